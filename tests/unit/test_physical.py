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
