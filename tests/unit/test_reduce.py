"""mdof.eigen.reduce: the normalised problem is the given one in other coordinates."""

from __future__ import annotations

import networkx as nx
import numpy as np
import pytest

import mdof
from mdof import System
from mdof.eigen.reduce import NormalisedProblem, normalise


def network(seed: int = 0, *, negative: bool = False, joint: bool = False, loss: bool = False) -> System:
    """Four bodies in a row with cross ties, springs and dampers at random."""
    rng = np.random.default_rng(seed)
    graph = nx.MultiGraph(directions=("x",), damping={})
    graph.add_node("ground", kind="ground")
    for name in "abcd":
        massless = joint and name == "b"
        mass = 0.0 if massless else float(rng.uniform(1, 3))
        graph.add_node(name, mass=mass, **({"massless": True} if massless else {}))
    ties = [("a", "ground"), ("b", "a"), ("c", "b"), ("d", "c"), ("d", "a"), ("c", "ground")]
    for index, (first, second) in enumerate(ties):
        data = {"stiffness": float(rng.uniform(10, 90))}
        if not (joint and "b" in (first, second)):
            data["damping"] = float(rng.uniform(0.1, 2))
        if negative and index == 4:
            data["stiffness"] = -5.0
        if loss and index in (0, 3):
            data["loss_factor"] = 0.1 + index
        graph.add_edge(first, second, key=f"s{index}", between=(first, second), **data)
    return mdof.assemble(graph)


def assert_congruent(system: System, problem: NormalisedProblem, reference: float | None = None) -> None:
    """TᵀMT = diag(I, 0), TᵀKT = WΣSΣWᵀ, TᵀCT = D, and D is its factors where there is nothing else."""
    T = problem.recover
    size = T.shape[1]
    mass = np.zeros((size, size))
    mass[: problem.heavy, : problem.heavy] = np.eye(problem.heavy)
    stiffness, damping = T.T @ system.K @ T, T.T @ system.damping_matrix(reference) @ T
    assert np.abs(T.T @ system.M @ T - mass).max() < 1e-13
    assert problem.stiffness == pytest.approx(stiffness, abs=1e-12 * np.abs(stiffness).max())
    floating = 0.0 if reference is None else problem.loss_rows.T @ problem.loss_rows / reference
    assert problem.damping + floating == pytest.approx(damping, abs=1e-12 * max(np.abs(damping).max(), 1e-300))
    bases = np.hstack([problem.W, problem.N])
    assert bases.T @ bases == pytest.approx(np.eye(size), abs=1e-13)
    if problem.own_damping is not None:
        factors = (problem.damper_rows.T * problem.damper_signs) @ problem.damper_rows
        assert factors + np.diag(problem.own_damping) == pytest.approx(problem.damping, abs=1e-12)


CASES = {
    "springs and dampers": network(1),
    "negative spring": network(2, negative=True),
    "joint": network(3, joint=True),
    "joint and negative spring": network(4, joint=True, negative=True),
    "proportional": network(5).with_values(mass_proportional=0.3, stiffness_proportional=0.02),
    "proportional beside a joint": network(6, joint=True).with_values(
        mass_proportional=0.3, stiffness_proportional=0.02
    ),
    "negative damper": network(7).with_values(damping=np.array([1.0, -0.2, 0.3, 0.4, 0.5, 0.6])),
    "gyroscopic": network(8).with_values(gyroscopic=np.diag([0.5, 0.2, 0.1], 1) - np.diag([0.5, 0.2, 0.1], -1)),
    "unsymmetric": System.from_matrices(
        np.diag([1.0, 2.0, 3.0]), np.diag([1.0, 2.0], 1), 9 * np.eye(3) + np.diag([1.0, 4.0], 1)
    ),
    "unsymmetric beside a joint": System.from_matrices(
        np.diag([1.0, 2.0, 0.0]), np.diag([1.0, 0.3, 0.0]), 9 * np.eye(3) + np.diag([1.0, 4.0], 1)
    ),
    "full mass matrix": System.from_matrices(
        [[2.0, 0.5], [0.5, 1.0]], [[0.3, 0.1], [0.1, 0.5]], [[9.0, -2.0], [-2.0, 4.0]]
    ),
}


@pytest.mark.parametrize("case", CASES)
def test_the_normalised_problem_is_congruent_to_the_given_one(case: str) -> None:
    assert_congruent(CASES[case], normalise(CASES[case]))


def test_loss_factors_without_reference_are_kept_as_factors_of_the_structural_damping() -> None:
    system = network(9, loss=True)
    assert_congruent(system, normalise(system), reference=7.0)


def test_modal_coordinates_are_the_undamped_modes() -> None:
    problem = normalise(network(1))
    assert problem.modal
    scale = 1 / np.sqrt(network(1).M.diagonal())
    squares = np.linalg.eigvalsh(network(1).K.toarray() * np.outer(scale, scale))
    assert np.sort(problem.sigma) == pytest.approx(np.sqrt(squares), rel=1e-12)


def test_condensed_joints_leave_one_coordinate_for_each_mass() -> None:
    problem = normalise(network(3, joint=True))
    assert (problem.recover.shape, problem.heavy, problem.modal) == ((4, 3), 3, True)


@pytest.mark.parametrize(
    ("changes", "passive"),
    [
        ({}, True),
        ({"damping": np.array([1.0, -0.2, 0.3, 0.4, 0.5, 0.6])}, False),
        ({"mass_proportional": -0.1}, False),
        ({"stiffness_proportional": -0.1}, False),
        ({"stiffness": np.array([90.0, 90.0, 90.0, 90.0, -5.0, 90.0])}, True),
        ({"stiffness": np.array([90.0, 90.0, 90.0, 90.0, -500.0, 90.0])}, False),
        ({"loss_factor": np.array([0.0, 0.0, -0.1, 0.0, 0.0, 0.0])}, False),
        ({"extra_damping": 0.1 * np.ones((4, 4))}, True),
        ({"extra_damping": -0.01 * np.eye(4)}, True),
        ({"extra_damping": -9.0 * np.eye(4)}, False),
        ({"extra_damping": np.diag([0.5, 0, 0], 1)}, False),
    ],
)
def test_a_system_is_passive_only_where_nothing_can_feed_it(changes: dict[str, object], passive: bool) -> None:
    """A negative term that the others outweigh feeds nothing; D and K as a whole decide."""
    system = network(1).with_values(**changes)
    C = system.C.toarray()
    assert normalise(system).passive is passive
    assert normalise(system).symmetric is bool(np.all(C == C.T))


def test_only_symmetric_matrices_go_without_skew_stiffness() -> None:
    assert normalise(CASES["full mass matrix"]).skew_stiffness is None
    assert normalise(CASES["unsymmetric"]).skew_stiffness is not None


def test_a_damper_of_zero_leaves_a_system_passive() -> None:
    graph = nx.MultiGraph(directions=("x",), damping={})
    graph.add_node("ground", kind="ground")
    graph.add_node("a", mass=1.0)
    graph.add_edge("a", "ground", key="s", between=("a", "ground"), stiffness=9.0, damping=1.0)
    system = mdof.assemble(graph)
    assert normalise(system.with_values(damping=np.zeros(1))).passive
