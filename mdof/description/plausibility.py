"""Numbers that can be read but hardly meant: a loss factor in per cent, an inertia off by powers of ten."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any

import numpy as np

from mdof.description.network_view import NetworkView
from mdof.findings import Finding, finding

__all__ = ["implausible", "radii_of_gyration"]

#: Radius of gyration over the distance to the farthest connection: common practice, no source.
_WIDEST, _NARROWEST = 3.0, 0.02


def implausible(view: NetworkView) -> Iterator[Finding]:
    """Findings on numbers of one body or connection."""
    yield from _loss_factors(view)
    yield from _inertias(view)
    yield from _centres(view)


def radii_of_gyration(data: Mapping[str, Any]) -> tuple[float, ...] | None:
    """sqrt(J / m) about x, y, z through the centre [m]; None without mass or inertia."""
    mass, inertia = float(data.get("mass") or 0.0), data.get("inertia")
    if mass <= 0 or inertia is None:
        return None
    return tuple(float(np.sqrt(max(moment, 0.0) / mass)) for moment in np.diag(np.asarray(inertia, dtype=float)))


def _loss_factors(view: NetworkView) -> Iterator[Finding]:
    found: dict[tuple[str, float], list[str]] = {}
    for name, _, edge in view.edges:
        for source in (edge, *(edge.get("branches") or ())):
            values = source.get("loss_factor")
            entries = values.values() if isinstance(values, Mapping) else () if values is None else (values,)
            for value in {float(value) for value in entries if value > 1}:
                found.setdefault((name.split("/", 1)[0], value), []).append(name)
    for (base, value), names in found.items():
        yield finding(
            "doubtful-loss-factor",
            f"`{base}` has a loss factor of {value:g}: in one cycle it dissipates {2 * np.pi * value:.3g} times the "
            f"energy it stores; if {value:g} % is meant, write {value / 100:g} or {value:g} %",
            connections=tuple(names),
        )


def _inertias(view: NetworkView) -> Iterator[Finding]:
    reach = _reach(view)
    for name in view.names:
        radii, farthest = radii_of_gyration(view.graph.nodes[name]), reach.get(name, 0.0)
        if radii is None or farthest <= 0:
            continue
        turning = [axis for axis in range(3) if "r" + "xyz"[axis] in view.directions[name]]
        for axis in turning:
            if _NARROWEST * farthest <= radii[axis] <= _WIDEST * farthest:
                continue
            size = "far larger" if radii[axis] > farthest else "far smaller"
            yield finding(
                "doubtful-inertia",
                f"the inertia of `{name}` about {'xyz'[axis]} makes its radius of gyration {radii[axis]:.3g} m, {size} "
                f"than the {farthest:.3g} m from its centre to its farthest connection",
                bodies=(str(name),),
            )


def _reach(view: NetworkView) -> dict[Any, float]:
    """Distance from each body's centre to its farthest connection [m]."""
    reach: dict[Any, float] = {}
    for _, ends, edge in view.edges:
        points = [edge["at"], edge["at"]] if edge.get("at") is not None else edge.get("ends")
        if points is None:
            continue
        for end, point in zip(ends, points, strict=True):
            if end in view.centre and end not in view.grounds:
                distance = float(np.linalg.norm(np.asarray(point, dtype=float) - view.centre[end]))
                reach[end] = max(reach.get(end, 0.0), distance)
    return reach


def _centres(view: NetworkView) -> Iterator[Finding]:
    assumed = tuple(
        str(name)
        for name in view.names
        if view.graph.nodes[name].get("centre_assumed") and len(view.directions[name]) > 1
        if any(direction.startswith("r") for direction in view.directions[name])
    )
    placed = any(not view.graph.nodes[name].get("centre_assumed") for name in view.names)
    pointed = any(edge.get("at") is not None or edge.get("ends") is not None for _, _, edge in view.edges)
    if assumed and (placed or pointed):
        listed = ", ".join(f"`{name}`" for name in assumed[:8]) + (", .." if len(assumed) > 8 else "")
        yield finding(
            "centre-at-origin",
            f"no `centre` is given for {listed}: the origin [0, 0, 0] is taken",
            bodies=assumed,
        )
