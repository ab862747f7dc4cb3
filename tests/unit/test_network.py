"""The network: what edges carry, what the network alone shows, and what is wrong with one made by hand."""

from __future__ import annotations

from typing import Any

import networkx as nx
import numpy as np
import pytest

import mdof
from mdof.description.network import network, network_findings, summary, validate_graph
from mdof.errors import ModelError

INERTIA = {"mass": 10, "inertia": [1, 2, 2.5]}
SPACE = ["x", "y", "z", "rx", "ry", "rz"]


def codes(graph: Any) -> dict[str, list[str]]:
    """Messages by code."""
    found: dict[str, list[str]] = {}
    for item in network_findings(graph):
        found.setdefault(item.code, []).append(item.message)
    return found


def test_nodes_and_edges_carry_si_attributes() -> None:
    """Breaks if an attribute of the graph contract is missing or not SI."""
    model = mdof.Model(
        units={"length": "mm"},
        title="t",
        directions=SPACE,
        reference_frequency="10 rad/s",
        damping={"two_ratios": {"2 rad/s": 0.1, "1 rad/s": 0.2}},
        supports={"deck": {"centre": [1000, 0, 0]}},
        bodies={
            "a": {
                "mass": "2 t",
                "centre": [1000, 2000, 3000],
                "inertia": {"xx": "1 kg*m^2", "yy": "2 kg*m^2", "zz": "2.5 kg*m^2", "xz": "0.25 kg*m^2"},
                "spin": {"axis": [0, 0, 2], "speed": "3 rad/s", "polar_inertia": "4 kg*m^2"},
            },
            "b": {"massless": True, "directions": ["z", "x"]},
        },
        connections={
            "s": {
                "between": ["deck", "a"],
                "at": {"p": [1000, 0, 0], "q": [0, 0, 0]},
                "axes": {"x": [0, 2, 0], "y": [-1, 0, 0]},
                "stiffness": {"x": "1 kN/m", "rx": "2 kN*m/rad"},
                "damping": {"y": "3 N*s/m"},
                "loss_factor": {"x": 0.1},
                "reference_frequency": "5 rad/s",
                "limits": {"travel": 6},
                "after_levelling": True,
            },
            "t": {
                "between": ["a", "b"],
                "ends": [[0, 0, 0], [1000, 0, 0]],
                "stiffness": "1 N/mm",
                "branches": [{"stiffness": "2 N/m", "damping": "3 N*s/m"}],
            },
            "g": {"between": ["a", "ground"], "gear": {"radii": [200, 100]}, "axis": [1, 0, 0], "stiffness": "4 N/m"},
        },
    )
    graph = network(model)
    validate_graph(graph)
    assert isinstance(graph, nx.MultiGraph)
    assert graph.graph == {
        "title": "t",
        "directions": tuple(SPACE),
        "reference_frequency": 10.0,
        "damping": {"two_ratios": ((1.0, 0.2), (2.0, 0.1))},
    }
    assert list(graph.nodes) == ["a", "b", "ground", "deck"]
    a = graph.nodes["a"]
    assert (a["kind"], a["mass"], a["massless"], a["directions"]) == ("body", 2000.0, False, tuple(SPACE))
    np.testing.assert_array_equal(a["centre"], [1, 2, 3])
    np.testing.assert_array_equal(a["inertia"], [[1, 0, -0.25], [0, 2, 0], [-0.25, 0, 2.5]])
    assert (a["spin"]["speed"], a["spin"]["polar_inertia"], list(a["spin"]["axis"])) == (3.0, 4.0, [0.0, 0.0, 2.0])
    assert (graph.nodes["b"]["mass"], graph.nodes["b"]["massless"], graph.nodes["b"]["directions"]) == (
        0.0,
        True,
        ("x", "z"),
    )
    assert graph.nodes["deck"]["kind"] == "ground"
    edge = graph.edges["a", "deck", "s/q"]
    assert edge["between"] == ("deck", "a")
    np.testing.assert_array_equal(edge["axes"], [[0, 1, 0], [-1, 0, 0], [0, 0, 1]])
    assert (edge["stiffness"], edge["damping"], edge["loss_factor"]) == (
        {"x": 1000.0, "rx": 2000.0},
        {"y": 3.0},
        {"x": 0.1},
    )
    assert (edge["reference_frequency"], edge["limits"], edge["after_levelling"], edge["label"]) == (
        5.0,
        {"travel": 0.006},
        True,
        "spring and damper",
    )
    assert "axes" not in graph.edges["a", "b", "t"]
    assert (graph.edges["a", "b", "t"]["stiffness"], graph.edges["a", "b", "t"]["branches"]) == (
        1000.0,
        [{"stiffness": 2.0, "damping": 3.0}],
    )
    np.testing.assert_array_equal(graph.edges["a", "b", "t"]["ends"], [[0, 0, 0], [1, 0, 0]])
    gear = graph.edges["a", "ground", "g"]
    assert (gear["kind"], gear["gear"], gear["stiffness"]) == ("gear", {"radii": (0.2, 0.1)}, 4.0)


def test_parallel_connections_stay_apart() -> None:
    """Breaks if a simple graph merges parallel edges."""
    model = mdof.Model(
        units="SI",
        bodies={"m": 1},
        connections={f"s{i}": {"between": ["m", "ground"], "stiffness": 1} for i in range(3)},
    )
    assert network(model).number_of_edges() == 3


def test_one_number_goes_to_the_one_direction() -> None:
    """Breaks if a scalar stiffness of a one-direction model loses its direction; also in torsion."""
    model = mdof.Model(
        units="SI",
        directions=["rz"],
        bodies={"m": {"inertia": 3}},
        connections={"s": {"between": ["m", "ground"], "stiffness": 2, "damping": "1 N*m*s/rad"}},
    )
    edge = network(model).edges["m", "ground", "s"]
    assert (edge["stiffness"], edge["damping"]) == ({"rz": 2.0}, {"rz": 1.0})
    np.testing.assert_array_equal(network(model).nodes["m"]["inertia"], 3 * np.eye(3))


@pytest.mark.parametrize(
    ("parts", "code", "words"),
    [
        ({"bodies": {"m": 1}}, "unheld-body", "no stiffness holds `m` in x: 1 of its 1 directions"),
        (
            {"bodies": {"m": 1}, "connections": {"d": {"between": ["m", "ground"], "damping": 1}}},
            "unheld-body",
            "`m` in x",
        ),
        # A spring at the centre of a body in space leaves the two other translations and all rotations.
        (
            {
                "directions": SPACE,
                "bodies": {"m": INERTIA},
                "connections": {"s": {"between": ["m", "ground"], "stiffness": {"x": 1}}},
            },
            "unheld-body",
            "in y, z, rx, ry, rz: 5 of its 6",
        ),
        # Three vertical springs hold z, rx, ry.
        (
            {
                "directions": SPACE,
                "bodies": {"m": INERTIA},
                "connections": {
                    "s": {
                        "between": ["m", "ground"],
                        "at": {"a": [1, 0, 0], "b": [-1, 1, 0], "c": [-1, -1, 0]},
                        "stiffness": {"z": 1},
                    }
                },
            },
            "unheld-body",
            "in x, y, rz: 3 of its 6",
        ),
        # Springs along the line from the origin to the body hold it against nothing but that line.
        (
            {
                "directions": ["x", "y"],
                "bodies": {"m": 1},
                "connections": {"s": {"between": ["m", "ground"], "axis": [1, 1, 0], "stiffness": 1}},
            },
            "unheld-body",
            "in 1 combined motion: 1 of its 2",
        ),
        (
            {"bodies": {"m": 1, "n": 1}, "connections": {"s": {"between": ["m", "n"], "stiffness": 1}}},
            "unheld-body",
            "group of `m`, `n` to a ground",
        ),
        (
            {
                "bodies": {"m": 1, "n": 1},
                "connections": {
                    "s": {"between": ["m", "ground"], "stiffness": 1},
                    "t": {"between": ["n", "ground"], "stiffness": 1},
                },
            },
            "separate-groups",
            "2 groups: m; n",
        ),
        (
            {"bodies": {"m": 1}, "connections": {"s": {"between": ["m", "ground"], "stiffness": {"x": 1, "y": 2}}}},
            "idle-connection",
            "`s` acts in y, where neither",
        ),
        (
            {"bodies": {"m": 1}, "connections": {"s": {"between": ["m", "ground"], "axis": [0, 1, 0], "stiffness": 2}}},
            "idle-connection",
            "`s` acts along its line",
        ),
        ({"bodies": {"m": 1, "j": {"massless": True}}}, "massless-body", "without mass: j"),
        (
            {"bodies": {"m": 1}, "connections": {"s": {"between": ["m", "ground"], "stiffness": -1}}},
            "negative-stiffness",
            "`s` has negative stiffness in x",
        ),
        (
            {"bodies": {"m": 1}, "connections": {"s": {"between": ["m", "ground"], "damping": -1}}},
            "negative-damping",
            "`s` has negative damping in x",
        ),
        (
            {
                "directions": ["rx"],
                "bodies": {"m": {"inertia": 1}, "n": {"inertia": 1}},
                "connections": {"g": {"between": ["m", "n"], "gear": {"ratio": 3}}},
            },
            "gear-reaction",
            "the tooth force of g",
        ),
    ],
)
def test_what_the_network_alone_shows(parts: dict[str, Any], code: str, words: str) -> None:
    """Breaks if a doubt an engineer should hear of stays silent or is miscounted."""
    found = codes(network(mdof.Model(units="SI", **parts)))
    assert any(words in message for message in found.get(code, [])), found


def test_a_sound_model_has_no_findings() -> None:
    """Breaks if a held machine raises a false alarm: offset points act through rotations, beams and riders count."""
    beam = {
        "youngs_modulus": 2e11,
        "shear_modulus": 8e10,
        "area": 1e-3,
        "second_moments": [1e-7, 1e-7],
        "torsion_constant": 1e-7,
        "towards": [0, 0, 1],
    }
    model = mdof.Model(
        units="SI",
        directions=SPACE,
        bodies={
            "m": {**INERTIA, "centre": [0, 0, 0]},
            "rider": {**INERTIA, "centre": [0, 0, 1]},
            "n": {**INERTIA, "centre": [0, 0, 0]},
            "turner": {"mass": 1, "centre": [0, 0, 0], "inertia": [1, 1, 1], "directions": ["ry", "rx", "rz"]},
        },
        connections={
            "s": {
                "between": ["rider", "ground"],
                "at": {"a": [1, 0, 0], "b": [-1, 1, 0], "c": [-1, -1, 0]},
                "stiffness": {"x": 1, "y": 1, "z": 1},
            },
            "link": {"rigid": ["m", "rider"]},
            "bar": {"between": ["m", "n"], "ends": [[0, 0, 0], [1, 0, 0]], "beam": beam},
            "strut": {
                "between": ["turner", "m"],
                "at": {"a": [1, 0, 0], "b": [0, 1, 0], "c": [0, 0, 1]},
                "stiffness": {"x": 1, "y": 1, "z": 1},
            },
        },
    )
    graph = network(model)
    assert codes(graph) == {}
    found = summary(graph)
    assert found.degrees_of_freedom == 6 + 6 + 3
    assert found.connections == {"spring": 6, "rigid link": 1, "beam": 1}


def test_named_points_of_one_connection_make_one_finding() -> None:
    """Breaks if eight points of one spring make eight lines of the same doubt."""
    model = mdof.Model(
        units="SI",
        bodies={"m": 1},
        connections={
            "s": {"between": ["m", "ground"], "at": {n: [0, 0, 0] for n in "abcd"}, "stiffness": {"x": -1, "y": 1}}
        },
    )
    found = {item.code: item for item in network_findings(network(model))}
    assert (
        found["negative-stiffness"].connections == found["idle-connection"].connections == ("s/a", "s/b", "s/c", "s/d")
    )


def test_summary_counts_mass_and_centre() -> None:
    """Breaks if total mass, centre of gravity or the counts are wrong."""
    model = mdof.Model(
        units="SI",
        directions=["x", "z"],
        bodies={"a": {"mass": 1, "centre": [0, 0, 3]}, "b": {"mass": 3, "centre": [4, 0, 3]}},
        connections={
            "s": {"between": ["a", "b"], "stiffness": {"x": 1}},
            "t": {"between": ["a", "ground"], "damping": {"x": 1}, "at": {"p": [0, 0, 0], "q": [1, 0, 0]}},
        },
    )
    found = summary(network(model))
    assert (found.bodies, found.grounds, found.total_mass, found.centre_of_gravity) == (
        ("a", "b"),
        ("ground",),
        4.0,
        (3.0, 0.0, 3.0),
    )
    assert (found.connections, found.degrees_of_freedom, found.groups) == ({"damper": 2, "spring": 1}, 4, (("a", "b"),))
    assert found.free_directions == ("a: z", "b: z")


def by_hand(**changes: Any) -> nx.MultiGraph:
    """A sound two-body network made by hand, with changes to its edge."""
    graph = nx.MultiGraph(directions=("x",))
    graph.add_node("m", mass=1.0)
    graph.add_node("n", mass=1.0)
    graph.add_node("ground", kind="ground")
    graph.add_edge("m", "n", key="s", **{"between": ("m", "n"), "stiffness": 3.0, **changes})
    return graph


def test_a_graph_made_by_hand_is_as_good() -> None:
    """Breaks if findings need attributes that only a model's network has."""
    graph = by_hand()
    validate_graph(graph)
    assert codes(graph) == {
        "unheld-body": ["no stiffness ties the group of `m`, `n` to a ground: it moves freely as a whole"]
    }
    graph.add_edge("m", "ground", key="t", between=("m", "ground"), stiffness={"x": 2.0})
    assert codes(graph) == {}
    assert summary(graph).connections == {"spring": 2}


@pytest.mark.parametrize(
    ("changes", "path", "words"),
    [
        ({"between": None}, "connections.s.between", "give between=('m', 'n')"),
        ({"between": ("m", "q")}, "connections.s.between", "not the ends of this edge"),
        ({"stifness": 3.0}, "connections.s.stifness", "did you mean `stiffness`?"),
        ({"stiffness": {"q": 3.0}}, "connections.s.stiffness.q", "unknown direction"),
        ({"stiffness": float("nan")}, "connections.s.stiffness", "not a finite number"),
        ({"stiffness": "3 N/m"}, "connections.s.stiffness", "give one SI number"),
        ({"stiffness": None}, "connections.s", "does nothing"),
        ({"at": (0, 0)}, "connections.s.at", "the shape is (2,)"),
        ({"at": (0, 0, np.inf)}, "connections.s.at", "finite"),
        ({"axes": np.zeros(3)}, "connections.s.axes", "3 by 3"),
        ({"ends": ((0, 0, 0),)}, "connections.s.ends", "2 by 3"),
        ({"kind": "sprng"}, "connections.s.kind", "did you mean `spring`?"),
        ({"kind": "beam"}, "connections.s.beam", "is missing"),
        ({"branches": [{"stiffness": 3.0}]}, "connections.s.branches.0.damping", "is missing"),
    ],
)
def test_a_wrong_edge_made_by_hand(changes: dict[str, Any], path: str, words: str) -> None:
    """Breaks if a mistake in Python code reaches assembly."""
    with pytest.raises(ModelError) as caught:
        validate_graph(by_hand(**changes))
    assert any(
        problem.path == path and words in f"{problem.message}; {problem.expected}" for problem in caught.value.problems
    ), str(caught.value)


@pytest.mark.parametrize(
    ("graph", "words"),
    [
        (nx.Graph([("m", "n")]), "merges parallel connections"),
        (nx.MultiDiGraph([("m", "n")]), "directed"),
        (nx.MultiGraph(), "no body"),
        ({"m": 1}, "not a network"),
    ],
)
def test_what_is_not_a_network(graph: Any, words: str) -> None:
    """Breaks if a graph of the wrong kind is taken."""
    with pytest.raises(ModelError, match=words):
        validate_graph(graph)


@pytest.mark.parametrize(
    ("attributes", "path", "words"),
    [
        ({"mass": -1.0}, "bodies.q.mass", "negative"),
        ({}, "bodies.q.mass", "neither mass nor inertia"),
        ({"mass": 1.0, "inertia": np.ones(3)}, "bodies.q.inertia", "the shape is (3,)"),
        ({"mass": 1.0, "directions": "xy"}, "bodies.q.directions", "not directions"),
        ({"mass": 1.0, "center": (0, 0, 0)}, "bodies.q.center", "did you mean `centre`?"),
        ({"mass": 1.0, "kind": "wall"}, "bodies.q.kind", "unknown kind"),
    ],
)
def test_a_wrong_body_made_by_hand(attributes: dict[str, Any], path: str, words: str) -> None:
    """Breaks if a wrong node passes the check."""
    graph = by_hand()
    graph.add_node("q", **attributes)
    with pytest.raises(ModelError) as caught:
        validate_graph(graph)
    assert [(problem.path, words in f"{problem.message}; {problem.expected}") for problem in caught.value.problems] == [
        (path, True)
    ]
