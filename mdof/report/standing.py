"""What stands out in a table of modes: the least damped mode, and the model's own criteria."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from mdof.modes.regime import Regime
from mdof.report.look import frequency, number, percent, plural
from mdof.report.screening import screen

if TYPE_CHECKING:
    from mdof.report.tables import ModeLike

__all__ = ["criteria_line", "least_damped_line"]

_GROWING = (Regime.UNSTABLE, Regime.DIVERGENT)
_NAMED = 8


def least_damped_line(modes: Sequence[ModeLike]) -> list[tuple[str, str]]:
    """The vibration with the smallest damping ratio, or the modes that grow; nothing where there is none."""
    growing = [mode for mode in modes if mode.regime in _GROWING]
    if growing:
        text = ", ".join(f"mode {mode.number} {mode.regime}" for mode in growing[:_NAMED])
        return [("grows", text + (", .." if len(growing) > _NAMED else ""))]
    ringing = [mode for mode in modes if mode.damping_ratio is not None and mode.natural_frequency is not None]
    if not ringing:
        return []
    least = min(ringing, key=lambda mode: mode.damping_ratio or 0.0)
    text = f"mode {least.number} at {frequency(least.natural_frequency)} with {percent(least.damping_ratio)}"
    if least.time_to_two_percent is not None:
        text += f", down to 2 % in {number(least.time_to_two_percent, 3)} s"
    return [("least damped", text)]


def criteria_line(modes: Sequence[Any], criteria: Any) -> list[tuple[str, str]]:
    """Whether the modes meet the least damping ratio that the model itself asks for; nothing where it asks for none."""
    if criteria is None or criteria.least_damping_ratio is None:
        return []
    verdict = screen(modes, criteria.least_damping_ratio, criteria.below)
    scope = "" if criteria.below is None else f" below {frequency(criteria.below)}"
    text = f"at least {percent(criteria.least_damping_ratio)}{scope}: "
    if not verdict.judged:
        text += "no mode judged"
    elif verdict.passed:
        text += f"met by {plural(verdict.judged, 'mode')}"
    else:
        text += f"missed by {len(verdict.failing)} of {plural(verdict.judged, 'mode')}: "
        text += ", ".join(str(mode.number) for mode in verdict.failing[:_NAMED])
        text += ", .." if len(verdict.failing) > _NAMED else ""
    return [("criteria", text)]
