"""mdof.modes.regime: what a mode is called, at and around every border."""

from __future__ import annotations

import math

import pytest

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


def test_a_passive_system_never_grows() -> None:
    assert classify(1e-9 + 5j, 1e-9 - 5j, EXACT, passive=True).regime is Regime.UNDAMPED
    assert classify(1e-9 + 5j, 1e-9 - 5j, EXACT).regime is Regime.UNSTABLE


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


@pytest.mark.parametrize("ratio", [1.0, 1 + 1e-9, 1.001, 1.5, 30.0])
def test_time_to_two_percent_without_oscillation_is_that_of_release_from_rest(ratio: float) -> None:
    slow, fast = (-root.real for root in pair(3.0, ratio))
    regime = Regime.CRITICALLY_DAMPED if ratio == 1 else Regime.OVERDAMPED
    time = time_to_two_percent(regime, pair(3.0, ratio))
    assert time is not None
    if fast - slow < 1e-3:
        left = (1 + slow * time) * math.exp(-slow * time)
    else:
        left = (fast * math.exp(-slow * time) - slow * math.exp(-fast * time)) / (fast - slow)
    assert left == pytest.approx(0.02, rel=1e-3 if 1 < ratio < 1.01 else 1e-9)


@pytest.mark.parametrize("regime", [Regime.UNDAMPED, Regime.UNSTABLE, Regime.DIVERGENT, Regime.RIGID_BODY])
def test_what_does_not_decay_has_no_such_time(regime: Regime) -> None:
    assert time_to_two_percent(regime, [-0.1 + 1j, -0.1 - 1j]) is None
