"""Loss factors without a reference frequency: each mode's own |λ| is the reference, found by iteration.

A loss factor η on a spring k acts in a mode like a dashpot ηk/ω matched at the mode's own frequency ω = |λ|. The
nonlinear problem (λ²M + λ(C + H/|λ|) + K) x = 0 is solved mode by mode: inverse iteration with the reference held,
then the reference renewed.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Callable
from typing import TYPE_CHECKING

import numpy as np

from mdof.eigen.quadratic import Roots, solve_complete
from mdof.eigen.verify import Judgement, judge
from mdof.errors import UnverifiedError

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from mdof.eigen.reduce import NormalisedProblem

__all__ = ["solve_floating"]

_EPS = float(np.finfo(np.float64).eps)
_STEPS = 60
#: Loss factors shrunk by this squared leave the frequencies where they are.
_QUIET = 1e-3


def solve_floating(
    problem: NormalisedProblem, pairs: Callable[[Roots], list[tuple[int, int]]]
) -> tuple[Roots, NDArray[np.float64]]:
    """All roots with floating loss factors, and the reference used for each root [rad/s].

    Parameters
    ----------
    problem : NormalisedProblem
    pairs : callable
        Indices (slow, fast) of the roots of each mode, so that both roots of an overdamped one share the reference
        sqrt(λs λf).

    Raises
    ------
    UnverifiedError
        If the iteration does not settle, or two starts settle on one mode.
    """
    held = problem.sigma[problem.sigma > 0]
    middle = float(np.sqrt(held.min() * held.max())) if len(held) else 1.0
    # Without its loss factors every mode has a frequency to start from; a common one would overdamp those far from it.
    quiet = dataclasses.replace(problem, loss_rows=problem.loss_rows * _QUIET)
    start = solve_complete(_matched(quiet, middle))
    values, vectors = start.values.copy(), start.vectors.copy()
    turning = np.nonzero(values.imag > 0)[0]
    for index in turning:
        values[index], vectors[:, index] = _own_reference(problem, values[index], vectors[:, index])
    if _collided(values[turning], vectors[:, turning]):
        values, vectors = _grown(problem, start, turning)
    reference = np.full(len(values), middle)
    reference[turning] = np.abs(values[turning])
    still = np.nonzero((values.imag == 0) & (values != 0))[0]
    single = set(still.tolist())
    for pair in pairs(start) if len(still) else ():
        if pair[0] in single and pair[1] in single and pair[0] != pair[1]:
            reference[list(pair)] = _settle_pair(problem, start, pair, values, vectors)
            single -= set(pair)
    for alone in sorted(single):
        if len(turning):
            nearest = turning[np.argmin(np.abs(np.abs(values[turning]) - abs(values[alone])))]
            reference[alone] = abs(values[nearest])
        near = solve_complete(_matched(problem, reference[alone]))
        values[alone], vectors[:, alone] = _real_root(near, start, alone)
    if _collided(values[still], vectors[:, still]):
        raise UnverifiedError(
            "two real roots settle on one with floating loss factors", "state a `reference_frequency`"
        )
    judgement = judge(problem, values, vectors, None if problem.symmetric else start.left, reference)
    found = dataclasses.replace(
        start,
        values=values,
        computed=values,
        vectors=vectors,
        bounds=np.where(values == 0, start.bounds, judgement.bound / _firmness(problem, values, vectors, judgement)),
        backward=judgement.backward,
        slope=judgement.slope,
        clustered=np.zeros(len(values), dtype=bool),
        method=start.method + ", loss factors matched at each mode's own frequency by iteration",
    )
    return found, reference


def _matched(problem: NormalisedProblem, reference: float) -> NormalisedProblem:
    """The problem with its floating loss factors turned into dashpots at one reference."""
    rows = problem.loss_rows / np.sqrt(reference)
    return dataclasses.replace(
        problem,
        damping=problem.damping + rows.T @ rows,
        damper_rows=np.vstack([problem.damper_rows, rows]),
        damper_signs=np.concatenate([problem.damper_signs, np.ones(len(rows))]),
        loss_rows=np.zeros((0, problem.loss_rows.shape[1])),
    )


def _firmness(
    problem: NormalisedProblem, values: NDArray[np.complex128], vectors: NDArray[np.complex128], judgement: Judgement
) -> NDArray[np.float64]:
    """Share of its slope with which an oscillating root withstands rounding, as its reference |λ| moves with it.

    With s the slope and h = zᵀHz the defect changes by a δλ + b δλ*, a = s − h/2|λ| and |b| = |h|/2|λ|: at least by
    (|a| − |b|) |δλ|.
    """
    stretch = problem.loss_rows @ vectors
    slope = judgement.slope
    with np.errstate(divide="ignore", invalid="ignore"):
        half = np.einsum("ij,ij->j", stretch, stretch) / (2 * np.abs(values))
        share = np.abs(np.abs(slope - half) - np.abs(half)) / np.abs(slope)
    return np.where(values.imag > 0, np.minimum(share, 1.0), 1.0)


def _settle_pair(
    problem: NormalisedProblem,
    start: Roots,
    pair: tuple[int, int],
    values: NDArray[np.complex128],
    vectors: NDArray[np.complex128],
) -> float:
    """Both roots of an overdamped mode at the reference sqrt(λs λf), in place; that reference [rad/s]."""
    own = list(pair)
    reference = float(np.sqrt(np.prod(np.abs(start.values[own]))))
    for _ in range(_STEPS):
        near = solve_complete(_matched(problem, reference))
        for index in own:
            values[index], vectors[:, index] = _real_root(near, start, index)
        renewed = float(np.sqrt(np.prod(np.abs(values[own]))))
        if abs(renewed - reference) <= 8 * _EPS * reference:
            return reference
        reference = renewed
    raise UnverifiedError(
        f"the overdamped mode near {reference / (2 * np.pi):.4g} Hz does not settle with loss factors matched at its "
        "own frequency",
        "state a `reference_frequency` for the loss factors",
    )


def _real_root(near: Roots, start: Roots, index: int) -> tuple[complex, NDArray[np.complex128]]:
    """The real root that continues one of the problem without loss factors, slow ones slow and fast ones fast."""
    same = np.sign(near.slope.real) == np.sign(start.slope[index].real)
    candidates = np.nonzero((near.values.imag == 0) & (near.values != 0) & same)[0]
    if not len(candidates):
        raise UnverifiedError("a real root disappears when loss factors are added", "state a `reference_frequency`")
    like = np.abs(near.vectors[:, candidates].conj().T @ start.vectors[:, index])
    away = np.abs(near.values[candidates] - start.values[index]) / abs(start.values[index])
    best = candidates[int(np.argmax(like / (1 + away)))]
    value = complex(near.values[best])
    equal = candidates[np.abs(near.values[candidates] - value) <= 1e-9 * abs(value)]
    # Equal roots have any shape within their common space: the one nearest to where this root started.
    basis = near.vectors[:, equal]
    shape = basis @ np.linalg.lstsq(basis, start.vectors[:, index], rcond=None)[0]
    return value, shape / np.linalg.norm(shape)


def _own_reference(
    problem: NormalisedProblem, value: complex, vector: NDArray[np.complex128]
) -> tuple[complex, NDArray[np.complex128]]:
    """Follow one oscillating root until its own |λ| is its reference, by full solves picked by shape."""
    begun = abs(value)
    for _ in range(_STEPS):
        roots = solve_complete(_matched(problem, abs(value)))
        turning = np.nonzero(roots.values.imag > 0)[0]
        if not len(turning):
            break
        like = np.abs(roots.vectors[:, turning].conj().T @ vector) / (
            1 + np.abs(roots.values[turning] - value) / abs(value)
        )
        best = turning[int(np.argmax(like))]
        change = abs(roots.values[best] - value)
        value, vector = complex(roots.values[best]), roots.vectors[:, best]
        if change <= 8 * _EPS * abs(value):
            return value, vector
        if change <= 1e-6 * abs(value):
            return _polish(problem, value, vector)
    raise UnverifiedError(
        f"the mode near {begun / (2 * np.pi):.4g} Hz does not settle with loss factors matched at its own frequency",
        "state a `reference_frequency` for the loss factors",
    )


def _polish(
    problem: NormalisedProblem, value: complex, vector: NDArray[np.complex128]
) -> tuple[complex, NDArray[np.complex128]]:
    """Inverse iteration with a renewed reference, to the last digits."""
    size, heavy = len(vector), problem.heavy
    stiffness = problem.stiffness
    loss = problem.loss_rows.T @ problem.loss_rows
    mass = np.zeros(size)
    mass[:heavy] = 1.0
    for _ in range(_STEPS):
        damping = problem.damping + loss / abs(value)
        quadratic = value * damping + stiffness + np.diag(value**2 * mass)
        slope = 2 * value * mass * vector + damping @ vector
        try:
            new = np.linalg.solve(quadratic, slope)
        except np.linalg.LinAlgError:
            return value, vector
        vector = np.asarray(new / np.linalg.norm(new), dtype=np.complex128)
        defect = vector @ (value**2 * mass * vector + value * (damping @ vector) + stiffness @ vector)
        step = -defect / (vector @ (2 * value * mass * vector + damping @ vector))
        value = complex(value + step)
        if abs(step) <= 4 * _EPS * abs(value):
            return value, vector
    return value, vector


def _collided(values: NDArray[np.complex128], vectors: NDArray[np.complex128]) -> bool:
    same = np.abs(values[:, None] - values[None, :]) <= 1e-9 * np.abs(values)[:, None]
    alike = np.abs(vectors.conj().T @ vectors) > 1 - 1e-6
    np.fill_diagonal(same, False)
    return bool(np.any(same & alike))


def _grown(
    problem: NormalisedProblem, start: Roots, turning: NDArray[np.int64]
) -> tuple[NDArray[np.complex128], NDArray[np.complex128]]:
    """Grow the loss factors from next to nothing, so that every mode keeps its identity."""
    values, vectors = start.values.copy(), start.vectors.copy()
    for index in turning:
        value, vector = complex(values[index]), vectors[:, index]
        for part in np.linspace(0.1, 1.0, 10):
            grown = dataclasses.replace(problem, loss_rows=problem.loss_rows * np.sqrt(part))
            value, vector = _own_reference(grown, value, vector)
        values[index], vectors[:, index] = value, vector
    if _collided(values[turning], vectors[:, turning]):
        raise UnverifiedError(
            "two modes settle on one root with floating loss factors", "state a `reference_frequency`"
        )
    return values, vectors
