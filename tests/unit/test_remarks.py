"""mdof.modes.remarks: what is worth saying about modes."""

from __future__ import annotations

import networkx as nx
import numpy as np
import pytest

import mdof


def codes(modes: mdof.DampedModes) -> set[str]:
    return {entry.code for entry in modes.findings}


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


def said(modes: mdof.DampedModes, code: str) -> mdof.Finding:
    (entry,) = (entry for entry in modes.findings if entry.code == code)
    return entry


def diagonal(masses: list[float], dampers: list[float], springs: list[float], **more: object) -> mdof.DampedModes:
    return mdof.solve(mdof.System.from_matrices(*(np.diag(values) for values in (masses, dampers, springs)), **more))


def test_growth_is_told_with_the_time_it_takes_to_double() -> None:
    """Re λ = 0.05 and 0.1 for the oscillations, λ = 2 for the divergence."""
    modes = diagonal([1.0] * 3, [-0.1, -0.2, 0.0], [1.0, 4.0, -4.0])
    unstable, divergent = said(modes, "unstable-mode"), said(modes, "divergent-mode")
    assert f"doubling in {np.log(2) / 0.1:.3g} s" in unstable.message
    assert f"doubling in {np.log(2) / 2:.3g} s" in divergent.message
    assert {modes[number - 1].regime for number in unstable.modes} == {"unstable"}
    assert (len(unstable.modes), len(divergent.modes)) == (2, 1)
    assert "modes 1, 3 grow while" in unstable.message or "modes 1, 2 grow while" in unstable.message
    assert "leaves rest" in divergent.message


@pytest.mark.parametrize("count", [1, 2])
def test_relaxation_roots_are_told_with_their_rates(count: int) -> None:
    graph = nx.MultiGraph(directions=("x",), damping={})
    graph.add_node("ground", kind="ground")
    graph.add_node("a", mass=1.0)
    branches = [{"stiffness": 3.0, "damping": 0.4}, {"stiffness": 3.0, "damping": 9.0}][:count]
    graph.add_edge("a", "ground", key="s", between=("a", "ground"), stiffness=100.0, branches=branches)
    modes = mdof.solve(mdof.assemble(graph))
    rates = sorted(mode.decay_rate for mode in modes if mode.regime == "relaxation")
    assert len(rates) == count
    text = said(modes, "relaxation-roots").message
    if count == 1:
        assert f"1 relaxation root decaying at {rates[0]:.4g} 1/s" in text
    else:
        assert f"2 relaxation roots decaying at {rates[0]:.4g} to {rates[1]:.4g} 1/s" in text


@pytest.mark.parametrize(("big", "doubtful"), [(1e8, False), (1e11, True)])
def test_a_bound_of_a_millionth_is_worth_a_word(big: float, doubtful: bool) -> None:
    modes = mdof.solve(mdof.System.from_matrices(np.eye(2), np.zeros((2, 2)), [[big, -big], [-big, big + 16]]))
    bound = modes[0].frequency_bound
    assert bound is not None
    assert (bound > 1e-6) is doubtful
    assert ("ill-conditioned-mode" in codes(modes)) is doubtful
    if doubtful:
        assert said(modes, "ill-conditioned-mode").modes == (1,)
        assert f"{100 * bound:.2g} %" in said(modes, "ill-conditioned-mode").message


def test_a_free_motion_names_the_three_that_move_most_and_nobody_below_a_third() -> None:
    """A free row of masses on equal springs moves as one; a heavy drag is told with its rate."""
    n = 5
    K = 2 * np.eye(n) - np.eye(n, k=1) - np.eye(n, k=-1)
    K[0, 0] = K[-1, -1] = 1.0
    modes = mdof.solve(mdof.System.from_matrices(np.eye(n), 0.25 * np.eye(n), K, [f"b{i}.x" for i in range(n)]))
    text = said(modes, "free-motion").message
    assert "1 motion free" in text
    assert text.count("+") == 2
    assert "slowed at 0.25 1/s" in text
    lever = np.array([[1.0, -0.25], [-0.25, 0.0625]])
    text = said(
        mdof.solve(mdof.System.from_matrices(np.eye(2), np.zeros((2, 2)), lever, ["slow.x", "fast.x"])), "free-motion"
    ).message
    assert "fast.x" in text
    assert "slow.x" not in text
    assert "slowed" not in text


def test_more_free_motions_than_six_are_counted() -> None:
    modes = diagonal([1.0] * 8, [0.0] * 8, [0.0] * 8)
    text = said(modes, "free-motion").message
    assert "8 motions free" in text
    assert "and 2 more" in text
    assert "more" not in said(diagonal([1.0] * 6, [0.0] * 6, [0.0] * 6), "free-motion").message


def test_a_damper_to_ground_holds_no_bodies_together() -> None:
    graph = nx.MultiGraph(directions=("x",), damping={})
    graph.add_node("ground", kind="ground")
    for name in "ab":
        graph.add_node(name, mass=1.0)
    graph.add_edge("a", "b", key="s", between=("a", "b"), stiffness=4.0, damping=0.1)
    graph.add_edge("a", "ground", key="drag", between=("a", "ground"), damping=0.1)
    assert "held-by-damper-only" not in codes(mdof.solve(mdof.assemble(graph)))


@pytest.mark.parametrize(("top", "outside"), [(9.5, False), (10.5, True)])
def test_twice_the_larger_target_is_the_border_of_a_fit(top: float, outside: bool) -> None:
    """α = 0, β = 0.02: ζ(ω) = ω/100, targets 0.02 at 2 and 0.05 at 5 rad/s; the border is ω = 10."""
    system = mdof.System.from_matrices(np.eye(2), np.zeros((2, 2)), np.diag([9.0, top**2]))
    modes = mdof.solve(system.with_values(stiffness_proportional=0.02, two_ratios=((2.0, 0.02), (5.0, 0.05))))
    assert ("damping-outside-fit" in codes(modes)) is outside
    if outside:
        text = said(modes, "damping-outside-fit")
        assert text.modes == (2,)
        assert "between 0.3183 and 0.7958 Hz gives more than 10 %" in text.message


def test_low_modes_count_as_outside_the_fit_by_the_mass_term() -> None:
    """α = 0.2: ζ = 0.1/ω, targets 0.01 at 10 and 0.005 at 20 rad/s; at ω = 4 it is 0.025."""
    system = mdof.System.from_matrices(np.eye(3), np.zeros((3, 3)), np.diag([16.0, 225.0, 900.0]))
    modes = mdof.solve(system.with_values(mass_proportional=0.2, two_ratios=((10.0, 0.01), (20.0, 0.005))))
    assert said(modes, "damping-outside-fit").modes == (1,)


def test_long_lists_of_modes_end_in_dots() -> None:
    many = said(diagonal([1.0] * 13, [-0.1] * 13, [float(i) for i in range(1, 14)]), "unstable-mode")
    assert "10, 11, 12, ... grow" in many.message
    assert len(many.modes) == 13
    twelve = said(diagonal([1.0] * 12, [-0.1] * 12, [float(i) for i in range(1, 13)]), "unstable-mode")
    assert "11, 12 grow" in twelve.message


def test_leaders_of_a_free_motion_are_named_by_size() -> None:
    """A free motion (0.5, 1, 0.8, 0.6): the three largest, largest first."""
    shape = np.array([0.5, 1.0, 0.8, 0.6])
    rest = np.linalg.svd(shape[None, :])[2][1:]
    K = rest.T @ np.diag([1.0, 4.0, 9.0]) @ rest
    modes = mdof.solve(mdof.System.from_matrices(np.eye(4), np.zeros((4, 4)), K, ["a", "b", "c", "d"]))
    assert "mostly b.x+c.x+d.x)" in said(modes, "free-motion").message


def test_roots_without_a_partner_are_named_and_relaxation_is_none_of_them() -> None:
    """Inman and Andry's example beside a relaxing mount: two roots left over, one that belongs to no oscillator."""
    M, K = np.diag([1.0, 1.0, 1.0, 0.0]), np.diag([1.0, 16.0, 49.0, 6.0])
    C = np.diag([2.5, 12.0, 0.1, 2.0])
    C[0, 1] = C[1, 0] = 1.3
    modes = mdof.solve(mdof.System.from_matrices(M, C, K))
    singles = {mode.number for mode in modes if len(mode.eigenvalues) == 1}
    relaxing = {mode.number for mode in modes if mode.regime == "relaxation"}
    assert (len(singles), len(relaxing)) == (3, 1)
    assert set(said(modes, "partner-unresolved").modes) == singles - relaxing
    assert set(said(modes, "relaxation-roots").modes) == relaxing
