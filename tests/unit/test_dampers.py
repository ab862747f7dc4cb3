"""mdof.eigen.dampers: damper factors in undamped modes."""

from __future__ import annotations

import mpmath as mp
import networkx as nx
import numpy as np
import pytest

import mdof
from mdof.eigen.dampers import factored_damping
from mdof.eigen.reduce import normalise


def chain(stiffness: list[float], damping: list[float], **more: object) -> mdof.System:
    graph = nx.MultiGraph(
        directions=("x",), damping={}, **{k: v for k, v in more.items() if k == "reference_frequency"}
    )
    graph.add_node("ground", kind="ground")
    last: object = "ground"
    for index, (k, c) in enumerate(zip(stiffness, damping, strict=True)):
        graph.add_node(index, mass=1.0 + index)
        graph.add_edge(index, last, key=f"s{index}", between=(index, last), stiffness=k, damping=c)
        last = index
    return mdof.assemble(graph)


def test_the_factors_give_the_damping_matrix_in_modes() -> None:
    system = chain([3.0, 5.0, 2.0], [0.1, 0.7, 0.2])
    problem = normalise(system)
    wanted = problem.recover.T @ system.C.toarray() @ problem.recover
    assert problem.damping == pytest.approx(wanted, rel=1e-12, abs=1e-14)
    rows = problem.damper_rows
    assert (rows.T * problem.damper_signs) @ rows == pytest.approx(problem.damping, rel=1e-12)


def test_the_stretch_of_a_very_stiff_spring_keeps_its_digits() -> None:
    """In the low mode both masses move alike; a dashpot beside the stiff spring sees k1/k2 of it."""
    soft, stiff, c = 2.0, 1e12, 4.0
    problem = normalise(chain([soft, stiff], [0.0, c]))
    low = int(np.argmin(problem.sigma))
    # Static share: the force soft·x is split by mass, m2/(m1+m2) of it passes the stiff spring; M = 1 + 2.
    shape = 1 / np.sqrt(3.0)
    stretch = soft * shape * (2.0 / 3.0) / stiff
    assert np.abs(problem.damper_rows[-1, low]) == pytest.approx(np.sqrt(c) * stretch, rel=1e-9)


def test_a_loss_factor_with_a_reference_is_a_dashpot_there() -> None:
    system = chain([8.0], [0.0]).with_values(loss_factor=np.array([0.1]), loss_reference=np.array([4.0]))
    assert normalise(system).damping[0, 0] == pytest.approx(0.1 * 8.0 / 4.0)


def test_a_loss_factor_without_reference_waits_for_the_mode() -> None:
    system = chain([8.0], [0.0]).with_values(loss_factor=np.array([0.1]))
    problem = normalise(system)
    assert problem.damping[0, 0] == 0
    assert problem.loss_rows.T @ problem.loss_rows == pytest.approx(np.array([[0.8]]))


def test_a_negative_damper_keeps_its_sign() -> None:
    assert normalise(chain([8.0], [-0.5])).damping[0, 0] == pytest.approx(-0.5)


def given(matrix: np.ndarray) -> mdof.System:
    n = len(matrix)
    return mdof.System.from_matrices(np.eye(n), matrix, np.diag(np.arange(1.0, n + 1)))


@pytest.mark.parametrize("rank", [1, 2, 3])
@pytest.mark.parametrize("scale", [1.0, 1e-12, 1e12])
def test_a_damping_matrix_of_low_rank_is_taken_apart_at_its_rank(rank: int, scale: float) -> None:
    rng = np.random.default_rng(rank)
    B = rng.normal(size=(24, rank)) * 10 ** rng.uniform(-2, 2, (24, 1))
    matrix = scale * B @ B.T
    columns, rest = factored_damping(given(matrix))
    assert columns is not None
    assert rest is None
    assert columns.shape == (24, rank)
    size = np.sqrt(np.diag(matrix))
    assert np.abs(columns @ columns.T - matrix).max(initial=0) <= 1e-13 * np.outer(size, size).max()
    assert np.all(np.abs(columns @ columns.T - matrix) <= 1e-13 * np.outer(size, size))


@pytest.mark.parametrize(
    "kind", ["full rank", "rank above an eighth", "unsymmetric", "indefinite", "negative", "small"]
)
def test_any_other_damping_matrix_is_left_as_it_is(kind: str) -> None:
    rng = np.random.default_rng(0)
    b = rng.normal(size=16)
    matrix = {
        "full rank": np.outer(b, b) + 1e-6 * np.eye(16),
        "rank above an eighth": np.diag([1.0, 2.0, 3.0] + [0.0] * 13),
        "unsymmetric": np.outer(b, b) + 1e-3 * np.eye(16, k=1),
        "indefinite": np.outer(b, b) - 1e-3 * np.outer(np.roll(b, 1), np.roll(b, 1)),
        "negative": -np.outer(b, b),
        "small": np.ones((7, 7)),
    }[kind]
    columns, rest = factored_damping(given(matrix))
    assert columns is None
    assert np.asarray(rest) == pytest.approx(matrix)


def test_a_few_dashpots_given_as_numbers_are_found_beside_coordinates_without_any() -> None:
    matrix = np.zeros((16, 16))
    matrix[3, 3] = 5.0
    columns, _ = factored_damping(given(matrix))
    assert columns is not None
    assert np.abs(columns[:, 0]) == pytest.approx(np.sqrt(5.0) * (np.arange(16) == 3))
    assert factored_damping(given(np.zeros((16, 16)))) == (None, None)


@pytest.mark.parametrize("floating", [True, False])
@pytest.mark.parametrize("stiff", [1e2, 1e10])
def test_loss_factors_in_modes_are_the_strain_energies_of_their_springs(floating: bool, stiff: float) -> None:
    """ηk (uᵀb)² of every mode, small beside stiff springs, against 40 digits."""
    loss, reference = np.array([0.1, 0.2, 0.3]), 5.0
    system = chain([3.0, stiff, 7.0], [0.0, 0.0, 0.0]).with_values(
        loss_factor=loss, loss_reference=np.full(3, np.nan if floating else reference)
    )
    problem = normalise(system)
    rows = problem.loss_rows * (1 / np.sqrt(reference)) if floating else problem.damper_rows
    with mp.workdps(40):
        B = mp.matrix(system.spring_columns.toarray().tolist())
        root = mp.diag([1 / mp.sqrt(mp.mpf(float(value))) for value in system.M.diagonal()])
        K = root * B * mp.diag([mp.mpf(float(value)) for value in system.stiffness]) * B.T * root
        squares, shapes = mp.eigsy(K)
        for mode in range(3):
            column = int(np.argmin(np.abs(problem.sigma / float(mp.sqrt(squares[mode])) - 1)))
            stretch = B.T * root * shapes[:, mode]
            for spring in range(3):
                wanted = float(loss[spring] * system.stiffness[spring] * stretch[spring] ** 2 / reference)
                found = rows[-3:, column][spring] ** 2
                assert found == pytest.approx(wanted, rel=1e-8)


def test_a_dashpot_on_a_spring_of_no_stiffness_is_seen_by_its_displacements() -> None:
    system = chain([3.0, 4.0], [0.5, 0.7])
    idle = system.with_values(stiffness=np.array([0.0, 4.0]))
    problem = normalise(idle)
    assert problem.damping == pytest.approx(problem.recover.T @ idle.C.toarray() @ problem.recover, abs=1e-14)


def test_a_loss_factor_on_a_negative_spring_needs_a_reference() -> None:
    system = chain([9.0], [0.2]).with_values(
        stiffness=np.array([-5.0]), loss_factor=np.array([0.1]), loss_reference=np.array([np.nan])
    )
    with pytest.raises(mdof.UnverifiedError, match="reference_frequency"):
        mdof.solve(system)
