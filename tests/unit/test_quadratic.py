"""mdof.eigen.quadratic: the roots of all blocks put together."""

from __future__ import annotations

import numpy as np
import pytest
import scipy.linalg

import mdof
from mdof.eigen.quadratic import Roots, solve_complete
from mdof.eigen.reduce import NormalisedProblem, normalise


def blocks_of_every_kind() -> NormalisedProblem:
    """An overdamped pair, a lightly damped pair, a proportional mode, an overdamped one, and a free coasting mass."""
    C = scipy.linalg.block_diag([[30.0, 4.0], [4.0, 20.0]], [[0.2, 0.1], [0.1, 0.3]], 0.5, 9.0, 1.5)
    K = np.diag([1.0, 4.0, 9.0, 16.0, 25.0, 2.0, 0.0])
    return normalise(mdof.System.from_matrices(np.diag([1.0, 2.0, 3.0, 1.0, 2.0, 1.0, 3.0]), C, K))


@pytest.fixture(scope="module")
def problem() -> NormalisedProblem:
    return blocks_of_every_kind()


@pytest.fixture(scope="module")
def roots(problem: NormalisedProblem) -> Roots:
    return solve_complete(problem)


def every(roots: Roots) -> np.ndarray:
    """All eigenvalues, conjugates included."""
    values = np.concatenate([roots.values, roots.values[roots.values.imag > 0].conj()])
    return values[np.lexsort((values.imag, values.real))]


def test_all_roots_of_all_blocks_are_those_of_the_whole(problem: NormalisedProblem, roots: Roots) -> None:
    n = len(problem.recover)
    state = np.block([[np.zeros((n, n)), np.eye(n)], [-problem.stiffness, -problem.damping]])
    wanted = np.linalg.eigvals(state)
    assert roots.count == 2 * n == len(every(roots))
    left = list(wanted)
    for value in every(roots):
        nearest = min(left, key=lambda root: abs(root - value))
        assert abs(nearest - value) < 1e-9 * max(1.0, abs(value))
        left.remove(nearest)


def test_every_vector_is_a_unit_null_vector_of_its_own_quadratic(problem: NormalisedProblem, roots: Roots) -> None:
    for value, z in zip(roots.computed, roots.vectors.T, strict=True):
        rest = value**2 * z + value * (problem.damping @ z) + problem.stiffness @ z
        assert np.linalg.norm(z) == pytest.approx(1.0, rel=1e-14)
        assert np.linalg.norm(rest) < 1e-12 * (abs(value) ** 2 + 40 * abs(value) + 13)


def test_a_vector_moves_in_its_own_block_only(roots: Roots) -> None:
    """Roots of one block share their coordinates with nobody else."""
    moved = {
        number: frozenset(np.nonzero(np.abs(roots.vectors[:, roots.block == number]).max(axis=1) > 0)[0].tolist())
        for number in np.unique(roots.block)
    }
    assert sorted(map(len, moved.values())) == [1, 1, 1, 2, 2]
    assert sum(map(len, moved.values())) == len(frozenset().union(*moved.values())) == 7


def test_partners_point_at_each_other_within_one_block(roots: Roots) -> None:
    known = np.nonzero(roots.partner >= 0)[0]
    # The scalar overdamped mode and the coasting mass know their two roots; coupled blocks leave that to the shapes.
    assert len(known) == 4
    assert roots.partner[roots.partner[known]].tolist() == known.tolist()
    assert roots.block[roots.partner[known]].tolist() == roots.block[known].tolist()
    sums = {round(float((roots.values[i] + roots.values[roots.partner[i]]).real), 9) for i in known}
    assert sums == {-9.0, -0.5}


def test_the_slope_is_that_of_the_quadratic_form(problem: NormalisedProblem, roots: Roots) -> None:
    for value, z, slope in zip(roots.computed, roots.vectors.T, roots.slope, strict=True):
        assert slope == pytest.approx(2 * value * (z @ z) + z @ problem.damping @ z, rel=1e-9, abs=1e-12)


def test_left_vectors_of_an_unsymmetric_problem_are_null_from_the_left() -> None:
    rng = np.random.default_rng(7)
    K = 20 * np.eye(4) + rng.normal(size=(4, 4))
    problem = normalise(mdof.System.from_matrices(np.diag([1.0, 2.0, 3.0, 4.0]), rng.normal(size=(4, 4)), K))
    roots = solve_complete(problem)
    assert roots.left is not None
    for value, y in zip(roots.computed, roots.left.T, strict=True):
        rest = value**2 * y + value * (y @ problem.damping) + y @ problem.stiffness
        assert np.linalg.norm(rest) < 1e-12 * np.linalg.norm(y) * np.linalg.norm(problem.stiffness)
