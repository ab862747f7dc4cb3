"""The complete dense problem: every root of the normalised quadratic, in blocks that damping does not couple.

Damping that leaves an undamped mode alone needs no eigensolver: its two roots are those of a scalar quadratic. The
others go through the energy-balanced state matrix ``[[0, Σ], [−Σ, −D]]`` (see Veselić, Damped Oscillations of Linear
Systems, Springer LNM 2023, 2011), in which masses and springs are scaled alike, with free motions
deflated, and LAPACK's QR algorithm.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from mdof.eigen.blocks import uncoupled_blocks
from mdof.eigen.choose import Solved, solve_block
from mdof.eigen.clusters import average_clusters
from mdof.eigen.oscillators import oscillator_bounds
from mdof.eigen.refine import inverse_step, refine, settled
from mdof.eigen.verify import Measured, judge, lengths, measure
from mdof.errors import UnverifiedError

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from mdof.eigen.reduce import NormalisedProblem

_EPS = float(np.finfo(np.float64).eps)

__all__ = ["Roots", "solve_complete"]

#: Slope of a root, in units of |λ| times its modal mass, below which it is about to meet another.
_MEETING = 1e-3


@dataclass(frozen=True, kw_only=True, slots=True, eq=False)
class Roots:
    """Roots of a quadratic with real coefficients, one of each conjugate pair.

    Attributes
    ----------
    values : ndarray of complex, shape (q,) [1/s]
        Imaginary parts are not negative.
    computed : ndarray of complex, shape (q,) [1/s]
        The roots before clusters were averaged; they belong to the vectors.
    vectors, left : ndarray of complex, shape (m, q)
        Right vectors z; left ones (unconjugated) or None for symmetric problems.
    bounds : ndarray, shape (q,)
        Forward bound on |δλ|; for members of a cluster the bound of its mean.
    backward : ndarray, shape (q,)
    block : ndarray of int, shape (q,)
        Roots of different blocks belong to motions that damping does not couple.
    partner : ndarray of int, shape (q,)
        Index of the other real root of the same oscillator where that is known, else -1.
    clustered : ndarray of bool
        True where colliding roots were replaced by the mean over their invariant subspace.
    slope : ndarray of complex, shape (q,): zᵀ(2λM + D)z
    count : int
        Number of eigenvalues these stand for, conjugates included.
    method : str
    """

    values: NDArray[np.complex128]
    computed: NDArray[np.complex128]
    vectors: NDArray[np.complex128]
    left: NDArray[np.complex128] | None
    bounds: NDArray[np.float64]
    backward: NDArray[np.float64]
    block: NDArray[np.int64]
    partner: NDArray[np.int64]
    clustered: NDArray[np.bool_]
    slope: NDArray[np.complex128]
    count: int
    method: str


def solve_complete(problem: NormalisedProblem, method: str = "auto") -> Roots:
    """All roots of a normalised problem whose modes of equal frequency are turned, judged.

    Raises
    ------
    UnverifiedError
        If a root does not come out finite, or roots are missing.
    """
    if not problem.recover.shape[1]:
        raise UnverifiedError("the model has no coordinate that can move", "give a body a direction")
    blocks = uncoupled_blocks(problem)
    size = problem.recover.shape[1]
    solved = [solve_block(problem, block, method) for block in blocks]
    found = [entry.roots for entry in solved]
    values, lefts, block_of, partner, states = [], [], [], [], []
    z = np.zeros((size, sum(len(part.values) for part in found)), dtype=np.complex128)
    offset = 0
    for number, (part, place) in enumerate(zip(found, blocks, strict=True)):
        z[place, offset : offset + len(part.values)] = part.vectors
        values.append(part.values)
        block_of.append(np.full(len(part.values), number))
        partner.append(np.where(part.partner >= 0, part.partner + offset, -1))
        states.append(part.state)
        if part.left is not None:
            lefts.append(part.left)
        offset += len(part.values)
    roots = np.concatenate(values)
    left = np.hstack(lefts) if lefts else None
    if not (np.all(np.isfinite(roots)) and np.all(np.isfinite(z))):
        raise UnverifiedError(
            "an eigenvalue came out infinite or undefined", "look for values near the ends of the number range"
        )
    z, left = _normalised(z), None if left is None else _normalised(left)
    which = np.concatenate(block_of)
    seen = measure(problem, roots, z, left)
    if not settled(seen, roots, size):
        roots, z, left, seen = _refined(problem, roots, z, left, seen)
    judgement = judge(problem, roots, z, left, seen=seen)
    mates = np.concatenate(partner)
    bounds = oscillator_bounds(problem, roots, judgement.bound, which, blocks)
    computed = roots
    other = z if left is None else left
    inertia = np.einsum("ij,ij->j", other[: problem.heavy], z[: problem.heavy])
    meeting = np.abs(judgement.slope) <= _MEETING * np.abs(roots) * np.abs(inertia)
    roots, bounds, clustered = average_clusters(roots, bounds, which, mates, states, meeting, problem.amplification)
    return Roots(
        values=roots,
        computed=computed,
        vectors=z,
        left=left,
        bounds=bounds,
        backward=judgement.backward,
        block=which,
        partner=mates,
        clustered=clustered,
        slope=judgement.slope,
        count=sum(part.count for part in found),
        method=_describe(problem, solved),
    )


def _refined(
    problem: NormalisedProblem,
    roots: NDArray[np.complex128],
    z: NDArray[np.complex128],
    left: NDArray[np.complex128] | None,
    seen: Measured,
) -> tuple[NDArray[np.complex128], NDArray[np.complex128], NDArray[np.complex128] | None, Measured]:
    """Refined pairs and what is seen of them; only pairs that change are looked at again."""
    new, new_z, new_left, index = refine(problem, roots, z, left, seen)
    if not len(index):
        return roots, z, left, seen

    def at(vectors: NDArray[np.complex128] | None, which: NDArray[np.int64]) -> NDArray[np.complex128] | None:
        return None if vectors is None else vectors[:, which]

    again = measure(problem, new[index], new_z[:, index], at(new_left, index))
    # Near a double root a step moves the root away from its vector; such roots stay as they came.
    worse = again.backward > np.maximum(seen.backward[index], len(z) * _EPS)
    back = index[worse]
    if len(back):
        new[back], new_z[:, back] = roots[back], z[:, back]
        if left is not None and new_left is not None:
            new_left[:, back] = left[:, back]
        for which in back:
            new_z[:, which] = inverse_step(problem, new[which], new_z[:, which], transposed=False)
        again = measure(problem, new[index], new_z[:, index], at(new_left, index))
    for whole, part in (
        (seen.numerator, again.numerator),
        (seen.slope, again.slope),
        (seen.backward, again.backward),
        (seen.step, again.step),
    ):
        whole[index] = part
    seen.rest[:, index] = again.rest
    return new, new_z, new_left, seen


def _describe(problem: NormalisedProblem, solved: list[Solved]) -> str:
    """What was done, in words."""
    kernels = [entry.kernel for entry in solved]
    words = []
    few, dense = kernels.count("few dampers"), kernels.count("state matrix")
    alone = kernels.count("proportional")
    if few:
        words.append("secular form of few dampers")
    if dense:
        words.append(f"dense, energy-balanced state matrix{'' if problem.modal else ' with first-order states'}")
    if not (few or dense):
        words.append("proportional: every undamped mode keeps its own two roots" if alone else f"dense, {kernels[0]}")
    elif alone:
        words.append(f"{alone} mode{'' if alone == 1 else 's'} that damping leaves uncoupled")
    reasons = [f"secular form given up: {entry.fallback}" for entry in solved if entry.fallback]
    return ", ".join([*words, *dict.fromkeys(reasons)])


def _normalised(vectors: NDArray[np.complex128]) -> NDArray[np.complex128]:
    length = lengths(vectors)
    if np.any(length == 0):
        raise UnverifiedError("an eigenvector vanished", "look for values near the ends of the number range")
    return np.asarray(vectors / length, dtype=np.complex128)
