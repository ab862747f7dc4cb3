"""mdof.report.standing: the least damped mode and the model's own criteria in one line each."""

from __future__ import annotations

from pathlib import Path

import pytest

import mdof
from mdof.report.standing import criteria_line, least_damped_line

MODELS = Path(__file__).parents[2] / "models"


def solved(name: str) -> tuple[mdof.Model, mdof.DampedModes]:
    model = mdof.load(MODELS / name)
    return model, mdof.solve(mdof.assemble(model))


def test_the_least_damped_mode_of_the_skid_and_its_missed_criterion() -> None:
    model, modes = solved("firewater_skid.yaml")
    assert least_damped_line(modes) == [("least damped", "mode 6 at 3.705 Hz with 4.97 %, down to 2 % in 3.38 s")]
    assert criteria_line(modes, model.criteria) == [
        ("criteria", "at least 5.00 % below 30.00 Hz: missed by 1 of 23 modes: 6")
    ]


@pytest.mark.parametrize(
    ("name", "least", "criteria"),
    [
        ("one_unstable.yaml", [("grows", "mode 1 unstable")], "at least 5.00 %: missed by 1 of 1 mode: 1"),
        ("one_rigid_body.yaml", [], "at least 5.00 %: no mode judged"),
        ("one_overdamped.yaml", None, "at least 5.00 %: met by 1 mode"),
    ],
)
def test_what_grows_what_is_free_and_what_meets_it(
    name: str, least: list[tuple[str, str]] | None, criteria: str
) -> None:
    model, modes = solved(name)
    if least is not None:
        assert least_damped_line(modes) == least
    assert criteria_line(modes, model.criteria) == [("criteria", criteria)]
    assert criteria_line(modes, None) == []
