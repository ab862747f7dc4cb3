"""mdof.eigen.state_matrix and quadratic: all roots of coupled blocks against independent eigensolvers."""

from __future__ import annotations

import numpy as np
import pytest
import scipy.linalg

import mdof
from mdof import System


def companion_roots(M: np.ndarray, C: np.ndarray, K: np.ndarray) -> np.ndarray:
    """All finite eigenvalues by the generalised QZ algorithm."""
    n = len(M)
    zero, eye = np.zeros((n, n)), np.eye(n)
    values = scipy.linalg.eig(np.block([[zero, eye], [-K, -C]]), np.block([[eye, zero], [zero, M]]), right=False)
    return values[np.isfinite(values) & (np.abs(values) < 1e8)]


def assert_same(modes: mdof.DampedModes, wanted: np.ndarray, tolerance: float = 1e-9) -> None:
    found = modes.eigenvalues[~np.isnan(modes.eigenvalues)]
    assert len(found) == len(wanted)
    left = list(wanted)
    for value in found:
        nearest = min(left, key=lambda root: abs(root - value))
        assert abs(nearest - value) <= tolerance * max(abs(value), 1.0)
        left.remove(nearest)


@pytest.mark.parametrize("seed", range(8))
def test_coupled_damping(seed: int) -> None:
    rng = np.random.default_rng(seed)
    n = 2 + seed
    A, B = rng.normal(size=(2, n, n))
    M, C, K = np.diag(rng.uniform(0.5, 3, n)), A @ A.T, B @ B.T + np.eye(n)
    assert_same(mdof.solve(System.from_matrices(M, C, K)), companion_roots(M, C, K))


@pytest.mark.parametrize("seed", range(4))
def test_gyroscopic_and_circulatory_terms(seed: int) -> None:
    rng = np.random.default_rng(seed)
    A, B, D = rng.normal(size=(3, 4, 4))
    M, C, K = np.eye(4), 0.1 * A @ A.T + (B - B.T), 20 * np.eye(4) + (D - D.T)
    assert_same(mdof.solve(System.from_matrices(M, C, K)), companion_roots(M, C, K))


def test_free_motions_have_exact_zero_roots_damped_or_not() -> None:
    """A free pair joined by spring and damper beside a free mass with drag: zeros 2 + 1, and the drag's decay."""
    K = np.array([[2.0, -2.0, 0], [-2.0, 2.0, 0], [0, 0, 0]])
    modes = mdof.solve(System.from_matrices(np.diag([1.0, 3.0, 2.0]), 0.1 * K + np.diag([0, 0, 0.5]), K))
    values = modes.eigenvalues[~np.isnan(modes.eigenvalues)]
    assert np.sum(values == 0) == 3
    assert -0.25 in values.real.round(14)


def test_a_damped_massless_coordinate_and_an_unsymmetric_stiffness() -> None:
    rng = np.random.default_rng(5)
    M, C = np.diag([1.0, 2.0, 0.0]), np.diag([0.2, 0.1, 4.0])
    K = np.diag([5.0, 6.0, 7.0]) + rng.normal(size=(3, 3))
    assert_same(mdof.solve(System.from_matrices(M, C, K)), companion_roots(M, C, K), 1e-8)


def test_undamped_modes_beside_damped_ones_are_exactly_imaginary() -> None:
    modes = mdof.solve(System.from_matrices(np.eye(3), np.diag([0.0, 1.0, 0.0]), np.diag([1.0, 4.0, 9.0])))
    assert [mode.decay_rate for mode in modes if mode.regime == "undamped"] == [0.0, 0.0]


def test_the_method_says_what_was_done() -> None:
    K = np.diag([1.0, 4.0])
    assert "proportional" in mdof.solve(System.from_matrices(np.eye(2), 0.1 * K, K)).method
    assert "state matrix" in mdof.solve(System.from_matrices(np.eye(2), np.ones((2, 2)), K)).method
