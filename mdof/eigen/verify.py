"""Judging eigenpairs of the normalised problem: residuals, forward bounds, completeness.

Backward error after Tisseur (Linear Algebra Appl. 309, 2000). The forward bound is first order and structured: it asks
how far the eigenvalue moves when every factor (a frequency, a damper, a mass) is off by rounding, which stays small
beside stiff springs where the normwise condition number does not.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from mdof.errors import UnverifiedError

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from mdof.eigen.reduce import NormalisedProblem

__all__ = ["GATE", "Judgement", "check_completeness", "damping_times", "judge", "residuals"]

_EPS = float(np.finfo(np.float64).eps)
#: Largest accepted backward error over n times the unit roundoff, in the manner of LAPACK's test programs.
GATE = 10.0


@dataclass(frozen=True, kw_only=True, slots=True, eq=False)
class Judgement:
    """Per root: residual vector's backward error, forward bound on λ (absolute) and zᵀ(2λM + D)z."""

    backward: NDArray[np.float64]
    bound: NDArray[np.float64]
    slope: NDArray[np.complex128]
    step: NDArray[np.complex128]


def damping_times(
    problem: NormalisedProblem, vectors: NDArray[np.complex128], reference: NDArray[np.float64] | None
) -> NDArray[np.complex128]:
    """D z for every column, loss factors without a reference matched at ``reference`` (shape (n_roots,), rad/s)."""
    product = problem.damping @ vectors
    if reference is not None and len(problem.loss_rows):
        product = product + problem.loss_rows.T @ ((problem.loss_rows @ vectors) / reference)
    return product


def residuals(
    problem: NormalisedProblem,
    values: NDArray[np.complex128],
    vectors: NDArray[np.complex128],
    reference: NDArray[np.float64] | None = None,
) -> NDArray[np.complex128]:
    """Q(λ) z for every column, shape (m, n_roots), from the factors."""
    result = values * damping_times(problem, vectors, reference)
    result[: problem.heavy] += values**2 * vectors[: problem.heavy]
    held = problem.W.T @ vectors
    result += problem.W @ ((problem.sigma**2 * problem.sign)[:, None] * held)
    if problem.skew_stiffness is not None:
        result += problem.skew_stiffness @ vectors
    return result


def judge(
    problem: NormalisedProblem,
    values: NDArray[np.complex128],
    vectors: NDArray[np.complex128],
    left: NDArray[np.complex128] | None = None,
    reference: NDArray[np.float64] | None = None,
) -> Judgement:
    """Backward errors and forward bounds of eigenpairs.

    Parameters
    ----------
    values : shape (q,) [1/s]; vectors : shape (m, q)
    left : shape (m, q), optional
        Left vectors, unconjugated transposes; the right ones serve for symmetric problems.
    """
    other = vectors if left is None else left
    rest = residuals(problem, values, vectors, reference)
    size = np.abs(values)
    damped = damping_times(problem, vectors, reference)
    heavy = slice(0, problem.heavy)
    slope = 2 * values * np.einsum("ij,ij->j", other[heavy], vectors[heavy]) + np.einsum("ij,ij->j", other, damped)
    numerator = np.einsum("ij,ij->j", other, rest)
    with np.errstate(divide="ignore", invalid="ignore"):
        step = np.where(slope != 0, -numerator / slope, 0.0)
    effort = size**2 * np.einsum("ij,ij->j", np.abs(other[heavy]), np.abs(vectors[heavy]))
    if problem.spring_rows is None:
        held, held_left = np.abs(problem.W.T @ vectors), np.abs(problem.W.T @ other)
        effort += np.einsum("i,ij,ij->j", problem.sigma**2, held_left, held)
    else:
        rows, rows_left = np.abs(problem.spring_rows @ vectors), np.abs(problem.spring_rows @ other)
        effort += np.einsum("ij,ij->j", rows_left, rows)
        general = problem.W * (problem.sigma**2) @ problem.W.T
        effort += np.einsum("ij,ij->j", np.abs(other), np.abs(general) @ np.abs(vectors))
    if len(problem.damper_rows):
        # A damper's stretch is a sum over modes that may cancel where it all but locks.
        rows, rows_left = np.abs(problem.damper_rows) @ np.abs(vectors), np.abs(problem.damper_rows @ other)
        effort += size * np.einsum("ij,ij->j", rows_left, rows)
    plain = problem.damping if not len(problem.damper_rows) else np.diag(np.diag(problem.damping))
    effort += size * np.einsum("ij,ij->j", np.abs(other), np.abs(plain) @ np.abs(vectors))
    dimension = len(vectors)
    # Rayleigh quotients of eigenvectors with error e are off by e², which the residual measures through the norms.
    damping_norm = float(np.linalg.norm(problem.damping, axis=0).max(initial=0.0))
    if len(problem.loss_rows) and reference is not None:
        damping_norm += float(np.max(np.sum(problem.loss_rows**2, axis=0), initial=0.0) / max(reference.min(), 1e-300))
    stiffness_norm = float((problem.sigma**2).max(initial=0.0))
    if problem.normwise:
        length = np.linalg.norm(other, axis=0) * np.linalg.norm(vectors, axis=0)
        effort += (stiffness_norm + size * damping_norm) * length
    scale = (size**2 + size * damping_norm + stiffness_norm) * np.linalg.norm(vectors, axis=0)
    with np.errstate(divide="ignore", invalid="ignore"):
        backward = np.where(scale > 0, np.linalg.norm(rest, axis=0) / scale, 0.0)
        uncertain = np.abs(numerator) + (dimension + 8) * _EPS * problem.amplification * effort
        bound = uncertain / np.abs(slope)
    # The second factor of the forward error is the residual seen by all other modes.
    bound = np.where(np.isfinite(bound), bound, np.inf) + _second_order(values, other, rest, slope)
    return Judgement(backward=backward, bound=bound, slope=slope, step=step)


def _second_order(
    values: NDArray[np.complex128],
    other: NDArray[np.complex128],
    rest: NDArray[np.complex128],
    slope: NDArray[np.complex128],
) -> NDArray[np.float64]:
    """Σ_k |z_kᵀ r_i|² / (|λ_i − λ_k| |slope_k slope_i|) over the other roots and their conjugates.

    Free motions have the exact root 0, double and of slope 0 where nothing damps them; they count as 1 / |λ_i|².
    """
    seen = np.abs(other.T @ rest) ** 2
    seen_conjugate = np.abs(other.conj().T @ rest) ** 2
    gap = np.abs(values[:, None] - values[None, :])
    gap_conjugate = np.abs(values.conj()[:, None] - values[None, :])
    np.fill_diagonal(gap, np.inf)
    gap_conjugate[np.diag_indices(len(values))] = np.where(values.imag != 0, np.diag(gap_conjugate), np.inf)
    free = values == 0
    with np.errstate(divide="ignore", invalid="ignore"):
        pull = np.abs(slope)[:, None] * gap
        pull[free] = np.maximum(pull[free], gap[free] ** 2)
        pull_conjugate = np.abs(slope)[:, None] * gap_conjugate
        pull_conjugate[free] = np.inf
        total = (seen / pull + seen_conjugate / pull_conjugate).sum(axis=0) / np.abs(slope)
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
