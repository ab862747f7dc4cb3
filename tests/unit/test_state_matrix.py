"""mdof.eigen.state_matrix and quadratic: all roots of coupled blocks against independent eigensolvers."""

from __future__ import annotations

import numpy as np
import pytest
import scipy.linalg

import mdof
from mdof import System
from mdof.eigen.reduce import normalise
from mdof.eigen.state_matrix import companion, energy_balanced


def companion_roots(M: np.ndarray, C: np.ndarray, K: np.ndarray) -> np.ndarray:
    """All finite eigenvalues by the generalised QZ algorithm."""
    n = len(M)
    zero, eye = np.zeros((n, n)), np.eye(n)
    values = scipy.linalg.eig(np.block([[zero, eye], [-K, -C]]), np.block([[eye, zero], [zero, M]]), right=False)
    return values[np.isfinite(values) & (np.abs(values) < 1e8)]


def assert_same(modes: mdof.DampedModes, wanted: np.ndarray, tolerance: float = 1e-9) -> None:
    found = modes.eigenvalues[~np.isnan(modes.eigenvalues)]
    assert len(found) == len(wanted)
    left = list(wanted)
    for value in found:
        nearest = min(left, key=lambda root: abs(root - value))
        assert abs(nearest - value) <= tolerance * max(abs(value), 1.0)
        left.remove(nearest)


@pytest.mark.parametrize("seed", range(8))
def test_coupled_damping(seed: int) -> None:
    rng = np.random.default_rng(seed)
    n = 2 + seed
    A, B = rng.normal(size=(2, n, n))
    M, C, K = np.diag(rng.uniform(0.5, 3, n)), A @ A.T, B @ B.T + np.eye(n)
    assert_same(mdof.solve(System.from_matrices(M, C, K)), companion_roots(M, C, K))


@pytest.mark.parametrize("seed", range(4))
def test_gyroscopic_and_circulatory_terms(seed: int) -> None:
    rng = np.random.default_rng(seed)
    A, B, D = rng.normal(size=(3, 4, 4))
    M, C, K = np.eye(4), 0.1 * A @ A.T + (B - B.T), 20 * np.eye(4) + (D - D.T)
    assert_same(mdof.solve(System.from_matrices(M, C, K)), companion_roots(M, C, K))


def test_free_motions_have_exact_zero_roots_damped_or_not() -> None:
    """A free pair joined by spring and damper beside a free mass with drag: zeros 2 + 1, and the drag's decay."""
    K = np.array([[2.0, -2.0, 0], [-2.0, 2.0, 0], [0, 0, 0]])
    modes = mdof.solve(System.from_matrices(np.diag([1.0, 3.0, 2.0]), 0.1 * K + np.diag([0, 0, 0.5]), K))
    values = modes.eigenvalues[~np.isnan(modes.eigenvalues)]
    assert np.sum(values == 0) == 3
    assert -0.25 in values.real.round(14)


def test_a_damped_massless_coordinate_and_an_unsymmetric_stiffness() -> None:
    rng = np.random.default_rng(5)
    M, C = np.diag([1.0, 2.0, 0.0]), np.diag([0.2, 0.1, 4.0])
    K = np.diag([5.0, 6.0, 7.0]) + rng.normal(size=(3, 3))
    assert_same(mdof.solve(System.from_matrices(M, C, K)), companion_roots(M, C, K), 1e-8)


def test_undamped_modes_beside_damped_ones_are_exactly_imaginary() -> None:
    modes = mdof.solve(System.from_matrices(np.eye(3), np.diag([0.0, 1.0, 0.0]), np.diag([1.0, 4.0, 9.0])))
    assert [mode.decay_rate for mode in modes if mode.regime == "undamped"] == [0.0, 0.0]


def test_the_method_says_what_was_done() -> None:
    K = np.diag([1.0, 4.0])
    assert "proportional" in mdof.solve(System.from_matrices(np.eye(2), 0.1 * K, K)).method
    assert "state matrix" in mdof.solve(System.from_matrices(np.eye(2), np.ones((2, 2)), K)).method


def random_case(seed: int, *, joints: int, free: int, gyroscopic: bool) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Five coordinates; the last ``joints`` are massless and damped, ``free`` motions are left to the dampers."""
    rng = np.random.default_rng(seed)
    n = 5
    M = np.diag(np.concatenate([rng.uniform(1, 3, n - joints), np.zeros(joints)]))
    A = rng.normal(size=(n, n))
    B = rng.normal(size=(n, n - free))
    C, K = A @ A.T / 3, B @ B.T
    if gyroscopic:
        G = rng.normal(size=(n, n))
        G[n - joints :] = G[:, n - joints :] = 0.0
        C = C + G - G.T
    return M, C, K


@pytest.mark.parametrize("gyroscopic", [False, True])
@pytest.mark.parametrize(("joints", "free"), [(1, 0), (2, 0), (0, 1), (1, 1), (2, 2)])
@pytest.mark.parametrize("seed", range(3))
def test_damped_joints_and_free_motions_in_every_mixture(seed: int, joints: int, free: int, gyroscopic: bool) -> None:
    """All roots and shapes, with 2·5 − joints of them, against the generalised QZ algorithm."""
    M, C, K = random_case(seed, joints=joints, free=free, gyroscopic=gyroscopic)
    modes = mdof.solve(System.from_matrices(M, C, K))
    wanted = companion_roots(M, C, K)
    wanted = np.where(np.abs(wanted) < 1e-9, 0, wanted)
    assert_same(modes, wanted, 1e-8)
    assert modes.verification.eigenvalues_found == 10 - joints
    assert np.sum(modes.eigenvalues == 0) == free
    for mode in modes:
        for value, shape in ((mode.eigenvalues[0], mode.shape), (mode.eigenvalues[-1], mode.fast_shape)):
            if shape is not None:
                rest = (value**2 * M + value * C + K) @ shape
                assert np.linalg.norm(rest) < 1e-11 * (abs(value) ** 2 * 3 + abs(value) * np.linalg.norm(C) + 10)


@pytest.mark.parametrize("skew", [False, True])
def test_left_vectors_are_null_from_the_left(skew: bool) -> None:
    M, C, K = random_case(1, joints=0, free=0, gyroscopic=True)
    if skew:
        K[0, 1] += 2.0
        K[1, 0] -= 2.0
    problem = normalise(System.from_matrices(M, C, K))
    block = companion(problem) if skew else energy_balanced(problem, np.arange(5))
    assert block.left is not None
    for value, y in zip(block.values, block.left.T, strict=True):
        rest = y @ (value**2 * np.eye(5) + value * problem.damping + problem.stiffness)
        assert np.linalg.norm(rest) < 1e-9 * np.linalg.norm(y) * np.linalg.norm(problem.stiffness)


def test_undamped_free_motions_have_their_two_zero_roots_as_partners() -> None:
    """Two free rows tied by nothing, dampers within one of them only: a double zero each, the damper elsewhere."""
    tie = np.array([[1.0, -1.0], [-1.0, 1.0]])
    K = scipy.linalg.block_diag(4 * tie, 9 * tie)
    C = scipy.linalg.block_diag(0.5 * tie, 0.0 * tie)
    problem = normalise(System.from_matrices(np.diag([1.0, 2.0, 3.0, 4.0]), C, K))
    block = energy_balanced(problem, np.arange(4))
    zero = np.nonzero(block.values == 0)[0]
    assert len(zero) == 4
    assert block.count == 8
    assert block.partner[block.partner[zero]].tolist() == zero.tolist()
    assert np.all(block.partner[zero] != zero)
    for index in zero:
        assert block.vectors[:, index] == pytest.approx(block.vectors[:, block.partner[index]])
    moves = block.vectors[:, zero].real
    assert np.linalg.matrix_rank(moves) == 2
    assert np.abs(problem.stiffness @ moves).max() < 1e-13


@pytest.mark.parametrize("joints", [0, 1, 2])
@pytest.mark.parametrize("seed", range(3))
def test_follower_forces_beside_damped_joints(seed: int, joints: int) -> None:
    """Unsymmetric stiffness and damping that couples masses and joints both ways."""
    M, C, K = random_case(seed, joints=joints, free=0, gyroscopic=True)
    K = K + 5 * np.eye(5) + np.random.default_rng(seed + 10).normal(size=(5, 5))
    modes = mdof.solve(System.from_matrices(M, C, K))
    assert_same(modes, companion_roots(M, C, K), 1e-8)
    assert modes.verification.eigenvalues_found == 10 - joints


@pytest.mark.parametrize("joint", [False, True])
def test_the_state_matrix_alone_gives_roots_and_shapes_before_any_refinement(joint: bool) -> None:
    M, C, K = random_case(4, joints=int(joint), free=0, gyroscopic=False)
    problem = normalise(System.from_matrices(M, C, K))
    block = energy_balanced(problem, np.arange(5))
    heavy = np.diag(np.arange(5) < problem.heavy).astype(float)
    for value, z in zip(block.values, block.vectors.T, strict=True):
        Q = value**2 * heavy + value * problem.damping + problem.stiffness
        assert np.linalg.norm(Q @ z) < 1e-10 * np.linalg.norm(Q) * np.linalg.norm(z)


def test_the_method_counts_the_modes_that_damping_leaves_alone() -> None:
    tie = np.array([[1.0, 0.5], [0.5, 1.0]])
    for alone, words in ((1, ", 1 mode that damping"), (2, ", 2 modes that damping")):
        C = scipy.linalg.block_diag(tie, np.eye(alone))
        system = System.from_matrices(np.eye(2 + alone), C, np.diag([1.0, 4.0, 9.0, 16.0][: 2 + alone]))
        assert words in mdof.solve(system).method
    relaxing = System.from_matrices(np.diag([1.0, 0.0]), np.diag([0.0, 1.0]), [[2.0, -1.0], [-1.0, 2.0]])
    assert "with first-order states" in mdof.solve(relaxing).method
    assert "first-order" not in mdof.solve(System.from_matrices(np.eye(2), tie, np.diag([1.0, 4.0]))).method


def test_a_gyroscopic_term_of_no_size_changes_no_regime() -> None:
    """A relaxation root stays one beside 1e-7 of gyroscopic coupling."""
    M = np.diag([1.0, 1.5, 0.0])
    C = np.array([[0.2, 0.0, 0.1], [0.0, 0.3, -0.1], [0.1, -0.1, 1.0]])
    K = np.array([[9.0, -2.0, -3.0], [-2.0, 6.0, -1.0], [-3.0, -1.0, 8.0]])
    G = np.zeros((3, 3))
    G[0, 1], G[1, 0] = 1e-7, -1e-7
    plain, turning = (mdof.solve(mdof.System.from_matrices(M, part, K)) for part in (C, C + G))
    assert "relaxation" in plain.regimes
    assert turning.regimes == plain.regimes


def test_left_vectors_are_null_from_the_left_beside_massless_coordinates() -> None:
    rng = np.random.default_rng(1)
    A, B, G = rng.normal(size=(3, 4, 4))
    G[3] = G[:, 3] = 0.0
    problem = normalise(
        mdof.System.from_matrices(np.diag([1.0, 2.0, 3.0, 0.0]), A @ A.T + G - G.T, B @ B.T + np.eye(4))
    )
    block = energy_balanced(problem, np.arange(4))
    heavy = np.diag([1.0, 1.0, 1.0, 0.0])
    assert block.left is not None
    for value, y in zip(block.values, block.left.T, strict=True):
        rest = y @ (value**2 * heavy + value * problem.damping + problem.stiffness)
        assert np.linalg.norm(rest) < 1e-9 * np.linalg.norm(y) * np.linalg.norm(problem.stiffness)
