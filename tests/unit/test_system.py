"""mdof.system: the frozen System."""

from __future__ import annotations

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
