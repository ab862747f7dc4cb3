"""Numbers that can be read but hardly meant: a loss factor in per cent, an inertia off by powers of ten."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from mdof.description.network_view import NetworkView
from mdof.findings import Finding, finding

__all__ = ["implausible", "radii_of_gyration"]

#: Largest radius of gyration of a body over the distance to its farthest connection: common practice, no source.
_WIDEST, _NARROWEST = 3.0, 0.02


def implausible(view: NetworkView) -> Iterator[Finding]:
    """Findings on numbers of one body, of one connection, or of the damping of the whole."""
    yield from _loss_factors(view)
    yield from _damping_ratios(view)
    yield from _inertias(view)
    yield from _centres(view)


def radii_of_gyration(data: Mapping[str, Any]) -> tuple[float, float, float] | None:
    """sqrt(J / m) about x, y, z through the centre of a node of the network [m]; None without mass or inertia."""
    mass, inertia = float(data.get("mass") or 0.0), data.get("inertia")
    if mass <= 0 or inertia is None:
        return None
    x, y, z = np.sqrt(np.maximum(np.diag(np.asarray(inertia, dtype=float)), 0.0) / mass)
    return float(x), float(y), float(z)


def _loss_factors(view: NetworkView) -> Iterator[Finding]:
    found: dict[tuple[str, float], list[str]] = {}
    for name, _, edge in view.edges:
        values = edge.get("loss_factor")
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


def _damping_ratios(view: NetworkView) -> Iterator[Finding]:
    damping = view.graph.graph.get("damping") or {}
    ratios = [damping["mode_ratios"]] if "mode_ratios" in damping else []
    ratios += [ratio for _, ratio in damping.get("two_ratios", ())]
    doubtful = sorted({float(ratio) for ratio in ratios if ratio > 1})
    if doubtful:
        meant = "; ".join(f"if {ratio:g} % is meant, write {ratio / 100:g} or {ratio:g} %" for ratio in doubtful)
        several = " and ".join(f"{ratio:g}" for ratio in doubtful)
        yield finding("doubtful-damping-ratio", f"`damping` asks for {several} times critical damping; {meant}")


def _inertias(view: NetworkView) -> Iterator[Finding]:
    reach, places = _reach(view), _places(view)
    for name in view.names:
        radii, farthest = radii_of_gyration(view.graph.nodes[name]), reach.get(name, 0.0)
        if radii is None or farthest <= 0:
            continue
        turning = [axis for axis in range(3) if "r" + "xyz"[axis] in view.directions[name]]
        if not turning:
            continue
        # Slender bodies have one small radius, so the largest decides.
        axis = max(turning, key=lambda which: radii[which])
        extent = float(np.linalg.norm(places - view.centre[name], axis=1).max())
        # A wheel is wider than its bearings are far, but hardly wider than the whole machine.
        if radii[axis] > max(_WIDEST * farthest, extent):
            size = "far larger"
        elif radii[axis] < _NARROWEST * farthest:
            size = "far smaller"
        else:
            continue
        letter = "xyz"[axis]
        moment = view.graph.nodes[name]["inertia"][axis][axis]
        yield finding(
            "doubtful-inertia",
            f"`{name}` has inertia {letter}{letter} = {moment:.4g} kg m², which makes its radius of gyration "
            f"{radii[axis]:.3g} m, {size} than the {farthest:.3g} m from its centre to its farthest connection",
            bodies=(str(name),),
        )


def _reach(view: NetworkView) -> dict[Any, float]:
    """Distance from each body's centre to its farthest connection [m]."""
    reach: dict[Any, float] = {}
    for _, ends, edge in view.edges:
        for end, point in zip(ends, _points(edge), strict=False):
            if end in view.centre and end not in view.grounds:
                distance = float(np.linalg.norm(point - view.centre[end]))
                reach[end] = max(reach.get(end, 0.0), distance)
    return reach


def _points(edge: Mapping[str, Any]) -> list[NDArray[np.float64]]:
    """Where a connection holds its first and its second end; none where it says nothing."""
    points = [edge["at"], edge["at"]] if edge.get("at") is not None else edge.get("ends")
    return [] if points is None else [np.asarray(point, dtype=np.float64) for point in points]


def _places(view: NetworkView) -> NDArray[np.float64]:
    """Centres of all bodies and points of all connections, shape (p, 3) [m]."""
    centres = [view.centre[name] for name in view.names]
    return np.array(centres + [point for _, _, edge in view.edges for point in _points(edge)])


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
