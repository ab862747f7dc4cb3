"""``mdof modes --certify``: table, JSON, statuses."""

from __future__ import annotations

import dataclasses
import json
from pathlib import Path
from typing import Any

import pytest

import mdof
import mdof.certify
from mdof.cli.app import run
from mdof.report.checking import solve_model

MODELS = Path(__file__).parents[2] / "models"
TWO = str(MODELS / "two_mass.yaml")
Captured = pytest.CaptureFixture[str]


def wrong(model: Any) -> mdof.DampedModes:
    """What a solver with a fault would say: the first damping ratio a millionth too large."""
    modes = solve_model(model)
    ratios = modes.damping_ratios.copy()
    ratios[0] *= 1 + 1e-6
    return dataclasses.replace(modes, damping_ratios=ratios)


def test_the_table_of_proofs_follows_the_mode_table(capfd: Captured) -> None:
    assert run(["modes", TWO, "--certify"]) == 0
    lines = capfd.readouterr().out.splitlines()
    assert lines[-1] == "2 of 2 modes proven at 128 bits"
    assert lines[-2].split()[-2:] == ["underdamped", "proven"]
    assert any(line.startswith("verified") for line in lines)


def test_without_the_option_nothing_is_proven(capfd: Captured) -> None:
    assert run(["modes", TWO]) == 0
    assert "proven" not in capfd.readouterr().out


def test_json_has_a_proof_object_and_csv_a_line_on_standard_error(capfd: Captured) -> None:
    assert run(["modes", TWO, "--certify", "--format", "json"]) == 0
    proof = json.loads(capfd.readouterr().out)["proof"]
    assert (proof["proven"], proof["contradicted"], proof["undecided"]) == (2, 0, 0)
    assert [mode["verdict"] for mode in proof["modes"]] == ["proven", "proven"]
    assert run(["modes", TWO, "--certify", "--format", "csv"]) == 0
    captured = capfd.readouterr()
    assert "2 of 2 modes proven at 128 bits" in captured.err
    assert "proven" not in captured.out


def test_a_contradicted_mode_is_status_3_and_not_archived(
    capfd: Captured, monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    monkeypatch.setattr("mdof.report.checking.solve_model", wrong)
    words = ["modes", TWO, "--certify", "--archive", str(tmp_path / "runs"), "--figure", str(tmp_path / "a.svg")]
    assert run(words) == 3
    captured = capfd.readouterr()
    assert "1 of 2 modes proven at 128 bits, 1 contradicted" in captured.out
    assert "damping ratio" in captured.err
    assert "neither archived nor drawn" in captured.err
    assert not list(tmp_path.rglob("*.h5"))
    assert not (tmp_path / "a.svg").exists()


def test_without_python_flint_it_is_wrong_usage(capfd: Captured, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("mdof.certify.find_spec", lambda _: None)
    assert run(["modes", TWO, "--certify"]) == 2
    captured = capfd.readouterr()
    assert captured.out == ""
    assert "pip install python-flint" in captured.err


@pytest.mark.parametrize("path", sorted(MODELS.glob("*.yaml")), ids=lambda path: path.stem)
def test_every_mode_of_every_model_in_every_state_is_proven(path: Path) -> None:
    model = mdof.load(path)
    for state in (None, *model.state_names):
        modes = mdof.solve(mdof.assemble(model.with_state(state) if state else model))
        assert mdof.certify.certify(modes).number(mdof.certify.Verdict.PROVEN) == len(modes)
