"""Undamped modes that damping leaves alone: the two roots of one scalar quadratic each, to the last digits."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from mdof.eigen.state_matrix import BlockRoots

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from mdof.eigen.reduce import NormalisedProblem

__all__ = ["oscillator_bounds", "single_oscillator"]

_EPS = float(np.finfo(np.float64).eps)


def single_oscillator(problem: NormalisedProblem, index: int) -> BlockRoots:
    """The two roots of λ² + dλ + sω² = 0, each to the last digits."""
    damping = float(problem.damping[index, index])
    held = len(problem.sigma)
    omega = float(problem.sigma[index]) if index < held else 0.0
    sign = float(problem.sign[index]) if index < held else 1.0
    one = np.ones((1, 1), dtype=np.complex128)
    if omega == 0.0:
        values = np.array([0.0, -damping], dtype=np.complex128)
    elif sign > 0 and abs(abs(damping) / 2 - omega) <= 4 * len(problem.recover) * _EPS * omega:
        # Within rounding of d this is the double root; the square root of that rounding would split it visibly.
        return BlockRoots(np.array([complex(-damping / 2)]), one, None, np.array([0]), count=2)
    elif sign > 0 and abs(damping) < 2 * omega:
        imaginary = np.sqrt((omega - damping / 2) * (omega + damping / 2))
        return BlockRoots(np.array([complex(-damping / 2, imaginary)]), one, None, np.array([-1]), count=2)
    else:
        square = (
            (damping / 2) ** 2 - sign * omega**2
            if sign < 0
            else (abs(damping) / 2 - omega) * (abs(damping) / 2 + omega)
        )
        large = -(damping / 2) - np.copysign(np.sqrt(square), damping)
        small = sign * omega**2 / large
        values = np.array([small, large] if abs(small) < abs(large) else [large, small], dtype=np.complex128)
    return BlockRoots(values, np.hstack([one, one]), None, np.array([1, 0]), count=2)


def oscillator_bounds(
    problem: NormalisedProblem,
    values: NDArray[np.complex128],
    bounds: NDArray[np.float64],
    block: NDArray[np.int64],
    blocks: list[NDArray[np.int64]],
) -> NDArray[np.float64]:
    """Bounds of uncoupled oscillators hold through the double root: |δλ|² is at most the defect of the quadratic."""
    if not (problem.modal and problem.symmetric):
        return bounds
    alone = np.array([len(part) == 1 for part in blocks])[block]
    index = np.array([int(part[0]) for part in blocks])[block]
    held = len(problem.sigma)
    squares = np.where(index < held, np.append(problem.sigma, 0.0)[np.minimum(index, held)] ** 2, 0.0)
    own = np.abs(np.diag(problem.damping))[index]
    size = np.abs(values)
    defect = (2 * len(problem.recover) + 8) * _EPS * problem.amplification * (size**2 + size * own + squares)
    if problem.normwise:
        # The squares came out of a matrix whose rounding is a share of its largest one.
        largest = float((problem.sigma**2).max(initial=0.0))
        defect += (len(problem.recover) + 8) * _EPS * problem.amplification * largest
    with np.errstate(divide="ignore", invalid="ignore"):
        simple = 2 * defect / np.abs(2 * values + np.diag(problem.damping)[index])
    return np.where(alone, np.fmin(simple, np.sqrt(2 * defect)), bounds)
