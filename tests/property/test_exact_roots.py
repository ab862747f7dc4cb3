"""Cases that verified answers have been wrong in, against roots of the exact determinant or closed forms."""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest
from exact import DIGITS, matrix, roots, weighted_gram
from scipy.sparse import csc_array

import mdof
from mdof import Regime, System, UnverifiedError


def factored(
    masses: list[float], springs: list[tuple[list[float], float]], dampers: list[tuple[list[float], float]]
) -> System:
    """A system from directions and values."""
    n = len(masses)
    columns = np.array([b for b, _ in springs], dtype=float).reshape(-1, n).T
    pushes = np.array([b for b, _ in dampers], dtype=float).reshape(-1, n).T
    return System.from_factors(np.diag(masses), columns, [k for _, k in springs], pushes, [c for _, c in dampers])


@pytest.mark.parametrize("stiff", [330.0, 1e4, 1e6, 1e9])
def test_a_free_motion_behind_a_massless_joint_stays_free(stiff: float) -> None:
    modes = mdof.solve(factored([1, 0, 2], [([1, -1, 0], 3.0), ([0, 1, -1], stiff)], []))
    series = 3 * stiff / (3 + stiff)
    assert modes.regimes == (Regime.RIGID_BODY, Regime.UNDAMPED)
    assert modes[1].natural_frequency == pytest.approx(np.sqrt(series * 1.5), rel=1e-13)
    assert "free-motion" in {finding.code for finding in modes.findings}


@pytest.mark.parametrize(
    "dampers",
    [[([1, 2], 1e8), ([1, 0], 1e-2)], [([1, 2], 1e10), ([2, -1.5], 1e-3)], [([1, 1], 1e6), ([1, -0.5], 1e-4)]],
)
def test_a_weak_damper_beside_a_strong_one_on_equal_frequencies(dampers: list[tuple[list[float], float]]) -> None:
    modes = mdof.solve(factored([1, 1], [([1, 0], 1.0), ([0, 1], 1.0)], dampers))
    pushes = np.array([b for b, _ in dampers], dtype=float).T
    with mp.workdps(DIGITS):
        exact = roots(mp.eye(2), weighted_gram(pushes, [c for _, c in dampers]), mp.eye(2))
        swinging = next(root for root in exact if root.imag > 0)
        mode = next(mode for mode in modes if mode.regime is Regime.UNDERDAMPED)
        truth = -swinging.real / abs(swinging)
        assert mode.damping_ratio_bound is not None
        assert abs(mode.damping_ratio - truth) <= mode.damping_ratio_bound + 1e-15
        assert mode.damping_ratio_bound < 1e-12


@pytest.mark.parametrize("share", [6e-3, 6e-5, 6e-7, 6e-9])
def test_coupled_masses_are_covered_by_the_bound(share: float) -> None:
    """A mass 1.3 m off its reference point, its own inertia a small share of m a²."""
    m, a = 3.7, 1.3
    M = np.array([[m, m * a], [m * a, m * a * a + m * share * a * a]])
    K = np.diag([7.3e3, 3.1e3])
    with mp.workdps(DIGITS):
        exact = sorted(abs(root) for root in roots(matrix(M), mp.zeros(2, 2), matrix(K)) if root.imag > 0)
        system = factored([1, 1], [([1, 0], 7.3e3), ([0, 1], 3.1e3)], []).with_values(mass=csc_array(M))
        for mode, truth in zip(mdof.solve(system), exact, strict=True):
            assert mode.frequency_bound is not None
            assert abs(mode.natural_frequency / truth - 1) <= mode.frequency_bound


@pytest.mark.parametrize("detuning", [sign * 10.0**power for power in range(-15, -5) for sign in (1, -1)])
def test_nearly_critical_modes_are_answered(detuning: float) -> None:
    """Two masses in a row and one damper near the value at which real roots meet."""
    damping = 2.4999999999999987 * (1 + detuning)
    modes = mdof.solve(factored([1, 1], [([1, 0], 1.0), ([1, -1], 1.0)], [([1, 0], damping)]))
    assert modes.verification.eigenvalues_found == 4


def test_a_weak_drag_beside_strong_inner_dampers_is_the_rate_of_the_whole() -> None:
    dampers = [([1.0, -1, 0], 1e9), ([0, 1.0, -1], 1e7), ([1.0, 0, 0], 1e-5)]
    modes = mdof.solve(factored([1, 2, 3], [([1, -1, 0], 20.0), ([0, 1, -1], 30.0)], dampers))
    assert modes.regimes[0] is Regime.RIGID_BODY
    assert modes[0].decay_rate == pytest.approx(1e-5 / 6, rel=1e-9)


def test_the_rate_of_a_rigid_body_has_a_bound() -> None:
    """A triple root at −1: rounding moves it by its cube root, and the bound says so."""
    modes = mdof.solve(factored([1, 1], [([1, -1], 1.0)], [([1, 0], 1.0), ([1, -1], 1.0)]))
    (rigid,) = [mode for mode in modes if mode.regime is Regime.RIGID_BODY]
    assert rigid.frequency_bound is not None
    assert abs(rigid.decay_rate - 1) <= rigid.frequency_bound


@pytest.mark.parametrize(
    ("M", "K", "words"),
    [
        ([[1, 1 - 3e-15], [1 - 3e-15, 1]], [[1, 0], [0, 2]], "singular"),
        (np.eye(2), np.diag([1e11, 1e-5]), "drowns"),
    ],
)
def test_what_rounding_decides_is_refused(M: object, K: object, words: str) -> None:
    with pytest.raises(UnverifiedError, match=words):
        mdof.solve(System.from_matrices(M, np.zeros((2, 2)), K))


def test_a_weakly_damped_massless_coordinate_keeps_its_root() -> None:
    C, K = np.diag([0, 1e3, 1e-8]), np.diag([3.0, 2, 2])
    modes = mdof.solve(System.from_matrices(np.diag([1.0, 0, 0]), C, K))
    rates = sorted(mode.decay_rate for mode in modes if mode.regime is Regime.RELAXATION)
    assert rates == pytest.approx([2e-3, 2e8], rel=1e-12)


def test_many_equal_frequencies_with_two_dampers() -> None:
    rng = np.random.default_rng(0)
    n = 60
    springs = [(list(np.eye(n)[index]), 1.0 + index % 20) for index in range(n)]
    system = factored([1.0] * n, springs, [(list(rng.normal(size=n)), 1.0) for _ in range(2)])
    auto, dense = mdof.solve(system), mdof.solve(system, method="dense")
    np.testing.assert_allclose(auto.natural_frequencies, dense.natural_frequencies, rtol=1e-9)
    # Of each twenty frequencies held three times, two dampers reach two.
    assert auto.regimes.count(Regime.UNDAMPED) == 20


def test_a_long_soft_chain_is_answered_whatever_its_length() -> None:
    for n in (219, 222):
        row = np.eye(n) - np.eye(n, k=1)
        springs = [(list(np.eye(n)[0]), 1e-2), *((list(row[index]), 1e9) for index in range(n - 1))]
        low = mdof.solve(factored([1.0] * n, springs, []), count=1)[0]
        assert low.natural_frequency == pytest.approx(np.sqrt(1e-2 / n), rel=1e-6)
