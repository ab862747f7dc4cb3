"""How fast and how right the kernels are: python scripts/bench_eigen.py [--short] [ROW...]

Every row times mdof's public door, pairing and verification and shapes included, against a general-purpose peer at its
best with vectors, both in this run and with the same number of BLAS threads. Generators and seeds are fixed here. The
status is 1 when a row misses its figure.
"""

from __future__ import annotations

import argparse
import resource
import statistics
import sys
import time
from collections.abc import Callable

import numpy as np
import scipy.linalg
import scipy.sparse.linalg
from scipy import sparse
from threadpoolctl import threadpool_info

import mdof
from mdof import Regime, System

EPS = float(np.finfo(float).eps)


def machine(n: int, dampers: int, spread: float, heavy: float, seed: int) -> tuple[System, np.ndarray]:
    """A dense stiffness matrix, random masses, and dampers to ground at random coordinates; with its state matrix.

    ``spread`` is how many orders of magnitude the dampers cover, ``heavy`` the smallest of them over the critical
    damping of its coordinate.
    """
    rng = np.random.default_rng(seed)
    A = rng.normal(size=(n, n))
    K = A @ A.T / n + np.diag(np.linspace(1, 100, n))
    mass = rng.uniform(0.5, 2.0, n)
    place = rng.choice(n, dampers, replace=False)
    critical = 2 * np.sqrt(np.diag(K)[place] * mass[place])
    C = np.zeros((n, n))
    C[place, place] = critical * heavy * 10 ** np.linspace(0, spread, dampers)
    scale = 1 / np.sqrt(mass)
    state = np.zeros((2 * n, 2 * n))
    state[:n, n:] = np.eye(n)
    state[n:, :n] = -(K * scale) * scale[:, None]
    state[n:, n:] = -(C * scale) * scale[:, None]
    return System.from_matrices(np.diag(mass), C, K), state


def timed(work: Callable[[], object], turns: int) -> float:
    """Median seconds of so many calls."""
    seconds = []
    for _ in range(turns):
        start = time.perf_counter()
        work()
        seconds.append(time.perf_counter() - start)
    return statistics.median(seconds)


def solved(system: System) -> mdof.DampedModes:
    modes = mdof.solve(system)
    _ = modes.shapes
    return modes


def peer_error(state: np.ndarray) -> float:
    """Largest backward error of scipy.linalg.eig's pairs, over the norm of the state matrix."""
    values, vectors = scipy.linalg.eig(state)
    rest = np.linalg.norm(state @ vectors - vectors * values, axis=0) / np.linalg.norm(vectors, axis=0)
    return float(rest.max() / np.linalg.norm(state, 2))


def report(name: str, ratio: float, ours: float, peer: float, limit: float, at_most: bool = False) -> bool:
    met = ratio <= limit if at_most else ratio >= limit
    wish = f"at most {limit:g} x its time" if at_most else f"at least {limit:g} x faster"
    print(f"{name:<46} {ratio:6.1f} x   ours {ours:9.4f} s, peer {peer:9.4f} s   {wish}: {'met' if met else 'MISSED'}")
    return met


def dense_row(n: int, dampers: int, spread: float, least: float, turns: int) -> bool:
    """All 2n eigenpairs of a dense system with few dampers against scipy.linalg.eig on the state matrix."""
    system, state = machine(n, dampers, spread, 3.0, seed=n + dampers)
    modes = solved(system)
    pairs = modes.regimes.count(Regime.OVERDAMPED)
    ours = timed(lambda: solved(system), turns)
    peer = timed(lambda: scipy.linalg.eig(state), max(1, turns // 3))
    name = f"all pairs, n = {n}, {dampers} dampers"
    met = report(name, peer / ours, ours, peer, least)
    print(
        f"    {pairs} real pairs; {modes.method}; largest backward error "
        f"{modes.backward_errors.max():.1e}, peer {peer_error(state):.1e}; largest bound "
        f"{modes.verification.largest_frequency_bound:.1e}"
    )
    return met


def small_row(turns: int) -> bool:
    """One solve of 24 coordinates."""
    system, state = machine(24, 3, 1.0, 0.1, seed=24)
    solved(system)
    ours, peer = timed(lambda: solved(system), turns), timed(lambda: scipy.linalg.eig(state), turns)
    return report("24 coordinates, one solve", ours / peer, ours, peer, 4.0, at_most=True)


def sweep_row() -> bool:
    """50 values of one damper, branches followed, against 50 eigensolves of the state matrix."""
    n = 600
    system, state = machine(n, 1, 0.0, 1.0, seed=6)
    K, mass = system.K.toarray(), system.M.diagonal()
    place = int(np.argmax(system.C.diagonal()))
    held = with_dampers(System.from_matrices(np.diag(mass), np.zeros((n, n)), K), np.array([place]), 1.0)
    values = system.C.diagonal()[place] * np.geomspace(0.01, 10, 50)
    swept = mdof.sweep(held, "pot 0", list(values))
    ours = timed(lambda: mdof.sweep(held, "pot 0", list(values)), 3)
    peer = 50 * timed(lambda: scipy.linalg.eig(state), 3)
    met = report("50 values of one damper, n = 600", peer / ours, ours, peer, 30.0)
    print(f"    {'; '.join(swept.methods)}; lowest confidence {np.nanmin(swept.confidence):.2f}")
    return met


def lattice(side: int, dampers: int, seed: int) -> System:
    """A cubic lattice of masses held at its faces, springs as a sparse matrix, heavy dampers to ground as factors."""
    rng = np.random.default_rng(seed)
    one = sparse.eye_array(side)
    row = 2 * one - sparse.eye_array(side, k=1) - sparse.eye_array(side, k=-1)
    K = sum(
        sparse.kron(sparse.kron(a, b), c) for a, b, c in ((row, one, one), (one, row, one), (one, one, row))
    ).tocsc()
    n = side**3
    system = System.from_matrices(sparse.diags_array(rng.uniform(0.5, 2.0, n)), sparse.csc_array((n, n)), 1e4 * K)
    return with_dampers(system, rng.choice(n, dampers, replace=False), 50.0)


def tree(n: int, dampers: int, seed: int) -> System:
    """Masses on a branching row of springs, each hung on one of the fifty before it; light dampers to ground."""
    rng = np.random.default_rng(seed)
    index = np.arange(1, n)
    parent = index - 1 - (rng.random(n - 1) * np.minimum(index, 50)).astype(int)
    rows = np.concatenate([np.arange(n), parent])
    columns = sparse.csc_array((np.r_[np.ones(n), -np.ones(n - 1)], (rows, np.r_[0:n, 1:n])), shape=(n, n))
    empty = sparse.csc_array((n, n))
    system = System.from_matrices(sparse.diags_array(rng.uniform(0.5, 2.0, n)), empty, empty).with_values(
        spring_columns=columns,
        stiffness=10 ** rng.uniform(5, 6, n),
        loss_factor=np.zeros(n),
        loss_reference=np.full(n, np.nan),
        spring_names=("spring",) * n,
        spring_grounded=np.arange(n) == 0,
    )
    return with_dampers(system, rng.choice(n, dampers, replace=False), 1.0)


def with_dampers(system: System, place: np.ndarray, damping: float) -> System:
    count = len(place)
    columns = sparse.csc_array((np.ones(count), (place, np.arange(count))), shape=(system.size, count))
    return system.with_values(
        damper_columns=columns,
        damping=np.full(count, damping),
        damper_names=tuple(f"pot {index}" for index in range(count)),
        damper_spring=np.full(count, -1),
        damper_grounded=np.ones(count, dtype=bool),
    )


def lattice_row(side: int) -> bool:
    """40 eigenvalues (20 pairs) nearest 0 against shift-invert Arnoldi on the pencil of size 2n."""
    system = lattice(side, 8, seed=1)
    n, M, C, K = system.size, system.M, system.C, system.K
    one = sparse.eye_array(n)
    left = sparse.block_array([[None, one], [-K, -C]], format="csc")
    right = sparse.block_array([[one, None], [None, M]], format="csc")
    modes = mdof.solve(system, count=20)
    ours = timed(lambda: mdof.solve(system, count=20), 2)
    peer = timed(lambda: scipy.sparse.linalg.eigs(left, k=40, M=right, sigma=0.0), 1)
    met = report(f"40 eigenvalues nearest 0, lattice of {n:,}", peer / ours, ours, peer, 4.0)
    print(f"    {modes.method}; largest bound {modes.verification.largest_frequency_bound:.1e}")
    return met


def tree_row(n: int) -> bool:
    """20 damped modes of a tree-like graph against the undamped ones by Lanczos' method."""
    system = tree(n, 8, seed=2)
    M, K = system.M, system.K
    start = time.perf_counter()
    modes = mdof.solve(system, count=20)
    ours = time.perf_counter() - start
    peer = timed(lambda: scipy.sparse.linalg.eigsh(K, k=20, M=M, sigma=0.0), 1)
    met = report(f"20 modes of a tree of {n:,}", ours / peer, ours, peer, 3.0, at_most=True)
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss * (1.0 if sys.platform == "darwin" else 1024.0)
    print(
        f"    {modes.method}; largest bound {modes.verification.largest_frequency_bound:.1e}; "
        f"peak {peak / n / 1e3:.2f} kB a coordinate (limit 4): {'met' if peak / n <= 4e3 else 'MISSED'}"
    )
    return met and peak / n <= 4e3


def growth(turns: int) -> bool:
    """How time grows from n = 250 to n = 2000, and how often the secular form is given up."""
    sizes = (250, 500, 1000, 2000)
    seconds, given_up, count = [], 0, 0
    for n in sizes:
        system, _ = machine(n, 4, 2.0, 3.0, seed=7 * n)
        seconds.append(timed(lambda system=system: solved(system), turns))
    for seed in range(20):
        system, _ = machine(250, 4, 2.0, 3.0, seed=seed)
        given_up += "given up" in solved(system).method
        count += 1
    slope = np.polynomial.polynomial.polyfit(np.log(sizes), np.log(seconds), 1)[1]
    shown = ", ".join(f"{n}: {s:.3f} s" for n, s in zip(sizes, seconds, strict=True))
    print(f"growth with n, 4 dampers: exponent {slope:.2f} ({shown}); secular form given up in {given_up} of {count}")
    return given_up <= 0.05 * count


def main() -> int:
    """Measure, print and judge."""
    parser = argparse.ArgumentParser(description=(__doc__ or "").splitlines()[0])
    parser.add_argument("--short", action="store_true", help="fewer turns, and no row that takes a minute")
    parser.add_argument(
        "rows", nargs="*", metavar="ROW", help="small, dense1000, dense2000, sweep, growth, lattice, tree; default all"
    )
    options = parser.parse_args()
    turns = 3 if options.short else 9
    rows: dict[str, Callable[[], bool]] = {
        "small": lambda: small_row(30),
        "dense1000": lambda: dense_row(1000, 4, 0.0, 6.0, turns),
        "dense2000": lambda: dense_row(2000, 8, 4.0, 8.0, 3),
        "sweep": sweep_row,
        "growth": lambda: growth(3),
        "lattice": lambda: lattice_row(30),
        "tree": lambda: tree_row(1_000_000),
    }
    chosen = options.rows or [
        name for name in rows if not (options.short and name not in ("small", "dense1000", "sweep"))
    ]
    unknown = set(chosen) - set(rows)
    if unknown:
        parser.error(f"no row {', '.join(sorted(unknown))}; rows are {', '.join(rows)}")
    threads = {entry["internal_api"]: entry["num_threads"] for entry in threadpool_info()}
    print(f"BLAS threads {threads}, medians")
    met = [rows[name]() for name in chosen]
    return 0 if all(met) else 1


if __name__ == "__main__":
    sys.exit(main())
