"""Tables: numbers as shown, every width without loss, findings in order."""

from __future__ import annotations

import math
import re
from io import StringIO
from pathlib import Path

import networkx as nx
import pytest
from rich.cells import cell_len

import mdof
from mdof.findings import finding
from mdof.modes.mode import DampedModes
from mdof.report.check_table import check_text
from mdof.report.checking import check_model
from mdof.report.layout import fold
from mdof.report.leaders import dissipates_most, kinetic_by_body, moves_most
from mdof.report.look import Look, aligned, number, percent
from mdof.report.records import csv_line, json_line
from mdof.report.screening import screen
from mdof.report.tables import cautions, findings_block, mode_table

MODELS = Path(__file__).parents[2] / "models"


@pytest.fixture(scope="module")
def modes() -> DampedModes:
    """A chain of three with a family of two dampers, one body named in wide letters and brackets."""
    graph = nx.MultiGraph(title="chain", directions=("x",))
    graph.add_node("ground", kind="ground")
    names = ("base", "[red]pump[/red]", "発電機")
    for name in names:
        graph.add_node(name, mass=10.0)
    below = "ground"
    for name in names:
        graph.add_edge(name, below, key=f"spring_{name[:2]}", between=(name, below), stiffness=4000.0)
        below = name
    for point in ("a", "b"):
        graph.add_edge("base", "ground", key=f"pot/{point}", between=("base", "ground"), damping=15.0)
    return mdof.solve(mdof.assemble(graph))


def table(modes: DampedModes, look: Look) -> str:
    return mode_table(modes, modes.system.coordinate_bodies, modes.system.coordinate_directions, look)


@pytest.mark.parametrize(
    ("value", "digits", "shown"),
    [
        (None, 4, "–"),
        (math.nan, 4, "–"),
        (0.0, 4, "0"),
        (2.38512, 4, "2.385"),
        (9.99996, 4, "10.00"),
        (1213.4, 4, "1213"),
        (0.05, 3, "0.0500"),
        (-5.0, 3, "-5.00"),
        (1.2345e-7, 3, "1.23e-7"),
        (4.0e9, 4, "4.000e9"),
    ],
)
def test_numbers_keep_their_significant_digits(value: float | None, digits: int, shown: str) -> None:
    assert number(value, digits) == shown


def test_a_limit_of_decimals_keeps_columns_narrow() -> None:
    shown = [number(value, 3, 3) for value in (0.0149, 0.5904, 12.34, 100.0, 0.00113, 1e8)]
    assert shown == ["0.015", "0.590", "12.3", "100", "1.1e-3", "1.0e8"]


def test_undefined_is_a_dash_and_never_zero() -> None:
    assert percent(None) == "–"
    assert percent(0.0) == "0 %"


def test_decimal_points_of_a_column_stand_below_each_other() -> None:
    column = aligned([2.385, 12.04, 1213.0, None, 0.0])
    assert column == ["   2.385", "  12.04 ", "1213    ", "   –    ", "   0    "]


def test_a_power_of_ten_does_not_widen_the_other_numbers() -> None:
    assert aligned([0.59, 12.3, 0.00113], 3, 3) == [" 0.590", "12.3  ", "1.1e-3"]


def test_folding_loses_nothing_and_keeps_the_width() -> None:
    text = "engine_mount_rear_発電機_and_a_very_long_name_without_end"
    lines = fold(text, 9)
    assert "".join(lines) == text
    assert max(map(cell_len, lines)) <= 9


@pytest.mark.parametrize("width", [30, 50, 72, 80, 104, 150, 200, None])
def test_every_width_fits_and_shows_every_mode(modes: DampedModes, width: int | None) -> None:
    text = table(modes, Look(width=width))
    assert width is None or max(map(cell_len, text.splitlines())) <= width
    for mode in modes:
        assert mode.natural_frequency is not None
        assert number(mode.natural_frequency / (2 * math.pi)) in text
        assert number(100 * (mode.damping_ratio or 0), 3, 3) in text or percent(mode.damping_ratio) in text
    assert "発電機" in text.replace("\n", "")
    assert "\x1b" not in text


def test_shares_go_before_names_are_broken(modes: DampedModes) -> None:
    roomy, tight = table(modes, Look(width=100)), table(modes, Look(width=76))
    assert [line.count("%") for line in roomy.splitlines()[2:]] == [2, 2, 2]
    assert [line.count("%") for line in tight.splitlines()[2:]] == [1, 1, 1]
    assert re.search(r"moves +damps$", tight.splitlines()[0])
    assert "100 % pot ×2" in tight


@pytest.mark.parametrize("width", [50, 80, 120, None])
@pytest.mark.parametrize(
    ("stiffness", "damping", "told"), [(0.0, 6.0, "rigid body 0.600 1/s"), (-10.0, 0.0, "divergent 1.00 1/s")]
)
def test_a_mode_without_frequency_tells_its_rate(
    stiffness: float, damping: float, told: str, width: int | None
) -> None:
    graph = nx.MultiGraph(directions=("x",))
    graph.add_node("ground", kind="ground")
    graph.add_node("trolley", mass=10.0)
    graph.add_edge("trolley", "ground", key="rail", between=("trolley", "ground"), stiffness=stiffness, damping=damping)
    assert told in table(mdof.solve(mdof.assemble(graph)), Look(width=width))


def test_names_are_never_read_as_markup(modes: DampedModes) -> None:
    assert "[red]pump[/red]" in table(modes, Look())


def test_colour_only_where_asked(modes: DampedModes) -> None:
    assert "\x1b[" in table(modes, Look(width=100, colour=True))


class _Terminal(StringIO):
    def isatty(self) -> bool:
        return True


@pytest.mark.parametrize(
    ("terminal", "environment", "width", "colour"),
    [
        (False, {}, None, False),
        (False, {"COLUMNS": "50"}, 50, False),
        (True, {}, 80, True),
        (True, {"COLUMNS": "160", "NO_COLOR": "1"}, 160, False),
        (True, {"NO_COLOR": ""}, 80, True),
        (True, {"TERM": "dumb"}, 80, False),
        (True, {"COLUMNS": "0"}, 80, True),
        (True, {"COLUMNS": "rubbish"}, 80, True),
    ],
)
def test_the_look_of_a_stream(terminal: bool, environment: dict[str, str], width: int | None, colour: bool) -> None:
    look = Look.of(_Terminal() if terminal else StringIO(), environment)
    assert (look.width, look.colour) == (width, colour)


def test_points_of_one_connection_count_together(modes: DampedModes) -> None:
    leader = dissipates_most(modes[0])
    assert leader is not None
    assert leader.name == "pot ×2"
    assert leader.share == pytest.approx(1.0)
    mover = moves_most(modes[0], modes.system.coordinate_bodies, modes.system.coordinate_directions)
    assert (mover.name, mover.body, mover.direction) == ("発電機", "発電機", "x")  # one direction needs no naming
    shares = kinetic_by_body(modes[0], modes.system.coordinate_bodies)
    assert shares is not None
    assert sum(shares.values()) == pytest.approx(1.0)
    assert shares[mover.body] == mover.share == max(shares.values())


def test_findings_come_serious_first_with_advice() -> None:
    found = [
        finding("massless-body", "note text"),
        finding("non-proportional-damping", "warning text", modes=(2, 3, 4, 9)),
        finding("unstable-mode", "serious text", modes=(8,)),
    ]
    text = findings_block(found, Look(width=60))
    assert text.index("serious text") < text.index("warning text") < text.index("note text")
    assert "modes 2-4, 9" in text
    assert text.count("→") == 3
    assert max(map(len, text.splitlines())) <= 60


def test_the_cautions_name_the_engineer() -> None:
    assert "qualified engineer" in cautions(Look())


def test_csv_quotes_and_json_refuses_nan() -> None:
    assert csv_line(['a "b", c', None, 0.1, 3]) == b'"a ""b"", c",,0.1,3\r\n'
    assert json_line({"name": "発電機"}) == '{"name": "発電機"}\n'.encode()
    with pytest.raises(ValueError, match="JSON"):
        json_line({"bad": math.nan})


def check(name: str, width: int | None) -> str:
    return check_text(check_model(mdof.load(MODELS / name)), Look(width=width))


def test_a_narrow_check_breaks_no_number() -> None:
    wide, narrow = check("firewater_skid.yaml", 100), check("firewater_skid.yaml", 50)
    assert "frame_aft  1285.0       -0.950       0.000       0.190" in wide
    assert "frame_aft\n    1285.0 kg at -0.950, 0.000, 0.190 m; inertia\n    250, 390, 560 kg m²\n" in narrow
    assert max(map(cell_len, narrow.splitlines())) <= 50


def test_a_check_shows_every_value_with_its_unit() -> None:
    wide, narrow = check("firewater_skid.yaml", 120), check("firewater_skid.yaml", 60)
    assert "pot_aft ×2             frame_aft – deck       c x y 4.1, z 6.2 kN s/m\n" in wide
    assert "k x 4, y 2.2, z 2.6 GN/m and rx 3.6, ry 55, rz 48 MN m/rad; η 0.02\n" in wide
    assert "pot_aft ×2, frame_aft – deck\n    c x y 4.1, z 6.2 kN s/m\n" in narrow
    assert "mesh             wheel – pinion       k 600 MN/m; c 4 kN s/m" in check("geared_train.yaml", 100)
    assert "k x 20 kN/m; 1 series branch" in check("one_relaxation.yaml", 100)


def test_a_train_shows_inertias_and_that_it_turns_freely() -> None:
    text = check("geared_train.yaml", 80)
    assert "body        inertia kg m²\nmotor               9.600\n" in text
    assert "all 4" not in text
    assert "no body by itself, but bodies together" in text
    assert "every body is tied" in check("two_mass.yaml", 80)


def test_screening_judges_only_what_it_should(modes: DampedModes) -> None:
    least = min(mode.damping_ratio or 0.0 for mode in modes)
    assert screen(modes, least).passed
    assert screen(modes, least * (1 + 1e-12)).passed  # rounding is no failure
    assert not screen(modes, least * 1.001).passed
    first = modes[0].natural_frequency or 0.0
    nothing = screen(modes, 1.0, below=first)
    assert (nothing.judged, nothing.passed, nothing.lowest) == (0, None, first)
    assert screen(modes, 1.0, below=first * 1.001).judged == 1
    with pytest.raises(mdof.UsageError):
        screen(modes, -0.1)


def test_growing_modes_fail_at_any_limit_and_frequency() -> None:
    graph = nx.MultiGraph(directions=("x",))
    graph.add_node("ground", kind="ground")
    graph.add_node("block", mass=1.0)
    graph.add_edge("block", "ground", key="spring", between=("block", "ground"), stiffness=100.0, damping=-0.2)
    result = screen(mdof.solve(mdof.assemble(graph)), 0.0, below=1e-3)
    assert [mode.number for mode in result.failing] == [1]
