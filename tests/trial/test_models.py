"""Every demo model, in every state, solved and verified; the numbers a throw-away script once gave for them.

A demonstration, NOT a proof: all data of these models is invented, and the expected numbers come from an unvalidated
script. They catch a model file that was edited by mistake. The proof is in tests/reference and tests/property.
"""

from __future__ import annotations

import itertools
import math
from pathlib import Path

import numpy as np
import pytest
import yaml

import mdof
from mdof import Regime

MODELS = Path(__file__).parents[2] / "models"
FILES = sorted(MODELS.glob("*.yaml"))
WITH_STATES = [
    (path.name, state)
    for path in FILES
    for state in (None, *yaml.safe_load(path.read_text(encoding="utf-8")).get("states", {}))
]
HZ = 2 * math.pi


def solved(file: str, state: str | None = None) -> mdof.DampedModes:
    modes = mdof.solve(mdof.assemble(mdof.load(MODELS / file, state)))
    assert modes.verification.status == "verified"
    return modes


def near(modes: mdof.DampedModes, hertz: float, percent: float) -> bool:
    """Is there a mode within 0.5 % of a frequency and 0.2 points of a damping ratio?"""
    f = modes.natural_frequencies / HZ
    return bool(np.any((np.abs(f / hertz - 1) <= 0.005) & (np.abs(100 * modes.damping_ratios - percent) <= 0.2)))


def test_all_models_are_here() -> None:
    oscillators = {f"one_{regime.value.replace(' ', '_')}.yaml" for regime in Regime}
    machines = {"firewater_skid.yaml", "geared_train.yaml", "floor_fan.yaml", "floor_fan_us.yaml"}
    assert {path.name for path in FILES} >= oscillators | machines | {"two_mass.yaml", "ten_mass_chain.yaml"}


@pytest.mark.parametrize("path", FILES, ids=lambda path: path.name)
def test_every_model_teaches(path: Path) -> None:
    """A model file begins with what it is about, in comments, and is plain ASCII in its name."""
    lines = path.read_text(encoding="utf-8").splitlines()
    leading = list(itertools.takewhile(lambda line: line.startswith("#"), lines))
    assert len(leading) >= 2
    assert path.name.isascii()


@pytest.mark.parametrize(("file", "state"), WITH_STATES)
def test_every_model_solves_verified(file: str, state: str | None) -> None:
    modes = solved(file, state)
    assert modes.verification.eigenvalues_found == modes.verification.eigenvalues_expected
    assert modes.verification.largest_scaled_residual < 10
    assert np.nanmax(modes.frequency_bounds, initial=0.0) < 1e-6


@pytest.mark.parametrize("regime", list(Regime))
def test_one_oscillator_in_each_regime(regime: Regime) -> None:
    modes = solved(f"one_{regime.value.replace(' ', '_')}.yaml")
    expected = {Regime.RELAXATION: [Regime.RELAXATION, Regime.UNDERDAMPED]}.get(regime, [regime])
    assert sorted(modes.regimes) == sorted(expected)


# Diesel fire-water pump skid ------------------------------------------------------------------------------------------

SKID_AS_SELECTED = [
    (2.39, 10.8), (2.65, 16.6), (2.77, 7.5), (3.49, 9.9), (3.60, 26.7), (3.70, 5.0), (4.45, 14.5), (4.71, 19.2),
    (5.78, 15.1), (7.99, 6.3), (9.26, 6.6), (10.70, 42.0), (12.04, 8.4), (13.07, 10.5), (13.72, 8.4), (14.20, 7.8),
    (17.34, 8.7), (19.30, 81.5), (20.76, 95.0), (25.96, 17.9), (28.47, 18.5), (28.69, 10.2), (38.69, 25.6),
    (40.68, 26.4),
]  # fmt: skip


def test_skid_totals() -> None:
    system = mdof.assemble(mdof.load(MODELS / "firewater_skid.yaml"))
    assert system.degrees_of_freedom == 48
    assert sum(system.bodies.values()) == pytest.approx(5465)


def test_skid_modes() -> None:
    modes = solved("firewater_skid.yaml")
    swings = [mode for mode in modes if mode.regime is Regime.UNDERDAMPED][: len(SKID_AS_SELECTED)]
    for mode, (hertz, percent) in zip(swings, SKID_AS_SELECTED, strict=True):
        assert mode.natural_frequency / HZ == pytest.approx(hertz, rel=0.005)
        assert 100 * mode.damping_ratio == pytest.approx(percent, abs=0.2)
    assert "relaxation" not in set(modes.regimes)


def test_skid_panel_bounce_is_overdamped() -> None:
    overdamped = [mode for mode in solved("firewater_skid.yaml") if mode.regime is Regime.OVERDAMPED]
    assert len(overdamped) == 1
    assert [root.real for root in overdamped[0].eigenvalues] == pytest.approx([-48.07, -147.16], abs=0.01)
    assert overdamped[0].natural_frequency / HZ == pytest.approx(13.4, rel=0.005)
    assert overdamped[0].damping_ratio == pytest.approx(1.16, abs=0.002)
    moves = overdamped[0].system.labels[int(np.argmax(np.abs(overdamped[0].shape)))]
    assert moves == "panel.z"


def test_skid_engine_bounce_misleads_the_shortcut() -> None:
    """The dampers of the panel make undamped-mode damping say 32 % where the engine bounce has 8.4 %."""
    modes = solved("firewater_skid.yaml")
    bounce = next(mode for mode in modes if abs(mode.natural_frequency / HZ - 12.04) < 0.06)
    assert 100 * bounce.shortcut_damping_ratio == pytest.approx(32.3, abs=0.5)
    blamed = next(finding for finding in modes.findings if finding.code == "non-proportional-damping")
    assert bounce.number in blamed.modes
    assert any(name.startswith("panel_mount") for name in blamed.connections)


@pytest.mark.parametrize(
    ("state", "expected"),
    [
        ("panel_dampers_revised", [(11.85, 9.0), (14.20, 7.8), (17.34, 8.6)]),
        ("three_parameter_mounts", [(12.14, 10.6)]),
        ("tie_rods_tight", [(8.46, 7.3)]),
        ("cold_rubber", [(9.20, 6.6), (19.70, 10.5)]),
    ],
)
def test_skid_states(state: str, expected: list[tuple[float, float]]) -> None:
    modes = solved("firewater_skid.yaml", state)
    for hertz, percent in expected:
        assert near(modes, hertz, percent), (hertz, percent)


def test_skid_with_revised_panel_dampers_has_no_real_roots() -> None:
    assert set(solved("firewater_skid.yaml", "panel_dampers_revised").regimes) == {Regime.UNDERDAMPED}


def test_skid_on_three_parameter_mounts_relaxes_at_four_rates() -> None:
    """One root a mount, of no partner, beside the panel's overdamped pair."""
    modes = solved("firewater_skid.yaml", "three_parameter_mounts")
    rates = [mode.eigenvalues[0].real for mode in modes if mode.regime is Regime.RELAXATION]
    assert sorted(rates, reverse=True) == pytest.approx([-73.7, -75.3, -76.9, -88.0], abs=0.05)
    assert all(len(mode.eigenvalues) == 1 for mode in modes if mode.regime is Regime.RELAXATION)
    assert modes.regimes.count(Regime.OVERDAMPED) == 1


def test_skid_states_change_what_they_say() -> None:
    model = mdof.load(MODELS / "firewater_skid.yaml")
    assert set(model.state_names) == {
        "springs_as_quoted",
        "panel_dampers_revised",
        "tank_tenth",
        "cold_rubber",
        "tie_rods_tight",
        "three_parameter_mounts",
    }
    assert sum(mdof.assemble(model.with_state("tank_tenth")).bodies.values()) == pytest.approx(5195)
    digests = {model.with_state(state).digest for state in model.state_names} | {model.digest}
    assert len(digests) == 7


# Geared train ---------------------------------------------------------------------------------------------------------


def test_geared_train() -> None:
    modes = solved("geared_train.yaml")
    assert modes.regimes == (Regime.RIGID_BODY, *[Regime.UNDERDAMPED] * 3)
    slow, drag = sorted((root.real for root in modes[0].eigenvalues), key=abs)
    assert slow == 0
    assert drag == pytest.approx(-0.124, abs=5e-4)
    assert modes[0].damping_ratio is None
    expected = [(27.97, 5.7), (92.8, 1.2), (1213, 2.5)]
    for mode, (hertz, percent) in zip(modes[1:], expected, strict=True):
        assert mode.natural_frequency / HZ == pytest.approx(hertz, rel=0.005)
        assert 100 * mode.damping_ratio == pytest.approx(percent, abs=0.2)
    shape = (modes[1].shape / modes[1].shape[-1] * -1).real
    assert shape == pytest.approx([0.740, -0.174, -0.565, -1], abs=0.01)
    assert "own frequency" in modes.loss_reference


def test_geared_train_rigid_motion_keeps_the_ratio() -> None:
    shape = solved("geared_train.yaml")[0].shape.real
    assert shape / shape[0] == pytest.approx([1, 1, 3.2, 3.2], rel=1e-9)


# Fan on a floor -------------------------------------------------------------------------------------------------------

FAN = [2.08, 2.48, 3.12, 5.44, 5.91, 6.70, 6.86, 15.60]


def test_floor_fan() -> None:
    modes = solved("floor_fan.yaml")
    for mode, hertz in zip(modes[: len(FAN)], FAN, strict=True):
        assert mode.natural_frequency / HZ == pytest.approx(hertz, rel=0.005)
    assert 100 * modes[5].damping_ratio == pytest.approx(2.5, abs=0.2)
    assert 100 * modes[7].damping_ratio == pytest.approx(3.1, abs=0.2)
    stiff = solved("floor_fan.yaml", "rails_stiffened")
    assert np.min(np.abs(stiff.natural_frequencies / HZ - 31)) < 0.2


@pytest.mark.parametrize("state", [None, "rails_stiffened"])
def test_twin_in_us_units_is_identical(state: str | None) -> None:
    """The twin's numbers are written to ten digits, so the answers agree to about nine."""
    ours, twin = solved("floor_fan.yaml", state), solved("floor_fan_us.yaml", state)
    assert ours.regimes == twin.regimes
    assert twin.natural_frequencies == pytest.approx(ours.natural_frequencies, rel=1e-8)
    assert twin.damping_ratios == pytest.approx(ours.damping_ratios, rel=1e-8)
    assert np.abs(twin.shapes - ours.shapes).max() < 1e-6


# Small teaching models ------------------------------------------------------------------------------------------------


def test_bare_chain_by_formula() -> None:
    w = 2 * math.sqrt(90e3 / 10) * np.sin(np.arange(1, 11) * math.pi / 22)
    assert solved("ten_mass_chain.yaml", "bare").natural_frequencies == pytest.approx(w, rel=1e-12)
    spread = solved("ten_mass_chain.yaml", "proportional")
    assert spread.damping_ratios == pytest.approx(4e-4 / 2 * w, rel=1e-10)


def test_numbers_in_the_comments_of_the_small_models() -> None:
    assert solved("one_undamped.yaml").natural_frequencies[0] == pytest.approx(20, rel=1e-14)
    assert solved("one_underdamped.yaml")[0].damping_ratio == pytest.approx(0.06, rel=1e-13)
    assert np.real(solved("one_critically_damped.yaml")[0].eigenvalues) == pytest.approx([-20, -20], abs=1e-6)
    assert np.real(solved("one_overdamped.yaml")[0].eigenvalues) == pytest.approx([-4.17, -95.83], abs=0.005)
    assert np.real(solved("one_rigid_body.yaml")[0].eigenvalues) == pytest.approx([0, -0.6], abs=1e-12)
    low, high = solved("two_mass.yaml")
    assert low.damping_ratio > 3 * high.damping_ratio
