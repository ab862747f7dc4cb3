"""Machines that float: their rigid-body motions are exact, and the rest does not know about the ground."""

from __future__ import annotations

from itertools import pairwise

import networkx as nx
import numpy as np
import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st
from machines import SIX, add, connect, empty_graph, random_inertia, rates

import mdof
from mdof import Regime

seeds = st.integers(0, 10**6)


def floating(seed: int, damped: bool = True) -> nx.MultiGraph:
    """Two to four bodies in a row, joined firmly, with some more connections, and no ground."""
    rng = np.random.default_rng(seed)
    graph = empty_graph(directions=SIX, damping={}, reference_frequency=60.0)
    names = [f"body {index}" for index in range(int(rng.integers(2, 5)))]
    for name in names:
        mass = float(10 ** rng.uniform(1, 3))
        graph.add_node(name, mass=mass, centre=rng.uniform(-1.5, 1.5, 3), inertia=random_inertia(rng, mass))
    for a, b in pairwise(names):
        data = {"stiffness": rates(rng, SIX, 1e6)}
        if damped:
            data |= {"damping": rates(rng, SIX, 1e3), "loss_factor": 0.05}
        add(graph, f"joint {a} {b}", a, b, at=rng.uniform(-1, 1, 3), **data)
    if damped:
        connect(graph, rng, "extra", names[0], names[-1], ("ends", "frame", "branch", "beam")[seed % 4])
    return graph


@given(seed=seeds)
@example(seed=77)  # damping all but vanishes on the free motions
@settings(max_examples=30, deadline=None)
def test_six_rigid_body_motions(seed: int) -> None:
    """Twelve zero roots, exactly zero, in six modes whose shapes strain nothing; every other mode is elastic."""
    system = mdof.assemble(floating(seed))
    modes = mdof.solve(system)
    free = [mode for mode in modes if mode.regime is Regime.RIGID_BODY]
    assert len(free) == 6
    assert all(mode.eigenvalues == (0, 0) for mode in free)
    assert [mode.number for mode in free] == [1, 2, 3, 4, 5, 6]
    shapes = np.array([mode.reduced_shape for mode in free]).T
    assert np.linalg.matrix_rank(shapes, tol=1e-6) == 6
    strain = system.spring_columns.T @ shapes
    assert np.abs(strain).max() < 1e-11
    rest = [mode for mode in modes if mode.regime is not Regime.RIGID_BODY]
    assert all(mode.decay_rate > 0 for mode in rest)
    found = next(finding for finding in modes.findings if finding.code == "free-motion")
    assert set(found.modes) == {1, 2, 3, 4, 5, 6}


@given(seed=seeds)
@settings(max_examples=20, deadline=None)
def test_drag_on_a_floating_machine_gives_rates_and_no_ratios(seed: int) -> None:
    """Mass-proportional drag alone: each free motion has the roots 0 and -α, each elastic one the ratio α/(2ω)."""
    graph = floating(seed, damped=False)
    graph.graph["damping"] = {"mass_proportional": 0.7}
    modes = mdof.solve(mdof.assemble(graph))
    for mode in modes[:6]:
        assert mode.regime is Regime.RIGID_BODY
        assert mode.damping_ratio is None
        assert sorted(root.real for root in mode.eigenvalues) == pytest.approx([-0.7, 0], rel=1e-9, abs=0)
    for mode in modes[6:]:
        assert mode.damping_ratio == pytest.approx(0.35 / mode.natural_frequency, rel=1e-9)


@given(seed=seeds)
@example(seed=213)
@settings(max_examples=20, deadline=None)
def test_moving_the_machine_changes_no_root(seed: int) -> None:
    """The whole machine carried elsewhere and turned: the elastic modes stay as they are."""
    graph = floating(seed)
    rng = np.random.default_rng(seed + 7)
    turn, _ = np.linalg.qr(rng.normal(size=(3, 3)))
    turn *= np.sign(np.linalg.det(turn))
    shift = rng.uniform(-3, 3, 3)
    moved = empty_graph(directions=SIX, damping={}, reference_frequency=60.0)
    for name, data in graph.nodes(data=True):
        if name != "ground":
            moved.add_node(
                name, mass=data["mass"], centre=turn @ data["centre"] + shift, inertia=turn @ data["inertia"] @ turn.T
            )
    for _, _, key, data in graph.edges(keys=True, data=True):
        new = dict(data)
        if "at" in new:
            new["at"] = turn @ new["at"] + shift
        if "ends" in new:
            new["ends"] = tuple(turn @ end + shift for end in new["ends"])
        if "beam" in new:
            new["beam"] = {**new["beam"], "towards": turn @ new["beam"]["towards"]}
        elif "ends" not in new:
            new["axes"] = np.asarray(new.get("axes", np.eye(3))) @ turn.T
        a, b = new["between"]
        moved.add_edge(a, b, key=key, **new)
    ours, theirs = (mdof.solve(mdof.assemble(each)) for each in (graph, moved))
    assert ours.regimes == theirs.regimes
    np.testing.assert_allclose(theirs.eigenvalues, ours.eigenvalues, rtol=1e-8, atol=0)


@given(seed=seeds)
@settings(max_examples=20, deadline=None)
def test_massless_joint_in_space_adds_no_mode(seed: int) -> None:
    """A joint without mass between two six-rate springs at one point: the springs in series, and no new root."""
    rng = np.random.default_rng(seed)
    at = rng.uniform(-1, 1, 3)
    first, second = rates(rng, SIX, 1e6), rates(rng, SIX, 1e6)

    def with_joint(joint: bool) -> mdof.DampedModes:
        graph = empty_graph(directions=SIX, damping={})
        graph.add_node("m", mass=80.0, centre=np.array([0.1, 0.2, 0.3]), inertia=np.diag([4.0, 5.0, 6.0]))
        if joint:
            graph.add_node("joint", mass=0.0, massless=True, centre=at)
            add(graph, "upper", "m", "joint", at=at, stiffness=first)
            add(graph, "lower", "joint", "ground", at=at, stiffness=second)
        else:
            series = {way: first[way] * second[way] / (first[way] + second[way]) for way in SIX}
            add(graph, "both", "m", "ground", at=at, stiffness=series)
        add(graph, "damper", "m", "ground", damping={"x": 300.0, "rz": 40.0})
        return mdof.solve(mdof.assemble(graph))

    ours, plain = with_joint(True), with_joint(False)
    assert len(ours) == len(plain) == 6
    assert ours.verification.eigenvalues_found == 12
    np.testing.assert_allclose(ours.eigenvalues, plain.eigenvalues, rtol=1e-9)
    np.testing.assert_allclose(
        np.abs(ours.shapes[:6]), np.abs(plain.shapes) * np.abs(ours.shapes[:6]).max(axis=0), atol=1e-6
    )
