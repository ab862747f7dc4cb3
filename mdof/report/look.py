"""How results look where they are shown: width, colour, and numbers as an engineer reads them."""

from __future__ import annotations

import math
import os
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from io import StringIO
from typing import Any, TextIO

from rich.cells import cell_len
from rich.console import Console, RenderableType
from rich.table import Table
from rich.text import Text

__all__ = [
    "DASH",
    "Look",
    "aligned",
    "columns",
    "fold",
    "frequency",
    "grid",
    "number",
    "pad",
    "percent",
    "plural",
    "styled",
]

#: What an undefined number is shown as.
DASH = "–"
_NARROWEST = 30
_UNLIMITED = 100_000


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

    def render(self, *parts: RenderableType) -> str:
        """Parts one below the other as text for this place, without blanks at line ends."""
        stream = StringIO()
        console = Console(
            file=stream,
            width=self.width or _UNLIMITED,
            color_system="standard" if self.colour else None,
            force_terminal=self.colour,
            legacy_windows=False,
            markup=False,
            emoji=False,
            highlight=False,
            soft_wrap=False,
        )
        for part in parts:
            console.print(part)
        return "".join(f"{line.rstrip()}\n" for line in stream.getvalue().split("\n")[:-1])


def grid(gap: int = 2) -> Table:
    """A table without lines or colours; columns are set apart by blanks."""
    return Table(box=None, show_header=False, pad_edge=False, padding=(0, gap, 0, 0), collapse_padding=True)


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


def styled(text: str, style: str = "") -> Text:
    """A text that is never read as markup, because names may hold brackets."""
    return Text(text, style=style, overflow="fold")


def columns(table: Table, cells: Sequence[Any]) -> None:
    """Add one row of texts and rich cells."""
    table.add_row(*[cell if isinstance(cell, Text) else styled(cell) for cell in cells])


def pad(text: str, width: int) -> str:
    """``text`` filled with blanks to so many terminal columns; wide letters count two."""
    return text + " " * (width - cell_len(text))


def fold(text: str, width: int) -> list[str]:
    """``text`` in lines of at most so many terminal columns, broken after a blank or one of ``_ / -`` if possible."""
    lines = []
    while cell_len(text) > width:
        end = 1
        while end < len(text) and cell_len(text[: end + 1]) <= width:
            end += 1
        good = [index for index in range(1, end + 1) if text[index - 1] in " _/-" or text[index : index + 1] == " "]
        end = good[-1] if good else end
        lines.append(text[:end].rstrip())
        text = text[end:].lstrip(" ")
    return [*lines, text]
