"""A network as its findings see it: columns of single bodies, groups, and what stiffness holds."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from mdof.description.quantities import DIRECTIONS

__all__ = ["Held", "NetworkView"]


_CODE = {name: index for index, name in enumerate(DIRECTIONS)}
#: A direction is free where the springs leave less than this share of it.
_FREE = 1e-9
_ONE = np.ones(1)
_ORIGIN = np.zeros(3)
_ALONG: tuple[NDArray[np.float64], ...] = (_ONE,)


class NetworkView:
    """The network as the findings see it: riders of rigid links count as parts of their hosts."""

    def __init__(self, graph: Any) -> None:
        self.graph = graph
        default = tuple(graph.graph.get("directions") or ("x",))
        self.grounds: list[Any] = []
        self.names: list[Any] = []
        self.centre: dict[Any, NDArray[np.float64]] = {}
        self.directions: dict[Any, tuple[str, ...]] = {}
        for name, data in graph.nodes(data=True):
            ground = data.get("kind", "ground" if name == "ground" else "body") == "ground"
            (self.grounds if ground else self.names).append(name)
            centre = data.get("centre")
            self.centre[name] = _ORIGIN if centre is None else np.asarray(centre, dtype=np.float64)
            self.directions[name] = () if ground else tuple(data.get("directions") or default)
        self.edges = [(str(key), _ends(a, b, edge), edge) for a, b, key, edge in graph.edges(keys=True, data=True)]
        self.host: dict[Any, Any] = {}
        for _, (host, rider), edge in self.edges:
            if edge.get("kind") == "rigid" and rider not in self.host:
                self.host[rider] = host

    def root(self, name: Any) -> Any:
        """The body that carries ``name``, itself unless it rides."""
        count = 0
        while name in self.host and count <= len(self.host):
            name, count = self.host[name], count + 1
        return name

    def groups(self) -> list[list[Any]]:
        """Bodies joined by connections, in order of their first body."""
        parent = {name: name for name in self.names}

        def find(name: Any) -> Any:
            while parent[name] != name:
                parent[name] = parent[parent[name]]
                name = parent[name]
            return name

        for _, (a, b), _edge in self.edges:
            if a in parent and b in parent:
                parent[find(b)] = find(a)
        found: dict[Any, list[Any]] = {}
        for name in self.names:
            found.setdefault(find(name), []).append(name)
        return list(found.values())

    def rows(
        self, ends: tuple[Any, Any], edge: Mapping[str, Any], which: str
    ) -> Iterator[tuple[str, NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]]:
        """Direction, force, moment and point of every column an edge's ``which`` values make."""
        values = edge.get(which)
        if not isinstance(values, Mapping):
            values = {"": values} if values else {}
        point = self.point(ends, edge)
        frame = np.asarray(edge["axes"], dtype=np.float64) if edge.get("axes") is not None else np.eye(3)
        none = np.zeros(3)
        for direction, value in values.items():
            if not value:
                continue
            if direction == "":
                for vector, turning in self.single(ends, edge):
                    yield (
                        ("rotation" if turning else "translation"),
                        (none if turning else vector),
                        (vector if turning else none),
                        point,
                    )
            else:
                vector = frame[_CODE[direction] % 3]
                turning = direction.startswith("r")
                yield direction, (none if turning else vector), (vector if turning else none), point

    def point(self, ends: tuple[Any, Any], edge: Mapping[str, Any]) -> NDArray[np.float64]:
        if edge.get("at") is not None:
            return np.asarray(edge["at"], dtype=np.float64)
        if edge.get("ends") is not None:
            return np.asarray(edge["ends"][0], dtype=np.float64)
        return self.centre[next((name for name in ends if name not in self.grounds), ends[0])]

    def single(self, ends: tuple[Any, Any], edge: Mapping[str, Any]) -> list[tuple[NDArray[np.float64], bool]]:
        """The one direction of a scalar value, and whether it is a rotation."""
        if edge.get("axis") is not None:
            return [(np.asarray(edge["axis"], dtype=np.float64), edge.get("kind") == "gear")]
        if edge.get("ends") is not None:
            return [(np.subtract(edge["ends"][1], edge["ends"][0]).astype(np.float64), False)]
        moving = {direction for name in ends for direction in self.directions.get(name, ())}
        if edge.get("kind") == "gear":
            moving = {direction for direction in moving if direction.startswith("r")}
        return [(np.eye(3)[_CODE[direction] % 3], direction.startswith("r")) for direction in moving]

    def seen_by(
        self, name: Any, force: NDArray[np.float64], moment: NDArray[np.float64], point: NDArray[np.float64]
    ) -> NDArray[np.float64]:
        """The column over the directions of the body ``name`` (or of what carries it)."""
        body = self.root(name)
        full = np.concatenate([force, np.cross(point - self.centre[body], force) + moment])
        return full[[_CODE[direction] for direction in self.directions[body]]]


def _ends(a: Any, b: Any, edge: Mapping[str, Any]) -> tuple[Any, Any]:
    between = edge.get("between")
    return (a, b) if between is None else (between[0], between[1])


class Held:
    """What stiffness holds: ``loose`` are bodies with free directions, ``tied`` those with a stiffness to a ground."""

    def __init__(self, view: NetworkView) -> None:
        rows: dict[Any, list[NDArray[np.float64]]] = {name: [] for name in view.names if name not in view.host}
        whole: set[Any] = set()
        self.tied: set[Any] = set()
        for _, ends, edge in view.edges:
            kind = edge.get("kind", "spring")
            if kind == "rigid":
                continue
            own = [view.root(name) for name in ends if name not in view.grounds]
            columns = list(_columns(view, ends, edge, kind)) if not _plain_line(view, own, edge, kind) else [_ALONG]
            if kind == "beam":
                whole.update(own)
            for body in own:
                if columns and columns[0] is _ALONG:
                    rows[body].append(_ONE)
                else:
                    rows[body].extend(view.seen_by(body, force, moment, point) for force, moment, point in columns)
            if len(own) == 1 and (columns or kind == "beam"):
                self.tied.add(own[0])
        self.loose = [
            (name, free, mixed)
            for name, own_rows in rows.items()
            if name not in whole
            for free, mixed in [_free_directions(own_rows, view.directions[name])]
            if free or mixed
        ]


def _plain_line(view: NetworkView, own: list[Any], edge: Mapping[str, Any], kind: str) -> bool:
    """True for a spring without geometry between bodies that move in one direction only: the case of long chains."""
    if kind != "spring" or not own or any(name in edge for name in ("at", "ends", "axis", "axes")):
        return False
    directions = view.directions[own[0]]
    if len(directions) != 1 or any(view.directions[body] != directions for body in own[1:]):
        return False
    values = edge.get("stiffness")
    return bool(values.get(directions[0]) if isinstance(values, Mapping) else values)


def _columns(
    view: NetworkView, ends: tuple[Any, Any], edge: Mapping[str, Any], kind: str
) -> Iterator[tuple[NDArray[np.float64], ...]]:
    """Force, moment and point of everything stiff in an edge."""
    if kind == "gear":
        point = view.point(ends, edge)
        yield from ((np.zeros(3), vector, point) for vector, _ in view.single(ends, edge))
    elif kind != "beam":
        yield from ((force, moment, point) for _, force, moment, point in view.rows(ends, edge, "stiffness"))


def _free_directions(rows: list[NDArray[np.float64]], directions: tuple[str, ...]) -> tuple[list[str], int]:
    """Directions in which no row acts, and how many motions besides are free only in combination."""
    if not rows:
        return list(directions), 0
    if len(directions) == 1:
        return ([] if any(row[0] for row in rows) else list(directions)), 0
    matrix = np.array(rows)
    turning = np.array([direction.startswith("r") for direction in directions])
    # Rotations are measured at the size of the machine, so that metres and radians compare.
    arms, forces = np.abs(matrix[:, turning]).max(initial=0.0), np.abs(matrix[:, ~turning]).max(initial=0.0)
    if arms > 0 and forces > 0:
        matrix = matrix / np.where(turning, arms, forces)
    matrix = matrix / np.maximum(np.linalg.norm(matrix, axis=1, keepdims=True), np.finfo(float).tiny)
    size = np.linalg.svd(matrix, compute_uv=False)
    rank = int(np.sum(size > _FREE * max(size.max(initial=0.0), np.finfo(float).tiny)))
    free = [direction for index, direction in enumerate(directions) if np.abs(matrix[:, index]).max() <= _FREE]
    return free, len(directions) - rank - len(free)
