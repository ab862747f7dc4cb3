"""Mass becomes the identity; massless coordinates that nothing damps are condensed."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np
from scipy.linalg import cholesky, solve_triangular

from mdof.errors import UnverifiedError

if TYPE_CHECKING:
    from numpy.typing import NDArray

__all__ = ["condense_massless", "mass_basis", "turned"]

_EPS = float(np.finfo(np.float64).eps)


def turned(rows: Any, basis: NDArray[np.float64]) -> NDArray[np.float64]:
    """``rows @ basis`` as a dense array; a diagonal basis or diagonal rows only scale."""
    from scipy.sparse import issparse

    if not rows.shape[0]:
        return np.zeros((0, basis.shape[1]))
    scale = _diagonal(basis)
    if scale is not None:
        return np.asarray((rows.toarray() if issparse(rows) else rows) * scale)
    if not issparse(rows):
        scale = _diagonal(rows)
        if scale is not None:
            return np.asarray(scale[:, None] * basis)
    elif rows.nnz > 0.2 * rows.shape[0] * rows.shape[1]:
        rows = rows.toarray()
    return np.asarray(rows @ basis)


def _diagonal(matrix: NDArray[np.float64]) -> NDArray[np.float64] | None:
    """The diagonal of a square matrix that holds nothing else."""
    if matrix.shape[0] != matrix.shape[1] or (len(matrix) > 1 and matrix[0, 1] != 0):
        return None
    diagonal = np.diagonal(matrix)
    return diagonal.copy() if np.count_nonzero(matrix) == np.count_nonzero(diagonal) else None


def mass_basis(mass: Any) -> tuple[NDArray[np.float64], int, float]:
    """Columns T with ``Tᵀ M T = diag(I, 0)``, heavy ones first, their number, and how T may magnify rounding.

    Parameters
    ----------
    mass : sparse array, shape (n, n)
    """
    plain = mass.diagonal()
    if mass.nnz == np.count_nonzero(plain) == len(plain) and np.all(plain > 0):
        return np.diag(1.0 / np.sqrt(plain)), len(plain), 1.0
    mass = mass.toarray()
    n = len(mass)
    light = ~mass.any(axis=0)
    index = np.concatenate([np.nonzero(~light)[0], np.nonzero(light)[0]])
    heavy = int(n - light.sum())
    basis = np.zeros((n, n))
    basis[index[heavy:], np.arange(heavy, n)] = 1.0
    if not heavy:
        return basis, 0, 1.0
    block = mass[np.ix_(index[:heavy], index[:heavy])]
    scale = np.sqrt(np.abs(np.diag(block)))
    scale[scale == 0] = 1.0
    scaled = block / np.outer(scale, scale)
    try:
        lower = cholesky(scaled, lower=True)
        if np.min(np.diag(lower)) > 1e-7:
            inner = solve_triangular(lower, np.eye(heavy), lower=True).T
            basis[np.ix_(index[:heavy], np.arange(heavy))] = inner / scale[:, None]
            # Skeel's condition number of the triangular factor, squared: M is its product with itself.
            return basis, heavy, float((np.abs(inner.T) @ np.abs(lower)).sum(axis=1).max()) ** 2
    except np.linalg.LinAlgError:
        pass
    values, vectors = np.linalg.eigh(scaled)
    tolerance = heavy * _EPS * max(abs(values[0]), abs(values[-1]))
    if values[0] < -10 * tolerance:
        raise UnverifiedError(
            f"the mass matrix is not positive semidefinite (lowest scaled eigenvalue {values[0]:.3g})",
            "check masses, inertias and products of inertia for signs",
        )
    massive = values > 2 * tolerance
    if np.any(massive & (values < 100 * tolerance)):
        raise UnverifiedError(
            "rounding decides whether the mass matrix is singular",
            "leave massless directions out, or give them a mass that counts",
        )
    vectors = vectors / scale[:, None]
    order = np.concatenate([np.nonzero(massive)[0], np.nonzero(~massive)[0]])
    count = int(massive.sum())
    block_basis = vectors[:, order]
    block_basis[:, :count] /= np.sqrt(values[massive])
    basis[np.ix_(index[:heavy], np.arange(heavy))] = block_basis
    kept = values[massive]
    return basis, count, float(kept.max() / kept.min() * heavy) if count else 1.0


def condense_massless(
    base: NDArray[np.float64],
    heavy: int,
    springs: NDArray[np.float64],
    stiffness: NDArray[np.float64],
    dampers: NDArray[np.float64],
    damping: NDArray[np.float64],
    extra_k: NDArray[np.float64] | None,
    extra_c: NDArray[np.float64] | None,
    definite: bool,
    free: NDArray[np.float64],
) -> tuple[Any, ...]:
    """Condense massless coordinates that no damper moves; the others keep their first-order equation.

    ``free`` holds what no spring resists, one motion a column; it is handed on in the coordinates that remain.
    """
    light = np.arange(heavy, base.shape[1])
    block = dampers[:, light]
    norms = np.linalg.norm(block, axis=1)
    block = block[norms > 0] / norms[norms > 0][:, None] if norms.any() else np.zeros((0, len(light)))
    parts = [block]
    if extra_c is not None and extra_c[np.ix_(light, light)].any():
        own = extra_c[np.ix_(light, light)]
        # Row by row, so that a weak damper counts beside a strong one; the null space stays the same.
        largest = np.maximum(np.abs(own).max(axis=1), np.finfo(float).tiny)
        parts.append(own / largest[:, None])
    _, size, right = np.linalg.svd(np.vstack(parts), full_matrices=True)
    rank = int(np.sum(size > 1e-10 * max(size.max(initial=0.0), 1.0)))
    turn = np.eye(base.shape[1])
    turn[np.ix_(light, light)] = right.T
    base, springs, dampers = base @ turn, springs @ turn, dampers @ turn
    extra_c = None if extra_c is None else turn.T @ extra_c @ turn
    extra_k = None if extra_k is None else turn.T @ extra_k @ turn
    kept = np.arange(heavy + rank)
    loose = np.arange(heavy + rank, base.shape[1])
    dampers[:, loose] = 0.0
    free = (turn.T @ free)[kept]
    if len(loose):
        weight = np.sqrt(np.abs(stiffness))[:, None]
        if definite:
            # Least squares in the spring forces is static equilibrium, and keeps the springs as factors.
            rows = weight * springs
            held = rows[:, loose]
            scale = np.linalg.norm(held, axis=0)
            if np.any(scale == 0):
                raise _loose()
            q, r = np.linalg.qr(held / scale)
            if np.min(np.abs(np.diag(r))) <= 1e-12:
                raise _loose()
            follow = -solve_triangular(r, q.T @ rows[:, kept]) / scale[:, None]
            springs = springs[:, kept] + springs[:, loose] @ follow
        else:
            full = (springs.T * stiffness) @ springs + (0.0 if extra_k is None else extra_k)
            inner = full[np.ix_(loose, loose)]
            if np.linalg.cond(inner) > 1e13:
                raise _loose()
            follow = -np.linalg.solve(inner, full[np.ix_(loose, kept)])
            springs = springs[:, kept] + springs[:, loose] @ follow
            if extra_k is not None:
                map_ = np.zeros((base.shape[1], len(kept)))
                map_[kept, kept] = 1.0
                map_[loose] = follow
                extra_k = map_.T @ extra_k @ map_
        base = base[:, kept] + base[:, loose] @ follow
        dampers = dampers[:, kept]
        extra_c = None if extra_c is None else extra_c[np.ix_(kept, kept)]
    if rank:
        # One damping unit for every light coordinate.
        last = np.arange(heavy, heavy + rank)
        own = (dampers[:, last].T * damping) @ dampers[:, last]
        if extra_c is not None:
            own = own + extra_c[np.ix_(last, last)]
        scale = 1.0 / np.sqrt(np.abs(np.diag(own)))
        base[:, last] *= scale
        free[last] /= scale[:, None]
        springs[:, last] *= scale
        dampers[:, last] *= scale
        if extra_c is not None:
            extra_c[last] *= scale[:, None]
            extra_c[:, last] *= scale
        if extra_k is not None:
            extra_k[last] *= scale[:, None]
            extra_k[:, last] *= scale
    return base, springs, dampers, extra_k, extra_c, heavy, free


def _loose() -> UnverifiedError:
    return UnverifiedError(
        "a massless coordinate is held by neither stiffness nor damping", "give it a mass, a spring or a damper"
    )
