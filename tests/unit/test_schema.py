"""The grammar: what a model may say, what no real machine has, and the words that answer a mistake."""

from __future__ import annotations

import copy
import json
import pickle
import re
from pathlib import Path
from typing import Any

import numpy as np
import pytest

import mdof
from mdof.description.bodies import mass_properties
from mdof.description.strict_yaml import parse
from mdof.errors import ModelError

MODELS = sorted((Path(__file__).parents[2] / "models").glob("*.yaml"))
SPACE = {
    "units": "SI",
    "directions": ["x", "y", "z", "rx", "ry", "rz"],
    "bodies": {"a": {"mass": 10, "inertia": [1, 1, 1]}, "b": {"mass": 10, "inertia": [1, 1, 1]}},
}


def faults(mapping: dict[str, Any]) -> list[str]:
    """``path: message; expected`` of every problem of a model built in code; empty if there is none."""
    try:
        mdof.Model(**mapping)
    except ModelError as error:
        return [str(problem) for problem in error.problems]
    return []


def with_connection(**connection: Any) -> dict[str, Any]:
    """A two-body model in space with one connection."""
    return {**SPACE, "connections": {"c": connection}}


AB = ["a", "b"]
LINE = [[0, 0, 0], [1, 0, 0]]
BEAM = {
    "youngs_modulus": "210 GPa",
    "shear_modulus": "81 GPa",
    "area": "1200 mm^2",
    "second_moments": ["8.0e4 mm^4", "9.0e4 mm^4"],
    "torsion_constant": "1.2e5 mm^4",
    "towards": [0, 0, 1],
}


@pytest.mark.parametrize(
    ("connection", "path", "words"),
    [
        ({"between": ["a", "grond"], "stiffness": {"x": 1}}, "between.1", "did you mean `ground`?"),
        ({"between": ["a", "a"], "stiffness": {"x": 1}}, "between", "connected to itself"),
        ({"between": ["a"], "stiffness": {"x": 1}}, "between", "1 names where 2 names belong"),
        ({"between": ["a", 3], "stiffness": {"x": 1}}, "between.1", "put numbers in quotes"),
        ({"between": AB}, "", "does nothing"),
        ({"stiffness": {"x": 1}}, "", "does not say what it joins"),
        ({"between": AB, "uses": "rubber"}, "uses", "unknown property set `rubber`"),
        ({"between": AB, "stiffnes": {"x": 1}}, "stiffnes", "did you mean `stiffness`?"),
        ({"between": AB, "stiffness": {"x": 1, "q": 2}}, "stiffness.q", "unknown direction"),
        ({"between": AB, "stiffness": {}}, "stiffness", "empty mapping"),
        ({"between": AB, "stiffness": {"rx": "1 N/m"}}, "stiffness.rx", "not a rotational stiffness"),
        ({"between": AB, "stiffness": {"x": "1 N*m/rad"}}, "stiffness.x", "is a rotational stiffness, not a stiffness"),
        ({"between": AB, "stiffness": "3 kN/m"}, "stiffness", "write {x: 3 kN/m, y: 3 kN/m, z: 3 kN/m}"),
        ({"between": AB, "damping": {"x": "1 kg/s^2"}}, "damping.x", "not a damping"),
        ({"between": AB, "at": [0, 0, 0], "ends": LINE, "stiffness": 1}, "ends", "exclude each other"),
        (
            {"between": AB, "axis": [1, 0, 0], "axes": {"x": [1, 0, 0], "y": [0, 1, 0]}, "stiffness": 1},
            "axes",
            "exclude each other",
        ),
        ({"between": AB, "ends": LINE, "axis": [1, 0, 0], "stiffness": 1}, "axis", "no meaning beside `ends`"),
        ({"between": AB, "ends": LINE, "stiffness": {"x": 1, "y": 1}}, "stiffness", "false moment to ground"),
        ({"between": AB, "ends": [[0, 0, 0], [0, 0, 0]], "stiffness": 1}, "ends", "same point"),
        ({"between": AB, "axis": [1, 0, 0], "stiffness": {"x": 1}}, "stiffness", "write one stiffness along the axis"),
        ({"between": AB, "axis": [1, 0, 0], "stiffness": "1 N*m/rad"}, "stiffness", "write {rx: 1 N*m/rad}"),
        ({"between": AB, "axis": [0, 0, 0], "stiffness": 1}, "axis", "length zero"),
        (
            {"between": AB, "axes": {"x": [1, 0, 0], "y": [1, 1, 0]}, "stiffness": {"x": 1}},
            "axes",
            "meet at 45 degrees",
        ),
        ({"between": AB, "axes": {"x": [1, 0, 0]}, "stiffness": {"x": 1}}, "axes.y", "`y` is missing"),
        ({"between": AB, "damping": {"x": 1}, "loss_factor": 0.1}, "loss_factor", "without stiffness"),
        ({"between": AB, "stiffness": {"x": 1}, "loss_factor": {"y": 0.1}}, "loss_factor.y", "without stiffness there"),
        ({"between": AB, "stiffness": {"x": 1}, "loss_factor": -0.1}, "loss_factor", "negative loss factor"),
        ({"between": AB, "stiffness": {"x": 1}, "reference_frequency": 12}, "reference_frequency", "write 12 Hz"),
        (
            {"between": AB, "stiffness": {"x": 1}, "reference_frequency": "0 Hz"},
            "reference_frequency",
            "greater than zero",
        ),
        ({"between": AB, "inertance": {"x": -1}}, "inertance.x", "negative inertance"),
        (
            {"between": AB, "branches": [{"stiffness": {"x": 1}, "damping": {"y": 1}}]},
            "branches.0",
            "need both in every direction",
        ),
        (
            {"between": AB, "branches": [{"stiffness": {"x": 0}, "damping": {"x": 1}}]},
            "branches.0.stiffness.x",
            "greater than zero",
        ),
        ({"between": AB, "branches": [{"stiffness": {"x": 1}}]}, "branches.0.damping", "missing"),
        ({"between": AB, "branches": {"stiffness": 1}}, "branches", "a list belongs here"),
        ({"between": AB, "stiffness_table": "rubber.csv"}, "stiffness_table", "not supported yet"),
        ({"between": AB, "stiffness": {"x": 1}, "loss_table": "rubber.csv"}, "loss_table", "not supported yet"),
        ({"between": AB, "stiffness": {"x": 1}, "limits": {"travel": "-1 mm"}}, "limits.travel", "greater than zero"),
        ({"between": AB, "stiffness": {"x": 1}, "at": [0, 0]}, "at", "2 values where three belong"),
        ({"between": AB, "stiffness": {"x": 1}, "at": {"p/q": [0, 0, 0]}}, "at.p/q", "holds `/`"),
        ({"between": AB, "stiffness": {"x": {"value": 1, "tolerance": 8}}}, "stiffness.x.tolerance", "write 8 %"),
        (
            {"between": AB, "stiffness": {"x": {"value": 1, "tolerance": "-8 %"}}},
            "stiffness.x.tolerance",
            "not possible",
        ),
        ({"between": AB, "stiffness": {"x": {"tolerance": "8 %"}}}, "stiffness.x", "`value` is missing"),
        (
            {"between": AB, "stiffness": {"x": {"value": 1, "sorce": "x"}}},
            "stiffness.x.sorce",
            "did you mean `source`?",
        ),
        ({"between": AB, "stiffness": {"x": None}}, "stiffness.x", "nothing where a number belongs"),
        ({"between": AB, "stiffness": None}, "stiffness", "no value is given"),
        ({"rigid": AB, "stiffness": {"x": 1}}, "stiffness", "no meaning for a rigid link"),
        ({"rigid": ["a", "ground"]}, "rigid.1", "is a ground"),
        ({"rigid": ["a", "a"]}, "rigid", "connected to itself"),
        (
            {"between": AB, "gear": {"radii": [1, 2], "ratio": 3}, "axis": [1, 0, 0]},
            "gear",
            "either `radii` or `ratio`",
        ),
        ({"between": AB, "gear": {"ratio": 3}}, "", "which of rx, ry, rz"),
        ({"between": AB, "gear": {"ratio": -3}, "axis": [1, 0, 0]}, "gear.ratio", "greater than zero"),
        (
            {"between": AB, "gear": {"ratio": 3}, "axis": [1, 0, 0], "damping": 1},
            "damping",
            "a rigid gear has no damping",
        ),
        (
            {"between": AB, "gear": {"radii": [1, 2]}, "axis": [1, 0, 0], "stiffness": "1 N*m/rad"},
            "stiffness",
            "does not fit this gear",
        ),
        ({"between": AB, "gear": {"ratio": 2}, "axis": [1, 0, 0], "stiffness": "1 N/m"}, "stiffness", "N*m/rad"),
        ({"between": AB, "beam": BEAM}, "", "needs its two ends"),
        ({"between": AB, "beam": {**BEAM, "towards": [1, 0, 0]}, "ends": LINE}, "beam.towards", "along the beam"),
        ({"between": AB, "beam": {"area": 1}, "ends": LINE}, "beam.youngs_modulus", "`youngs_modulus` is missing"),
        ({"between": AB, "beam": BEAM, "ends": LINE, "stiffness": {"x": 1}}, "stiffness", "no meaning for a beam"),
    ],
)
def test_wrong_connections(connection: dict[str, Any], path: str, words: str) -> None:
    """Breaks if a connection that contradicts itself is taken, or the fault is placed elsewhere."""
    found = faults(with_connection(**connection))
    start = f"connections.c.{path}".rstrip(".") + ":"
    assert any(line.startswith(start) and words in line for line in found), found


@pytest.mark.parametrize(
    "connection",
    [
        {"between": ["a", "ground"], "stiffness": {"x": -1}, "damping": {"x": -1}},
        {"between": AB, "ends": LINE, "stiffness": 1, "damping": 2, "inertance": 3},
        {"between": AB, "axis": [1, 1, 0], "at": {"p": [0, 0, 0], "q": [1, 0, 0]}, "stiffness": 1, "loss_factor": 0.1},
        {
            "between": AB,
            "axes": {"x": [0.866, 0.5, 0], "y": [-0.5, 0.866, 0]},
            "stiffness": {"x": 1, "rz": 2},
            "loss_factor": {"x": 0.1},
        },
        {
            "between": AB,
            "stiffness": {"x": 1},
            "branches": [{"stiffness": {"x": 1, "rx": 2}, "damping": {"rx": 1, "x": 1}}],
        },
        {"between": AB, "gear": {"radii": [0.3, 0.1]}, "axis": [1, 0, 0], "stiffness": 1e8, "damping": 1e3},
        {"between": AB, "gear": {"ratio": 3}, "axis": [1, 0, 0]},
        {"between": AB, "beam": BEAM, "ends": LINE, "loss_factor": 0.01},
        {"rigid": AB},
    ],
)
def test_right_connections(connection: dict[str, Any]) -> None:
    """Breaks if a form of the grammar is refused."""
    assert faults(with_connection(**connection)) == []


@pytest.mark.parametrize(
    ("body", "path", "words"),
    [
        ({"mass": 0, "inertia": [1, 1, 1]}, "mass", "a zero mass"),
        ({"mass": -1, "inertia": [1, 1, 1]}, "mass", "a negative mass"),
        ({"inertia": [1, 1, 1]}, "", "has no mass"),
        ({"mass": 1}, "", "but has no inertia"),
        ({"mass": 1, "weight": 10, "inertia": [1, 1, 1]}, "weight", "both given"),
        ({"mass": "240 lbf", "inertia": [1, 1, 1]}, "mass", "`weight: 240 lbf`"),
        ({"weight": "240 lb", "inertia": [1, 1, 1]}, "weight", "`240 lbf`"),
        ({"mass": 1, "inertia": 2}, "inertia", "one inertia for 3 rotations"),
        ({"mass": 1, "inertia": [1, 1]}, "inertia", "2 values where three, xx, yy and zz, belong"),
        ({"mass": 1, "inertia": [1, 1, 3]}, "inertia", "its zz is above the sum of the other two"),
        ({"mass": 1, "inertia": [1, 1, 0]}, "inertia", "greater than zero"),
        ({"mass": 1, "inertia": {"xx": 1, "yy": 1, "zz": 1, "xy": 1.5}}, "inertia", "principal moments are -0.5"),
        ({"mass": 1, "inertia": {"xx": 1, "yy": 1}}, "inertia", "lacks zz"),
        ({"mass": 1, "inertia": {"xx": 1, "yy": 1, "zz": 1, "yx": 0}}, "inertia.yx", "unknown key"),
        ({"massless": True, "mass": 1}, "mass", "a massless body has no mass"),
        ({"massless": 1}, "massless", "write true or false"),
        ({"mass": 1, "centre": [0, 0], "inertia": [1, 1, 1]}, "centre", "2 values where three belong"),
        ({"mass": 1, "directions": ["x", "x"]}, "directions.1", "written twice"),
        ({"mass": 1, "directions": ["x", "Rx"]}, "directions.1", "did you mean `rx`?"),
        ({"mass": 1, "directions": []}, "directions", "an empty list"),
        (
            {"mass": 1, "inertia": [1, 1, 1], "spin": {"axis": [1, 0, 0], "speed": 100, "polar_inertia": 1}},
            "spin.speed",
            "write 100 Hz",
        ),
        (
            {"mass": 1, "directions": ["x"], "spin": {"axis": [1, 0, 0], "speed": "1 Hz", "polar_inertia": 1}},
            "spin",
            "no effect",
        ),
        ({"made_of": []}, "made_of", "no part is given"),
        ({"made_of": [{"centre": [0, 0, 0]}]}, "made_of.0", "has no mass"),
        ({"made_of": [{"mass": 1, "weight": 1, "centre": [0, 0, 0]}]}, "made_of.0", "has mass and weight"),
        ({"made_of": [{"mass": 1, "centre": [0, 0, 0], "inertia": 3}]}, "made_of.0.inertia", "write three"),
        ({"made_of": [{"mass": 1, "centre": [0, 0, 0]}], "mass": 3}, "mass", "follows from `made_of`"),
        ({"made_of": [{"mass": 1, "centre": [i, 0, 0]} for i in range(3)]}, "made_of", "no real body"),
        ({"mas": 1, "mass": 1, "inertia": [1, 1, 1]}, "mas", "did you mean `mass`?"),
        ([1], "", "a list where a mapping belongs"),
        (None, "", "nothing is described"),
    ],
)
def test_wrong_bodies(body: Any, path: str, words: str) -> None:
    """Breaks if a body that cannot exist is taken."""
    found = faults({**SPACE, "bodies": {"m": body}})
    start = f"bodies.m.{path}".rstrip(".") + ":"
    assert any(line.startswith(start) and words in line for line in found), found


@pytest.mark.parametrize(
    ("part", "path", "words"),
    [
        ({"bodies": {}}, "bodies", "no body"),
        ({"bodies": 3}, "bodies", "named entries belong"),
        ({"bodies": {"ground": 3}}, "bodies.ground", "never moves"),
        ({"bodies": {"a.b": 3}}, "bodies.a.b", "holds `.`"),
        ({"bodies": {" a": 3}}, "bodies. a", "blanks at its ends"),
        ({"bodies": {"a\u200bb": 3}}, "bodies.a\\u200bb", "cannot be printed"),
        ({"bodies": {7: 3}}, "bodies.7", "is not text"),
        ({"supports": {"m": {}}}, "bodies.m", "also a support"),
        ({"supports": {"ground": {}}}, "supports.ground", "always exists"),
        ({"matrices": {}}, "matrices", "not supported yet"),
        ({"conections": {}}, "conections", "did you mean `connections`?"),
        ({"directions": "x"}, "directions", "text where directions belong"),
        ({"units": "US"}, "units", "`units: SI`"),
        ({"units": {"length": "kg"}}, "units.length", "not a unit of a length"),
        ({"units": {"frequency": "Hz"}}, "units.frequency", "write the unit beside every such number"),
        ({"units": {"lenght": "mm"}}, "units.lenght", "did you mean `length`?"),
        ({"title": 3}, "title", "text belongs"),
        ({"damping": {}}, "damping", "no damping is given"),
        ({"damping": {"mode_ratios": 0.02, "mass_proportional": 1}}, "damping", "several forms"),
        ({"damping": {"two_ratios": {"4 Hz": 0.1}}}, "damping.two_ratios", "two values"),
        ({"damping": {"two_ratios": {"4 Hz": 0.1, "240 rpm": 0.1}}}, "damping.two_ratios.240 rpm", "same frequency"),
        ({"damping": {"two_ratios": {"4": 0.1, "5 Hz": 0.1}}}, "damping.two_ratios.4", "write 4 Hz"),
        ({"damping": {"mode_ratios": -0.02}}, "damping.mode_ratios", "must not be negative"),
        ({"watch": {"p": {"on": "n"}}}, "watch.p.on", "unknown body `n`"),
        ({"criteria": {"below": 60}}, "criteria.below", "write 60 Hz"),
        (
            {"criteria": {"settle": {"band": 0.02, "within": 1, "at": "p"}}},
            "criteria.settle.at",
            "unknown watched point",
        ),
        ({"loads": {"l": {"on": "m"}}}, "loads.l", "the load says nothing"),
        ({"loads": {"l": {"unbalance": 1, "on": "m", "speed": "1 Hz"}}}, "loads.l", "`axis` is missing"),
        ({"loads": {"l": {"moment": [1, 0, 0], "on": "n"}}}, "loads.l.on", "unknown body `n`"),
        (
            {"loads": {"l": {"moment": [1, 0, 0], "on": "m", "speed": {"from": "9 Hz", "to": "3 Hz"}}}},
            "loads.l.speed",
            "does not rise",
        ),
        (
            {"loads": {"l": {"base": "deck", "direction": "z", "acceleration_spectrum": {"5 Hz": 1, "9 Hz": 1}}}},
            "loads.l.base",
            "unknown support",
        ),
        ({"loads": {"l": {"force": [1, 0, 0], "on": "m", "direction": "x"}}}, "loads.l.direction", "no meaning"),
    ],
)
def test_wrong_models(part: dict[str, Any], path: str, words: str) -> None:
    """Breaks if a fault of the whole is missed or placed elsewhere."""
    found = faults({"units": "SI", "bodies": {"m": 3}, **part})
    assert any(line.startswith(path) and words in line for line in found), found


def test_the_faults_of_rigid_links_across_connections() -> None:
    """Breaks if a rider with two hosts, a circle, or a host that lacks a direction reaches assembly."""
    bodies = {name: {"mass": 1, "inertia": [1, 1, 1]} for name in "abc"} | {"d": {"mass": 1, "directions": ["x"]}}
    links = {"one": ["a", "b"], "two": ["c", "b"], "three": ["b", "a"], "four": ["d", "c"]}
    found = faults({**SPACE, "bodies": bodies, "connections": {name: {"rigid": pair} for name, pair in links.items()}})
    assert any(line.startswith("connections.two.rigid.1:") and "already rides on `a`" in line for line in found)
    assert any(line.startswith("connections.three.rigid:") and "circle" in line for line in found)
    assert any(
        line.startswith("connections.four.rigid:") and "y, z, rx, ry, rz, which the host `d` lacks" in line
        for line in found
    )
    assert len(found) == 3


def test_a_wrong_body_is_not_reported_again_by_those_that_name_it() -> None:
    """Breaks if one mistake makes a chain of false complaints."""
    mapping = {
        "units": "SI",
        "bodies": {"m": "3 kN"},
        "property_sets": {"r": {"stiffness": "3 kg"}},
        "connections": {"s": {"between": ["m", "ground"], "uses": "r"}},
        "watch": {"p": {"on": "m"}},
    }
    assert [line.split(":")[0] for line in faults(mapping)] == ["property_sets.r.stiffness", "bodies.m.mass"]


def test_weight_becomes_mass_by_standard_gravity() -> None:
    """Breaks if pounds-force pass for pounds: the numbers agree by the definition of the pound-force."""
    model = mdof.Model(bodies={"a": {"weight": "240 lbf"}, "b": {"mass": "240 lb"}, "c": {"weight": "9.80665 N"}})
    masses = [mass_properties(body).mass for body in model.bodies.values()]
    assert masses[0] == pytest.approx(masses[1], rel=3e-16)
    assert masses[2] == 1.0


def test_parts_merge_by_the_parallel_axis_rule() -> None:
    """Breaks if centre or inertia of parts is wrong; the reference sums point masses r × (θ × r)."""
    rng = np.random.default_rng(5)
    masses, points = rng.uniform(1, 3, 12), rng.normal(size=(12, 3))

    def about(origin: np.ndarray, chosen: slice) -> np.ndarray:
        arms = points[chosen] - origin
        return sum(m * (np.dot(r, r) * np.eye(3) - np.outer(r, r)) for m, r in zip(masses[chosen], arms, strict=True))

    def written(tensor: np.ndarray) -> dict[str, float]:
        return {
            "xx": tensor[0, 0],
            "yy": tensor[1, 1],
            "zz": tensor[2, 2],
            "xy": -tensor[0, 1],
            "yz": -tensor[1, 2],
            "xz": -tensor[0, 2],
        }

    first, second = slice(0, 5), slice(5, 12)
    centre = [masses[part] @ points[part] / masses[part].sum() for part in (first, second)]
    corner = np.array([0.3, -0.2, 0.9])
    parts = [
        {"mass": masses[first].sum(), "centre": centre[0], "inertia": written(about(centre[0], first))},
        {
            "weight": masses[second].sum() * 9.80665,
            "centre": centre[1],
            "inertia": written(about(corner, second)),
            "inertia_about": corner,
        },
    ]
    made = mass_properties(mdof.Model(**{**SPACE, "bodies": {"m": {"made_of": parts}}}).bodies["m"])
    whole = masses @ points / masses.sum()
    assert made.mass == pytest.approx(masses.sum(), rel=1e-14)
    assert made.centre == pytest.approx(tuple(whole), rel=1e-12)
    assert made.inertia == pytest.approx(about(whole, slice(None)), rel=1e-12, abs=1e-12)


def test_contents_weigh_what_is_in_them() -> None:
    """Breaks if a tank's fill is ignored."""
    part = {"contents": {"volume": "0.4 m^3", "density": "840 kg/m^3", "fill": "25 %"}, "centre": [0, 0, 0]}
    model = mdof.Model(
        units="SI", directions=["x"], bodies={"tank": {"made_of": [part, {"mass": 130, "centre": [0, 0, 0]}]}}
    )
    assert mass_properties(model.bodies["tank"]).mass == 214.0


def test_a_partial_inertia_serves_a_body_in_a_plane() -> None:
    """Breaks if a planar model must invent inertias it has no use for."""
    assert (
        faults({"units": "SI", "directions": ["x", "y", "rz"], "bodies": {"m": {"mass": 1, "inertia": {"zz": 3}}}})
        == []
    )
    assert faults({"units": "SI", "directions": ["x", "y", "rz"], "bodies": {"m": {"mass": 1, "inertia": 3}}}) == []


def test_what_is_known_about_a_number_is_kept() -> None:
    """Breaks if tolerance, source or status is lost on the way to the archive."""
    stiffness = {"value": "9 kN/mm", "tolerance": "10 %", "source": "bolt preload unknown", "status": "assumed"}
    model = mdof.Model(bodies={"m": "10 kg"}, connections={"s": {"between": ["m", "ground"], "stiffness": stiffness}})
    value = model.connections["s"].stiffness
    assert (float(value), value.text, value.tolerance, value.source, value.status) == (
        9e6,
        "9 kN/mm",
        0.1,
        "bolt preload unknown",
        "assumed",
    )
    assert model.to_si()["connections"]["s"]["stiffness"] == {
        "x": {"value": 9e6, "tolerance": 0.1, "source": "bolt preload unknown", "status": "assumed"}
    }


def test_property_sets_and_points_are_written_out() -> None:
    """Breaks if a connection loses the set's values, an override, or a point."""
    model = mdof.Model(
        units="SI",
        directions=["x", "y"],
        bodies={"m": 1},
        property_sets={"r": {"stiffness": {"x": 1, "y": 2}, "loss_factor": 0.1}},
        connections={
            "s": {
                "between": ["m", "ground"],
                "uses": "r",
                "at": {"p": [1, 0, 0], "q": [2, 0, 0]},
                "stiffness": {"y": 5},
            }
        },
    )
    connections = model.to_si()["connections"]
    assert list(connections) == ["s/p", "s/q"]
    assert connections["s/q"] == {
        "between": ["m", "ground"],
        "kind": "spring",
        "at": [2.0, 0.0, 0.0],
        "stiffness": {"x": 1.0, "y": 5.0},
        "loss_factor": 0.1,
    }


def test_digest_follows_the_numbers_and_not_the_spelling() -> None:
    """Breaks if unit twins or another order of keys change the digest, or a changed number does not."""
    one = mdof.Model(
        title="t",
        bodies={"a": "1 t", "b": "2 kg"},
        connections={"s": {"between": ["a", "b"], "stiffness": "86.4 kN/m"}},
    )
    two = mdof.Model(
        units={"stiffness": "N/mm"},
        connections={"s": {"stiffness": 86.4, "between": ["a", "b"]}},
        bodies={"b": "2000 g", "a": "1000 kg"},
        title="t",
    )
    other = mdof.Model(
        title="t",
        bodies={"a": "1 t", "b": "2 kg"},
        connections={"s": {"between": ["a", "b"], "stiffness": "86.5 kN/m"}},
    )
    assert re.fullmatch("sha256:[0-9a-f]{64}", one.digest)
    assert one.digest == two.digest
    assert one.digest != other.digest
    assert json.loads(json.dumps(one.to_si(), allow_nan=False)) == one.to_si()


def test_a_model_cannot_be_changed_and_does_not_hold_the_callers_mapping() -> None:
    """Breaks if a caller can change a model behind its digest."""
    bodies = {"m": {"mass": 1.0, "centre": np.array([1.0, 2.0, 3.0])}}
    given = copy.deepcopy(bodies)
    model = mdof.Model(units="SI", bodies=bodies)
    digest = model.digest
    bodies["m"]["mass"] = 5.0
    assert model.with_state(None).digest == digest
    assert given["m"]["mass"] == 1.0
    with pytest.raises(AttributeError):
        model.title = "x"
    with pytest.raises(TypeError):
        model.bodies["n"] = 3
    model.to_si()["bodies"].clear()
    assert model.digest == digest


@pytest.mark.parametrize("path", MODELS, ids=lambda path: path.stem)
def test_every_model_of_the_repository_loads_pickles_and_fits_the_editor_schema(path: Path) -> None:
    """Breaks if the grammar and its JSON Schema drift apart, or a shipped model is wrong."""
    import jsonschema

    model = mdof.load(path)
    document = parse(path.read_text(encoding="utf-8"))
    validator = jsonschema.Draft202012Validator(mdof.Model.json_schema())
    assert [error.message for error in validator.iter_errors(document.data)] == []
    again = pickle.loads(pickle.dumps(model))
    assert (again.digest, again.file, again.state_names) == (model.digest, model.file, model.state_names)


def test_the_editor_schema_has_a_text_on_every_field_and_refuses_what_the_reader_refuses() -> None:
    """Breaks if an editor shows a key without a word about it."""
    import jsonschema

    schema = mdof.Model.json_schema()
    jsonschema.Draft202012Validator.check_schema(schema)
    mute = []
    stack: list[tuple[str, Any]] = [("", schema)]
    while stack:
        path, node = stack.pop()
        if isinstance(node, dict):
            if isinstance(node.get("properties"), dict):
                mute += [f"{path}/{name}" for name, entry in node["properties"].items() if not entry.get("description")]
            stack += [(f"{path}/{key}", entry) for key, entry in node.items()]
        elif isinstance(node, list):
            stack += [(f"{path}/{index}", entry) for index, entry in enumerate(node)]
    assert mute == []
    validator = jsonschema.Draft202012Validator(schema)
    for wrong in (
        {"bodies": {"m": {"mas": 3}}},
        {"bodies": {"a.b": 3}},
        {"bodis": {}},
        {"bodies": {"m": 3}, "reference_frequency": 12},
    ):
        assert not validator.is_valid(wrong), wrong


def test_quantities_may_be_numbers_texts_or_mappings_for_an_editor() -> None:
    """Breaks if one of the three forms of a value is flagged in the editor."""
    import jsonschema

    validator = jsonschema.Draft202012Validator(mdof.Model.json_schema())
    for mass in (3, "3 kg", {"value": "3 kg", "tolerance": "8 %", "source": "x", "status": "measured"}):
        assert validator.is_valid({"bodies": {"m": {"mass": mass}}})
        assert validator.is_valid({"bodies": {"m": mass}})


def test_locate_places_a_later_problem_in_the_file(tmp_path: Path) -> None:
    """Breaks if a check after reading cannot point at the line."""
    path = tmp_path / "m.yaml"
    path.write_text(
        "units: SI\nbodies: {m: 10}\nconnections:\n  s:\n    between: [m, ground]\n    at:\n      p: [0, 0, 0]\n "
        "   stiffness: 5\nstates:\n  heavy: {bodies: {m: {mass: 20}}}\n"
    )
    model = mdof.load(path)
    assert str(model.locate("connections.s/p", "is odd", "change it")).startswith(
        f"{path}:7:10: connections.s/p: is odd; change it"
    )
    assert model.locate("connections.s/p.stiffness", "is odd").line == 8
    assert model.with_state("heavy").locate("bodies.m.mass", "is odd").line == 10
    assert model.with_state("heavy").locate("connections.s.stiffness", "is odd").line == 8
    assert str(mdof.Model(bodies={"m": "1 kg"}).locate("bodies.m", "is odd")) == "bodies.m: is odd"
