"""The factors of a System, binary64 numbers taken as exact, multiplied out in rational arithmetic."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from flint import fmpq, fmpq_mat

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence

    from mdof.system import System

__all__ = [
    "Column",
    "ExactMatrices",
    "connected_parts",
    "exact_columns",
    "exact_matrices",
    "is_zero",
    "picked",
    "rational",
]

#: Nonzero entries of a direction by row.
Column = dict[int, fmpq]
#: Nonzero entries of a matrix by row and column.
_Entries = dict[tuple[int, int], fmpq]


@dataclass(frozen=True, kw_only=True, slots=True, eq=False)
class ExactMatrices:
    """M, C and K of ``λ²M + λC + K``, and the loss factors that state no reference, each of shape (n, n).

    ``loss`` is Σ η k b bᵀ: the damping is C + loss / ω at the reference ω. It is left out of C.
    """

    mass: fmpq_mat
    damping: fmpq_mat
    stiffness: fmpq_mat
    loss: fmpq_mat

    @property
    def size(self) -> int:
        """Number of coordinates."""
        return self.mass.nrows()

    @property
    def symmetric(self) -> bool:
        """True where all matrices are."""
        return all(part == part.transpose() for part in (self.mass, self.damping, self.stiffness, self.loss))

    def restricted(self, index: Sequence[int]) -> ExactMatrices:
        """Rows and columns of some coordinates."""
        return ExactMatrices(
            mass=picked(self.mass, index, index),
            damping=picked(self.damping, index, index),
            stiffness=picked(self.stiffness, index, index),
            loss=picked(self.loss, index, index),
        )


def rational(value: Any) -> fmpq:
    """A binary64 number as the fraction that it is."""
    numerator, denominator = float(value).as_integer_ratio()
    return fmpq(numerator, denominator)


def exact_columns(columns: Any) -> list[Column]:
    """Directions as sparse columns of fractions."""
    cuts, rows, values = columns.indptr, columns.indices, columns.data
    return [
        {int(rows[place]): rational(values[place]) for place in range(cuts[j], cuts[j + 1])}
        for j in range(columns.shape[1])
    ]


def exact_matrices(
    system: System, springs: list[Column] | None = None, dampers: list[Column] | None = None
) -> ExactMatrices:
    """Multiply the factors out without rounding.

    Loss factors with a stated reference are dashpots η k / ω in C, divided exactly.

    Parameters
    ----------
    system : System
    springs, dampers : list of Column, optional
        Directions to take for those of the system.
    """
    n = system.size
    springs = exact_columns(system.spring_columns) if springs is None else springs
    dampers = exact_columns(system.damper_columns) if dampers is None else dampers
    mass = _entries(system.mass)
    stiffness = _gram(springs, [rational(value) for value in system.stiffness])
    if system.extra_stiffness is not None:
        _add(stiffness, _entries(system.extra_stiffness))
    damping = _gram(dampers, [rational(value) for value in system.damping])
    stated, floating = [], []
    for factor, spring, reference in zip(system.loss_factor, system.stiffness, system.loss_reference, strict=True):
        product = rational(factor) * rational(spring)
        own = bool(np.isnan(reference))
        stated.append(fmpq(0) if own or not product else product / rational(reference))
        floating.append(product if own else fmpq(0))
    _add(damping, _gram(springs, stated))
    _add(damping, mass, rational(system.mass_proportional))
    _add(damping, stiffness, rational(system.stiffness_proportional))
    for part in (system.extra_damping, system.gyroscopic):
        if part is not None:
            _add(damping, _entries(part))
    return ExactMatrices(
        mass=_matrix(mass, n),
        damping=_matrix(damping, n),
        stiffness=_matrix(stiffness, n),
        loss=_matrix(_gram(springs, floating), n),
    )


def _entries(matrix: Any) -> _Entries:
    coo = matrix.tocoo()
    result: _Entries = {}
    for i, j, value in zip(coo.row, coo.col, coo.data, strict=True):
        key = (int(i), int(j))
        result[key] = result.get(key, fmpq(0)) + rational(value)
    return result


def _gram(columns: Iterable[Column], weights: Iterable[fmpq]) -> _Entries:
    """B diag(w) Bᵀ."""
    result: _Entries = {}
    for column, weight in zip(columns, weights, strict=True):
        if not weight:
            continue
        for a, x in column.items():
            scaled = x * weight
            for b, y in column.items():
                result[a, b] = result.get((a, b), fmpq(0)) + scaled * y
    return result


def _add(target: _Entries, other: _Entries, factor: fmpq | None = None) -> None:
    if factor is not None and not factor:
        return
    for key, value in list(other.items()):
        target[key] = target.get(key, fmpq(0)) + (value if factor is None else factor * value)


def _matrix(entries: _Entries, n: int) -> fmpq_mat:
    result = fmpq_mat(n, n)
    for (i, j), value in entries.items():
        result[i, j] = value
    return result


def picked(matrix: fmpq_mat, rows: Sequence[int], columns: Sequence[int]) -> fmpq_mat:
    """Some rows and columns of a matrix."""
    return fmpq_mat(len(rows), len(columns), [matrix[i, j] for i in rows for j in columns])


def is_zero(matrix: fmpq_mat) -> bool:
    """True where no entry differs from 0."""
    return not bool(matrix)


def connected_parts(matrices: ExactMatrices) -> list[list[int]]:
    """Coordinates in groups that no entry of M, C, K or the loss factors couples."""
    from scipy.sparse import csr_array
    from scipy.sparse.csgraph import connected_components

    n = matrices.size
    pattern = np.zeros((n, n), dtype=bool)
    for part in (matrices.mass, matrices.damping, matrices.stiffness, matrices.loss):
        pattern |= np.array([bool(value) for value in part.entries()], dtype=bool).reshape(n, n)
    count, label = connected_components(csr_array(pattern), directed=False)
    return [[int(i) for i in np.nonzero(label == number)[0]] for number in range(count)]
