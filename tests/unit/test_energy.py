"""mdof.modes.energy: who moves and who dissipates."""

from __future__ import annotations

import numpy as np
import pytest

import mdof


def skid() -> mdof.DampedModes:
    model = mdof.Model(
        bodies={"a": "2 kg", "b": "3 kg"},
        connections={
            "s": {"between": ["a", "ground"], "stiffness": "50 N/m", "damping": "0.4 N*s/m"},
            "t": {"between": ["b", "a"], "stiffness": "70 N/m", "loss_factor": 0.1, "reference_frequency": "1 Hz"},
        },
        damping={"mass_proportional": "0.02 1/s"},
    )
    return mdof.solve(mdof.assemble(model))


def test_shares_are_those_of_the_motion() -> None:
    for mode in skid():
        x = mode.shape
        kinetic = np.array([2.0, 3.0]) * np.abs(x) ** 2
        assert mode.energy.kinetic == pytest.approx(kinetic / kinetic.sum(), rel=1e-12)
        lost = {
            "s": 0.4 * abs(x[0]) ** 2,
            "t": 0.1 * 70 / (2 * np.pi) * abs(x[1] - x[0]) ** 2,
            "damping.mass_proportional": 0.02 * kinetic.sum(),
        }
        total = sum(lost.values())
        assert mode.energy.dissipated == pytest.approx({name: value / total for name, value in lost.items()}, rel=1e-11)


def test_the_power_lost_is_twice_the_decay_rate_times_the_energy() -> None:
    """x*Cx = 2σ x*Mx for an oscillating mode: the shares come from a consistent whole."""
    modes = skid()
    C, M = modes.system.C.toarray(), modes.system.M.toarray()
    for mode in modes:
        x = mode.reduced_shape
        assert np.real(x.conj() @ C @ x) == pytest.approx(2 * mode.decay_rate * np.real(x.conj() @ M @ x), rel=1e-12)


def test_an_undamped_mode_has_no_dissipation() -> None:
    modes = mdof.solve(mdof.System.from_matrices(np.eye(1), np.zeros((1, 1)), np.eye(1)))
    assert modes[0].energy.dissipated == {}


def test_a_negative_damper_has_a_negative_share() -> None:
    model = mdof.Model(
        bodies={"a": "2 kg"},
        connections={
            "good": {"between": ["a", "ground"], "stiffness": "50 N/m", "damping": "0.9 N*s/m"},
            "bad": {"between": ["a", "ground"], "damping": "-0.3 N*s/m"},
        },
    )
    shares = mdof.solve(mdof.assemble(model))[0].energy.dissipated
    assert shares == pytest.approx({"good": 1.5, "bad": -0.5})
