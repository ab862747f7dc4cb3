"""mdof.eigen.clusters: roots that rounding cannot tell apart."""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest
import scipy.linalg

import mdof
from mdof.eigen.clusters import average_clusters


def test_the_mean_of_a_defective_pair_is_accurate_where_each_member_is_not() -> None:
    """M = I, C = diag(1, 0), K = [[4.25, −1], [−1, 4]]: the double pair −0.25 ± i sqrt(63)/4."""
    modes = mdof.solve(mdof.System.from_matrices(np.eye(2), np.diag([1.0, 0.0]), [[4.25, -1.0], [-1.0, 4.0]]))
    with mp.workdps(30):
        truth = mp.mpc(-0.25, mp.sqrt(63) / 4)
        for mode in modes:
            assert abs(mp.mpc(mode.eigenvalues[0]) - truth) < 2e-15
    assert modes.damping_ratios == pytest.approx(0.125, rel=1e-15)


def test_real_roots_about_to_meet_share_their_mean() -> None:
    state = np.array([[0.0, 1.0], [-1.0, -2.0]])
    values = np.array([-1 + 1e-9, -1 - 1e-9], dtype=complex)
    partner = np.array([-1, -1])
    mean, _, clustered = average_clusters(
        values, np.full(2, 1e-9), np.zeros(2, dtype=int), partner, [state], np.ones(len(values), dtype=bool)
    )
    assert mean == pytest.approx([-1, -1], rel=1e-15)
    assert clustered.all()
    assert partner.tolist() == [1, 0]


def test_a_complex_pair_about_to_reach_the_axis_is_put_on_it() -> None:
    state = np.array([[0.0, 1.0], [-1.0, -2.0]])
    values = np.array([-1 + 1e-9j])
    mean, _, _ = average_clusters(
        values, np.array([1e-8]), np.zeros(1, dtype=int), np.array([-1]), [state], np.ones(1, dtype=bool)
    )
    assert mean[0].imag == 0


def test_roots_apart_are_left_alone() -> None:
    values = np.array([-1 + 2j, -1 + 2.001j])
    same, bounds, clustered = average_clusters(
        values, np.full(2, 1e-12), np.zeros(2, dtype=int), np.array([-1, -1]), [np.eye(4)], np.ones(2, dtype=bool)
    )
    assert same.tolist() == values.tolist()
    assert bounds.tolist() == [1e-12, 1e-12]
    assert not clustered.any()


def put_together(
    values: list[complex], bounds: float, state: np.ndarray, block: list[int] | None = None
) -> tuple[np.ndarray, np.ndarray, np.ndarray, list[int]]:
    partner = np.full(len(values), -1)
    number = np.zeros(len(values), dtype=int) if block is None else np.array(block)
    mean, bound, clustered = average_clusters(
        np.array(values, dtype=complex),
        np.full(len(values), bounds),
        number,
        partner,
        [state] * (number.max() + 1),
        np.ones(len(values), dtype=bool),
    )
    return mean, bound, clustered, partner.tolist()


def chain_state(values: list[float], coupling: float = 1.0) -> np.ndarray:
    """Upper triangular, with the values on the diagonal and every neighbour coupled."""
    return np.diag(np.array(values)) + coupling * np.eye(len(values), k=1)


def test_equal_roots_of_uncoupled_motions_stay_apart() -> None:
    values = [-1 + 1e-9, -1 - 1e-9]
    mean, _, clustered, partner = put_together(values, 1e-9, chain_state([-1.0, -1.0]), [0, 1])
    assert mean.tolist() == values
    assert not clustered.any()
    assert partner == [-1, -1]


def test_three_real_roots_share_a_mean_and_one_of_them_goes_without_a_partner() -> None:
    values = [-1 + 1e-6, -1 - 1e-6, -1 + 1e-6, -5.0]
    mean, bound, clustered, partner = put_together(values, 1e-6, chain_state([-1.0, -1.0, -1.0, -5.0]))
    assert mean[:3] == pytest.approx([-1 + 1e-6 / 3] * 3, rel=1e-14)
    assert clustered.tolist() == [True, True, True, False]
    assert partner == [1, 0, -1, -1]
    # The bound covers how far the members were from their mean.
    assert np.all(bound[:3] >= 1.3e-6)
    assert bound[3] == 1e-6


def test_a_complex_pair_counts_twice_beside_a_real_root_on_the_axis() -> None:
    """The three roots −1 + 2d, −1 ± i√3 d have the mean −1 + 2d/3."""
    d = 1e-7
    values = [-1 - d + 1j * np.sqrt(3) * d, -1 + 2 * d]
    mean, _, clustered, partner = put_together(values, 2 * d, chain_state([-1.0, -1.0, -1.0]))
    assert mean == pytest.approx([-1.0, -1.0], rel=1e-14)
    assert clustered.all()
    assert partner == [0, -1]


def test_two_complex_pairs_that_collide_off_the_axis_keep_their_imaginary_part() -> None:
    """Off the axis nothing is a partner: each pair has its own conjugate."""
    mean, _, clustered, partner = put_together([-1 + 2j + 1e-8, -1 + 2j - 1e-8], 1e-8, np.eye(4))
    assert mean == pytest.approx([-1 + 2j] * 2, rel=1e-15)
    assert clustered.all()
    assert partner == [-1, -1]


def test_a_complex_pair_near_the_axis_is_not_joined_to_its_mirror_where_the_bound_is_small() -> None:
    mean, _, clustered, partner = put_together([-1 + 1e-6j], 1e-8, chain_state([-1.0, -1.0]))
    assert mean.tolist() == [-1 + 1e-6j]
    assert not clustered.any()
    assert partner == [-1]


def test_no_bound_however_large_joins_roots_more_than_a_few_millionths_apart() -> None:
    mean, *_ = put_together([-1.0, -1.00001], 1e3, chain_state([-1.0, -1.00001]))
    assert mean.tolist() == [-1.0, -1.00001]
    mean, *_ = put_together([-1.0, -1.000001], 1e3, chain_state([-1.0, -1.000001]))
    assert mean.tolist() == pytest.approx([-1.0000005] * 2, rel=1e-15)


def test_zero_roots_and_blocks_without_a_state_matrix_are_left_alone() -> None:
    partner = np.array([-1, -1])
    values = np.zeros(2, dtype=complex)
    same, *_ = average_clusters(
        values, np.full(2, 1e-9), np.zeros(2, dtype=int), partner, [np.eye(2)], np.ones(2, dtype=bool)
    )
    assert same.tolist() == [0, 0]
    values = np.array([-1.0, -1.0 - 1e-12], dtype=complex)
    same, _, clustered = average_clusters(
        values, np.full(2, 1e-9), np.zeros(2, dtype=int), partner, [None], np.ones(2, dtype=bool)
    )
    assert same.tolist() == values.tolist()
    assert not clustered.any()


@pytest.mark.parametrize("coupling", [0.0, 10.0, 1e4])
def test_the_mean_is_as_well_known_as_its_subspace_stands_apart(coupling: float) -> None:
    """Double root −1 and −3 coupled by t: the projector onto the cluster has the norm sqrt(1 + |R|²), AR − RB = T."""
    state = np.array([[-1.0, 1.0, 0.0], [0.0, -1.0, coupling], [0.0, 0.0, -3.0]])
    mean, bound, *_ = put_together([-1 + 1e-12, -1 - 1e-12, -3.0], 1e-12, state)
    R = scipy.linalg.solve_sylvester(state[:2, :2], np.array([[3.0]]), state[:2, 2:])
    projector = np.sqrt(1 + np.linalg.norm(R) ** 2)
    known = 8 * 3 * 2.0**-52 * np.linalg.norm(state) * projector
    # Rounding ``known`` of a block with the off-diagonal 1 splits its double root by the square root of known * 1.
    wanted = known + np.abs(mean[0] - (-1 + 1e-12)) + np.sqrt(known)
    assert bound[:2] == pytest.approx([wanted] * 2, rel=1e-6)
    # One cluster that is all there is needs no projector.
    _, whole, *_ = put_together([-1 + 1e-12, -1 - 1e-12], 1e-12, state[:2, :2])
    known = 8 * 2 * 2.0**-52 * np.sqrt(3.0)
    assert whole == pytest.approx([known + 1e-12 + np.sqrt(known)] * 2, rel=1e-3)


def test_pairs_that_reach_the_axis_at_different_places_stay_apart() -> None:
    mean, _, clustered, partner = put_together([-1 + 1e-9j, -5 + 1e-9j], 1e-8, chain_state([-1.0, -1.0, -5.0, -5.0]))
    assert mean == pytest.approx([-1.0, -5.0], rel=1e-15)
    assert (mean.imag == 0).all()
    assert clustered.all()
    assert partner == [0, 1]


@pytest.mark.parametrize("coupling", [0.0, 1e3])
def test_the_mean_of_colliding_pairs_is_as_well_known_as_their_subspace(coupling: float) -> None:
    """A double pair −1 ± 2i coupled to a single one at −3 ± 5i: the projector onto the double one."""
    turn = np.array([[-1.0, 2.0], [-2.0, -1.0]])
    double = np.block([[turn, np.eye(2)], [np.zeros((2, 2)), turn]])
    single = np.array([[-3.0, 5.0], [-5.0, -3.0]])
    link = np.zeros((4, 2))
    link[2, 0] = coupling
    state = np.block([[double, link], [np.zeros((2, 4)), single]])
    d = 1e-12
    _, bound, clustered, partner = put_together([-1 + 2j + d, -1 + 2j - d, -3 + 5j], d, state)
    R = scipy.linalg.solve_sylvester(double, -single, link)
    projector = np.sqrt(1 + np.linalg.norm(R) ** 2)
    known = 8 * 6 * 2.0**-52 * np.linalg.norm(state) * projector
    wanted = known + d + np.sqrt(known)
    # LAPACK bounds the norm of R by its Frobenius norm.
    assert bound[:2] == pytest.approx([wanted] * 2, rel=1e-3)
    assert clustered.tolist() == [True, True, False]
    assert partner == [-1, -1, -1]


def test_equal_real_roots_of_unlike_motions_are_no_pair() -> None:
    values = np.array([-1.0, -1.0], dtype=complex)
    partner, state = np.array([-1, -1]), np.diag([-1.0, -1.0])
    same, _, clustered = average_clusters(
        values, np.full(2, 1e-9), np.zeros(2, dtype=int), partner, [state], np.zeros(2, dtype=bool)
    )
    assert same.tolist() == values.tolist()
    assert not clustered.any()
    assert partner.tolist() == [-1, -1]
