"""From DampedModes to a certificate: exact factors, enclosures at rising precision, one verdict a mode."""

from __future__ import annotations

import dataclasses
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from flint import acb, arb

from mdof.certify.enclosures import Root, enclose
from mdof.certify.exact_factors import connected_parts, exact_matrices
from mdof.certify.exact_pencils import Pencil, SingularPencilError, pencils
from mdof.certify.free_motions import freed
from mdof.certify.own_frequency import OwnFrequencyProofs
from mdof.certify.proof import Certificate, ModeProof, Verdict
from mdof.certify.verdicts import judge, undecided

if TYPE_CHECKING:
    from mdof.certify.exact_factors import ExactMatrices
    from mdof.modes.mode import DampedModes

__all__ = ["certified"]

#: States from which the work takes long enough to say so, and seconds at 128 bits for a million of multiplications.
_MANY = 150
_SECONDS = 1.0e-6
_SINGULAR = "undecided: a motion of the exact factors is held by no mass, damper or spring"
_NUMBERS = "undecided: not free exactly, as stiffness is given as rounded numbers and not by directions"
#: Largest correction of an entry of a direction that counts as the undoing of rounding.
_ROUNDING = 2.0**-44
#: Bits of a ball beyond which no stated bound is narrower.
_NARROW = 80


@dataclass(slots=True, eq=False)
class _Part:
    """A pencil and what is known of its roots; a fresh part knows nothing."""

    pencil: Pencil
    roots: list[Root]
    enclosed: bool = False


def certified(modes: DampedModes, first_bits: int, most_bits: int, say: Callable[[str], None]) -> Certificate:
    """What :func:`mdof.certify.certify` does, once python-flint is known to be there."""
    stated = int(np.count_nonzero(~np.isnan(modes.eigenvalues)))
    # A choice of some modes states fewer roots than there are masses.
    complete = stated == modes.verification.eigenvalues_expected and stated >= int(
        np.count_nonzero(modes.system.mass.diagonal())
    )
    floating = modes.system.has_floating_loss_factors
    prove = _each_by_itself if floating else _proved
    bits_range = (first_bits, most_bits)
    elastic = [index for index, mode in enumerate(modes) if 0 not in mode.eigenvalues]
    try:
        proofs, bits, count = prove(modes, exact_matrices(modes.system), elastic, bits_range, say)
        asked = [index for index, proof in enumerate(proofs) if proof.verdict is not Verdict.PROVEN]
        asked = sorted(set(asked) - set(elastic))
        nearest = freed(modes) if asked else None
        if nearest is not None and nearest.correction <= _ROUNDING:
            # Once more for free motions that the rounding of directions holds.
            second, more_bits, _ = prove(modes, nearest.matrices, asked, bits_range, say)
            bits = max(bits, more_bits)
            for index in asked:
                proofs[index] = dataclasses.replace(second[index], correction=nearest.correction)
        elif asked and nearest is None:
            for index in asked:
                proofs[index] = dataclasses.replace(proofs[index], verdict=Verdict.UNDECIDED, reason=_NUMBERS)
    except SingularPencilError:
        proofs = [undecided(mode, _SINGULAR, first_bits) for mode in modes]
        bits, count = first_bits, None
    return Certificate(
        modes=tuple(proofs), bits=bits, eigenvalues_exact=count, eigenvalues_stated=stated, complete=complete
    )


def _proved(
    modes: DampedModes,
    matrices: ExactMatrices,
    asked: Sequence[int],
    bits_range: tuple[int, int],
    say: Callable[[str], None],
) -> tuple[list[ModeProof], int, int | None]:
    """Verdicts on all modes, at a precision that rises as long as it helps one of those asked for.

    Returns
    -------
    proofs, bits, number of finite eigenvalues
    """
    parts = [
        _Part(pencil, [Root(ball=_unknown())] * pencil.count)
        for index in connected_parts(matrices)
        for pencil in pencils(matrices.restricted(index))
    ]
    count = sum(part.pencil.count for part in parts)
    if max((part.pencil.E.nrows() for part in parts), default=0) > _MANY:
        seconds = _SECONDS * sum(part.pencil.E.nrows() ** 3 for part in parts)
        say(f"enclosing {count} eigenvalues takes about {seconds:.0f} s, and longer where more bits are needed")
    bits, most_bits = bits_range
    wanted = parts
    while True:
        for part in wanted:
            found = enclose(part.pencil, bits)
            if found is not None:
                part.roots, part.enclosed = found, True
        verdicts = _verdicts(modes, parts, bits)
        open_parts = set().union(*(verdicts[index].open_parts for index in asked))
        wanted = [part for number, part in enumerate(parts) if not part.enclosed or number in open_parts]
        if not wanted or bits >= most_bits:
            return [verdict.proof for verdict in verdicts], bits, count
        bits = min(2 * bits, most_bits)


@dataclass(frozen=True, slots=True)
class _Judged:
    """A verdict, and the parts on whose roots more bits may change it."""

    proof: ModeProof
    open_parts: set[int]


def _verdicts(modes: DampedModes, parts: list[_Part], bits: int) -> list[_Judged]:
    """Verdicts at this precision."""
    roots = [(root, number) for number, part in enumerate(parts) for root in part.roots]
    known = all(part.enclosed for part in parts)
    mates = iter(_matched([value for mode in modes for value in mode.eigenvalues], [root for root, _ in roots]))
    result = []
    for mode in modes:
        places = [next(mates) for _ in mode.eigenvalues]
        if -1 in places:
            reason = "undecided: more eigenvalues stated than the exact factors have"
            result.append(_Judged(undecided(mode, reason, bits), set()))
            continue
        own = [roots[place] for place in places]
        proof = judge(mode, tuple(root for root, _ in own), bits)
        if proof.verdict is Verdict.CONTRADICTED and not known:
            proof = undecided(mode, f"undecided at {bits} bits: not all roots are told apart", bits)
        # More bits do not free a motion that the exact factors hold.
        held = 0 in mode.eigenvalues and not any(root.is_zero for root, _ in own)
        unsure = proof.verdict is Verdict.UNDECIDED and not held
        result.append(_Judged(proof, {number for root, number in own if unsure and _may_narrow(root)}))
    return result


def _matched(stated: list[complex], roots: list[Root]) -> list[int]:
    """Index of the exact root nearest to each stated one, every root used once; -1 where none is left."""
    from scipy.optimize import linear_sum_assignment

    left = np.array(stated, dtype=np.complex128)[:, None]
    right = np.array([complex(root.ball) for root in roots], dtype=np.complex128)[None, :]
    size = np.maximum(np.abs(left), np.abs(right))
    cost = np.divide(np.abs(left - right), size, out=np.zeros(size.shape), where=size > 0)
    rows, columns = linear_sum_assignment(np.where(np.isnan(cost), 2.0, cost))
    result = [-1] * len(stated)
    for row, column in zip(rows, columns, strict=True):
        result[row] = int(column)
    return result


def _may_narrow(root: Root) -> bool:
    """False where the ball is far narrower than any bound, and holds no roots that might still part."""
    parting = root.count > 1 and not root.exact
    return not root.is_zero and (parting or root.ball.rel_accuracy_bits() < _NARROW)


def _unknown() -> acb:
    return acb(arb.nan(), arb.nan())


def _each_by_itself(
    modes: DampedModes,
    matrices: ExactMatrices,
    asked: Sequence[int],
    bits_range: tuple[int, int],
    say: Callable[[str], None],
) -> tuple[list[ModeProof], int, int | None]:
    """As :func:`_proved`, where loss factors without a reference make every mode a problem of its own; no count."""
    if modes.system.size > _MANY:
        say(f"{len(modes)} modes are enclosed one by one, as loss factors state no reference; this takes long")
    bits, most_bits = bits_range
    prover = OwnFrequencyProofs(modes, matrices, bits)
    proofs = [prover.proof(mode) for mode in modes]
    while bits < most_bits:
        wanted = [index for index in asked if proofs[index].verdict is Verdict.UNDECIDED]
        if not wanted:
            break
        bits = min(2 * bits, most_bits)
        prover = OwnFrequencyProofs(modes, matrices, bits)
        for index in wanted:
            proofs[index] = prover.proof(modes[index])
    return proofs, bits, None
