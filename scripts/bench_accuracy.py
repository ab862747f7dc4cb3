"""Modes of thousands of awkward random systems against exact arithmetic: ``python scripts/bench_accuracy.py [COUNT]``.

The truth is the determinant of the exact rational matrix polynomial, from the very binary64 factors the solver was
given, and its isolated roots (Johansson F., Arb, IEEE Transactions on Computers 66, 2017, through python-flint). Every
frequency, ratio and single root is held against its own stated bound and every regime against the sign of the exact
discriminant. A wrong number or regime without a word is a silent error; none is allowed.
"""

from __future__ import annotations

import argparse
import sys
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import flint
import numpy as np
from scipy.optimize import linear_sum_assignment

import mdof
from mdof import Regime, System, UnverifiedError

sys.path.insert(0, str(Path(__file__).parent))
from accuracy_cases import FAMILIES

EPS = 2.0**-52
BITS = 300
#: Stated bounds may be smaller than what a printed binary64 can hold by one rounding.
LAST_DIGIT = 2.0**-52
#: Condition times roundoff below which a refusal counts against the solver.
EASY = 1e-10


@dataclass(slots=True)
class Tally:
    """What one family of cases gave."""

    cases: int = 0
    refused: int = 0
    easy: int = 0
    easy_refused: int = 0
    unlike: int = 0
    silent: list[str] = field(default_factory=list)
    slack: list[float] = field(default_factory=list)
    gates: list[float] = field(default_factory=list)


def exact_matrices(system: System) -> tuple[Any, Any, Any]:
    """M, C and K of rational numbers from the binary64 factors."""
    n = system.size

    def rational(values: Any) -> Any:
        entries = [flint.fmpq(*float(value).as_integer_ratio()) for value in np.asarray(values).ravel()]
        return flint.fmpq_mat(*np.shape(values), entries)

    def gram(columns: Any, weights: Any) -> Any:
        if not columns.shape[1]:
            return flint.fmpq_mat(n, n)
        factor = rational(columns.toarray())
        return factor * rational(np.diag(weights)) * factor.transpose()

    K, C = gram(system.spring_columns, system.stiffness), gram(system.damper_columns, system.damping)
    if system.extra_stiffness is not None:
        K += rational(system.extra_stiffness.toarray())
    if system.extra_damping is not None:
        C += rational(system.extra_damping.toarray())
    return rational(system.mass.toarray()), C, K


def exact_roots(system: System) -> list[Any]:
    """All eigenvalues with their multiplicities, as complex balls narrower than 1e-80 of their size."""
    M, C, K = exact_matrices(system)
    points = [flint.fmpq(p) for p in range(-system.size, system.size + 1)]
    divided = [(p * p * M + p * C + K).det() for p in points]
    for order in range(1, len(points)):
        for index in range(len(points) - 1, order - 1, -1):
            divided[index] = (divided[index] - divided[index - 1]) / (points[index] - points[index - order])
    polynomial = flint.fmpq_poly([0])
    for point, value in zip(reversed(points), reversed(divided), strict=True):
        polynomial = polynomial * flint.fmpq_poly([-point, 1]) + flint.fmpq_poly([value])
    flint.ctx.prec = BITS
    roots = []
    for factor, multiplicity in polynomial.numer().factor_squarefree()[1]:
        for root, _ in factor.complex_roots():
            roots += [flint.acb(root)] * multiplicity
    return roots


def condition(system: System) -> float:
    """Largest normwise condition number of a simple eigenvalue but zero (Tisseur 2000); inf where M is singular."""
    M, C, K = system.M.toarray(), system.C.toarray(), system.K.toarray()
    n = len(M)
    if np.linalg.cond(M) > 1e12:
        return np.inf
    from scipy.linalg import eig

    state = np.block([[np.zeros((n, n)), np.eye(n)], [-np.linalg.solve(M, K), -np.linalg.solve(M, C)]])
    values, left, right = eig(state, left=True)
    keep = np.abs(values) > 1e-9 * np.abs(values).max()
    values, x = values[keep], right[:n, keep]
    y = np.linalg.solve(M.T, left[n:, keep])
    size = np.abs(values)
    weight = size**2 * np.linalg.norm(M, 2) + size * np.linalg.norm(C, 2) + np.linalg.norm(K, 2)
    slope = np.abs(np.einsum("ij,ij->j", y.conj(), 2 * values * (M @ x) + C @ x))
    with np.errstate(divide="ignore"):
        return float(np.max(weight * np.linalg.norm(x, axis=0) * np.linalg.norm(y, axis=0) / (size * slope), initial=0))


def judged(modes: mdof.DampedModes, truth: list[Any]) -> tuple[list[str], list[float]]:
    """Complaints about a solved case, and stated bound over true error of every number."""
    printed = [(mode, complex(value)) for mode in modes for value in mode.eigenvalues]
    if len(printed) != len(truth):
        return [f"{len(printed)} roots where there are {len(truth)}"], []
    rough = np.array([complex(root) for root in truth])
    mine = np.array([value for _, value in printed])
    size = np.maximum(np.maximum(np.abs(mine)[:, None], np.abs(rough)[None, :]), np.finfo(float).tiny)
    rows, columns = linear_sum_assignment(np.abs(mine[:, None] - rough[None, :]) / size)
    own: dict[int, list[Any]] = {}
    for row, column in zip(rows, columns, strict=True):
        own.setdefault(printed[row][0].number, []).append(truth[column])
    complaints, slack = [], []
    for mode in modes:
        words, ratios = _mode_judged(mode, own[mode.number])
        complaints += [f"mode {mode.number} ({mode.regime}): {text}" for text in words]
        slack += ratios
    return complaints, slack


def _mode_judged(mode: mdof.Mode, roots: list[Any]) -> tuple[list[str], list[float]]:
    if mode.regime is Regime.RIGID_BODY or (mode.regime is Regime.DIVERGENT and mode.natural_frequency is None):
        return _rates_judged(mode, roots)
    if len(roots) == 1:
        return _within(abs(mode.eigenvalues[0].real - roots[0].real) / abs(roots[0]), mode.frequency_bound, "rate")
    first, second = roots
    product = abs(first * second)
    if product == 0:
        return ["one of its roots is zero"], []
    frequency = product.sqrt()
    ratio = -(first + second).real / (2 * frequency)
    words, slack = _within(abs(mode.natural_frequency - frequency) / frequency, mode.frequency_bound, "frequency")
    more, other = _within(abs(mode.damping_ratio - ratio), mode.damping_ratio_bound, "ratio", float(abs(ratio)))
    words += more
    if not _regime_fits(mode, ratio):
        words.append(f"the exact ratio is 1 {float(ratio - 1):+.3e}, bound {mode.damping_ratio_bound:.1e}")
    return words, slack + other


def _regime_fits(mode: mdof.Mode, ratio: Any) -> bool:
    known = mode.damping_ratio_bound or 0.0
    if mode.regime is Regime.CRITICALLY_DAMPED:
        return bool(abs(ratio - 1) <= max(1e-9, known))
    if mode.regime is Regime.UNDAMPED:
        return bool(abs(ratio) <= known)
    if mode.regime is Regime.UNSTABLE:
        return bool(ratio < known)
    return bool(ratio < 1 + known and ratio > -known) if mode.regime is Regime.UNDERDAMPED else bool(ratio > 1 - known)


def _rates_judged(mode: mdof.Mode, roots: list[Any]) -> tuple[list[str], list[float]]:
    words, slack = [], []
    for printed, root in zip(mode.eigenvalues, roots, strict=True):
        if printed == 0:
            words += [] if bool(root == 0) else [f"a zero root is {complex(root):.3g}"]
        else:
            more, other = _within(abs(printed.real - root.real) / abs(root), mode.frequency_bound, "rate")
            words, slack = words + more, slack + other
    return words, slack


def _within(error: Any, bound: float | None, what: str, size: float = 1.0) -> tuple[list[str], list[float]]:
    error = float(error)
    if bound is None:
        return [f"no bound on its {what}"], []
    words = [f"{what} off by {error:.2e}, bound {bound:.2e}"] if error > bound + LAST_DIGIT * size else []
    return words, [bound / max(error, EPS / 4)]


def alike(system: System, modes: mdof.DampedModes) -> bool:
    """True where the kernel for few dampers, if it can do the case, agrees with the dense one within the bounds."""
    try:
        other = mdof.solve(system, method="few dampers")
    except UnverifiedError:
        return True
    if len(other) != len(modes):
        return False
    for one, two in zip(modes, other, strict=True):
        pair = (one.natural_frequency, two.natural_frequency, one.frequency_bound, two.frequency_bound)
        if None not in pair and abs(pair[0] - pair[1]) > (pair[2] + pair[3] + LAST_DIGIT) * pair[0]:
            return False
    return True


def run(count: int, seed: int, families: list[str]) -> dict[str, Tally]:
    """``count`` cases shared among the families."""
    tallies = {name: Tally() for name in families}
    for number in range(count):
        name = families[number % len(families)]
        tally, system = tallies[name], FAMILIES[name](np.random.default_rng([seed, number]))
        tally.cases += 1
        easy = condition(system) * EPS < EASY
        tally.easy += easy
        try:
            modes = mdof.solve(system, method="dense")
        except UnverifiedError as refusal:
            tally.refused += 1
            tally.easy_refused += easy
            if easy:
                print(f"  refused: {name}, case {number}: {str(refusal)[:90]}", file=sys.stderr)
            continue
        words, slack = judged(modes, exact_roots(system))
        tally.silent += [f"{name}, case {number}: {text}" for text in words]
        tally.slack += slack
        tally.gates.append(modes.verification.largest_scaled_residual)
        tally.unlike += not alike(system, modes)
    return tallies


def show(tallies: dict[str, Tally]) -> bool:
    """Print the table and say whether every demand is met."""
    print(f"{'family':<22}{'cases':>6}{'refused':>9}{'silent':>8}{'kernels differ':>16}{'bound/error':>13}{'R<1':>7}")
    total = Tally()
    for name, one in [*tallies.items(), ("all", total)]:
        share = np.mean(np.array(one.gates) < 1) if one.gates else np.nan
        median = np.median(one.slack) if one.slack else np.nan
        print(
            f"{name:<22}{one.cases:>6}{one.refused:>9}{len(one.silent):>8}{one.unlike:>16}{median:>13.3g}{share:>7.1%}"
        )
        for part in ("cases", "refused", "easy", "easy_refused", "unlike", "silent", "slack", "gates"):
            if one is not total:
                setattr(total, part, getattr(total, part) + getattr(one, part))
    for text in total.silent[:40]:
        print("  silent:", text)
    demands = [
        ("silent errors", len(total.silent), 0),
        ("kernels that differ", total.unlike, 0),
        ("refused where condition times roundoff < 1e-10, %", 100 * total.easy_refused / max(total.easy, 1), 1.0),
        ("median of stated bound over true error", float(np.median(total.slack)), 1000.0),
        ("cases with R of 1 or more, %", 100 * float(np.mean(np.array(total.gates) >= 1)), 10.0),
    ]
    for text, figure, limit in demands:
        print(f"{text}: {figure:.3g} (at most {limit:g}){'' if figure <= limit else '   MISSED'}")
    return all(figure <= limit for _, figure, limit in demands)


def main() -> int:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("count", nargs="?", type=int, default=2400, help="number of cases")
    parser.add_argument("--seed", type=int, default=2026)
    parser.add_argument("--family", choices=FAMILIES, action="append", help="only this family; may be repeated")
    wanted = parser.parse_args()
    return 0 if show(run(wanted.count, wanted.seed, wanted.family or list(FAMILIES))) else 1


if __name__ == "__main__":
    sys.exit(main())
