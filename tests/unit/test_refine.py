"""mdof.eigen.refine: spoilt pairs come back."""

from __future__ import annotations

import numpy as np
import pytest

import mdof
from mdof.eigen.quadratic import solve_complete
from mdof.eigen.reduce import normalise
from mdof.eigen.refine import refine
from mdof.eigen.verify import judge


@pytest.mark.parametrize("seed", range(5))
def test_a_spoilt_vector_and_root_are_repaired(seed: int) -> None:
    rng = np.random.default_rng(seed)
    A, B = rng.normal(size=(2, 6, 6))
    problem = normalise(mdof.System.from_matrices(np.eye(6), A @ A.T, B @ B.T + np.eye(6)))
    roots = solve_complete(problem)
    vectors = roots.vectors + 1e-6 * rng.normal(size=roots.vectors.shape)
    values = roots.values * (1 + 1e-7)
    again, better, _ = refine(problem, values, vectors / np.linalg.norm(vectors, axis=0), None)
    assert again == pytest.approx(roots.values, rel=1e-13)
    assert np.all(judge(problem, again, better).backward < 5e-15)


def test_real_roots_stay_real() -> None:
    problem = normalise(mdof.System.from_matrices(np.eye(2), [[5.0, 1.0], [1.0, 7.0]], np.diag([1.0, 2.0])))
    roots = solve_complete(problem)
    again, _, _ = refine(problem, roots.values * (1 + 1e-9), roots.vectors, None)
    assert np.all(again.imag == 0)
