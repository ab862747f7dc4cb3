"""mdof.eigen.oscillators: uncoupled modes as scalar quadratics."""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest

import mdof
from mdof.eigen.quadratic import Roots, solve_complete
from mdof.eigen.reduce import normalise


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


@pytest.mark.parametrize("damping", [-5.0, -2.5, 2.5, 5.0, 1e8, -1e8])
def test_real_roots_keep_all_digits_whether_they_decay_or_grow(damping: float) -> None:
    """Slow first: λ² + dλ + 1 = 0 with product 1, both roots of the sign of −d."""
    mode = one(damping, 1.0)
    with mp.workdps(50):
        exact = sorted(quadratic_roots(mp.mpf(damping)), reverse=True, key=lambda root: root.real)
        for value, root in zip(mode.eigenvalues, exact, strict=True):
            assert abs(mp.mpc(value) / root - 1) < 4e-16
    assert mode.regime == ("overdamped" if damping > 0 else "divergent")


@pytest.mark.parametrize(("damping", "stiffness"), [(5.0, -6.0), (-5.0, -6.0), (1e8, -1.0), (-1e8, -1.0), (0.0, -4.0)])
def test_the_roots_of_a_spring_that_pushes_have_its_product_and_the_sum_of_its_damper(
    damping: float, stiffness: float
) -> None:
    roots = [value.real for value in one(damping, stiffness).eigenvalues]
    with mp.workdps(50):
        d, k = mp.mpf(damping), mp.mpf(stiffness)
        root = mp.sqrt(d * d - 4 * k)
        for value, wanted in zip(sorted(roots), sorted([(-d - root) / 2, (-d + root) / 2]), strict=True):
            assert abs(mp.mpf(value) / wanted - 1) < 4e-16


@pytest.mark.parametrize("damping", [0.0, 3.0, 1e-12])
def test_without_a_spring_there_is_the_root_zero_and_the_drag(damping: float) -> None:
    mode = one(damping, 0.0)
    assert [value.real for value in mode.eigenvalues] == [0.0, -damping]
    assert mode.decay_rate == damping


@pytest.mark.parametrize("seed", range(5))
@pytest.mark.parametrize("gap", [0.0, 1e-15, 1e-13, 1e-9, 1e-3, -1e-15, -1e-13, -1e-9, -1e-3])
def test_the_bound_covers_the_error_through_the_double_root(gap: float, seed: int) -> None:
    """m, c, k given as floats; their exact roots against the computed ones, just below, at and above critical."""
    rng = np.random.default_rng(seed)
    m, k = rng.uniform(0.1, 10, 2)
    c = 2 * np.sqrt(m * k) * (1 + gap)
    problem = normalise(mdof.System.from_matrices([[m]], [[c]], [[k]]))
    roots = solve_complete(problem)
    with mp.workdps(50):
        m, c, k = (mp.mpf(float(value)) for value in (m, c, k))
        root = mp.sqrt(c * c - 4 * m * k)
        exact = [(-c + root) / (2 * m), (-c - root) / (2 * m)]
        for value, bound in zip(roots.values, roots.bounds, strict=True):
            error = min(abs(mp.mpc(complex(value)) - root) for root in exact)
            assert error <= bound
    assert np.all(roots.bounds < 1e-6 * np.abs(roots.values))
    if abs(gap) >= 1e-3:
        assert np.all(roots.bounds < 1e-12 * np.abs(roots.values))


@pytest.mark.parametrize("ratio", [1 + 1e-14, 1 - 1e-14, 1 + 1e-13, 1 - 1e-13])
def test_within_rounding_of_critical_there_is_one_double_root_or_an_honest_pair(ratio: float) -> None:
    mode = one(2 * ratio, 1.0)
    assert mode.regime == "critically damped"
    assert mode.damping_ratio == pytest.approx(1.0, abs=2e-13)
    assert mode.natural_frequency == pytest.approx(1.0, rel=1e-13)


@pytest.mark.parametrize("ratio", [0.05, 1 - 1e-12, 1.0, 1 + 1e-12, 8.0])
@pytest.mark.parametrize("scale", [2.0**-30, 2.0**30])
def test_roots_and_bounds_do_not_depend_on_the_unit_of_time(ratio: float, scale: float) -> None:
    """Powers of two, so that nothing but the unit changes."""

    def solved(unit: float) -> Roots:
        return solve_complete(normalise(mdof.System.from_matrices([[1.0]], [[6.0 * ratio * unit]], [[9.0 * unit**2]])))

    plain, other = solved(1.0), solved(scale)
    assert other.values == pytest.approx(scale * plain.values, rel=1e-15)
    assert other.bounds == pytest.approx(scale * plain.bounds, rel=1e-6)
