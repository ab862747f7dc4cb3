"""mdof.assembly, constraints and proportional: from bodies and connections to factors."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

import mdof
from mdof import ModelError


def approx(rows: list[list[float]]) -> Any:
    return pytest.approx(np.array(rows, dtype=float))


def assembled(bodies: dict[str, Any], connections: dict[str, Any], **more: Any) -> mdof.System:
    return mdof.assemble(mdof.Model(units="SI", bodies=bodies, connections=connections, **more))


def test_two_masses_in_a_row() -> None:
    system = assembled(
        {"a": "2 kg", "b": "3 kg"},
        {
            "s": {"between": ["a", "ground"], "stiffness": "5 N/m"},
            "t": {"between": ["b", "a"], "stiffness": "7 N/m", "damping": "0.5 N*s/m"},
        },
    )
    assert system.M.toarray() == pytest.approx(np.diag([2.0, 3.0]))
    assert system.K.toarray() == approx([[12.0, -7.0], [-7.0, 7.0]])
    assert system.C.toarray() == approx([[0.5, -0.5], [-0.5, 0.5]])
    # The damper knows the spring it shares its direction with, and who stands on the ground.
    assert system.damper_spring.tolist() == [1]
    assert system.spring_grounded.tolist() == [True, False]


def test_a_spring_off_the_centre_turns_the_body() -> None:
    """Vertical spring 0.3 m along x: it sees z − 0.3 ry."""
    body = {"mass": "4 kg", "inertia": ["1 kg*m^2", "1 kg*m^2", "1 kg*m^2"]}
    spring = {"between": ["a", "ground"], "at": ["0.3 m", 0, 0], "stiffness": {"z": "100 N/m"}}
    system = assembled({"a": body}, {"s": spring}, directions=["z", "ry"])
    assert system.K.toarray() == pytest.approx(100 * np.outer([1, -0.3], [1, -0.3]))


def test_a_rider_adds_its_mass_by_the_parallel_axis_rule() -> None:
    rotor = {"mass": "5 kg", "inertia": ["0.1 kg*m^2"] * 3, "centre": ["0.4 m", 0, 0]}
    frame = {"mass": "20 kg", "inertia": ["2 kg*m^2"] * 3, "centre": [0, 0, 0]}
    system = assembled(
        {"frame": frame, "rotor": rotor},
        {
            "seat": {"rigid": ["frame", "rotor"]},
            "s": {"between": ["frame", "ground"], "at": [0, 0, 0], "stiffness": {"y": "1 N/m"}},
        },
        directions=["y", "rz"],
    )
    # y of the rotor is y + 0.4 rz of the frame.
    wanted = np.diag([20.0, 2.0]) + 5 * np.outer([1, 0.4], [1, 0.4]) + np.diag([0, 0.1])
    assert system.M.toarray() == pytest.approx(wanted)
    assert system.recovery.toarray() == approx([[1, 0], [0, 1], [1, 0.4], [0, 1]])


def test_a_rigid_gear_leaves_one_angle_for_two_shafts() -> None:
    """J1 + J2 (r1/r2)²: the driven inertia counts with the square of the ratio."""
    system = assembled(
        {"wheel": {"inertia": "4 kg*m^2"}, "pinion": {"inertia": "0.5 kg*m^2"}},
        {
            "mesh": {"between": ["wheel", "pinion"], "gear": {"radii": [0.3, 0.1]}},
            "shaft": {"between": ["wheel", "ground"], "stiffness": "10 N*m/rad"},
        },
        directions=["rx"],
    )
    assert system.size == 1
    scale = abs(system.recovery.toarray()[0, 0])
    assert system.M.toarray()[0, 0] / scale**2 == pytest.approx(4 + 0.5 * 9)
    assert abs(system.recovery.toarray()[1, 0]) / scale == pytest.approx(3.0)


def test_inertance_acts_on_relative_acceleration_only() -> None:
    system = assembled(
        {"a": "1 kg", "b": "1 kg"},
        {
            "s": {"between": ["a", "b"], "stiffness": "1 N/m", "inertance": "0.7 kg"},
            "t": {"between": ["a", "ground"], "stiffness": "1 N/m"},
        },
    )
    assert system.M.toarray() == approx([[1.7, -0.7], [-0.7, 1.7]])


def test_a_series_branch_adds_a_first_order_state_without_mass() -> None:
    system = assembled(
        {"a": "1 kg"},
        {
            "s": {
                "between": ["a", "ground"],
                "stiffness": "3 N/m",
                "branches": [{"stiffness": "2 N/m", "damping": "0.4 N*s/m"}],
            }
        },
    )
    assert (system.size, system.degrees_of_freedom, system.first_order_states) == (2, 1, 1)
    assert system.K.toarray() == approx([[5.0, -2.0], [-2.0, 2.0]])
    assert system.C.toarray() == approx([[0.0, 0.0], [0.0, 0.4]])


def test_two_ratios_are_met_at_their_frequencies() -> None:
    system = assembled(
        {"a": "1 kg"},
        {"s": {"between": ["a", "ground"], "stiffness": "1 N/m"}},
        damping={"two_ratios": {"2 Hz": 0.02, "30 Hz": 0.05}},
    )
    for hertz, ratio in ((2.0, 0.02), (30.0, 0.05)):
        w = 2 * np.pi * hertz
        assert system.mass_proportional / (2 * w) + system.stiffness_proportional * w / 2 == pytest.approx(ratio)


def test_one_ratio_for_every_mode_is_every_modes_ratio() -> None:
    system = assembled(
        {"a": "2 kg", "b": "3 kg"},
        {"s": {"between": ["a", "ground"], "stiffness": "50 N/m"}, "t": {"between": ["b", "a"], "stiffness": "70 N/m"}},
        damping={"mode_ratios": "3 %"},
    )
    assert mdof.solve(system).damping_ratios == pytest.approx([0.03, 0.03], rel=1e-10)


def test_a_massless_joint_that_can_drift_is_refused_with_its_direction() -> None:
    with pytest.raises(ModelError, match=r"joint\.y"):
        assembled(
            {"a": {"mass": "1 kg"}, "joint": {"massless": True}},
            {
                "s": {"between": ["a", "joint"], "stiffness": {"x": "1 N/m"}},
                "t": {"between": ["joint", "ground"], "stiffness": {"x": "1 N/m"}},
                "u": {"between": ["a", "ground"], "stiffness": {"y": "1 N/m"}},
            },
            directions=["x", "y"],
        )


def test_rigid_links_in_a_circle_are_refused() -> None:
    import networkx as nx

    graph = nx.MultiGraph(directions=("x",))
    for name in "ab":
        graph.add_node(name, mass=1.0)
    graph.add_edge("a", "b", key="one", between=("a", "b"), kind="rigid")
    graph.add_edge("b", "a", key="two", between=("b", "a"), kind="rigid")
    with pytest.raises(ModelError, match=r"circle|rides"):
        mdof.assemble(graph)
