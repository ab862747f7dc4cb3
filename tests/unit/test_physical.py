"""mdof.modes.physical: residuals in the coordinates and units of the model."""

from __future__ import annotations

import numpy as np
import pytest

import mdof
from mdof.modes.physical import PhysicalResidual


def system(seed: int) -> mdof.System:
    rng = np.random.default_rng(seed)
    A, B = rng.normal(size=(2, 4, 4))
    return mdof.System.from_matrices(np.diag([1.0, 1e3, 1e-3, 10.0]), A @ A.T, B @ B.T + np.eye(4))


def test_the_backward_error_is_tisseurs_and_never_below_it() -> None:
    given = system(1)
    M, C, K = given.M.toarray(), given.C.toarray(), given.K.toarray()
    rng = np.random.default_rng(0)
    value, x = 0.3 + 2j, rng.normal(size=4) + 1j * rng.normal(size=4)
    size = sum(abs(value) ** power * np.linalg.norm(part, 2) for power, part in ((2, M), (1, C), (0, K)))
    wanted = np.linalg.norm((value**2 * M + value * C + K) @ x) / (size * np.linalg.norm(x))
    found = PhysicalResidual(given, None).backward_errors(np.array([value]), x[:, None])
    # The longest column lies between the 2-norm over sqrt(n) and the 2-norm.
    assert wanted <= found[0] <= 2 * wanted


@pytest.mark.parametrize("seed", range(4))
def test_polishing_repairs_a_spoilt_pair_and_stays_within_its_freedom(seed: int) -> None:
    given = system(seed)
    modes = mdof.solve(given)
    values = modes.eigenvalues[:, 0]
    vectors = modes.reduced_shapes * (1 + 1e-7 * np.random.default_rng(seed).normal(size=modes.reduced_shapes.shape))
    moved, better, errors = PhysicalResidual(given, None).polish(values, vectors, 1e-12 * np.abs(values))
    assert np.all(errors < 10 * 4 * 2.0**-52)
    assert np.all(np.abs(moved - values) <= 1e-12 * np.abs(values))
    for a, b in zip(better.T, modes.reduced_shapes.T, strict=True):
        assert abs(np.vdot(a, b)) == pytest.approx(np.linalg.norm(a) * np.linalg.norm(b), rel=1e-10)


def test_a_large_sparse_system_uses_norms_that_flatter_nobody() -> None:
    n = 300
    K = 2 * np.eye(n) - np.eye(n, k=1) - np.eye(n, k=-1)
    given = mdof.System.from_matrices(np.eye(n), 0.1 * np.eye(n), K)
    residual = PhysicalResidual(given, None)
    exact = [np.linalg.norm(part.toarray(), 2) for part in (given.M, given.C, given.K)]
    assert all(used <= true * (1 + 1e-12) for used, true in zip(residual.norms, exact, strict=True))


def of_every_kind(floating: bool) -> mdof.System:
    """Springs, dampers, loss factors, proportional, general and gyroscopic terms at once."""
    rng = np.random.default_rng(5)
    columns = rng.normal(size=(4, 6))
    return system(3).with_values(
        spring_columns=columns,
        stiffness=rng.uniform(1, 9, 6),
        loss_factor=np.array([0.1, 0.0, 0.2, 0.0, 0.3, 0.0]),
        loss_reference=np.array([4.0, np.nan, np.nan if floating else 7.0, 9.0, np.nan if floating else 2.0, np.nan]),
        damper_columns=rng.normal(size=(4, 2)),
        damping=np.array([0.5, 1.5]),
        mass_proportional=0.3,
        stiffness_proportional=0.02,
        gyroscopic=np.diag([0.5, 0.2, 0.1], 1) - np.diag([0.5, 0.2, 0.1], -1),
    )


@pytest.mark.parametrize("floating", [False, True])
def test_residuals_hold_damping_of_every_kind_at_the_reference_of_each_root(floating: bool) -> None:
    given = of_every_kind(floating)
    rng = np.random.default_rng(0)
    values, vectors = (
        rng.normal(size=3) + 1j * rng.normal(size=3),
        rng.normal(size=(4, 3)) + 1j * rng.normal(size=(4, 3)),
    )
    references = np.array([3.0, 5.0, 11.0]) if floating else None
    residual = PhysicalResidual(given, references)
    M, K = given.M.toarray(), given.K.toarray()
    middle = given.damping_matrix(5.0 if floating else None).toarray()
    norms = [np.linalg.norm(part, axis=0).max() for part in (M, middle, K)]
    assert residual.norms == pytest.approx(norms, rel=1e-12)
    together = residual.backward_errors(values, vectors)
    for index, value in enumerate(values):
        C = given.damping_matrix(None if references is None else float(references[index])).toarray()
        x = vectors[:, index]
        size = abs(value) ** 2 * norms[0] + abs(value) * norms[1] + norms[2]
        wanted = np.linalg.norm((value**2 * M + value * C + K) @ x) / (size * np.linalg.norm(x))
        assert together[index] == pytest.approx(wanted, rel=1e-11)
        alone = residual.backward_errors(values[[index]], vectors[:, [index]], index)
        assert alone[0] == pytest.approx(wanted, rel=1e-11)


@pytest.mark.parametrize("floating", [False, True])
def test_polishing_finds_the_pair_of_damping_of_every_kind(floating: bool) -> None:
    """With freedom enough, from a start off by a thousandth; the reference stays what it was."""
    given = of_every_kind(floating)
    reference = 6.0
    C = given.damping_matrix(reference if floating else None).toarray()
    M, K = given.M.toarray(), given.K.toarray()
    state = np.block([[np.zeros((4, 4)), np.eye(4)], [-np.linalg.solve(M, K), -np.linalg.solve(M, C)]])
    exact, states = np.linalg.eig(state)
    which = int(np.argmax(exact.imag))
    start = np.array([exact[which] * (1 + 1e-5)])
    vector = states[:4, [which]] * (1 + 1e-5 * np.arange(4)[:, None])
    references = np.array([reference]) if floating else None
    residual = PhysicalResidual(given, references)
    before = residual.backward_errors(start, vector)
    values, vectors, errors = residual.polish(start, vector, np.abs(start))
    assert errors[0] < 1e-9 * before[0]
    assert values[0] == pytest.approx(exact[which], rel=1e-9)
    assert errors == pytest.approx(residual.backward_errors(values, vectors))


def test_polishing_leaves_good_pairs_and_zero_roots_as_they_are() -> None:
    given = system(2)
    modes = mdof.solve(given)
    residual = PhysicalResidual(given, None)
    values, vectors, _ = residual.polish(modes.eigenvalues[:, 0], modes.reduced_shapes, np.full(len(modes), 1.0))
    good = residual.backward_errors(modes.eigenvalues[:, 0], modes.reduced_shapes) < 0.5 * 4 * 2.0**-52
    assert (values[good] == modes.eigenvalues[good, 0]).all()
    assert (vectors[:, good] == modes.reduced_shapes[:, good]).all()
    free = mdof.System.from_matrices(np.eye(1), np.eye(1), np.zeros((1, 1)))
    zero = PhysicalResidual(free, None).polish(np.zeros(1, dtype=complex), np.ones((1, 1), dtype=complex), np.ones(1))
    assert (zero[0][0], zero[1][0, 0], zero[2][0]) == (0, 1, 0)


def test_a_large_system_leaves_the_same_residual_through_sparse_products() -> None:
    n = 230
    K = 2 * np.eye(n) - np.eye(n, k=1) - np.eye(n, k=-1)
    given = mdof.System.from_matrices(np.eye(n), 0.1 * np.eye(n), K).with_values(stiffness_proportional=0.01)
    rng = np.random.default_rng(0)
    value, x = -0.1 + 1.3j, rng.normal(size=n) + 1j * rng.normal(size=n)
    M, C, K = given.M.toarray(), given.C.toarray(), given.K.toarray()
    size = sum(abs(value) ** power * np.linalg.norm(part, axis=0).max() for power, part in ((2, M), (1, C), (0, K)))
    wanted = np.linalg.norm((value**2 * M + value * C + K) @ x) / (size * np.linalg.norm(x))
    assert PhysicalResidual(given, None).backward_errors(np.array([value]), x[:, None]) == pytest.approx([wanted])


def test_a_root_that_makes_the_matrix_exactly_singular_is_polished_too() -> None:
    """K − 4M has an exact zero: elimination breaks down there, and the null vector is the shape."""
    given = mdof.System.from_matrices(np.eye(2), np.zeros((2, 2)), np.diag([4.0, 9.0]))
    spoilt = np.array([[1.0], [1e-6]], dtype=complex)
    _, better, errors = PhysicalResidual(given, None).polish(np.array([2j]), spoilt, np.array([1e-12]))
    assert errors[0] < 1e-15
    assert abs(better[1, 0]) < 1e-15 * abs(better[0, 0])
