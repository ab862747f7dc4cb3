"""How mode shapes are drawn: chains and trains as stems, bodies in space by their outlines. Imports matplotlib."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from matplotlib.collections import LineCollection
from matplotlib.lines import Line2D
from matplotlib.patches import Patch, Polygon

import mdof
from mdof.modes.regime import Regime
from mdof.report.leaders import moves_most
from mdof.report.look import frequency, percent

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from mdof.description.schema import Model
    from mdof.modes.mode import Mode

__all__ = ["draw_shapes"]

_INK, _PALE, _BLUE = "#222222", "#9a9a9a", "#0072b2"
#: Colours of bodies, in file order, that colour-blind readers tell apart (M. Okabe and K. Ito, 2008).
_COLOURS = (_BLUE, "#d55e00", "#009e73", "#cc79a7", "#e69f00", "#56b4e9", "#7a5230", "#555555")
_ORDER = ("x", "y", "z", "rx", "ry", "rz")
#: The largest motion drawn, as a part of the size of the machine.
_SWING = 0.12
#: Views by name, the coordinate to the right and the one upwards.
_VIEWS = (("side", 0, 2), ("top", 0, 1), ("end", 1, 2))
#: How much more of the motion a later view must show to be taken.
_CLEARLY = 1.05

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
        mover = moves_most(mode, system.coordinate_bodies, system.coordinate_directions)
        remark = f"moves most: {mover}"
        if spatial:
            name, right, up = _drawing(place, mode, skeleton)
            remark += f"; {name} view ({_ORDER[right]} right, {_ORDER[up]} up)"
        else:
            _stems(place, mode)
        place.set_title(_title(mode), loc="left", pad=13)
        place.annotate(
            remark,
            (0, 1),
            xytext=(0, 4),
            xycoords="axes fraction",
            textcoords="offset points",
            fontsize=6.5,
            color="#555555",
            parse_math=False,
            annotation_clip=False,
        )
    for place in axes[len(modes) :]:
        place.set_axis_off()
    how = "real part; hollow: imaginary part"
    if spatial:
        how = "each in the view that shows most of it; grey: at rest, coloured: moved by the real part"
        _legend(figure, skeleton)
    figure.suptitle(f"Mode shapes{note}: {how}", x=0.01, ha="left", fontsize=8.5, color="#555555")


def _title(mode: Mode) -> str:
    title = str(mode.number)
    if mode.natural_frequency is not None:
        title += f"   {frequency(mode.natural_frequency)}"
    if mode.damping_ratio is not None:
        title += f"   {percent(mode.damping_ratio)}"
    if mode.regime is not Regime.UNDERDAMPED:
        title += f"   {mode.regime}"
    return title


def _legend(figure: Any, skeleton: _Skeleton) -> None:
    """Bodies by colour, mounts and ground; of very many bodies the titles name the one that counts."""
    bodies = list(skeleton.centres)
    entries: list[Any] = []
    if len(bodies) <= len(_COLOURS):
        entries = [
            Patch(facecolor=colour + "33", edgecolor=colour, label=_literal(body))
            for body, colour in zip(bodies, _COLOURS, strict=False)
        ]
    entries.append(Line2D([], [], color=_INK, marker="s", markersize=2.6, linewidth=1.2, label="connection, stretched"))
    if skeleton.grounded:
        entries.append(Line2D([], [], color=_INK, marker="^", markersize=4, linestyle="none", label="ground"))
    figure.legend(
        handles=entries, loc="outside lower left", ncols=len(entries), frameon=False, fontsize=7, columnspacing=1.4
    )


def _literal(name: str) -> str:
    """A name whose dollar signs start no formula, and that a legend does not leave out for its underscore."""
    return "\u200b" * name.startswith("_") + name.replace("$", r"\$")


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
    """Bodies in space, and what joins them.

    Attributes
    ----------
    centres : body to its centre [m].
    arms : body to the points where something is connected to it, shape (n, 3) [m].
    links : of every connection its two ends, each a body (None: ground) and a point [m].
    """

    centres: dict[str, Vector]
    arms: dict[str, Vector]
    links: list[list[tuple[str | None, Vector]]]

    @property
    def points(self) -> Vector:
        return np.vstack([*self.centres.values(), *self.arms.values()])

    @property
    def flat(self) -> bool:
        """True where nothing has a place, as in a chain of one direction."""
        return bool((self.points == self.points[0]).all())

    @property
    def grounded(self) -> bool:
        return any(body is None for link in self.links for body, _ in link)


def _skeleton(model: Model, bodies: Sequence[str]) -> _Skeleton:
    graph = mdof.network(model)
    centres = {body: np.asarray(graph.nodes[body].get("centre", np.zeros(3)), float) for body in dict.fromkeys(bodies)}
    arms: dict[str, list[Vector]] = {body: [] for body in centres}
    links: list[list[tuple[str | None, Vector]]] = []
    for _, _, edge in graph.edges(data=True):
        between = edge["between"]
        at = edge.get("at")
        if at is None:
            at = next((centres[name] for name in between if name in centres), np.zeros(3))
        link: list[tuple[str | None, Vector]] = []
        for name, point in zip(between, edge.get("ends") or (at, at), strict=True):
            place = np.asarray(point, float)
            if name in arms:
                arms[name].append(place)
                link.append((name, place))
            elif graph.nodes[name].get("kind") == "ground":
                link.append((None, place))
        if len(link) == 2:
            links.append(link)
    return _Skeleton(
        centres=centres,
        arms={body: np.unique(np.reshape(points, (-1, 3)), axis=0) for body, points in arms.items()},
        links=links,
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


def _view(shifts: Sequence[Vector]) -> tuple[str, int, int]:
    """The view that shows most of the motion; the side view where there is little to choose."""
    amounts = [sum(float(np.mean(shift[:, pair] ** 2)) for shift in shifts) for _, *pair in _VIEWS]
    best = 0
    for index, amount in enumerate(amounts):
        if amount > _CLEARLY * amounts[best]:
            best = index
    return _VIEWS[best]


def _drawing(axes: Axes, mode: Mode, skeleton: _Skeleton) -> tuple[str, int, int]:
    """The bodies at rest and moved by the real part of the shape, in the view that is returned."""
    centres = skeleton.centres
    moves = {body: np.zeros(6) for body in centres}
    for body, way, value in zip(
        mode.system.coordinate_bodies, mode.system.coordinate_directions, mode.shape, strict=True
    ):
        moves[body][_ORDER.index(way)] = value.real
    corners = {body: np.vstack([centres[body], skeleton.arms[body]]) for body in centres}
    shifts = {body: _moved(corners[body], centres[body], moves[body]) for body in centres}
    view = _view(list(shifts.values()))
    pair = list(view[1:])
    low, high = skeleton.points.min(axis=0), skeleton.points.max(axis=0)
    size = float(np.linalg.norm(high - low)) or 1.0
    largest = max(float(np.linalg.norm(shift, axis=1).max()) for shift in shifts.values())
    scale = _SWING * size / largest if largest > 0 else 0.0

    few = len(centres) <= len(_COLOURS)
    for index, body in enumerate(centres):
        colour = _COLOURS[index] if few else _BLUE
        rest = corners[body][:, pair]
        away = rest + scale * shifts[body][:, pair]
        axes.add_patch(Polygon(rest[_outline(rest)], fill=False, edgecolor=_PALE, linewidth=0.6, zorder=1))
        # Points that hide one another at rest may part when the body turns, so the moved outline is its own.
        axes.add_patch(
            Polygon(away[_outline(away)], facecolor=colour + "22", edgecolor=colour, linewidth=1.0, zorder=2)
        )
        axes.plot(*rest[0], ".", color=_PALE, markersize=3, zorder=1)
        axes.plot(*away[0], "o", color=colour, markersize=3.2, zorder=3)

    stretched: list[list[Vector]] = []
    joints: list[Vector] = []
    grounds: list[Vector] = []
    for link in skeleton.links:
        ends = [
            point[pair] + (0.0 if body is None else scale * _moved(point, centres[body], moves[body])[pair])
            for body, point in link
        ]
        stretched.append(ends)
        for (holder, _), end in zip(link, ends, strict=True):
            (grounds if holder is None else joints).append(end)
    axes.add_collection(LineCollection(stretched, colors=_INK, linewidths=1.2, zorder=4))
    for points, marker, room in ((joints, "s", 1.8), (grounds, "^", 4.0)):
        axes.plot(*np.reshape(points, (-1, 2)).T, marker, color=_INK, markersize=room, linestyle="none", zorder=4)

    margin = 1.1 * _SWING * size
    axes.set_aspect("equal", adjustable="datalim")
    axes.set_xlim(low[pair[0]] - margin, high[pair[0]] + margin)
    axes.set_ylim(low[pair[1]] - margin, high[pair[1]] + margin)
    axes.set_axis_off()
    return view
