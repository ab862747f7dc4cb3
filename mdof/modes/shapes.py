"""Scaling of mode shapes."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from mdof.modes.energy import kinetic_shares

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from mdof.system import System

__all__ = ["scaled_shapes"]


def scaled_shapes(
    system: System, reduced: NDArray[np.complex128]
) -> tuple[NDArray[np.complex128], NDArray[np.complex128]]:
    """Described and reduced shapes: the most energetic coordinate real and positive, the largest component 1.

    Parameters
    ----------
    reduced : ndarray of complex, shape (n, n_modes)
    """
    described = np.asarray(system.recovery @ reduced)
    share = kinetic_shares(system, reduced)
    magnitude = np.abs(described)
    still = share.max(axis=0, initial=0.0) <= 0
    rank = np.where(still, magnitude / np.maximum(magnitude.max(axis=0, initial=0.0), 1e-300), share)
    # Ties go to the first coordinate in file order.
    leader = np.argmax(rank >= rank.max(axis=0) * (1 - 1e-9), axis=0)
    columns = np.arange(described.shape[1])
    phase = described[leader, columns]
    phase = np.where(phase == 0, 1.0, phase / np.where(phase == 0, 1.0, np.abs(phase)))
    largest = magnitude.max(axis=0, initial=0.0)
    factor = phase.conj() / np.where(largest > 0, largest, 1.0)
    described, reduced = described * factor, reduced * factor
    described[leader, columns] = described[leader, columns].real
    return described, reduced
