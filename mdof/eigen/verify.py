"""Judging eigenpairs of the normalised problem: residuals, forward bounds, completeness.

Backward error after Tisseur (Linear Algebra Appl. 309, 2000). The forward bound is first order and structured: it asks
how far the eigenvalue moves when every factor (a frequency, a damper, a mass) is off by rounding, which stays small
beside stiff springs where the normwise condition number does not.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from mdof.errors import UnverifiedError

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from mdof.eigen.reduce import NormalisedProblem

__all__ = [
    "GATE",
    "Judgement",
    "Measured",
    "check_completeness",
    "damping_times",
    "judge",
    "lengths",
    "measure",
    "real_times",
]

_EPS = float(np.finfo(np.float64).eps)
#: Largest accepted backward error over n times the unit roundoff, in the manner of LAPACK's test programs.
GATE = 10.0
#: Roots above which the second-order term of the bound uses norms.
_MANY = 400


@dataclass(frozen=True, kw_only=True, slots=True, eq=False)
class Judgement:
    """Per root: residual vector's backward error, forward bound on λ (absolute) and zᵀ(2λM + D)z."""

    backward: NDArray[np.float64]
    bound: NDArray[np.float64]
    slope: NDArray[np.complex128]


@dataclass(frozen=True, kw_only=True, slots=True, eq=False)
class Measured:
    """Residuals r = Q(λ)x of shape (m, q) and, per root, yᵀr, yᵀQ'x, backward error and Rayleigh step on λ."""

    rest: NDArray[np.complex128]
    numerator: NDArray[np.complex128]
    slope: NDArray[np.complex128]
    backward: NDArray[np.float64]
    step: NDArray[np.complex128]


def damping_times(
    problem: NormalisedProblem, vectors: NDArray[np.complex128], reference: NDArray[np.float64] | None
) -> NDArray[np.complex128]:
    """D z for every column, loss factors without a reference matched at ``reference`` (shape (n_roots,), rad/s)."""
    if problem.own_damping is not None and 4 * len(problem.damper_rows) < len(vectors):
        # Few dampers: through their factors, which is cheaper and loses nothing.
        rows = problem.damper_rows
        product = real_times(rows.T * problem.damper_signs, real_times(rows, vectors))
        if problem.own_damping.any():
            product += problem.own_damping[:, None] * vectors
    else:
        product = real_times(problem.damping, vectors)
    if reference is not None and len(problem.loss_rows):
        product = product + problem.loss_rows.T @ ((problem.loss_rows @ vectors) / reference)
    return product


def lengths(vectors: NDArray[np.complex128]) -> NDArray[np.float64]:
    """2-norm of every column, without a temporary of magnitudes."""
    parts = np.ascontiguousarray(vectors).view(np.float64)
    squares = np.einsum("ij,ij->j", parts, parts)
    return np.asarray(np.sqrt(squares[0::2] + squares[1::2]))


def real_times(matrix: NDArray[np.float64], vectors: NDArray[np.complex128]) -> NDArray[np.complex128]:
    """A real matrix times complex columns, in half the work of a complex product."""
    if not vectors.shape[1]:
        return np.zeros((matrix.shape[0], 0), dtype=np.complex128)
    # Real and imaginary parts lie side by side in memory: twice as many real columns.
    parts = np.ascontiguousarray(vectors, dtype=np.complex128).view(np.float64)
    return (matrix @ parts).view(np.complex128)


def _residuals(
    problem: NormalisedProblem,
    values: NDArray[np.complex128],
    vectors: NDArray[np.complex128],
    damped: NDArray[np.complex128],
) -> NDArray[np.complex128]:
    """Q(λ) z for every column, shape (m, q), from the factors."""
    squares = problem.sigma**2 * problem.sign
    # In place: these are the largest arrays of a solve.
    result = values * vectors
    result[problem.heavy :] = 0.0
    result += damped
    result *= values
    if problem.modal:
        result[: len(squares)] += squares[:, None] * vectors[: len(squares)]
    else:
        result += problem.W @ (squares[:, None] * (problem.W.T @ vectors))
    if problem.skew_stiffness is not None:
        result += problem.skew_stiffness @ vectors
    return result


def judge(
    problem: NormalisedProblem,
    values: NDArray[np.complex128],
    vectors: NDArray[np.complex128],
    left: NDArray[np.complex128] | None = None,
    reference: NDArray[np.float64] | None = None,
    seen: Measured | None = None,
) -> Judgement:
    """Backward errors and forward bounds of eigenpairs.

    Parameters
    ----------
    values : shape (q,) [1/s]; vectors : shape (m, q)
    left : shape (m, q), optional
        Left vectors, unconjugated transposes; the right ones serve for symmetric problems.
    seen : Measured, optional
        What :func:`measure` said of the very same pairs.
    """
    other = vectors if left is None else left
    if seen is None:
        seen = measure(problem, values, vectors, left, reference)
    size = np.abs(values)
    effort = _effort(problem, size, np.abs(vectors), np.abs(other) if left is not None else None, vectors, other)
    if problem.normwise:
        length = np.linalg.norm(other, axis=0) * np.linalg.norm(vectors, axis=0)
        stiffness_norm, damping_norm = _norms(problem, reference)
        # Rayleigh quotients of vectors with error e are off by e², which the residual measures through the norms.
        effort += (stiffness_norm + size * damping_norm) * length
    with np.errstate(divide="ignore", invalid="ignore"):
        uncertain = np.abs(seen.numerator) + (len(vectors) + 8) * _EPS * problem.amplification * effort
        bound = uncertain / np.abs(seen.slope)
    # The second factor of the forward error is the residual seen by all other modes.
    bound = np.where(np.isfinite(bound), bound, np.inf) + _second_order(
        values, other, seen.rest, seen.slope, problem.heavy
    )
    return Judgement(backward=seen.backward, bound=bound, slope=seen.slope)


def measure(
    problem: NormalisedProblem,
    values: NDArray[np.complex128],
    vectors: NDArray[np.complex128],
    left: NDArray[np.complex128] | None = None,
    reference: NDArray[np.float64] | None = None,
) -> Measured:
    """Residuals and Rayleigh steps, without bounds; the parameters are those of :func:`judge`."""
    other = vectors if left is None else left
    damped = damping_times(problem, vectors, reference)
    rest = _residuals(problem, values, vectors, damped)
    heavy = slice(0, problem.heavy)
    slope = 2 * values * _dots(other[heavy], vectors[heavy]) + _dots(other, damped)
    numerator = _dots(other, rest)
    stiffness_norm, damping_norm = _norms(problem, reference)
    size = np.abs(values)
    scale = (size**2 + size * damping_norm + stiffness_norm) * lengths(vectors)
    with np.errstate(divide="ignore", invalid="ignore"):
        step = np.where(slope != 0, -numerator / slope, 0.0)
        backward = np.where(scale > 0, lengths(rest) / scale, 0.0)
    return Measured(rest=rest, numerator=numerator, slope=slope, backward=backward, step=step)


def _norms(problem: NormalisedProblem, reference: NDArray[np.float64] | None) -> tuple[float, float]:
    """2-norm of the normalised K and a lower bound on that of D."""
    damping = float(np.linalg.norm(problem.damping, axis=0).max(initial=0.0))
    if len(problem.loss_rows) and reference is not None:
        damping += float(np.max(np.sum(problem.loss_rows**2, axis=0), initial=0.0) / max(reference.min(), 1e-300))
    return float((problem.sigma**2).max(initial=0.0)), damping


def _dots(first: NDArray[Any], second: NDArray[Any]) -> NDArray[Any]:
    """Σ first · second of every column, unconjugated."""
    return np.asarray(np.einsum("ij,ij->j", first, second))


def _effort(
    problem: NormalisedProblem,
    size: NDArray[np.float64],
    magnitude: NDArray[np.float64],
    magnitude_left: NDArray[np.float64] | None,
    vectors: NDArray[np.complex128],
    other: NDArray[np.complex128],
) -> NDArray[np.float64]:
    """What rounding of every factor is multiplied by in yᵀQ(λ)x: sums of absolute products, shape (q,)."""
    beside = magnitude if magnitude_left is None else magnitude_left
    heavy = slice(0, problem.heavy)
    effort = size**2 * _dots(beside[heavy], magnitude[heavy])
    squares = problem.sigma**2
    if problem.modal:
        held = slice(0, len(squares))
        effort += squares @ (beside[held] * magnitude[held])
        if problem.spring_rows is not None and len(problem.spring_rows):
            effort += _dots(np.abs(problem.spring_rows @ other), np.abs(problem.spring_rows @ vectors))
    elif problem.spring_rows is None:
        effort += squares @ (np.abs(problem.W.T @ other) * np.abs(problem.W.T @ vectors))
    else:
        effort += _dots(np.abs(problem.spring_rows @ other), np.abs(problem.spring_rows @ vectors))
        effort += _dots(beside, np.abs((problem.W * squares) @ problem.W.T) @ magnitude)
    if len(problem.damper_rows):
        # A damper's stretch is a sum over modes that may cancel where it all but locks.
        effort += size * _dots(np.abs(real_times(problem.damper_rows, other)), np.abs(problem.damper_rows) @ magnitude)
    if problem.own_damping is not None:
        effort += size * (np.diagonal(problem.damping) @ (beside * magnitude))
    else:
        effort += size * _dots(beside, np.abs(problem.damping) @ magnitude)
    return np.asarray(effort)


def _second_order(
    values: NDArray[np.complex128],
    other: NDArray[np.complex128],
    rest: NDArray[np.complex128],
    slope: NDArray[np.complex128],
    heavy: int,
) -> NDArray[np.float64]:
    """Σ_k |z_kᵀ r_i|² / (|λ_i − λ_k| |slope_k slope_i|) over the other roots and their conjugates.

    Free motions have the exact root 0, double and of slope 0 where nothing damps them; they count as
    1 / (|λ_i|² z_kᵀMz_k). Large problems take |z_k| |r_i| for the products, which costs less and is never smaller.
    """
    along = (values.real[:, None] - values.real[None, :]) ** 2
    gap = np.sqrt(along + (values.imag[:, None] - values.imag[None, :]) ** 2)
    gap_conjugate = np.sqrt(along + (values.imag[:, None] + values.imag[None, :]) ** 2)
    np.fill_diagonal(gap, np.inf)
    gap_conjugate[np.diag_indices(len(values))] = np.where(values.imag != 0, np.diag(gap_conjugate), np.inf)
    free = values == 0
    size = np.abs(slope)
    with np.errstate(divide="ignore", invalid="ignore"):
        # Row k, column i: what mode k adds to root i for |z_kᵀ r_i| = 1.
        pull, pull_conjugate, weight = 1.0 / gap, 1.0 / gap_conjugate, 1.0 / size
        if free.any():
            modal_mass = lengths(other[:heavy, free]) ** 2
            pull[free] = 1.0 / np.maximum(size[free, None] * gap[free], modal_mass[:, None] * gap[free] ** 2)
            pull_conjugate[free] = 0.0
            weight[free] = 1.0
        if len(values) > _MANY:
            total = lengths(rest) ** 2 * ((lengths(other) ** 2 * weight) @ (pull + pull_conjugate))
        else:
            seen, seen_conjugate = np.abs(other.T @ rest) ** 2, np.abs(other.conj().T @ rest) ** 2
            total = (weight[:, None] * (seen * pull + seen_conjugate * pull_conjugate)).sum(axis=0)
        total = total / size
    floor = np.finfo(np.float64).tiny
    return np.where(np.isfinite(total), total, 0.0) + floor


def check_completeness(state: NDArray[np.float64], values: NDArray[np.complex128], where: str = "the model") -> None:
    """Compare Σλ and Σλ² with the traces of the state matrix and its square.

    Parameters
    ----------
    state : ndarray, shape (s, s)
    values : ndarray of complex, shape (s,)
        All eigenvalues, conjugates included.

    Raises
    ------
    UnverifiedError
        If eigenvalues are missing or doubled.
    """
    if len(values) != len(state):
        raise UnverifiedError(
            f"{len(values)} eigenvalues found where {len(state)} are expected in {where}",
            "report this model; the answer is incomplete",
        )
    norm = float(np.linalg.norm(state))
    first = abs(values.sum() - np.trace(state))
    second = abs((values**2).sum() - np.einsum("ij,ji->", state, state))
    # An eigenvalue as large as the norm lost or doubled shows as 1; rounding of the sums as n times the unit roundoff.
    limit = 1e4 * len(state) * _EPS
    if norm > 0 and (first > limit * norm or second > limit * norm**2):
        raise UnverifiedError(
            f"the sums of the eigenvalues miss the traces of {where} by {first / norm:.1e} "
            f"and {second / norm**2:.1e} of its norm",
            "look for stiffness, mass or damping values that differ by more than 12 orders of magnitude",
        )
