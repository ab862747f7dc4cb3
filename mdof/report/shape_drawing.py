"""How mode shapes are drawn: chains and trains as stems, bodies in space by their outlines. Imports matplotlib."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from matplotlib.collections import LineCollection, PolyCollection

import mdof
from mdof.modes.regime import Regime
from mdof.report.look import frequency, percent

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from mdof.description.schema import Model
    from mdof.modes.mode import Mode

__all__ = ["draw_shapes"]

_INK, _PALE, _BLUE, _ORANGE = "#222222", "#9a9a9a", "#0072b2", "#e69f00"
_ORDER = ("x", "y", "z", "rx", "ry", "rz")
#: The largest motion drawn, as a part of the size of the machine.
_SWING = 0.13

Vector = np.ndarray[Any, np.dtype[np.float64]]


def draw_shapes(
    figure: Any, model: Model, modes: Sequence[Mode], across: int, note: str, rows: int | None = None
) -> None:
    """Fill a figure with mode shapes, so many across."""
    down = rows or math.ceil(len(modes) / across)
    axes = figure.subplots(down, across, squeeze=False).ravel()
    system = modes[0].system
    skeleton = _skeleton(model, system.coordinate_bodies)
    spatial = not skeleton.flat and bool({"x", "y", "z"} & set(system.coordinate_directions))
    for place, mode in zip(axes, modes, strict=False):
        if spatial:
            _drawing(place, mode, skeleton)
        else:
            _stems(place, mode)
        title = str(mode.number)
        if mode.natural_frequency is not None:
            title += f"   {frequency(mode.natural_frequency)}"
        if mode.damping_ratio is not None:
            title += f"   {percent(mode.damping_ratio)}"
        if mode.regime is not Regime.UNDERDAMPED:
            title += f"   {mode.regime}"
        place.set_title(title, loc="left")
    for place in axes[len(modes) :]:
        place.set_axis_off()
    how = (
        "outlines of bodies; grey: at rest, blue: moved by the real part, orange: path of the centre, "
        "triangles: ties to the ground"
        if spatial
        else "real part; hollow: imaginary part"
    )
    figure.suptitle(f"Mode shapes{note}: {how}", x=0.01, ha="left", fontsize=8.5, color="#555555")


def _stems(axes: Axes, mode: Mode) -> None:
    """One stem a coordinate, for chains and trains."""
    labels = list(mode.system.coordinate_bodies)
    if len(set(mode.system.coordinate_directions)) > 1:
        labels = [f"{body} {way}" for body, way in zip(labels, mode.system.coordinate_directions, strict=True)]
    places = np.arange(len(labels))
    real, imaginary = mode.shape.real, mode.shape.imag
    axes.vlines(places, 0, real, color=_BLUE, linewidth=1.6)
    axes.plot(places, real, "o", color=_BLUE, markersize=4.5)
    axes.plot(places, imaginary, "o", color=_INK, markerfacecolor="white", markersize=3.2, markeredgewidth=0.7)
    axes.axhline(0, color=_INK, linewidth=0.7)
    axes.set(xlim=(-0.6, len(labels) - 0.4), ylim=(-1.12, 1.12), yticks=[-1, 0, 1])
    axes.spines["bottom"].set_visible(False)
    step = max(1, math.ceil(len(labels) / 12))
    axes.set_xticks(places[::step])
    long = max(map(len, labels)) * len(labels[::step]) > 34
    axes.set_xticklabels(labels[::step], rotation=60 if long else 0, ha="right" if long else "center", parse_math=False)
    axes.tick_params(axis="x", length=0)


@dataclass(frozen=True, kw_only=True)
class _Skeleton:
    """Bodies in space.

    Attributes
    ----------
    centres : body to its centre [m].
    arms : body to the points where something is connected to it, shape (n, 3) [m].
    ties : points of the connections to grounds, shape (n, 3) [m].
    """

    centres: dict[str, Vector]
    arms: dict[str, Vector]
    ties: Vector

    @property
    def points(self) -> Vector:
        return np.vstack([*self.centres.values(), *self.arms.values()])

    @property
    def flat(self) -> bool:
        """True where nothing has a place, as in a chain of one direction."""
        return bool((self.points == self.points[0]).all())


def _skeleton(model: Model, bodies: Sequence[str]) -> _Skeleton:
    graph = mdof.network(model)
    centres = {body: np.asarray(graph.nodes[body].get("centre", np.zeros(3)), float) for body in dict.fromkeys(bodies)}
    arms: dict[str, list[Vector]] = {body: [] for body in centres}
    ties: list[Vector] = []
    for _, _, edge in graph.edges(data=True):
        between = edge["between"]
        at = edge.get("at")
        if at is None:
            at = next((centres[name] for name in between if name in centres), np.zeros(3))
        for name, point in zip(between, edge.get("ends") or (at, at), strict=True):
            if name in arms:
                arms[name].append(np.asarray(point, float))
            elif graph.nodes[name].get("kind") == "ground":
                ties.append(np.asarray(point, float))
    return _Skeleton(
        centres=centres,
        arms={body: np.unique(np.reshape(points, (-1, 3)), axis=0) for body, points in arms.items()},
        ties=np.unique(np.reshape(ties, (-1, 3)), axis=0),
    )


def _moved(points: Vector, centre: Vector, move: Vector) -> Vector:
    """Displacement of points of a body that shifts and turns a little."""
    return move[:3] + np.cross(move[3:], points - centre)


def _outline(points: Vector) -> list[int]:
    """Which points of a plane make up its convex outline, in order (Andrew's monotone chain)."""
    order = sorted(range(len(points)), key=lambda index: tuple(points[index]))
    result: list[int] = []
    for half in (order, order[::-1]):
        chain: list[int] = []
        for index in half:
            while len(chain) > 1 and _turn(points[chain[-2]], points[chain[-1]], points[index]) <= 0:
                chain.pop()
            chain.append(index)
        result += chain[:-1]
    return result or order


def _turn(a: Vector, b: Vector, c: Vector) -> float:
    return float((b[0] - a[0]) * (c[1] - a[1]) - (b[1] - a[1]) * (c[0] - a[0]))


def _drawing(axes: Axes, mode: Mode, skeleton: _Skeleton) -> None:
    """Three views of the bodies: at rest, and moved by the real part of the shape."""
    centres, arms = skeleton.centres, skeleton.arms
    moves = {body: np.zeros(6) for body in centres}
    for body, way, value in zip(
        mode.system.coordinate_bodies, mode.system.coordinate_directions, mode.shape, strict=True
    ):
        moves[body][_ORDER.index(way)] = value.real
    shifts = {body: _moved(np.vstack([centres[body], arms[body]]), centres[body], moves[body]) for body in centres}
    points = skeleton.points
    low, high = points.min(axis=0), points.max(axis=0)
    size = float(np.linalg.norm(high - low)) or 1.0
    swings = {body: float(np.linalg.norm(shift, axis=1).max()) for body, shift in shifts.items()}
    largest = max(swings.values())
    scale = _SWING * size / largest if largest > 0 else 0.0
    gap, margin = 1.5 * _SWING * size, 1.0 * _SWING * size
    # Offsets that put the top view below the side view and the end view to the right of it.
    views = (
        ("side", 0, 2, (0.0, 0.0)),
        ("top", 0, 1, (0.0, low[2] - high[1] - gap)),
        ("end", 1, 2, (high[0] - low[1] + gap, 0.0)),
    )
    leaders = [body for body in sorted(swings, key=lambda body: -swings[body])[:2] if swings[body] > 0.4 * largest]
    # A leader is named in the view that shows most of its motion.
    best = {
        body: max(((a, b) for _, a, b, _ in views), key=lambda pair: float(np.linalg.norm(shifts[body][:, list(pair)])))
        for body in leaders
    }
    for name, first, second, offset in views:
        corner = (low[first] + offset[0] - margin, high[second] + offset[1] + 0.7 * margin)
        axes.annotate(name, corner, fontsize=6, color=_PALE, ha="left", va="center", style="italic")
        axes.plot(*(skeleton.ties[:, [first, second]] + offset).T, "^", color=_INK, markersize=2.6, zorder=1)
        still, moved, paths = [], [], []
        for body, centre in centres.items():
            rest = np.vstack([centre, arms[body]])[:, [first, second]] + offset
            away = rest + scale * shifts[body][:, [first, second]]
            outline = _outline(rest)
            still.append(rest[outline])
            moved.append(away[outline])
            paths.append((rest[0], away[0]))
            axes.plot(*rest[0], ".", color=_PALE, markersize=2.5)
            axes.plot(*away[0], "o", color=_BLUE, markersize=2.8, zorder=3)
            if best.get(body) == (first, second):
                axes.annotate(
                    body,
                    away[0],
                    xytext=(3, 4) if body == leaders[0] else (3, -9),
                    textcoords="offset points",
                    fontsize=6,
                    color=_INK,
                    parse_math=False,
                    bbox={"facecolor": "white", "edgecolor": "none", "alpha": 0.7, "pad": 0.3},
                    zorder=4,
                )
        axes.add_collection(PolyCollection(still, facecolors="none", edgecolors=_PALE, linewidths=0.5))
        axes.add_collection(LineCollection(paths, colors=_ORANGE, linewidths=0.9))
        axes.add_collection(PolyCollection(moved, facecolors=_BLUE + "14", edgecolors=_BLUE, linewidths=0.9, zorder=2))
    axes.set_aspect("equal")
    axes.set_xlim(low[0] - margin, high[0] + gap + (high[1] - low[1]) + margin)
    axes.set_ylim(low[2] - gap - (high[1] - low[1]) - margin, high[2] + margin)
    axes.set_axis_off()
