"""Which kernel solves a block of coupled undamped modes."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from mdof.eigen.lowrank import NotResolved, few_dampers
from mdof.eigen.oscillators import single_oscillator
from mdof.eigen.state_matrix import BlockRoots, companion, energy_balanced

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from mdof.eigen.reduce import NormalisedProblem

__all__ = ["METHODS", "Solved", "solve_block"]

METHODS = ("auto", "dense", "few dampers", "partial")
#: The secular form pays from so many coordinates on, and with at most one damper in so many of them.
_LEAST_SIZE, _LEAST_SHARE = 60, 12


@dataclass(frozen=True, slots=True)
class Solved:
    """Roots of one block, by which kernel, and why another one was given up."""

    roots: BlockRoots
    kernel: str
    fallback: str = ""


def solve_block(problem: NormalisedProblem, block: NDArray[np.int64], method: str) -> Solved:
    """All roots of one block of coordinates that damping couples.

    Parameters
    ----------
    method : one of :data:`METHODS`
        ``"dense"`` uses the state matrix for whatever is coupled; ``"few dampers"`` the secular form wherever it is
        defined, however many dampers there are.
    """
    if len(block) == 1 and problem.modal and problem.symmetric:
        return Solved(single_oscillator(problem, int(block[0])), "proportional")
    if problem.skew_stiffness is not None:
        return Solved(companion(problem), "state matrix of an unsymmetric system")
    columns = _columns(problem, block)
    if columns is not None and not columns.shape[1]:
        columns = None
    suits = columns is not None and len(block) >= _LEAST_SIZE and columns.shape[1] * _LEAST_SHARE <= len(block)
    if columns is not None and method != "dense" and (suits or method == "few dampers"):
        try:
            return Solved(_by_secular_form(problem, block, columns), "few dampers")
        except (NotResolved, np.linalg.LinAlgError) as reason:
            return Solved(energy_balanced(problem, block), "state matrix", fallback=str(reason))
    return Solved(energy_balanced(problem, block), "state matrix")


def _columns(problem: NormalisedProblem, block: NDArray[np.int64]) -> NDArray[np.float64] | None:
    """Damper columns of a block, shape (n_block, r), where the secular form is defined."""
    if problem.own_damping is None or not problem.passive or len(problem.loss_rows):
        return None
    rows = problem.damper_rows[:, block]
    rows = rows[np.any(rows != 0, axis=1)]
    return _independent(rows).T


def _independent(rows: NDArray[np.float64]) -> NDArray[np.float64]:
    """Fewer rows with the same Gram matrix, where some are combinations of others."""
    size = np.linalg.norm(rows, axis=1)
    unit = rows / size[:, None]
    if len(rows) < 2:
        return rows
    gram = unit @ unit.T
    values = np.linalg.eigvalsh(gram)
    if values[0] > 1e-12 * len(rows):
        return rows
    # Unit rows tell the rank, whatever the dampers' sizes; the others are written in terms of the pivots.
    from scipy.linalg import qr

    _, triangle, order = qr(unit.T, mode="economic", pivoting=True)
    rank = int(np.sum(np.abs(np.diag(triangle)) > 1e-12 * abs(triangle[0, 0])))
    pivots = unit[order[:rank]]
    spread = np.linalg.lstsq(pivots.T, rows.T, rcond=None)[0]
    return np.asarray(np.linalg.cholesky(spread @ spread.T).T @ pivots)


def _by_secular_form(problem: NormalisedProblem, block: NDArray[np.int64], columns: NDArray[np.float64]) -> BlockRoots:
    if problem.own_damping is None:
        raise NotResolved("damping is given as a full matrix")
    squares = np.append(problem.sigma**2, 0.0)[np.minimum(block, len(problem.sigma))]
    return few_dampers(squares, problem.own_damping[block], columns)
