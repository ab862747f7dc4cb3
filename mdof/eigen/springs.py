"""Undamped modes from the springs as factors, small frequencies accurate beside stiff springs.

One-sided Jacobi SVD of ``diag(√k) Bᵀ`` (Demmel et al., Linear Algebra Appl. 299, 1999; LAPACK's xGEJSV by Drmač &
Veselić, SIAM J. Matrix Anal. Appl. 29, 2008). The matrix K, where that information is already rounded away, is never
formed. Free motions are the null space of the spring directions alone, so their number does not depend on how stiff
the springs are.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from scipy.linalg import lapack

from mdof.errors import UnverifiedError

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from mdof.system import System

__all__ = ["JACOBI_LIMIT", "by_eigensolver", "free_motions", "split", "spring_modes", "symmetric_factors"]

_EPS = float(np.finfo(np.float64).eps)
#: Above this size the Jacobi SVD gives way to a symmetric eigensolver wherever that is accurate enough.
JACOBI_LIMIT = 220
_MILD = 1e-6


def free_motions(
    system: System, springs: NDArray[np.float64], size: int
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Orthonormal bases of what no spring resists and of the rest, from the spring directions alone."""
    active = springs[system.stiffness != 0] if len(springs) else springs
    if not len(active):
        return split(np.eye(size))
    # Coordinates first: metres and radians, heavy and light, differ by orders that say nothing about connectivity.
    scale = np.abs(active).max(axis=0)
    scale[scale == 0] = 1.0
    scaled = active / scale
    length = np.linalg.norm(scaled, axis=1)
    # A spring in series with a far softer one stretches by nothing that can be told from zero.
    scaled = scaled[length > 0] / length[length > 0][:, None]
    if not len(scaled):
        return split(np.eye(size))
    if len(scaled) >= size:
        gram = scaled.T @ scaled
        if np.linalg.eigvalsh(gram)[0] > 1e-9 * len(scaled) / size:
            return np.zeros((size, 0)), np.eye(size)
    _, values, right = np.linalg.svd(scaled, full_matrices=True)
    rank = int(np.sum(values > max(scaled.shape) * 16 * _EPS * values[0]))
    if rank == size:
        return np.zeros((size, 0)), np.eye(size)
    return split(right[rank:].T / scale[:, None])


def split(free: NDArray[np.float64]) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Orthonormal bases of the span of independent columns and of what is orthogonal to it."""
    size, count = free.shape
    if not count:
        return free, np.eye(size)
    q, _ = np.linalg.qr(free / np.linalg.norm(free, axis=0), mode="complete")
    return q[:, :count], q[:, count:]


def spring_modes(
    factor: NDArray[np.float64],
) -> tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]:
    """Left vectors, singular values and right vectors of a factor of full column rank, small values accurate."""
    rows, columns = factor.shape
    if not columns:
        return np.zeros((rows, 0)), np.zeros(0), np.zeros((0, 0))
    if columns > JACOBI_LIMIT:
        values, vectors = np.linalg.eigh(factor.T @ factor)
        if values[0] > _MILD * values[-1]:
            sigma = np.sqrt(values)
            return (factor @ vectors) / sigma, sigma, vectors
    if not np.all(np.isfinite(factor)):
        raise _undecomposed()
    size, left, right, _, _, info = lapack.dgejsv(factor, joba=2, jobu=0, jobv=0, jobr=1, jobt=0, jobp=1)
    if info != 0 or not np.all(np.isfinite(size)) or np.any(size <= 0):
        raise _undecomposed()
    # uᵀ A v squares the errors of the vectors and repairs what pivoting by columns alone lets through.
    sigma = np.einsum("ij,ij->j", left, factor @ right)
    order = np.argsort(sigma)
    return left[:, order], sigma[order], right[:, order]


def by_eigensolver(sigma: NDArray[np.float64]) -> bool:
    """True where :func:`spring_modes` found these values by the symmetric eigensolver."""
    return len(sigma) > JACOBI_LIMIT and bool(sigma.min() ** 2 > _MILD * sigma.max() ** 2)


def _undecomposed() -> UnverifiedError:
    return UnverifiedError(
        "the stiffness factors could not be decomposed",
        "look for stiffness values that differ by over 30 orders of magnitude",
    )


def symmetric_factors(stiffness: NDArray[np.float64], size: int) -> tuple[NDArray[np.float64], ...]:
    """Σ, S, W and N of a symmetric stiffness matrix that may be indefinite."""
    values, vectors = np.linalg.eigh(stiffness)
    tolerance = 4 * size * _EPS * max(abs(values[0]), abs(values[-1]))
    held = np.abs(values) > tolerance
    if not held.all():
        unit = np.sqrt(np.abs(np.diag(stiffness)))
        unit[unit == 0] = 1.0
        own = np.abs(np.linalg.eigvalsh(stiffness / np.outer(unit, unit)))
        if np.sum(~held) > np.sum(own <= 4 * size * _EPS * max(own.max(), 1.0)):
            raise UnverifiedError(
                "a soft mode drowns in the rounding of the stiffness matrix",
                "give its springs as connections instead of a matrix, or a model of less unlike stiffness",
            )
    return np.sqrt(np.abs(values[held])), np.sign(values[held]), vectors[:, held], vectors[:, ~held]
