"""Findings: engineering doubt, said out loud. The one registry of their codes."""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum


class Severity(StrEnum):
    """How much a finding matters to the person who signs."""

    NOTE = "note"
    WARNING = "warning"
    SERIOUS = "serious"


@dataclass(frozen=True, kw_only=True, slots=True)
class FindingKind:
    """What a finding code means wherever it occurs, and what to do about it."""

    severity: Severity
    meaning: str
    advice: str


REGISTRY: dict[str, FindingKind] = {
    "free-motion": FindingKind(
        severity=Severity.WARNING,
        meaning="The springs leave a rigid-body or mechanism motion free.",
        advice="Add the missing support or connection, or keep it if the machine really is free to move that way.",
    ),
    "held-by-damper-only": FindingKind(
        severity=Severity.WARNING,
        meaning="A motion between bodies is held by dampers only; it has no natural frequency.",
        advice="Give the connection a stiffness, or accept that the bodies drift apart slowly under a steady load.",
    ),
    "unheld-body": FindingKind(
        severity=Severity.WARNING,
        meaning="No stiffness holds a body, or a group of bodies, in some of its directions.",
        advice="Add the missing support or connection, narrow its `directions`, or keep it if it really is free.",
    ),
    "separate-groups": FindingKind(
        severity=Severity.NOTE,
        meaning="The model falls into groups that no connection joins.",
        advice="Check that no connection is missing; each group vibrates on its own.",
    ),
    "idle-connection": FindingKind(
        severity=Severity.WARNING,
        meaning="A connection acts in a direction in which neither of its ends may move.",
        advice="Add the direction to the bodies, or remove the value from the connection.",
    ),
    "massless-body": FindingKind(
        severity=Severity.NOTE,
        meaning="A body is a joint without mass; it follows its springs and dampers.",
        advice="Nothing to do if intended; each damped massless direction adds a relaxation root.",
    ),
    "negative-stiffness": FindingKind(
        severity=Severity.WARNING,
        meaning="A connection has negative stiffness and pushes away from rest.",
        advice="Check the sign; with too much of it a mode diverges.",
    ),
    "negative-damping": FindingKind(
        severity=Severity.SERIOUS,
        meaning="A connection feeds energy into the motion.",
        advice="Check the sign; a mode that gains energy grows until something limits or breaks it.",
    ),
    "doubtful-loss-factor": FindingKind(
        severity=Severity.WARNING,
        meaning="A loss factor above 1 is more than any mount or joint in use has.",
        advice="Loss factors are plain numbers: 8 % is 0.08 or `8 %`. For a damping ratio ζ write twice as much.",
    ),
    "doubtful-damping-ratio": FindingKind(
        severity=Severity.WARNING,
        meaning="A damping ratio above 1 is given for the whole machine: more than critical damping.",
        advice="Damping ratios are plain numbers: 5 % is 0.05 or `5 %`.",
    ),
    "doubtful-inertia": FindingKind(
        severity=Severity.WARNING,
        meaning="A radius of gyration does not go with the size of its body.",
        advice="Check the unit and the powers of ten of inertia and mass; keep it if the body really is of that size.",
    ),
    "centre-at-origin": FindingKind(
        severity=Severity.NOTE,
        meaning="A body that can turn states no centre of gravity; the origin is taken.",
        advice="Give its `centre`, or write [0, 0, 0] to say that you mean it.",
    ),
    "gear-reaction": FindingKind(
        severity=Severity.NOTE,
        meaning="The tooth force of a gear acts on the two shafts only; the reaction on the housing is not modelled.",
        advice="Model the housing's motion separately if it matters.",
    ),
    "non-proportional-damping": FindingKind(
        severity=Severity.WARNING,
        meaning="Damping couples the undamped modes: the one-ratio-a-mode shortcut misstates the modes named.",
        advice="Use the complex modes of this result for the modes named, not undamped-mode damping ratios.",
    ),
    "partial-spectrum": FindingKind(
        severity=Severity.NOTE,
        meaning="Only the modes nearest to a frequency were computed; what concerns all modes was not judged.",
        advice="Ask for more modes than you need; solve a smaller model whole where the damping shortcut matters.",
    ),
    "partner-unresolved": FindingKind(
        severity=Severity.WARNING,
        meaning="Real roots could not be paired into oscillators by their shapes; they are listed singly.",
        advice="Quote their decay rates; a damping ratio has no meaning for them.",
    ),
    "relaxation-roots": FindingKind(
        severity=Severity.NOTE,
        meaning="Dampers in series with springs, or on massless joints, add roots without a natural frequency.",
        advice="Nothing to do: they are not vibration modes.",
    ),
    "unstable-mode": FindingKind(
        severity=Severity.SERIOUS,
        meaning="A mode grows in time.",
        advice="Find what feeds it (negative damping, unsymmetric terms); no settling time or steady response exists.",
    ),
    "divergent-mode": FindingKind(
        severity=Severity.SERIOUS,
        meaning="A mode leaves rest without oscillating: the springs do not hold it.",
        advice="Find the negative stiffness or destabilising load that acts in it.",
    ),
    "damping-outside-fit": FindingKind(
        severity=Severity.WARNING,
        meaning="Proportional damping fitted to two target ratios gives a mode outside them over twice the larger one.",
        advice="Fit over the band that matters, or give dampers and loss factors where they are.",
    ),
    "ill-conditioned-mode": FindingKind(
        severity=Severity.WARNING,
        meaning="Rounding of the input alone moves the result visibly; the stated bound says by how much.",
        advice="Quote no more digits than the bound allows; look for near-mechanisms or extreme stiffness ratios.",
    ),
}


@dataclass(frozen=True, kw_only=True, slots=True)
class Finding:
    """One finding about one model.

    Attributes
    ----------
    code : a key of :data:`REGISTRY`.
    message : what was seen here, with the numbers.
    modes : mode numbers concerned, from 1.
    bodies, connections : names concerned, as in the model file.
    """

    code: str
    message: str
    severity: Severity
    advice: str
    modes: tuple[int, ...] = ()
    bodies: tuple[str, ...] = ()
    connections: tuple[str, ...] = ()


def finding(
    code: str,
    message: str,
    *,
    modes: tuple[int, ...] = (),
    bodies: tuple[str, ...] = (),
    connections: tuple[str, ...] = (),
    severity: Severity | None = None,
) -> Finding:
    """Make a finding of a registered ``code``; severity and advice come from the registry.

    Raises
    ------
    KeyError
        If ``code`` is not registered.
    """
    kind = REGISTRY[code]
    return Finding(
        code=code,
        message=message,
        severity=severity or kind.severity,
        advice=kind.advice,
        modes=modes,
        bodies=bodies,
        connections=connections,
    )
