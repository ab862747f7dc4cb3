"""mdof.modes.analysis: the front door of a solve."""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest

import mdof
from mdof import Regime, System, UnverifiedError, UsageError


def row(n: int, damping: float = 0.01) -> System:
    """n unit masses in a row between walls, springs 1, damping proportional to stiffness."""
    K = 2 * np.eye(n) - np.eye(n, k=1) - np.eye(n, k=-1)
    return System.from_matrices(np.eye(n), damping * K, K)


@pytest.mark.parametrize(
    ("options", "words"),
    [
        ({"method": "magic"}, "'magic'"),
        ({"count": 0}, "positive"),
        ({"count": 1.5}, "positive"),
        ({"count": True}, "positive"),
        ({"near": 3.0}, "near goes with count"),
        ({"count": 1, "near": -1.0}, "rad/s"),
        ({"count": 1, "near": float("nan")}, "rad/s"),
    ],
)
def test_wrong_options_are_refused(options: dict[str, object], words: str) -> None:
    with pytest.raises(UsageError, match=words):
        mdof.solve(row(3), **options)


def test_only_a_system_is_solved() -> None:
    with pytest.raises(UsageError, match=r"mdof\.assemble"):
        mdof.solve({"bodies": {}})


def test_count_and_near_choose_the_nearest_modes_and_keep_their_order() -> None:
    every = mdof.solve(row(8))
    some = mdof.solve(row(8), count=3, near=float(every.natural_frequencies[4]))
    assert some.natural_frequencies == pytest.approx(every.natural_frequencies[3:6], rel=1e-14)
    assert [mode.number for mode in some] == [1, 2, 3]


def test_equal_frequencies_are_ordered_by_decay() -> None:
    modes = mdof.solve(System.from_matrices(np.eye(3), np.diag([0.3, 0.1, 0.2]), np.eye(3)))
    assert modes.decay_rates == pytest.approx([0.05, 0.1, 0.15], rel=1e-13)


def test_shapes_are_scaled_to_the_largest_and_real_where_most_energy_is() -> None:
    modes = mdof.solve(System.from_matrices(np.diag([1.0, 10.0]), [[0.5, 0.0], [0.0, 0.0]], [[3.0, -1.0], [-1.0, 4.0]]))
    for mode in modes:
        assert np.abs(mode.shape).max() == pytest.approx(1.0, rel=1e-14)
        leader = int(np.argmax(np.array([1.0, 10.0]) * np.abs(mode.shape) ** 2))
        assert mode.shape[leader].imag == 0
        assert mode.shape[leader].real > 0


def test_every_pair_solves_the_equation_of_motion() -> None:
    rng = np.random.default_rng(1)
    factor = rng.normal(size=(5, 5))
    M, C, K = np.diag([1.0, 2.0, 3.0, 4.0, 5.0]), factor @ factor.T, 50 * np.eye(5) + np.ones((5, 5))
    for mode in mdof.solve(System.from_matrices(M, C, K)):
        for value, shape in ((mode.eigenvalues[0], mode.shape), (mode.eigenvalues[-1], mode.fast_shape)):
            if shape is not None:
                assert np.linalg.norm((value**2 * M + value * C + K) @ shape) < 1e-12 * np.linalg.norm(K)


def test_a_mass_matrix_that_no_body_has_is_refused() -> None:
    with pytest.raises(UnverifiedError, match="positive semidefinite"):
        mdof.solve(System.from_matrices([[1.0, 2.0], [2.0, 1.0]], np.zeros((2, 2)), np.eye(2)))


def test_a_massless_coordinate_that_nothing_holds_is_refused() -> None:
    with pytest.raises(UnverifiedError, match="neither stiffness nor damping"):
        mdof.solve(System.from_matrices(np.diag([1.0, 0.0]), np.zeros((2, 2)), np.diag([1.0, 0.0])))


@pytest.mark.parametrize("coupled", [False, True])
def test_a_frequency_that_rounding_decides_is_refused(coupled: bool) -> None:
    """Stiffness 16 left over from entries of 2e14: a few per cent of it are anybody's guess."""
    big = 2e14
    C = np.diag([1e-3, 2e-3 if coupled else 1e-3])
    with pytest.raises(UnverifiedError, match="rounding"):
        mdof.solve(System.from_matrices(np.eye(2), C, [[big, -big], [-big, big + 16]]))


@pytest.mark.parametrize("coupled", [False, True])
def test_a_stated_bound_covers_what_a_rounded_matrix_hides(coupled: bool) -> None:
    """The low root of [[b, −b], [−b, b + 16]] is known: ω² = b + 8 − sqrt(b² + 64)."""
    big = 1e10
    C = np.diag([1e-3, 2e-3 if coupled else 1e-3])
    low = mdof.solve(System.from_matrices(np.eye(2), C, [[big, -big], [-big, big + 16]]))[0]
    with mp.workdps(40):
        truth = mp.sqrt(big + 8 - mp.sqrt(mp.mpf(big) ** 2 + 64))
        error = float(abs(low.natural_frequency / truth - 1))
    assert low.frequency_bound is not None
    assert error < low.frequency_bound < 1e-4


def test_results_cannot_be_changed() -> None:
    modes = mdof.solve(row(2))
    with pytest.raises(ValueError, match="read-only"):
        modes.natural_frequencies[0] = 1.0


def test_growth_is_named() -> None:
    modes = mdof.solve(System.from_matrices(np.eye(2), np.diag([-0.1, 0.1]), np.diag([1.0, -4.0])))
    assert set(modes.regimes) == {Regime.UNSTABLE, Regime.DIVERGENT}
    assert {"unstable-mode", "divergent-mode"} <= {finding.code for finding in modes.findings}


def test_lapack_threads_are_given_back() -> None:
    from threadpoolctl import threadpool_info

    before = [(entry["internal_api"], entry["num_threads"]) for entry in threadpool_info()]
    mdof.solve(row(4))
    assert [(entry["internal_api"], entry["num_threads"]) for entry in threadpool_info()] == before
