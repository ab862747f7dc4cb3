"""States: partial models merged key by key, chained, scaled, and checked when the file is loaded."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest

import mdof
from mdof.errors import ModelError, UsageError

BASE = """\
directions: [x, y]
bodies:
  tank: {mass: 430 kg, centre: [1 m, 2 m, 3 m]}
  pump: 90 kg
property_sets:
  rubber: {stiffness: {x: 10 N/m, y: {value: 20 N/m, tolerance: 15 %}}, loss_factor: 0.1}
connections:
  mount: {between: [tank, ground], at: {a: [0 m, 0 m, 0 m], b: [1 m, 0 m, 0 m]}, uses: rubber}
  link: {between: [pump, tank], stiffness: {x: 5 N/m}, damping: {x: 1 N*s/m, y: 2 N*s/m}}
states:
"""


def loaded(tmp_path: Path, states: str, state: str | None = None) -> mdof.Model:
    """The base model with these states, in one of them."""
    path = tmp_path / "m.yaml"
    path.write_text(BASE + states)
    return mdof.load(path, state)


@pytest.mark.parametrize(
    ("state", "where", "value"),
    [
        # One value changes, its neighbours stay.
        ("{bodies: {tank: {mass: 160 kg}}}", "bodies.tank.mass", 160.0),
        ("{bodies: {tank: {mass: 160 kg}}}", "bodies.tank.centre", [1.0, 2.0, 3.0]),
        ("{bodies: {tank: 160 kg}}", "bodies.tank.centre", [1.0, 2.0, 3.0]),
        ("{bodies: {pump: {centre: [0 m, 0 m, 1 m]}}}", "bodies.pump.mass", 90.0),
        # Lists are replaced whole.
        ("{bodies: {tank: {centre: [9 m, 8 m, 7 m]}}}", "bodies.tank.centre", [9.0, 8.0, 7.0]),
        ("{directions: [y]}", "directions", ["y"]),
        # A property set reaches every connection that uses it.
        ("{property_sets: {rubber: {stiffness: {x: 7 N/m}}}}", "connections.mount/b.stiffness.x", 7.0),
        (
            "{property_sets: {rubber: {stiffness: {x: 7 N/m}}}}",
            "connections.mount/b.stiffness.y",
            {"value": 20.0, "tolerance": 0.15},
        ),
        (
            "{property_sets: {rubber: {stiffness: {y: {value: 7 N/m}}}}}",
            "connections.mount/b.stiffness.y",
            {"value": 7.0, "tolerance": 0.15},
        ),
        ("{property_sets: {rubber: {stiffness: {y: 7 N/m}}}}", "connections.mount/b.stiffness.y", 7.0),
        # null removes.
        ("{connections: {link: {damping: null}}}", "connections.link.damping", None),
        ("{connections: {link: {damping: {x: null}}}}", "connections.link.damping", {"y": 2.0}),
        ("{connections: {link: null}}", "connections.link", None),
        ("{connections: {mount: {at: {a: null}}}}", "connections.mount/a", None),
        # A new key of the grammar may be added.
        ("{damping: {mode_ratios: 2 %}}", "damping.mode_ratios", 0.02),
        (
            "{connections: {link: {branches: [{stiffness: {x: 1 N/m}, damping: {x: 1 N*s/m}}]}}}",
            "connections.link.branches",
            [{"stiffness": {"x": 1.0}, "damping": {"x": 1.0}}],
        ),
        # Scaling multiplies every number below a path, and keeps what is known about it.
        (
            "{scale: {property_sets.rubber.stiffness: 1.5}}",
            "connections.mount/a.stiffness",
            {"x": 15.0, "y": {"value": 30.0, "tolerance": 0.15}},
        ),
        ("{scale: {property_sets.rubber.stiffness.x: 150 %}}", "connections.mount/a.stiffness.x", 15.0),
        ("{scale: {bodies.pump: 2}}", "bodies.pump.mass", 180.0),
        ("{scale: {bodies.pump.mass: 2}}", "bodies.pump.mass", 180.0),
        ("{scale: {bodies.tank.centre.2: 2}}", "bodies.tank.centre", [1.0, 2.0, 6.0]),
        ("{bodies: {pump: 10 kg}, scale: {bodies.pump.mass: 2}}", "bodies.pump.mass", 20.0),
        ("", "bodies.pump.mass", 90.0),
    ],
)
def test_what_a_state_comes_to(tmp_path: Path, state: str, where: str, value: Any) -> None:
    """Breaks if merging replaces too much or too little, or scaling misses a number."""
    node: Any = loaded(tmp_path, f"  s: {state}\n" if state else "  s: {}\n", "s").to_si()
    for step in where.split("."):
        node = node.get(step) if node is not None else None
    assert node == value


def test_states_build_on_each_other(tmp_path: Path) -> None:
    """Breaks if `from` is ignored, or applied in the wrong order."""
    states = "  third: {from: second, scale: {bodies.tank.mass: 2}}\n"
    states += "  first: {bodies: {tank: {mass: 100 kg}, pump: 5 kg}}\n"
    states += "  second: {from: first, bodies: {tank: {mass: 50 kg}}}\n"
    model = loaded(tmp_path, states, "third")
    masses = {name: body["mass"] for name, body in model.to_si()["bodies"].items()}
    assert masses == {"tank": 100.0, "pump": 5.0}
    assert (model.state, model.state_names) == ("third", ("third", "first", "second"))


def test_a_state_leaves_the_model_alone(tmp_path: Path) -> None:
    """Breaks if state leaks between calls."""
    model = loaded(tmp_path, "  s: {scale: {bodies.tank.mass: 2}, bodies: {pump: 1 kg}}\n")
    digest = model.digest
    first, second = model.with_state("s"), model.with_state("s")
    assert first.digest == second.digest != digest
    assert model.digest == digest == first.with_state(None).digest
    assert first.with_state("s").digest == first.digest


@pytest.mark.parametrize(
    ("state", "column", "path", "words"),
    [
        ("s: {bodies: {tnk: {mass: 1 kg}}}", 16, "states.s.bodies.tnk", "did you mean `tank`?"),
        ("s: {connections: {new: {between: [pump, ground]}}}", 21, "states.s.connections.new", "describe it there"),
        ("s: {bodies: {tank: {mas: 1 kg}}}", 23, "states.s.bodies.tank.mas", "did you mean `mass`?"),
        ("s: {bodies: {tank: {mass: 1 lbf}}}", 29, "states.s.bodies.tank.mass", "`weight: 1 lbf`"),
        ("s: {bodies: {tank: {mass: -1 kg}}}", 29, "states.s.bodies.tank.mass", "negative mass"),
        ("s: {bodies: {tank: {centre: null, mass: null}}}", 16, "states.s.bodies.tank", "has no mass"),
        ("s: {bodies: {tank: {spin: null}}}", 23, "states.s.bodies.tank.spin", "nothing to remove"),
        ("s: {connections: {mount: {uses: ruber}}}", 35, "states.s.connections.mount.uses", "did you mean `rubber`?"),
        ("s: {units: SI}", 7, "states.s.units", "cannot change `units`"),
        ("s: {bodis: {}}", 7, "states.s.bodis", "did you mean `bodies`?"),
        ("s: 3", 6, "states.s", "a partial model belongs"),
        (
            "s: {scale: {property_sets.ruber.stiffness: 2}}",
            15,
            "states.s.scale",
            "did you mean `property_sets.rubber`?",
        ),
        (
            "s: {scale: {property_sets.rubber.stifness: 2}}",
            15,
            "states.s.scale",
            "did you mean `property_sets.rubber.stiffness`?",
        ),
        (
            "s: {scale: {connections.mount.stiffness: 2}}",
            15,
            "states.s.scale",
            "its values come from property_sets.rubber",
        ),
        ("s: {scale: {connections.link: 2}}", 15, "states.s.scale", "holds the text `pump`"),
        ("s: {scale: {title: 2}}", 15, "states.s.scale", "nothing to scale"),
        ("s: {scale: {bodies.pump.mass.value: 2}}", 15, "states.s.scale", "is one value"),
        ("s: {scale: {bodies.pump.mass: much}}", 33, "states.s.scale", "is not a number"),
        ("s: {scale: {bodies.pump.mass: 2 kg}}", 33, "states.s.scale", "number without unit"),
        ("s: {scale: {bodies.pump.mass: -2}}", 33, "states.s.bodies.pump.mass", "negative mass"),
        ("s: {scale: 2}", 14, "states.s.scale", "paths and factors"),
        ("s: {from: other}", 13, "states.s.from", "unknown state `other`"),
        ("s: {from: s}", 13, "states.s.from", "circle"),
        ("a.b: {}", 3, "states.a.b", "holds `.`"),
    ],
)
def test_a_wrong_state_is_told_when_the_file_is_loaded(
    tmp_path: Path, state: str, column: int, path: str, words: str
) -> None:
    """Breaks if a state is only found wrong when somebody asks for it, or is placed outside its own lines."""
    with pytest.raises(ModelError) as caught:
        loaded(tmp_path, f"  {state}\n")
    (problem,) = caught.value.problems
    assert problem.path.startswith(path)
    assert words in f"{problem.message}; {problem.expected}"
    assert (problem.line, problem.column) == (BASE.count("\n") + 1, column)


def test_a_fault_is_told_once_where_it_was_made(tmp_path: Path) -> None:
    """Breaks if a fault of the model, or of a state others build on, is repeated by each of them."""
    states = "  good: {from: bad}\n  bad: {bodies: {pump: 3 N}}\n  other: {bodies: {tank: {mass: 1 kg}}}\n"
    (tmp_path / "m.yaml").write_text(BASE.replace("loss_factor: 0.1", "loss_factor: 0.1 m") + states)
    with pytest.raises(ModelError) as caught:
        mdof.load(tmp_path / "m.yaml")
    assert [problem.path for problem in caught.value.problems] == [
        "property_sets.rubber.loss_factor",
        "states.bad.bodies.pump.mass",
    ]


def test_a_state_that_does_not_exist_names_the_nearest(tmp_path: Path) -> None:
    """Breaks if a mistyped state gives the model as described."""
    model = loaded(tmp_path, "  cold: {}\n")
    with pytest.raises(UsageError, match="did you mean `cold`"):
        model.with_state("clod")
    with pytest.raises(UsageError, match="no states"):
        mdof.Model(bodies={"m": "1 kg"}).with_state("cold")


def test_states_work_for_a_model_built_in_code() -> None:
    """Breaks if states need a file."""
    model = mdof.Model(
        units="SI",
        bodies={"m": 1},
        connections={"s": {"between": ["m", "ground"], "stiffness": 2}},
        states={"stiff": {"scale": {"connections.s.stiffness": 3}}},
    )
    assert model.with_state("stiff").to_si()["connections"]["s"]["stiffness"] == {"x": 6.0}
    with pytest.raises(ModelError, match=r"states\.s\.bodies\.n"):
        mdof.Model(units="SI", bodies={"m": 1}, states={"s": {"bodies": {"n": 1}}})
