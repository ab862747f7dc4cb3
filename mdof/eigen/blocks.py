"""Which undamped modes does damping couple? Equal frequencies are rotated first, so that only real coupling counts."""

from __future__ import annotations

import dataclasses
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from mdof.eigen.reduce import NormalisedProblem

__all__ = ["connected", "rotate_equal", "uncoupled_blocks"]

_EPS = float(np.finfo(np.float64).eps)


def rotate_equal(problem: NormalisedProblem) -> tuple[NormalisedProblem, NDArray[np.float64] | None]:
    """Rotate undamped modes of equal frequency so that damping does not couple them.

    Returns
    -------
    The problem in turned coordinates, and the turn (old coordinates = turn @ new ones) or None where nothing turned.
    """
    if not (problem.modal and problem.symmetric):
        return problem, None
    size = problem.recover.shape[1]
    squares = np.concatenate([problem.sigma**2 * problem.sign, np.zeros(problem.N.shape[1])])
    gram = problem.damping + problem.loss_rows.T @ problem.loss_rows
    turn = np.eye(size)
    turned = False
    for cluster in _equal(squares, size):
        part = gram[np.ix_(cluster, cluster)]
        if np.abs(part - np.diag(np.diag(part))).max() > 8 * size * _EPS * np.abs(part).max():
            _, vectors = np.linalg.eigh(part)
            turn[np.ix_(cluster, cluster)] = vectors
            turned = True
    if not turned:
        return problem, None
    rows = problem.damper_rows @ turn
    rows[np.abs(rows) <= 4 * size * _EPS * (np.abs(problem.damper_rows) @ np.abs(turn))] = 0.0
    if problem.own_damping is None:
        damping = turn.T @ problem.damping @ turn
    else:
        # From the factors: turning the sum would leave the rounding of a large damper on the small ones.
        damping = (rows.T * problem.damper_signs) @ rows + np.diag(problem.own_damping)
    return dataclasses.replace(
        problem,
        recover=problem.recover @ turn,
        damper_rows=rows,
        loss_rows=problem.loss_rows @ turn,
        damping=0.5 * (damping + damping.T),
        spring_rows=None if problem.spring_rows is None else problem.spring_rows @ turn,
    ), turn


def uncoupled_blocks(problem: NormalisedProblem) -> list[NDArray[np.int64]]:
    """Groups of coordinates that damping does not couple to each other; one group where nothing can be told."""
    size = problem.recover.shape[1]
    if not (problem.modal and problem.symmetric):
        return [np.arange(size)]
    damping = problem.damping
    effort = np.einsum("ij,ij->j", problem.damper_rows, problem.damper_rows) + np.abs(np.diag(damping))
    noise = 8 * size * _EPS * np.sqrt(np.outer(effort, effort))
    coupled = np.abs(damping) > noise
    if len(problem.loss_rows):
        gram = problem.loss_rows.T @ problem.loss_rows
        own = np.diag(gram)
        coupled |= np.abs(gram) > 8 * size * _EPS * np.sqrt(np.outer(own, own))
    return connected(coupled)


def _equal(squares: NDArray[np.float64], size: int) -> list[NDArray[np.int64]]:
    """Groups of two or more equal ω², within rounding; what is neglected between them is covered by the bounds."""
    order = np.argsort(squares)
    groups: list[list[int]] = []
    first = np.nan
    for index in order:
        value = squares[index]
        if abs(value - first) <= 2 * size * _EPS * max(abs(value), abs(first)):
            groups[-1].append(int(index))
        else:
            groups.append([int(index)])
            first = value
    return [np.array(group) for group in groups if len(group) > 1]


def connected(coupled: NDArray[np.bool_]) -> list[NDArray[np.int64]]:
    """Connected components of a symmetric adjacency matrix."""
    alone = coupled.sum(axis=1) - np.diagonal(coupled) == 0
    left = ~alone
    blocks = [np.array([index]) for index in np.nonzero(alone)[0]]
    for start in np.nonzero(left)[0]:
        if not left[start]:
            continue
        reached = np.zeros(len(coupled), dtype=bool)
        reached[start] = True
        frontier = reached
        while frontier.any():
            frontier = coupled[frontier].any(axis=0) & ~reached
            reached = reached | frontier
        left &= ~reached
        blocks.append(np.nonzero(reached)[0])
    return sorted(blocks, key=lambda block: int(block[0]))
