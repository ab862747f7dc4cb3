"""Text in lines: wrapping, indents, columns, styles, and signs that must not reach a terminal."""

from __future__ import annotations

import re

import pytest
from rich.cells import cell_len

from mdof.report.layout import Grid, Paragraph, fold, pad, styled

TEXT = "the shortcut says 32.3 % at 11.82 Hz for panel_mount (fwd_outer, aft_outer) and for 発電機 on its four mounts"


@pytest.mark.parametrize("width", range(8, 60, 3))
def test_wrapping_loses_no_word_and_keeps_the_width(width: int) -> None:
    lines = styled(TEXT, indent=2).lines(width, False)
    assert max(map(cell_len, lines)) <= width
    assert all(line.startswith("  ") for line in lines)
    assert "".join(lines).replace(" ", "") == TEXT.replace(" ", "")
    assert not any(line.endswith(" ") for line in lines)


@pytest.mark.parametrize("width", range(12, 60))
def test_no_line_ends_between_a_number_and_its_unit(width: int) -> None:
    lines = styled(TEXT).lines(width, False)
    assert not any(re.search(r"\d$", line) for line in lines)
    assert "\xa0" not in "".join(lines)


def test_a_pipe_gets_long_lines() -> None:
    assert styled(TEXT, indent=4).lines(None, False) == ["    " + TEXT]
    assert Paragraph(wrap=False).append(TEXT).lines(10, False) == [TEXT]


def test_a_word_without_end_is_broken_at_a_joint() -> None:
    assert styled("20261201T111705Z-two-mass-no-damper-67a2a5b1.h5").lines(45, False) == [
        "20261201T111705Z-two-mass-no-damper-",
        "67a2a5b1.h5",
    ]
    assert styled("x" * 12).lines(5, False) == ["xxxxx", "xxxxx", "xx"]
    assert fold("engine_mount_rear ×2", 12) == ["engine_", "mount_rear", "×2"]


def test_styles_follow_their_words_over_line_ends() -> None:
    text = styled("warning", "bold yellow").append(" of modes").append(" 13 and 14", "dim")
    assert text.lines(15, False) == ["warning of", "modes 13 and 14"]
    assert text.lines(15, True) == [
        "\x1b[1;33mwarning\x1b[0m of",
        "modes\x1b[2m 13 and 14\x1b[0m",
    ]


def test_signs_that_steer_a_terminal_are_replaced() -> None:
    (line,) = styled("a\x1b[31mb\x07c\x9bd\re").lines(80, True)
    assert line == "a\ufffd[31mb\ufffdc\ufffdd\ufffde"


def test_a_line_end_in_a_name_starts_a_line() -> None:
    assert styled("pump\nroom", indent=1).lines(80, False) == [" pump", " room"]
    assert styled("").lines(80, False) == [""]


def test_the_last_column_of_a_grid_is_wrapped_and_hangs() -> None:
    grid = Grid()
    grid.add(styled("solved by", "dim"), "dense, energy-balanced state matrix")
    grid.add("発電機", "x")
    assert grid.width == 11 + 35
    assert grid.lines(None, False) == ["solved by  dense, energy-balanced state matrix", "発電機     x"]
    assert grid.lines(32, False) == [
        "solved by  dense,",
        "           energy-balanced state",
        "           matrix",
        "発電機     x",
    ]
    assert [re.sub(r"\x1b\[\d*m", "", line) for line in grid.lines(32, True)] == grid.lines(32, False)


def test_blanks_at_the_end_of_a_cell_keep_their_room() -> None:
    grid = Grid()
    for amount in ("1285.0 ", " 890.00"):
        grid.add(styled(amount, "bold"), "x")
    assert grid.lines(None, False) == ["1285.0   x", " 890.00  x"]


def test_wide_letters_are_padded_by_columns() -> None:
    assert cell_len(pad("発電機", 9)) == 9


def test_no_line_ends_within_a_number_and_its_unit() -> None:
    text = styled("values of 48 MN m/rad and 4.1 kN s/m and 3 kg m² at 30 Hz")
    for width in range(12, 50):
        lines = text.lines(width, colour=False)
        for whole in ("48\xa0MN\xa0m/rad", "4.1\xa0kN\xa0s/m", "3\xa0kg\xa0m²", "30\xa0Hz"):
            assert any(whole.replace("\xa0", " ") in line.replace("\xa0", " ") for line in lines), (width, lines)
