"""One damper over many values, on one eigensolve: how every mode moves, followed by its identity.

Mass and springs do not change, so the undamped modes are found once and every value only costs the damped roots in
their coordinates. Modes keep their identity from value to value by the likeness of their shapes, so that crossing
curves cross and veering ones veer; the likeness is handed back as a confidence.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from mdof.eigen.blocks import rotate_equal
from mdof.eigen.quadratic import solve_complete
from mdof.eigen.reduce import NormalisedProblem, normalise
from mdof.eigen.threads import at_once, suited_threads
from mdof.eigen.verify import GATE, lengths
from mdof.errors import UnverifiedError, UsageError
from mdof.modes.pairing import pair_roots
from mdof.modes.regime import Regime, classified

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from mdof.system import System

__all__ = ["DamperSweep", "sweep"]

_EPS = float(np.finfo(np.float64).eps)
#: Likeness from which a mode is taken to be the same one without looking at others.
_PLAIN = 0.9


@dataclass(frozen=True, kw_only=True, slots=True, eq=False)
class DamperSweep:
    """Branches of modes over the values of one damper; rows are values, columns branches.

    Attributes
    ----------
    damper : str
    values : ndarray, shape (v,) [N s/m, N m s/rad]
    natural_frequencies, damping_ratios : ndarray, shape (v, b) [rad/s, -]
        NaN where undefined or where a branch has no mode.
    eigenvalues : ndarray of complex, shape (v, b) [1/s]
        The root with positive imaginary part, or the slow real one.
    regimes : tuple of v tuples of Regime or None
    confidence : ndarray, shape (v, b)
        Mass-weighted modal assurance criterion with the branch's shape at the value before; 1 at the first.
    frequency_bounds : ndarray, shape (v, b), relative
    methods : which kernels were used, in words.
    """

    damper: str
    values: NDArray[np.float64]
    natural_frequencies: NDArray[np.float64]
    damping_ratios: NDArray[np.float64]
    eigenvalues: NDArray[np.complex128]
    regimes: tuple[tuple[Regime | None, ...], ...]
    confidence: NDArray[np.float64]
    frequency_bounds: NDArray[np.float64]
    methods: tuple[str, ...]


@dataclass(slots=True)
class _At:
    """Modes at one value."""

    roots: NDArray[np.complex128]
    frequencies: NDArray[np.float64]
    ratios: NDArray[np.float64]
    bounds: NDArray[np.float64]
    regimes: list[Regime]
    shapes: NDArray[np.complex128]
    method: str


def sweep(system: System, damper: str, values: Sequence[float]) -> DamperSweep:
    """Every mode over many values of one damper.

    Parameters
    ----------
    system : System
    damper : str
        A connection with damping. Where it damps several directions they keep their proportions, and the largest
        takes the value.
    values : sequence of float, rising or falling [N s/m, N m s/rad]

    Raises
    ------
    UsageError
        If there is no such damper, or a value is negative or not finite.
    UnverifiedError
        If the modes at a value cannot be verified.
    """
    wanted = np.array(values, dtype=np.float64)
    if wanted.ndim != 1 or not len(wanted) or not np.all(np.isfinite(wanted)) or np.any(wanted < 0):
        raise UsageError("values must be one or more finite damping coefficients of at least 0")
    own = np.array([name == damper for name in system.damper_names], dtype=bool)
    largest = float(np.abs(system.damping[own]).max(initial=0.0))
    if not own.any() or largest == 0:
        known = ", ".join(dict.fromkeys(system.damper_names)) or "none"
        raise UsageError(f"there is no damper {damper!r}; dampers are: {known}")
    if system.has_floating_loss_factors:
        raise UsageError("loss factors must state a reference frequency for a sweep")
    unit = system.with_values(damping=np.where(own, system.damping / largest, system.damping))
    with suited_threads(system.size), np.errstate(over="ignore", invalid="ignore", divide="ignore", under="ignore"):
        problem, _ = rotate_equal(normalise(unit))
    varied = np.zeros(len(problem.damper_rows), dtype=bool)
    varied[: len(own)] = own
    share = (problem.damper_rows[varied].T * problem.damper_signs[varied]) @ problem.damper_rows[varied]
    found = at_once(lambda value: _solved(problem, varied, share, value), [float(value) for value in wanted])
    return _followed(damper, wanted, found, problem.heavy)


@np.errstate(over="ignore", invalid="ignore", divide="ignore", under="ignore")
def _solved(problem: NormalisedProblem, varied: NDArray[np.bool_], share: NDArray[np.float64], value: float) -> _At:
    rows = np.where(varied[:, None], np.sqrt(value) * problem.damper_rows, problem.damper_rows)
    roots = solve_complete(
        dataclasses.replace(problem, damper_rows=rows, damping=problem.damping + (value - 1.0) * share)
    )
    size = problem.recover.shape[1]
    gate = float(roots.backward.max(initial=0.0)) / (size * _EPS)
    if not gate < GATE:
        raise UnverifiedError(
            f"with a damping of {value:g} a residual of {gate:.3g} times n times the unit roundoff is left",
            "leave this value out, or solve it by itself to see why",
        )
    pairing = pair_roots(roots, problem.heavy)
    _, numbers = classified(roots.values, roots.bounds, pairing.pairs, pairing.relaxation)
    slow_index = np.array([pair[0] for pair in pairing.pairs])
    return _At(
        roots=roots.values[slow_index],
        frequencies=_numbers([entry.natural_frequency for entry in numbers]),
        ratios=_numbers([entry.damping_ratio for entry in numbers]),
        bounds=_numbers([entry.frequency_bound for entry in numbers]),
        regimes=[entry.regime for entry in numbers],
        shapes=_unit_rows(pairing.vectors[: problem.heavy, slow_index]),
        method=roots.method,
    )


def _followed(damper: str, values: NDArray[np.float64], found: list[_At], heavy: int) -> DamperSweep:
    """Put the modes of every value into the columns of the branches they belong to."""
    count = max(len(at.roots) for at in found)
    shape = (len(values), count)
    frequencies, ratios, bounds = (np.full(shape, np.nan) for _ in range(3))
    roots, confidence = np.full(shape, complex(np.nan, np.nan)), np.full(shape, np.nan)
    regimes: list[tuple[Regime | None, ...]] = []
    first = np.argsort(np.abs(found[0].roots), kind="stable")
    place = np.full(count, -1)
    place[: len(first)] = first
    likeness = np.where(place >= 0, 1.0, np.nan)
    before: NDArray[np.complex128] = np.zeros((count, heavy), dtype=np.complex128)
    last = np.zeros(count, dtype=np.complex128)
    for row, at in enumerate(found):
        if row:
            place, likeness = _matched(before, last, at)
        kept = np.nonzero(place >= 0)[0]
        mode = place[kept]
        frequencies[row, kept], ratios[row, kept] = at.frequencies[mode], at.ratios[mode]
        bounds[row, kept], roots[row, kept] = at.bounds[mode], at.roots[mode]
        confidence[row] = likeness
        regimes.append(tuple(at.regimes[index] if index >= 0 else None for index in place))
        before[kept], last[kept] = at.shapes[mode], at.roots[mode]
    return DamperSweep(
        damper=damper,
        values=_fixed(values),
        natural_frequencies=_fixed(frequencies),
        damping_ratios=_fixed(ratios),
        eigenvalues=_fixed(roots),
        regimes=tuple(regimes),
        confidence=_fixed(confidence),
        frequency_bounds=_fixed(bounds),
        methods=tuple(dict.fromkeys(at.method for at in found)),
    )


def _matched(
    before: NDArray[np.complex128], last: NDArray[np.complex128], at: _At
) -> tuple[NDArray[np.int64], NDArray[np.float64]]:
    """Mode of every branch (-1: none) and its likeness to the branch's last shape.

    Most modes hardly move and are found among their neighbours; only the others are assigned by all their shapes.
    """
    count, modes = len(before), len(at.roots)
    order = np.argsort(np.abs(at.roots), kind="stable")
    position = np.searchsorted(np.abs(at.roots[order]), np.abs(np.nan_to_num(last)))
    place, confidence = np.full(count, -1), np.full(count, np.nan)
    best = np.zeros(count)
    for shift in (0, -1, 1, -2, 2):
        open_ = np.nonzero(best < _PLAIN)[0]
        candidate = order[np.clip(position[open_] + shift, 0, modes - 1)]
        like = _alike(before if len(open_) == count else before[open_], at.shapes[candidate])
        better = like > best[open_]
        place[open_[better]], best[open_[better]] = candidate[better], like[better]
    plain = (best >= _PLAIN) & (np.bincount(place[place >= 0], minlength=modes)[place] == 1)
    confidence[plain] = best[plain]
    branches = np.nonzero(~plain)[0]
    left = np.setdiff1d(np.arange(modes), place[plain])
    place[branches] = -1
    if len(branches) and len(left):
        from scipy.optimize import linear_sum_assignment

        likeness = np.abs(before[branches].conj() @ at.shapes[left].T) ** 2
        rows, columns = linear_sum_assignment(likeness, maximize=True)
        place[branches[rows]], confidence[branches[rows]] = left[columns], likeness[rows, columns]
    return place, confidence


def _unit_rows(shapes: NDArray[np.complex128]) -> NDArray[np.complex128]:
    """Mass-normalised shapes as rows of length 1; rows are what matching takes out and compares."""
    rows = np.array(shapes.T, order="C")
    length = lengths(shapes)
    rows /= np.where(length > 0, length, 1.0)[:, None]
    return rows


def _alike(first: NDArray[np.complex128], second: NDArray[np.complex128]) -> NDArray[np.float64]:
    """Modal assurance criterion of unit shapes, row by row."""
    return np.asarray(np.abs(np.vecdot(first, second)) ** 2)


def _numbers(values: list[float | None]) -> NDArray[np.float64]:
    return np.array([np.nan if value is None else value for value in values], dtype=np.float64)


def _fixed(values: Any) -> Any:
    values.flags.writeable = False
    return values
