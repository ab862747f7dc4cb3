"""mdof.eigen.blocks: which undamped modes damping couples."""

from __future__ import annotations

import networkx as nx
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


def twins(damper: float, loss: float, tie: float = 0.0) -> mdof.System:
    """Two equal oscillators, a damper on one, a loss factor on a spring of the other, and perhaps a damper between."""
    graph = nx.MultiGraph(directions=("x",), damping={})
    graph.add_node("ground", kind="ground")
    for name in "abc":
        graph.add_node(name, mass=2.0)
    graph.add_edge("a", "ground", key="a", between=("a", "ground"), stiffness=50.0, damping=damper)
    graph.add_edge("b", "ground", key="b", between=("b", "ground"), stiffness=50.0, loss_factor=loss)
    graph.add_edge("c", "ground", key="c", between=("c", "ground"), stiffness=90.0, damping=0.4)
    if tie:
        graph.add_edge("a", "b", key="tie", between=("a", "b"), damping=tie)
    return mdof.assemble(graph)


def test_a_turn_leaves_the_problem_the_same_in_turned_coordinates() -> None:
    """Everything that is a form or a factor is turned, and the undamped frequencies stay."""
    problem = normalise(twins(0.3, 0.2, tie=0.7))
    turned, turn = rotate_equal(problem)
    assert turn is not None
    assert turn.T @ turn == pytest.approx(np.eye(3), abs=1e-14)
    assert turned.recover == pytest.approx(problem.recover @ turn, abs=1e-14)
    assert turned.damping == pytest.approx(turn.T @ problem.damping @ turn, abs=1e-14)
    assert (turned.damping == turned.damping.T).all()
    rows = turned.damper_rows
    assert (rows.T * turned.damper_signs) @ rows == pytest.approx(turned.damping, abs=1e-13)
    assert turned.loss_rows == pytest.approx(problem.loss_rows @ turn, abs=1e-14)
    # Viscous damping and loss factors of equal modes are made diagonal as one.
    gram = turned.damping + turned.loss_rows.T @ turned.loss_rows
    equal = np.nonzero(np.isclose(turned.sigma, 5.0))[0]
    assert abs(gram[equal[0], equal[1]]) < 1e-14


@pytest.mark.parametrize(("loss", "sizes"), [(0.0, [1, 1, 1]), (0.2, [1, 1, 1])])
def test_dampers_and_loss_factors_on_different_equal_oscillators_couple_nothing(loss: float, sizes: list[int]) -> None:
    problem, _ = rotate_equal(normalise(twins(0.3, loss)))
    assert sorted(len(block) for block in uncoupled_blocks(problem)) == sizes


def test_a_loss_factor_between_oscillators_couples_their_modes() -> None:
    graph = nx.MultiGraph(directions=("x",), damping={})
    graph.add_node("ground", kind="ground")
    for name, stiffness in (("a", 50.0), ("b", 70.0)):
        graph.add_node(name, mass=2.0)
        graph.add_edge(name, "ground", key=name, between=(name, "ground"), stiffness=stiffness)
    for eta, blocks in ((0.2, [[0, 1]]), (0.0, [[0], [1]])):
        tied = graph.copy()
        tied.add_edge("a", "b", key="t", between=("a", "b"), stiffness=30.0, loss_factor=eta)
        assert [block.tolist() for block in uncoupled_blocks(normalise(mdof.assemble(tied)))] == blocks


@pytest.mark.parametrize(("size", "blocks"), [(1e-17, 2), (1e-10, 1), (-1e-10, 1)])
def test_coupling_counts_above_rounding_of_the_two_modes_it_couples(size: float, blocks: int) -> None:
    for scale in (1e-6, 1.0, 1e6):
        C = scale * np.array([[1.0, size], [size, 1e-3]])
        problem = normalise(mdof.System.from_matrices(np.eye(2), C, np.diag([1.0, 2.0])))
        assert len(uncoupled_blocks(problem)) == blocks


def test_where_nothing_can_be_told_all_coordinates_are_one_block() -> None:
    C = np.array([[0.1, 0.2], [-0.2, 0.1]])
    gyroscopic = normalise(mdof.System.from_matrices(np.eye(2), C, np.diag([1.0, 2.0])))
    assert [block.tolist() for block in uncoupled_blocks(gyroscopic)] == [[0, 1]]
    assert rotate_equal(gyroscopic)[1] is None
    massless = normalise(mdof.System.from_matrices(np.diag([1.0, 0.0]), np.diag([0.0, 1.0]), np.diag([1.0, 2.0])))
    assert [block.tolist() for block in uncoupled_blocks(massless)] == [[0, 1]]


def test_an_unstable_twin_of_equal_size_is_not_of_equal_frequency() -> None:
    """ω² = 4 and −4 have one |ω|; turning them would mix a motion that is held with one that is not."""
    system = mdof.System.from_matrices(np.eye(2), np.ones((2, 2)), np.diag([4.0, -4.0]))
    assert rotate_equal(normalise(system))[1] is None


@pytest.mark.parametrize("scale", [1e-10, 1.0, 1e10])
def test_every_group_of_equal_frequencies_is_turned_for_itself(scale: float) -> None:
    """ω² of 1, 1, 2, 3, 3, 3 in any unit: damping becomes diagonal within each group, and between groups it stays."""
    rng = np.random.default_rng(3)
    A = rng.normal(size=(6, 6))
    squares = np.array([3.0, 1.0, 3.0, 2.0, 1.0, 3.0])
    problem = normalise(mdof.System.from_matrices(np.eye(6), np.sqrt(scale) * A @ A.T, np.diag(scale * squares)))
    turned, turn = rotate_equal(problem)
    assert turn is not None
    order = problem.sigma**2 / scale
    same = np.abs(order[:, None] - order[None, :]) < 1e-9
    size = np.abs(turned.damping).max()
    assert np.abs(turned.damping[same & ~np.eye(6, dtype=bool)]).max() < 1e-14 * size
    assert (turn[~same] == 0).all()
    for group in (1.0, 2.0, 3.0):
        own = np.ix_(np.abs(order - group) < 1e-9, np.abs(order - group) < 1e-9)
        assert np.sort(np.diag(turned.damping[own])) == pytest.approx(
            np.linalg.eigvalsh(problem.damping[own]), rel=1e-11
        )
    # The lone mode keeps its coordinate.
    lone = int(np.argmin(np.abs(order - 2.0)))
    assert turn[lone].tolist() == np.eye(6)[lone].tolist()


def test_equal_modes_that_damping_leaves_apart_are_not_turned() -> None:
    system = mdof.System.from_matrices(np.eye(3), np.diag([0.3, 0.1, 0.2]), np.diag([4.0, 4.0, 9.0]))
    assert rotate_equal(normalise(system))[1] is None
