"""Some modes of a large sparse system from one factorisation of size n; the pencil of size 2n is never formed.

``K − ω²M`` is factored once, with a symmetric ordering. Where damping is light, the undamped modes by Lanczos' method,
joined by what the dampers push (K⁻¹B and what follows; see Bai & Su, SIAM J. Matrix Anal. Appl. 26, 2005, for
second-order Krylov spaces), all but hold the wanted shapes. Where a damper is heavy, Arnoldi's method on the inverse
of the state space form, applied through the factors of size n, finds them. Either way M, C and K are projected on a
real basis, the small quadratic is solved completely, and the basis is widened by the preconditioned residuals of
whatever has not settled.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from mdof.errors import UnverifiedError

if TYPE_CHECKING:
    from numpy.typing import NDArray

    Complex = NDArray[np.complex128]
    Real = NDArray[np.float64]

__all__ = ["Nearest", "Pencil", "nearest_roots"]

_EPS = float(np.finfo(np.float64).eps)
_BLOCK = 8
_CYCLES = 40
#: Undamped modes beyond those wanted, moments of the dampers, and blocks of residuals before a restart.
_SPARE, _MOMENTS, _WIDER = 6, 4, 12
#: Dampers that change their own receptance by less than this are light.
_LIGHT = 0.05
#: Relative residual at which a root of a large system has settled; roots are then right to its square.
_SETTLED = 1e-10


@dataclass(frozen=True, kw_only=True, slots=True, eq=False)
class Pencil:
    """A symmetric positive semidefinite quadratic ``λ²M + λC + K`` as operators and sparse matrices.

    Attributes
    ----------
    mass, damping, stiffness : sparse arrays, shape (n, n)
        For the factorisation and for projections.
    forces : callable
        M x, C x and K x of a complex block, from the factors.
    pushes : ndarray, shape (n, r)
        Columns √c b of the dampers where they are few, else (n, 0).
    """

    mass: Any
    damping: Any
    stiffness: Any
    forces: Callable[[Complex], tuple[Complex, Complex, Complex]]
    pushes: Real


@dataclass(frozen=True, kw_only=True, slots=True, eq=False)
class Nearest:
    """Roots of upper half-plane and real axis nearest to a frequency, with unit vectors."""

    values: Complex
    vectors: Complex
    method: str


def nearest_roots(
    pencil: Pencil,
    count: int,
    near: float,
    solve_small: Callable[[Real, Real, Real], tuple[Complex, Complex]],
    progress: Callable[[int, int], None] | None = None,
) -> Nearest:
    """The ``count`` roots (one of each conjugate pair) with |λ| nearest to ``near``.

    Parameters
    ----------
    count : number of roots
    near : float [rad/s]
    solve_small : callable
        All roots of a small dense quadratic (M, C, K) and their vectors.
    progress : callable, optional
        Called with the number of settled roots and of wanted ones.

    Raises
    ------
    UnverifiedError
        If the roots do not settle, or the matrices cannot be factored.
    """
    n = pencil.mass.shape[0]
    factor = _factor(pencil, near)
    heavy = _heaviness(pencil, factor, near)
    if heavy < _LIGHT:
        basis = _extended(np.zeros((n, 0)), _undamped(pencil, factor, count, near))
        fresh = pencil.pushes
        for _ in range(_MOMENTS if fresh.shape[1] else 0):
            before = basis.shape[1]
            basis = _extended(basis, factor.solve(np.ascontiguousarray(fresh)))
            fresh = np.asarray(pencil.mass @ basis[:, before:])
    else:
        basis = _extended(np.zeros((n, 0)), _damped(pencil, factor, count, near))
    most = basis.shape[1] + _WIDER * _BLOCK
    settled = min(_SETTLED, max(4 * n * _EPS, 1e-13))
    for _ in range(_CYCLES):
        values, small = _projected(pencil, basis, count, near, solve_small)
        vectors = _combined(basis, small)
        rest, backward = _residuals(pencil, values, vectors)
        open_roots = np.nonzero(backward > settled)[0]
        if progress is not None:
            progress(count - len(open_roots), count)
        if not len(open_roots) or basis.shape[1] >= n:
            return Nearest(
                values=values,
                vectors=vectors,
                method=f"some modes, projected on {basis.shape[1]} vectors "
                f"({'undamped modes and what the dampers push' if heavy < _LIGHT else 'of Arnoldi in state space'}), "
                f"{factor.name}",
            )
        if basis.shape[1] + len(open_roots) > most:
            # Keep what the wanted roots need and start to widen again.
            basis = _extended(np.zeros((n, 0)), np.hstack([vectors.real, vectors.imag]))
        chosen = open_roots[: 2 * _BLOCK]
        wide = np.hstack([rest[:, chosen].real, rest[:, chosen].imag])
        before = basis.shape[1]
        basis = _extended(basis, factor.solve(wide))
        if basis.shape[1] == before:
            break
    raise UnverifiedError(
        f"{len(open_roots)} of {count} roots near {near / (2 * np.pi):.4g} Hz do not settle",
        "ask for a few more or fewer modes, or for the modes near another frequency",
    )


@dataclass(frozen=True, slots=True, eq=False)
class _Factor:
    solve: Callable[[Real], Real]
    name: str


def _factor(pencil: Pencil, near: float) -> _Factor:
    """K − ω²M factored for many right-hand sides."""
    from scipy.sparse.linalg import splu

    matrix = (pencil.stiffness - near**2 * pencil.mass).tocsc()
    try:
        lower = splu(matrix, permc_spec="MMD_AT_PLUS_A", diag_pivot_thresh=0.0, options={"SymmetricMode": True})
    except RuntimeError:
        raise UnverifiedError(
            "the stiffness matrix cannot be factored at this frequency",
            "the model moves freely, or `near` meets an undamped mode exactly; hold it, or move `near` a little",
        ) from None
    return _Factor(lower.solve, "one SuperLU factorisation with a symmetric ordering")


def _heaviness(pencil: Pencil, factor: _Factor, near: float) -> float:
    """How much the dampers change motions: the largest |λ| c bᵀ(K − ω²M)⁻¹b, over the few dampers; 1 for many."""
    if not pencil.pushes.shape[1]:
        return 1.0 if pencil.damping.nnz else 0.0
    follow = factor.solve(pencil.pushes)
    own = np.abs(np.einsum("ij,ij->j", pencil.pushes, follow))
    inertia = np.einsum("ij,ij->j", follow, np.asarray(pencil.mass @ follow))
    # The lowest frequency that a static deflection under the dampers suggests.
    typical = float(np.sqrt(np.min(own / np.maximum(inertia, np.finfo(float).tiny))))
    return float(np.max(max(near, typical) * own))


def _damped(pencil: Pencil, factor: _Factor, count: int, near: float) -> Real:
    """Arnoldi's method on the inverse of the state space form: real and imaginary parts of the shapes found."""
    from scipy.sparse.linalg import ArpackNoConvergence, LinearOperator, eigs

    n = pencil.mass.shape[0]

    def inverse(state: Real) -> Real:
        shape, velocity = state[:n], state[n:]
        push = np.asarray(pencil.mass @ velocity) + np.asarray(pencil.damping @ shape)
        return np.concatenate([-factor.solve(push), shape])

    wanted = min(2 * (count + 1), 2 * n - 2)
    if near > 0 or n <= 4 * wanted:
        # Away from zero the undamped modes are the better start; residuals widen it.
        return _undamped(pencil, factor, count, near)
    operator = LinearOperator((2 * n, 2 * n), matvec=inverse, dtype=np.float64)
    start = np.random.default_rng(0).normal(size=2 * n)
    try:
        _, vectors = eigs(operator, k=wanted, ncv=min(2 * n, 5 * wanted // 2), tol=1e-10, v0=start)
    except ArpackNoConvergence as partly:
        vectors = partly.eigenvectors
    shapes = vectors[:n]
    return np.hstack([shapes.real, shapes.imag])


def _undamped(pencil: Pencil, factor: _Factor, count: int, near: float) -> Real:
    """Undamped modes nearest to ``near`` by Lanczos' method, shape (n, at least count)."""
    from scipy.sparse.linalg import ArpackNoConvergence, LinearOperator, eigsh

    n = pencil.mass.shape[0]
    wanted = min(count + max(_SPARE, count // 2), n - 1)
    if n <= 4 * wanted:
        return np.eye(n)
    inverse = LinearOperator((n, n), matvec=factor.solve, dtype=np.float64)
    start = np.random.default_rng(0).normal(size=n)
    try:
        _, vectors = eigsh(pencil.stiffness, k=wanted, M=pencil.mass, sigma=near**2, OPinv=inverse, v0=start, tol=1e-10)
    except ArpackNoConvergence as partly:
        vectors = partly.eigenvectors
    return np.asarray(vectors)


def _extended(basis: Real, block: Real) -> Real:
    """``basis`` with the new directions of ``block``, orthonormal; directions already there are dropped."""
    block = np.ascontiguousarray(block / np.maximum(np.linalg.norm(block, axis=0), np.finfo(float).tiny))
    block = block - basis @ (basis.T @ block)
    # Pivots tell which directions are new; a second pass makes them orthogonal to rounding.
    left, size, _ = np.linalg.svd(block, full_matrices=False)
    block = np.ascontiguousarray(left[:, size > 1e-9])
    block = block - basis @ (basis.T @ block)
    # Rows in memory: products of tall arrays in columns are ten times slower.
    return np.ascontiguousarray(np.hstack([basis, np.linalg.qr(block)[0]]))


def _projected(
    pencil: Pencil, basis: Real, count: int, near: float, solve_small: Callable[[Real, Real, Real], tuple[Any, Any]]
) -> tuple[Complex, Complex]:
    """Wanted roots of the projected quadratic and their vectors in the basis."""
    small = [basis.T @ np.ascontiguousarray(part @ basis) for part in (pencil.mass, pencil.damping, pencil.stiffness)]
    mass, damping, stiffness = (0.5 * (part + part.T) for part in small)
    values, vectors = solve_small(mass, damping, stiffness)
    order = np.argsort(np.abs(np.abs(values) - near), kind="stable")[:count]
    return values[order], vectors[:, order]


def _combined(basis: Real, small: Complex) -> Complex:
    vectors = np.empty((basis.shape[0], small.shape[1]), dtype=np.complex128)
    vectors.real = basis @ small.real
    vectors.imag = basis @ small.imag
    return np.asarray(vectors / np.linalg.norm(vectors, axis=0))


def _residuals(pencil: Pencil, values: Complex, vectors: Complex) -> tuple[Complex, Real]:
    """Q(λ)x for unit vectors, and what of it is more than rounding, relative to the sizes of its three parts."""
    inertia, drag, elastic = pencil.forces(vectors)
    rest = values**2 * inertia + values * drag + elastic
    size = np.abs(values)
    scale = size**2 * np.linalg.norm(inertia, axis=0) + size * np.linalg.norm(drag, axis=0)
    scale += np.linalg.norm(elastic, axis=0)
    # Stiff springs that hardly stretch in a low mode leave their rounding behind whatever is done.
    rounding = 16 * _EPS * _stiffest(pencil.stiffness)
    return rest, np.maximum(np.linalg.norm(rest, axis=0) - rounding, 0.0) / scale


def _stiffest(matrix: Any) -> float:
    """Largest column sum of magnitudes."""
    return float(abs(matrix).sum(axis=0).max())
