"""mdof.eigen.verify: judging eigenpairs."""

from __future__ import annotations

import numpy as np
import pytest

import mdof
from mdof.eigen.quadratic import solve_complete
from mdof.eigen.reduce import normalise
from mdof.eigen.verify import check_completeness, judge, measure
from mdof.errors import UnverifiedError

STATE = np.array([[0.0, 0.0, 2.0, 0.0], [0.0, 0.0, 0.0, 3.0], [-2.0, 0.0, -0.4, 0.1], [0.0, -3.0, 0.1, -0.2]])


def test_all_eigenvalues_pass() -> None:
    check_completeness(STATE, np.linalg.eigvals(STATE))


@pytest.mark.parametrize("change", ["lost", "doubled", "moved"])
def test_a_wrong_set_of_eigenvalues_is_refused(change: str) -> None:
    values = np.linalg.eigvals(STATE)
    if change == "lost":
        values = values[:-1]
    elif change == "doubled":
        values[0] = values[2]
    else:
        values[0] += 1e-6
    with pytest.raises(UnverifiedError, match=r"report|traces"):
        check_completeness(STATE, values)


def test_a_missing_undamped_pair_shows_in_the_sum_of_squares() -> None:
    """Its sum is zero, so the trace alone would not see it."""
    state = np.array([[0.0, 2.0, 0, 0], [-2.0, 0, 0, 0], [0, 0, 0, 3.0], [0, 0, -3.0, 0]])
    with pytest.raises(UnverifiedError, match="traces"):
        check_completeness(state, np.array([2j, -2j, 2j, -2j]))


def problem_of(seed: int) -> object:
    rng = np.random.default_rng(seed)
    A, B = rng.normal(size=(2, 5, 5))
    return normalise(mdof.System.from_matrices(np.diag(rng.uniform(1, 4, 5)), A @ A.T, B @ B.T + np.eye(5)))


def test_residuals_are_those_of_the_quadratic() -> None:
    problem = problem_of(1)
    rng = np.random.default_rng(0)
    values, vectors = rng.normal(size=3) + 1j * rng.normal(size=3), rng.normal(size=(5, 3)) + 0j
    dense = [
        (v**2 * np.eye(5) + v * problem.damping + np.diag(problem.sigma**2)) @ z
        for v, z in zip(values, vectors.T, strict=True)
    ]
    assert measure(problem, values, vectors).rest == pytest.approx(np.array(dense).T, rel=1e-12)


def test_the_bound_grows_with_an_error_that_is_put_in() -> None:
    problem = problem_of(2)
    roots = solve_complete(problem)
    clean = judge(problem, roots.values, roots.vectors)
    off = judge(problem, roots.values * (1 + 1e-9), roots.vectors)
    assert np.all(off.bound >= 0.5e-9 * np.abs(roots.values))
    assert np.all(clean.bound < 1e-12 * np.abs(roots.values))
    # The correction the residual proposes undoes the error.
    assert roots.values * (1 + 1e-9) + measure(problem, roots.values * (1 + 1e-9), roots.vectors).step == pytest.approx(
        roots.values, rel=1e-13
    )


def test_left_vectors_serve_unsymmetric_problems() -> None:
    """The eigenvalue's first-order change is yᵀ dQ x over yᵀ Q' x: against a finite difference."""
    rng = np.random.default_rng(4)
    M, C, K = np.eye(3), 0.2 * np.eye(3) + np.diag([1.0, 1.0], 1), 9 * np.eye(3) + rng.normal(size=(3, 3))
    roots = solve_complete(normalise(mdof.System.from_matrices(M, C, K)))
    assert roots.left is not None
    judged = judge(normalise(mdof.System.from_matrices(M, C, K)), roots.values, roots.vectors, roots.left)
    assert np.all(judged.backward < 1e-14)
    assert np.all(np.isfinite(judged.bound))
