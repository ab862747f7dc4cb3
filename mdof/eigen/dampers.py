"""Damper factors of the normalised problem: viscous dampers, and loss factors as dashpots."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from mdof.errors import UnverifiedError

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from mdof.system import System

__all__ = ["damper_rows", "damper_rows_in_modes", "factored_damping"]

_EPS = float(np.finfo(np.float64).eps)
#: A damping matrix has few dampers where its rank is below one in so many coordinates.
_FEW = 8


def damper_rows(
    system: System, springs: NDArray[np.float64], dampers: NDArray[np.float64], spring_rows: NDArray[np.float64]
) -> tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]:
    """Factors of viscous damping, of loss factors with a stated reference (as dashpots) and of those without."""
    lossy = system.loss_factor != 0
    stated = lossy & np.isfinite(system.loss_reference)
    floating = lossy & ~stated
    if np.any(floating & (system.stiffness < 0)):
        raise UnverifiedError(
            "a loss factor on a negative stiffness cannot be matched at each mode's own frequency",
            "state a `reference_frequency` for it",
        )
    equivalent = np.zeros(len(system.loss_factor))
    equivalent[stated] = system.loss_factor[stated] * system.stiffness[stated] / system.loss_reference[stated]
    rows = [
        np.sqrt(np.abs(system.damping))[:, None] * dampers,
        np.sqrt(np.abs(equivalent[stated]))[:, None] * springs[stated],
    ]
    signs = np.concatenate([np.sign(system.damping), np.sign(equivalent[stated])])
    loss = np.sqrt(np.abs(system.loss_factor[floating]))[:, None] * spring_rows[floating]
    return np.vstack(rows), signs, loss


def damper_rows_in_modes(
    system: System,
    rows: NDArray[np.float64],
    loss: NDArray[np.float64],
    left: NDArray[np.float64] | None,
    sigma: NDArray[np.float64],
    basis: NDArray[np.float64],
    root_k: NDArray[np.float64],
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Damper factors in undamped modes, without the cancellation of small relative motions.

    Where a damper shares its direction with a spring, the relative motion in mode j is ``σ_j u_ij / √k_i`` from the
    left singular vectors; elsewhere it is a difference of displacements, and what lies below its rounding is zero.
    """
    result, floated = rows @ basis, loss @ basis
    size, floated_size = np.abs(rows) @ np.abs(basis), np.abs(loss) @ np.abs(basis)
    if left is None:
        result[np.abs(result) <= 4 * _EPS * size] = 0.0
        return result, floated
    lossy = system.loss_factor != 0
    stated = np.nonzero(lossy & np.isfinite(system.loss_reference))[0]
    floating = np.nonzero(lossy & ~np.isfinite(system.loss_reference))[0]
    count = len(system.damping)
    shared = np.nonzero((system.damper_spring >= 0) & (np.append(root_k, 0.0)[system.damper_spring] > 0))[0]
    spring = system.damper_spring[shared]
    apart = np.setdiff1d(np.arange(count), shared)
    result[apart] = np.where(np.abs(result[apart]) <= 4 * _EPS * size[apart], 0.0, result[apart])
    forces = np.hstack([left * sigma, np.zeros((len(left), basis.shape[1] - len(sigma)))])

    def from_forces(ratio: NDArray[np.float64], which: NDArray[np.int64], plain: Any, effort: Any) -> Any:
        # Differences that cancel little are the more accurate of the two.
        return np.where(np.abs(plain) > 0.25 * effort, plain, np.sqrt(np.abs(ratio))[:, None] * forces[which])

    ratio = system.damping[shared] / root_k[spring] ** 2
    result[shared] = from_forces(ratio, spring, result[shared], size[shared])
    ratio = system.loss_factor[stated] / system.loss_reference[stated]
    result[count:] = from_forces(ratio, stated, result[count:], size[count:])
    floated = from_forces(system.loss_factor[floating], floating, floated, floated_size)
    return result, floated


def factored_damping(system: System) -> tuple[NDArray[np.float64] | None, Any]:
    """Columns F, shape (n, r), with ``F Fᵀ`` the given damping matrix where its rank is low, and what is left over.

    Cholesky factorisation with diagonal pivoting stops at the rank (Higham, Accuracy and Stability of Numerical
    Algorithms, 2nd ed. 2002, section 10.3); a matrix of full rank, or one that is not positive semidefinite, is left
    as it is.
    """
    matrix = system.handy("extra_damping")
    if matrix is None:
        return None, None
    most = system.size // _FEW
    if most == 0:
        return None, matrix
    full = matrix if isinstance(matrix, np.ndarray) else matrix.toarray()
    diagonal = np.diagonal(full)
    largest = float(diagonal.max(initial=0.0))
    if largest <= 0 or np.any(diagonal < 0) or np.abs(full - full.T).max() > 4 * _EPS * largest:
        return None, matrix
    tolerance = system.size * _EPS * diagonal
    left = diagonal.copy()
    columns = np.zeros((system.size, most))
    for rank in range(most):
        pivot = int(np.argmax(np.where(diagonal > 0, left / np.where(diagonal > 0, diagonal, 1.0), 0.0)))
        if left[pivot] <= tolerance[pivot]:
            break
        column = full[:, pivot] - columns[:, :rank] @ columns[pivot, :rank]
        columns[:, rank] = column / np.sqrt(left[pivot])
        left = np.maximum(left - columns[:, rank] ** 2, 0.0)
        left[pivot] = 0.0
    else:
        rank = most
    columns = columns[:, :rank]
    if np.any(left > tolerance):
        return None, matrix
    worst = np.abs(columns @ columns.T - full)
    scale = np.sqrt(diagonal)
    if np.any(worst > system.size * _EPS * np.outer(scale, scale)):
        return None, matrix
    return columns, None
