"""Connection kinds against formulas every handbook has.

Blevins R.D., Formulas for Natural Frequency and Mode Shape (1979); Den Hartog J.P., Mechanical Vibrations; Rao S.S.,
Mechanical Vibrations (formulas from memory, places not checked; data chosen here).
"""

from __future__ import annotations

import math

import networkx as nx
import numpy as np
import pytest

import mdof

SIX = ("x", "y", "z", "rx", "ry", "rz")
STEEL = {"youngs_modulus": 2.1e11, "shear_modulus": 8.1e10}
SECTION = {"area": 3e-4, "second_moments": (2.5e-9, 2.25e-8), "torsion_constant": 8e-9}


def graph_of(directions: tuple[str, ...], **settings: object) -> nx.MultiGraph:
    graph = nx.MultiGraph(title="closed form", directions=directions, damping={}, **settings)
    graph.add_node("ground", kind="ground", centre=np.zeros(3))
    return graph


def join(graph: nx.MultiGraph, name: str, a: str, b: str, **data: object) -> None:
    graph.add_edge(a, b, key=name, between=(a, b), **data)


def frequencies(graph: nx.MultiGraph) -> np.ndarray:
    return mdof.solve(mdof.assemble(graph)).natural_frequencies


def cantilever(
    directions: tuple[str, ...], mass: float, inertia: float, length: float, **beam: object
) -> nx.MultiGraph:
    """Beam along x, clamped at the origin, with a body at its tip."""
    graph = graph_of(directions)
    tip = np.array([length, 0.0, 0.0])
    graph.add_node("tip", mass=mass, centre=tip, inertia=inertia * np.eye(3))
    data = {**STEEL, **SECTION, "towards": np.array([0.0, 1.0, 0.0]), **beam}
    join(graph, "beam", "ground", "tip", kind="beam", ends=(np.zeros(3), tip), beam=data)
    return graph


@pytest.mark.parametrize(("direction", "about"), [("y", 1), ("z", 0)])
@pytest.mark.parametrize("shear_area", [None, 2.5e-4])
def test_mass_on_a_cantilever(direction: str, about: int, shear_area: float | None) -> None:
    """Free tip: k = 1/(L³/3EI + L/GA_s), with the second moment about the axis square to the motion."""
    m, L = 12.0, 0.8
    turning = {"y": "rz", "z": "ry"}[direction]
    areas = {} if shear_area is None else {"shear_areas": (shear_area, shear_area)}
    graph = cantilever((direction, turning), m, 1e-9, L, **areas)
    EI = STEEL["youngs_modulus"] * SECTION["second_moments"][about]
    give = L**3 / (3 * EI) + (0 if shear_area is None else L / (STEEL["shear_modulus"] * shear_area))
    # The tip's own inertia is made so small that the second mode lies far above.
    assert frequencies(graph)[0] == pytest.approx(math.sqrt(1 / give / m), rel=1e-8)
    # With the tip kept from turning the beam is stiffer.
    clamped = L**3 / (12 * EI) + (0 if shear_area is None else L / (STEEL["shear_modulus"] * shear_area))
    guided = cantilever((direction,), m, 1e-9, L, **areas)
    assert frequencies(guided)[0] == pytest.approx(math.sqrt(1 / clamped / m), rel=1e-12)


@pytest.mark.parametrize(("direction", "stiffness"), [("x", 2.1e11 * 3e-4 / 0.8), ("rx", 8.1e10 * 8e-9 / 0.8)])
def test_beam_in_tension_and_torsion(direction: str, stiffness: float) -> None:
    graph = cantilever((direction,), 12.0, 0.3, 0.8)
    inertia = 12.0 if direction == "x" else 0.3
    assert frequencies(graph)[0] == pytest.approx(math.sqrt(stiffness / inertia), rel=1e-13)


def test_two_point_spring_acts_along_its_line_only() -> None:
    """A mass hung in the plane on two springs at ±60°: k_x = 2 k cos², k_y = 2 k sin²."""
    graph = graph_of(("x", "y"))
    graph.add_node("m", mass=2.0)
    for name, sign in (("left", -1), ("right", 1)):
        foot = np.array([math.cos(math.pi / 3), sign * math.sin(math.pi / 3), 0.0])
        join(graph, name, "m", "ground", ends=(np.zeros(3), foot), stiffness=800.0)
    assert frequencies(graph) == pytest.approx(
        [math.sqrt(2 * 800 * 0.25 / 2), math.sqrt(2 * 800 * 0.75 / 2)], rel=1e-13
    )


def test_inertance_adds_to_the_mass_without_weight() -> None:
    graph = graph_of(("x",))
    graph.add_node("m", mass=3.0)
    join(graph, "strut", "m", "ground", stiffness=4000.0, damping=20.0, inertance=7.0)
    mode = mdof.solve(mdof.assemble(graph))[0]
    assert mode.natural_frequency == pytest.approx(20.0, rel=1e-14)
    assert mode.damping_ratio == pytest.approx(20 / (2 * 10 * 20), rel=1e-14)


def test_rigid_rider_follows_the_parallel_axis_rule() -> None:
    """A motor bolted to a plate that may only turn: J = J1 + J2 + m2 d²."""
    graph = graph_of(SIX)
    graph.add_node("plate", mass=10.0, inertia=np.diag([1.0, 2.0, 3.0]), directions=("rz",))
    graph.add_node(
        "motor", mass=5.0, inertia=np.diag([0.1, 0.1, 0.2]), centre=np.array([0.3, 0.4, 0.9]), directions=("rz",)
    )
    join(graph, "bolts", "plate", "motor", kind="rigid")
    join(graph, "spring", "plate", "ground", stiffness={"rz": 900.0})
    system = mdof.assemble(graph)
    assert mdof.solve(system).natural_frequencies == pytest.approx([math.sqrt(900 / (3.0 + 0.2 + 5 * 0.25))], rel=1e-13)


@pytest.mark.parametrize("gear", [{"ratio": 2.5}, {"radii": (0.25, 0.1)}])
def test_rigid_gear_refers_inertia_by_the_square_of_the_ratio(gear: dict) -> None:
    """J1 + n² J2 on the first shaft's spring; the second shaft runs n times as fast."""
    graph = graph_of(("rx",))
    graph.add_node("slow", inertia=4.0 * np.eye(3))
    graph.add_node("fast", inertia=0.6 * np.eye(3))
    join(graph, "shaft", "slow", "ground", stiffness=5000.0)
    join(graph, "teeth", "slow", "fast", kind="gear", gear=gear)
    modes = mdof.solve(mdof.assemble(graph))
    assert modes.natural_frequencies == pytest.approx([math.sqrt(5000 / (4 + 2.5**2 * 0.6))], rel=1e-13)
    assert modes[0].shape.real == pytest.approx([0.4, 1.0], rel=1e-13)


def test_one_ratio_for_all_modes() -> None:
    """`mode_ratios` gives every undamped mode of what has no damping of its own the same ratio."""
    graph = graph_of(SIX)
    graph.graph["damping"] = {"mode_ratios": 0.02}
    graph.add_node("m", mass=40.0, inertia=np.diag([2.0, 3.0, 4.0]), centre=np.array([0.1, -0.2, 0.3]))
    join(
        graph,
        "mount",
        "m",
        "ground",
        at=np.zeros(3),
        stiffness={way: 1e5 * (1 + index) for index, way in enumerate(SIX)},
    )
    modes = mdof.solve(mdof.assemble(graph))
    assert len(modes) == 6
    assert modes.damping_ratios == pytest.approx([0.02] * 6, rel=1e-11)
    assert "non-proportional-damping" not in {finding.code for finding in modes.findings}


def test_tilted_mount_couples_what_its_axes_say() -> None:
    """A mount turned by 30° moves no frequency; it turns the directions of the motion."""
    angle = math.radians(30)
    c, s = math.cos(angle), math.sin(angle)
    graph = graph_of(("x", "y"))
    graph.add_node("m", mass=1.0)
    join(
        graph,
        "mount",
        "m",
        "ground",
        axes=np.array([[c, s, 0], [-s, c, 0], [0, 0, 1]]),
        stiffness={"x": 100.0, "y": 400.0},
    )
    modes = mdof.solve(mdof.assemble(graph))
    assert modes.natural_frequencies == pytest.approx([10, 20], rel=1e-13)
    soft = modes[0].shape.real
    assert soft[1] / soft[0] == pytest.approx(math.tan(angle), rel=1e-12)
