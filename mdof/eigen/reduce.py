"""From M and the factors of C and K to a normalised problem with the zero and infinite eigenvalues taken out exactly.

Mass becomes the identity, undamped massless coordinates are condensed, and the stiffness is written ``K = W Σ S Σ Wᵀ``
with orthonormal W, positive Σ and signs S.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from mdof.eigen.dampers import damper_rows, damper_rows_in_modes, factored_damping
from mdof.eigen.mass import condense_massless, mass_basis, turned
from mdof.eigen.springs import by_eigensolver, free_motions, split, spring_modes, symmetric_factors

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from mdof.system import System

__all__ = ["NormalisedProblem", "normalise"]

_EPS = float(np.finfo(np.float64).eps)


@dataclass(frozen=True, kw_only=True, slots=True, eq=False)
class NormalisedProblem:
    """``λ² diag(I, 0) + λ D + W Σ S Σ Wᵀ`` in coordinates z = (heavy, light).

    Attributes
    ----------
    recover : ndarray, shape (n, m)
        System coordinates from z.
    heavy : int
        Coordinates with mass; the m - heavy others are massless and damped.
    W : ndarray, shape (m, r); N : ndarray, shape (m, p)
        Orthonormal bases of what the springs hold and of what they leave free.
    sigma, sign : ndarray, shape (r,)
        sqrt|ω²| in rad/s and its sign.
    damping : ndarray, shape (m, m)
        D without loss factors that state no reference, gyroscopic part included.
    damper_rows : ndarray, shape (n_rows, m); damper_signs : shape (n_rows,)
        Damper factors, ``D = rowsᵀ diag(signs) rows`` plus the general part.
    loss_rows : ndarray, shape (n_loss, m)
        Factors of η k for loss factors without a reference: ``D(ω) = D + lossᵀ loss / ω``.
    spring_rows : ndarray, shape (n_springs, m), or None
        sqrt|k| bᵀ where some stiffness is negative, for the bounds; None where Σ itself serves.
    amplification : float
        How much mass normalisation may magnify rounding (1 for diagonal masses).
    normwise : bool
        True where K went through a symmetric eigensolver, whose error is a share of the largest ω².
    modal : bool
        True where heavy coordinates are already the undamped modes, so that W is the identity's first columns.
    symmetric, passive : bool
    general_rows : int
        The last so many damper rows are factors of a damping matrix given as numbers.
    drag : float [1/s], or None
        Mass-proportional damping, all that slows free motions beside the damper rows; None where D has other parts.
    own_damping : ndarray, shape (m,), or None
        What proportional terms add to the diagonal of ``rowsᵀ diag(signs) rows``; None where D has other parts, or
        coordinates are not the undamped modes.
    """

    recover: NDArray[np.float64]
    heavy: int
    W: NDArray[np.float64]
    N: NDArray[np.float64]
    sigma: NDArray[np.float64]
    sign: NDArray[np.float64]
    damping: NDArray[np.float64]
    damper_rows: NDArray[np.float64]
    damper_signs: NDArray[np.float64]
    loss_rows: NDArray[np.float64]
    spring_rows: NDArray[np.float64] | None
    skew_stiffness: NDArray[np.float64] | None
    amplification: float
    normwise: bool
    modal: bool
    symmetric: bool
    passive: bool
    general_rows: int = 0
    drag: float | None = None
    own_damping: NDArray[np.float64] | None = None

    @property
    def stiffness(self) -> NDArray[np.float64]:
        """W Σ S Σ Wᵀ with the skew part, shape (m, m)."""
        product = (self.W * (self.sigma**2 * self.sign)) @ self.W.T
        return np.asarray(product if self.skew_stiffness is None else product + self.skew_stiffness)


def normalise(system: System) -> NormalisedProblem:
    """Bring a System to its normalised problem.

    Raises
    ------
    UnverifiedError
        If the mass matrix is not positive semidefinite, or a massless coordinate is held by nothing.
    """
    base, heavy, amplification = mass_basis(system.mass)
    light_count = base.shape[1] - heavy
    springs, dampers = (turned(system.handy(name).T, base) for name in ("spring_columns", "damper_columns"))
    root_k = np.sqrt(np.abs(system.stiffness))
    spring_rows = root_k[:, None] * springs
    extra_k = (
        None if system.extra_stiffness is None else turned(turned(system.handy("extra_stiffness"), base).T, base).T
    )
    columns, rest = factored_damping(system)
    general = np.zeros((0, base.shape[1])) if columns is None else turned(columns.T, base)
    extra_c = None
    for part in (rest, system.handy("gyroscopic")):
        if part is not None:
            product = turned(turned(part, base).T, base).T
            extra_c = product if extra_c is None else extra_c + product
    definite = extra_k is None and bool(np.all(system.stiffness >= 0))
    if light_count:
        own = len(dampers)
        # From the springs as they are: condensed rows of stiff springs are differences whose rounding looks like more.
        none = np.zeros((base.shape[1], 0))
        free = free_motions(system, springs, base.shape[1])[0] if definite else none
        base, springs, dampers, extra_k, extra_c, heavy, free = condense_massless(
            base,
            heavy,
            springs,
            system.stiffness,
            np.vstack([dampers, general]),
            np.concatenate([system.damping, np.ones(len(general))]),
            extra_k,
            extra_c,
            definite,
            free,
        )
        dampers, general = dampers[:own], dampers[own:]
        spring_rows = root_k[:, None] * springs
    size = base.shape[1]
    skew = None
    if definite:
        N, Z = split(free) if light_count else free_motions(system, springs, size)
        left, sigma, W = spring_modes(spring_rows @ Z)
        W, sign = Z @ W, np.ones(len(sigma))
    else:
        stiffness = (spring_rows.T * np.sign(system.stiffness)) @ spring_rows
        if extra_k is not None:
            stiffness = stiffness + extra_k
        skew = 0.5 * (stiffness - stiffness.T)
        skew = skew if np.abs(skew).max(initial=0.0) > 4 * _EPS * np.abs(stiffness).max(initial=0.0) else None
        left, (sigma, sign, W, N) = None, symmetric_factors(0.5 * (stiffness + stiffness.T), size)
    rows, signs, loss = damper_rows(system, springs, dampers, spring_rows)
    modal = heavy == size
    if modal:
        basis = np.hstack([W, N])
        rows, loss = damper_rows_in_modes(system, rows, loss, left, sigma, basis, root_k)
        general = general @ basis
        base = turned(base, basis)
        extra_c = None if extra_c is None else basis.T @ extra_c @ basis
        spring_rows = spring_rows @ basis
        skew = None if skew is None else basis.T @ skew @ basis
        eye = np.eye(size)
        W, N = eye[:, : len(sigma)], eye[:, len(sigma) :]
    rows, signs = np.vstack([rows, general]), np.concatenate([signs, np.ones(len(general))])
    damping = (rows.T * signs) @ rows
    if extra_c is not None:
        damping = damping + extra_c
    if system.mass_proportional:
        damping[np.arange(heavy), np.arange(heavy)] += system.mass_proportional
    if system.stiffness_proportional:
        damping = damping + system.stiffness_proportional * ((W * (sigma**2 * sign)) @ W.T)
    asymmetry = np.abs(damping - damping.T).max(initial=0.0)
    symmetric = skew is None and bool(asymmetry <= 4 * _EPS * np.abs(damping).max(initial=0.0))
    if symmetric:
        damping = 0.5 * (damping + damping.T)
    passive = (
        symmetric
        and bool(np.all(sign > 0))
        and extra_c is None
        and bool(np.all(signs >= 0))
        and system.mass_proportional >= 0
        and system.stiffness_proportional >= 0
        and bool(np.all(system.loss_factor >= 0))
    )
    if symmetric and not passive and extra_c is not None:
        lowest = float(np.linalg.eigvalsh(damping)[0])
        passive = bool(np.all(sign > 0)) and lowest >= -size * _EPS * float(np.abs(damping).max(initial=0.0))
    return NormalisedProblem(
        recover=base,
        heavy=heavy,
        W=W,
        N=N,
        sigma=sigma,
        sign=sign,
        damping=damping,
        damper_rows=rows,
        damper_signs=signs,
        loss_rows=loss,
        spring_rows=None if definite else spring_rows,
        skew_stiffness=skew,
        amplification=amplification,
        normwise=not definite or by_eigensolver(sigma),
        modal=modal,
        symmetric=symmetric,
        passive=passive,
        general_rows=len(general),
        drag=float(system.mass_proportional) if extra_c is None else None,
        own_damping=_own_damping(system, sigma, size) if modal and extra_c is None else None,
    )


def _own_damping(system: System, sigma: NDArray[np.float64], size: int) -> NDArray[np.float64]:
    """Damping that proportional terms give each undamped mode, shape (m,) [1/s]."""
    result = np.full(size, float(system.mass_proportional))
    result[: len(sigma)] += system.stiffness_proportional * sigma**2
    return result
