"""What the network alone shows: bodies nobody holds, groups, idle connections, doubtful signs; and a summary."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from mdof.description.network_view import Held, NetworkView
from mdof.description.plausibility import implausible
from mdof.description.resolved import kind_words
from mdof.findings import Finding, finding

__all__ = ["Summary", "network_findings", "summary"]


@dataclass(frozen=True, kw_only=True, slots=True)
class Summary:
    """A network in a few numbers.

    Attributes
    ----------
    bodies, grounds : names, in order.
    total_mass : float [kg]
    centre_of_gravity : tuple of three floats [m], or None where there is no mass.
    connections : how many of each kind, in words, by falling number.
    degrees_of_freedom : coordinates left after rigid links and rigid gears.
    groups : bodies by group; connections to grounds do not join groups.
    free_directions : the directions of single bodies that no stiffness holds, in words.
    """

    bodies: tuple[str, ...]
    grounds: tuple[str, ...]
    total_mass: float
    centre_of_gravity: tuple[float, float, float] | None
    connections: Mapping[str, int] = field(default_factory=dict)
    degrees_of_freedom: int = 0
    groups: tuple[tuple[str, ...], ...] = ()
    free_directions: tuple[str, ...] = ()


def summary(graph: Any) -> Summary:
    """Bodies, total mass, centre of gravity, connections by kind and degrees of freedom of a network."""
    view = NetworkView(graph)
    masses = np.array([float(graph.nodes[name].get("mass") or 0.0) for name in view.names])
    total = float(masses.sum())
    centre = None
    if total > 0:
        x, y, z = masses @ np.array([view.centre[name] for name in view.names]) / total
        centre = (float(x), float(y), float(z))
    kinds: dict[str, int] = {}
    rigid_gears = 0
    for _, _, edge in graph.edges(data=True):
        words = edge.get("label") or kind_words(edge)
        kinds[words] = kinds.get(words, 0) + 1
        rigid_gears += edge.get("kind") == "gear" and not edge.get("stiffness") and not edge["gear"].get("stiffness")
    free = sum(len(view.directions[name]) for name in view.names if name not in view.host)
    return Summary(
        bodies=tuple(str(name) for name in view.names),
        grounds=tuple(str(name) for name in view.grounds),
        total_mass=total,
        centre_of_gravity=centre,
        connections=dict(sorted(kinds.items(), key=lambda item: -item[1])),
        degrees_of_freedom=free - rigid_gears,
        groups=tuple(tuple(str(name) for name in group) for group in view.groups()),
        free_directions=tuple(f"{name}: {_named(free, mixed)}" for name, free, mixed in Held(view).loose),
    )


def network_findings(graph: Any) -> tuple[Finding, ...]:
    """Findings that need no eigenvalues; the graph may be made by hand."""
    view = NetworkView(graph)
    own = (*_unheld(view), *_separate(view), *_idle(view), *_massless(view), *_signs(view), *_gears(view))
    return (*own, *implausible(view))


def _named(free: list[str], mixed: int) -> str:
    combined = f"{mixed} combined motion{'s' if mixed > 1 else ''}" if mixed else ""
    return " and ".join(part for part in (", ".join(free), combined) if part)


def _unheld(view: NetworkView) -> Iterator[Finding]:
    held = Held(view)
    wholly = set()
    for name, free, mixed in held.loose:
        count, allowed = len(free) + mixed, len(view.directions[name])
        if count == allowed:
            wholly.add(name)
        yield finding(
            "unheld-body",
            f"no stiffness holds `{name}` in {_named(free, mixed)}: {count} of its {allowed} directions",
            bodies=(str(name),),
        )
    for group in view.groups():
        roots = {view.root(name) for name in group}
        if len(roots) > 1 and not roots & held.tied and not roots <= wholly:
            listed = ", ".join(f"`{name}`" for name in group[:6]) + (", .." if len(group) > 6 else "")
            message = f"no stiffness ties the group of {listed} to a ground: it moves freely as a whole"
            yield finding("unheld-body", message, bodies=tuple(str(name) for name in group))


def _separate(view: NetworkView) -> Iterator[Finding]:
    groups = view.groups()
    if len(groups) > 1:
        shown = "; ".join(
            ", ".join(str(name) for name in group[:4]) + (", .." if len(group) > 4 else "") for group in groups[:6]
        )
        more = f"; and {len(groups) - 6} more" if len(groups) > 6 else ""
        yield finding(
            "separate-groups",
            f"no connection joins these {len(groups)} groups: {shown}{more}",
            bodies=tuple(str(group[0]) for group in groups),
        )


def _base(name: str) -> str:
    return name.split("/", 1)[0]


def _idle(view: NetworkView) -> Iterator[Finding]:
    idle: dict[tuple[str, tuple[str, ...]], list[str]] = {}
    for name, ends, edge in view.edges:
        if edge.get("kind", "spring") != "spring":
            continue
        moving = {direction for end in ends for direction in view.directions.get(view.root(end), ())}
        dead: list[str] = []
        sources: list[tuple[Mapping[str, Any], str]] = [(edge, "stiffness"), (edge, "damping"), (edge, "inertance")]
        sources += [({**edge, **branch}, "stiffness") for branch in edge.get("branches") or ()]
        for source, which in sources:
            values = source.get(which)
            if not values:
                continue
            if (
                source.get("axes") is None
                and isinstance(values, Mapping)
                and all(direction in moving for direction in values)
            ):
                continue
            for direction, force, moment, point in view.rows(ends, source, which):
                acts = any(
                    np.abs(view.seen_by(end, force, moment, point)).max(initial=0.0) > 0
                    for end in ends
                    if end not in view.grounds
                )
                if not acts and direction not in dead:
                    dead.append(direction)
        if dead:
            idle.setdefault((_base(name), tuple(dead)), []).append(name)
    for (base, dead_directions), names in idle.items():
        where = "along its line" if dead_directions == ("translation",) else f"in {', '.join(dead_directions)}"
        yield finding(
            "idle-connection", f"`{base}` acts {where}, where neither of its ends may move", connections=tuple(names)
        )


def _massless(view: NetworkView) -> Iterator[Finding]:
    names = tuple(str(name) for name in view.names if view.graph.nodes[name].get("massless"))
    if names:
        yield finding(
            "massless-body", f"without mass: {', '.join(names[:12])}{', ..' if len(names) > 12 else ''}", bodies=names
        )


def _signs(view: NetworkView) -> Iterator[Finding]:
    for which, code, unit in (
        ("stiffness", "negative-stiffness", "stiffness"),
        ("damping", "negative-damping", "damping"),
    ):
        found: dict[str, tuple[list[str], list[str]]] = {}
        for name, _, edge in view.edges:
            values = edge.get(which)
            if not values:
                continue
            entries = values.items() if isinstance(values, Mapping) else (("", values),)
            negative = [direction for direction, value in entries if value < 0]
            if negative:
                directions, names = found.setdefault(_base(name), ([], []))
                directions.extend(direction for direction in negative if direction and direction not in directions)
                names.append(name)
        for base, (directions, names) in found.items():
            where = f" in {', '.join(directions)}" if directions else ""
            yield finding(code, f"`{base}` has negative {unit}{where}", connections=tuple(names))


def _gears(view: NetworkView) -> Iterator[Finding]:
    names = tuple(name for name, _, edge in view.edges if edge.get("kind") == "gear")
    if names:
        yield finding(
            "gear-reaction",
            f"the tooth force of {', '.join(names)} acts on the shafts only, not on a housing",
            connections=names,
        )
