"""mdof.modes.energy: who moves and who dissipates."""

from __future__ import annotations

import networkx as nx
import numpy as np
import pytest

import mdof
from mdof.modes.energy import kinetic_shares


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


def rubber(reference: float | None, loss: float = 0.3) -> mdof.DampedModes:
    graph = nx.MultiGraph(directions=("x",), damping={})
    graph.add_node("ground", kind="ground")
    graph.add_node("a", mass=2.0)
    graph.add_node("b", mass=1.0)
    data = {"loss_factor": loss} | ({"reference_frequency": reference} if reference else {})
    graph.add_edge("a", "ground", key="s", between=("a", "ground"), stiffness=100.0, **data)
    graph.add_edge("b", "a", key="t", between=("b", "a"), stiffness=400.0, damping=1.5)
    return mdof.solve(mdof.assemble(graph))


def test_a_loss_factor_takes_its_share_at_the_frequency_of_each_mode() -> None:
    for mode in rubber(None):
        frequency = abs(mode.eigenvalues[0])
        lost = {
            "s": 0.3 * 100 / frequency * abs(mode.shape[0]) ** 2,
            "t": 1.5 * abs(mode.shape[1] - mode.shape[0]) ** 2,
        }
        total = sum(lost.values())
        assert mode.energy.dissipated == pytest.approx({name: part / total for name, part in lost.items()}, rel=1e-10)


def test_general_and_stiffness_proportional_damping_have_shares_of_their_own() -> None:
    K = np.array([[3.0, -1.0], [-1.0, 2.0]])
    C = np.diag([0.3, 0.1])
    system = mdof.System.from_matrices(np.diag([1.0, 2.0]), C, K).with_values(stiffness_proportional=0.05)
    for mode in mdof.solve(system):
        x = mode.shape
        lost = {
            "damping.stiffness_proportional": 0.05 * np.real(x.conj() @ K @ x),
            "matrix C": np.real(x.conj() @ C @ x),
        }
        total = sum(lost.values())
        assert mode.energy.dissipated == pytest.approx({name: part / total for name, part in lost.items()}, rel=1e-11)


def test_dampers_that_cancel_have_no_shares() -> None:
    """Nothing is lost as a whole, so nobody has a share of it."""
    model = mdof.Model(
        bodies={"a": "2 kg"},
        connections={
            "good": {"between": ["a", "ground"], "stiffness": "50 N/m", "damping": "0.3 N*s/m"},
            "bad": {"between": ["a", "ground"], "damping": "-0.3 N*s/m"},
        },
    )
    assert mdof.solve(mdof.assemble(model))[0].energy.dissipated == {}


def test_coupled_masses_share_the_kinetic_energy_of_what_couples_them_evenly() -> None:
    """A product of inertia m₁₂ puts Re(x₁* m₁₂ x₂) on each of the two coordinates it joins."""
    M = np.array([[2.0, 0.5], [0.5, 1.0]])
    modes = mdof.solve(mdof.System.from_matrices(M, np.zeros((2, 2)), np.diag([3.0, 5.0])))
    for mode in modes:
        x = mode.shape.real
        whole = x @ M @ x
        cross = M[0, 1] * x[0] * x[1]
        assert mode.energy.kinetic == pytest.approx(
            [(M[0, 0] * x[0] ** 2 + cross) / whole, (M[1, 1] * x[1] ** 2 + cross) / whole], rel=1e-11
        )
        assert mode.energy.kinetic.sum() == pytest.approx(1.0, rel=1e-13)


def test_the_mass_of_a_rider_counts_with_its_host_and_a_still_shape_has_no_energy() -> None:
    model = mdof.Model(
        bodies={"host": "2 kg", "rider": "5 kg", "other": "1 kg"},
        connections={
            "seat": {"rigid": ["host", "rider"]},
            "s": {"between": ["host", "ground"], "stiffness": "50 N/m"},
            "t": {"between": ["other", "host"], "stiffness": "70 N/m"},
        },
    )
    system = mdof.assemble(model)
    host, rider, other = (system.coordinate_bodies.index(name) for name in ("host", "rider", "other"))
    for mode in mdof.solve(system):
        energy = np.zeros(3)
        energy[host], energy[other] = 7 * abs(mode.shape[host]) ** 2, abs(mode.shape[other]) ** 2
        assert mode.energy.kinetic == pytest.approx(energy / energy.sum(), rel=1e-12)
        assert mode.energy.kinetic[rider] == 0
    assert np.all(kinetic_shares(system, np.zeros((2, 1), dtype=complex)) == 0)
