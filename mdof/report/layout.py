"""Text in lines: styled paragraphs, columns, and wrapping to a width."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass, field

from rich.cells import cell_len

__all__ = ["Grid", "Paragraph", "fold", "pad", "styled"]

_CODES = {"bold": "1", "dim": "2", "red": "31", "green": "32", "yellow": "33", "cyan": "36"}
#: Signs that steer a terminal; a name from a foreign file must not.
_CONTROL = re.compile(r"[\x00-\x09\x0b-\x1f\x7f-\x9f]")
#: Blanks between a number and its unit, and within a unit, where no line should end.
_BEFORE_UNIT = re.compile(
    r"(?<=\d) (?=(?:%|Hz|rpm|rad/s|1/s|s|kg|m|[kMG]?N)(?![\w])(?!/(?!m\b|rad\b)))"
    r"|(?<=N) (?=[ms]\b)|(?<=N m) (?=s\b)|(?<=kg) (?=m²)"
)
#: Signs after which a long word may be broken.
_JOINTS = " \xa0_/-"
_BLANKS = " \xa0"
_LEAST = 8


@dataclass(slots=True)
class Paragraph:
    """Spans of text, each with a style such as ``bold red``, in lines as long as there is room.

    Attributes
    ----------
    indent : blanks before every line.
    wrap : whether a line that is too long is broken.
    """

    spans: list[tuple[str, str]] = field(default_factory=list)
    indent: int = 0
    wrap: bool = True

    def append(self, text: str, style: str = "") -> Paragraph:
        """Add a span; returns the paragraph."""
        self.spans.append((_CONTROL.sub("\ufffd", text), style))
        return self

    @property
    def width(self) -> int:
        """Columns of the terminal that it takes unbroken."""
        return self.indent + max(map(cell_len, "".join(text for text, _ in self.spans).split("\n")))

    def lines(self, width: int | None, colour: bool) -> list[str]:
        """Lines for this width (None: any), with colours as escape sequences where wanted."""
        whole = "".join(text for text, _ in self.spans)
        room = None if width is None or not self.wrap else max(width - self.indent, 1)
        margin = " " * self.indent
        pieces = _pieces(_BEFORE_UNIT.sub("\xa0", whole), room, " ")
        if not colour:
            return [margin + whole[start:stop] for start, stop in pieces]
        return [margin + self._coloured(start, stop) for start, stop in pieces]

    def _coloured(self, start: int, stop: int) -> str:
        parts = []
        at = 0
        for text, style in self.spans:
            part = text[max(start - at, 0) : max(stop - at, 0)]
            at += len(text)
            codes = ";".join(_CODES[word] for word in style.split())
            parts.append(f"\x1b[{codes}m{part}\x1b[0m" if codes and part else part)
        return "".join(parts)


@dataclass(slots=True)
class Grid:
    """Rows of cells set apart by blanks; the last column is wrapped where room is short."""

    rows: list[Sequence[Paragraph]] = field(default_factory=list)
    gap: int = 2

    def add(self, *cells: str | Paragraph) -> None:
        """Add a row."""
        self.rows.append([styled(cell) if isinstance(cell, str) else cell for cell in cells])

    @property
    def width(self) -> int:
        """Columns of the terminal that it takes unbroken."""
        widths = self._widths()
        return sum(widths) + self.gap * (len(widths) - 1)

    def _widths(self) -> list[int]:
        return [max(cell.width for cell in column) for column in zip(*self.rows, strict=True)]

    def lines(self, width: int | None, colour: bool) -> list[str]:
        """Lines for this width (None: any), with colours as escape sequences where wanted."""
        widths = self._widths()
        before = sum(widths[:-1]) + self.gap * (len(widths) - 1)
        room = None if width is None else max(width - before, _LEAST)
        result = []
        for *cells, last in self.rows:
            start = ""
            for cell, wide in zip(cells, widths, strict=False):
                visible = cell_len(cell.lines(None, False)[0])
                start += cell.lines(None, colour)[0] + " " * (wide - visible + self.gap)
            first, *more = last.lines(room, colour)
            result += [(start + first).rstrip(), *(" " * before + line for line in more)]
        return result


def styled(text: str, style: str = "", indent: int = 0) -> Paragraph:
    """A paragraph of one style."""
    return Paragraph(indent=indent).append(text, style)


def pad(text: str, width: int) -> str:
    """``text`` filled with blanks to so many terminal columns; wide letters count two."""
    return text + " " * (width - cell_len(text))


def fold(text: str, width: int) -> list[str]:
    """``text`` in lines of at most so many terminal columns, broken after a blank or one of ``_ / -`` if possible."""
    return [text[start:stop] for start, stop in _pieces(text, width, _JOINTS)]


def _pieces(text: str, width: int | None, joints: str) -> list[tuple[int, int]]:
    """Where the lines of ``text`` start and stop: at a joint if possible, then inside a word at one of ``_ / -``."""
    result = []
    start = 0
    for part in text.split("\n"):
        end = start + len(part)
        while width is not None and cell_len(text[start:end]) > width:
            stop = start + 1
            while cell_len(text[start : stop + 1]) <= width:
                stop += 1
            stop = _last(text, start, stop, joints) or _last(text, start, stop, _JOINTS) or stop
            result.append((start, start + len(text[start:stop].rstrip(_BLANKS))))
            start = end - len(text[stop:end].lstrip(_BLANKS))
        result.append((start, start + len(text[start:end].rstrip(_BLANKS))))
        start = end + 1
    return result


def _last(text: str, start: int, stop: int, joints: str) -> int:
    """The last place up to ``stop`` that is before a blank or after one of ``joints``; 0 if there is none."""
    return max((at for at in range(start + 1, stop + 1) if text[at] == " " or text[at - 1] in joints), default=0)
