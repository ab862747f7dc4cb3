"""Does every mode of a machine meet a least damping ratio?"""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass
from typing import TYPE_CHECKING

from mdof.errors import UsageError
from mdof.modes.regime import Regime

if TYPE_CHECKING:
    from mdof.modes.mode import Mode

__all__ = ["Screening", "screen"]

#: A ratio so close below the limit, relatively, still meets it: a model made for 0.05 gives 0.05 only to rounding.
_ROUNDING = 1e-9
_NEVER_JUDGED = (Regime.RIGID_BODY, Regime.RELAXATION)
_ALWAYS_FAIL = (Regime.UNSTABLE, Regime.DIVERGENT)


@dataclass(frozen=True, kw_only=True, slots=True, eq=False)
class Screening:
    """The verdict on one model in one state.

    Attributes
    ----------
    passed : True when every judged mode meets the limit, False when one fails, None when no mode was judged.
    failing : the modes that fail, by number.
    judged : how many modes the criterion applied to.
    least_damping_ratio : the limit.
    below : only modes with a natural frequency below this were judged [rad/s]; None for all.
    lowest : the lowest natural frequency of a mode that could have been judged [rad/s]; None where none vibrates.
    """

    passed: bool | None
    failing: tuple[Mode, ...]
    judged: int
    least_damping_ratio: float
    below: float | None
    lowest: float | None

    @property
    def least_damped(self) -> Mode | None:
        """The failing mode with the smallest ratio; growing modes come first."""
        return min(self.failing, key=_badness, default=None)


def _badness(mode: Mode) -> tuple[bool, float]:
    grows = mode.regime in _ALWAYS_FAIL
    return not grows, mode.decay_rate if grows or mode.damping_ratio is None else mode.damping_ratio


def screen(modes: Iterable[Mode], least_damping_ratio: float, below: float | None = None) -> Screening:
    """Judge the modes of one model.

    Rigid-body motions and relaxation roots are no vibration and are left out; a mode that grows always fails. Motions
    that do not oscillate (critically damped, overdamped) meet any ratio up to their own; a single real root without
    partner has no ratio and cannot fail.

    Parameters
    ----------
    least_damping_ratio : a number of at least 0, such as 0.05.
    below : judge only modes with a natural frequency below this [rad/s].

    Raises
    ------
    UsageError
        If a limit is negative or not finite.
    """
    if not (math.isfinite(least_damping_ratio) and least_damping_ratio >= 0):
        raise UsageError(f"the least damping ratio must be a number of at least 0, not {least_damping_ratio}")
    if below is not None and not (math.isfinite(below) and below > 0):
        raise UsageError(f"the frequency below which modes are judged must be above 0, not {below}")
    failing: list[Mode] = []
    judged = 0
    frequencies: list[float] = []
    for mode in modes:
        if mode.regime in _ALWAYS_FAIL:
            judged += 1
            failing.append(mode)
            continue
        if mode.regime in _NEVER_JUDGED or mode.damping_ratio is None:
            continue
        if mode.natural_frequency is not None:
            frequencies.append(mode.natural_frequency)
            if below is not None and mode.natural_frequency >= below:
                continue
        judged += 1
        if mode.damping_ratio < least_damping_ratio * (1 - _ROUNDING):
            failing.append(mode)
    return Screening(
        # Nothing to fail is no pass: a limit in the wrong unit looks like this.
        passed=not failing if judged else None,
        failing=tuple(failing),
        judged=judged,
        least_damping_ratio=least_damping_ratio,
        below=below,
        lowest=min(frequencies, default=None),
    )
