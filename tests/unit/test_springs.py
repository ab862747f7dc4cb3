"""mdof.eigen.springs: undamped modes from the springs as factors."""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest

import mdof
from mdof.eigen.reduce import normalise
from mdof.eigen.springs import JACOBI_LIMIT, free_motions, spring_modes, symmetric_factors
from mdof.errors import UnverifiedError


@pytest.mark.parametrize("seed", range(6))
def test_small_singular_values_beside_large_ones_keep_their_digits(seed: int) -> None:
    """A row of masses and springs over sixteen orders against 60-digit arithmetic."""
    rng = np.random.default_rng(seed)
    n = 6
    path = np.eye(n + 1, n) - np.eye(n + 1, n, k=-1)
    factor = np.sqrt(10 ** rng.uniform(-4, 12, n + 1))[:, None] * path / np.sqrt(10 ** rng.uniform(-2, 3, n))
    left, sigma, right = spring_modes(factor)
    with mp.workdps(60):
        exact = mp.matrix(factor.tolist())
        truth = sorted(mp.sqrt(value) for value in mp.eigsy(exact.T * exact, eigvals_only=True))
        assert max(abs(mp.mpf(float(s)) / t - 1) for s, t in zip(sigma, truth, strict=True)) < 4e-15
    assert (left * sigma) @ right.T == pytest.approx(factor, rel=1e-9, abs=1e-14 * np.abs(factor).max())


def test_large_problems_give_the_same_by_the_symmetric_eigensolver() -> None:
    rng = np.random.default_rng(0)
    factor = np.vstack([np.eye(230), 0.5 * rng.normal(size=(100, 230))])
    left, sigma, right = spring_modes(factor)
    assert sigma == pytest.approx(np.sort(np.linalg.svd(factor, compute_uv=False)), rel=1e-12)
    assert np.linalg.norm((left * sigma) @ right.T - factor) < 1e-12 * np.linalg.norm(factor)


@pytest.mark.parametrize("stiff", [1.0, 1e-9, 1e12])
def test_the_number_of_free_motions_does_not_depend_on_stiffness(stiff: float) -> None:
    """Three masses in a row on two springs, one of any stiffness, and nothing else: one free motion."""
    import networkx as nx

    graph = nx.MultiGraph(directions=("x",))
    for index in range(3):
        graph.add_node(index, mass=1.0 + index)
    graph.add_edge(0, 1, key="a", between=(0, 1), stiffness=1.0)
    graph.add_edge(1, 2, key="b", between=(1, 2), stiffness=stiff)
    system = mdof.assemble(graph)
    problem = normalise(system)
    assert problem.N.shape[1] == 1
    assert problem.recover @ problem.N / (problem.recover @ problem.N)[0] == pytest.approx(np.ones((3, 1)), rel=1e-13)


def test_metres_and_radians_do_not_confuse_the_rank() -> None:
    """Two springs at 1 mm from the centre hold translation and rotation, a thousand times less well."""
    system = mdof.System.from_matrices(np.eye(2), np.zeros((2, 2)), np.zeros((2, 2)))
    rows = np.array([[1.0, 1e-3], [1.0, -1e-3]])
    system = system.with_values(
        spring_columns=rows.T,
        stiffness=np.ones(2),
        loss_factor=np.zeros(2),
        loss_reference=np.full(2, np.nan),
        extra_stiffness=None,
        spring_names=("a", "b"),
        spring_grounded=np.ones(2, dtype=bool),
    )
    free, held = free_motions(system, rows, 2)
    assert (free.shape[1], held.shape[1]) == (0, 2)


def test_an_indefinite_matrix_keeps_the_sign_of_every_square() -> None:
    sigma, sign, W, N = symmetric_factors(np.diag([4.0, -9.0, 0.0]), 3)
    assert sorted(zip(sigma.tolist(), sign.tolist(), strict=True)) == [(2.0, 1.0), (3.0, -1.0)]
    assert (W * (sigma**2 * sign)) @ W.T == pytest.approx(np.diag([4.0, -9.0, 0.0]))
    assert np.abs(N[:, 0]) == pytest.approx([0, 0, 1])


def sprung(rows: list[list[float]], stiffness: list[float] | None = None) -> mdof.System:
    columns = np.array(rows).T
    count = columns.shape[1]
    return mdof.System.from_matrices(*(np.eye(len(columns)) * value for value in (1.0, 0.0, 0.0))).with_values(
        spring_columns=columns,
        stiffness=np.ones(count) if stiffness is None else np.array(stiffness),
        loss_factor=np.zeros(count),
        loss_reference=np.full(count, np.nan),
        spring_names=tuple(f"s{index}" for index in range(count)),
        spring_grounded=np.ones(count, dtype=bool),
    )


def bases(rows: list[list[float]], stiffness: list[float] | None = None) -> tuple[np.ndarray, np.ndarray]:
    free, held = free_motions(sprung(rows, stiffness), np.array(rows), len(rows[0]))
    both = np.hstack([free, held])
    assert both.T @ both == pytest.approx(np.eye(len(rows[0])), abs=1e-14)
    active = np.array(rows)[[index for index in range(len(rows)) if stiffness is None or stiffness[index]]]
    assert np.abs(active @ free).max(initial=0.0) < 1e-14 * np.abs(active).max(initial=1.0)
    return free, held


@pytest.mark.parametrize(
    ("rows", "stiffness", "free"),
    [
        ([[1.0, -1.0, 0.0], [0.0, 1.0, -1.0]], None, 1),
        # More springs than coordinates, and still one motion free.
        ([[1.0, -1.0, 0.0], [0.0, 1.0, -1.0], [1.0, 0.0, -1.0], [2.0, -1.0, -1.0]], None, 1),
        ([[1.0, -1.0, 0.0], [0.0, 1.0, -1.0], [1.0, 0.0, 0.0]], None, 0),
        # A spring of no stiffness holds nothing, one of negative stiffness does.
        ([[1.0, -1.0, 0.0], [0.0, 1.0, -1.0], [1.0, 0.0, 0.0]], [1.0, 1.0, 0.0], 1),
        ([[1.0, -1.0, 0.0], [0.0, 1.0, -1.0], [1.0, 0.0, 0.0]], [1.0, -1.0, 1.0], 0),
        # Held by a lever a millionth off the line: badly, but held.
        ([[1.0, 1.0, 0.0], [1.0, 1.0 + 1e-6, 0.0], [0.0, 0.0, 1.0]], None, 0),
        ([[1.0, 1.0, 0.0], [1.0, 1.0 + 1e-6, 0.0], [0.0, 0.0, 1.0], [0.0, 0.0, 1.0]], None, 0),
        # A coordinate that no spring sees.
        ([[1.0, 0.0, 0.0], [0.0, 0.0, 1e-9]], None, 1),
        ([[1e-12, 1e-12, 0.0], [1e12, -1e12, 0.0]], None, 1),
    ],
)
def test_free_motions_are_the_null_space_of_the_directions(
    rows: list[list[float]], stiffness: list[float] | None, free: int
) -> None:
    found, held = bases(rows, stiffness)
    assert (found.shape[1], held.shape[1]) == (free, 3 - free)


def test_without_springs_everything_is_free() -> None:
    free, held = free_motions(sprung([[1.0, -1.0]], [0.0]), np.array([[1.0, -1.0]]), 2)
    assert (free.tolist(), held.shape) == (np.eye(2).tolist(), (2, 0))


@pytest.mark.parametrize("orders", [0.1, 4.0, 15.0])
def test_the_grading_of_a_large_problem_does_not_cost_it_digits(orders: float) -> None:
    """Above the limit the symmetric eigensolver serves only where nothing is small beside the rest."""
    rng = np.random.default_rng(0)
    n = JACOBI_LIMIT + 5
    truth = np.geomspace(1.0, 10**orders, n)
    # Orthonormal columns times a grading, so that the singular values are the grading.
    q = np.linalg.qr(rng.normal(size=(n + 3, n)))[0]
    left, sigma, right = spring_modes(q * rng.permutation(truth))
    assert sigma == pytest.approx(truth, rel=1e-12)
    assert np.abs(left.T @ left - np.eye(n)).max() < 1e-12
    assert np.abs(right.T @ right - np.eye(n)).max() < 1e-12


def test_singular_values_rise_and_belong_to_their_vectors() -> None:
    rng = np.random.default_rng(4)
    factor = rng.normal(size=(9, 6))
    left, sigma, right = spring_modes(factor)
    assert np.all(np.diff(sigma) >= 0)
    assert factor @ right == pytest.approx(left * sigma, rel=1e-12, abs=1e-13)
    assert [part.shape for part in spring_modes(np.zeros((3, 0)))] == [(3, 0), (0,), (0, 0)]


@pytest.mark.parametrize("bad", [np.nan, np.inf, 0.0])
def test_factors_that_cannot_be_decomposed_are_refused(bad: float) -> None:
    with pytest.raises(UnverifiedError, match="could not be decomposed"):
        spring_modes(np.diag([1.0, bad]))


def test_what_rounding_leaves_of_a_null_space_is_null() -> None:
    """A full matrix whose null space is known to rounding only, and a small square that is none."""
    rng = np.random.default_rng(1)
    q = np.linalg.qr(rng.normal(size=(5, 5)))[0]
    squares = np.array([0.0, 1e-12, -3.0, 5.0, 80.0])
    matrix = (q * squares) @ q.T
    sigma, sign, W, N = symmetric_factors(0.5 * (matrix + matrix.T), 5)
    assert N.shape == (5, 1)
    assert np.abs(q[:, 0] @ N[:, 0]) == pytest.approx(1.0, rel=1e-3)
    assert np.sort(sigma**2 * sign) == pytest.approx([-3.0, 1e-12, 5.0, 80.0], rel=0.1)
    assert (W * (sigma**2 * sign)) @ W.T == pytest.approx(matrix, abs=1e-12)
