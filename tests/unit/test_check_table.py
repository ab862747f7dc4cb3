"""mdof.report.check_table and check_record: a slip of a power of ten must be seen before anything is solved."""

from __future__ import annotations

import json
import math
from pathlib import Path
from typing import Any

import mdof
from mdof.report.check_record import check_record
from mdof.report.check_table import check_text
from mdof.report.checking import check_model
from mdof.report.look import Look

MODELS = Path(mdof.__file__).parents[1] / "models"
SCHEMA = Path(mdof.__file__).parent / "schemas" / "check.json"


def text(model: mdof.Model, width: int | None = None) -> str:
    return check_text(check_model(model), Look(width=width))


def one(**connection: Any) -> mdof.Model:
    return mdof.Model(
        units="SI",
        bodies={"m": 10},
        connections={"mount": {"between": ["m", "ground"], **connection}},
    )


def test_radii_of_gyration_stand_beside_the_inertias_where_there_is_room() -> None:
    model = mdof.load(MODELS / "firewater_skid.yaml")
    for width in (None, 140):
        assert "96, 218, 188; xz 9     0.29, 0.43, 0.40\n" in text(model, width)
    at_80 = text(model, 80)
    assert "96, 218, 188; xz 9\n" in at_80
    assert "radii" not in at_80
    assert max(map(len, at_80.splitlines())) <= 80


def test_values_of_unlike_size_have_prefixes_of_their_own() -> None:
    model = mdof.load(MODELS / "floor_fan.yaml")
    assert "k x y 10 GN/m, z 16.34 MN/m and rx ry rz 10 GN m/rad; c x y 100, z 19.7 kN s/m" in text(model)


def test_what_gears_and_series_branches_are_made_of_is_shown() -> None:
    assert "c 4 kN s/m; radii 0.336, 0.105 m\n" in text(mdof.load(MODELS / "geared_train.yaml"))
    assert "1 series branch (k x 40 kN/m, c x 600 N s/m)\n" in text(mdof.load(MODELS / "one_relaxation.yaml"))


def test_a_loss_factor_names_the_frequency_of_its_own() -> None:
    assert "k x 10 kN/m; η 0.1 at 12.00 Hz\n" in text(one(stiffness=1e4, loss_factor=0.1, reference_frequency="12 Hz"))
    assert "k x 10 kN/m; η 0.1\n" in text(one(stiffness=1e4, loss_factor=0.1))


def test_the_record_holds_every_value_in_si_and_what_its_schema_requires() -> None:
    model = mdof.load(MODELS / "firewater_skid.yaml", state="three_parameter_mounts")
    results = check_record(model, check_model(model))["results"]
    schema = json.loads(SCHEMA.read_text(encoding="utf-8"))["properties"]["results"]
    assert list(results) == schema["required"] == list(schema["properties"])
    for key in ("bodies", "connection_values"):
        item = schema["properties"][key]["items"]
        assert all(set(entry) == set(item["required"]) == set(item["properties"]) for entry in results[key])
    engine = next(body for body in results["bodies"] if body["name"] == "engine")
    assert engine["inertia"] == [96.0, 218.0, 188.0]
    assert engine["products_of_inertia"] == {"xz": 9.0}
    assert math.isclose(engine["radii_of_gyration"][1], math.sqrt(218 / 1180), rel_tol=1e-12)
    assert math.isclose(results["reference_frequency_hz"], 12.0, rel_tol=1e-12)
    mount = next(entry for entry in results["connection_values"] if entry["name"] == "engine_mount_rear")
    assert mount["points"] == 2
    assert mount["stiffness"] == {"x": 7.15e5, "y": 6.5e5, "z": 1.105e6}
    assert mount["branches"] == [{"stiffness": {"z": 4.55e5}, "damping": {"z": 5172.54}}]
    assert mount["geometry"] == {}
    gear = mdof.load(MODELS / "geared_train.yaml")
    values = check_record(gear, check_model(gear))["results"]["connection_values"]
    assert next(entry["geometry"] for entry in values if entry["name"] == "mesh") == {"radii": [0.336, 0.105]}
