"""Figures: whole files of the kind asked for, for every regime and odd names, without touching global settings."""

from __future__ import annotations

import os
from pathlib import Path
from xml.etree import ElementTree

import matplotlib
import pytest

import mdof
from mdof.errors import OutputError, UsageError
from mdof.report.figures import check_figure, draw_modes

MODELS = Path(__file__).parents[2] / "models"


def solved(name: str) -> tuple[mdof.Model, mdof.DampedModes]:
    model = mdof.load(MODELS / name)
    return model, mdof.solve(mdof.assemble(model))


@pytest.mark.parametrize("name", [*sorted(path.name for path in MODELS.glob("one_*.yaml")), "geared_train.yaml"])
def test_every_regime_is_drawn(tmp_path: Path, name: str) -> None:
    case = solved(name)
    path = tmp_path / "figure.svg"
    draw_modes(path, [case])
    root = ElementTree.parse(path).getroot()
    assert root.tag.endswith("svg")
    assert os.listdir(tmp_path) == ["figure.svg"]


@pytest.mark.parametrize(("ending", "start"), [("png", b"\x89PNG"), ("pdf", b"%PDF"), ("PDF", b"%PDF")])
def test_the_ending_chooses_the_kind(tmp_path: Path, ending: str, start: bytes) -> None:
    path = tmp_path / f"figure.{ending}"
    draw_modes(path, [solved("floor_fan.yaml")])
    assert path.read_bytes().startswith(start)


def test_a_pdf_holds_pages_for_all_modes_and_models(tmp_path: Path) -> None:
    path = tmp_path / "figure.pdf"
    fan = solved("floor_fan.yaml")
    draw_modes(path, [fan, solved("two_mass.yaml")])
    # 18 modes: 8 on the first page, 10 on the second; the two masses need one page.
    assert path.read_bytes().count(b"/Type /Page ") == 3


def test_drawing_changes_no_global_setting_and_repeats_exactly(tmp_path: Path) -> None:
    before = dict(matplotlib.rcParams)
    case = solved("two_mass.yaml")
    for name in ("a.svg", "b.svg"):
        draw_modes(tmp_path / name, [case])
    assert dict(matplotlib.rcParams) == before
    assert (tmp_path / "a.svg").read_bytes() == (tmp_path / "b.svg").read_bytes()


def test_names_are_text_and_never_formulas(tmp_path: Path) -> None:
    model = mdof.Model(
        title="cost $5_a$ 発",
        units="SI",
        bodies={"$x^{": 1.0, "発": 1.0},
        connections={
            "s": {"between": ["$x^{", "ground"], "stiffness": 9.0},
            "t": {"between": ["発", "$x^{"], "stiffness": 9.0, "damping": 0.1},
        },
    )
    draw_modes(tmp_path / "figure.png", [(model, mdof.solve(mdof.assemble(model)))])


def test_an_existing_figure_survives_a_failure(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    path = tmp_path / "figure.png"
    path.write_bytes(b"old")

    def full(_source: object, _target: object) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr("mdof.report.figures.os.replace", full)
    with pytest.raises(OutputError, match="No space left"):
        draw_modes(path, [solved("two_mass.yaml")])
    assert os.listdir(tmp_path) == ["figure.png"]
    assert path.read_bytes() == b"old"


def test_what_cannot_be_drawn_is_refused_before_computing(tmp_path: Path) -> None:
    with pytest.raises(UsageError, match=r"\.svg, \.png or \.pdf"):
        check_figure(tmp_path / "figure.jpg")
    with pytest.raises(UsageError, match=r"\.pdf for pages"):
        check_figure(tmp_path / "figure.svg", several=True)
    check_figure(tmp_path / "figure.pdf", several=True)
    with pytest.raises(OutputError, match="no folder"):
        check_figure(tmp_path / "nowhere" / "figure.png")
    (tmp_path / "folder.png").mkdir()
    with pytest.raises(OutputError, match="is a folder"):
        check_figure(tmp_path / "folder.png")
    assert os.listdir(tmp_path) == ["folder.png"]
