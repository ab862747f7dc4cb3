"""Pages of the manual for a terminal: paragraphs, lists and tables are fitted to its width, code is left alone."""

from __future__ import annotations

import re
from collections.abc import Iterator
from itertools import groupby

from mdof.report.layout import Grid, Paragraph, styled
from mdof.report.look import Look

__all__ = ["page_text"]


def page_text(markdown: str, look: Look) -> str:
    """A page as it is written where there is no width to fit it to, else laid out anew.

    Parameters
    ----------
    markdown : headings, paragraphs, lists of one level, tables, indented and fenced code.
    """
    return markdown if look.width is None else look.render(*_parts(markdown))


def _parts(markdown: str) -> Iterator[Paragraph | Grid]:
    fenced = False
    kinds: list[tuple[str, str]] = []
    for line in markdown.splitlines():
        fence = line.startswith("```")
        kinds.append(("code" if fenced or fence else _kind(line, kinds[-1][0] if kinds else ""), line))
        fenced ^= fence
    for kind, group in groupby(kinds, key=lambda item: item[0]):
        lines = [line for _, line in group]
        if kind == "text":
            yield styled(" ".join(line.strip() for line in lines))
        elif kind == "list":
            items = Grid(gap=1)
            for item in re.split(r"\n(?=- )", "\n".join(lines)):
                items.add("-", " ".join(item[2:].split()))
            yield items
        elif kind == "table":
            table = Grid()
            for number, line in enumerate(lines):
                if number != 1:  # the rule below the heading
                    cells = [cell.strip() for cell in line.strip().strip("|").split(" | ")]
                    table.add(*[styled(cell, "bold" if number == 0 else "") for cell in cells])
            yield table
        else:
            style = "bold" if kind == "heading" else ""
            yield from (Paragraph(wrap=kind != "code").append(line, style) for line in lines)


def _kind(line: str, before: str) -> str:
    if not line:
        return "blank"
    if line.startswith("#"):
        return "heading"
    if line.startswith("|"):
        return "table"
    if line.startswith("- ") or (before == "list" and line.startswith("  ")):
        return "list"
    return "code" if line.startswith("    ") else "text"
