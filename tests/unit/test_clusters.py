"""mdof.eigen.clusters: roots that rounding cannot tell apart."""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest

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
    mean, _, clustered = average_clusters(values, np.full(2, 1e-9), np.zeros(2, dtype=int), partner, [state])
    assert mean == pytest.approx([-1, -1], rel=1e-15)
    assert clustered.all()
    assert partner.tolist() == [1, 0]


def test_a_complex_pair_about_to_reach_the_axis_is_put_on_it() -> None:
    state = np.array([[0.0, 1.0], [-1.0, -2.0]])
    values = np.array([-1 + 1e-9j])
    mean, _, _ = average_clusters(values, np.array([1e-8]), np.zeros(1, dtype=int), np.array([-1]), [state])
    assert mean[0].imag == 0


def test_roots_apart_are_left_alone() -> None:
    values = np.array([-1 + 2j, -1 + 2.001j])
    same, bounds, clustered = average_clusters(
        values, np.full(2, 1e-12), np.zeros(2, dtype=int), np.array([-1, -1]), [np.eye(4)]
    )
    assert same.tolist() == values.tolist()
    assert bounds.tolist() == [1e-12, 1e-12]
    assert not clustered.any()
