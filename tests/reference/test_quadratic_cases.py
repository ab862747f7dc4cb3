"""Quadratic eigenproblems whose spectra are known by formula or closed argument.

The families overdamped_chain, critical_ring, beam_midspan_damper, wing and the bicycle of test_quadratic_theory.py are
described in: Betcke T., Higham N.J., Mehrmann V., Schröder C., Tisseur F., NLEVP: A Collection of Nonlinear Eigenvalue
Problems, ACM Transactions on Mathematical Software 39 (2013), article 7.
"""

from __future__ import annotations

import math

import networkx as nx
import numpy as np
import pytest
from published import chain, oscillator, solve

import mdof
from mdof import Regime

ROUNDOFF = 2.0**-52


def codes(modes: mdof.DampedModes) -> set[str]:
    return {finding.code for finding in modes.findings}


def pairs_by_formula(sums: np.ndarray, products: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Natural frequencies and ratios of r² + sum r + product = 0, by rising frequency."""
    w = np.sqrt(products)
    order = np.argsort(w, kind="stable")
    return w[order], (sums / (2 * w))[order]


def inside_bounds(modes: mdof.DampedModes, w: np.ndarray, zeta: np.ndarray) -> None:
    """Frequencies and ratios within the bounds the result states for itself, plus rounding of the formula."""
    assert np.all(np.abs(modes.natural_frequencies / w - 1) <= modes.frequency_bounds + 4 * ROUNDOFF)
    assert np.all(np.abs(modes.damping_ratios - zeta) <= modes.damping_ratio_bounds + 8 * ROUNDOFF * zeta)


@pytest.mark.parametrize("n", [1, 2, 10, 60])
def test_overdamped_chain(n: int) -> None:
    """M = I, C = 10 T, K = 5 T with T = tridiag(-1, 3, -1): every pair real, and each pair is one oscillator's."""
    T = 3 * np.eye(n) - np.eye(n, k=1) - np.eye(n, k=-1)
    t = 3 - 2 * np.cos(np.arange(1, n + 1) * np.pi / (n + 1))
    modes = solve(np.eye(n), 10 * T, 5 * T)
    assert set(modes.regimes) == {Regime.OVERDAMPED}
    assert "non-proportional-damping" not in codes(modes)
    inside_bounds(modes, *pairs_by_formula(10 * t, 5 * t))
    assert np.all(modes.frequency_bounds < 1e-10)


def ring(n: int) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    A = -2 * np.eye(n) + np.roll(np.eye(n), 1, axis=0) + np.roll(np.eye(n), -1, axis=0)
    return np.eye(n), np.eye(n) + A @ A, np.eye(n) + A + A @ A


@pytest.mark.parametrize("n", [6, 7, 12, 30, 60])
def test_critical_ring(n: int) -> None:
    """With 6 | n exactly two modes are critical, between overdamped short waves and underdamped long ones."""
    mu = -4 * np.sin(np.pi * np.arange(n) / n) ** 2
    modes = solve(*ring(n))
    critical = int(np.sum(np.abs(mu + 1) < 1e-12))
    assert critical == (2 if n % 6 == 0 else 0)
    assert modes.regimes.count(Regime.CRITICALLY_DAMPED) == critical
    assert modes.regimes.count(Regime.OVERDAMPED) == np.sum(mu < -1 - 1e-12)
    assert modes.regimes.count(Regime.UNDERDAMPED) == np.sum(mu > -1 + 1e-12)
    w, zeta = pairs_by_formula(1 + mu**2, 1 + mu + mu**2)
    np.testing.assert_allclose(modes.natural_frequencies, w, rtol=1e-12)
    np.testing.assert_allclose(np.sort(modes.damping_ratios), np.sort(zeta), rtol=1e-12)
    for mode in modes:
        if mode.regime is Regime.CRITICALLY_DAMPED:
            assert mode.eigenvalues == pytest.approx([-1, -1], abs=1e-12)


def beam_with_midspan_damper(n: int) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Simply supported beam of n/2 cubic elements with one damper of 5 N s/m in the middle."""
    elements = n // 2
    width, height, length, young, mass, damper = 0.05, 0.005, 1.0, 7e10, 0.674, 5.0
    h = length / elements
    stiff = young * width * height**3 / 12 / h**3
    k = stiff * np.array(
        [
            [12, 6 * h, -12, 6 * h],
            [6 * h, 4 * h**2, -6 * h, 2 * h**2],
            [-12, -6 * h, 12, -6 * h],
            [6 * h, 2 * h**2, -6 * h, 4 * h**2],
        ]
    )
    m = (
        mass
        * h
        / 420
        * np.array(
            [
                [156, 22 * h, 54, -13 * h],
                [22 * h, 4 * h**2, 13 * h, -3 * h**2],
                [54, 13 * h, 156, -22 * h],
                [-13 * h, -3 * h**2, -22 * h, 4 * h**2],
            ]
        )
    )
    M, K = np.zeros((n + 2, n + 2)), np.zeros((n + 2, n + 2))
    for element in range(elements):
        place = slice(2 * element, 2 * element + 4)
        M[place, place] += m
        K[place, place] += k
    C = np.zeros((n + 2, n + 2))
    C[elements, elements] = damper
    held = np.delete(np.arange(n + 2), [0, n])
    return tuple(part[np.ix_(held, held)] for part in (M, C, K))


@pytest.mark.parametrize("n", [8, 40, 200])
def test_beam_midspan_damper(n: int) -> None:
    """Antisymmetric modes have a node at the damper: half the spectrum stays on the imaginary axis."""
    modes = solve(*beam_with_midspan_damper(n))
    assert modes.regimes.count(Regime.UNDAMPED) == n // 2
    assert modes.regimes.count(Regime.UNDERDAMPED) == n // 2
    if n == 200:
        # Digits as printed in the notes on this family; four figures more than the finite-element error.
        lowest = next(mode for mode in modes if mode.regime is Regime.UNDERDAMPED).eigenvalues[0]
        assert abs(lowest - (-7.42298 + 72.23065j)) < 1e-5


def test_wing() -> None:
    """Flutter of a wing in an air stream: M symmetric, the rest not.

    Data of Frazer, Duncan & Collar, Elementary Matrices (1938), section 10.11; roots as printed to four places in the
    literature on this problem (both from memory; they agree with each other).
    """
    M = [[17.6, 1.28, 2.89], [1.28, 0.824, 0.413], [2.89, 0.413, 0.725]]
    C = [[7.66, 2.45, 2.1], [0.23, 1.04, 0.223], [0.6, 0.756, 0.658]]
    K = [[121, 18.9, 15.9], [0, 2.7, 0.145], [11.9, 3.64, 15.5]]
    modes = solve(M, C, K)
    found = [mode.eigenvalues[0] for mode in modes]
    np.testing.assert_allclose(found, [-0.9180 + 1.7606j, 0.0947 + 2.5229j, -0.8848 + 8.4415j], rtol=0, atol=7e-5)
    assert modes.regimes == (Regime.UNDERDAMPED, Regime.UNSTABLE, Regime.UNDERDAMPED)


@pytest.mark.parametrize("m", [1.0, 3.0, 50.0, 1234.5])
@pytest.mark.parametrize("k", [1.0, 2e4, 7.7e9])
def test_one_mass_is_critical_only_at_the_critical_damper(m: float, k: float) -> None:
    c = 2 * math.sqrt(m * k)
    at = oscillator(m, c, k)
    assert at.regime is Regime.CRITICALLY_DAMPED
    assert at.damping_ratio == pytest.approx(1, abs=1e-15)
    assert np.ptp(np.real(at.eigenvalues)) <= 1e-7 * at.natural_frequency
    for change in (1e-6, -1e-6, 1e-8, -1e-8):
        near = oscillator(m, c * (1 + change), k)
        assert near.regime is (Regime.OVERDAMPED if change > 0 else Regime.UNDERDAMPED)
        assert near.damping_ratio - 1 == pytest.approx(change, abs=8 * ROUNDOFF)


@pytest.mark.parametrize("seed", range(6))
def test_coupled_critical_damping(seed: int) -> None:
    """C = 2 K^(1/2) with n = 12: every mode critical, and none at 1 ± 1e-6 (Inman & Andry 1980)."""
    rng = np.random.default_rng(seed)
    Q, _ = np.linalg.qr(rng.normal(size=(12, 12)))
    root = Q @ np.diag(10 ** rng.uniform(0, 2, 12)) @ Q.T
    root = (root + root.T) / 2
    K = root @ root
    K = (K + K.T) / 2
    assert set(solve(np.eye(12), 2 * root, K).regimes) == {Regime.CRITICALLY_DAMPED}
    assert set(solve(np.eye(12), 2 * (1 + 1e-6) * root, K).regimes) == {Regime.OVERDAMPED}
    assert set(solve(np.eye(12), 2 * (1 - 1e-6) * root, K).regimes) == {Regime.UNDERDAMPED}


def test_defective_pair() -> None:
    """Two equal pairs with one shape: each computed pair alone is wrong by 1e-8, their mean is right to rounding."""
    modes = solve(np.eye(2), np.diag([1.0, 0.0]), [[4.25, -1], [-1, 4]])
    assert modes.regimes == (Regime.UNDERDAMPED,) * 2
    np.testing.assert_allclose(modes.damping_ratios, 0.125, rtol=0, atol=1e-14)
    np.testing.assert_allclose(modes.natural_frequencies, 2.0, rtol=1e-14)


@pytest.mark.parametrize(
    ("C", "K", "ratios"),
    [
        (np.diag([10.0, 5.0]), np.diag([1.0, 4.0]), [5.0, 1.25]),  # roots interlace: -0.10, -1, -4, -9.90
        (np.diag([10.0, 100.0]), np.diag([1.0, 900.0]), [5.0, 5 / 3]),  # all real, no common gap
    ],
)
def test_real_roots_are_paired_by_shape(C: np.ndarray, K: np.ndarray, ratios: list[float]) -> None:
    """Taking sorted neighbours would marry roots of different oscillators. Also in a mixed frame, where all couples."""
    turn = np.array([[0.8, -0.6], [0.6, 0.8]])
    for frame in (np.eye(2), turn):
        damping, stiffness = frame @ C @ frame.T, frame @ K @ frame.T
        modes = solve(np.eye(2), (damping + damping.T) / 2, (stiffness + stiffness.T) / 2)
        assert modes.regimes == (Regime.OVERDAMPED,) * 2
        np.testing.assert_allclose(modes.damping_ratios, ratios, rtol=1e-12)
        np.testing.assert_allclose(modes.natural_frequencies, np.sqrt(np.diag(K)), rtol=1e-12)


def test_definite_difference_does_not_make_all_modes_overdamped() -> None:
    """C - 2 K^(1/2) is positive definite, yet one mode oscillates; the two real roots left over are not a pair."""
    C, K = np.array([[2.5, 1.3], [1.3, 12.0]]), np.diag([1.0, 16.0])
    assert np.all(np.linalg.eigvalsh(C - 2 * np.sqrt(K)) > 0)
    modes = solve(np.eye(2), C, K)
    swings = [mode for mode in modes if mode.regime is Regime.UNDERDAMPED]
    assert len(swings) == 1
    assert swings[0].eigenvalues[0] == pytest.approx(-1.657 + 0.626j, abs=6e-4)
    left = [mode for mode in modes if mode.regime is Regime.OVERDAMPED]
    assert sorted(mode.eigenvalues[0].real for mode in left) == pytest.approx([-10.71, -0.476], abs=6e-3)
    assert all(len(mode.eigenvalues) == 1 and mode.damping_ratio is None for mode in left)
    assert "partner-unresolved" in codes(modes)


@pytest.mark.parametrize("n", [2, 5, 40])
def test_free_chain(n: int) -> None:
    """No wall: one rigid-body motion with both roots exactly zero, the rest by formula; dampers between masses only."""
    modes = mdof.solve(chain([2.0] * n, [0.0] + [500.0] * (n - 1), [0.0] + [0.8] * (n - 1)))
    assert modes.regimes[0] is Regime.RIGID_BODY
    assert modes[0].eigenvalues == (0, 0)
    assert modes[0].damping_ratio is None
    np.testing.assert_allclose(modes.shapes[:, 0], 1, rtol=1e-12)
    w = 2 * np.sqrt(500 / 2) * np.sin(np.arange(1, n) * np.pi / (2 * n))
    np.testing.assert_allclose(modes.natural_frequencies[1:], w, rtol=1e-12)
    np.testing.assert_allclose(modes.damping_ratios[1:], 0.8 / 500 * w / 2, rtol=1e-12)
    assert "free-motion" in codes(modes)


def test_body_slowed_by_a_damper_is_a_rigid_body() -> None:
    mode = oscillator(50.0, 30.0, 0.0)
    assert mode.regime is Regime.RIGID_BODY
    assert mode.damping_ratio is None
    assert sorted(root.real for root in mode.eigenvalues) == pytest.approx([-0.6, 0], rel=1e-14, abs=0)


def test_two_masses_joined_by_a_dashpot_only() -> None:
    """Roots 0, 0 of the whole and 0, -c/mu of the parting motion, mu the reduced mass."""
    m1, m2, c = 3.0, 5.0, 8.0
    modes = mdof.solve(chain([m1, m2], [0.0, 0.0], [0.0, c]))
    assert modes.regimes == (Regime.RIGID_BODY,) * 2
    assert "held-by-damper-only" in codes(modes)
    roots = sorted(root.real for mode in modes for root in mode.eigenvalues)
    assert roots == pytest.approx([-c * (m1 + m2) / (m1 * m2), 0, 0, 0], rel=1e-14, abs=0)
    assert all(mode.damping_ratio is None and mode.natural_frequency in (None, 0.0) for mode in modes)


def test_mass_dragged_along_by_a_dashpot() -> None:
    """One mass on a spring, another hung on it by a dashpot only: three roots of a cubic and one zero."""
    m1, m2, k, c = 3.0, 5.0, 700.0, 8.0
    modes = mdof.solve(chain([m1, m2], [k, 0.0], [0.0, c]))
    # Newton's law for both, one integration of the second left out: λ (m1 m2 λ³ + c (m1+m2) λ² + m2 k λ + k c) = 0.
    expected = np.roots([m1 * m2, c * (m1 + m2), m2 * k, k * c])
    found = np.concatenate([mode.eigenvalues for mode in modes])
    assert len(found) == 4
    assert np.sum(found == 0) == 1
    for root in expected:
        assert np.abs(found - root).min() < 1e-12 * abs(root)
    assert "held-by-damper-only" in codes(modes)


def joint_graph(**joint: object) -> nx.MultiGraph:
    """mass - k1 - massless joint - k2 - ground."""
    graph = nx.MultiGraph(title="joint", directions=("x",), damping={})
    graph.add_node("ground", kind="ground", centre=np.zeros(3))
    graph.add_node("m", mass=4.0)
    graph.add_node("joint", mass=0.0, massless=True)
    graph.add_edge("m", "joint", key="k1", between=("m", "joint"), stiffness=300.0)
    graph.add_edge("joint", "ground", key="k2", between=("joint", "ground"), **joint)
    return graph


def test_massless_joint_between_springs() -> None:
    """Two springs in series; the joint follows at k1/(k1 + k2) and adds no root."""
    modes = mdof.solve(mdof.assemble(joint_graph(stiffness=600.0)))
    assert len(modes) == 1
    assert modes.verification.eigenvalues_expected == modes.verification.eigenvalues_found == 2
    assert modes.regimes == (Regime.UNDAMPED,)
    assert modes[0].natural_frequency == pytest.approx(math.sqrt(200 / 4), rel=1e-14)
    np.testing.assert_allclose(modes[0].shape, [1, 1 / 3], rtol=1e-14)


def test_damped_massless_joint_adds_a_relaxation_root() -> None:
    """m λ² + k1 (k2 + cλ)/(k1 + k2 + cλ) = 0, a cubic."""
    k1, k2, c, m = 300.0, 600.0, 20.0, 4.0
    modes = mdof.solve(mdof.assemble(joint_graph(stiffness=k2, damping=c)))
    expected = np.roots([m * c, m * (k1 + k2), k1 * c, k1 * k2])
    check_cubic(modes, expected)


@pytest.mark.parametrize(("k1", "c"), [(40e3, 600.0), (5e3, 90.0), (300e3, 20.0)])
def test_series_branch_gives_the_roots_of_the_three_parameter_mount(k1: float, c: float) -> None:
    """m λ² + k + k1 cλ/(k1 + cλ) = 0 (Zener's model): an oscillator and one relaxation root, which has no partner."""
    m, k = 50.0, 20e3
    graph = nx.MultiGraph(title="mount", directions=("x",), damping={})
    graph.add_node("ground", kind="ground", centre=np.zeros(3))
    graph.add_node("m", mass=m)
    graph.add_edge(
        "m", "ground", key="mount", between=("m", "ground"), stiffness=k, branches=[{"stiffness": k1, "damping": c}]
    )
    modes = mdof.solve(mdof.assemble(graph))
    check_cubic(modes, np.roots([m * c, m * k1, c * (k + k1), k * k1]))


def check_cubic(modes: mdof.DampedModes, expected: np.ndarray) -> None:
    """One conjugate pair and one relaxation root, matching three expected roots."""
    assert sorted(modes.regimes) == sorted([Regime.RELAXATION, Regime.UNDERDAMPED])
    assert modes.verification.eigenvalues_found == modes.verification.eigenvalues_expected == 3
    assert "relaxation-roots" in codes(modes)
    for mode in modes:
        root = mode.eigenvalues[0]
        assert np.abs(expected - root).min() < 1e-11 * abs(root)
        if mode.regime is Regime.RELAXATION:
            assert len(mode.eigenvalues) == 1
            assert mode.damping_ratio is None
            assert mode.decay_rate == pytest.approx(-root.real)
        else:
            assert len(mode.eigenvalues) == 2


@pytest.mark.parametrize(("c", "k", "regime"), [(-40.0, 2e4, Regime.UNSTABLE), (120.0, -5e3, Regime.DIVERGENT)])
def test_growing_motions(c: float, k: float, regime: Regime) -> None:
    mode = oscillator(50.0, c, k)
    assert mode.decay_rate < 0
    assert mode.time_to_two_percent is None
    assert mode.regime is regime
    if regime is Regime.DIVERGENT:
        assert mode.natural_frequency is None
        assert mode.damping_ratio is None
    else:
        assert mode.damping_ratio == pytest.approx(c / (2 * math.sqrt(50 * k)), rel=1e-14)


def test_growth_without_swinging_is_divergent() -> None:
    """A damper more negative than the critical one: both roots real and positive."""
    assert oscillator(50.0, -1e4, 2e4).regime is Regime.DIVERGENT


def test_equal_oscillators_with_different_dampers() -> None:
    """Three oscillators of one frequency, undamped to overdamped, hidden in a mixed frame: each keeps its own ratio."""
    Q, _ = np.linalg.qr(np.random.default_rng(8).normal(size=(3, 3)))
    for frame in (np.eye(3), Q):
        C = frame @ np.diag([0.0, 0.4, 10.0]) @ frame.T
        K = frame @ np.diag([4.0, 4.0, 4.0]) @ frame.T
        modes = solve(np.eye(3), (C + C.T) / 2, (K + K.T) / 2)
        assert sorted(modes.regimes) == sorted([Regime.UNDAMPED, Regime.UNDERDAMPED, Regime.OVERDAMPED])
        np.testing.assert_allclose(np.sort(modes.damping_ratios), [0, 0.1, 2.5], rtol=1e-12, atol=1e-14)
        np.testing.assert_allclose(modes.natural_frequencies, 2, rtol=1e-13)
        assert "non-proportional-damping" not in codes(modes)
