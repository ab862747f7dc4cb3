"""mdof.description.plausibility: numbers that can be read but hardly meant."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest

import mdof
from mdof.description.network import network_findings

MODELS = Path(__file__).parents[2] / "models"
SPACE = ["x", "y", "z", "rx", "ry", "rz"]


def machine(**changes: Any) -> mdof.Model:
    body = {"mass": 100, "centre": [0, 0, 0.5], "inertia": [10, 12, 14], **changes.pop("body", {})}
    mount = {
        "between": ["machine", "ground"],
        "at": {"a": [0.5, 0.4, 0], "b": [-0.5, 0.4, 0], "c": [0, -0.4, 0]},
        "stiffness": {"x": 1e5, "y": 1e5, "z": 2e5},
        **changes,
    }
    body = {key: value for key, value in body.items() if value is not None}
    return mdof.Model(units="SI", directions=SPACE, bodies={"machine": body}, connections={"mount": mount})


def said(model: mdof.Model) -> dict[str, str]:
    return {finding.code: finding.message for finding in network_findings(mdof.network(model))}


def test_a_plausible_machine_raises_no_alarm() -> None:
    assert said(machine(loss_factor=0.9)) == {}


@pytest.mark.parametrize("value", [8, 1.5, {"x": 0.1, "z": 8}])
def test_a_loss_factor_above_one_is_doubted_and_says_how_to_write_per_cent(value: Any) -> None:
    message = said(machine(loss_factor=value))["doubtful-loss-factor"]
    largest = max(value.values()) if isinstance(value, dict) else value
    assert f"`mount` has a loss factor of {largest:g}" in message
    assert f"write {largest / 100:g} or {largest:g} %" in message


@pytest.mark.parametrize(("factor", "size"), [(1000.0, "far larger"), (1e-4, "far smaller")])
def test_an_inertia_off_by_powers_of_ten_is_doubted(factor: float, size: str) -> None:
    message = said(machine(body={"inertia": [10 * factor, 12 * factor, 14 * factor]}))["doubtful-inertia"]
    assert f"inertia zz = {14 * factor:.4g} kg m²" in message
    assert size in message


def test_a_wheel_wider_than_its_bearings_is_no_alarm_where_the_machine_is_larger() -> None:
    wheel = {"mass": 100, "centre": [0, 0, 1], "inertia": [32, 16, 16]}
    bearing = {"between": ["wheel", "frame"], "at": {"a": [0.1, 0, 1], "b": [-0.1, 0, 1]}, "stiffness": {"z": 1e6}}
    model = mdof.Model(
        units="SI",
        directions=SPACE,
        bodies={"wheel": wheel, "frame": {"mass": 300, "centre": [0, 0, 0], "inertia": [90, 90, 90]}},
        connections={
            "bearing": bearing,
            "foot": {"between": ["frame", "ground"], "at": [0.8, 0, 0], "stiffness": {"z": 1e5}},
        },
    )
    assert "doubtful-inertia" not in said(model)


def test_a_slender_pipe_is_no_alarm_about_its_own_axis() -> None:
    assert "doubtful-inertia" not in said(machine(body={"inertia": [1e-4, 12, 12]}))


@pytest.mark.parametrize(
    ("damping", "ratio", "meant"),
    [
        ({"mode_ratios": 2}, "2 times critical", "write 0.02 or 2 %"),
        ({"two_ratios": {"4 Hz": 0.02, "30 Hz": 3}}, "3 times critical", "write 0.03 or 3 %"),
    ],
)
def test_a_damping_ratio_above_one_is_doubted(damping: Any, ratio: str, meant: str) -> None:
    model = mdof.Model(
        units="SI",
        bodies={"m": 10},
        connections={"k": {"between": ["m", "ground"], "stiffness": 1e4}},
        damping=damping,
    )
    message = said(model)["doubtful-damping-ratio"]
    assert ratio in message
    assert meant in message


def test_an_inertia_is_not_doubted_where_nothing_tells_the_size_of_the_body() -> None:
    model = mdof.Model(
        units="SI",
        directions=SPACE,
        bodies={"machine": {"mass": 100, "centre": [0, 0, 0.5], "inertia": [1e5, 1e5, 1e5]}},
        connections={"mount": {"between": ["machine", "ground"], "stiffness": dict.fromkeys(SPACE, 1e5)}},
    )
    assert "doubtful-inertia" not in said(model)


def test_a_centre_that_nobody_gave_is_told_where_it_matters() -> None:
    assert "for `machine`: the origin" in said(machine(body={"centre": None}))["centre-at-origin"]
    straight = mdof.Model(
        units="SI",
        directions=["z"],
        bodies={"machine": 100},
        connections={"mount": {"between": ["machine", "ground"], "at": [1, 0, 0], "stiffness": 1e5}},
    )
    assert "centre-at-origin" not in said(straight)


def test_no_demo_model_is_doubted() -> None:
    for path in MODELS.glob("*.yaml"):
        model = mdof.load(path)
        for state in (None, *model.states):
            codes = said(mdof.load(path, state=state))
            assert not any(code.startswith(("doubtful", "centre")) for code in codes)
