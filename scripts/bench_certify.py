"""Times of proofs and the share that is proven: python scripts/bench_certify.py [--count N] [--seed S]

Every demo model in every state, then random systems of several kinds from seeds. Random spectra are simple with
probability one; of those at least 99 % must be proven, none contradicted, and the 48 modes of the skid in about three
seconds. The status is 1 when one of these is missed.
"""

from __future__ import annotations

import argparse
import statistics
import sys
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np

import mdof
from mdof import System
from mdof.certify import Certificate, Verdict, certify

MODELS = Path(__file__).resolve().parent.parent / "models"
SKID_SECONDS = 3.0
SHARE = 0.99


def timed(modes: mdof.DampedModes) -> tuple[Certificate, float]:
    """The certificate and its wall seconds."""
    start = time.perf_counter()
    certificate = certify(modes)
    return certificate, time.perf_counter() - start


def models() -> bool:
    """Print a line for every model and state; True where none is contradicted and the skid is quick enough."""
    good = True
    for path in sorted(MODELS.glob("*.yaml")):
        model = mdof.load(path)
        for state in (None, *model.state_names):
            certificate, seconds = timed(mdof.solve(mdof.assemble(model.with_state(state) if state else model)))
            print(f"{path.stem:26} {state or 'as written':24} {seconds:7.3f} s  {certificate.summary}")
            good &= not certificate.contradicted
            if path.stem == "firewater_skid":
                good &= seconds <= SKID_SECONDS and certificate.number(Verdict.PROVEN) == len(certificate.modes)
    return good


def chain(rng: np.random.Generator, n: int) -> System:
    """Masses in a row on springs, a few dampers anywhere."""
    dampers = rng.normal(size=(n, 3)) * (rng.random((n, 3)) < 0.5)
    springs = np.eye(n) - np.eye(n, k=1)
    mass = np.diag(10.0 ** rng.uniform(-1, 1, n))
    return System.from_factors(mass, springs, 10.0 ** rng.uniform(2, 5, n), dampers, 10.0 ** rng.uniform(-1, 2, 3))


def graded(rng: np.random.Generator, n: int) -> System:
    """Stiffness over twelve orders of magnitude, damping over six."""
    springs = np.eye(n) - np.eye(n, k=1)
    damping = 10.0 ** rng.uniform(-3, 3, n)
    return System.from_factors(np.eye(n), springs, 10.0 ** rng.uniform(-3, 9, n), springs, damping)


def heavy(rng: np.random.Generator, n: int) -> System:
    """A heavy damper beside every spring: most roots real."""
    springs = np.eye(n) - np.eye(n, k=1)
    return System.from_factors(np.eye(n), springs, rng.uniform(1, 9, n), springs, 10.0 ** rng.uniform(0, 2, n))


def unsymmetric(rng: np.random.Generator, n: int) -> System:
    """Full C and K without any symmetry, some modes unstable."""
    base = rng.normal(size=(n, n))
    damping, stiffness = rng.normal(size=(n, n)), base @ base.T + 0.3 * rng.normal(size=(n, n))
    return System.from_matrices(np.diag(rng.uniform(1, 2, n)), damping, stiffness)


KINDS: dict[str, Callable[[np.random.Generator, int], System]] = {
    "chain, three dampers": chain,
    "graded stiffness": graded,
    "heavily damped": heavy,
    "unsymmetric": unsymmetric,
}


def random_systems(kind: str, sizes: tuple[int, ...], count: int, seed: int) -> bool:
    """Print the proven share of one kind; True where it is large enough and nothing is contradicted."""
    modes = proven = contradicted = refused = 0
    seconds: list[float] = []
    for index in range(count):
        rng = np.random.default_rng([seed, index, list(KINDS).index(kind)])
        try:
            solved = mdof.solve(KINDS[kind](rng, int(rng.choice(sizes))))
        except mdof.UnverifiedError:
            refused += 1
            continue
        certificate, taken = timed(solved)
        seconds.append(taken)
        modes += len(certificate.modes)
        proven += certificate.number(Verdict.PROVEN)
        if certificate.contradicted:
            contradicted += 1
            print(f"    contradicted: {kind}, index {index}: {certificate.summary}")
    share = proven / modes if modes else 0.0
    median = statistics.median(seconds) if seconds else 0.0
    print(
        f"{kind:24} {count} systems ({refused} refused by the solver), {100 * share:.2f} % of {modes} modes proven, "
        f"{contradicted} systems contradicted, median {median:.4f} s"
    )
    return share >= SHARE and not contradicted


def main() -> int:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--count", type=int, default=500, help="random systems of each kind")
    parser.add_argument("--seed", type=int, default=1)
    options = parser.parse_args()
    good = models()
    for kind in KINDS:
        good &= random_systems(kind, (1, 2, 3, 5, 8, 13, 20), options.count, options.seed)
    print("met" if good else "MISSED")
    return 0 if good else 1


if __name__ == "__main__":
    sys.exit(main())
