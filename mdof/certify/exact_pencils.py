"""Zero, infinite and undamped roots taken out of an exact problem, so that only roots to enclose remain.

Everything here is rational arithmetic: a rank is a rank, and a root that is called zero is zero.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from flint import fmpq, fmpq_mat, nmod_mat

from mdof.certify.exact_factors import is_zero, picked

if TYPE_CHECKING:
    from mdof.certify.exact_factors import ExactMatrices

__all__ = ["Pencil", "SingularPencilError", "pencils"]

#: Coordinates up to which undamped motions of a damped machine are looked for exactly.
_MOST_SPLIT = 64
_PRIMES = (2**61 - 1, 18446744073709551557, 9223372036854775783)


class SingularPencilError(Exception):
    """det(λ²M + λC + K) vanishes for every λ: some motion is held by no mass, damper or spring."""


@dataclass(frozen=True, kw_only=True, slots=True, eq=False)
class Pencil:
    """det(F − νE) with E and F regular, shape (s, s), and the roots that were taken out of it.

    Attributes
    ----------
    zeros : multiplicity of the root λ = 0.
    squared : True where ν is λ², as nothing is damped; then λ = ±sqrt(ν).
    real : True where theory has every ν real (symmetric, with definite mass).
    """

    E: fmpq_mat
    F: fmpq_mat
    zeros: int
    squared: bool
    real: bool

    @property
    def count(self) -> int:
        """Number of finite roots λ."""
        return self.zeros + (2 if self.squared else 1) * self.E.nrows()


def pencils(part: ExactMatrices) -> list[Pencil]:
    """The pencils whose roots together are the finite roots of λ²M + λC + K.

    Raises
    ------
    SingularPencilError
    """
    M, C, K = part.mass, part.damping, part.stiffness
    if is_zero(C):
        return [_undamped(M, K)]
    U = _undamped_motions(M, C, K) if part.symmetric else None
    if U is None:
        return [_damped(M, C, K)]
    # Of symmetric problems the motions M-orthogonal to undamped ones are a problem of their own.
    W = _null_columns(U.transpose() * M)[0]
    return [_undamped(*(_on(X, U) for X in (M, K))), *([_damped(*(_on(X, W) for X in (M, C, K)))] if W.ncols() else [])]


def _on(matrix: fmpq_mat, basis: fmpq_mat) -> fmpq_mat:
    return basis.transpose() * matrix * basis


def _undamped(M: fmpq_mat, K: fmpq_mat) -> Pencil:
    heavy = [i for i in range(M.nrows()) if any(bool(M[i, j]) for j in range(M.nrows()))]
    light = [i for i in range(M.nrows()) if i not in heavy]
    symmetric = is_zero(M - M.transpose()) and is_zero(K - K.transpose())
    regular = not light or picked(K, light, light).rank() == len(light)
    real = symmetric and regular and _is_definite(picked(M, heavy, heavy))
    E, F, zeros = _regular(M, K * fmpq(-1))
    return Pencil(E=E, F=F, zeros=2 * zeros, squared=True, real=real)


def _damped(M: fmpq_mat, C: fmpq_mat, K: fmpq_mat) -> Pencil:
    n = M.nrows()
    E, F = fmpq_mat(2 * n, 2 * n), fmpq_mat(2 * n, 2 * n)
    for i in range(n):
        E[i, i] = fmpq(1)
        F[i, n + i] = fmpq(1)
        for j in range(n):
            E[n + i, n + j] = M[i, j]
            F[n + i, j] = -K[i, j]
            F[n + i, n + j] = -C[i, j]
    E, F, zeros = _regular(E, F)
    return Pencil(E=E, F=F, zeros=zeros, squared=False, real=False)


def _regular(E: fmpq_mat, F: fmpq_mat) -> tuple[fmpq_mat, fmpq_mat, int]:
    """det(F − νE) without its infinite and zero roots, and the number of the latter."""
    while E.nrows() and E.rank() < E.nrows():
        F, E = _deflated(F, E)
    finite = E.nrows()
    while F.nrows() and F.rank() < F.nrows():
        E, F = _deflated(E, F)
    return E, F, finite - E.nrows()


def _deflated(E: fmpq_mat, F: fmpq_mat) -> tuple[fmpq_mat, fmpq_mat]:
    """det(F − νE) divided by ν once for every dimension of null F.

    With F X = 0 the columns (F − νE)X are −νEX; rows W with W E X = 0 do not see them, so that in the basis of X and
    unit vectors the pencil is block triangular with −ν I and W(F − νE) on its diagonal.
    """
    X, rest = _null_columns(F)
    W, _ = _null_columns((E * X).transpose())
    if W.ncols() != E.nrows() - X.ncols():
        raise SingularPencilError
    left, every = W.transpose(), range(E.nrows())
    return left * picked(E, every, rest), left * picked(F, every, rest)


def _null_columns(matrix: fmpq_mat) -> tuple[fmpq_mat, list[int]]:
    """A basis of the null space, one column each and unit vectors in the free rows, and the other rows."""
    form, rank = matrix.rref()
    columns = matrix.ncols()
    pivots: list[int] = []
    for i in range(rank):
        start = pivots[-1] + 1 if pivots else 0
        pivots.append(next(j for j in range(start, columns) if form[i, j]))
    free = sorted(set(range(columns)) - set(pivots))
    basis = fmpq_mat(columns, len(free))
    for k, j in enumerate(free):
        basis[j, k] = fmpq(1)
        for i, pivot in enumerate(pivots):
            basis[pivot, k] = -form[i, j]
    return basis, pivots


def _undamped_motions(M: fmpq_mat, C: fmpq_mat, K: fmpq_mat) -> fmpq_mat | None:
    """Basis of the largest space that C maps to 0 and K maps into its image under M; None where there is none.

    Its motions are the undamped modes and the free motions that no damper resists.
    """
    n = M.nrows()
    if n > _MOST_SPLIT or M.rank() < n or _damping_reaches_all(M, C, K):
        return None
    V, _ = _null_columns(C)
    while V.ncols():
        d = V.ncols()
        both = fmpq_mat(n, 2 * d)
        stretched, moved = K * V, M * V
        for i in range(n):
            for j in range(d):
                both[i, j], both[i, d + j] = stretched[i, j], moved[i, j]
        pairs, _ = _null_columns(both)
        if pairs.ncols() == d:
            return V
        kept = V * picked(pairs, range(d), range(pairs.ncols()))
        # The reduced echelon form keeps the fractions of the basis short.
        V = kept.transpose().rref()[0].transpose()
    return None


def _damping_reaches_all(M: fmpq_mat, C: fmpq_mat, K: fmpq_mat) -> bool:
    """True where M⁻¹C and its images under M⁻¹K span everything.

    Found modulo a prime: a rank there is never larger than the true one, so that full rank is proof.
    """
    n = M.nrows()
    mass, damping, stiffness = (X.numer_denom()[0] for X in (M, C, K))
    for prime in _PRIMES:
        heavy = nmod_mat(mass, prime)
        if heavy.rank() < n:
            continue
        inverse = heavy.inv()
        step = inverse * nmod_mat(stiffness, prime)
        spanned, rank = _row_space((inverse * nmod_mat(damping, prime)).transpose())
        while 0 < rank < n:
            images = spanned * step.transpose()
            both = nmod_mat(2 * rank, n, [*spanned.entries(), *images.entries()], prime)
            spanned, larger = _row_space(both)
            if larger == rank:
                break
            rank = larger
        return rank == n
    return False


def _row_space(matrix: nmod_mat) -> tuple[nmod_mat, int]:
    form, rank = matrix.rref()
    entries = form.entries()[: rank * matrix.ncols()]
    return nmod_mat(rank, matrix.ncols(), entries, matrix.modulus()), rank


def _is_definite(matrix: fmpq_mat) -> bool:
    """True where a symmetric matrix is positive definite: every pivot of its elimination is positive."""
    n = matrix.nrows()
    rows = matrix.tolist()
    for k in range(n):
        if rows[k][k] <= 0:
            return False
        for i in range(k + 1, n):
            if rows[i][k]:
                factor = rows[i][k] / rows[k][k]
                for j in range(k, n):
                    if rows[k][j]:
                        rows[i][j] -= factor * rows[k][j]
    return True
