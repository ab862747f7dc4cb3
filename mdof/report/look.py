"""How results look where they are shown: width, colour, and numbers as an engineer reads them."""

from __future__ import annotations

import math
import os
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, TextIO

if TYPE_CHECKING:
    from mdof.report.layout import Grid, Paragraph

__all__ = ["DASH", "Look", "aligned", "frequency", "number", "percent", "plural"]

#: What an undefined number is shown as.
DASH = "–"
_NARROWEST = 30


@dataclass(frozen=True, kw_only=True, slots=True)
class Look:
    """What the place of output can show.

    Attributes
    ----------
    width : columns of the terminal; None for a pipe or file, where nothing is wrapped.
    colour : whether colours and weights may be used.
    """

    width: int | None = None
    colour: bool = False

    @classmethod
    def of(cls, stream: TextIO, environment: Mapping[str, str] | None = None) -> Look:
        """The look of a stream: ``COLUMNS`` wins over the terminal's own width, ``NO_COLOR`` turns colours off."""
        variables = os.environ if environment is None else environment
        terminal = stream.isatty()
        width: int | None = None
        if terminal:
            try:
                width = os.get_terminal_size(stream.fileno()).columns or 80
            except (OSError, ValueError):
                width = 80
        stated = variables.get("COLUMNS", "")
        if stated.isdigit() and int(stated) > 0:
            width = int(stated)
        # The old Windows console shows escape sequences as rubbish; newer ones announce themselves.
        capable = variables.get("TERM") != "dumb" and (os.name != "nt" or bool(variables.get("WT_SESSION")))
        forced = bool(variables.get("FORCE_COLOR"))
        colour = not variables.get("NO_COLOR") and ((terminal and capable) or forced)
        return cls(width=None if width is None else max(width, _NARROWEST), colour=colour)

    def render(self, *parts: Paragraph | Grid) -> str:
        """Parts one below the other as text for this place."""
        return "".join(f"{line}\n" for part in parts for line in part.lines(self.width, self.colour))


def number(value: float | None, digits: int = 4, decimals: int = 99) -> str:
    """``value`` with so many significant digits; an en dash where it is undefined.

    ``decimals`` is the most of them from 0.01 upwards, where more would only widen a column; what is smaller is then
    written with a power of ten.
    """
    if value is None or not math.isfinite(value):
        return DASH
    if value == 0:
        return "0"
    text = f"{value:.{digits - 1}e}"
    exponent = int(text.split("e")[1])
    if not (-3 if decimals > digits else -2) <= exponent < 7:
        if decimals <= digits:
            text = f"{value:.1e}"
        return text.replace("e-0", "e-").replace("e+0", "e").replace("e+", "e")
    return f"{value:.{min(max(0, digits - 1 - exponent), decimals)}f}"


def percent(ratio: float | None, digits: int = 3) -> str:
    """A ratio in per cent with so many significant digits."""
    return DASH if ratio is None else f"{number(100 * ratio, digits)} %"


def frequency(value: float | None, digits: int = 4) -> str:
    """An angular frequency [rad/s] in hertz."""
    return DASH if value is None else f"{number(value / (2 * math.pi), digits)} Hz"


def aligned(values: Iterable[float | None], digits: int = 4, decimals: int = 99) -> list[str]:
    """Numbers of one column, padded so that their decimal points stand below each other."""
    texts = [number(value, digits, decimals) for value in values]
    parts = [(text, "") if "e" in text else text.partition(".")[::2] for text in texts]
    left = max((len(head) for head, _ in parts if "e" not in head), default=0)
    right = max((len(tail) + 1 for _, tail in parts if tail), default=0)
    # A power of ten may reach into the room of the decimals.
    rows = []
    for head, tail in parts:
        if "e" in head:
            rows.append(head)
        else:
            rows.append(f"{head:>{left}}" + (f".{tail}" if tail else "").ljust(right))
    width = max((len(row) for row in rows), default=0)
    return [f"{row:>{width}}" for row in rows]


def plural(count: int, word: str, words: str | None = None) -> str:
    """``1 body``, ``3 bodies``."""
    return f"{count:,} {word if count == 1 else words or word + 's'}".replace(",", " ")
