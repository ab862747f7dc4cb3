"""mdof.modes.proportionality: what the shortcut misstates, and who is to blame."""

from __future__ import annotations

import re
from typing import Any

import networkx as nx
import numpy as np
import pytest

import mdof
from mdof.eigen.reduce import normalise
from mdof.findings import Finding
from mdof.modes.proportionality import proportionality_findings, shortcut


def pair(damping: float, between: list[str]) -> mdof.DampedModes:
    """Two close oscillators on a base; one damper."""
    model = mdof.Model(
        bodies={"left": "1 kg", "right": "1 kg"},
        connections={
            "a": {"between": ["left", "ground"], "stiffness": "100 N/m"},
            "b": {"between": ["right", "ground"], "stiffness": "104 N/m"},
            "tie": {"between": ["left", "right"], "stiffness": "1 N/m"},
            "pot": {"between": between, "damping": f"{damping} N*s/m"},
        },
    )
    return mdof.solve(mdof.assemble(model))


def test_one_local_damper_on_close_modes_is_reported_with_its_name() -> None:
    modes = pair(1.0, ["left", "ground"])
    (finding,) = [entry for entry in modes.findings if entry.code == "non-proportional-damping"]
    assert finding.modes == (2,)
    assert finding.connections == ("pot",)
    # The message quotes both sides of the worst mode.
    assert "shortcut says" in finding.message


def test_light_damping_is_no_alarm() -> None:
    assert not [entry for entry in pair(0.001, ["left", "ground"]).findings if entry.code == "non-proportional-damping"]


def test_the_commutator_vanishes_for_proportional_damping_only() -> None:
    rng = np.random.default_rng(0)
    A = rng.normal(size=(4, 4))
    K = A @ A.T + np.eye(4)
    M = np.diag(rng.uniform(1, 2, 4))
    proportional = shortcut(normalise(mdof.System.from_matrices(M, 0.3 * M + 0.01 * K, K)))
    assert proportional.commutator < 1e-13
    C = np.diag([1.0, 0, 0, 0])
    local = shortcut(normalise(mdof.System.from_matrices(M, C, K)))
    # Caughey & O'Kelly's difference in mass-normalised coordinates, formed independently.
    root = np.diag(1 / np.sqrt(np.diag(M)))
    c, k = root @ C @ root, root @ K @ root
    assert local.commutator == pytest.approx(np.linalg.norm(c @ k - k @ c) / np.linalg.norm(k @ c), rel=1e-10)


def test_the_shortcut_ratio_is_the_diagonal_of_modal_damping() -> None:
    modes = pair(1.0, ["left", "ground"])
    K, C = modes.system.K.toarray(), modes.system.C.toarray()
    squares, shapes = np.linalg.eigh(K)
    wanted = np.einsum("ij,ik,kj->j", shapes, C, shapes) / (2 * np.sqrt(squares))
    assert np.sort(modes.shortcut_damping_ratios) == pytest.approx(np.sort(wanted), rel=1e-10)


def judged(ratio: float, drift: float, shortcut_ratio: float = 0.05) -> tuple[Finding, ...]:
    """One undamped mode at 10 rad/s with the shortcut's ratio, against an exact ratio and a drifted frequency."""
    system = mdof.System.from_matrices(np.eye(1), [[2 * shortcut_ratio * 10.0]], [[100.0]])
    problem = normalise(system)
    exact, frequency = np.array([ratio]), np.array([10.0 / (1 + drift)])
    return tuple(proportionality_findings(system, problem, shortcut(problem), np.array([0]), exact, frequency))


@pytest.mark.parametrize(
    ("ratio", "drift", "shortcut_ratio", "misstated"),
    [
        (0.05 / 1.09, 0.0, 0.05, False),
        (0.05 / 1.11, 0.0, 0.05, True),
        (0.05 / 0.91, 0.0, 0.05, False),
        (0.05 / 0.89, 0.0, 0.05, True),
        # A fifth of very little is nothing: less than 0.002 in the ratio itself.
        (0.010, 0.0, 0.0119, False),
        (0.010, 0.0, 0.0121, True),
        (0.0001, 0.0, 0.0019, False),
        (0.05, 0.029, 0.05, False),
        (0.05, 0.031, 0.05, True),
        (0.05, -0.029, 0.05, False),
        (0.05, -0.031, 0.05, True),
        # An unstable mode is judged by the size of its ratio.
        (-0.02, 0.0, 0.05, True),
        (-0.05 / 1.09, 0.0, -0.05, False),
    ],
)
def test_ten_per_cent_and_two_thousandths_or_three_per_cent_of_frequency(
    ratio: float, drift: float, shortcut_ratio: float, misstated: bool
) -> None:
    assert bool(judged(ratio, drift, shortcut_ratio)) is misstated


def test_modes_without_a_ratio_are_not_judged() -> None:
    system = mdof.System.from_matrices(np.eye(1), [[1.0]], [[100.0]])
    problem = normalise(system)
    for nearest, ratio in ((-1, 0.5), (0, np.nan)):
        told = proportionality_findings(
            system, problem, shortcut(problem), np.array([nearest]), np.array([ratio]), np.array([10.0])
        )
        assert told == []


def test_the_message_quotes_ratio_and_frequency_of_both_sides() -> None:
    (entry,) = judged(0.02, 0.25)
    assert "mode 1 at 1.273 Hz has 2 %, the shortcut says 5 % at 1.592 Hz" in entry.message
    assert "misstates 1 of 1 modes" in entry.message


def machine(culprits: dict[str, tuple[str, str, float]], *, beta: float = 0.0, **more: Any) -> mdof.System:
    """Four close oscillators on a base whose mounts are damped in proportion to stiffness, and dampers of their own."""
    graph = nx.MultiGraph(directions=("x",), damping={})
    graph.add_node("ground", kind="ground")
    graph.add_node("base", mass=20.0)
    mounts = {"feet": ("base", "ground", 4000.0)}
    for index in range(4):
        graph.add_node(f"p{index}", mass=1.0)
        mounts[f"mount/{index}"] = (f"p{index}", "base", 100.0 * (1 + 0.05 * index))
    for name, (a, b, stiffness) in mounts.items():
        data = {"stiffness": stiffness} | ({"damping": beta * stiffness} if beta else {}) | more.get(name, {})
        graph.add_edge(a, b, key=name, between=(a, b), **data)
    for name, (a, b, damping) in culprits.items():
        graph.add_edge(a, b, key=name, between=(a, b), damping=damping)
    return mdof.assemble(graph)


def named(system: mdof.System) -> tuple[str, ...]:
    (entry,) = (entry for entry in mdof.solve(system).findings if entry.code == "non-proportional-damping")
    return entry.connections


@pytest.mark.parametrize("where", [("p0", "ground"), ("p0", "p2"), ("p1", "base")])
@pytest.mark.parametrize("beta", [0.0, 0.002, 0.01])
def test_the_damper_that_breaks_the_proportion_is_named_first(where: tuple[str, str], beta: float) -> None:
    assert named(machine({"tiny": (*where, 1e-4), "pot": (*where, 3.0)}, beta=beta))[0] == "pot"


def test_without_other_damping_the_culprit_is_named_alone() -> None:
    assert named(machine({"tiny": ("p3", "ground", 1e-3), "pot": ("p0", "ground", 2.0)})) == ("pot",)


@pytest.mark.parametrize("reference", [None, 10.0])
def test_a_loss_factor_that_couples_is_named_with_its_spring(reference: float | None) -> None:
    loss = {"loss_factor": 0.4} | ({"reference_frequency": reference} if reference else {})
    assert named(machine({}, **{"mount/1": loss})) == ("mount/1",)


def test_two_dampers_that_undo_each_others_coupling_raise_nothing() -> None:
    """Two equal oscillators, a damper to ground on each: the off-diagonal terms cancel."""
    model = mdof.Model(
        bodies={"a": "1 kg", "b": "1 kg"},
        connections={
            "s": {"between": ["a", "ground"], "stiffness": "100 N/m", "damping": "4 N*s/m"},
            "t": {"between": ["b", "ground"], "stiffness": "100 N/m", "damping": "4 N*s/m"},
            "u": {"between": ["a", "b"], "stiffness": "3 N/m"},
        },
    )
    system = mdof.assemble(model)
    assert mdof.solve(system).findings == ()
    assert "s" in named(system.with_values(damping=np.array([8.0, 0.01])))


def test_members_of_one_family_are_written_together() -> None:
    (entry,) = (
        entry
        for entry in mdof.solve(machine({"pot/a": ("p0", "ground", 2.0), "pot/b": ("p1", "ground", 2.0)})).findings
        if entry.code == "non-proportional-damping"
    )
    assert re.search(r"coupled most by pot \((a, b|b, a)\)", entry.message)


def test_the_shortcut_follows_massless_joints_with_their_springs() -> None:
    """A damped joint between two springs: the undamped mode is the one on the springs in series, the joint between."""
    k1, k2, m, c = 30.0, 60.0, 2.0, 0.5
    K = np.array([[k1, -k1], [-k1, k1 + k2]])
    problem = normalise(mdof.System.from_matrices(np.diag([m, 0.0]), np.diag([0.0, c]), K))
    plain = shortcut(problem)
    omega, share = np.sqrt(k1 * k2 / (k1 + k2) / m), k1 / (k1 + k2)
    assert plain.frequencies == pytest.approx([omega], rel=1e-12)
    assert plain.ratios() == pytest.approx([c * share**2 / m / (2 * omega)], rel=1e-12)
    assert np.abs((problem.recover @ plain.shapes)[1] / (problem.recover @ plain.shapes)[0]) == pytest.approx(share)


def test_the_shortcut_matches_loss_factors_at_the_undamped_frequency() -> None:
    """η/2 for a loss factor on every spring, whatever the mode, and no ratio for a free motion."""
    every = {name: {"loss_factor": 0.08} for name in ("feet", *(f"mount/{index}" for index in range(4)))}
    plain = shortcut(normalise(machine({}, **every)))
    assert plain.ratios() == pytest.approx([0.04] * 5, rel=1e-12)
    free = shortcut(normalise(mdof.System.from_matrices(np.eye(2), np.eye(2), [[1.0, -1.0], [-1.0, 1.0]])))
    assert np.isnan(free.ratios()).sum() == 1


def test_the_nearest_undamped_mode_is_that_of_the_largest_overlap() -> None:
    plain = shortcut(normalise(machine({"pot": ("p0", "ground", 2.0)})))
    assert plain.nearest(np.array([[0.2, 0.9j], [0.1, 0.1], [-0.9, 0], [0, 0], [0, 0.3]]), 5).tolist() == [2, 0]
