"""mdof.eigen.mass: mass to the identity, massless coordinates condensed."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.sparse import csc_array

import mdof
from mdof.eigen.mass import mass_basis
from mdof.eigen.reduce import normalise


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
