"""Checking a network made by hand, before it goes to assembly."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any

import numpy as np

from mdof.description.quantities import DIRECTIONS
from mdof.errors import ModelError, Problem
from mdof.units import nearest

__all__ = ["validate_graph"]

_GRAPH = ("title", "name", "directions", "damping", "reference_frequency")
_NODE = ("kind", "mass", "centre", "centre_assumed", "inertia", "directions", "massless", "spin")
_EDGE = (
    "between", "kind", "at", "ends", "axis", "axes", "stiffness", "damping", "inertance", "loss_factor",
    "reference_frequency", "branches", "beam", "gear", "after_levelling", "limits", "label",
)  # fmt: skip
_KINDS = ("spring", "beam", "rigid", "gear")


def validate_graph(graph: Any) -> None:
    """Check a network made by hand against the attributes of :mod:`mdof.description.network`.

    Assembly does not call this, because it costs more than assembling; call it once for a graph you wrote.

    Raises
    ------
    ModelError
        With every problem; paths are ``bodies.NAME.attribute`` and ``connections.NAME.attribute``.
    """
    problems = [Problem(path=path, message=message, expected=expected) for path, message, expected in _problems(graph)]
    if problems:
        raise ModelError(problems)


_Found = Iterator[tuple[str, str, str]]


def _problems(graph: Any) -> _Found:
    if not all(hasattr(graph, name) for name in ("nodes", "edges", "is_multigraph")):
        yield "", f"a {type(graph).__name__} is not a network", "give a networkx.MultiGraph"
        return
    if not graph.is_multigraph():
        yield "", "the network is a simple graph, which merges parallel connections", "use networkx.MultiGraph"
        return
    if graph.is_directed():
        yield "", "the network is a directed graph", "use networkx.MultiGraph; `between` holds the order"
        return
    yield from _unknown("", graph.graph, _GRAPH)
    yield from _directions("directions", graph.graph.get("directions"))
    grounds = {"ground"}
    bodies = 0
    for name, data in graph.nodes(data=True):
        if data.get("kind", "ground" if name == "ground" else "body") == "ground":
            grounds.add(name)
        elif data.get("kind", "body") == "body":
            bodies += 1
            yield from _body(f"bodies.{name}", data)
        else:
            yield f"bodies.{name}.kind", f"unknown kind `{data['kind']}`", "write body or ground"
    if not bodies:
        yield "bodies", "the network has no body", "add a node with a mass"
    seen: set[str] = set()
    for a, b, key, edge in graph.edges(keys=True, data=True):
        path = f"connections.{key}"
        if str(key) in seen and isinstance(key, str):
            yield path, "two connections have the same name", "give every edge its own key"
        seen.add(str(key))
        yield from _edge(path, edge, a, b, grounds)


def _unknown(path: str, data: Mapping[Any, Any], known: tuple[str, ...]) -> _Found:
    for key in data:
        if key not in known:
            close = nearest(str(key), known)
            yield (
                f"{path}.{key}".lstrip("."),
                f"unknown attribute `{key}`",
                f"did you mean `{close}`?" if close else f"known: {', '.join(known)}",
            )


def _directions(path: str, directions: Any) -> _Found:
    if directions is None:
        return
    if (
        isinstance(directions, str)
        or not all(direction in DIRECTIONS for direction in directions)
        or not len(directions)
    ):
        yield path, f"{directions!r} are not directions", f"write a tuple of {', '.join(DIRECTIONS)}"


def _shaped(path: str, value: Any, shape: tuple[int, ...]) -> _Found:
    if value is None:
        return
    words = " by ".join(str(size) for size in shape)
    try:
        array = np.asarray(value, dtype=np.float64)
    except (TypeError, ValueError):
        yield path, "these are not numbers", f"give {words} SI numbers"
        return
    if array.shape != shape:
        yield path, f"the shape is {array.shape}", f"give {words} SI numbers"
    elif not np.all(np.isfinite(array)):
        yield path, "not all numbers are finite", f"give {words} SI numbers"


def _body(path: str, data: Mapping[str, Any]) -> _Found:
    yield from _unknown(path, data, _NODE)
    yield from _directions(f"{path}.directions", data.get("directions"))
    yield from _shaped(f"{path}.mass", data.get("mass"), ())
    yield from _shaped(f"{path}.centre", data.get("centre"), (3,))
    yield from _shaped(f"{path}.inertia", data.get("inertia"), (3, 3))
    if _number(data.get("mass")) and data["mass"] < 0:
        yield f"{path}.mass", "a negative mass", "give what it weighs"
    elif (
        _number(data.get("mass", 0.0))
        and not data.get("mass")
        and not data.get("massless")
        and data.get("inertia") is None
    ):
        yield f"{path}.mass", "the body has neither mass nor inertia", "give it a mass, or massless=True"


def _number(value: Any) -> bool:
    return (
        isinstance(value, int | float | np.floating | np.integer)
        and not isinstance(value, bool)
        and bool(np.isfinite(value))
    )


def _edge(path: str, edge: Mapping[str, Any], a: Any, b: Any, grounds: set[Any]) -> _Found:
    yield from _unknown(path, edge, _EDGE)
    between = edge.get("between")
    if between is None:
        yield (
            f"{path}.between",
            "`between` is missing: the graph does not keep the order of the ends",
            f"give between=({a!r}, {b!r})",
        )
    elif isinstance(between, str) or len(between) != 2 or {*between} != {a, b}:
        yield f"{path}.between", f"{between!r} are not the ends of this edge", f"give between=({a!r}, {b!r})"
    if a == b:
        yield f"{path}.between", f"`{a}` is connected to itself", "name two different ends"
    elif a in grounds and b in grounds:
        yield f"{path}.between", "both ends are grounds", "name at least one body"
    kind = edge.get("kind", "spring")
    if kind not in _KINDS:
        close = nearest(str(kind), _KINDS)
        yield (
            f"{path}.kind",
            f"unknown kind `{kind}`",
            f"did you mean `{close}`?" if close else f"write one of {', '.join(_KINDS)}",
        )
    for name, shape in (("at", (3,)), ("axis", (3,)), ("axes", (3, 3)), ("ends", (2, 3))):
        yield from _shaped(f"{path}.{name}", edge.get(name), shape)
    if edge.get("axis") is not None and edge.get("axes") is not None:
        yield f"{path}.axes", "`axis` and `axes` exclude each other", "keep one"
    for name in ("stiffness", "damping", "inertance", "loss_factor"):
        yield from _values(f"{path}.{name}", edge.get(name))
    for index, branch in enumerate(edge.get("branches") or ()):
        for name in ("stiffness", "damping"):
            if not isinstance(branch, Mapping) or branch.get(name) is None:
                yield (
                    f"{path}.branches.{index}.{name}",
                    f"`{name}` is missing",
                    "a branch is a spring and a damper in series",
                )
            else:
                yield from _values(f"{path}.branches.{index}.{name}", branch[name])
    if kind in ("beam", "gear") and not isinstance(edge.get(kind), Mapping):
        yield f"{path}.{kind}", f"`{kind}` is missing", f"give the {kind}'s values as a mapping"
    if kind == "beam" and edge.get("ends") is None:
        yield f"{path}.ends", "a beam needs its two ends", "give ends=((x, y, z), (x, y, z))"
    if kind == "spring" and all(edge.get(name) is None for name in ("stiffness", "damping", "inertance", "branches")):
        yield path, "the connection does nothing", "give it stiffness, damping, inertance or branches"


def _values(path: str, values: Any) -> _Found:
    if values is None or _number(values):
        return
    if not isinstance(values, Mapping):
        yield path, f"{values!r} is not a finite number", "give one SI number, or numbers by direction"
        return
    for direction, value in values.items():
        if direction not in DIRECTIONS:
            yield f"{path}.{direction}", f"unknown direction `{direction}`", f"directions are {', '.join(DIRECTIONS)}"
        elif not _number(value):
            yield f"{path}.{direction}", f"{value!r} is not a finite number", "give an SI number"
