"""mdof.eigen.springs: undamped modes from the springs as factors."""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest

import mdof
from mdof.eigen.reduce import normalise
from mdof.eigen.springs import free_motions, spring_modes, symmetric_factors


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
