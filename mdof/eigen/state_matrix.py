"""All roots of one block of coupled coordinates, by LAPACK's QR algorithm on a state matrix."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from mdof.eigen.verify import check_completeness

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from mdof.eigen.reduce import NormalisedProblem

__all__ = ["BlockRoots", "companion", "energy_balanced"]

_EPS = float(np.finfo(np.float64).eps)


@dataclass(slots=True, eq=False)
class BlockRoots:
    """Roots of one block in the block's own coordinates."""

    values: NDArray[np.complex128]
    vectors: NDArray[np.complex128]
    left: NDArray[np.complex128] | None
    partner: NDArray[np.int64]
    state: NDArray[np.float64] | None = None
    count: int = 0


def energy_balanced(problem: NormalisedProblem, block: NDArray[np.int64]) -> BlockRoots:
    """State matrix in (spring coordinates q = Σ Wᵀ z, velocities of heavy coordinates), free motions deflated."""
    whole = len(block) == problem.recover.shape[1]
    if problem.modal:
        springs = block[block < len(problem.sigma)]
        free = np.nonzero(block >= len(problem.sigma))[0]
        W = (block[:, None] == springs[None, :]).astype(float)
        N = np.eye(len(block))[:, free]
        sigma, sign = problem.sigma[springs], problem.sign[springs]
        damping, heavy = problem.damping[np.ix_(block, block)], len(block)
    else:
        W, N, sigma, sign = problem.W, problem.N, problem.sigma, problem.sign
        damping, heavy = problem.damping, problem.heavy
    held = len(sigma)
    force = W * sigma
    Dhh, Dhl, Dlh = damping[:heavy, :heavy], damping[:heavy, heavy:], damping[heavy:, :heavy]
    # Rates of massless coordinates follow from their own equation: z_l' = −D_ll⁻¹ (D_lh v + W_l Σ S q).
    from_v = -np.linalg.solve(damping[heavy:, heavy:], Dlh)
    from_q = -np.linalg.solve(damping[heavy:, heavy:], force[heavy:] * sign)
    state = np.zeros((held + heavy, held + heavy))
    state[:held, held:] = force[:heavy].T
    state[held:, :held] = -force[:heavy] * sign
    state[held:, held:] = -Dhh
    if len(block) > heavy or not problem.modal:
        state[:held, :held] += force[heavy:].T @ from_q
        state[:held, held:] += force[heavy:].T @ from_v
        state[held:, :held] -= Dhl @ from_q
        state[held:, held:] -= Dhl @ from_v
    moving, still, rate = _split_free(problem, block, N, damping, heavy)
    keep = None
    if still.shape[1]:
        q, _ = np.linalg.qr(still[:heavy], mode="complete")
        rest = q[:, still.shape[1] :]
        keep = np.block([[np.eye(held), np.zeros((held, rest.shape[1]))], [np.zeros((heavy, held)), rest]])
        state = keep.T @ state @ keep
    if not problem.symmetric:
        values, states, left_states = _eig_both(state)
    else:
        values, states = np.linalg.eig(state)
        left_states = None
    values, states = values.astype(np.complex128), states.astype(np.complex128)
    check_completeness(state, values)
    upper = values.imag >= 0
    values, states = values[upper], states[:, upper]
    if keep is not None:
        states = keep @ states
    q, v = states[:held], states[held:]
    if problem.modal:
        # The larger of velocity over λ and spring coordinate over ω loses fewer digits.
        vectors = v / np.where(values == 0, 1.0, values)
        slow = sigma[:, None] > np.abs(values)[None, :]
        direct = q / sigma[:, None]
        rows = np.argmax(W, axis=0)
        vectors[rows] = np.where(slow, direct, vectors[rows])
    else:
        vectors = np.vstack([v, from_q @ q + from_v @ v]) / np.where(values == 0, 1.0, values)
    left = None
    if left_states is not None:
        w = (left_states if keep is None else keep @ left_states)[held:, upper]
        left = _left_vectors(damping, (W * (sigma**2 * sign)) @ W.T, values, w)
    zero = N.shape[1]
    count = len(state) + zero + still.shape[1]
    mates = np.full(len(values), -1)
    if zero:
        # Free motions have the exact root 0; those that no damper moves have the rate of their drag, 0 or not, beside.
        start = len(values)
        values = np.concatenate([values, np.zeros(zero), np.full(still.shape[1], -rate + 0.0)])
        vectors = np.hstack([vectors, moving, still, still])
        first = start + moving.shape[1]
        pair = np.arange(still.shape[1])
        mates = np.concatenate([mates, np.full(moving.shape[1], -1), first + still.shape[1] + pair, first + pair])
        if left is not None:
            left = np.hstack([left, moving, still, still])
    return BlockRoots(values, vectors, left, mates, state=state if whole or problem.modal else None, count=count)


def _left_vectors(
    damping: NDArray[np.float64],
    stiffness: NDArray[np.float64],
    values: NDArray[np.complex128],
    w: NDArray[np.complex128],
) -> NDArray[np.complex128]:
    """Left vectors whose heavy part is w: the light columns of yᵀQ(λ) vanish, root by root."""
    heavy, size = len(w), len(damping)
    result = np.zeros((size, len(values)), dtype=np.complex128)
    result[:heavy] = w
    for index, value in enumerate(values if size > heavy else ()):
        inner = value * damping[heavy:, heavy:] + stiffness[heavy:, heavy:]
        cross = value * damping[:heavy, heavy:] + stiffness[:heavy, heavy:]
        try:
            result[heavy:, index] = -np.linalg.solve(inner.T, cross.T @ w[:, index])
        except np.linalg.LinAlgError:
            # The light coordinates have this very root among themselves.
            whole = value * damping + stiffness
            whole[:heavy, :heavy] += value**2 * np.eye(heavy)
            result[:, index] = np.linalg.svd(whole.T)[2][-1].conj()
    return result


def _split_free(
    problem: NormalisedProblem,
    block: NDArray[np.int64],
    N: NDArray[np.float64],
    damping: NDArray[np.float64],
    heavy: int,
) -> tuple[NDArray[np.float64], NDArray[np.float64], float]:
    """Free motions that a damper moves; those that none does; and the rate at which drag slows the latter [1/s]."""
    if not N.shape[1] or not problem.symmetric:
        return N, N[:, :0], 0.0
    if problem.drag is None:
        N = N @ np.linalg.eigh(N.T @ damping @ N)[1]
        still = np.linalg.norm(damping @ N, axis=0) <= 16 * len(N) * _EPS * float(np.linalg.norm(damping))
        rate = 0.0
    else:
        # By the factors, a weak drag shows beside strong dampers that a free motion does not move.
        whole = problem.damper_rows[:, block]
        rows = whole @ N
        # What a damper within the machine makes of a free motion is its rounding.
        rows[np.abs(rows) <= 64 * len(N) * _EPS * np.linalg.norm(whole, axis=1)[:, None]] = 0.0
        rows = rows[np.any(rows != 0, axis=1)]
        still = np.ones(N.shape[1], dtype=bool)
        if len(rows):
            _, size, turn = np.linalg.svd(rows / np.linalg.norm(rows, axis=1)[:, None])
            still[: int(np.sum(size > 64 * len(N) * _EPS))] = False
            N = N @ turn.T
        rate = problem.drag
    still &= np.linalg.norm(N[:heavy], axis=0) > 1e-8
    return N[:, ~still], N[:, still], rate


def companion(problem: NormalisedProblem) -> BlockRoots:
    """State matrix in (z, heavy velocities) where the stiffness is not symmetric."""
    heavy, size = problem.heavy, problem.recover.shape[1]
    stiffness, damping = problem.stiffness, problem.damping
    # An empty solve is cheap, so models without massless coordinates need no case of their own.
    inner = damping[heavy:, heavy:]
    from_v = -np.linalg.solve(inner, damping[heavy:, :heavy])
    from_x = -np.linalg.solve(inner, stiffness[heavy:])
    state = np.block(
        [
            [np.zeros((heavy, size)), np.eye(heavy)],
            [from_x, from_v],
            [
                -stiffness[:heavy] - damping[:heavy, heavy:] @ from_x,
                -damping[:heavy, :heavy] - damping[:heavy, heavy:] @ from_v,
            ],
        ]
    )
    values, states, left_states = _eig_both(state)
    check_completeness(state, values)
    upper = values.imag >= 0
    w = left_states[size:, upper]
    left = _left_vectors(damping, stiffness, values[upper], w)
    return BlockRoots(
        values[upper], states[:size, upper], left, np.full(int(upper.sum()), -1), state=state, count=len(state)
    )


def _eig_both(
    state: NDArray[np.float64],
) -> tuple[NDArray[np.complex128], NDArray[np.complex128], NDArray[np.complex128]]:
    """Eigenvalues, right vectors and unconjugated left vectors."""
    from scipy.linalg import eig

    values, left, right = eig(state, left=True, right=True)
    return values.astype(np.complex128), right.astype(np.complex128), left.conj().astype(np.complex128)
