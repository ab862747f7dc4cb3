"""Free motions whose directions are rounded: the nearest directions that leave them free exactly.

A direction on a body in space holds products such as (p − g) × n. Rounded to binary64 they resist a rigid motion by
1e-16 of their size, and the root 0 becomes one of 1e-15. To prove what is meant, as few entries of every column are
corrected as there are free motions, so that the column and each motion are orthogonal in exact arithmetic.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from flint import arb, fmpq

from mdof.certify.exact_factors import exact_columns, exact_matrices, rational
from mdof.modes.regime import Regime

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from mdof.certify.exact_factors import Column, ExactMatrices
    from mdof.modes.mode import DampedModes

__all__ = ["Freed", "freed"]


@dataclass(frozen=True, kw_only=True, slots=True, eq=False)
class Freed:
    """Matrices from the corrected directions, and the largest correction as a share of what it is a sum of."""

    matrices: ExactMatrices
    correction: float


@dataclass(frozen=True, slots=True, eq=False)
class _Motions:
    """Exact motions, one a column of fractions: the identity in the rows ``held``."""

    held: list[int]
    columns: list[Column]


def freed(modes: DampedModes) -> Freed | None:
    """The system with its stated free motions made exact; None where its stiffness is not given by directions.

    Springs leave all of them free, dampers those that state the root 0 twice.
    """
    system = modes.system
    free = [mode for mode in modes if mode.regime is Regime.RIGID_BODY and 0 in mode.eigenvalues]
    if system.extra_stiffness is not None or not free:
        return None
    drifting = [mode.eigenvalues.count(0) == 2 for mode in free]
    shapes = np.array([mode.reduced_shape.real for mode in free]).T
    undamped = _motions(shapes[:, drifting], None)
    every = _motions(shapes[:, np.logical_not(drifting)], undamped)
    springs, first = _corrected(exact_columns(system.spring_columns), [every, undamped])
    dampers, second = _corrected(exact_columns(system.damper_columns), [undamped])
    return Freed(matrices=exact_matrices(system, springs, dampers), correction=max(first, second))


def _motions(shapes: NDArray[np.float64], other: _Motions | None) -> _Motions:
    """Columns with the same span, the identity in some rows, and zero in the rows that ``other`` holds."""
    from scipy.linalg import qr

    n, count = shapes.shape
    taken = [] if other is None else other.held
    if other is not None and taken:
        basis = np.array([[float(arb(column.get(i, 0))) for column in other.columns] for i in range(n)])
        shapes = shapes - basis @ shapes[taken]
    if not count:
        return _Motions([], [])
    rows = shapes.copy()
    rows[taken] = 0.0
    held = [int(i) for i in qr(rows.T, mode="economic", pivoting=True)[2][:count]]
    scaled = np.linalg.solve(shapes[held].T, shapes.T).T
    scaled[taken] = 0.0
    scaled[held] = np.eye(count)
    columns = [{int(i): rational(scaled[i, j]) for i in np.nonzero(scaled[:, j])[0]} for j in range(count)]
    return _Motions(held, columns)


def _corrected(columns: list[Column], motions: list[_Motions]) -> tuple[list[Column], float]:
    """Columns orthogonal to all motions, and the largest correction as a share of a column times a motion."""
    largest = 0.0
    result = []
    for column in columns:
        new = dict(column)
        longest = max(map(abs, column.values()), default=fmpq(0))
        for group in motions:
            for held, motion in zip(group.held, group.columns, strict=True):
                rest = sum((value * new[i] for i, value in motion.items() if i in new), fmpq(0))
                if rest:
                    share = abs(rest) / (longest * max(map(abs, motion.values())))
                    largest = max(largest, int(share.p) / int(share.q))
                    new[held] = new.get(held, fmpq(0)) - rest
        result.append(new)
    return result, largest
