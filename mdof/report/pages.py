"""How the pictures of modes are drawn. Imports matplotlib; only mdof.report.figures imports this."""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING, Any

import numpy as np
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.collections import LineCollection
from matplotlib.figure import Figure

import mdof
from mdof.modes.regime import Regime
from mdof.report.look import frequency, percent

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from mdof.description.schema import Model
    from mdof.modes.mode import DampedModes, Mode

__all__ = ["STYLE", "first_page", "shape_page"]

STYLE: Any = {
    "font.size": 8.0,
    "font.family": "sans-serif",
    "axes.titlesize": 8.5,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.linewidth": 0.7,
    "svg.hashsalt": "mdof",
    "pdf.fonttype": 42,
}
# Blue, orange and their like from a palette that colour-blind readers tell apart; the marker tells the same in grey.
_INK, _PALE, _BLUE, _ORANGE, _GREEN, _RED = "#222222", "#9a9a9a", "#0072b2", "#e69f00", "#009e73", "#d55e00"
_MARKS: dict[Regime, tuple[str, str, bool]] = {
    Regime.UNDERDAMPED: ("o", _BLUE, True),
    Regime.UNDAMPED: ("o", _BLUE, False),
    Regime.CRITICALLY_DAMPED: ("D", _GREEN, True),
    Regime.OVERDAMPED: ("s", _ORANGE, True),
    Regime.RELAXATION: ("v", _PALE, True),
    Regime.RIGID_BODY: ("x", _INK, True),
    Regime.UNSTABLE: ("^", _RED, True),
    Regime.DIVERGENT: (">", _RED, False),
}
_RATIOS = (0.01, 0.02, 0.05, 0.1, 0.2, 0.4, 0.7)


def first_page(model: Model, modes: DampedModes, panels: int, *, rest: bool) -> Figure:
    """Pole map above, the lowest mode shapes below.

    Parameters
    ----------
    rest : the other shapes follow on more pages.
    """
    figure = _new_figure(model)
    shown = min(panels, len(modes))
    rows = math.ceil(shown / 4)
    parts: Any = figure.subfigures(2, 1, height_ratios=[1.0, 0.62 * rows])
    top, bottom = parts
    _pole_maps(top, modes)
    note = "" if shown == len(modes) else f"; modes 1 to {shown} of {len(modes)}"
    if note and not rest:
        note += " (a .pdf shows all)"
    _shapes(bottom, model, list(modes[:shown]), min(4, shown), note)
    return figure


def shape_page(model: Model, modes: DampedModes, chosen: range) -> Figure:
    """A page of mode shapes."""
    figure = _new_figure(model)
    note = f"; modes {chosen.start + 1} to {chosen.stop} of {len(modes)}"
    parts: Any = figure.subfigures(1, 1, squeeze=False)
    _shapes(parts[0, 0], model, [modes[index] for index in chosen], 4, note, rows=4)
    return figure


def _new_figure(model: Model) -> Figure:
    figure = Figure(figsize=(11.7, 8.3), layout="constrained")
    FigureCanvasAgg(figure)
    name = f"{model.title}: {model.state}" if model.state else model.title
    figure.suptitle(name, x=0.01, ha="left", fontsize=11, parse_math=False)
    return figure


def _pole_maps(figure: Any, modes: DampedModes) -> None:
    """The upper half of the s-plane; beside it its lowest part where the frequencies spread widely."""
    poles = [(mode, value) for mode in modes for value in _upper(mode)]
    sizes = sorted(abs(value) for _, value in poles if value.imag > 0)
    # Twelve modes fill a map without crowding it.
    zoom = len(sizes) > 12 and sizes[-1] > 3 * sizes[11]
    axes = figure.subplots(1, 2 if zoom else 1, squeeze=False)[0]
    if zoom:
        _pole_map(axes[0], [pole for pole in poles if abs(pole[1]) <= sizes[11] * 1.01], "lowest modes")
        _pole_map(axes[1], poles, "all modes")
    else:
        _pole_map(axes[0], poles, "")


def _upper(mode: Mode) -> Iterable[complex]:
    """The eigenvalues of a mode in the upper half plane, real ones included."""
    values = mode.eigenvalues
    if len(values) == 2 and values[0].imag != 0:
        return [max(values, key=lambda value: value.imag)]
    return values


def _pole_map(axes: Axes, poles: Sequence[tuple[Mode, complex]], title: str) -> None:
    heights = [value.imag / (2 * math.pi) for _, value in poles]
    reals = [value.real for _, value in poles]
    top = 1.12 * max(heights, default=0.0) or 1.0
    left, right = min(0.0, *reals, 0.0), max(0.0, *reals, 0.0)
    span = (right - left) or 1.0
    left, right = left - 0.10 * span, right + 0.08 * span
    axes.set(xlim=(left, right), ylim=(-0.06 * top, top))
    axes.set_xlabel("real part of the eigenvalue, 1/s (decay to the left)")
    axes.set_ylabel("damped frequency, Hz")
    if title:
        axes.set_title(title, loc="left", color=_PALE)
    if max(reals, default=0.0) > 0:
        axes.axvspan(0, right, color=_RED, alpha=0.08, linewidth=0)
        axes.annotate("grows", (right, top), xytext=(-4, -8), textcoords="offset points", ha="right", color=_RED)
    axes.axvline(0, color=_INK, linewidth=0.8)
    axes.axhline(0, color=_INK, linewidth=0.8)
    if max(heights, default=0.0) > 0:
        last = 0.0
        for ratio in _RATIOS:
            last = _ratio_line(axes, ratio, left, top, last)
    seen: dict[Regime, None] = {}
    for mode, value in poles:
        marker, colour, filled = _MARKS[mode.regime]
        label = None if mode.regime in seen else str(mode.regime)
        seen[mode.regime] = None
        axes.plot(
            [value.real],
            [value.imag / (2 * math.pi)],
            marker,
            color=colour,
            markerfacecolor=colour if filled else "white",
            markeredgecolor=colour if marker == "x" else _INK,
            markeredgewidth=1.4 if marker == "x" else 0.6,
            markersize=6,
            linestyle="none",
            label=label,
            clip_on=False,
            zorder=3,
        )
    _number_poles(axes, poles)
    axes.legend(loc="upper left", bbox_to_anchor=(1.0, 1.0), frameon=False, handletextpad=0.2, borderaxespad=0.3)


def _ratio_line(axes: Axes, ratio: float, left: float, top: float, last: float) -> float:
    """The line of one damping ratio from the origin to the edge, with its value there unless ``last`` is too near."""
    slope = math.sqrt(1 - ratio**2) / ratio / (2 * math.pi)
    height = min(top, -left * slope)
    at = -height / slope
    axes.plot([0, at], [0, height], color=_PALE, linewidth=0.6, linestyle=(0, (4, 3)), zorder=1)
    on_side = height < top
    # Places along the edge, from the top right corner to the left and down.
    place = 1 - height / top + 1 if on_side else at / left
    if place - last < 0.055:
        return last
    axes.annotate(
        f"{100 * ratio:g} %",
        (at, height),
        xytext=(3, -1) if on_side else (0, 1),
        textcoords="offset points",
        ha="left" if on_side else "center",
        va="bottom",
        color="#6a6a6a",
        fontsize=6.5,
        annotation_clip=False,
    )
    return place


def _number_poles(axes: Axes, poles: Sequence[tuple[Mode, complex]]) -> None:
    """Mode numbers beside their poles, where one does not cover another."""
    figure = axes.get_figure(root=True)
    if figure is None:
        return
    width, height = figure.get_size_inches() * 72
    (x0, x1), (y0, y1) = axes.get_xlim(), axes.get_ylim()
    taken: list[tuple[float, float]] = []
    for mode, value in poles:
        y = value.imag / (2 * math.pi)
        # Positions in points, by the rough size of the map on the page.
        place = ((value.real - x0) / (x1 - x0) * width * 0.4, (y - y0) / (y1 - y0) * height * 0.35)
        for dx, dy in ((5, 3), (-5, 3), (5, -8), (-5, -8)):
            spot = (place[0] + dx * 1.6, place[1] + dy)
            if all(abs(spot[0] - x) > 11 or abs(spot[1] - y_) > 7 for x, y_ in taken):
                taken.append(spot)
                axes.annotate(
                    str(mode.number),
                    (value.real, y),
                    xytext=(dx, dy),
                    textcoords="offset points",
                    ha="left" if dx > 0 else "right",
                    fontsize=6.5,
                    annotation_clip=False,
                )
                break


def _shapes(figure: Any, model: Model, modes: Sequence[Mode], across: int, note: str, rows: int | None = None) -> None:
    down = rows or math.ceil(len(modes) / across)
    axes = figure.subplots(down, across, squeeze=False).ravel()
    system = modes[0].system
    centres = _centres(model, system.coordinate_bodies)
    spatial = len({tuple(centre) for centre in centres.values()}) > 1 and {"x", "y", "z"} & set(
        system.coordinate_directions
    )
    for place, mode in zip(axes, modes, strict=False):
        if spatial:
            _drawing(place, mode, centres)
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
        "side, end and top view; grey: at rest, blue: moved by the real part"
        if spatial
        else "real part; hollow: imaginary part"
    )
    figure.suptitle(f"Mode shapes: {how}{note}", x=0.01, ha="left", fontsize=8.5, color="#555555")


def _centres(model: Model, bodies: Sequence[str]) -> dict[str, np.ndarray[Any, Any]]:
    graph = mdof.network(model)
    return {body: np.asarray(graph.nodes[body].get("centre", np.zeros(3)), float) for body in dict.fromkeys(bodies)}


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


def _drawing(axes: Axes, mode: Mode, centres: dict[str, np.ndarray[Any, Any]]) -> None:
    """Three views of the bodies at their centres: at rest, and moved and turned by the real part of the shape."""
    moves = {body: np.zeros(6) for body in centres}
    order = ("x", "y", "z", "rx", "ry", "rz")
    for body, way, value in zip(
        mode.system.coordinate_bodies, mode.system.coordinate_directions, mode.shape, strict=True
    ):
        moves[body][order.index(way)] = value.real
    points = np.array(list(centres.values()))
    low, high = points.min(axis=0), points.max(axis=0)
    size = float(np.linalg.norm(high - low)) or 1.0
    shift = max(float(np.linalg.norm(move[:3])) for move in moves.values())
    turn = max(float(np.abs(move[3:]).max()) for move in moves.values())
    # One scale for shifts and turns keeps a rocking body true; neither may leave the picture.
    scale = min(0.16 * size / shift if shift > 0 else math.inf, 0.7 / turn if turn > 0 else math.inf)
    arm, gap = 0.055 * size, 0.24 * size
    # Offsets that put the top view below the side view and the end view to the right of it.
    views = (
        (0, 2, 4, (0.0, 0.0)),
        (0, 1, 5, (0.0, low[2] - high[1] - gap)),
        (1, 2, 3, (high[0] - low[1] + gap, 0.0)),
    )
    leaders = sorted(centres, key=lambda body: -float(np.linalg.norm(moves[body][:3])))[:2]
    # A leader is named in the view that shows most of its motion.
    best = {
        body: max(((a, b) for a, b, *_ in views), key=lambda pair: float(np.hypot(*moves[body][list(pair)])))
        for body in leaders
    }
    for (first, second, spin, offset), name in zip(views, ("side", "top", "end"), strict=True):
        corner = (low[first] + offset[0] - arm, high[second] + offset[1] + 1.6 * arm)
        axes.annotate(name, corner, fontsize=6, color=_PALE, ha="right", va="center", style="italic")
        still, moved, paths = [], [], []
        for body, centre in centres.items():
            move = moves[body] * scale
            start = np.array([centre[first], centre[second]]) + offset
            stop = start + np.array([move[first], move[second]])
            # A turn about y carries x towards -z; about z and x it carries the first axis towards the second.
            angle = -move[spin] if spin == 4 else move[spin]
            still += _cross(start, arm, 0.0)
            moved += _cross(stop, arm, angle)
            paths.append([start, stop])
            if best.get(body) == (first, second):
                axes.annotate(
                    body,
                    stop,
                    xytext=(3, 4),
                    textcoords="offset points",
                    fontsize=6,
                    color=_INK,
                    parse_math=False,
                    zorder=4,
                )
        axes.add_collection(LineCollection(still, colors=_PALE, linewidths=0.6))
        axes.add_collection(LineCollection(paths, colors=_ORANGE, linewidths=0.9))
        axes.add_collection(LineCollection(moved, colors=_BLUE, linewidths=1.3))
    axes.set_aspect("equal")
    margin = 0.2 * size
    axes.set_xlim(low[0] - margin, high[0] + gap + (high[1] - low[1]) + margin)
    axes.set_ylim(low[2] - gap - (high[1] - low[1]) - margin, high[2] + margin)
    axes.set_axis_off()


def _cross(at: np.ndarray[Any, Any], arm: float, angle: float) -> list[list[np.ndarray[Any, Any]]]:
    along = np.array([math.cos(angle), math.sin(angle)]) * arm
    across = np.array([-along[1], along[0]]) * 0.55
    return [[at - along, at + along], [at - across, at + across]]
