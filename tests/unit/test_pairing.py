"""mdof.modes.pairing: which real roots belong to one oscillator."""

from __future__ import annotations

import numpy as np
import pytest

import mdof
from mdof import Regime


def solve(M: object, C: object, K: object) -> mdof.DampedModes:
    return mdof.solve(mdof.System.from_matrices(M, C, K))


def test_interlaced_real_roots_of_two_oscillators_keep_their_partners() -> None:
    """(m, c, k) = (1, 10, 1) and (1, 5, 4): sorting and taking neighbours would be wrong."""
    modes = solve(np.eye(2), np.diag([10.0, 5.0]), np.diag([1.0, 4.0]))
    assert [mode.regime for mode in modes] == [Regime.OVERDAMPED] * 2
    assert modes.natural_frequencies == pytest.approx([1.0, 2.0], rel=1e-13)
    assert modes.damping_ratios == pytest.approx([5.0, 1.25], rel=1e-13)


def test_interlaced_real_roots_of_coupled_oscillators_keep_their_partners() -> None:
    """The same two, turned and lightly coupled, so that shapes must tell."""
    turn = np.array([[0.8, -0.6], [0.6, 0.8]])
    C = turn @ (np.diag([10.0, 5.0]) + 0.01 * np.ones((2, 2))) @ turn.T
    modes = solve(np.eye(2), C, turn @ np.diag([1.0, 4.0]) @ turn.T)
    assert modes.natural_frequencies == pytest.approx([1.0, 2.0], rel=1e-2)
    assert modes.damping_ratios == pytest.approx([5.0, 1.25], rel=1e-2)


def test_leftover_roots_of_unlike_shape_are_not_forced_together() -> None:
    """Inman & Andry's example: −0.476 and −10.71 belong to different oscillators."""
    modes = solve(np.eye(2), [[2.5, 1.3], [1.3, 12.0]], np.diag([1.0, 16.0]))
    singles = [mode for mode in modes if len(mode.eigenvalues) == 1]
    assert sorted(mode.eigenvalues[0].real for mode in singles) == pytest.approx([-10.71, -0.476], rel=2e-3)
    assert {mode.regime for mode in singles} == {Regime.OVERDAMPED}
    assert all(mode.damping_ratio is None for mode in singles)
    assert "partner-unresolved" in {finding.code for finding in modes.findings}


def test_there_is_no_relaxation_without_a_first_order_state() -> None:
    rng = np.random.default_rng(3)
    for _ in range(20):
        factor = rng.normal(size=(3, 3))
        modes = solve(np.eye(3), 4 * factor @ factor.T, np.diag([1.0, 2.0, 3.0]))
        assert Regime.RELAXATION not in modes.regimes


def test_as_many_relaxation_roots_as_first_order_states() -> None:
    """A damped massless coordinate: 2·2 + 1 roots, one of them without partner."""
    modes = solve(
        np.diag([1.0, 1.0, 0.0]),
        np.diag([0.0, 0.0, 3.0]),
        [[5.0, -2.0, 0.0], [-2.0, 5.0, -3.0], [0.0, -3.0, 3.0]],
    )
    assert modes.regimes.count(Regime.RELAXATION) == 1
    assert modes.verification.eigenvalues_found == 5


def test_free_motions_that_a_damper_slows_find_their_own_decay() -> None:
    """Two bodies coasting, each with its own drag: (0, −c/m) twice."""
    modes = solve(np.diag([2.0, 5.0]), np.diag([1.0, 4.0]), np.zeros((2, 2)))
    assert modes.regimes == (Regime.RIGID_BODY,) * 2
    assert sorted(mode.decay_rate for mode in modes) == pytest.approx([0.5, 0.8], rel=1e-14)
    for mode in modes:
        # The zero root moves the same body as the decay it is paired with.
        assert mode.fast_shape is not None
        assert np.argmax(np.abs(mode.shape)) == np.argmax(np.abs(mode.fast_shape))
