"""Refining roots and vectors of the normalised problem until only rounding is left."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from mdof.eigen.verify import Measured, measure

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from mdof.eigen.reduce import NormalisedProblem

__all__ = ["inverse_step", "refine", "settled"]

_EPS = float(np.finfo(np.float64).eps)
_REFINEMENTS = 6
_FEW_ROUNDINGS = 4
#: Cosine from which two shapes are those of roots about to collide.
_ALIKE = 1 - 1e-6


def refine(
    problem: NormalisedProblem,
    values: NDArray[np.complex128],
    vectors: NDArray[np.complex128],
    left: NDArray[np.complex128] | None,
    seen: Measured,
) -> tuple[NDArray[np.complex128], NDArray[np.complex128], NDArray[np.complex128] | None, NDArray[np.int64]]:
    """Inverse iteration for vectors that leave more than rounding, then two-sided Rayleigh steps.

    The steps recover small roots beside large ones; roots about to collide keep their values.

    Parameters
    ----------
    seen : Measured
        What :func:`mdof.eigen.verify.measure` said of these pairs.

    Returns
    -------
    values, vectors, left, and the indices of the pairs that changed
    """
    values, vectors = values.copy(), vectors.copy()
    left = None if left is None else left.copy()
    active = np.nonzero(values != 0)[0]
    step, backward = seen.step[active], seen.backward[active]
    changed = np.zeros(len(values), dtype=bool)
    last = np.full(len(values), np.inf)
    for turn in range(_REFINEMENTS):
        if turn:
            now = measure(problem, values[active], vectors[:, active], None if left is None else left[:, active])
            step, backward = now.step, now.backward
        old = values[active]
        # What is right but for a few roundings is left alone at first; what moves once is brought to the last digit.
        wanted = np.abs(step) > (0.5 if turn else _FEW_ROUNDINGS) * _EPS * np.abs(old)
        wanted[wanted] &= np.abs(step[wanted]) < 0.05 * _gaps(values, active[wanted])
        moved = old + np.where(wanted, step, 0.0)
        values[active] = np.where(old.imag == 0, moved.real, moved)
        rough = backward > 0.5 * len(vectors) * _EPS
        changed[active[wanted | rough]] = True
        if turn == _REFINEMENTS - 1:
            break
        for index in active[rough]:
            vectors[:, index] = inverse_step(problem, values[index], vectors[:, index], transposed=False)
            if left is not None:
                left[:, index] = inverse_step(problem, values[index], left[:, index], transposed=True)
        # Steps of a few roundings are as good as none, and steps that no longer shrink are rounding themselves.
        length = np.abs(step)
        going = wanted & (length > 16 * _EPS * np.abs(old)) & (length < 0.1 * last[active])
        last[active] = length
        active = active[rough | going]
        if not len(active):
            break
    return values, vectors, left, np.nonzero(changed)[0]


def settled(seen: Measured, values: NDArray[np.complex128], size: int) -> bool:
    """True where no vector is rough and no step longer than a few roundings."""
    moving = values != 0
    long = np.abs(seen.step) > _FEW_ROUNDINGS * _EPS * np.abs(values)
    return not bool(np.any(moving & (long | (seen.backward > 0.5 * size * _EPS))))


def inverse_step(
    problem: NormalisedProblem, value: complex, vector: NDArray[np.complex128], *, transposed: bool
) -> NDArray[np.complex128]:
    """One step of inverse iteration on Q(λ), kept only where it leaves a smaller residual."""
    mass = np.zeros(len(vector))
    mass[: problem.heavy] = 1.0
    value = value.real if value.imag == 0 else value
    quadratic = value * problem.damping + problem.stiffness + np.diag(value**2 * mass)
    slope = 2 * value * np.diag(mass) + problem.damping
    if transposed:
        quadratic, slope = quadratic.T, slope.T
    # Equilibration keeps the elimination stable where stiff and soft modes stand side by side.
    row = 1.0 / np.maximum(np.abs(quadratic).max(axis=1), 1e-300)
    scaled = quadratic * row[:, None]
    best, least = vector, np.linalg.norm(quadratic @ vector)
    try:
        # Near a double root the slope times the shape has nothing along the conjugate shape: take that, too.
        tries = np.linalg.solve(scaled, row[:, None] * np.column_stack([slope @ vector, vector.conj()]))
    except np.linalg.LinAlgError:
        # Singular to the last digit: the root is exact in working precision, and its null vector is the shape.
        tries = np.linalg.svd(scaled)[2][-1:].conj().T
    for number, new in enumerate(tries.T):
        length = np.linalg.norm(new)
        if not np.isfinite(length) or length == 0:
            continue
        new = new / length
        rest = np.linalg.norm(quadratic @ new)
        # The conjugate also finds shapes of other roots nearby, with residuals as small.
        same = number == 0 or abs(np.vdot(vector, new)) > _ALIKE * np.linalg.norm(vector)
        if rest < least and same:
            best, least = new, rest
    return np.asarray(best, dtype=np.complex128)


def _gaps(values: NDArray[np.complex128], which: NDArray[np.int64]) -> NDArray[np.float64]:
    """Distance of chosen roots to the nearest other one, own conjugates included, exact zero roots left out."""
    both = np.concatenate([np.where(values == 0, np.inf, values), values[values.imag > 0].conj()])
    distance = np.abs(values[which][:, None] - both[None, :])
    distance[np.arange(len(which)), which] = np.inf
    result: NDArray[np.float64] = distance.min(axis=1, initial=np.inf)
    return np.where(np.isfinite(result), result, np.abs(values[which]))
