"""mdof.eigen.blocks: which undamped modes damping couples."""

from __future__ import annotations

import numpy as np
import pytest

import mdof
from mdof.eigen.blocks import connected, rotate_equal, uncoupled_blocks
from mdof.eigen.reduce import normalise


def test_connected_components() -> None:
    graph = np.eye(5, dtype=bool)
    graph[0, 3] = graph[3, 0] = graph[3, 4] = graph[4, 3] = True
    assert [block.tolist() for block in connected(graph)] == [[0, 3, 4], [1], [2]]


def test_modes_of_equal_frequency_are_turned_until_damping_leaves_them_alone() -> None:
    turn = np.array([[0.6, -0.8], [0.8, 0.6]])
    C = turn @ np.diag([0.1, 0.7]) @ turn.T
    problem, _ = rotate_equal(normalise(mdof.System.from_matrices(np.eye(2), C, 4 * np.eye(2))))
    assert np.sort(np.diag(problem.damping)) == pytest.approx([0.1, 0.7], rel=1e-14)
    assert abs(problem.damping[0, 1]) < 1e-15
    assert [len(block) for block in uncoupled_blocks(problem)] == [1, 1]


def test_modes_of_unlike_frequency_are_not_turned() -> None:
    system = mdof.System.from_matrices(np.eye(2), np.ones((2, 2)), np.diag([1.0, 1.0 + 1e-9]))
    problem, turn = rotate_equal(normalise(system))
    assert turn is None
    assert [len(block) for block in uncoupled_blocks(problem)] == [2]


def test_damping_proportional_to_stiffness_couples_nothing() -> None:
    rng = np.random.default_rng(2)
    A = rng.normal(size=(6, 6))
    K = A @ A.T + np.eye(6)
    problem = normalise(mdof.System.from_matrices(np.diag(rng.uniform(1, 2, 6)), 0.01 * K, K))
    assert [len(block) for block in uncoupled_blocks(problem)] == [1] * 6
