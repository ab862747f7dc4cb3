"""A certificate as plain data, for the ``proof`` object of ``mdof modes --format json``."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, Any

from mdof.certify import Verdict

if TYPE_CHECKING:
    from mdof.certify import Certificate, ModeProof
    from mdof.certify.proof import Interval

__all__ = ["proof_record"]


def proof_record(certificate: Certificate) -> dict[str, Any]:
    """Counts, precision and one object a mode; intervals are [lower, upper], null where nothing is known."""
    return {
        "summary": certificate.summary,
        "bits": certificate.bits,
        "proven": certificate.number(Verdict.PROVEN),
        "contradicted": certificate.number(Verdict.CONTRADICTED),
        "undecided": certificate.number(Verdict.UNDECIDED),
        "eigenvalues_stated": certificate.eigenvalues_stated,
        "eigenvalues_exact": certificate.eigenvalues_exact,
        "modes": [_mode(proof) for proof in certificate.modes],
    }


def _mode(proof: ModeProof) -> dict[str, Any]:
    frequency = proof.natural_frequency
    return {
        "number": proof.number,
        "verdict": str(proof.verdict),
        "reason": proof.reason,
        "bits": proof.bits,
        "exact": proof.exact,
        "correction": proof.correction,
        "multiplicity": proof.multiplicity,
        "eigenvalues": [[_ends(real), _ends(imaginary)] for real, imaginary in proof.eigenvalues],
        "natural_frequency_hz": None if frequency is None else _ends(_hertz(frequency)),
        "damping_ratio": None if proof.damping_ratio is None else _ends(proof.damping_ratio),
    }


def _hertz(interval: Interval) -> Interval:
    """In Hz, one unit in the last place wider for the division."""
    low, high = (value / (2 * math.pi) for value in interval)
    return math.nextafter(math.nextafter(low, -math.inf), -math.inf), math.nextafter(
        math.nextafter(high, math.inf), math.inf
    )


def _ends(interval: Interval) -> list[float] | None:
    return list(interval) if all(map(math.isfinite, interval)) else None
