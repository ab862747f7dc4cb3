"""Purely hysteretic modes: loss factors alike at all frequencies, no dashpots.

With the complex stiffness k (1 + jη) of every spring, K_c x = μ M x has one complex μ = ω² (1 + jη) a mode: its loss
factor is Im μ / Re μ, and λ = j √μ decays. The model holds for steady vibration; as a free vibration it is an
approximation, because the conjugate of λ is no eigenvalue (Crandall S.H., The role of damping in vibration theory,
Journal of Sound and Vibration 11, 1970; from memory).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from mdof.eigen.reduce import normalise
from mdof.eigen.verify import GATE
from mdof.errors import UnverifiedError, UsageError
from mdof.modes.mode import Verification
from mdof.modes.shapes import scaled_shapes
from mdof.system import System

if TYPE_CHECKING:
    from numpy.typing import NDArray

__all__ = ["HystereticModes", "hysteretic_modes"]

_EPS = float(np.finfo(np.float64).eps)


@dataclass(frozen=True, kw_only=True, eq=False)
class HystereticModes:
    """Modes of complex stiffness by rising natural frequency; arrays of shape (n_modes,), read-only.

    Attributes
    ----------
    natural_frequencies : ndarray [rad/s]
        sqrt(Re μ): where the mode resonates; 0 for free motions.
    loss_factors : ndarray
        Im μ / Re μ; NaN for free motions. Half of it is the damping ratio of a dashpot matched at resonance.
    eigenvalues : ndarray of complex [1/s]
        λ = j √μ, Re λ ≤ 0.
    shapes : ndarray of complex, shape (n_described, n_modes)
    frequency_bounds, loss_factor_bounds : ndarray
        How far rounding can have moved the frequency (relative) and the loss factor (absolute).
    verification : Verification
    """

    system: System
    natural_frequencies: NDArray[np.float64]
    loss_factors: NDArray[np.float64]
    eigenvalues: NDArray[np.complex128]
    shapes: NDArray[np.complex128]
    frequency_bounds: NDArray[np.float64]
    loss_factor_bounds: NDArray[np.float64]
    verification: Verification

    def __len__(self) -> int:
        return len(self.eigenvalues)


def hysteretic_modes(system: System) -> HystereticModes:
    """All purely hysteretic modes of a system whose only damping are loss factors.

    Stated reference frequencies play no part: nothing is turned into dashpots.

    Raises
    ------
    UsageError
        If something else dissipates, stiffness is negative or unsymmetric, or a coordinate has no mass.
    UnverifiedError
        If a mode cannot be verified.
    """
    _refuse(system)
    problem = normalise(system.with_values(loss_reference=np.full(len(system.stiffness), np.nan)))
    if not problem.modal or problem.recover.shape[1] < system.size:
        # Condensing a joint with the real stiffness would lose its share of the loss factors.
        raise UsageError("a coordinate has no mass; purely hysteretic modes need mass in every coordinate")
    size, held = problem.recover.shape[1], len(problem.sigma)
    squares = np.zeros(size)
    squares[:held] = problem.sigma**2
    # Undamped modes first, so that a soft mode is not a difference of stiff springs.
    lost = problem.loss_rows.T @ problem.loss_rows
    free = np.arange(held, size)
    matrix = np.diag(squares[:held]) + 1j * lost[:held, :held]
    values, inner = np.linalg.eig(matrix)
    vectors = np.zeros((size, size), dtype=np.complex128)
    vectors[:held, :held], vectors[free, free] = inner, 1.0
    square = np.einsum("ij,ij->j", inner, inner)
    rest = matrix @ inner - inner * values
    # Every frequency and every loss factor off by rounding, and the residual seen by the mode itself.
    effort = squares[:held] @ np.abs(inner) ** 2
    effort += np.einsum(
        "ij,ij->j", np.abs(problem.loss_rows[:, :held] @ inner), np.abs(problem.loss_rows[:, :held]) @ np.abs(inner)
    )
    uncertain = np.abs(np.einsum("ij,ij->j", inner, rest)) + (size + 8) * _EPS * problem.amplification * effort
    norm = float(np.linalg.norm(matrix, 2)) if held else 0.0
    with np.errstate(divide="ignore", invalid="ignore"):
        bound = uncertain / np.abs(square)
        gate = float(np.max(np.linalg.norm(rest, axis=0), initial=0.0)) / (norm * size * _EPS) if norm else 0.0
    if not gate < GATE or np.any(values.real <= 0) or np.any(bound > 1e-2 * np.abs(values)):
        raise UnverifiedError(
            "purely hysteretic modes could not be verified",
            "look for equal modes of very unlike loss factors, or stiffness values over 12 orders of magnitude",
        )
    order = np.concatenate([free, np.argsort(values.real, kind="stable")]).astype(np.int64)
    rows = len(free)
    squared = np.concatenate([np.zeros(rows), values[order[rows:]]])
    bounds = np.concatenate([np.zeros(rows), bound[order[rows:]]])
    frequencies = np.sqrt(squared.real)
    with np.errstate(divide="ignore", invalid="ignore"):
        losses = np.where(squared.real > 0, squared.imag / squared.real, np.nan)
        relative = np.where(squared.real > 0, bounds / squared.real, 0.0)
    shapes, _ = scaled_shapes(system, problem.recover @ vectors[:, order])
    return HystereticModes(
        system=system,
        natural_frequencies=_frozen(frequencies),
        loss_factors=_frozen(losses),
        eigenvalues=_frozen(1j * np.sqrt(squared.astype(np.complex128))),
        shapes=_frozen(shapes),
        frequency_bounds=_frozen(relative / 2),
        loss_factor_bounds=_frozen(relative * (1 + np.nan_to_num(losses))),
        verification=Verification(
            status="verified",
            largest_scaled_residual=gate,
            largest_frequency_bound=float(relative.max(initial=0.0)) / 2,
            eigenvalues_expected=size,
            eigenvalues_found=size,
        ),
    )


def _refuse(system: System) -> None:
    other = [
        what
        for what, there in (
            ("dampers", bool(np.any(system.damping))),
            ("proportional damping", bool(system.mass_proportional or system.stiffness_proportional)),
            ("a damping matrix", system.extra_damping is not None),
            ("gyroscopic terms", system.gyroscopic is not None),
            ("negative stiffness", bool(np.any(system.stiffness < 0))),
            ("a stiffness matrix given as numbers", system.extra_stiffness is not None),
            ("negative loss factors", bool(np.any(system.loss_factor < 0))),
        )
        if there
    ]
    if other:
        raise UsageError(
            f"purely hysteretic modes know loss factors only, and this system has {', '.join(other)}; "
            "use mdof.solve, which turns loss factors into dashpots"
        )


def _frozen(values: Any) -> Any:
    values.flags.writeable = False
    return values
