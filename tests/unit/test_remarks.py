"""mdof.modes.remarks and mdof.findings: what is worth saying about modes."""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np
import pytest

import mdof
from mdof.findings import REGISTRY, Severity, finding

ROOT = Path(mdof.__file__).parent


def codes(modes: mdof.DampedModes) -> set[str]:
    return {entry.code for entry in modes.findings}


def test_every_code_that_is_used_is_registered_and_every_registered_one_is_used() -> None:
    used = {
        code
        for path in ROOT.rglob("*.py")
        if path.name != "findings.py"
        for code in re.findall(r'"([a-z]+(?:-[a-z]+)+)"', path.read_text(encoding="utf-8"))
        if code in REGISTRY
    }
    assert used == set(REGISTRY)
    with pytest.raises(KeyError):
        finding("no-such-code", "nothing")


def test_every_kind_of_finding_says_what_it_means_and_what_to_do() -> None:
    for code, kind in REGISTRY.items():
        assert kind.meaning.endswith("."), code
        assert kind.advice.endswith("."), code
        assert kind.severity in Severity


def test_a_free_motion_is_named_with_its_rate() -> None:
    modes = mdof.solve(mdof.System.from_matrices(np.diag([2.0]), np.diag([1.0]), np.zeros((1, 1)), ["trolley.x"]))
    (entry,) = [entry for entry in modes.findings if entry.code == "free-motion"]
    assert "trolley.x" in entry.message
    assert "0.5 1/s" in entry.message


def test_two_bodies_held_together_by_a_dashpot_only() -> None:
    model = mdof.Model(
        bodies={"a": "1 kg", "b": "2 kg"}, connections={"pot": {"between": ["a", "b"], "damping": "3 N*s/m"}}
    )
    modes = mdof.solve(mdof.assemble(model))
    (entry,) = [entry for entry in modes.findings if entry.code == "held-by-damper-only"]
    assert entry.connections == ("pot",)


def test_damping_outside_the_fitted_band_is_reported() -> None:
    model = mdof.Model(
        bodies={"a": "1 kg", "b": "1 kg"},
        connections={
            "s": {"between": ["a", "ground"], "stiffness": "1 kN/m"},
            "t": {"between": ["b", "a"], "stiffness": "4000 kN/m"},
        },
        damping={"two_ratios": {"2 Hz": 0.02, "5 Hz": 0.02}},
    )
    modes = mdof.solve(mdof.assemble(model))
    (entry,) = [entry for entry in modes.findings if entry.code == "damping-outside-fit"]
    assert entry.modes == (2,)


def test_a_sound_system_raises_nothing() -> None:
    assert codes(mdof.solve(mdof.System.from_matrices(np.eye(2), 0.02 * np.eye(2), np.diag([1.0, 4.0])))) == set()
