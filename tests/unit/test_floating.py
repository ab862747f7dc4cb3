"""mdof.eigen.floating: loss factors matched at each mode's own frequency."""

from __future__ import annotations

import networkx as nx
import numpy as np
import pytest

import mdof


def two_rubbers(first: float, second: float) -> mdof.System:
    graph = nx.MultiGraph(directions=("x",), damping={})
    graph.add_node("ground", kind="ground")
    graph.add_node("a", mass=2.0)
    graph.add_node("b", mass=1.0)
    graph.add_edge("a", "ground", key="s", between=("a", "ground"), stiffness=100.0, loss_factor=first)
    graph.add_edge("b", "a", key="t", between=("b", "a"), stiffness=400.0, loss_factor=second)
    return mdof.assemble(graph)


@pytest.mark.parametrize("loss", [1e-3, 0.1, 0.8])
def test_equal_loss_factors_give_half_of_it_as_ratio(loss: float) -> None:
    """c = ηk/ω at ω = |λ| makes ζ = η/2 exactly, whatever the mode."""
    assert mdof.solve(two_rubbers(loss, loss)).damping_ratios == pytest.approx([loss / 2] * 2, rel=1e-12)


def test_unlike_loss_factors_are_consistent_with_their_own_frequency() -> None:
    """Every root solves the determinant with its own |λ| as reference."""
    modes = mdof.solve(two_rubbers(0.3, 0.05))
    for mode in modes:
        value = mode.eigenvalues[0]

        def stiffness(k: float, eta: float, value: complex = value) -> complex:
            return k * (1 + value * eta / abs(value))

        s, t = stiffness(100.0, 0.3), stiffness(400.0, 0.05)
        matrix = np.array([[2 * value**2 + s + t, -t], [-t, value**2 + t]])
        assert abs(np.linalg.det(matrix)) < 1e-10 * abs(matrix).max() ** 2
        assert mode.damping_reference == pytest.approx(abs(value), rel=1e-12)


def test_a_dashpot_beside_a_loss_factor_adds_to_it() -> None:
    """m λ² + (c + ηk/ω) λ + k = 0 with |λ| = sqrt(k/m) = 3 for any damping below critical."""
    graph = nx.MultiGraph(directions=("x",), damping={})
    graph.add_node("ground", kind="ground")
    graph.add_node("a", mass=1.0)
    graph.add_edge("a", "ground", key="s", between=("a", "ground"), stiffness=9.0, loss_factor=0.2, damping=0.6)
    (mode,) = mdof.solve(mdof.assemble(graph))
    assert mode.damping_ratio == pytest.approx((0.6 + 0.2 * 9.0 / 3.0) / (2 * 3.0), rel=1e-12)


def test_the_result_says_which_reference_was_used() -> None:
    modes = mdof.solve(two_rubbers(0.1, 0.2))
    assert "own frequency" in modes.loss_reference
    assert "own frequency" in modes.method


def overdamped(eta: float, tie: float) -> mdof.System:
    """A mass on a strong dashpot tied to one on rubber: two real roots beside an oscillation."""
    graph = nx.MultiGraph(directions=("x",), damping={})
    graph.add_node("ground", kind="ground")
    graph.add_node("a", mass=1.0)
    graph.add_node("b", mass=1.0)
    graph.add_edge("a", "ground", key="s", between=("a", "ground"), stiffness=100.0, damping=30.0)
    graph.add_edge("b", "ground", key="t", between=("b", "ground"), stiffness=400.0, loss_factor=eta)
    graph.add_edge("b", "a", key="u", between=("b", "a"), stiffness=tie)
    return mdof.assemble(graph)


def assert_roots(system: mdof.System, modes: mdof.DampedModes) -> None:
    """Every root, the real ones too, solves the determinant with the reference that is stated for its mode."""
    for mode in modes:
        C = system.damping_matrix(mode.damping_reference).toarray()
        for value in mode.eigenvalues:
            Q = value**2 * system.M.toarray() + value * C + system.K.toarray()
            assert np.linalg.svd(Q, compute_uv=False)[-1] < 1e-10 * np.linalg.norm(Q)


@pytest.mark.parametrize("tie", [20.0, 50.0])
def test_both_roots_of_an_overdamped_mode_share_its_own_frequency_as_reference(tie: float) -> None:
    system = overdamped(0.4, tie)
    modes = mdof.solve(system)
    (real,) = (mode for mode in modes if mode.regime == "overdamped")
    assert real.damping_reference == pytest.approx(real.natural_frequency, rel=1e-12)
    assert real.eigenvalues[0] != real.eigenvalues[1]
    assert_roots(system, modes)


def test_without_any_oscillation_every_mode_still_has_its_own_reference() -> None:
    """Both masses overdamped; sqrt(λs λf) is the undamped ω of each, 10 and 40 rad/s."""
    graph = nx.MultiGraph(directions=("x",), damping={})
    graph.add_node("ground", kind="ground")
    for name, stiffness in (("a", 100.0), ("b", 1600.0)):
        graph.add_node(name, mass=1.0)
        graph.add_edge(
            name, "ground", key=name, between=(name, "ground"), stiffness=stiffness, damping=200.0, loss_factor=0.5
        )
    system = mdof.assemble(graph)
    modes = mdof.solve(system)
    assert [mode.damping_reference for mode in modes] == pytest.approx([10.0, 40.0], rel=1e-12)
    assert_roots(system, modes)


@pytest.mark.parametrize("ratio", [3.0, 20.0, 40.0])
def test_modes_far_apart_find_their_own_references(ratio: float) -> None:
    """Two masses on their own rubber, frequencies far apart: η/2 each, and their own reference."""
    graph = nx.MultiGraph(directions=("x",), damping={})
    graph.add_node("ground", kind="ground")
    for name, stiffness, eta in (("a", 4.0, 0.3), ("b", 4.0 * ratio**2, 0.1)):
        graph.add_node(name, mass=1.0)
        graph.add_edge(name, "ground", key=name, between=(name, "ground"), stiffness=stiffness, loss_factor=eta)
    modes = mdof.solve(mdof.assemble(graph))
    assert modes.damping_ratios == pytest.approx([0.15, 0.05], rel=1e-12)
    assert modes.damping_references == pytest.approx([2.0, 2.0 * ratio], rel=1e-12)


def test_a_loss_factor_just_short_of_two_is_just_short_of_critical() -> None:
    """ζ = η/2, and |λ| stays sqrt(k/m), to the very border."""
    graph = nx.MultiGraph(directions=("x",), damping={})
    graph.add_node("ground", kind="ground")
    graph.add_node("a", mass=1.0)
    graph.add_edge("a", "ground", key="s", between=("a", "ground"), stiffness=9.0, loss_factor=1.9)
    assert mdof.solve(mdof.assemble(graph)).damping_ratios == pytest.approx([0.95], rel=1e-12)


def test_close_modes_of_unlike_rubber_do_not_settle_on_one() -> None:
    """Two nearly equal masses on unlike rubber and a weak tie: two roots, each with its own reference."""
    graph = nx.MultiGraph(directions=("x",), damping={})
    graph.add_node("ground", kind="ground")
    for name, stiffness, eta in (("a", 100.0, 0.05), ("b", 100.5, 0.3)):
        graph.add_node(name, mass=1.0)
        graph.add_edge(name, "ground", key=name, between=(name, "ground"), stiffness=stiffness, loss_factor=eta)
    graph.add_edge("a", "b", key="t", between=("a", "b"), stiffness=0.5)
    system = mdof.assemble(graph)
    modes = mdof.solve(system)
    assert abs(modes.eigenvalues[0, 0] - modes.eigenvalues[1, 0]) > 0.1
    assert np.sort(modes.damping_ratios) == pytest.approx([0.025, 0.15], abs=2e-3)
    assert_roots(system, modes)


def beside_an_overdamped_mass(tie: float) -> mdof.System:
    """An overdamped mass (roots of λ² + 30λ + 100) beside one on a rubber spring without a reference frequency."""
    graph = nx.MultiGraph(directions=("x",), damping={})
    graph.add_node("ground", kind="ground")
    graph.add_node("a", mass=1.0)
    graph.add_node("b", mass=1.0)
    graph.add_edge("a", "ground", key="s", between=("a", "ground"), stiffness=100.0, damping=30.0)
    graph.add_edge("b", "ground", key="t", between=("b", "ground"), stiffness=400.0, loss_factor=0.1)
    if tie:
        graph.add_edge("b", "a", key="u", between=("b", "a"), stiffness=tie)
    return mdof.assemble(graph)


@pytest.mark.parametrize("tie", [0.0, 1e-6])
def test_an_overdamped_mode_beside_a_loss_factor_keeps_both_of_its_roots(tie: float) -> None:
    modes = mdof.solve(beside_an_overdamped_mass(tie))
    real = sorted(value.real for mode in modes for value in mode.eigenvalues if value.imag == 0)
    assert real == pytest.approx([-15 - np.sqrt(125), -15 + np.sqrt(125)], rel=1e-5)


@pytest.mark.parametrize(("ratio", "loss"), [(1000.0, 0.1), (50.0, 0.3), (10.0, 0.8)])
def test_the_reference_of_a_mode_is_found_from_any_distance(ratio: float, loss: float) -> None:
    graph = nx.MultiGraph(directions=("x",), damping={})
    graph.add_node("ground", kind="ground")
    for name, stiffness in (("a", 4.0), ("b", 4.0 * ratio**2)):
        graph.add_node(name, mass=1.0)
        graph.add_edge(name, "ground", key=name, between=(name, "ground"), stiffness=stiffness, loss_factor=loss)
    modes = mdof.solve(mdof.assemble(graph))
    assert modes.damping_ratios == pytest.approx([loss / 2, loss / 2], rel=1e-12)
    assert modes.natural_frequencies == pytest.approx([2.0, 2.0 * ratio], rel=1e-12)
