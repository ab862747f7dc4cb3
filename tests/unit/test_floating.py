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
