"""Assembly against an independent oracle: second differences of energies of really rotated bodies (see oracle.py)."""

from __future__ import annotations

import networkx as nx
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from machines import SIX, add, connect, empty_graph, random_inertia, random_machine
from oracle import Oracle

import mdof

#: Relative to sqrt(D_ii D_jj), so that stiff directions do not hide errors in soft ones.
TOLERANCE = 1e-7


def scaled_difference(ours: np.ndarray, theirs: np.ndarray, scale: np.ndarray | None = None) -> float:
    """Largest |difference| with rows and columns scaled by the diagonal of ``scale``, or of ``theirs``."""
    size = np.sqrt(np.abs(np.diag(theirs if scale is None else scale)))
    size = np.maximum(size, 1e-4 * size.max(initial=0.0)) + (0.0 if size.any() else 1.0)
    return float(np.max(np.abs(ours - theirs) / np.outer(size, size), initial=0.0))


def condensed(system: mdof.System, s: complex) -> np.ndarray:
    """s²M + sC + K of a system with its first-order states eliminated."""
    full = s * s * system.M.toarray() + s * system.C.toarray() + system.K.toarray()
    n = system.degrees_of_freedom
    if n == system.size:
        return full
    return full[:n, :n] - full[:n, n:] @ np.linalg.solve(full[n:, n:], full[n:, :n])


def compare(graph: nx.MultiGraph) -> Oracle:
    """Assert that ``mdof.assemble(graph)`` and the oracle tell the same machine."""
    oracle = Oracle(graph)
    system = mdof.assemble(graph)
    names = [f"{body}.{way}" for body, way in oracle.coordinates]
    assert list(system.labels) == names
    assert system.first_order_states == len(oracle.inner)
    recovery = system.recovery.toarray()[:, : system.degrees_of_freedom]
    assert np.linalg.matrix_rank(recovery) == system.degrees_of_freedom
    assert oracle.constraint_violation(recovery) < TOLERANCE
    if not oracle.inner:
        back = [recovery.T @ part @ recovery for part in (oracle.mass, oracle.damping, oracle.stiffness)]
        gyroscopic = recovery.T @ oracle.gyroscopic @ recovery
        assert scaled_difference(system.M.toarray(), back[0]) < TOLERANCE
        assert scaled_difference(system.K.toarray(), back[2]) < TOLERANCE
        ours = system.C.toarray()
        assert scaled_difference((ours + ours.T) / 2, back[1]) < TOLERANCE
        np.testing.assert_allclose(
            (ours - ours.T) / 2, gyroscopic, rtol=0, atol=TOLERANCE * max(1.0, np.abs(ours).max())
        )
    # At low, middling and high rates, decaying, growing and oscillating: no part of M, C, K can hide.
    for s in (1e-2, 30.0, 1e5, 40j, -3.0 + 25j):
        scale = oracle.dynamic_stiffness(abs(s), recovery)  # at real s > 0 nothing cancels on the diagonal
        assert scaled_difference(condensed(system, s), oracle.dynamic_stiffness(s, recovery), scale) < TOLERANCE, s
    return oracle


@pytest.mark.parametrize("kind", ["point", "frame", "ends", "axis", "branch", "beam"])
@pytest.mark.parametrize("held", ["to ground", "between bodies", "ground first"])
def test_one_connection_of_each_kind(kind: str, held: str) -> None:
    rng = np.random.default_rng(len(kind) + 10 * len(held))
    graph = empty_graph(directions=SIX, damping={}, reference_frequency=80.0)
    for name in ("frame", "engine"):
        graph.add_node(name, mass=200.0, centre=rng.uniform(-1, 1, 3), inertia=random_inertia(rng, 200.0))
    a, b = {
        "to ground": ("engine", "ground"),
        "between bodies": ("engine", "frame"),
        "ground first": ("ground", "engine"),
    }[held]
    connect(graph, rng, "link", a, b, kind)
    compare(graph)


@given(seed=st.integers(0, 10**6))
@settings(max_examples=60, deadline=None)
def test_random_machines(seed: int) -> None:
    compare(random_machine(seed, kinds=("point", "frame", "ends", "axis", "branch", "beam")))


@given(seed=st.integers(0, 10**6))
@settings(max_examples=40, deadline=None)
def test_rigid_riders_move_with_their_host(seed: int) -> None:
    """A rider on a rider: masses, springs and beams of both end up on the host, levers and all."""
    rng = np.random.default_rng(seed)
    graph = random_machine(seed, kinds=("point", "ends", "branch"))
    for body in list(graph):
        graph.nodes[body].pop("directions", None)
    for host, rider in (("body 0", "motor"), ("motor", "terminal box"), ("body 1", "gearbox")):
        graph.add_node(rider, mass=40.0, centre=rng.uniform(-1.5, 1.5, 3), inertia=random_inertia(rng, 40.0))
        add(graph, f"bolts of {rider}", host, rider, kind="rigid")
    connect(graph, rng, "on rider", "terminal box", "ground", "frame")
    connect(graph, rng, "between riders", "gearbox", "motor", "beam")
    connect(graph, rng, "inside one rigid body", "motor", "body 0", "point")
    compare(graph)


def test_spin_gives_the_gyroscopic_moment() -> None:
    rng = np.random.default_rng(4)
    graph = empty_graph(directions=SIX, damping={})
    axis = np.array([1.0, 2.0, -0.5])
    graph.add_node(
        "rotor", mass=90.0, inertia=random_inertia(rng, 90.0), spin={"axis": axis, "speed": 310.0, "polar_inertia": 2.1}
    )
    connect(graph, rng, "bearing", "rotor", "ground", "point")
    oracle = compare(graph)
    assert np.abs(oracle.gyroscopic).max() > 100


@pytest.mark.parametrize("gear", [{"radii": (0.336, 0.105)}, {"ratio": 3.2}])
@pytest.mark.parametrize("mesh", [{}, {"stiffness": 6e8, "damping": 4e3}])
def test_gears(gear: dict, mesh: dict) -> None:
    graph = empty_graph(directions=("rx",), damping={})
    for name, inertia in (("motor", 9.6), ("wheel", 4.2), ("pinion", 0.16), ("fan", 1.9)):
        graph.add_node(name, mass=0.0, inertia=inertia * np.eye(3))
    add(graph, "coupling", "motor", "wheel", stiffness=2.4e5, damping=40.0)
    add(graph, "teeth", "wheel", "pinion", kind="gear", gear=gear, **mesh)
    add(graph, "shaft", "pinion", "fan", stiffness={"rx": 1.35e5})
    add(graph, "drag", "fan", "ground", damping=0.25)
    compare(graph)


def test_ground_that_is_first_or_named_keeps_its_columns_grounded() -> None:
    graph = empty_graph(directions=("x",), damping={})
    graph.add_node("deck", kind="ground", centre=np.zeros(3))
    graph.add_node("m", mass=3.0)
    add(graph, "a", "m", "deck", stiffness=5.0, damping=1.0)
    add(graph, "b", "ground", "m", stiffness=7.0)
    system = mdof.assemble(graph)
    assert system.K.toarray() == pytest.approx(np.array([[12.0]]), rel=1e-15)
    assert system.spring_grounded.all()
    assert system.damper_grounded.all()


@given(seed=st.integers(0, 10**6))
@settings(max_examples=60, deadline=None)
def test_internal_columns_vanish_on_rigid_motion(seed: int) -> None:
    """Moving the whole machine as one rigid body strains no connection between bodies."""
    graph = random_machine(seed, kinds=("point", "frame", "ends", "axis", "branch", "beam"))
    for body in list(graph):
        graph.nodes[body].pop("directions", None)
    system = mdof.assemble(graph)
    motions = np.zeros((len(system.labels), 6))
    for row, label in enumerate(system.labels):
        body, way = label.rsplit(".", 1)
        centre = np.asarray(graph.nodes[body]["centre"])
        place = SIX.index(way)
        if place < 3:
            motions[row, place] = 1.0
            motions[row, 3:] = np.cross(np.eye(3), centre)[:, place]
        else:
            motions[row, place] = 1.0
    reduced = np.linalg.lstsq(system.recovery.toarray(), motions, rcond=None)[0]
    np.testing.assert_allclose(system.recovery @ reduced, motions, atol=1e-12)
    for columns, grounded in (
        (system.spring_columns, system.spring_grounded),
        (system.damper_columns, system.damper_grounded),
    ):
        inside = columns.toarray()[:, ~grounded]
        assert np.abs(inside.T @ reduced).max(initial=0.0) < 1e-13
