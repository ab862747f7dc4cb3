"""Pages of modes: the pole map, and mode shapes below it. Imports matplotlib."""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING, Any

from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure

from mdof.modes.regime import Regime
from mdof.report.shape_drawing import draw_shapes

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
    parts: Any = figure.subfigures(2, 1, height_ratios=[0.85, 0.62 * rows])
    top, bottom = parts
    _pole_maps(top, modes)
    note = "" if shown == len(modes) else f"; modes 1 to {shown} of {len(modes)}"
    if note and not rest:
        note += " (a .pdf shows all)"
    draw_shapes(bottom, model, list(modes[:shown]), min(4, shown), note)
    return figure


def shape_page(model: Model, modes: DampedModes, chosen: range) -> Figure:
    """A page of mode shapes."""
    figure = _new_figure(model)
    note = f"; modes {chosen.start + 1} to {chosen.stop} of {len(modes)}"
    parts: Any = figure.subfigures(1, 1, squeeze=False)
    draw_shapes(parts[0, 0], model, [modes[index] for index in chosen], 4, note, rows=4)
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
        low = [pole for pole in poles if abs(pole[1]) <= sizes[11] * 1.01]
        _pole_map(axes[0], low, low, "lowest modes")
        _pole_map(axes[1], poles, [pole for pole in poles if pole not in low], "all modes")
    else:
        _pole_map(axes[0], poles, poles, "")


def _upper(mode: Mode) -> Iterable[complex]:
    """The eigenvalues of a mode in the upper half plane, real ones included."""
    if mode.eigenvalues[0].imag != 0:
        return [max(mode.eigenvalues, key=lambda value: value.imag)]
    # Two equal roots are one point of the map.
    return dict.fromkeys(mode.eigenvalues)


def _pole_map(
    axes: Axes, poles: Sequence[tuple[Mode, complex]], numbered: Sequence[tuple[Mode, complex]], title: str
) -> None:
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
        axes.set_title(title, loc="left", color=_PALE, pad=12)
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
    _number_poles(axes, poles, numbered)
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


def _number_poles(axes: Axes, poles: Sequence[tuple[Mode, complex]], numbered: Sequence[tuple[Mode, complex]]) -> None:
    """Mode numbers beside their poles, where they cover neither a pole nor another number."""
    figure = axes.get_figure(root=True)
    if figure is None:
        return
    width, height = figure.get_size_inches() * 72
    (x0, x1), (y0, y1) = axes.get_xlim(), axes.get_ylim()

    def place(value: complex) -> tuple[float, float]:
        """Where a pole is, in points, by the rough size of the map on the page."""
        across, up = (value.real - x0) / (x1 - x0), (value.imag / (2 * math.pi) - y0) / (y1 - y0)
        return across * width * 0.4, up * height * 0.35

    markers = [place(value) for _, value in poles]
    taken: list[tuple[float, float]] = []
    for mode, value in numbered:
        x, y = place(value)
        for dx, dy in ((5, 3), (-5, 3), (5, -8), (-5, -8)):
            # The middle of the number.
            spot = (x + dx * 1.8, y + dy + 2.5)
            clear = all(abs(spot[0] - other) > 11 or abs(spot[1] - height_) > 7 for other, height_ in taken)
            if clear and all(abs(spot[0] - other) > 6.5 or abs(spot[1] - height_) > 5 for other, height_ in markers):
                taken.append(spot)
                axes.annotate(
                    str(mode.number),
                    (value.real, value.imag / (2 * math.pi)),
                    xytext=(dx, dy),
                    textcoords="offset points",
                    ha="left" if dx > 0 else "right",
                    fontsize=6.5,
                    annotation_clip=False,
                )
                break
