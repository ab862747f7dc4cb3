"""Pairing eigenvalues into modes.

Complex roots pair by conjugation. Real roots: the sign of xᵀ(2λM + C)x is + for the slow and - for the fast root of
one oscillator; one of each is paired by likeness of shape, and only where the likeness is plain. Sorting and taking
neighbours would be wrong: the roots of two oscillators may interlace.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from mdof.eigen.quadratic import Roots

__all__ = ["Pairing", "mode_frequencies", "mode_roots", "pair_roots", "rising"]

_LEAST_LIKENESS = 0.5
_LEAST_LEAD = 2.0


@dataclass(frozen=True, kw_only=True, slots=True, eq=False)
class Pairing:
    """Modes as (slow root, fast root) indices; -1: no partner, equal indices: a double root or a conjugate pair.

    ``relaxation`` and ``unresolved`` are the single roots that belong to first-order states and those whose partner
    the shapes do not tell. ``vectors`` are the root vectors with degenerate free motions turned to match their
    partners.
    """

    pairs: list[tuple[int, int]]
    relaxation: set[int]
    unresolved: set[int]
    vectors: NDArray[np.complex128]


def mode_roots(values: NDArray[np.complex128], pairs: list[tuple[int, int]]) -> NDArray[np.complex128]:
    """The two roots of every mode, slow one first, shape (m, 2); NaN where there is no second."""
    slow, fast = np.array(pairs, dtype=np.int64).reshape(-1, 2).T
    first = values[slow]
    second = np.where(fast == slow, first.conj(), values[fast])
    return np.column_stack([first, np.where(fast < 0, complex(np.nan, np.nan), second)])


def mode_frequencies(roots: NDArray[np.complex128]) -> NDArray[np.float64]:
    """What modes are ordered by: sqrt|λs λf|, or |λ| of a single root, shape (m,) [rad/s]."""
    size = np.abs(roots)
    return np.where(np.isnan(size[:, 1]), size[:, 0], np.sqrt(size[:, 0]) * np.sqrt(size[:, 1]))


def rising(frequencies: NDArray[np.float64], rates: NDArray[np.float64]) -> NDArray[np.int64]:
    """Order by frequency, ties within 1e-9 by decay rate."""
    order = np.argsort(frequencies, kind="stable")
    ranked = frequencies[order]
    if len(order) > 1 and not np.any(ranked[1:] <= ranked[:-1] * (1 + 1e-9)):
        return order
    result: list[int] = []
    start = 0
    for stop in range(1, len(order) + 1):
        if stop == len(order) or ranked[stop] > ranked[start] * (1 + 1e-9):
            result += sorted(order[start:stop].tolist(), key=lambda index: float(rates[index]))
            start = stop
    return np.array(result, dtype=np.int64)


def pair_roots(roots: Roots, heavy: int) -> Pairing:
    """Pair the roots of a solve.

    Parameters
    ----------
    roots : Roots
    heavy : int
        Leading coordinates of the root vectors that carry unit mass; likeness is judged on them.
    """
    vectors = roots.vectors.copy()
    relaxation: set[int] = set()
    unresolved: set[int] = set()
    index = np.arange(len(roots.values))
    done = (roots.values.imag > 0) | (roots.partner == index)
    pairs = [(alone, alone) for alone in np.nonzero(done)[0].tolist()]
    for known in np.nonzero(~done & (roots.partner > index))[0].tolist():
        mate = int(roots.partner[known])
        slow, fast = sorted((known, mate), key=lambda which: -roots.values[which].real)
        pairs.append((slow, fast))
        done[[known, mate]] = True
    for number in np.unique(roots.block[~done]) if not done.all() else ():
        own = np.nonzero((roots.block == number) & ~done)[0]
        _pair_real(roots, own, vectors, heavy, pairs, relaxation, unresolved)
    return Pairing(pairs=pairs, relaxation=relaxation, unresolved=unresolved, vectors=vectors)


def _pair_real(
    roots: Roots,
    own: NDArray[np.int64],
    vectors: NDArray[np.complex128],
    heavy: int,
    pairs: list[tuple[int, int]],
    relaxation: set[int],
    unresolved: set[int],
) -> None:
    sign = _signs(roots, own, heavy)
    zero = own[roots.values[own] == 0]
    slow = own[(sign > 0) & (roots.values[own] != 0)]
    fast = own[(sign <= 0) & (roots.values[own] != 0)]
    if len(zero):
        fast = _match_free(zero, fast, vectors, heavy, pairs)
    likeness = _likeness(vectors[:heavy, slow], vectors[:heavy, fast])
    rows, columns = _assign(likeness)
    for row, column in zip(rows, columns, strict=True):
        value = likeness[row, column]
        others = np.concatenate([np.delete(likeness[row], column), np.delete(likeness[:, column], row)])
        first, second = int(slow[row]), int(fast[column])
        if value >= _LEAST_LIKENESS and value >= _LEAST_LEAD * others.max(initial=0.0):
            pairs.append((first, second))
        else:
            unresolved.update((first, second))
            pairs.extend([(first, -1), (second, -1)])
    # No more slow roots are surplus than there are first-order states; those least like any fast root are.
    spare = np.delete(np.arange(len(slow)), rows)
    spare = spare[np.argsort(likeness[spare].max(axis=1, initial=0.0), kind="stable")]
    first_order = len(vectors) - heavy - len(relaxation)
    relaxation.update(int(index) for index in slow[spare[:first_order]])
    unresolved.update(int(index) for index in slow[spare[first_order:]])
    unresolved.update(int(index) for index in np.delete(fast, columns))
    pairs.extend((int(index), -1) for index in [*slow[spare], *np.delete(fast, columns)])


def _signs(roots: Roots, own: NDArray[np.int64], heavy: int) -> NDArray[np.float64]:
    slope = roots.slope[own].real
    if roots.left is not None:
        # Left and right vectors scale freely, so their common mass decides the sign of the slope.
        mass = np.einsum("ij,ij->j", roots.left[:heavy, own], roots.vectors[:heavy, own]).real
        slope = slope * np.where(mass < 0, -1.0, 1.0)
    signs: NDArray[np.float64] = np.sign(slope)
    return signs


def _match_free(
    zero: NDArray[np.int64],
    fast: NDArray[np.int64],
    vectors: NDArray[np.complex128],
    heavy: int,
    pairs: list[tuple[int, int]],
) -> NDArray[np.int64]:
    """Give free motions their decaying partner; the basis of equal zero roots is turned to the partners' shapes."""
    basis = vectors[:, zero].real
    coefficients = (
        np.linalg.lstsq(basis[:heavy], vectors[:heavy, fast].real, rcond=None)[0]
        if len(fast)
        else np.zeros((len(zero), 0))
    )
    part = np.linalg.norm(basis[:heavy] @ coefficients, axis=0)
    share = part / np.maximum(np.linalg.norm(vectors[:heavy, fast].real, axis=0), np.finfo(float).tiny)
    chosen = [int(column) for column in np.argsort(-share)[: len(zero)] if share[column] ** 2 >= _LEAST_LIKENESS]
    if chosen:
        metric = np.linalg.cholesky(basis[:heavy].T @ basis[:heavy]).T
        wanted = metric @ coefficients[:, chosen]
        left, size, right = np.linalg.svd(wanted, full_matrices=True)
        if size.min() > 1e-8:
            count = len(chosen)
            turned = np.hstack([left[:, :count] @ right, left[:, count:]])
            vectors[:, zero] = basis @ np.linalg.solve(metric, turned)
        else:
            chosen = []
    for position, index in enumerate(zero):
        pairs.append((int(index), int(fast[chosen[position]]) if position < len(chosen) else -1))
    return np.delete(fast, chosen)


def _likeness(first: NDArray[np.complex128], second: NDArray[np.complex128]) -> NDArray[np.float64]:
    """Modal assurance criterion of mass-normalised real-root shapes, shape (n_first, n_second)."""
    cross = np.abs(first.conj().T @ second) ** 2
    own = np.outer(np.sum(np.abs(first) ** 2, axis=0), np.sum(np.abs(second) ** 2, axis=0))
    return np.asarray(np.divide(cross, own, out=np.zeros_like(cross), where=own > 0))


def _assign(likeness: NDArray[np.float64]) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    if not likeness.size:
        return np.zeros(0, dtype=np.int64), np.zeros(0, dtype=np.int64)
    if min(likeness.shape) == 1:
        row, column = np.unravel_index(int(np.argmax(likeness)), likeness.shape)
        return np.array([row]), np.array([column])
    # Loading scipy.optimize costs as much as a small solve, so only models with several real pairs pay for it.
    from scipy.optimize import linear_sum_assignment

    rows, columns = linear_sum_assignment(likeness, maximize=True)
    return rows.astype(np.int64), columns.astype(np.int64)
