"""The regimes of a mode, and the damping numbers that follow from its eigenvalues."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from enum import StrEnum
from typing import TYPE_CHECKING, Any

import numpy as np

from mdof.modes.pairing import mode_roots

if TYPE_CHECKING:
    from numpy.typing import NDArray

__all__ = ["Numbers", "Regime", "classified", "classify", "time_to_two_percent"]

#: |ζ - 1| up to this, or up to the stated bound where that is larger, is called critical.
_CRITICAL = 1e-9
_NEWTON_STEPS = 60


class Regime(StrEnum):
    """What a mode does when it is left alone."""

    RIGID_BODY = "rigid body"
    UNDAMPED = "undamped"
    UNDERDAMPED = "underdamped"
    CRITICALLY_DAMPED = "critically damped"
    OVERDAMPED = "overdamped"
    RELAXATION = "relaxation"
    UNSTABLE = "unstable"
    DIVERGENT = "divergent"


@dataclass(frozen=True, kw_only=True, slots=True)
class Numbers:
    """What follows from a mode's eigenvalues; None where undefined. Frequencies in rad/s, rates in 1/s."""

    regime: Regime
    natural_frequency: float | None
    damping_ratio: float | None
    decay_rate: float
    damping_ratio_bound: float | None
    frequency_bound: float | None


def classify(
    slow: complex,
    fast: complex | None,
    bounds: tuple[float, float],
    *,
    relaxation: bool = False,
) -> Numbers:
    """Regime and numbers of a mode.

    Parameters
    ----------
    slow, fast : complex [1/s]
        A conjugate pair, a real pair (slow first), or one real root with ``fast`` None.
    bounds : (float, float) [1/s]
        Forward bounds on the two roots.
    relaxation : bool
        The single root belongs to a first-order state.
    """
    if slow == 0 or fast == 0:
        other = slow if fast is None or slow != 0 else fast
        if other.real > 0:
            # Free, and pushed on by negative drag: its speed grows.
            return _numbers(Regime.DIVERGENT, None, None, -other.real, None, None)
        # What is known of the rate counts as the bound of the mode; a motion that nothing slows has none.
        known = None if other == 0 else bounds[0 if other is slow else 1] / abs(other)
        return _numbers(Regime.RIGID_BODY, None, None, -other.real + 0.0, None, known)
    relative = max(bound / abs(root) for bound, root in zip(bounds, (slow, fast), strict=True) if root is not None)
    if fast is None:
        rate = -slow.real
        if rate < 0:
            return _numbers(Regime.DIVERGENT, None, None, rate, None, relative)
        return _numbers(Regime.RELAXATION if relaxation else Regime.OVERDAMPED, None, None, rate, None, relative)
    if slow.imag != 0:
        return _oscillating(slow, bounds[0], relative, abs(slow), *_ratio(slow, abs(slow), relative))
    product = slow.real * fast.real
    if product < 0 or (slow.real > 0 and fast.real > 0):
        return _numbers(Regime.DIVERGENT, None, None, -slow.real, None, relative)
    frequency = math.sqrt(-slow.real) * math.sqrt(-fast.real)
    ratio = (-slow.real - fast.real) / (2 * frequency)
    spread = 0.5 * sum(bound / abs(root) for bound, root in zip(bounds, (slow, fast), strict=True))
    # dζ = sqrt(ζ² − 1) d(ln sqrt(λf/λs)): bounds on the roots blow up at the double root, their sum and product do not.
    bound = math.sqrt(max(ratio * ratio - 1, 0.0)) * spread + ratio * spread**2 + 2e-14
    critical = abs(ratio - 1) <= max(_CRITICAL, min(bound, 1e-7))
    return _numbers(
        Regime.CRITICALLY_DAMPED if critical else Regime.OVERDAMPED, frequency, ratio, -slow.real, bound, relative
    )


def classified(
    roots: NDArray[np.complex128], bounds: NDArray[np.float64], pairs: list[tuple[int, int]], relaxation: set[int]
) -> tuple[NDArray[np.complex128], list[Numbers]]:
    """Roots of every mode, shape (m, 2) with NaN for no second one, and what :func:`classify` makes of them.

    Parameters
    ----------
    roots : shape (q,) [1/s]; bounds : shape (q,) [1/s]
    pairs : indices (slow, fast) of the roots of every mode, as in :class:`mdof.modes.pairing.Pairing`
    relaxation : indices of single roots that belong to first-order states
    """
    slow, fast = np.array(pairs, dtype=np.int64).reshape(-1, 2).T
    values = mode_roots(roots, pairs)
    first = values[:, 0]
    size = np.abs(first)
    low, high = bounds[slow], bounds[np.where(fast < 0, slow, fast)]
    with np.errstate(divide="ignore", invalid="ignore"):
        relative = np.fmax(low, high) / size
        ratio, ratio_bound = _ratio(first, size, relative)
    columns = (first, values[:, 1], low, high, relative, size, ratio, ratio_bound, slow)
    result = []
    for root, second, bound, other, part, frequency, damping, known, index in zip(
        *(column.tolist() for column in columns), strict=True
    ):
        if root.imag != 0:
            result.append(_oscillating(root, bound, part, frequency, damping, known))
        else:
            single = second != second
            result.append(classify(root, None if single else second, (bound, other), relaxation=index in relaxation))
    return values, result


def _ratio(root: Any, frequency: Any, relative: Any) -> tuple[Any, Any]:
    """Damping ratio of an oscillating root and its bound; numbers or arrays."""
    return -root.real / frequency, relative * abs(root.imag) / frequency + relative**2 + 2e-15


def time_to_two_percent(regime: Regime, eigenvalues: Sequence[complex]) -> float | None:
    """Time for a mode to fall to 2 % of its start for good [s].

    A mode that oscillates is judged by its envelope, exp(Re λ t). A pair of real roots is released from rest, so that
    both roots share in the motion: (λf exp(λs t) − λs exp(λf t)) / (λf − λs), and (1 + ωt) exp(−ωt) where they meet.

    Parameters
    ----------
    eigenvalues : sequence of one or two complex [1/s]
        A conjugate pair, a real pair (slow first) or one real root.

    Returns
    -------
    float or None
        None where the mode does not decay, or has no rest position to fall back to.
    """
    slow = -eigenvalues[0].real
    if regime in (Regime.RIGID_BODY, Regime.UNDAMPED, Regime.UNSTABLE, Regime.DIVERGENT) or slow <= 0:
        return None
    envelope = math.log(50.0) / slow
    if len(eigenvalues) == 1 or (eigenvalues[0].imag != 0 and regime is not Regime.CRITICALLY_DAMPED):
        return envelope
    # In units of the slow time constant, with g ≥ 0 the gap of the rates: f(t) = e^-t (1 + t (1 − e^-gt) / (gt)).
    gap = max(-eigenvalues[1].real / slow - 1.0, 0.0)
    time = math.log(50.0)
    for _ in range(_NEWTON_STEPS):
        # ln f is concave here, so Newton's method from below comes up to the answer and stays there.
        share = -math.expm1(-gap * time) / gap if gap > 1e-8 else time
        step = (math.log1p(share) - time + math.log(50.0)) / (1.0 - math.exp(-gap * time) / (1.0 + share))
        time += step
        if abs(step) <= 1e-15 * time:
            break
    return time / slow


def _oscillating(
    root: complex, bound: float, relative: float, frequency: float, ratio: float, ratio_bound: float
) -> Numbers:
    if root.real == 0 or abs(root.real) <= bound:
        return _numbers(Regime.UNDAMPED, frequency, 0.0, 0.0, ratio_bound, relative)
    if root.real > 0:
        return _numbers(Regime.UNSTABLE, frequency, ratio, -root.real, ratio_bound, relative)
    critical = abs(ratio - 1) <= max(_CRITICAL, min(ratio_bound, 1e-7))
    regime = Regime.CRITICALLY_DAMPED if critical else Regime.UNDERDAMPED
    return _numbers(regime, frequency, ratio, -root.real, ratio_bound, relative)


def _numbers(
    regime: Regime,
    frequency: float | None,
    ratio: float | None,
    rate: float,
    ratio_bound: float | None,
    frequency_bound: float | None,
) -> Numbers:
    return Numbers(
        regime=regime,
        natural_frequency=frequency,
        damping_ratio=ratio,
        decay_rate=rate,
        damping_ratio_bound=ratio_bound,
        frequency_bound=frequency_bound,
    )
