"""mdof.eigen.oscillators: uncoupled modes as scalar quadratics."""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest

import mdof


def one(damping: float, stiffness: float) -> mdof.Mode:
    return mdof.solve(mdof.System.from_matrices([[1.0]], [[damping]], [[stiffness]]))[0]


def quadratic_roots(damping: mp.mpf) -> list[mp.mpc]:
    """Roots of λ² + dλ + 1."""
    root = mp.sqrt(damping * damping - 4)
    return [(-damping + root) / 2, (-damping - root) / 2]


@pytest.mark.parametrize("damping", [1e-12, 0.3, 1.999999999, 2.000000001, 50.0, 1e9])
def test_both_roots_keep_all_digits(damping: float) -> None:
    mode = one(damping, 1.0)
    with mp.workdps(50):
        exact = quadratic_roots(mp.mpf(damping))
        for value in mode.eigenvalues:
            error = min(abs(mp.mpc(value) - root) / abs(root) for root in exact)
            # Beside the double root the roots themselves are less well conditioned than their sum and product.
            assert error < 4e-16 / min(1, abs(damping / 2 - 1) ** 0.5 + 1e-8)


def test_the_exact_double_root_is_one_root_twice() -> None:
    mode = one(6.0, 9.0)
    assert mode.eigenvalues == (-3 + 0j, -3 + 0j)
    assert (mode.regime, mode.damping_ratio) == ("critically damped", pytest.approx(1.0, rel=1e-15))


@pytest.mark.parametrize("ratio", [1 - 1e-6, 1 + 1e-6])
def test_a_millionth_off_critical_is_not_critical(ratio: float) -> None:
    assert one(2 * ratio, 1.0).regime != "critically damped"


def test_a_negative_stiffness_diverges_whatever_the_damping() -> None:
    mode = one(5.0, -6.0)
    assert np.sort([value.real for value in mode.eigenvalues]) == pytest.approx([-6.0, 1.0], rel=1e-14)
    assert mode.regime == "divergent"
