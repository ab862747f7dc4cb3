"""mdof.eigen.lowrank, secular and choose: few dampers on many coordinates."""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest

import mdof
from mdof.eigen.lowrank import NotResolved, few_dampers
from mdof.eigen.secular import Secular


def form(seed: int, n: int = 12, rank: int = 2, size: float = 1.0, own: float = 0.0) -> tuple[np.ndarray, ...]:
    rng = np.random.default_rng(seed)
    squares = np.sort(rng.uniform(1, 100, n))
    return squares, own * np.sqrt(squares), size * rng.normal(size=(n, rank))


def state_roots(squares: np.ndarray, own: np.ndarray, columns: np.ndarray) -> np.ndarray:
    n = len(squares)
    D = np.diag(own) + columns @ columns.T
    return np.linalg.eigvals(np.block([[np.zeros((n, n)), np.eye(n)], [-np.diag(squares), -D]]))


@pytest.mark.parametrize("own", [0.0, 0.05])
def test_the_secular_matrix_and_its_slope(own: float) -> None:
    squares, damping, columns = form(0, own=own)
    secular = Secular(squares, damping, columns)
    value = -0.3 + 2.1j

    def direct(v: complex, skip: int = -1) -> np.ndarray:
        q = v**2 + damping * v + squares
        q = np.where(np.arange(len(q)) == skip, np.inf, q)
        return np.eye(2) + v * columns.T @ (columns / q[:, None])

    whole, slope = secular.sums(np.array([value]))
    assert whole[0] == pytest.approx(direct(value), rel=1e-12)
    step = 1e-6
    assert slope[0] == pytest.approx((direct(value + step) - direct(value - step)) / (2 * step), rel=1e-6)
    without, _ = secular.sums(np.array([value]), np.array([3]))
    assert without[0] == pytest.approx(direct(value, 3), rel=1e-12)


def test_the_inertia_count_is_that_of_the_whole_matrix() -> None:
    squares, damping, columns = form(1, size=3.0, own=0.02)
    rates = np.geomspace(1e-2, 1e3, 40)
    D = np.diag(damping) + columns @ columns.T
    wanted = [int(np.sum(np.linalg.eigvalsh(s * s * np.eye(12) - s * D + np.diag(squares)) < 0)) for s in rates]
    assert Secular(squares, damping, columns).negative(rates).tolist() == wanted


def test_the_logarithmic_slope_is_the_sum_over_all_roots() -> None:
    squares, damping, columns = form(2)
    value = 0.7 + 1.3j
    wanted = np.sum(1 / (value - state_roots(squares, damping, columns)))
    assert Secular(squares, damping, columns).log_slope(np.array([value]))[0] == pytest.approx(wanted, rel=1e-10)


@pytest.mark.parametrize("size", [0.01, 1.0, 5.0, 100.0])
@pytest.mark.parametrize("seed", range(6))
def test_all_roots_light_and_heavy(seed: int, size: float) -> None:
    squares, own, columns = form(seed, rank=1 + seed % 3, size=size, own=0.03 * (seed % 2))
    found = few_dampers(squares, own, columns).values
    every = np.concatenate([found, found[found.imag > 0].conj()])
    truth = list(state_roots(squares, own, columns))
    assert len(every) == len(truth)
    for root in every:
        nearest = min(truth, key=lambda other: abs(other - root))
        assert abs(nearest - root) < 1e-8 * abs(root)
        truth.remove(nearest)


def test_vectors_solve_the_problem() -> None:
    squares, own, columns = form(4, rank=3, size=2.0)
    roots = few_dampers(squares, own, columns)
    z = roots.vectors / np.linalg.norm(roots.vectors, axis=0)
    left = (roots.values**2 + squares[:, None]) * z + roots.values * (columns @ (columns.T @ z))
    assert np.linalg.norm(left, axis=0).max() < 1e-12 * (squares.max() + np.abs(roots.values).max() ** 2)


def test_one_damper_against_fifty_digits() -> None:
    """The polynomial Π(λ² + ω²) + λ Σ v² Π' by mpmath."""
    squares, own, columns = form(5, n=5, rank=1, size=3.0)
    with mp.workdps(50):
        w2, v = [mp.mpf(float(x)) for x in squares], [mp.mpf(float(x)) for x in columns[:, 0]]

        def times(a: list[mp.mpf], b: list[mp.mpf]) -> list[mp.mpf]:
            result = [mp.mpf(0)] * (len(a) + len(b) - 1)
            for i, x in enumerate(a):
                for j, y in enumerate(b):
                    result[i + j] += x * y
            return result

        total = [mp.mpf(1)]
        for s in w2:
            total = times(total, [mp.mpf(1), mp.mpf(0), s])
        for k in range(5):
            part = [mp.mpf(1)]
            for i, s in enumerate(w2):
                if i != k:
                    part = times(part, [mp.mpf(1), mp.mpf(0), s])
            part = [mp.mpf(0)] * (len(total) - len(part) - 1) + [v[k] ** 2 * x for x in part] + [mp.mpf(0)]
            total = [a + b for a, b in zip(total, part, strict=True)]
        exact = mp.polyroots(total[::-1], maxsteps=500, extraprec=500, asc=True)
        for root in few_dampers(squares, own, columns).values:
            assert min(abs(mp.mpc(root) - other) / abs(other) for other in exact) < 1e-13


def test_roots_about_to_collide_are_left_to_another_kernel() -> None:
    """One oscillator at its critical damping: the double root is a matter for averaging."""
    with pytest.raises(NotResolved, match=r"collide|odd|missing|coincide|settle"):
        few_dampers(np.array([1.0, 4.0]), np.zeros(2), np.array([[np.sqrt(2.0), 0.0], [0.0, 0.1]]))


@pytest.mark.parametrize("seed", range(10))
def test_both_kernels_agree_through_the_front_door(seed: int) -> None:
    rng = np.random.default_rng(seed)
    n = 40
    A = rng.normal(size=(n, n))
    M, K = np.diag(rng.uniform(0.5, 2, n)), A @ A.T / n + np.diag(np.linspace(1, 80, n))
    B = np.zeros((n, 3))
    B[rng.choice(n, 3, replace=False), range(3)] = 1
    C = (B * 10 ** rng.uniform(-1, 3, 3)) @ B.T
    system = mdof.System.from_matrices(M, C, K)
    few, dense = (mdof.solve(system, method=method) for method in ("few dampers", "dense"))
    assert "secular form" in few.method
    assert "given up" not in few.method
    assert few.regimes == dense.regimes
    np.testing.assert_allclose(few.natural_frequencies, dense.natural_frequencies, rtol=1e-9)
    np.testing.assert_allclose(few.damping_ratios, dense.damping_ratios, rtol=1e-7, atol=1e-12)


def test_few_dampers_on_many_coordinates_are_found_and_used() -> None:
    n = 80
    K = 2 * np.eye(n) - np.eye(n, k=1) - np.eye(n, k=-1)
    C = np.zeros((n, n))
    C[3, 3] = 0.5
    assert "secular form" in mdof.solve(mdof.System.from_matrices(np.eye(n), C, K)).method
    assert "state matrix" in mdof.solve(mdof.System.from_matrices(np.eye(n), C, K), method="dense").method


def test_dependent_dampers_count_once() -> None:
    """Three dampers on two directions are of rank two."""
    from mdof.eigen.choose import _independent

    rows = np.array([[1.0, 0.0, 2.0], [0.0, 1e-5, 0.0], [3.0, 1.0, 6.0]])
    fewer = _independent(rows)
    assert len(fewer) == 2
    assert fewer.T @ fewer == pytest.approx(rows.T @ rows, rel=1e-9, abs=1e-12)


def test_a_reason_is_given_when_the_secular_form_is_given_up(monkeypatch: pytest.MonkeyPatch) -> None:
    import mdof.eigen.choose as choose

    def refuse(*_: object) -> None:
        raise NotResolved("for this test")

    monkeypatch.setattr(choose, "few_dampers", refuse)
    K = 2 * np.eye(3) - np.eye(3, k=1) - np.eye(3, k=-1)
    columns = mdof.System.from_matrices(np.eye(3), np.zeros((3, 3)), K).with_values(
        damper_columns=np.eye(3, 1),
        damping=np.ones(1),
        damper_names=("d",),
        damper_spring=np.array([-1]),
        damper_grounded=np.array([True]),
    )
    modes = mdof.solve(columns, method="few dampers")
    assert "secular form given up: for this test" in modes.method
    assert len(modes) == 3
