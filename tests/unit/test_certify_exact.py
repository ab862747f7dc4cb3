"""mdof.certify.exact_factors, exact_pencils and free_motions: rational arithmetic."""

from __future__ import annotations

import dataclasses
from fractions import Fraction

import numpy as np
import pytest
from flint import fmpq_mat

import mdof
from mdof import System
from mdof.certify import Verdict, certify
from mdof.certify.exact_factors import connected_parts, exact_matrices
from mdof.certify.exact_pencils import SingularPencilError, pencils
from mdof.certify.free_motions import freed


def fractions(matrix: fmpq_mat) -> list[list[Fraction]]:
    return [[Fraction(int(value.p), int(value.q)) for value in row] for row in matrix.tolist()]


def counts(M: object, C: object, K: object) -> list[tuple[int, int, bool]]:
    exact = exact_matrices(System.from_matrices(M, C, K))
    return [
        (pencil.count, pencil.zeros, pencil.squared)
        for index in connected_parts(exact)
        for pencil in pencils(exact.restricted(index))
    ]


def test_factors_are_multiplied_without_rounding() -> None:
    """0.1 is not a tenth, and 1e20 + 0.1 does not lose the 0.1."""
    system = System.from_factors(np.eye(2), [[1.0, 0.1], [0.0, 1.0]], [0.1, 1e20], [[1.0], [0.0]], [0.3])
    system = system.with_values(
        loss_factor=[0.1, 0.0], loss_reference=[3.0, np.nan], mass_proportional=0.7, stiffness_proportional=0.01
    )
    exact = exact_matrices(system)
    tenth, big = Fraction(0.1), Fraction(1e20)
    K = [[tenth + tenth * tenth * big, tenth * big], [tenth * big, big]]
    assert fractions(exact.stiffness) == K
    own = Fraction(0.3) + tenth * tenth / 3 + Fraction(0.7)
    assert fractions(exact.damping)[0][0] == own + Fraction(0.01) * K[0][0]
    assert fractions(exact.damping)[0][1] == Fraction(0.01) * K[0][1]


def test_a_loss_factor_without_reference_stays_apart() -> None:
    system = System.from_factors(np.eye(1), [[2.0]], [5.0]).with_values(loss_factor=[0.25])
    exact = exact_matrices(system)
    assert fractions(exact.loss) == [[Fraction(5)]]
    assert fractions(exact.damping) == [[Fraction(0)]]


@pytest.mark.parametrize(
    ("M", "C", "K", "expected"),
    [
        # One oscillator, damped, undamped, free, free with drag.
        ([[1]], [[1]], [[1]], [(2, 0, False)]),
        ([[1]], [[0]], [[1]], [(2, 0, True)]),
        ([[1]], [[0]], [[0]], [(2, 2, True)]),
        ([[1]], [[3]], [[0]], [(2, 1, False)]),
        # Two uncoupled ones are two parts.
        (np.eye(2), np.diag([1, 0]), np.eye(2), [(2, 0, False), (2, 0, True)]),
        # Joined by a dashpot only: roots 0, 0, 0 and −c/μ. The common motion is undamped, the relative one damped.
        (np.eye(2), [[1, -1], [-1, 1]], np.zeros((2, 2)), [(2, 2, True), (2, 1, False)]),
        # A massless joint: held by springs it is no state, with a damper it is one of first order.
        (np.diag([1, 0]), np.zeros((2, 2)), [[1, -1], [-1, 3]], [(2, 0, True)]),
        (np.diag([1, 0]), [[0, 0], [0, 2]], [[1, -1], [-1, 3]], [(3, 0, False)]),
        # Equal masses with a damper between them: the common swing is undamped.
        (np.eye(2), [[1, -1], [-1, 1]], 3 * np.eye(2), [(2, 0, True), (2, 0, False)]),
        # A gyroscopic joint without mass has two states of first order.
        (np.zeros((2, 2)), [[0, 1], [-1, 0]], np.eye(2), [(2, 0, False)]),
        # The middle of three equal masses is damped: the antisymmetric swing is not.
        (np.eye(3), np.diag([0, 1, 0]), [[2, -1, 0], [-1, 2, -1], [0, -1, 2]], [(2, 0, True), (4, 0, False)]),
    ],
)
def test_zero_infinite_and_undamped_roots_are_counted(
    M: object, C: object, K: object, expected: list[tuple[int, int, bool]]
) -> None:
    assert sorted(counts(M, C, K)) == sorted(expected)


def test_a_motion_that_nothing_holds_has_no_count() -> None:
    exact = exact_matrices(System.from_matrices(np.diag([1.0, 0]), np.zeros((2, 2)), np.diag([1.0, 0])))
    with pytest.raises(SingularPencilError):
        [pencils(exact.restricted(index)) for index in connected_parts(exact)]


def test_rounded_directions_are_corrected_until_the_motion_is_free() -> None:
    """Two bodies in a plane, three oblique springs between them, the last digit of one cosine wrong."""
    columns = np.array([[0.1, 0.2, -0.1, -np.nextafter(0.2, 1)], [0.3, 0, -0.3, 0], [0.7, -0.3, -0.7, 0.3]]).T
    system = System.from_factors(np.eye(4), columns, [1e3, 2e3, 5e2])
    modes = mdof.solve(system)
    assert modes.regimes.count(mdof.Regime.RIGID_BODY) == 2
    assert exact_matrices(system).stiffness.rank() == 3
    nearest = freed(modes)
    assert nearest is not None
    assert 0 < nearest.correction < 1e-15
    assert nearest.matrices.stiffness.rank() == 2
    certificate = certify(modes)
    assert certificate.summary == "4 of 4 modes proven at 128 bits"
    assert sum(proof.correction > 0 for proof in certificate.modes) == 1


def test_a_motion_that_is_truly_held_is_not_corrected_away() -> None:
    """A soft spring to the ground, stated as free."""
    columns = np.array([[1.0, -1.0], [1.0, 0.0]]).T
    modes = mdof.solve(System.from_factors(np.eye(2), columns[:, :1], [1e3]))
    held = modes.system.with_values(
        spring_columns=columns, stiffness=[1e3, 1e-6], loss_factor=[0, 0], loss_reference=[np.nan] * 2
    )
    certificate = certify(dataclasses.replace(modes, system=held))
    assert certificate.modes[0].verdict is Verdict.CONTRADICTED
    assert certificate.contradicted


def test_rounded_stiffness_matrices_leave_free_motions_undecided() -> None:
    K = np.array([[0.3, -0.1, -0.2], [-0.1, 0.1, 0], [-0.2, 0, 0.2]])
    assert exact_matrices(System.from_matrices(np.eye(3), np.zeros((3, 3)), K)).stiffness.rank() == 3
    certificate = certify(mdof.solve(System.from_matrices(np.eye(3), np.zeros((3, 3)), K)))
    assert [str(proof.verdict) for proof in certificate.modes] == ["undecided", "proven", "proven"]
    assert "rounded numbers" in certificate.modes[0].reason
