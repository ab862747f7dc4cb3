"""mdof.modes.analysis: the front door of a solve."""

from __future__ import annotations

import dataclasses
from collections.abc import Callable

import mpmath as mp
import networkx as nx
import numpy as np
import pytest

import mdof
from mdof import Regime, System, UnverifiedError, UsageError
from mdof.eigen.quadratic import Roots


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


def test_more_modes_than_there_are_is_all_of_them_and_zero_is_the_lowest() -> None:
    every = mdof.solve(row(4))
    assert mdof.solve(row(4), count=9).natural_frequencies == pytest.approx(every.natural_frequencies, rel=1e-14)
    assert mdof.solve(row(4), count=2).natural_frequencies == pytest.approx(every.natural_frequencies[:2], rel=1e-14)
    top = mdof.solve(row(4), count=np.int64(1), near=1e6)
    assert top.natural_frequencies == pytest.approx(every.natural_frequencies[3:], rel=1e-14)
    assert top.verification.eigenvalues_found == 8


@pytest.mark.parametrize(("apart", "by_decay"), [(4e-10, True), (1e-8, False)])
def test_frequencies_count_as_equal_to_a_billionth(apart: float, by_decay: bool) -> None:
    """The slightly higher one decays less; it comes first only where the two count as equal."""
    k = np.array([1.0, 1.0 + 2 * apart])
    modes = mdof.solve(System.from_matrices(np.eye(2), np.diag([0.2, 0.1]), np.diag(k)))
    assert modes.decay_rates == pytest.approx([0.05, 0.1] if by_decay else [0.1, 0.05], rel=1e-6)


def test_single_roots_are_ordered_by_their_size_among_the_frequencies() -> None:
    """A relaxation root of size 3 between oscillations at 1 and 5."""
    M, C = np.diag([1.0, 1.0, 0.0]), np.diag([0.0, 0.0, 2.0])
    modes = mdof.solve(System.from_matrices(M, C, np.diag([1.0, 25.0, 6.0])))
    assert [mode.regime.value for mode in modes] == ["undamped", "relaxation", "undamped"]
    assert modes[1].eigenvalues == pytest.approx((-3.0,), rel=1e-14)
    assert modes[1].natural_frequency is None


def test_of_equally_energetic_coordinates_the_first_is_real_and_positive() -> None:
    modes = mdof.solve(System.from_matrices(np.eye(2), np.zeros((2, 2)), [[2.0, -1.0], [-1.0, 2.0]]))
    assert modes.shapes[0].tolist() == [1.0, 1.0]
    assert modes.shapes[1].real == pytest.approx([1.0, -1.0], rel=1e-14)


def test_both_shapes_of_a_real_pair_are_scaled_and_solve_their_own_root() -> None:
    M, C, K = np.diag([1.0, 4.0]), np.array([[9.0, -1.0], [-1.0, 30.0]]), np.array([[3.0, -1.0], [-1.0, 6.0]])
    modes = mdof.solve(System.from_matrices(M, C, K))
    assert set(modes.regimes) == {Regime.OVERDAMPED}
    for mode in modes:
        assert len(mode.eigenvalues) == 2
        assert mode.fast_shape is not None
        assert mode.eigenvalues[0].real > mode.eigenvalues[1].real
        for value, shape in zip(mode.eigenvalues, (mode.shape, mode.fast_shape), strict=True):
            assert np.abs(shape).max() == pytest.approx(1.0, rel=1e-14)
            assert np.linalg.norm((value**2 * M + value * C + K) @ shape) < 1e-12 * 100
            leader = int(np.argmax(np.diag(M) * np.abs(shape) ** 2))
            assert shape[leader].imag == 0
            assert shape[leader].real > 0


def test_described_and_reduced_shapes_are_one_motion() -> None:
    """A rider on a rigid link is described but not a coordinate."""
    model = mdof.Model(
        bodies={"host": "2 kg", "rider": "5 kg", "other": "1 kg"},
        connections={
            "seat": {"rigid": ["host", "rider"]},
            "s": {"between": ["host", "ground"], "stiffness": "50 N/m", "damping": "2 N*s/m"},
            "t": {"between": ["other", "host"], "stiffness": "70 N/m", "damping": "1 N*s/m"},
        },
    )
    system = mdof.assemble(model)
    modes = mdof.solve(system)
    assert modes.shapes == pytest.approx(system.recovery.toarray() @ modes.reduced_shapes, rel=1e-14)
    assert modes.reduced_shapes.shape[0] == 2


def test_the_undamped_frequency_beside_a_mode_is_the_one_nearest_in_shape() -> None:
    """Two unlike oscillators barely tied; a free motion has none."""
    modes = mdof.solve(System.from_matrices(np.eye(2), np.diag([0.5, 0.1]), [[4.0, -0.01], [-0.01, 9.0]]))
    assert modes.undamped_frequencies == pytest.approx([2.0, 3.0], rel=1e-4)
    assert modes.shortcut_damping_ratios == pytest.approx([0.125, 0.1 / 6], rel=1e-4)
    free = mdof.solve(System.from_matrices(np.eye(1), np.eye(1), np.zeros((1, 1))))[0]
    assert (free.undamped_frequency, free.shortcut_damping_ratio, free.natural_frequency) == (None, None, None)


def broken(monkeypatch: pytest.MonkeyPatch, **changes: Callable[[Roots], object]) -> System:
    """A system whose solver hands back roots that are wrong in one way."""
    from mdof.modes import analysis

    right = analysis.solve_complete

    def wrong(*arguments: object) -> Roots:
        roots = right(*arguments)
        return dataclasses.replace(roots, **{name: change(roots) for name, change in changes.items()})

    monkeypatch.setattr(analysis, "solve_complete", wrong)
    return System.from_matrices(np.eye(2), [[0.3, 0.1], [0.1, 0.5]], np.diag([1.0, 9.0]))


def test_a_root_off_by_a_millionth_never_passes_the_gate(monkeypatch: pytest.MonkeyPatch) -> None:
    off = broken(monkeypatch, values=lambda r: r.values * (1 + 1e-6), computed=lambda r: r.computed * (1 + 1e-6))
    with pytest.raises(UnverifiedError, match=r"residual .* times n times the unit roundoff; 10 is the limit"):
        mdof.solve(off)


def test_a_backward_error_of_the_solver_counts_too(monkeypatch: pytest.MonkeyPatch) -> None:
    """The gate is 10·n·2⁻⁵²: just below passes, just above does not."""
    limit = 10 * 2 * 2.0**-52
    assert (
        mdof.solve(broken(monkeypatch, backward=lambda r: r.backward + 0.9 * limit)).verification.status == "verified"
    )
    monkeypatch.undo()
    with pytest.raises(UnverifiedError, match="residual"):
        mdof.solve(broken(monkeypatch, backward=lambda r: r.backward + 1.1 * limit))


def test_a_missing_eigenvalue_is_never_passed_over(monkeypatch: pytest.MonkeyPatch) -> None:
    with pytest.raises(UnverifiedError, match="3 eigenvalues found where 4 are expected"):
        mdof.solve(broken(monkeypatch, count=lambda r: r.count - 1))


@pytest.mark.parametrize(("bound", "accepted"), [(0.009, True), (0.011, False), (np.inf, False)])
def test_a_bound_above_one_per_cent_is_no_answer(monkeypatch: pytest.MonkeyPatch, bound: float, accepted: bool) -> None:
    system = broken(monkeypatch, bounds=lambda r: bound * np.abs(r.values))
    if accepted:
        modes = mdof.solve(system)
        assert modes.verification.largest_frequency_bound == pytest.approx(bound, rel=1e-6)
        assert "ill-conditioned-mode" in {finding.code for finding in modes.findings}
    else:
        with pytest.raises(UnverifiedError, match="rounding of the given numbers alone"):
            mdof.solve(system)


def test_the_verification_quotes_the_worst_of_all_modes() -> None:
    modes = mdof.solve(row(6))
    verification = modes.verification
    assert verification.largest_frequency_bound == pytest.approx(max(modes.frequency_bounds))
    assert verification.largest_scaled_residual == pytest.approx(max(modes.backward_errors) / (6 * 2.0**-52))
    assert (verification.eigenvalues_expected, verification.eigenvalues_found) == (12, 12)


def test_a_breakdown_in_linear_algebra_is_a_refusal_with_advice(monkeypatch: pytest.MonkeyPatch) -> None:
    def breaks(*_: object) -> None:
        raise np.linalg.LinAlgError("it did not converge")

    monkeypatch.setattr("mdof.modes.analysis.normalise", breaks)
    with pytest.raises(UnverifiedError, match="it did not converge"):
        mdof.solve(row(2))


def test_loss_references_are_told_in_hertz() -> None:
    graph = nx.MultiGraph(directions=("x",), damping={})
    graph.add_node("ground", kind="ground")
    graph.add_node("a", mass=1.0)
    for index in range(6):
        data = {"stiffness": 9.0, "loss_factor": 0.1} | (
            {"reference_frequency": 2 * np.pi * (index + 1)} if index else {}
        )
        graph.add_edge("a", "ground", key=f"s{index}", between=("a", "ground"), **data)
    system = mdof.assemble(graph)
    assert mdof.solve(system).loss_reference == (
        "as dashpots matched at 2 Hz, 3 Hz, 4 Hz, 5 Hz and others and as dashpots matched at each mode's own frequency"
    )
    lone = system.with_values(loss_factor=np.array([0.0, 0.1, 0, 0, 0, 0.0]))
    assert mdof.solve(lone).loss_reference == "as dashpots matched at 2 Hz"
    assert mdof.solve(row(2)).loss_reference == ""


def test_near_must_be_a_number() -> None:
    with pytest.raises(mdof.UsageError, match="near"):
        mdof.solve(mdof.System.from_matrices([[1.0]], [[0.0]], [[1.0]]), count=1, near="3 Hz")
