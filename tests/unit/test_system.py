"""mdof.system: the frozen System."""

from __future__ import annotations

import re

import numpy as np
import pytest
import scipy.sparse

import mdof
from mdof import System, UsageError

EYE = np.eye(2)


@pytest.mark.parametrize(
    ("M", "C", "K", "labels", "words"),
    [
        (np.ones((2, 3)), EYE, EYE, None, "square"),
        (EYE, np.eye(3), EYE, None, "C must have shape"),
        (EYE, EYE, EYE * 1j, None, "real"),
        (EYE, EYE, [[1, np.nan], [0, 1]], None, "NaN"),
        ([[1, 0.1], [0, 1]], EYE, EYE, None, "symmetric"),
        (np.zeros((0, 0)), np.zeros((0, 0)), np.zeros((0, 0)), None, "empty"),
        (EYE, EYE, EYE, ["a.x", "a.x"], "different"),
        (EYE, EYE, EYE, ["a.x"], "2 different"),
    ],
)
def test_wrong_matrices_are_refused(M: object, C: object, K: object, labels: list[str] | None, words: str) -> None:
    with pytest.raises(UsageError, match=words):
        System.from_matrices(M, C, K, labels)


def test_sparse_and_dense_matrices_give_the_same_system() -> None:
    K = np.array([[3.0, -1.0], [-1.0, 2.0]])
    dense, sparse = (
        System.from_matrices(form(EYE), form(0.1 * K), form(K)) for form in (np.array, scipy.sparse.coo_array)
    )
    assert (dense.K != sparse.K).nnz == 0
    assert (dense.C != sparse.C).nnz == 0


def test_labels_split_at_the_last_dot() -> None:
    system = System.from_matrices(EYE, EYE, EYE, ["pump.main.rz", "fan"])
    assert system.coordinate_bodies == ("pump.main", "fan")
    assert system.coordinate_directions == ("rz", "x")
    assert system.labels == ("pump.main.rz", "fan.x")


def test_changed_values_make_a_new_system() -> None:
    system = System.from_matrices(EYE, EYE, EYE)
    other = system.with_values(mass_proportional=0.5)
    assert (system.mass_proportional, other.mass_proportional) == (0.0, 0.5)
    assert other.C.toarray() == pytest.approx(1.5 * EYE)
    with pytest.raises(UsageError, match="stifness"):
        system.with_values(stifness=1)


def test_the_damping_matrix_holds_every_kind_of_damping() -> None:
    graph_system = System.from_matrices(EYE, np.array([[0.0, 1.0], [-1.0, 0.0]]), EYE)
    system = graph_system.with_values(
        spring_columns=np.array([[1.0], [-1.0]]),
        stiffness=np.array([10.0]),
        loss_factor=np.array([0.2]),
        loss_reference=np.array([5.0]),
        spring_names=("s",),
        spring_grounded=np.array([False]),
        damper_columns=np.array([[1.0], [0.0]]),
        damping=np.array([3.0]),
        damper_names=("d",),
        damper_spring=np.array([-1]),
        damper_grounded=np.array([True]),
        mass_proportional=0.5,
        stiffness_proportional=0.01,
    )
    pair = np.array([[1.0, -1.0], [-1.0, 1.0]])
    K = np.eye(2) + 10 * pair
    wanted = np.diag([3.0, 0.0]) + 0.2 * 10 / 5 * pair + 0.5 * EYE + 0.01 * K + np.array([[0, 1.0], [-1.0, 0]])
    assert system.K.toarray() == pytest.approx(K)
    assert system.C.toarray() == pytest.approx(wanted)


def test_values_cannot_be_changed_in_place() -> None:
    system = mdof.assemble(
        mdof.Model(bodies={"a": "1 kg"}, connections={"s": {"between": ["a", "ground"], "stiffness": "1 N/m"}})
    )
    with pytest.raises(ValueError, match="read-only"):
        system.stiffness[0] = 2.0


def with_springs(**more: object) -> System:
    """Two coordinates, two spring columns, the second with a loss factor."""
    return System.from_matrices(EYE, np.zeros((2, 2)), np.zeros((2, 2))).with_values(
        spring_columns=np.array([[1.0, 1.0], [0.0, -1.0]]),
        stiffness=np.array([10.0, 20.0]),
        loss_factor=np.array([0.0, 0.3]),
        loss_reference=np.array([np.nan, np.nan]),
        spring_names=("s", "t"),
        spring_grounded=np.array([True, False]),
        **more,
    )


def test_loss_factors_act_at_their_own_reference_or_the_given_one_or_not_at_all() -> None:
    floating = with_springs()
    stated = floating.with_values(loss_reference=np.array([np.nan, 5.0]))
    assert (floating.has_floating_loss_factors, stated.has_floating_loss_factors) == (True, False)
    assert floating.loss_damping().tolist() == [0.0, 0.0]
    assert floating.loss_damping(2.0).tolist() == [0.0, 3.0]
    assert stated.loss_damping().tolist() == stated.loss_damping(2.0).tolist() == [0.0, 1.2]
    pair = np.array([[1.0, -1.0], [-1.0, 1.0]])
    assert floating.damping_matrix(2.0).toarray() == pytest.approx(3.0 * pair)
    assert floating.C.nnz == 0 or not floating.C.toarray().any()
    # A reference without a loss factor makes none.
    idle = floating.with_values(loss_factor=np.zeros(2))
    assert not idle.has_floating_loss_factors
    assert idle.loss_damping(2.0).tolist() == [0.0, 0.0]


@pytest.mark.parametrize(
    ("changes", "symmetric"),
    [
        ({}, True),
        ({"extra_damping": np.array([[1.0, 2.0], [2.0, 5.0]])}, True),
        ({"extra_damping": np.array([[1.0, 2.0], [2.5, 5.0]])}, False),
        ({"extra_stiffness": np.array([[1.0, 2.0], [-2.0, 5.0]])}, False),
        ({"gyroscopic": np.array([[0.0, 2.0], [-2.0, 0.0]])}, False),
        ({"gyroscopic": np.zeros((2, 2))}, True),
    ],
)
def test_a_system_knows_whether_it_is_symmetric(changes: dict[str, object], symmetric: bool) -> None:
    assert with_springs(**changes).is_symmetric is symmetric


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"spring_columns": np.ones((3, 2))}, "spring_columns must have 2 rows, not 3"),
        ({"stiffness": np.array([1.0, np.inf])}, "stiffness holds NaN or infinite"),
        ({"loss_factor": np.array([np.nan, 0.0])}, "loss_factor holds NaN"),
        ({"damper_columns": np.array([[np.nan], [1.0]])}, "damper_columns holds NaN"),
        ({"gyroscopic": np.zeros((3, 3))}, "gyroscopic must have shape"),
        ({"mass": np.ones((2, 3))}, "square"),
    ],
)
def test_values_that_do_not_fit_are_refused_by_name(changes: dict[str, object], words: str) -> None:
    with pytest.raises(UsageError, match=re.escape(words)):
        with_springs().with_values(**changes)


@pytest.mark.parametrize(("off", "accepted"), [(2e-16, True), (1e-14, False)])
@pytest.mark.parametrize("scale", [1e-9, 1.0, 1e9])
def test_mass_may_be_unsymmetric_by_rounding_only_in_any_unit(off: float, accepted: bool, scale: float) -> None:
    M = scale * np.array([[2.0, 1.0], [1.0 + off, 2.0]])
    if accepted:
        System.from_matrices(M, EYE, EYE)
    else:
        with pytest.raises(UsageError, match="symmetric"):
            System.from_matrices(M, EYE, EYE)


def test_coordinates_without_names_are_numbered_and_numbers_alone_make_one_degree_of_freedom() -> None:
    assert System.from_matrices(EYE, EYE, EYE).labels == ("x1.x", "x2.x")
    single = System.from_matrices(2, 1, 8)
    assert (single.size, single.degrees_of_freedom, single.K.toarray().tolist()) == (1, 1, [[8.0]])


def test_a_reduced_coordinate_knows_the_described_one_that_it_is() -> None:
    """Rows of the recovery that hold a single 1; of two such rows the first counts."""
    recovery = np.array([[0.0, 1.0], [1.0, 0.4], [1.0, 0.0], [0.0, 1.0]])
    system = System.from_matrices(EYE, EYE, EYE).with_values(
        recovery=recovery, coordinate_bodies=("a", "b", "c", "d"), coordinate_directions=("x",) * 4
    )
    described, own = system.own_coordinates
    assert dict(zip(own.tolist(), described.tolist(), strict=True)) == {0: 2, 1: 0}


def test_first_order_states_are_no_degrees_of_freedom() -> None:
    system = System.from_matrices(np.diag([1.0, 0.0]), np.diag([0.0, 1.0]), EYE).with_values(first_order_states=1)
    assert (system.size, system.degrees_of_freedom) == (2, 1)
    assert repr(system).startswith("System(1 degrees of freedom, 0 spring columns")


def test_a_system_from_directions_and_values_has_their_matrices() -> None:
    system = System.from_factors(np.diag([1.0, 2.0]), [[1, 1], [-1, 0]], [3.0, 5.0], [[0, 1], [1, -1]], [7.0, 11.0])
    assert system.K.toarray().tolist() == [[8, -3], [-3, 3]]
    assert system.C.toarray().tolist() == [[11, -11], [-11, 18]]
    assert system.damper_spring.tolist() == [-1, 0]
    assert system.spring_grounded.tolist() == [False, True]
    assert System.from_factors([[1.0]], [[1.0]], [4.0]).C.toarray().tolist() == [[0]]


@pytest.mark.parametrize(
    ("columns", "stiffness", "words"),
    [
        ([[1.0], [0.0]], [1.0, 2.0], "spring_columns must have shape (2, 2) to go with M and stiffness, not (2, 1)"),
        ([[1.0]], [1.0], "spring_columns must have shape (2, 1)"),
        ([[1.0], [0.0]], [np.nan], "stiffness holds NaN"),
    ],
)
def test_factors_that_do_not_fit_are_refused(columns: object, stiffness: list[float], words: str) -> None:
    with pytest.raises(UsageError, match=re.escape(words)):
        System.from_factors(np.eye(2), columns, stiffness)
