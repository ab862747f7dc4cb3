"""Balls that surely hold the roots of an exact pencil, each with its number of roots.

The state matrix A = E⁻¹F is turned by its approximate eigenvectors, in ball arithmetic, into T = V⁻¹AV, whose
off-diagonal entries are tiny. Block Gershgorin discs (Feingold & Varga, Pacific J. Math. 12, 1962) around its diagonal
hold all roots, and a disc that meets no other holds as many as its block has rows. Roots that a precision cannot tell
apart share a block, spanned by an orthonormal basis, so that multiple and defective ones are no obstacle. Ball
arithmetic after Johansson, IEEE Trans. Computers 66, 2017.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from flint import acb, acb_mat, arb, arb_mat, ctx, fmpq_mat

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence

    from numpy.typing import NDArray

    from mdof.certify.exact_pencils import Pencil

__all__ = ["Root", "enclose"]

#: States up to which roots that share a ball are told apart by the exact characteristic polynomial.
_MOST_POLYNOMIAL = 40
_MERGES = 6
_DOUBLINGS = 200


@dataclass(frozen=True, kw_only=True, slots=True, eq=False)
class Root:
    """One exact root λ [1/s], with ``count`` roots, itself included, in the same ball.

    A ball with imaginary part 0 holds a real root, one with real part 0 a root on the imaginary axis; these zeros are
    proven. ``exact`` tells that ``count`` is an exact multiplicity and not only what the precision leaves together.
    """

    ball: acb
    count: int = 1
    exact: bool = False

    @property
    def is_zero(self) -> bool:
        """True for the root 0."""
        return bool(self.ball.is_zero())

    @property
    def is_real(self) -> bool:
        """True where the root is surely real."""
        return bool(self.ball.imag.is_zero())

    @property
    def is_complex(self) -> bool:
        """True where the root is surely not real."""
        return not self.ball.imag.contains(0)


def enclose(pencil: Pencil, bits: int) -> list[Root] | None:
    """Every root of a pencil, or None where ``bits`` do not suffice."""
    roots = [Root(ball=acb(0), count=pencil.zeros, exact=True)] * pencil.zeros
    size = pencil.E.nrows()
    if not size:
        return roots
    with ctx.workprec(bits):
        found = _discs(pencil.E, pencil.F)
        single = found is not None and all(count == 1 for _, count in found)
        if not single and size <= _MOST_POLYNOMIAL:
            found = None
            exact = _polynomial_roots(pencil.E, pencil.F)
        else:
            exact = [(ball, count, False) for ball, count in found or ()]
        if not exact:
            return None
        exact = [(acb(ball.real), count, known) for ball, count, known in exact] if pencil.real else _conjugated(exact)
        for ball, count, known in exact:
            for value in _square_roots(ball) if pencil.squared else (ball,):
                roots += [Root(ball=value, count=count, exact=known)] * count
    return roots


def _square_roots(ball: acb) -> tuple[acb, acb]:
    """Both λ with λ² in the ball."""
    if ball.real > 0:
        root = ball.sqrt()
    elif ball.real < 0:
        down = -ball
        root = acb(0, down.real.sqrt()) if ball.imag.is_zero() else acb(0, 1) * down.sqrt()
    else:
        size = abs(ball).upper().sqrt()
        root = acb(arb(0, size), arb(0, size))
    return root, -root


def _conjugated(found: list[tuple[acb, int, bool]]) -> list[tuple[acb, int, bool]]:
    """Single roots of a real problem whose ball meets its own mirror image and no other are real."""
    result = []
    for index, (ball, count, known) in enumerate(found):
        mirror = ball.conjugate()
        alone = ball.imag.contains(0) and not any(
            mirror.overlaps(other) for place, (other, _, _) in enumerate(found) if place != index
        )
        result.append((acb(ball.real), count, known) if alone and (count == 1 or known) else (ball, count, known))
    return result


def _polynomial_roots(E: fmpq_mat, F: fmpq_mat) -> list[tuple[acb, int, bool]]:
    """Roots of the exact characteristic polynomial, with their exact multiplicities."""
    polynomial = E.solve(F).charpoly().numer()
    _, factors = polynomial.factor_squarefree()
    result = []
    for factor, power in factors:
        roots: Any = factor.complex_roots()
        result += [(acb(root), power, True) for root, _ in roots]
    return result


def _discs(E: fmpq_mat, F: fmpq_mat) -> list[tuple[acb, int]] | None:
    """Balls that meet no other, and how many roots each holds; None where the precision does not suffice."""
    try:
        A = _balanced(arb_mat(E).solve(arb_mat(F)))
        values, V = A.mid().eig(right=True, algorithm="approx")
    except (ZeroDivisionError, ValueError):
        return None
    groups = _close(values)
    for _ in range(_MERGES):
        _orthonormalise(V, [group for group in groups if len(group) > 1])
        try:
            T = V.solve(A * V)
        except ZeroDivisionError:
            return None
        balls = [_disc(T, group) for group in groups]
        if not all(ball.is_finite() for ball in balls):
            return None
        meeting = np.array([[a.overlaps(b) for b in balls] for a in balls], dtype=bool)
        if meeting.sum() == len(balls):
            return [(ball, len(group)) for ball, group in zip(balls, groups, strict=True)]
        groups = [sorted(j for i in chain for j in groups[i]) for chain in _chains(meeting)]
    return None


def _balanced(A: arb_mat) -> acb_mat:
    """A similar matrix whose rows and columns are of like size, by powers of two, which scale time as well."""
    from scipy.linalg import matrix_balance

    n = A.nrows()
    plain = np.array([float(value.mid()) for value in A.entries()]).reshape(n, n)
    if not np.all(np.isfinite(plain)):
        return acb_mat(A)
    _, (scale, _) = matrix_balance(plain, permute=False, separate=True)
    powers = [arb(float(value)) for value in scale]
    return acb_mat(n, n, [A[i, j] * powers[j] / powers[i] for i in range(n) for j in range(n)])


def _close(values: Sequence[acb]) -> list[list[int]]:
    """Approximate roots in groups: one that is k-fold is split by the k-th root of rounding."""
    gap = arb(2) ** (-ctx.prec // 4)
    mids = [value.mid() for value in values]
    sizes = [abs(value) for value in mids]
    near = np.eye(len(mids), dtype=bool)
    for i, value in enumerate(mids):
        for j in range(i):
            near[i, j] = near[j, i] = not abs(value - mids[j]) > gap * (sizes[i] + sizes[j])
    return _chains(near)


def _chains(near: NDArray[np.bool_]) -> list[list[int]]:
    from scipy.sparse import csr_array
    from scipy.sparse.csgraph import connected_components

    count, label = connected_components(csr_array(near), directed=False)
    return [[int(i) for i in np.nonzero(label == number)[0]] for number in range(count)]


def _orthonormalise(V: acb_mat, groups: list[list[int]]) -> None:
    """Gram-Schmidt on the columns of each group, in place; approximate, as T is computed from what comes out."""
    n = V.nrows()
    for group in groups:
        done: list[list[acb]] = []
        for j in group:
            column = [V[i, j].mid() for i in range(n)]
            for _ in range(2):
                for other in done:
                    overlap = sum((a * b.conjugate() for a, b in zip(column, other, strict=True)), acb(0)).mid()
                    column = [(a - overlap * b).mid() for a, b in zip(column, other, strict=True)]
            length = sum((abs(a) ** 2 for a in column), arb(0)).sqrt().mid()
            if length:
                column = [(a / length).mid() for a in column]
            for i in range(n):
                V[i, j] = column[i]
            done.append(column)


def _disc(T: acb_mat, group: list[int]) -> acb:
    """Ball around the roots of one diagonal block B of T.

    With p the characteristic polynomial of B − μ and ``adj(z − B + μ) = Σ zʲ Bⱼ`` (Faddeev & LeVerrier), a root at the
    distance r from μ needs ``|p| ≤ s Σ rʲ |Bⱼ|``, where s is the largest row sum beside the block. That fails for
    every r above the one positive root of ``rᵏ − Σ |cⱼ| rᵏ⁻ʲ − s Σ rʲ |Bⱼ|``.
    """
    k, members = len(group), set(group)
    beside = _largest(sum((abs(T[i, j]).upper() for j in range(T.ncols()) if j not in members), arb(0)) for i in group)
    centre = (sum((T[i, i] for i in group), acb(0)) / k).mid()
    B = acb_mat(k, k, [T[i, j] - (centre if i == j else 0) for i in group for j in group])
    adjugate, one = acb_mat(k, k, [int(i == j) for i in range(k) for j in range(k)]), acb(1)
    identity = adjugate
    #: (power that is left to r, factor) of everything subtracted from r**k
    terms: list[tuple[int, arb]] = []
    for j in range(1, k + 1):
        norm = _largest(sum((abs(adjugate[a, b]) for b in range(k)), arb(0)) for a in range(k))
        terms.append((k - j, (beside * norm).upper()))
        product = B * adjugate
        coefficient = -product.trace() / j
        terms.append((k - j, abs(coefficient * one).upper()))
        adjugate = product + identity * coefficient
    radius = _largest(factor.root(k - power) for power, factor in terms).upper()
    for _ in range(_DOUBLINGS):
        rest = radius**k - sum((factor * radius**power for power, factor in terms), arb(0))
        if rest > 0 or not radius:
            return acb(arb(centre.real, radius), arb(centre.imag, radius))
        radius = (radius * arb(1.125)).upper()
    return acb(arb.nan())


def _largest(values: Iterable[arb]) -> arb:
    result = arb(0)
    for value in values:
        result = result.max(value)
    return result
