"""mdof.modes.regime: what a mode is called, at and around every border."""

from __future__ import annotations

import math

import mpmath as mp
import numpy as np
import pytest

import mdof
from mdof.modes.regime import Regime, classify, time_to_two_percent

EXACT = (1e-15, 1e-15)


def pair(omega: float, ratio: float) -> tuple[complex, complex]:
    """The two roots of one oscillator, slow first."""
    if ratio < 1:
        root = complex(-ratio * omega, omega * math.sqrt(1 - ratio**2))
        return root, root.conjugate()
    spread = math.sqrt(ratio**2 - 1)
    return complex(-omega / (ratio + spread)), complex(-omega * (ratio + spread))


@pytest.mark.parametrize(
    ("ratio", "regime"),
    [
        (0.0, Regime.UNDAMPED),
        (1e-9, Regime.UNDERDAMPED),
        (0.5, Regime.UNDERDAMPED),
        (1 - 1e-6, Regime.UNDERDAMPED),
        (1.0, Regime.CRITICALLY_DAMPED),
        (1 + 1e-6, Regime.OVERDAMPED),
        (40.0, Regime.OVERDAMPED),
        (-0.01, Regime.UNSTABLE),
    ],
)
def test_the_ratio_decides_the_regime(ratio: float, regime: Regime) -> None:
    numbers = classify(*pair(7.0, ratio), EXACT)
    assert numbers.regime is regime
    assert numbers.natural_frequency == pytest.approx(7.0, rel=1e-12)
    assert numbers.damping_ratio == pytest.approx(ratio, abs=1e-14, rel=1e-12)


def test_a_bound_as_wide_as_the_real_part_leaves_undamped() -> None:
    assert classify(-1e-13 + 5j, -1e-13 - 5j, (1e-12, 1e-12)).regime is Regime.UNDAMPED
    assert classify(-1e-11 + 5j, -1e-11 - 5j, (1e-12, 1e-12)).regime is Regime.UNDERDAMPED


def test_growth_within_the_bound_is_none_and_beyond_it_is_growth() -> None:
    assert classify(1e-9 + 5j, 1e-9 - 5j, (2e-9, 2e-9)).regime is Regime.UNDAMPED
    assert classify(1e-9 + 5j, 1e-9 - 5j, (5e-10, 5e-10)).regime is Regime.UNSTABLE


def test_a_divergent_pair_has_no_frequency_and_no_ratio() -> None:
    numbers = classify(3 + 0j, -4 + 0j, EXACT)
    assert (numbers.regime, numbers.natural_frequency, numbers.damping_ratio) == (Regime.DIVERGENT, None, None)
    assert numbers.decay_rate == -3


@pytest.mark.parametrize(("slow", "fast", "rate"), [(0j, -2 + 0j, 2.0), (0j, 0j, 0.0), (0j, None, 0.0)])
def test_a_zero_root_is_a_rigid_body_with_its_rate(slow: complex, fast: complex | None, rate: float) -> None:
    numbers = classify(slow, fast, EXACT)
    assert (numbers.regime, numbers.damping_ratio, numbers.decay_rate) == (Regime.RIGID_BODY, None, rate)


@pytest.mark.parametrize(
    ("root", "relaxation", "regime"),
    [(-3.0, True, Regime.RELAXATION), (-3.0, False, Regime.OVERDAMPED), (3.0, True, Regime.DIVERGENT)],
)
def test_single_real_roots(root: float, relaxation: bool, regime: Regime) -> None:
    numbers = classify(complex(root), None, EXACT, relaxation=relaxation)
    assert (numbers.regime, numbers.damping_ratio, numbers.decay_rate) == (regime, None, -root)


def test_the_ratio_of_close_real_roots_is_better_known_than_the_roots() -> None:
    """dζ = sqrt(ζ² − 1) times the relative error of the roots: it vanishes where they meet."""
    slow, fast = pair(1.0, 1 + 1e-10)
    numbers = classify(slow, fast, (1e-8, 1e-8))
    assert numbers.damping_ratio_bound is not None
    assert numbers.damping_ratio_bound < 1e-12
    assert numbers.frequency_bound == pytest.approx(1e-8, rel=1e-3)


def test_time_to_two_percent_of_an_oscillation_is_that_of_its_envelope() -> None:
    assert time_to_two_percent(Regime.UNDERDAMPED, [-0.5 + 9j, -0.5 - 9j]) == pytest.approx(2 * math.log(50))


@pytest.mark.parametrize("regime", [Regime.UNDAMPED, Regime.UNSTABLE, Regime.DIVERGENT, Regime.RIGID_BODY])
def test_what_does_not_decay_has_no_such_time(regime: Regime) -> None:
    assert time_to_two_percent(regime, [-0.1 + 1j, -0.1 - 1j]) is None


@pytest.mark.parametrize("ratio", [1 + 1e-12, 1 + 1e-8, 1 + 1e-5, 1.001, 1.5, 30.0, 1e5])
@pytest.mark.parametrize("size", [1e-14, 1e-9])
def test_the_stated_bound_of_a_real_pair_covers_the_worst_of_both_roots(ratio: float, size: float) -> None:
    """Roots moved to the ends of their bounds: the ratio moves by no more than stated, and not by far less."""
    slow, fast = pair(3.0, ratio)
    bounds = (size * abs(slow), size * abs(fast))
    numbers = classify(slow, fast, bounds)
    with mp.workdps(40):
        moved = []
        for first in (-1, 1):
            for second in (-1, 1):
                s, f = mp.mpf(slow.real) + first * bounds[0], mp.mpf(fast.real) + second * bounds[1]
                moved.append(-(s + f) / (2 * mp.sqrt(s * f)))
        exact = -(mp.mpf(slow.real) + mp.mpf(fast.real)) / (2 * mp.sqrt(mp.mpf(slow.real) * mp.mpf(fast.real)))
        worst = float(max(abs(value - exact) for value in moved))
    assert numbers.damping_ratio_bound is not None
    # First order in the bounds, but for the most unlike roots.
    assert worst * (1 - 1e-9) <= numbers.damping_ratio_bound <= 3 * worst + 3e-14
    assert numbers.frequency_bound == pytest.approx(size, rel=1e-12)


@pytest.mark.parametrize("ratio", [0.0, 1e-6, 0.3, 0.999, 1 - 1e-9])
def test_the_stated_bound_of_a_complex_pair_covers_the_worst_direction(ratio: float) -> None:
    root, size = pair(3.0, ratio)[0], 1e-9
    stated = classify(root, root.conjugate(), (3 * size, 3 * size)).damping_ratio_bound
    moved = [root + 3 * size * complex(math.cos(angle), math.sin(angle)) for angle in np.linspace(0, 2 * np.pi, 181)]
    worst = max(abs(-value.real / abs(value) + root.real / abs(root)) for value in moved)
    assert stated is not None
    assert worst <= stated <= 3 * worst + 1e-14


@pytest.mark.parametrize(
    ("ratio", "bound", "regime"),
    [
        (1 + 5e-10, 0.0, Regime.CRITICALLY_DAMPED),
        (1 + 2e-9, 0.0, Regime.OVERDAMPED),
        (1 + 5e-8, 1e-3, Regime.CRITICALLY_DAMPED),
        (1 + 1e-6, 1e-2, Regime.OVERDAMPED),
        (1 - 5e-10, 0.0, Regime.CRITICALLY_DAMPED),
        (1 - 2e-9, 0.0, Regime.UNDERDAMPED),
        (1 - 5e-8, 1e-3, Regime.CRITICALLY_DAMPED),
        (1 - 1e-6, 1e-2, Regime.UNDERDAMPED),
    ],
)
def test_the_border_of_critical_widens_with_the_bound_but_never_to_a_millionth(
    ratio: float, bound: float, regime: Regime
) -> None:
    assert classify(*pair(1.0, ratio), (bound, bound)).regime is regime


@pytest.mark.parametrize(
    ("slow", "fast"),
    [(3 + 0j, 2 + 0j), (3 + 0j, -4 + 0j), (1e-100 + 0j, -1e-100 + 0j)],
)
def test_any_growing_real_root_makes_a_pair_divergent(slow: complex, fast: complex) -> None:
    numbers = classify(slow, fast, (0.0, 0.0))
    assert (numbers.regime, numbers.damping_ratio, numbers.natural_frequency) == (Regime.DIVERGENT, None, None)
    assert numbers.decay_rate == -slow.real


def test_a_single_root_is_no_relaxation_and_growth_is_growth_unless_said_otherwise() -> None:
    assert classify(-3 + 0j, None, EXACT).regime is Regime.OVERDAMPED
    assert classify(1e-9 + 5j, 1e-9 - 5j, EXACT).decay_rate == -1e-9


def test_an_undamped_mode_has_the_ratio_and_the_rate_zero_and_not_its_rounding() -> None:
    numbers = classify(-1e-13 + 5j, -1e-13 - 5j, (1e-12, 1e-12))
    assert (numbers.damping_ratio, numbers.decay_rate) == (0.0, 0.0)


def test_the_product_of_very_unlike_roots_neither_overflows_nor_vanishes() -> None:
    numbers = classify(-1e-200 + 0j, -1e200 + 0j, (0.0, 0.0))
    assert numbers.natural_frequency == pytest.approx(1.0)
    assert numbers.damping_ratio == pytest.approx(0.5e200)


@pytest.mark.parametrize("gap", [0.0, 1e-14, 1e-9, 1e-7, 1e-4, 0.1, 2.0, 1e3, 1e9])
def test_time_from_rest_is_the_root_of_the_free_decay(gap: float) -> None:
    """Against 40 digits, through the confluence of the two rates s and s(1 + gap)."""
    slow = 0.7
    fast = slow * (1 + gap)
    regime = Regime.CRITICALLY_DAMPED if fast == slow else Regime.OVERDAMPED
    time = time_to_two_percent(regime, [complex(-slow), complex(-fast)])
    with mp.workdps(40):
        s, f = mp.mpf(slow), mp.mpf(fast)

        def left(t: mp.mpf) -> mp.mpf:
            both = mp.mpf(1) + s * t if f == s else (f - s * mp.exp((s - f) * t)) / (f - s)
            return mp.log(both) - s * t + mp.log(50)

        exact = mp.findroot(left, (mp.log(50) / s, 2 * mp.log(50) / s), solver="anderson")
        assert abs(mp.mpf(time) / exact - 1) < (1e-9 if 0 < gap <= 1e-8 else 4e-15)


def test_a_critical_mode_given_as_a_complex_pair_or_a_double_root_takes_the_same_time() -> None:
    """(1 + x) e^−x = 0.02 at x = 5.8339..."""
    for roots in ([-2 + 1e-9j, -2 - 1e-9j], [-2 + 0j, -2 + 0j]):
        assert time_to_two_percent(Regime.CRITICALLY_DAMPED, roots) == pytest.approx(5.833920 / 2, rel=1e-6)


def test_a_single_real_root_falls_by_its_exponential() -> None:
    for regime in (Regime.RELAXATION, Regime.OVERDAMPED):
        assert time_to_two_percent(regime, [-4 + 0j]) == pytest.approx(math.log(50) / 4)


def test_a_free_motion_that_grows_is_divergent() -> None:
    modes = mdof.solve(mdof.System.from_matrices([[1.0]], [[-3.0]], [[0.0]]))
    assert modes[0].regime == "divergent"
    assert "divergent-mode" in {finding.code for finding in modes.findings}


def test_the_bound_of_very_unlike_real_roots_holds_to_second_order() -> None:
    numbers = classify(-1e-5 + 0j, -1e5 + 0j, (1e-7, 1e3))
    assert numbers.damping_ratio_bound is not None
    slow, fast = 1e-5 - 1e-7, 1e5 + 1e3
    assert (slow + fast) / (2 * np.sqrt(slow * fast)) - numbers.damping_ratio <= numbers.damping_ratio_bound
