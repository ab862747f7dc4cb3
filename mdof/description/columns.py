"""Growing lists of incidence columns with their springs, dampers and inertances, and the sparse matrix they make."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray

__all__ = ["GROUND", "ColumnSet", "Columns"]


GROUND = -1


@dataclass(slots=True)
class Columns:
    """Growing lists that describe columns; one entry a column.

    ``body_a``, ``body_b`` are body indices (-1 for a ground), ``code`` the direction 0..5, ``frame`` and ``point``
    indices into ``frames`` and ``points`` (point -1: centre of the first body that is not a ground).
    """

    body_a: list[int] = field(default_factory=list)
    body_b: list[int] = field(default_factory=list)
    code: list[int] = field(default_factory=list)
    frame: list[int] = field(default_factory=list)
    point: list[int] = field(default_factory=list)
    frames: list[NDArray[np.float64]] = field(default_factory=lambda: [np.eye(3)])
    points: list[Any] = field(default_factory=list)
    # Columns with two unlike legs: (column index, body index, force direction, moment direction, point).
    legs: list[tuple[int, int, NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]] = field(
        default_factory=list
    )

    def add(self, a: int, b: int, code: int, frame: int, point: int) -> int:
        """Append an ordinary column and return its index."""
        self.body_a.append(a)
        self.body_b.append(b)
        self.code.append(code)
        self.frame.append(frame)
        self.point.append(point)
        return len(self.code) - 1

    def add_legs(self, legs: list[tuple[int, NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]]) -> int:
        """Append a column made of legs (body, force direction, moment direction, point) and return its index."""
        column = self.add(GROUND, GROUND, 0, 0, -1)
        self.legs.extend((column, body, force, moment, point) for body, force, moment, point in legs if body != GROUND)
        return column

    def matrix(self, centres: NDArray[np.float64]) -> Any:
        """All columns over the six motions of every body: csc_array, shape (6 n_bodies, n_columns)."""
        from scipy.sparse import coo_array

        count = len(self.code)
        a, b = np.array(self.body_a, dtype=np.int64), np.array(self.body_b, dtype=np.int64)
        code, frame = np.array(self.code, dtype=np.int64), np.array(self.frame, dtype=np.int64)
        point = np.array(self.point, dtype=np.int64)
        direction = np.array(self.frames)[frame, code % 3] if count else np.zeros((0, 3))
        at = centres[np.where(a == GROUND, np.maximum(b, 0), a)] if count else np.zeros((0, 3))
        placed = point >= 0
        if placed.any():
            at[placed] = np.array(self.points, dtype=np.float64).reshape(-1, 3)[point[placed]]
        is_moment = code >= 3
        rows, columns, values = [], [], []
        index = np.arange(count)
        for body, sign in ((a, 1.0), (b, -1.0)):
            for held in (False, True):
                chosen = (body != GROUND) & (is_moment == held)
                if not chosen.any():
                    continue
                which, n = body[chosen], direction[chosen]
                part = n if held else np.hstack([n, np.cross(at[chosen] - centres[which], n)])
                first = 3 if held else 0
                local, motion = np.nonzero(part)
                rows.append(6 * which[local] + first + motion)
                columns.append(index[chosen][local])
                values.append(sign * part[local, motion])
        for column, body_index, force, moment, where in self.legs:
            row = np.concatenate([force, np.cross(where - centres[body_index], force) + moment])
            nonzero = np.nonzero(row)[0]
            rows.append(6 * body_index + nonzero)
            columns.append(np.full(len(nonzero), column))
            values.append(row[nonzero])
        shape = (6 * len(centres), count)
        if not rows:
            return coo_array(shape).tocsc()
        entries = (np.concatenate(values), (np.concatenate(rows), np.concatenate(columns)))
        return coo_array(entries, shape=shape).tocsc()


@dataclass(slots=True)
class ColumnSet:
    """What the edges of a network resist: columns, and who uses them with which value.

    Springs, dampers and inertances refer to columns by index. ``branches`` are springs and dampers in series:
    (name, column, stiffness, damping). ``rigid`` are (name, host, rider), ``rigid_gears`` (name, column).
    """

    columns: Columns = field(default_factory=Columns)
    spring_column: list[int] = field(default_factory=list)
    stiffness: list[float] = field(default_factory=list)
    loss_factor: list[float] = field(default_factory=list)
    loss_reference: list[float] = field(default_factory=list)
    spring_names: list[str] = field(default_factory=list)
    damper_column: list[int] = field(default_factory=list)
    damping: list[float] = field(default_factory=list)
    damper_names: list[str] = field(default_factory=list)
    damper_spring: list[int] = field(default_factory=list)
    inertance_column: list[int] = field(default_factory=list)
    inertance: list[float] = field(default_factory=list)
    branches: list[tuple[str, int, float, float]] = field(default_factory=list)
    rigid: list[tuple[str, str, str]] = field(default_factory=list)
    rigid_gears: list[tuple[str, int]] = field(default_factory=list)

    def spring(self, name: str, column: int, value: float, loss_factor: float, reference: float) -> int:
        """Add a spring on a column; returns its index."""
        self.spring_column.append(column)
        self.stiffness.append(value)
        self.loss_factor.append(loss_factor)
        self.loss_reference.append(reference)
        self.spring_names.append(name)
        return len(self.stiffness) - 1

    def damper(self, name: str, column: int, value: float, spring: int = -1) -> None:
        """Add a damper on a column, naming the spring with the same direction if there is one."""
        self.damper_column.append(column)
        self.damping.append(value)
        self.damper_names.append(name)
        self.damper_spring.append(spring)
