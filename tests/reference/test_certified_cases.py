"""Proofs of systems whose exact roots are known in closed form: critical, multiple, defective, free, massless."""

from __future__ import annotations

import math

import numpy as np
import pytest

import mdof
from mdof import Regime, System
from mdof.certify import Certificate, certify


def proven(system: System) -> Certificate:
    modes = mdof.solve(system)
    certificate = certify(modes)
    assert certificate.summary == f"{len(modes)} of {len(modes)} modes proven at 128 bits"
    assert certificate.eigenvalues_exact == certificate.eigenvalues_stated
    return certificate


def inside(value: float, interval: tuple[float, float] | None, width: float = 1e-15) -> bool:
    """The value, known to a few units in the last place, lies in an interval that is as narrow as that."""
    assert interval is not None
    low, high = interval
    return low - 4 * math.ulp(value) <= value <= high + 4 * math.ulp(value) and high - low <= width * max(1, abs(value))


@pytest.mark.parametrize(
    ("m", "c", "k"), [(1, 2, 1), (0.25, 1, 1), (4, 96, 576), (50, 2000, 20000), (2**-30, 2, 2**30)]
)
def test_critical_damping_is_a_double_root_exactly(m: float, c: float, k: float) -> None:
    """c = 2 sqrt(km) in numbers that binary64 holds exactly."""
    (proof,) = proven(System.from_factors([[m]], [[1.0]], [k], [[1.0]], [c])).modes
    assert proof.regime == Regime.CRITICALLY_DAMPED
    assert (proof.multiplicity, proof.exact) == (2, True)
    assert proof.damping_ratio == (1.0, 1.0)
    assert inside(math.sqrt(k / m), proof.natural_frequency)


def test_two_equal_masses_on_equal_springs() -> None:
    """Uncoupled: the root ±j sqrt(k/m) twice, nothing damps it."""
    certificate = proven(System.from_factors(2 * np.eye(2), np.eye(2), [50.0, 50.0]))
    for proof in certificate.modes:
        assert inside(5.0, proof.natural_frequency)
        assert proof.exact
        assert proof.damping_ratio == (0.0, 0.0)


def test_coupled_equal_oscillators_keep_their_double_frequency() -> None:
    """K = aI + b11ᵀ on three masses: a twice, a + 3b once."""
    springs = np.hstack([np.eye(3), np.ones((3, 1))])
    certificate = proven(System.from_factors(np.eye(3), springs, [4.0, 4, 4, 7]))
    assert [proof.multiplicity for proof in certificate.modes] == [2, 2, 1]
    for proof, square in zip(certificate.modes, (4, 4, 25), strict=True):
        assert inside(math.sqrt(square), proof.natural_frequency)


def test_the_defective_pair() -> None:
    """M = I, C = diag(1, 0), K = [[4.25, −1], [−1, 4]]: (λ² + λ/2 + 4)² by hand, so ±j sqrt(63)/4 − 1/4 twice.

    det Q = (λ² + λ + 17/4)(λ² + 4) − 1 = λ⁴ + λ³ + 33/4 λ² + 4λ + 16.
    """
    certificate = proven(System.from_matrices(np.eye(2), np.diag([1.0, 0]), [[4.25, -1], [-1, 4]]))
    for proof in certificate.modes:
        assert (proof.multiplicity, proof.exact) == (2, True)
        (real, imaginary), _ = proof.eigenvalues
        assert inside(-0.25, real)
        assert inside(math.sqrt(63) / 4, imaginary)
        assert inside(0.125, proof.damping_ratio)
        assert inside(2.0, proof.natural_frequency)


@pytest.mark.parametrize("n", [2, 3, 8])
def test_a_free_chain(n: int) -> None:
    """2 sin(πj / 2n) sqrt(k/m), the first of them a rigid-body motion."""
    springs = np.eye(n)[:, 1:] - np.eye(n)[:, :-1]
    certificate = proven(System.from_factors(np.eye(n), springs, np.full(n - 1, 9.0)))
    assert certificate.modes[0].regime == Regime.RIGID_BODY
    assert certificate.modes[0].eigenvalues == (((0.0, 0.0), (0.0, 0.0)),) * 2
    for j, proof in enumerate(certificate.modes[1:], start=1):
        assert inside(6 * math.sin(math.pi * j / (2 * n)), proof.natural_frequency, 4e-15)
        assert proof.exact


def test_masses_joined_by_a_dashpot_alone() -> None:
    """Roots 0, 0, 0 and −c/μ with μ = m₁m₂/(m₁ + m₂)."""
    system = System.from_factors(np.diag([1.0, 3.0]), np.zeros((2, 0)), [], [[1.0], [-1.0]], [6.0])
    certificate = proven(system)
    assert [proof.regime for proof in certificate.modes] == [Regime.RIGID_BODY] * 2
    roots = sorted(real for proof in certificate.modes for real, _ in proof.eigenvalues)
    assert roots == [(-8.0, -8.0), (0.0, 0.0), (0.0, 0.0), (0.0, 0.0)]


def test_a_massless_damped_joint() -> None:
    """A spring in series with a spring beside a damper: m c λ³ + m(k₁ + k₂) λ² + k₁ c λ + k₁ k₂ = 0, three roots.

    With m = 1, k₁ = 8, k₂ = 1, c = 4 it is 4 (λ³ + 9/4 λ² + 8 λ + 2), which has one real root.
    """
    springs = np.array([[1.0, -1.0], [0.0, 1.0]]).T
    system = System.from_factors(np.diag([1.0, 0.0]), springs, [8.0, 1.0], [[0.0], [1.0]], [4.0])
    certificate = proven(system)
    assert certificate.eigenvalues_exact == 3
    relaxation = next(proof for proof in certificate.modes if proof.regime == Regime.RELAXATION)
    (root, imaginary) = relaxation.eigenvalues[0]
    assert imaginary == (0.0, 0.0)
    assert inside(next(x.real for x in np.roots([1, 2.25, 8, 2]) if x.imag == 0), root)


def test_a_massless_undamped_joint_adds_nothing() -> None:
    """Springs in series: 1/(1/3 + 1/6) = 2."""
    springs = np.array([[1.0, -1.0], [0.0, 1.0]]).T
    (proof,) = proven(System.from_factors(np.diag([1.0, 0.0]), springs, [3.0, 6.0])).modes
    assert inside(math.sqrt(2), proof.natural_frequency)
    assert proof.exact


def test_an_unstable_and_a_divergent_mode() -> None:
    """λ² − λ/8 + 1 and λ² + λ − 1, whose roots are −1/2 ± sqrt(5)/2."""
    modes = proven(System.from_matrices(np.eye(2), np.diag([-0.125, 1]), np.diag([1, -1]))).modes
    assert {proof.regime for proof in modes} == {Regime.UNSTABLE, Regime.DIVERGENT}
    divergent = next(proof for proof in modes if proof.regime == Regime.DIVERGENT)
    assert divergent.natural_frequency is divergent.damping_ratio is None
    for sign, (real, _) in zip((1, -1), divergent.eigenvalues, strict=True):
        assert inside((sign * math.sqrt(5) - 1) / 2, real)


def test_the_node_of_a_swing_is_undamped_exactly() -> None:
    """Three equal masses, the middle one damped: its node is at rest in the antisymmetric mode."""
    springs = np.array([[1, 1, 0, 0], [0, -1, 1, 0], [0, 0, -1, 1]], dtype=float)
    certificate = proven(System.from_factors(np.eye(3), springs, np.ones(4), np.eye(3)[:, 1:2], [0.5]))
    undamped = [proof for proof in certificate.modes if proof.exact]
    assert [proof.regime for proof in undamped] == [Regime.UNDAMPED]
    assert inside(math.sqrt(2), undamped[0].natural_frequency)


@pytest.mark.parametrize("loss", [0.05, 0.5])
def test_loss_factors_at_their_own_frequency(loss: float) -> None:
    """Equal loss factors everywhere and ω = |λ|: λ² + η ω_n λ + ω_n² = 0, so ζ = η/2 and |λ| = ω_n exactly."""
    springs = np.array([[1.0, 1.0], [0.0, -1.0]])
    system = System.from_factors(np.eye(2), springs, [2.0, 2.0]).with_values(loss_factor=[loss, loss])
    certificate = certify(mdof.solve(system))
    assert certificate.summary == "2 of 2 modes proven at 128 bits"
    assert certificate.eigenvalues_exact is None
    for proof, square in zip(certificate.modes, (3 - math.sqrt(5), 3 + math.sqrt(5)), strict=True):
        assert inside(loss / 2, proof.damping_ratio)
        assert inside(math.sqrt(square), proof.natural_frequency)
