"""mdof.eigen.mass: mass to the identity, massless coordinates condensed."""

from __future__ import annotations

import itertools

import networkx as nx
import numpy as np
import pytest
from scipy.sparse import csc_array

import mdof
from mdof.eigen.mass import mass_basis, turned
from mdof.eigen.reduce import normalise
from mdof.errors import UnverifiedError


def test_the_basis_makes_mass_the_identity_over_twenty_orders() -> None:
    mass = np.diag([1e-10, 3.0, 1e10])
    mass[0, 1] = mass[1, 0] = 1e-6
    basis, heavy, amplification = mass_basis(csc_array(mass))
    assert heavy == 3
    assert basis.T @ mass @ basis == pytest.approx(np.eye(3), abs=1e-14)
    assert amplification < 10


def test_massless_coordinates_come_last() -> None:
    basis, heavy, _ = mass_basis(csc_array(np.diag([0.0, 4.0, 0.0])))
    assert heavy == 1
    assert basis.T @ np.diag([0.0, 4.0, 0.0]) @ basis == pytest.approx(np.diag([1.0, 0.0, 0.0]))


def test_a_mass_matrix_of_lower_rank_counts_its_rank() -> None:
    """One mass seen by two coordinates."""
    mass = np.array([[2.0, 2.0], [2.0, 2.0]])
    basis, heavy, _ = mass_basis(csc_array(mass))
    assert heavy == 1
    assert basis.T @ mass @ basis == pytest.approx(np.diag([1.0, 0.0]), abs=1e-12)


def test_condensation_is_static_equilibrium() -> None:
    """m on k1, a joint, k2 to ground: two springs in series, and the joint moves by its share."""
    K = np.array([[3.0, -3.0], [-3.0, 3.0 + 6.0]])
    (mode,) = mdof.solve(mdof.System.from_matrices(np.diag([2.0, 0.0]), np.zeros((2, 2)), K))
    assert mode.natural_frequency == pytest.approx(np.sqrt(3 * 6 / 9 / 2), rel=1e-14)
    assert mode.shape[1] / mode.shape[0] == pytest.approx(3 / 9, rel=1e-13)


def test_a_damped_massless_coordinate_keeps_its_first_order_equation() -> None:
    """A mass on a spring in series with a damper: m λ² (k + cλ) + k c λ = 0 has the roots 0 and the rest."""
    m, k, c = 2.0, 5.0, 0.7
    K = np.array([[k, -k], [-k, k]])
    modes = mdof.solve(mdof.System.from_matrices(np.diag([m, 0.0]), np.diag([0.0, c]), K))
    found = np.sort_complex(modes.eigenvalues[~np.isnan(modes.eigenvalues)])
    assert found == pytest.approx(np.sort_complex(np.roots([m * c, m * k, k * c, 0])), abs=1e-12)
    assert normalise(mdof.System.from_matrices(np.diag([m, 0.0]), np.diag([0.0, c]), K)).heavy == 1


def joints(stiffness: list[float], negative: float = 0.0) -> mdof.System:
    """A mass, a row of joints and the ground, so that all springs stand in series; a negative spring on the mass."""
    graph = nx.MultiGraph(directions=("x",), damping={})
    graph.add_node("ground", kind="ground")
    graph.add_node("m", mass=2.0)
    names = ["m", *(f"j{index}" for index in range(len(stiffness) - 1)), "ground"]
    for name in names[1:-1]:
        graph.add_node(name, mass=0.0, massless=True)
    for index, (a, b) in enumerate(itertools.pairwise(names)):
        graph.add_edge(a, b, key=f"s{index}", between=(a, b), stiffness=stiffness[index])
    if negative:
        graph.add_edge("m", "ground", key="n", between=("m", "ground"), stiffness=negative)
    return mdof.assemble(graph)


@pytest.mark.parametrize("stiffness", [[3.0, 6.0], [3.0, 6.0, 9.0], [1e8, 1.0, 1e-6, 1e4], [1e-10, 1e10]])
def test_a_row_of_joints_is_springs_in_series_and_divides_the_stretch(stiffness: list[float]) -> None:
    """One over the sum of compliances; each joint keeps the compliance below it."""
    compliance = 1 / np.array(stiffness)
    (mode,) = mdof.solve(joints(stiffness))
    assert mode.natural_frequency == pytest.approx(np.sqrt(1 / compliance.sum() / 2.0), rel=1e-13)
    below = 1 - np.cumsum(compliance)[:-1] / compliance.sum()
    assert np.real(mode.shape[1:] / mode.shape[0]) == pytest.approx(below, rel=1e-9, abs=1e-13)


def test_joints_are_condensed_beside_a_negative_spring_too() -> None:
    (mode,) = mdof.solve(joints([3.0, 6.0, 9.0], negative=-1.0))
    assert mode.natural_frequency == pytest.approx(np.sqrt((1 / (1 / 3 + 1 / 6 + 1 / 9) - 1.0) / 2.0), rel=1e-13)
    assert np.real(mode.shape[1] / mode.shape[0]) == pytest.approx((1 / 6 + 1 / 9) / (1 / 3 + 1 / 6 + 1 / 9), rel=1e-12)


@pytest.mark.parametrize("seed", range(4))
def test_a_damper_across_joints_keeps_one_equation_and_condenses_the_rest(seed: int) -> None:
    """Two masses, three joints held by springs both ways, one oblique damper between them: 2·2 + 1 roots."""
    rng = np.random.default_rng(seed)
    A = rng.normal(size=(5, 5))
    K = A @ A.T + np.eye(5)
    b = np.concatenate([np.zeros(2), rng.normal(size=3)])
    M, C = np.diag([1.0, 2.0, 0.0, 0.0, 0.0]), 0.7 * np.outer(b, b)
    system = mdof.System.from_matrices(M, C, K)
    problem = normalise(system)
    assert (problem.heavy, problem.recover.shape[1]) == (2, 3)
    modes = mdof.solve(system)
    assert modes.verification.eigenvalues_found == 5
    for mode in modes:
        value, x = mode.eigenvalues[0], mode.shape
        assert np.linalg.norm((value**2 * M + value * C + K) @ x) < 1e-12 * np.linalg.norm(K)


def test_a_damped_joint_between_factors_solves_its_own_equation() -> None:
    """m ẍ + k₁(x − y) = 0, c ẏ + k₂ y = k₁(x − y), from springs and a damper as factors."""
    m, k1, k2, c = 2.0, 30.0, 50.0, 0.8
    graph = nx.MultiGraph(directions=("x",), damping={})
    graph.add_node("ground", kind="ground")
    graph.add_node("m", mass=m)
    graph.add_node("y", mass=0.0, massless=True)
    graph.add_edge("m", "y", key="a", between=("m", "y"), stiffness=k1)
    graph.add_edge("y", "ground", key="b", between=("y", "ground"), stiffness=k2, damping=c)
    modes = mdof.solve(mdof.assemble(graph))
    found = np.sort_complex(modes.eigenvalues[~np.isnan(modes.eigenvalues)])
    assert found == pytest.approx(np.sort_complex(np.roots([m * c, m * (k1 + k2), k1 * c, k1 * k2])), rel=1e-11)


def test_a_joint_that_cancelling_springs_leave_loose_is_refused() -> None:
    system = joints([5.0, 5.0]).with_values(stiffness=np.array([5.0, -5.0]))
    with pytest.raises(UnverifiedError, match="neither stiffness nor damping"):
        mdof.solve(system)


@pytest.mark.parametrize(("low", "accepted"), [(1e-18, True), (-1e-18, True), (-1e-3, False)])
def test_a_mass_matrix_may_be_indefinite_within_rounding_only(low: float, accepted: bool) -> None:
    turn = np.array([[0.6, -0.8], [0.8, 0.6]])
    mass = turn @ np.diag([low, 2.0]) @ turn.T
    if accepted:
        assert mass_basis(csc_array(mass))[1] == 1
    else:
        with pytest.raises(UnverifiedError, match=r"lowest scaled eigenvalue -"):
            mass_basis(csc_array(mass))


def test_the_magnification_of_rounding_grows_with_coupling_and_not_with_scale() -> None:
    """Two coordinates far from a centre: the closer to one motion, the more mass normalisation cancels."""

    def amplification(coupling: float, scale: float) -> float:
        return mass_basis(csc_array(np.array([[1.0, coupling * scale], [coupling * scale, scale**2]])))[2]

    assert amplification(0.0, 1e6) == 1.0
    assert amplification(0.5, 1.0) == pytest.approx(amplification(0.5, 1e8), rel=1e-9)
    assert amplification(0.999999, 1.0) > 100 * amplification(0.5, 1.0)
    singular = np.diag([1.0, 1e-6, 0.0])
    singular[0, 2] = singular[2, 0] = singular[2, 2] = 1.0
    assert 1.0 <= mass_basis(csc_array(singular))[2] < 10


@pytest.mark.parametrize("density", [0.1, 1.0])
def test_rows_are_turned_the_same_dense_or_sparse_by_any_basis(density: float) -> None:
    rng = np.random.default_rng(0)
    rows = rng.normal(size=(6, 4)) * (rng.random((6, 4)) < density)
    square = np.diag([1.0, 2.0, 3.0, 4.0])
    full = rng.normal(size=(4, 4))
    nearly = square.copy()
    nearly[2, 3] = 0.5
    for basis in (square, full, nearly, rng.normal(size=(4, 3))):
        for given in (rows, csc_array(rows)):
            assert turned(given, basis) == pytest.approx(rows @ basis, rel=1e-14, abs=1e-15)
    assert turned(square, full) == pytest.approx(square @ full)
    assert turned(nearly, full) == pytest.approx(nearly @ full)
    assert turned(np.zeros((0, 4)), full).shape == (0, 4)
