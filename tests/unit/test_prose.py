"""Pages of the manual on a terminal: fitted to its width, code untouched, no word lost."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

import mdof
from mdof.report.look import Look
from mdof.report.prose import page_text

PAGES = sorted((Path(mdof.__file__).parent / "manual").glob("*.md"))

PAGE = """\
# Title: a page

    mdof modes MODEL... --archive FOLDER

One paragraph that goes
on over two lines.

- first item
  goes on
- second

| status | meaning |
|---|---|
| 0 | done |
| 130 | interrupted by the user |

```yaml
a: {b: 1}   # a comment that is longer than the width

- not a list
```
"""


def test_every_part_is_laid_out_in_its_own_way() -> None:
    assert page_text(PAGE, Look(width=30)).splitlines() == [
        "# Title: a page",
        "",
        "    mdof modes MODEL... --archive FOLDER",
        "",
        "One paragraph that goes on",
        "over two lines.",
        "",
        "- first item goes on",
        "- second",
        "",
        "status  meaning",
        "0       done",
        "130     interrupted by the",
        "        user",
        "",
        "```yaml",
        "a: {b: 1}   # a comment that is longer than the width",
        "",
        "- not a list",
        "```",
    ]


def test_a_pipe_gets_the_page_as_it_is_written() -> None:
    assert page_text(PAGE, Look()) == PAGE


@pytest.mark.parametrize("page", PAGES, ids=lambda page: page.stem)
@pytest.mark.parametrize("width", [50, 80, 200])
def test_pages_keep_their_words(page: Path, width: int) -> None:
    written = page.read_text(encoding="utf-8")

    def words(text: str) -> list[str]:
        return re.sub(r"^\|[-|]+$|[\s|]", "", text, flags=re.MULTILINE).split()

    assert words(page_text(written, Look(width=width))) == words(written)
