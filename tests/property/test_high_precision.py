"""Modes against 50-digit arithmetic: values inside their own stated bounds, regimes and pairs right."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import mpmath as mp
import numpy as np
import pytest
from exact import DIGITS, matrix, roots, weighted_gram
from hypothesis import example, given, reject, settings
from hypothesis import strategies as st

import mdof
from mdof import Regime

ROUNDOFF = 2.0**-52


@pytest.fixture(autouse=True, scope="module")
def fifty_digits() -> Iterator[None]:
    """Comparisons, too, are made in high precision."""
    with mp.workdps(DIGITS):
        yield


def chain_system(masses: np.ndarray, springs: np.ndarray, dampers: np.ndarray) -> tuple[mdof.System, np.ndarray]:
    """Chain from wall (``springs[0]``) to wall (the last spring), and its incidence matrix."""
    import networkx as nx

    n = len(masses)
    graph = nx.MultiGraph(title="chain", directions=("x",), damping={})
    graph.add_node("ground", kind="ground", centre=np.zeros(3))
    for index, mass in enumerate(masses):
        graph.add_node(index, mass=float(mass))
    B = np.zeros((n, n + 1))
    stops: list[Any] = ["ground", *range(n), "ground"]
    for index in range(n + 1):
        a, b = stops[index + 1], stops[index]
        for name, sign in ((a, 1.0), (b, -1.0)):
            if name != "ground":
                B[name, index] = sign
        if a == "ground":
            a, b = b, a
        graph.add_edge(
            a, b, key=f"s{index}", between=(a, b), stiffness=float(springs[index]), damping=float(dampers[index])
        )
    return mdof.assemble(graph), B


def nearest(exact: list[mp.mpc], value: complex) -> mp.mpc:
    return min(exact, key=lambda root: abs(root - mp.mpc(value)))


def errors_and_bounds(modes: mdof.DampedModes, exact: list[mp.mpc]) -> tuple[np.ndarray, np.ndarray]:
    """Relative error of each mode's frequency (or single rate), with its stated bound; ratios are asserted here."""
    found, stated = [], []
    left = list(exact)
    for mode in modes:
        mates = []
        for value in mode.eigenvalues:
            mate = nearest(left, value)
            left.remove(mate)
            mates.append(mate)
        if mode.regime is Regime.RIGID_BODY:
            continue
        truth = mp.sqrt(abs(mates[0] * mates[1])) if len(mates) == 2 else abs(mates[0])
        ours = (
            mp.sqrt(abs(mp.mpc(mode.eigenvalues[0]) * mp.mpc(mode.eigenvalues[1])))
            if len(mates) == 2
            else abs(mp.mpc(mode.eigenvalues[0]))
        )
        if mode.natural_frequency is not None:
            ours = mp.mpf(mode.natural_frequency)
        found.append(float(abs(ours / truth - 1)))
        stated.append(mode.frequency_bound)
        if mode.damping_ratio is not None and len(mates) == 2:
            ratio = -(mates[0] + mates[1]).real / (2 * truth)
            assert abs(mode.damping_ratio - ratio) <= mode.damping_ratio_bound + 4 * ROUNDOFF * max(1, abs(ratio))
    assert not left
    return np.array(found), np.array(stated, dtype=float)


def test_twelve_orders_of_magnitude() -> None:
    """Springs from 1e-2 to 1e10 N/m in any order: every eigenvalue inside its stated bound, and the bound is of use."""
    slack = []
    for seed in range(10):
        rng = np.random.default_rng(seed)
        n = 5
        springs = 10 ** rng.permutation(np.linspace(-2, 10, n + 1))
        masses, dampers = (
            10 ** rng.uniform(-0.5, 0.5, n),
            np.where(rng.random(n + 1) < 0.6, 10 ** rng.uniform(-4, 3, n + 1), 0.0),
        )
        system, B = chain_system(masses, springs, dampers)
        modes = mdof.solve(system)
        assert modes.verification.status == "verified"
        exact = roots(mp.diag([mp.mpf(float(m)) for m in masses]), weighted_gram(B, dampers), weighted_gram(B, springs))
        error, bound = errors_and_bounds(modes, exact)
        assert np.all(error <= bound + 2 * ROUNDOFF), seed
        # A verified mode must be usable: no bound that only says "somewhere".
        assert np.all(bound < 1e-10), seed
        slack.extend(bound / np.maximum(error, ROUNDOFF))
    assert np.median(slack) < 300, f"median bound is {np.median(slack):.1e} times the error"


def test_soft_spring_under_a_very_stiff_one() -> None:
    """Two masses on 1e10 N/m, held to ground by 1e-6 N/m: the low root drowns in the rounded stiffness matrix."""
    system, B = chain_system(np.array([1.0, 1.0]), np.array([1e-6, 1e10, 0.0]), np.array([1e-5, 0.0, 0.0]))
    modes = mdof.solve(system)
    exact = roots(mp.eye(2), weighted_gram(B, [1e-5, 0, 0]), weighted_gram(B, [1e-6, 1e10, 0]))
    error, bound = errors_and_bounds(modes, exact)
    assert np.all(error <= bound + 2 * ROUNDOFF)
    assert np.all(bound < 1e-9)


@given(seed=st.integers(0, 10**6))
@example(seed=75)  # one soft spring to ground, one damper that all but locks
@settings(max_examples=60, deadline=None)
def test_wild_values_are_right_or_refused(seed: int) -> None:
    """Springs over twelve orders, dampers over fourteen, some missing: the bounds hold, or nothing is returned."""
    rng = np.random.default_rng(seed)
    n = int(rng.integers(1, 6))
    springs = 10 ** rng.uniform(-2, 10, n + 1)
    if seed % 3 == 0:
        springs[rng.random(n + 1) < 0.4] = 0
    dampers = np.where(rng.random(n + 1) < 0.6, 10 ** rng.uniform(-6, 8, n + 1), 0.0)
    masses = 10 ** rng.uniform(-2, 3, n)
    system, B = chain_system(masses, springs, dampers)
    try:
        modes = mdof.solve(system)
    except mdof.UnverifiedError:
        reject()
    exact = roots(mp.diag([mp.mpf(float(m)) for m in masses]), weighted_gram(B, dampers), weighted_gram(B, springs))
    error, bound = errors_and_bounds(modes, exact)
    assert np.all(error <= bound + 4 * ROUNDOFF)


@given(seed=st.integers(0, 10**6), n=st.integers(1, 5), weight=st.sampled_from([0.05, 0.5, 2.0, 10.0]))
@example(seed=357, n=3, weight=0.5)  # residual near the gate
@settings(max_examples=60, deadline=None)
def test_random_symmetric_systems(seed: int, n: int, weight: float) -> None:
    """Roots, regimes and pairs of random passive systems, from lightly damped to all roots real."""
    rng = np.random.default_rng(seed)
    M, C, K = (spd(rng, n) for _ in range(3))
    C = weight * C
    if seed % 3 == 0:
        column = rng.normal(size=(n, 1))
        C = weight * column @ column.T
    modes = mdof.solve(mdof.System.from_matrices(M, C, K))
    exact = roots(matrix(M), matrix(C), matrix(K))
    error, bound = errors_and_bounds(modes, exact)
    assert np.all(error <= bound + 4 * ROUNDOFF)
    swinging = sum(1 for root in exact if root.imag > 0)
    near_critical = any(abs(mode.damping_ratio - 1) < 1e-6 for mode in modes if mode.damping_ratio is not None)
    if near_critical:
        return
    assert modes.regimes.count(Regime.UNDERDAMPED) == swinging
    real_pairs = [mode for mode in modes if mode.regime is Regime.OVERDAMPED and len(mode.eigenvalues) == 2]
    singles = [mode for mode in modes if mode.regime is Regime.OVERDAMPED and len(mode.eigenvalues) == 1]
    assert swinging + len(real_pairs) + len(singles) == len(modes)
    assert 2 * (swinging + len(real_pairs)) + len(singles) == 2 * n
    for mode in real_pairs:
        # One root of each sign of xᵀ(2λM + C)x, the positive one slow; and shapes that look alike.
        slow, fast = (root.real for root in mode.eigenvalues)
        assert 0 > slow > fast
        x, y = mode.shape.real, mode.fast_shape.real
        assert x @ (2 * slow * M + C) @ x > 0
        assert y @ (2 * fast * M + C) @ y < 0
        assert (x @ M @ y) ** 2 >= 0.5 * (x @ M @ x) * (y @ M @ y)
    for mode in singles:
        assert mode.damping_ratio is None
    assert bool(singles) == ("partner-unresolved" in {finding.code for finding in modes.findings})


def spd(rng: np.random.Generator, n: int) -> np.ndarray:
    factor = rng.normal(size=(n, n))
    result = factor @ factor.T + 0.2 * np.eye(n)
    return (result + result.T) / 2


@given(seed=st.integers(0, 10**6), n=st.integers(1, 6))
@settings(max_examples=60, deadline=None)
def test_classically_damped_systems_are_paired_exactly(seed: int, n: int) -> None:
    """Ratios from 0.02 to 20 put on known modes: each comes back with its own frequency."""
    rng = np.random.default_rng(seed)
    w = np.cumsum(rng.uniform(0.5, 3.0, n))
    zeta = 10 ** rng.uniform(-1.7, 1.3, n)
    factor = np.tril(rng.normal(size=(n, n))) + 3 * np.eye(n)
    M = factor @ factor.T
    Q, _ = np.linalg.qr(rng.normal(size=(n, n)))
    spread = factor @ Q  # its columns are M times the mass-normalised shapes
    C, K = spread @ np.diag(2 * zeta * w) @ spread.T, spread @ np.diag(w**2) @ spread.T
    modes = mdof.solve(mdof.System.from_matrices((M + M.T) / 2, (C + C.T) / 2, (K + K.T) / 2))
    np.testing.assert_allclose(modes.natural_frequencies, w, rtol=1e-9)
    np.testing.assert_allclose(modes.damping_ratios, zeta, rtol=1e-9)
    expected = [Regime.UNDERDAMPED if ratio < 1 else Regime.OVERDAMPED for ratio in zeta]
    assert list(modes.regimes) == expected
    np.testing.assert_allclose(modes.shortcut_damping_ratios, zeta, rtol=1e-8)
    assert "non-proportional-damping" not in {finding.code for finding in modes.findings}


@given(seed=st.integers(0, 10**6), n=st.integers(1, 4))
@example(seed=177879, n=3)  # two real roots of opposite sign
@settings(max_examples=40, deadline=None)
def test_random_unsymmetric_systems(seed: int, n: int) -> None:
    """Follower forces and rotating machines: unsymmetric C and K. Growing roots are named, none is lost."""
    rng = np.random.default_rng(seed)
    M = spd(rng, n)
    C, K = rng.normal(size=(n, n)), spd(rng, n) + rng.normal(size=(n, n))
    modes = mdof.solve(mdof.System.from_matrices(M, C, K))
    exact = roots(matrix(M), matrix(C), matrix(K))
    found = modes.eigenvalues[~np.isnan(modes.eigenvalues)]
    assert len(found) == 2 * n
    for root in found:
        assert abs(nearest(exact, root) - mp.mpc(root)) < 1e-9 * abs(root)
    growing = [mode for mode in modes if max(value.real for value in mode.eigenvalues) > 1e-9]
    assert {mode.regime for mode in growing} <= {Regime.UNSTABLE, Regime.DIVERGENT}
    assert {mode.regime for mode in modes if mode not in growing} <= {
        Regime.UNDERDAMPED,
        Regime.OVERDAMPED,
        Regime.UNDAMPED,
        Regime.CRITICALLY_DAMPED,
    }
    assert bool(growing) == any(root.real > 0 for root in exact)


@pytest.mark.parametrize("seed", range(4))
def test_relaxing_mounts_and_massless_joints(seed: int) -> None:
    """Series branches: as many surplus real roots as first-order states, checked by the determinant in 50 digits."""
    import networkx as nx

    rng = np.random.default_rng(seed)
    graph = nx.MultiGraph(title="relaxing", directions=("x",), damping={})
    graph.add_node("ground", kind="ground", centre=np.zeros(3))
    masses = rng.uniform(1, 5, 3)
    for index, mass in enumerate(masses):
        graph.add_node(index, mass=float(mass))
    pairs = [(0, "ground"), (1, 0), (2, 1)]
    k, k1, c1 = 10 ** rng.uniform(2, 3, 3), 10 ** rng.uniform(2, 3, 3), 10 ** rng.uniform(0, 1.5, 3)
    for number, pair in enumerate(pairs):
        branch = {"stiffness": float(k1[number]), "damping": float(c1[number])}
        graph.add_edge(*pair, key=f"mount {number}", between=pair, stiffness=float(k[number]), branches=[branch])
    modes = mdof.solve(mdof.assemble(graph))
    assert modes.regimes.count(Regime.RELAXATION) >= 3
    assert modes.verification.eigenvalues_found == 2 * 3 + 3
    with mp.workdps(DIGITS):
        B = [[1, -1, 0], [0, 1, -1], [0, 0, 1]]

        def determinant(s: mp.mpc) -> mp.mpc:
            force = [
                mp.mpf(float(k[i]))
                + s * mp.mpf(float(k1[i])) * mp.mpf(float(c1[i])) / (mp.mpf(float(k1[i])) + s * mp.mpf(float(c1[i])))
                for i in range(3)
            ]
            D = mp.diag([s * s * mp.mpf(float(m)) for m in masses]) + mp.matrix(B) * mp.diag(force) * mp.matrix(B).T
            return mp.det(D)

        for mode in modes:
            root = mp.mpc(mode.eigenvalues[0])
            exact = mp.findroot(determinant, root)
            assert abs(exact - root) <= (mode.frequency_bound + 4 * ROUNDOFF) * abs(root)
