"""mdof.eigen.refine: spoilt pairs come back."""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest

import mdof
from mdof.eigen.quadratic import solve_complete
from mdof.eigen.reduce import NormalisedProblem, normalise
from mdof.eigen.refine import refine
from mdof.eigen.verify import judge, measure


def refined(
    problem: NormalisedProblem, values: np.ndarray, vectors: np.ndarray, left: np.ndarray | None = None
) -> tuple[np.ndarray, np.ndarray, np.ndarray | None, np.ndarray]:
    return refine(problem, values, vectors, left, measure(problem, values, vectors, left))


@pytest.mark.parametrize("seed", range(5))
def test_a_spoilt_vector_and_root_are_repaired(seed: int) -> None:
    rng = np.random.default_rng(seed)
    A, B = rng.normal(size=(2, 6, 6))
    problem = normalise(mdof.System.from_matrices(np.eye(6), A @ A.T, B @ B.T + np.eye(6)))
    roots = solve_complete(problem)
    vectors = roots.vectors + 1e-6 * rng.normal(size=roots.vectors.shape)
    values = roots.values * (1 + 1e-7)
    again, better, *_ = refined(problem, values, vectors / np.linalg.norm(vectors, axis=0))
    assert again == pytest.approx(roots.values, rel=1e-13)
    assert np.all(judge(problem, again, better).backward < 5e-15)


def test_real_roots_stay_real() -> None:
    problem = normalise(mdof.System.from_matrices(np.eye(2), [[5.0, 1.0], [1.0, 7.0]], np.diag([1.0, 2.0])))
    roots = solve_complete(problem)
    again, *_ = refined(problem, roots.values * (1 + 1e-9), roots.vectors)
    assert np.all(again.imag == 0)


@pytest.mark.parametrize("seed", range(3))
def test_left_and_right_vectors_of_an_unsymmetric_problem_are_both_repaired(seed: int) -> None:
    rng = np.random.default_rng(seed)
    C, skew = rng.normal(size=(2, 5, 5))
    K = np.diag([20.0, 30.0, 45.0, 60.0, 80.0]) + skew
    problem = normalise(mdof.System.from_matrices(np.eye(5), C, K))
    roots = solve_complete(problem)
    right, left = (
        part + 1e-5 * (rng.normal(size=part.shape) + 1j * rng.normal(size=part.shape))
        for part in (roots.vectors, roots.left)
    )
    values, better, better_left, _ = refined(problem, roots.values * (1 + 1e-8j), right, left)
    assert better_left is not None
    assert values == pytest.approx(roots.values, rel=1e-12)
    for value, x, y in zip(values, better.T, better_left.T, strict=True):
        Q = value**2 * np.eye(5) + value * problem.damping + problem.stiffness
        assert np.linalg.norm(Q @ x) < 1e-12 * np.linalg.norm(Q) * np.linalg.norm(x)
        assert np.linalg.norm(y @ Q) < 1e-12 * np.linalg.norm(Q) * np.linalg.norm(y)


def test_what_is_given_is_not_changed_in_place() -> None:
    problem = normalise(mdof.System.from_matrices(np.eye(2), [[1.0, 0.5], [0.5, 2.0]], np.diag([3.0, 7.0])))
    roots = solve_complete(problem)
    values, vectors = roots.values * (1 + 1e-8), roots.vectors + 1e-6
    kept = values.copy(), vectors.copy()
    refined(problem, values, vectors)
    assert (values == kept[0]).all()
    assert (vectors == kept[1]).all()


def test_roots_about_to_collide_keep_their_values_and_zero_roots_stay_zero() -> None:
    """A Rayleigh step longer than a twentieth of the gap could take a root over to its neighbour."""
    problem = normalise(mdof.System.from_matrices(np.eye(2), np.diag([2.0, 2.5]), np.diag([1.0, 0.0])))
    vectors = np.eye(2, dtype=complex)[:, [0, 0, 1]]
    values = np.array([-1 + 1e-6, -1 - 1e-6, 0.0], dtype=complex)
    again, *_ = refined(problem, values, vectors)
    assert again.tolist() == values.tolist()


def test_a_soft_mode_beside_a_very_stiff_one_is_refined_to_its_own_digits() -> None:
    """ω = 1 beside ω = 1e7, coupled by a damper: the small root to a relative 1e-12, as 40 digits have it."""
    C, squares = np.array([[0.2, 30.0], [30.0, 5000.0]]), np.array([1.0, 1e14])
    problem = normalise(mdof.System.from_matrices(np.eye(2), C, np.diag(squares)))
    roots = solve_complete(problem)
    spoilt = roots.vectors * (1 + 1e-7 * np.arange(roots.vectors.size).reshape(roots.vectors.shape))
    values, *_ = refined(problem, roots.values * (1 + 1e-9), spoilt)
    found = complex(min(values[values.imag > 0], key=abs))
    with mp.workdps(40):

        def determinant(z: mp.mpc) -> mp.mpc:
            return (z * z + mp.mpf(0.2) * z + 1) * (z * z + 5000 * z + mp.mpf(1e14)) - 900 * z * z

        exact = mp.findroot(determinant, mp.mpc(-0.1, 1))
        assert abs(mp.mpc(found) / exact - 1) < 1e-12
