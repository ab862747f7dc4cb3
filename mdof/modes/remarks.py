"""Findings that follow from the modes themselves."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from mdof.findings import Finding, finding
from mdof.modes.regime import Numbers, Regime

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from mdof.eigen.reduce import NormalisedProblem
    from mdof.modes.pairing import Pairing
    from mdof.system import System

__all__ = ["mode_findings"]

#: A relative bound on a frequency above this is worth a word.
_VISIBLE_BOUND = 1e-6


def mode_findings(
    system: System,
    problem: NormalisedProblem,
    numbers: list[Numbers],
    pairs: list[tuple[int, int]],
    pairing: Pairing,
    shapes: NDArray[np.complex128],
) -> list[Finding]:
    """Growing modes, free motions, single roots, rounding and fitted damping, most serious first."""
    found: list[Finding] = []
    by_regime: dict[Regime, tuple[int, ...]] = {
        regime: tuple(index + 1 for index, entry in enumerate(numbers) if entry.regime == regime) for regime in Regime
    }
    if by_regime[Regime.UNSTABLE]:
        fastest = min(numbers[index - 1].decay_rate for index in by_regime[Regime.UNSTABLE])
        found.append(
            finding(
                "unstable-mode",
                f"{_modes(by_regime[Regime.UNSTABLE])} grow{_s(by_regime[Regime.UNSTABLE])} while oscillating, "
                f"doubling in {np.log(2) / -fastest:.3g} s at the fastest",
                modes=by_regime[Regime.UNSTABLE],
            )
        )
    if by_regime[Regime.DIVERGENT]:
        fastest = min(numbers[index - 1].decay_rate for index in by_regime[Regime.DIVERGENT])
        found.append(
            finding(
                "divergent-mode",
                f"{_modes(by_regime[Regime.DIVERGENT])} leave{_s(by_regime[Regime.DIVERGENT])} rest without "
                f"oscillating, doubling in {np.log(2) / -fastest:.3g} s at the fastest",
                modes=by_regime[Regime.DIVERGENT],
            )
        )
    rates = [numbers[index - 1].decay_rate for index in by_regime[Regime.RIGID_BODY]]
    found += _free_motions(system, problem, by_regime[Regime.RIGID_BODY], rates, shapes)
    single = tuple(number for number, pair in enumerate(pairs, 1) if pair[0] in pairing.unresolved and pair[1] < 0)
    if single:
        found.append(
            finding("partner-unresolved", f"{_modes(single)}: real roots without a partner of like shape", modes=single)
        )
    if by_regime[Regime.RELAXATION]:
        rates = [numbers[index - 1].decay_rate for index in by_regime[Regime.RELAXATION]]
        found.append(
            finding(
                "relaxation-roots",
                f"{len(rates)} relaxation roots decaying at {min(rates):.4g} to {max(rates):.4g} 1/s"
                if len(rates) > 1
                else f"1 relaxation root decaying at {rates[0]:.4g} 1/s",
                modes=by_regime[Regime.RELAXATION],
            )
        )
    doubtful = tuple(
        index + 1
        for index, entry in enumerate(numbers)
        if entry.frequency_bound is not None and entry.frequency_bound > _VISIBLE_BOUND
    )
    if doubtful:
        largest = max(numbers[index - 1].frequency_bound or 0.0 for index in doubtful)
        found.append(
            finding(
                "ill-conditioned-mode",
                f"{_modes(doubtful)}: rounding alone may move the frequency or rate by up to {100 * largest:.2g} %",
                modes=doubtful,
            )
        )
    return found + _outside_fit(system, numbers)


def _free_motions(
    system: System,
    problem: NormalisedProblem,
    rigid: tuple[int, ...],
    rates: list[float],
    shapes: NDArray[np.complex128],
) -> list[Finding]:
    if not rigid:
        return []
    labels = system.labels
    named = []
    for number, rate in zip(rigid[:6], rates, strict=False):
        size = np.abs(shapes[:, number - 1])
        leaders = [labels[index] for index in np.argsort(-size, kind="stable")[:3] if size[index] >= 0.3 * size.max()]
        slows = f", slowed at {rate:.4g} 1/s by damping" if rate > 0 else ""
        named.append(f"{'+'.join(leaders)}{slows}")
    more = "" if len(rigid) <= 6 else f" and {len(rigid) - 6} more"
    count = f"{len(rigid)} motion{'' if len(rigid) == 1 else 's'}"
    # A damper between two bodies that acts in a free motion is all that holds them together there.
    inner = problem.N.shape[1] and len(problem.damper_rows)
    names: list[str] = []
    if inner:
        for index in np.nonzero(~system.damper_grounded)[0]:
            row = problem.damper_rows[index]
            if np.linalg.norm(row @ problem.N) > 1e-9 * np.linalg.norm(row):
                names.append(system.damper_names[index])
    text = f"the springs leave {count} free (mostly {'; '.join(named)}{more})"
    found = [finding("free-motion", text, modes=rigid)]
    if names:
        unique = tuple(dict.fromkeys(names))
        found.append(
            finding(
                "held-by-damper-only",
                f"only dampers hold bodies together in a free motion: {', '.join(unique[:6])}",
                modes=rigid,
                connections=unique,
            )
        )
    return found


def _outside_fit(system: System, numbers: list[Numbers]) -> list[Finding]:
    if system.two_ratios is None:
        return []
    (low, first), (high, second) = system.two_ratios
    alpha, beta = system.mass_proportional, system.stiffness_proportional
    limit = 2 * max(first, second)
    outside = []
    for index, entry in enumerate(numbers):
        frequency = entry.natural_frequency
        if frequency and not low <= frequency <= high and alpha / (2 * frequency) + beta * frequency / 2 > limit:
            outside.append(index + 1)
    if not outside:
        return []
    return [
        finding(
            "damping-outside-fit",
            f"{_modes(tuple(outside))}: proportional damping fitted between {low / (2 * np.pi):.4g} "
            f"and {high / (2 * np.pi):.4g} Hz gives more than {100 * limit:.3g} % there",
            modes=tuple(outside),
        )
    ]


def _modes(numbers: tuple[int, ...]) -> str:
    listed = ", ".join(str(number) for number in numbers[:12]) + (", ..." if len(numbers) > 12 else "")
    return f"mode{'' if len(numbers) == 1 else 's'} {listed}"


def _s(numbers: tuple[int, ...]) -> str:
    return "s" if len(numbers) == 1 else ""
