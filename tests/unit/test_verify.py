"""mdof.eigen.verify: judging eigenpairs."""

from __future__ import annotations

import networkx as nx
import numpy as np
import pytest

import mdof
from mdof.eigen.quadratic import solve_complete
from mdof.eigen.reduce import normalise
from mdof.eigen.verify import check_completeness, damping_times, judge, measure, real_times
from mdof.errors import UnverifiedError

STATE = np.array([[0.0, 0.0, 2.0, 0.0], [0.0, 0.0, 0.0, 3.0], [-2.0, 0.0, -0.4, 0.1], [0.0, -3.0, 0.1, -0.2]])


def test_all_eigenvalues_pass() -> None:
    check_completeness(STATE, np.linalg.eigvals(STATE))


@pytest.mark.parametrize("change", ["lost", "doubled", "moved"])
def test_a_wrong_set_of_eigenvalues_is_refused(change: str) -> None:
    values = np.linalg.eigvals(STATE)
    if change == "lost":
        values = values[:-1]
    elif change == "doubled":
        values[0] = values[2]
    else:
        values[0] += 1e-6
    with pytest.raises(UnverifiedError, match=r"report|traces"):
        check_completeness(STATE, values)


def test_a_missing_undamped_pair_shows_in_the_sum_of_squares() -> None:
    """Its sum is zero, so the trace alone would not see it."""
    state = np.array([[0.0, 2.0, 0, 0], [-2.0, 0, 0, 0], [0, 0, 0, 3.0], [0, 0, -3.0, 0]])
    with pytest.raises(UnverifiedError, match="traces"):
        check_completeness(state, np.array([2j, -2j, 2j, -2j]))


def problem_of(seed: int) -> object:
    rng = np.random.default_rng(seed)
    A, B = rng.normal(size=(2, 5, 5))
    return normalise(mdof.System.from_matrices(np.diag(rng.uniform(1, 4, 5)), A @ A.T, B @ B.T + np.eye(5)))


def test_residuals_are_those_of_the_quadratic() -> None:
    problem = problem_of(1)
    rng = np.random.default_rng(0)
    values, vectors = rng.normal(size=3) + 1j * rng.normal(size=3), rng.normal(size=(5, 3)) + 0j
    dense = [
        (v**2 * np.eye(5) + v * problem.damping + np.diag(problem.sigma**2)) @ z
        for v, z in zip(values, vectors.T, strict=True)
    ]
    assert measure(problem, values, vectors).rest == pytest.approx(np.array(dense).T, rel=1e-12)


def test_the_bound_grows_with_an_error_that_is_put_in() -> None:
    problem = problem_of(2)
    roots = solve_complete(problem)
    clean = judge(problem, roots.values, roots.vectors)
    off = judge(problem, roots.values * (1 + 1e-9), roots.vectors)
    assert np.all(off.bound >= 0.5e-9 * np.abs(roots.values))
    assert np.all(clean.bound < 1e-12 * np.abs(roots.values))
    # The correction the residual proposes undoes the error.
    assert roots.values * (1 + 1e-9) + measure(problem, roots.values * (1 + 1e-9), roots.vectors).step == pytest.approx(
        roots.values, rel=1e-13
    )


def test_left_vectors_serve_unsymmetric_problems() -> None:
    """The eigenvalue's first-order change is yᵀ dQ x over yᵀ Q' x: against a finite difference."""
    rng = np.random.default_rng(4)
    M, C, K = np.eye(3), 0.2 * np.eye(3) + np.diag([1.0, 1.0], 1), 9 * np.eye(3) + rng.normal(size=(3, 3))
    roots = solve_complete(normalise(mdof.System.from_matrices(M, C, K)))
    assert roots.left is not None
    judged = judge(normalise(mdof.System.from_matrices(M, C, K)), roots.values, roots.vectors, roots.left)
    assert np.all(judged.backward < 1e-14)
    assert np.all(np.isfinite(judged.bound))


def chain(kind: str) -> mdof.System:
    """Four masses in a row; what else there is decides how rounding is reckoned."""
    rng = np.random.default_rng(3)
    graph = nx.MultiGraph(directions=("x",), damping={})
    graph.add_node("ground", kind="ground")
    last = "ground"
    for name in "abcd":
        joint = name == "b" and "joint" in kind
        graph.add_node(name, mass=0.0 if joint else float(rng.uniform(1, 4)), **({"massless": True} if joint else {}))
        data = {"stiffness": float(rng.uniform(20, 90)), "damping": float(rng.uniform(0.2, 3))}
        graph.add_edge(name, last, key=name, between=(name, last), **data)
        last = name
    if "negative" in kind:
        graph.add_edge("d", "ground", key="n", between=("d", "ground"), stiffness=-0.7)
    system = mdof.assemble(graph)
    if "full" in kind:
        system = system.with_values(extra_damping=0.1 * np.eye(4) + 0.02 * np.ones((4, 4)))
    return system


def every_root(system: mdof.System) -> np.ndarray:
    return solve_complete(normalise(system)).values


@pytest.mark.parametrize("kind", ["plain", "full", "negative", "joint", "joint, negative"])
def test_the_bound_is_what_rounding_of_every_given_number_can_do(kind: str) -> None:
    """Masses, springs and dampers off by a relative 1e-7 move no root beyond the bound in that unit, nor far below."""
    system = chain(kind)
    roots = solve_complete(normalise(system))
    assert np.all(roots.bounds < 1e-11 * np.abs(roots.values))
    rng = np.random.default_rng(0)
    size, worst = 1e-7, np.zeros(len(roots.values))
    for _ in range(60):
        masses, springs, dampers = (
            1 + size * rng.choice([-1.0, 1.0], count)
            for count in (system.size, len(system.stiffness), len(system.damping))
        )
        moved = every_root(
            system.with_values(
                mass=system.mass.toarray() * masses,
                stiffness=system.stiffness * springs,
                damping=system.damping * dampers,
            )
        )
        worst = np.maximum(worst, np.abs(roots.values[:, None] - moved[None, :]).min(axis=1))
    scaled = roots.bounds * size / 2.0**-52
    assert np.all(worst <= scaled)
    # An indefinite stiffness goes through a matrix, whose rounding is a share of its largest entries.
    assert np.all(scaled <= (1000 if "negative" in kind else 100) * worst)


def test_the_coarse_second_order_term_of_large_problems_is_never_below_the_fine_one(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    problem = problem_of(3)
    roots = solve_complete(problem)
    spoilt = roots.vectors + 1e-4 * np.random.default_rng(0).normal(size=roots.vectors.shape)
    fine = judge(problem, roots.values, spoilt).bound
    monkeypatch.setattr("mdof.eigen.verify._MANY", 0)
    coarse = judge(problem, roots.values, spoilt).bound
    assert np.all(coarse >= fine)
    assert np.any(coarse > 1.01 * fine)


def test_an_error_in_the_vector_alone_is_bounded_by_its_second_order_effect() -> None:
    """A Rayleigh quotient of a spoilt vector is off by the square of the error; the bound covers it."""
    problem = problem_of(4)
    roots = solve_complete(problem)
    for size in (1e-3, 1e-5):
        spoilt = roots.vectors + size * np.random.default_rng(1).normal(size=roots.vectors.shape)
        spoilt = spoilt / np.linalg.norm(spoilt, axis=0)
        values = roots.values.copy()
        for _ in range(4):
            values = values + measure(problem, values, spoilt).step
        bound = judge(problem, values, spoilt).bound
        error = np.abs(values - roots.values)
        # Far beyond rounding, so that it is the second-order term that is seen.
        assert error.max() > 1e-4 * size**2
        assert np.all(error <= 2 * bound)
        assert np.all(bound <= 1e5 * size**2)


def test_damping_forces_through_the_factors_are_those_of_the_matrix() -> None:
    """Few dampers and proportional terms take the way through the factors."""
    system = few_dampers()
    problem = normalise(system)
    assert problem.own_damping is not None
    vectors = np.random.default_rng(0).normal(size=(20, 3)) + 1j * np.random.default_rng(1).normal(size=(20, 3))
    wanted = problem.recover.T @ system.C.toarray() @ problem.recover @ vectors
    assert damping_times(problem, vectors, None) == pytest.approx(wanted, rel=1e-11)


def few_dampers() -> mdof.System:
    graph = nx.MultiGraph(directions=("x",), damping={"mass_proportional": 0.2, "stiffness_proportional": 0.01})
    graph.add_node("ground", kind="ground")
    for index in range(20):
        graph.add_node(index, mass=1.0 + 0.1 * index)
        last = index - 1 if index else "ground"
        own = {"damping": -0.5 if index else 2.0} if index in (0, 7) else {}
        graph.add_edge(index, last, key=f"s{index}", between=(index, last), stiffness=10.0 + index, **own)
    return mdof.assemble(graph)


def test_loss_factors_count_with_the_reference_of_each_root() -> None:
    system = chain("plain").with_values(loss_factor=np.array([0.1, 0.0, 0.3, 0.0]))
    problem = normalise(system)
    rng = np.random.default_rng(2)
    values, vectors = rng.normal(size=2) + 1j * rng.normal(size=2), rng.normal(size=(4, 2)) + 0j
    references = np.array([2.0, 9.0])
    for index, reference in enumerate(references):
        x = problem.recover @ vectors[:, index]
        force = values[index] ** 2 * system.M @ x + values[index] * system.damping_matrix(reference) @ x + system.K @ x
        wanted = problem.recover.T @ force
        seen = measure(problem, values, vectors, None, references)
        assert seen.rest[:, index] == pytest.approx(wanted, rel=1e-11)
        assert seen.numerator[index] == pytest.approx(vectors[:, index] @ wanted, rel=1e-11)
        slope = 2 * values[index] * (x @ (system.M @ x)) + x @ (system.damping_matrix(reference) @ x)
        assert seen.slope[index] == pytest.approx(slope, rel=1e-11)


def test_a_real_matrix_times_complex_columns() -> None:
    rng = np.random.default_rng(0)
    A, x = rng.normal(size=(3, 4)), rng.normal(size=(4, 2)) + 1j * rng.normal(size=(4, 2))
    assert real_times(A, x) == pytest.approx(A.astype(complex) @ x, rel=1e-14)


@pytest.mark.parametrize("scale", [1e-12, 1.0, 1e12])
def test_completeness_does_not_depend_on_the_unit_of_time(scale: float) -> None:
    values = np.linalg.eigvals(scale * STATE)
    check_completeness(scale * STATE, values)
    with pytest.raises(UnverifiedError, match="traces"):
        check_completeness(scale * STATE, values[[0, 0, 2, 3]])
