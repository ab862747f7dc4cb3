"""Proof of solved modes by exact and ball arithmetic; the extra ``certify`` (python-flint) is needed.

The binary64 factors of a System are taken as exact. Every eigenvalue is enclosed, and every mode is proven,
contradicted or left undecided at a stated precision. Importing this package costs nothing; :func:`certify` loads
python-flint.
"""

from __future__ import annotations

from collections.abc import Callable
from importlib.util import find_spec
from typing import TYPE_CHECKING

from mdof.certify.proof import Certificate, ModeProof, Verdict
from mdof.errors import UsageError

if TYPE_CHECKING:
    from mdof.modes.mode import DampedModes

__all__ = ["Certificate", "ModeProof", "Verdict", "certify", "require_flint"]


def require_flint() -> None:
    """Raise a UsageError where python-flint is not installed."""
    if find_spec("flint") is None:
        raise UsageError("proofs need python-flint, which is not installed; do `pip install python-flint`")


def certify(
    modes: DampedModes,
    *,
    first_bits: int = 128,
    most_bits: int = 1024,
    say: Callable[[str], None] | None = None,
) -> Certificate:
    """Prove the regime, natural frequency and damping ratio of every mode, within its stated bounds.

    Parameters
    ----------
    modes : DampedModes
        From :func:`mdof.solve`.
    first_bits, most_bits : int
        Working precision to begin with, and where doubling it ends.
    say : callable, optional
        Told in words when the work will take long.

    Returns
    -------
    Certificate

    Raises
    ------
    UsageError
        If python-flint is not installed, or the precisions are no whole numbers from 64 upwards in rising order.
    """
    require_flint()
    if not all(isinstance(bits, int) for bits in (first_bits, most_bits)) or not 64 <= first_bits <= most_bits:
        raise UsageError(f"bits must be whole numbers, 64 or more, in rising order, not {first_bits!r}, {most_bits!r}")
    from mdof.certify.certifying import certified

    return certified(modes, first_bits, most_bits, say or (lambda _: None))
