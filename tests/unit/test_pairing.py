"""mdof.modes.pairing: which real roots belong to one oscillator."""

from __future__ import annotations

import dataclasses

import numpy as np
import pytest

import mdof
from mdof import Regime
from mdof.eigen.quadratic import Roots
from mdof.modes.pairing import pair_roots


def solve(M: object, C: object, K: object) -> mdof.DampedModes:
    return mdof.solve(mdof.System.from_matrices(M, C, K))


def test_interlaced_real_roots_of_two_oscillators_keep_their_partners() -> None:
    """(m, c, k) = (1, 10, 1) and (1, 5, 4): sorting and taking neighbours would be wrong."""
    modes = solve(np.eye(2), np.diag([10.0, 5.0]), np.diag([1.0, 4.0]))
    assert [mode.regime for mode in modes] == [Regime.OVERDAMPED] * 2
    assert modes.natural_frequencies == pytest.approx([1.0, 2.0], rel=1e-13)
    assert modes.damping_ratios == pytest.approx([5.0, 1.25], rel=1e-13)


def test_interlaced_real_roots_of_coupled_oscillators_keep_their_partners() -> None:
    """The same two, turned and lightly coupled, so that shapes must tell."""
    turn = np.array([[0.8, -0.6], [0.6, 0.8]])
    C = turn @ (np.diag([10.0, 5.0]) + 0.01 * np.ones((2, 2))) @ turn.T
    modes = solve(np.eye(2), C, turn @ np.diag([1.0, 4.0]) @ turn.T)
    assert modes.natural_frequencies == pytest.approx([1.0, 2.0], rel=1e-2)
    assert modes.damping_ratios == pytest.approx([5.0, 1.25], rel=1e-2)


def test_leftover_roots_of_unlike_shape_are_not_forced_together() -> None:
    """Inman & Andry's example: −0.476 and −10.71 belong to different oscillators."""
    modes = solve(np.eye(2), [[2.5, 1.3], [1.3, 12.0]], np.diag([1.0, 16.0]))
    singles = [mode for mode in modes if len(mode.eigenvalues) == 1]
    assert sorted(mode.eigenvalues[0].real for mode in singles) == pytest.approx([-10.71, -0.476], rel=2e-3)
    assert {mode.regime for mode in singles} == {Regime.OVERDAMPED}
    assert all(mode.damping_ratio is None for mode in singles)
    assert "partner-unresolved" in {finding.code for finding in modes.findings}


def test_there_is_no_relaxation_without_a_first_order_state() -> None:
    rng = np.random.default_rng(3)
    for _ in range(20):
        factor = rng.normal(size=(3, 3))
        modes = solve(np.eye(3), 4 * factor @ factor.T, np.diag([1.0, 2.0, 3.0]))
        assert Regime.RELAXATION not in modes.regimes


def test_as_many_relaxation_roots_as_first_order_states() -> None:
    """A damped massless coordinate: 2·2 + 1 roots, one of them without partner."""
    modes = solve(
        np.diag([1.0, 1.0, 0.0]),
        np.diag([0.0, 0.0, 3.0]),
        [[5.0, -2.0, 0.0], [-2.0, 5.0, -3.0], [0.0, -3.0, 3.0]],
    )
    assert modes.regimes.count(Regime.RELAXATION) == 1
    assert modes.verification.eigenvalues_found == 5


def test_free_motions_that_a_damper_slows_find_their_own_decay() -> None:
    """Two bodies coasting, each with its own drag: (0, −c/m) twice."""
    modes = solve(np.diag([2.0, 5.0]), np.diag([1.0, 4.0]), np.zeros((2, 2)))
    assert modes.regimes == (Regime.RIGID_BODY,) * 2
    assert sorted(mode.decay_rate for mode in modes) == pytest.approx([0.5, 0.8], rel=1e-14)
    for mode in modes:
        # The zero root moves the same body as the decay it is paired with.
        assert mode.fast_shape is not None
        assert np.argmax(np.abs(mode.shape)) == np.argmax(np.abs(mode.fast_shape))


def hand_made(values: list[float], signs: list[int], shapes: list[list[float]], light: int = 0) -> Roots:
    """Real roots of one block with the sign of the slope and the shape given; the last ``light`` rows are massless."""
    count = len(values)
    vectors = np.array(shapes, dtype=complex).T
    return Roots(
        values=np.array(values, dtype=complex),
        computed=np.array(values, dtype=complex),
        vectors=np.vstack([vectors, np.zeros((light, count))]),
        left=None,
        bounds=np.zeros(count),
        backward=np.zeros(count),
        block=np.zeros(count, dtype=int),
        partner=np.full(count, -1),
        clustered=np.zeros(count, dtype=bool),
        slope=np.array(signs, dtype=complex),
        count=count,
        method="",
    )


def turned(share: float) -> list[float]:
    """A unit shape whose assurance criterion with the first coordinate is ``share``."""
    return [np.sqrt(share), np.sqrt(1 - share)]


@pytest.mark.parametrize(("share", "paired"), [(0.51, True), (0.49, False)])
def test_a_pair_needs_half_of_full_likeness(share: float, paired: bool) -> None:
    pairing = pair_roots(hand_made([-1.0, -9.0], [1, -1], [[1.0, 0.0], turned(share)]), 2)
    assert sorted(pairing.pairs) == ([(0, 1)] if paired else [(0, -1), (1, -1)])
    assert pairing.unresolved == (set() if paired else {0, 1})
    assert pairing.relaxation == set()


@pytest.mark.parametrize(("share", "paired"), [(0.68, True), (0.65, False)])
def test_a_pair_needs_twice_the_likeness_of_any_other(share: float, paired: bool) -> None:
    """Two slow roots along the axes; both fast ones lean: the runner-up of each has 1 − share."""
    a, b = turned(share)
    pairing = pair_roots(
        hand_made([-1.0, -2.0, -8.0, -9.0], [1, 1, -1, -1], [[1.0, 0.0], [0.0, 1.0], [-b, a], [a, b]]), 2
    )
    assert (0, 3) in pairing.pairs if paired else (0, -1) in pairing.pairs
    assert (1, 2) in pairing.pairs if paired else (1, -1) in pairing.pairs
    assert len(pairing.unresolved) == (0 if paired else 4)


def test_a_rival_of_the_fast_root_alone_is_enough_to_doubt() -> None:
    """Two slow roots of almost one shape, one fast root: nobody can tell whose it is."""
    pairing = pair_roots(hand_made([-1.0, -2.0, -9.0], [1, 1, -1], [[1.0, 0.0], turned(0.9), turned(0.99)]), 2)
    assert {pair[1] for pair in pairing.pairs} == {-1}
    assert pairing.unresolved == {0, 1, 2}


def test_surplus_slow_roots_relax_only_as_far_as_there_are_first_order_states() -> None:
    """Three slow roots, one fast, one massless coordinate: the one least like any fast root relaxes, one stays open."""
    shapes = [[0.0, 1.0], [1.0, 0.0], turned(0.2), [1.0, 0.0]]
    pairing = pair_roots(hand_made([-1.0, -2.0, -3.0, -9.0], [1, 1, 1, -1], shapes, light=1), 2)
    assert (1, 3) in pairing.pairs
    assert (pairing.relaxation, pairing.unresolved) == ({0}, {2})


@pytest.mark.parametrize("light", [1, 2])
def test_first_order_states_are_shared_out_over_all_blocks(light: int) -> None:
    """One surplus root in each of two blocks: with a single massless coordinate only one of them may relax."""
    roots = hand_made([-1.0, -2.0], [1, 1], [[1.0, 0.0], [0.0, 1.0]], light=light)
    pairing = pair_roots(dataclasses.replace(roots, block=np.array([0, 1])), 2)
    assert len(pairing.relaxation) == light
    assert len(pairing.unresolved) == 2 - light


def test_a_known_partner_is_taken_slow_root_first() -> None:
    roots = hand_made([-9.0, -1.0, -3.0], [-1, 1, 1], [[1.0, 0.0], [1.0, 0.0], [0.0, 1.0]])
    pairing = pair_roots(dataclasses.replace(roots, partner=np.array([1, 0, 2])), 2)
    assert sorted(pairing.pairs) == [(1, 0), (2, 2)]


def test_the_sign_of_a_slope_does_not_depend_on_how_left_vectors_are_scaled() -> None:
    roots = hand_made([-1.0, -9.0], [1, -1], [[1.0, 0.0], [1.0, 0.0]])
    flipped = dataclasses.replace(roots, left=-roots.vectors, slope=-roots.slope)
    assert pair_roots(flipped, 2).pairs == pair_roots(dataclasses.replace(roots, left=roots.vectors), 2).pairs
    assert pair_roots(flipped, 2).pairs == [(0, 1)]


def test_equal_zero_roots_are_turned_to_the_decays_they_belong_to() -> None:
    """Two free masses told by an arbitrary basis; each decay takes the zero root of its own shape."""
    c, s = np.cos(0.3), np.sin(0.3)
    roots = hand_made([0.0, 0.0, -2.0, -3.0], [1, 1, -1, -1], [[c, s], [-s, c], [1.0, 0.0], [0.0, 1.0]])
    pairing = pair_roots(roots, 2)
    for zero, fast in pairing.pairs:
        likeness = abs(np.vdot(pairing.vectors[:, zero], roots.vectors[:, fast]))
        assert likeness == pytest.approx(1.0, rel=1e-14)
    assert {fast for _, fast in pairing.pairs} == {2, 3}


def test_a_free_motion_leaves_a_decay_of_another_shape_to_others() -> None:
    """One free mass without drag beside an overdamped one: the fast root is no decay of the free motion."""
    pairing = pair_roots(hand_made([0.0, -1.0, -9.0], [1, 1, -1], [[1.0, 0.0], [0.0, 1.0], [0.1, 1.0]]), 2)
    assert sorted(pairing.pairs) == [(0, -1), (1, 2)]


@pytest.mark.parametrize("drags", [(1.0, 4.0), (4.0, 1.0)])
def test_of_more_decays_than_free_motions_the_likest_are_taken(drags: tuple[float, float]) -> None:
    """One free motion along the first coordinate; of two decays the one along it is its own, in whatever order."""
    shapes = [[1.0, 0.0], [0.0, 1.0], [0.8, 0.6], [1.0, 0.1]]
    pairing = pair_roots(hand_made([0.0, -1.0, -2.0 * drags[0], -2.0 * drags[1]], [1, 1, -1, -1], shapes), 2)
    assert (0, 3) in pairing.pairs


def test_complex_shapes_are_alike_whatever_their_common_phase() -> None:
    roots = hand_made([-1.0, -9.0], [1, -1], [[1.0, 0.5], [1.0, 0.5]])
    turned_by = roots.vectors * np.array([np.exp(0.7j), np.exp(-0.4j)])
    skewed = roots.vectors * np.array([[1.0, 1.0], [1j, 1j]])
    for vectors in (turned_by, skewed):
        assert pair_roots(dataclasses.replace(roots, vectors=vectors), 2).pairs == [(0, 1)]


def test_likeness_counts_massive_coordinates_only() -> None:
    """Two shapes that agree in what has mass belong together however their massless part differs."""
    roots = hand_made([-1.0, -9.0], [1, -1], [[1.0, 0.0], [1.0, 0.0]], light=1)
    vectors = roots.vectors.copy()
    vectors[2] = [50.0, -80.0]
    assert pair_roots(dataclasses.replace(roots, vectors=vectors), 2).pairs == [(0, 1)]
