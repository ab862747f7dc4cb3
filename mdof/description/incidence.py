"""Incidence columns: each connection as directions at points, before any matrix exists.

A direction n at a point p of a body with centre g is the row ``[n, (p − g) × n]`` in the body's six motions (a moment
about n is ``[0, n]``). A column holds this row for the first body and its negative for the second. Beams and gears
have two unlike legs and are written leg by leg. Everything here is per column, so one pass over the edges collects
plain lists and numpy does the rest.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from mdof.description.columns import GROUND, Columns, ColumnSet
from mdof.errors import ModelError, Problem

if TYPE_CHECKING:
    from collections.abc import Mapping

    from numpy.typing import NDArray

__all__ = ["DIRECTIONS", "ColumnSet", "Columns", "beam_deformations", "collect"]

DIRECTIONS = ("x", "y", "z", "rx", "ry", "rz")
_CODE = {name: index for index, name in enumerate(DIRECTIONS)}


def collect(graph: Any, body_index: Mapping[Any, int], body_directions: list[tuple[str, ...]]) -> ColumnSet:
    """One pass over the edges of a network.

    Parameters
    ----------
    graph : networkx.MultiGraph with SI attributes, see :func:`mdof.network`.
    body_index : body name to index; grounds map to -1.
    body_directions : directions of each body by index.

    Raises
    ------
    ModelError
        If an edge has no order of ends, an unknown end, or a value whose direction is not told.
    """
    found = ColumnSet()
    default_reference = graph.graph.get("reference_frequency")
    default_reference = np.nan if default_reference is None else float(default_reference)
    same = set(body_directions)
    only = _CODE[next(iter(same))[0]] if len(same) == 1 and len(next(iter(same))) == 1 else None
    plain = _PlainEdges(found, default_reference)
    for u, v, key, edge in graph.edges(keys=True, data=True):
        ends = edge.get("between")
        if (
            only is not None
            and ends is not None
            and _SPECIAL.isdisjoint(edge)
            and edge.get("kind", "spring") == "spring"
        ):
            # Large one-direction models are nearly all of this kind, and this pass is all the Python they cost.
            a, b = body_index.get(ends[0]), body_index.get(ends[1])
            stiffness, damping = edge.get("stiffness", 0.0), edge.get("damping", 0.0)
            if a is not None and b is not None and type(stiffness) is float and type(damping) is float:
                plain.add(str(key), a, b, only, stiffness, damping, edge)
                continue
        if ends is None:
            # Relative motion has no sign for ordinary springs, so an edge without an order still has a meaning there.
            ends = (u, v)
            if edge.get("kind") in ("rigid", "gear", "beam"):
                raise _error(key, f"a {edge['kind']} needs between=(a, b)", "give the order of its ends")
        try:
            a, b = body_index[ends[0]], body_index[ends[1]]
        except KeyError as missing:
            raise _error(key, f"unknown body {missing.args[0]!r}", "name a node of the network") from None
        _collect_edge(found, str(key), edge, a, b, ends, body_directions, default_reference)
    return found


#: Attributes that need more than one look at an edge.
_SPECIAL = frozenset({"at", "ends", "axis", "axes", "branches", "beam", "gear", "inertance"})


class _PlainEdges:
    """The short way in for one spring and one damper along the model's only direction, between centres."""

    def __init__(self, found: ColumnSet, default_reference: float) -> None:
        self.found, self.default = found, default_reference
        columns = found.columns
        self.column = (
            columns.body_a.append,
            columns.body_b.append,
            columns.code.append,
            columns.frame.append,
            columns.point.append,
        )

    def add(self, name: str, a: int, b: int, code: int, stiffness: float, damping: float, edge: dict[str, Any]) -> None:
        found = self.found
        column = len(found.columns.code)
        put_a, put_b, put_code, put_frame, put_point = self.column
        put_a(a)
        put_b(b)
        put_code(code)
        put_frame(0)
        put_point(-1)
        spring = -1
        if stiffness:
            loss = edge.get("loss_factor", 0.0)
            if hasattr(loss, "get"):
                loss = loss.get(DIRECTIONS[code], 0.0)
            reference = edge.get("reference_frequency")
            spring = found.spring(name, column, stiffness, loss, self.default if reference is None else reference)
        if damping:
            found.damper(name, column, damping, spring)


def _collect_edge(
    found: ColumnSet,
    name: str,
    edge: dict[str, Any],
    a: int,
    b: int,
    ends: tuple[Any, Any],
    body_directions: list[tuple[str, ...]],
    default_reference: float,
) -> None:
    kind = edge.get("kind", "spring")
    reference = edge.get("reference_frequency")
    reference = default_reference if reference is None else reference
    if kind == "rigid":
        found.rigid.append((name, ends[0], ends[1]))
        return
    if kind == "beam":
        _collect_beam(found, name, edge, a, b, reference)
        return
    if kind == "gear":
        _collect_gear(found, name, edge, a, b, body_directions, reference)
        return
    columns = found.columns
    frame, point = _place(columns, name, edge)
    only = 0 if ("axis" in edge or "ends" in edge) else None
    loss = edge.get("loss_factor", 0.0)
    by_code: dict[int, int] = {}
    spring_of: dict[int, int] = {}

    def coded(values: Any) -> list[tuple[int, float]]:
        if values is None:
            return []
        if hasattr(values, "items"):
            return [(_CODE[direction], value) for direction, value in values.items() if value]
        if not values:
            return []
        return [(_single_direction(name, a, b, body_directions) if only is None else only, values)]

    def column(code: int) -> int:
        if code not in by_code:
            by_code[code] = columns.add(a, b, code, frame, point)
        return by_code[code]

    for code, value in coded(edge.get("stiffness")):
        factor = loss.get(DIRECTIONS[code], 0.0) if hasattr(loss, "get") else loss
        spring_of[code] = found.spring(name, column(code), value, factor, reference)
    for code, value in coded(edge.get("damping")):
        found.damper(name, column(code), value, spring_of.get(code, -1))
    for code, value in coded(edge.get("inertance")):
        found.inertance_column.append(column(code))
        found.inertance.append(value)
    for branch in edge.get("branches") or ():
        dampings = dict(coded(branch.get("damping")))
        # A branch needs both parts to carry force; one without a damper hangs free.
        found.branches.extend(
            (name, column(code), value, dampings[code])
            for code, value in coded(branch.get("stiffness"))
            if code in dampings
        )


def _place(columns: Columns, name: str, edge: dict[str, Any]) -> tuple[int, int]:
    """Frame and point index of an ordinary edge."""
    frame, point = 0, -1
    if "ends" in edge and edge["ends"] is not None:
        start, stop = (np.asarray(end, dtype=np.float64) for end in edge["ends"])
        along = stop - start
        length = np.linalg.norm(along)
        if length == 0:
            raise _error(name, "both ends are the same point", "give two different points, or `at` with `axis`")
        columns.frames.append(np.array([along / length, np.zeros(3), np.zeros(3)]))
        columns.points.append(start)
        return len(columns.frames) - 1, len(columns.points) - 1
    if edge.get("at") is not None:
        columns.points.append(edge["at"])
        point = len(columns.points) - 1
    if edge.get("axis") is not None:
        axis = np.asarray(edge["axis"], dtype=np.float64)
        columns.frames.append(np.array([axis / np.linalg.norm(axis), np.zeros(3), np.zeros(3)]))
        frame = len(columns.frames) - 1
    elif edge.get("axes") is not None:
        columns.frames.append(np.asarray(edge["axes"], dtype=np.float64).reshape(3, 3))
        frame = len(columns.frames) - 1
    return frame, point


def _single_direction(name: str, a: int, b: int, body_directions: list[tuple[str, ...]]) -> int:
    both: set[str] = set()
    for body in (a, b):
        if body != GROUND:
            both.update(body_directions[body])
    if len(both) != 1:
        example = ", ".join(f"{direction}: .." for direction in DIRECTIONS if direction in both)
        raise _error(name, "one number does not say in which direction it acts", f"write {{{example}}}")
    return _CODE[both.pop()]


def beam_deformations(
    start: NDArray[np.float64], stop: NDArray[np.float64], towards: NDArray[np.float64]
) -> tuple[float, NDArray[np.float64]]:
    """Length and axes of a beam: rows are local x (along), y (``towards`` made perpendicular), z (right hand)."""
    along = stop - start
    length = float(np.linalg.norm(along))
    x = along / length
    y = towards - (towards @ x) * x
    y = y / np.linalg.norm(y)
    return length, np.array([x, y, np.cross(x, y)])


def _collect_beam(found: ColumnSet, name: str, edge: dict[str, Any], a: int, b: int, reference: float) -> None:
    """Six natural deformations of a uniform massless beam, each with its own stiffness.

    Stretch EA/L, twist GJ/L and, for each plane of bending, the even deformation EI/L and the odd one
    3EI/(L(1 + Φ)) with the shear number Φ = 12EI/(G A_s L²). Their sum is the usual 12-by-12 stiffness matrix.
    Source: Przemieniecki, Theory of Matrix Structural Analysis (1968), section 5.6 (the matrix; from memory); the
    natural deformations after Argyris and co-workers (from memory).
    """
    data = edge["beam"]
    start, stop = (np.asarray(end, dtype=np.float64) for end in edge["ends"])
    if not np.any(stop != start):
        raise _error(name, "both ends are the same point", "give two different points")
    towards = np.asarray(data["towards"], dtype=np.float64)
    if np.linalg.norm(np.cross(stop - start, towards)) <= 1e-9 * np.linalg.norm(stop - start) * np.linalg.norm(towards):
        raise _error(name, "`towards` points along the beam", "give a direction across the beam")
    length, (x, y, z) = beam_deformations(start, stop, towards)
    young, shear = data["youngs_modulus"], data["shear_modulus"]
    about_y, about_z = data["second_moments"]
    shear_areas = data.get("shear_areas")
    none = np.zeros(3)
    loss = float(edge.get("loss_factor", 0.0) or 0.0)

    def put(stiffness: float, at_start: tuple[Any, Any], at_stop: tuple[Any, Any]) -> None:
        legs = [(a, at_start[0], at_start[1], start), (b, at_stop[0], at_stop[1], stop)]
        found.spring(name, found.columns.add_legs(legs), stiffness, loss, reference)

    put(young * data["area"] / length, (-x, none), (x, none))
    put(shear * data["torsion_constant"] / length, (none, -x), (none, x))
    for second_moment, turn, push, sign, which in ((about_z, z, y, -1.0, 0), (about_y, y, z, 1.0, 1)):
        put(young * second_moment / length, (none, -turn), (none, turn))
        number = 0.0
        if shear_areas is not None:
            number = 12 * young * second_moment / (shear * shear_areas[which] * length**2)
        odd = 3 * young * second_moment / (length * (1 + number))
        put(odd, (-sign * 2 / length * push, turn), (sign * 2 / length * push, turn))


def _collect_gear(
    found: ColumnSet,
    name: str,
    edge: dict[str, Any],
    a: int,
    b: int,
    body_directions: list[tuple[str, ...]],
    reference: float,
) -> None:
    data = edge["gear"]
    first, second = data["radii"] if data.get("radii") is not None else (data["ratio"], 1.0)
    if edge.get("axis") is not None:
        axis = np.asarray(edge["axis"], dtype=np.float64)
        axis = axis / np.linalg.norm(axis)
    else:
        turns = {
            direction for body in (a, b) if body != GROUND for direction in body_directions[body] if direction[0] == "r"
        }
        if len(turns) != 1:
            raise _error(name, "the gear's shaft direction is not told", "write `axis: [1, 0, 0]` along the shafts")
        axis = np.eye(3)[_CODE[turns.pop()] - 3]
    none = np.zeros(3)
    column = found.columns.add_legs([(a, none, first * axis, none), (b, none, -second * axis, none)])
    stiffness, damping = data.get("stiffness") or edge.get("stiffness"), data.get("damping") or edge.get("damping")
    if not stiffness:
        found.rigid_gears.append((name, column))
        return
    loss = float(edge.get("loss_factor", 0.0) or 0.0)
    spring = found.spring(name, column, stiffness, loss, reference)
    if damping:
        found.damper(name, column, damping, spring)


def _error(name: Any, message: str, expected: str) -> ModelError:
    return ModelError([Problem(path=f"connections.{name}", message=message, expected=expected)])
