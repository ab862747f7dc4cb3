"""What a certificate says: a verdict a mode, with the intervals that surely hold its exact numbers."""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum

__all__ = ["Certificate", "Interval", "ModeProof", "Verdict"]

#: Lower and upper end, rounded outwards.
Interval = tuple[float, float]


class Verdict(StrEnum):
    """What exact arithmetic says about a stated mode."""

    PROVEN = "proven"
    CONTRADICTED = "contradicted"
    UNDECIDED = "undecided"


@dataclass(frozen=True, kw_only=True, slots=True)
class ModeProof:
    """The verdict on one mode.

    Attributes
    ----------
    number : int, as in :class:`mdof.modes.mode.Mode`.
    regime : str, as stated.
    verdict : Verdict
    reason : str
        What is wrong or why it is not decided; empty where the mode is proven.
    bits : int
        Working precision of the enclosure behind the verdict.
    eigenvalues : tuple of (real, imaginary) intervals [1/s]
        Enclosures of the exact eigenvalues, as many as the mode states.
    natural_frequency : Interval or None [rad/s]
    damping_ratio : Interval or None
    frequency_digits : str or None
        The natural frequency in Hz to the digits that are proven, twelve at most.
    ratio_digits : str or None
        The damping ratio in % to the digits that are proven, twelve at most.
    multiplicity : int
        Exact eigenvalues that share the enclosure: 1 for a simple one.
    exact : bool
        True where exact rational arithmetic alone gives the multiplicity or the regime: zero roots of free motions,
        modes that no damping acts on, double roots.
    correction : float
        Of a free motion: the share by which entries of directions are corrected to undo their rounding, so that the
        motion is free exactly; 0 where they are taken as they are.
    """

    number: int
    regime: str
    verdict: Verdict
    reason: str
    bits: int
    eigenvalues: tuple[tuple[Interval, Interval], ...] = ()
    natural_frequency: Interval | None = None
    damping_ratio: Interval | None = None
    frequency_digits: str | None = None
    ratio_digits: str | None = None
    multiplicity: int = 1
    exact: bool = False
    correction: float = 0.0


@dataclass(frozen=True, kw_only=True, slots=True)
class Certificate:
    """The verdicts on all modes, and on their number.

    Attributes
    ----------
    modes : tuple of ModeProof
    bits : int
        Largest working precision of a verdict.
    eigenvalues_exact : int or None
        Number of finite eigenvalues of the exact factors; None where each mode is a problem of its own (loss factors
        without a reference).
    eigenvalues_stated : int
    complete : bool
        False where the modes are a choice of some, so that numbers of eigenvalues need not agree.
    """

    modes: tuple[ModeProof, ...]
    bits: int
    eigenvalues_exact: int | None
    eigenvalues_stated: int
    complete: bool = True

    def number(self, verdict: Verdict) -> int:
        """How many modes have this verdict."""
        return sum(proof.verdict is verdict for proof in self.modes)

    @property
    def miscounted(self) -> bool:
        """True where the modes state more or fewer eigenvalues than the exact factors have."""
        return (
            self.complete and self.eigenvalues_exact is not None and self.eigenvalues_exact != self.eigenvalues_stated
        )

    @property
    def contradicted(self) -> bool:
        """True where a stated number, or the number of eigenvalues, is wrong."""
        return self.miscounted or self.number(Verdict.CONTRADICTED) > 0

    @property
    def summary(self) -> str:
        """One line, such as ``48 of 48 modes proven at 256 bits``."""
        text = f"{self.number(Verdict.PROVEN)} of {len(self.modes)} modes proven at {self.bits} bits"
        for verdict in (Verdict.CONTRADICTED, Verdict.UNDECIDED):
            if self.number(verdict):
                text += f", {self.number(verdict)} {verdict}"
        if self.miscounted:
            text += f"; {self.eigenvalues_stated} eigenvalues stated, the exact factors have {self.eigenvalues_exact}"
        return text
