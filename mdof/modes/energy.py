"""Who moves and who dissipates in a mode."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from mdof.modes.mode import Mode
    from mdof.system import System

__all__ = ["EnergyShares", "energy_shares", "kinetic_shares"]


@dataclass(frozen=True, kw_only=True, slots=True, eq=False)
class EnergyShares:
    """Shares of one mode's energy over a cycle.

    Attributes
    ----------
    kinetic : ndarray, shape (n_described,)
        Share of the kinetic energy by described coordinate; products of inertia are split evenly between the
        coordinates they join, and the mass of a rigidly linked rider counts with its host. Sums to 1; all zero where
        the mode carries no kinetic energy.
    dissipated : dict of connection name to share
        Connections in file order; proportional, modal and general damping under their own names. Sums to 1 (a
        connection of negative damping has a negative share); empty where nothing dissipates.
    """

    kinetic: NDArray[np.float64]
    dissipated: dict[str, float]


def energy_shares(mode: Mode) -> EnergyShares:
    """Kinetic energy by coordinate and dissipated energy by connection of a mode."""
    system, shape = mode.system, mode.reduced_shape
    return EnergyShares(kinetic=kinetic_shares(system, shape[:, None])[:, 0], dissipated=_dissipated(mode))


def kinetic_shares(system: System, shapes: NDArray[np.complex128]) -> NDArray[np.float64]:
    """Share of kinetic energy by described coordinate.

    Parameters
    ----------
    shapes : ndarray of complex, shape (n, n_modes)
        In reduced coordinates.

    Returns
    -------
    ndarray, shape (n_described, n_modes)
    """
    energy = np.real(shapes.conj() * (system.mass @ shapes))
    total = energy.sum(axis=0)
    share = np.divide(energy, total, out=np.zeros_like(energy), where=total > 0)
    result = np.zeros((len(system.coordinate_bodies), shapes.shape[1]))
    row, column = _own_rows(system)
    result[row] = share[column]
    return result


def _own_rows(system: System) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """For every reduced coordinate of a body, the described coordinate that it is."""
    entries = system.recovery.tocoo()
    single = np.bincount(entries.row, minlength=entries.shape[0]) == 1
    exact = single[entries.row] & (entries.data == 1.0)
    column, first = np.unique(entries.col[exact], return_index=True)
    return entries.row[exact][first].astype(np.int64), column.astype(np.int64)


def _dissipated(mode: Mode) -> dict[str, float]:
    system, shape = mode.system, mode.reduced_shape
    power: dict[str, float] = {}

    def add(name: str, value: float) -> None:
        if value:
            power[name] = power.get(name, 0.0) + value

    motion = np.abs(system.spring_columns.T @ shape) ** 2
    for name, value in zip(system.spring_names, system.loss_damping(mode.damping_reference) * motion, strict=True):
        add(name, float(value))
    motion = np.abs(system.damper_columns.T @ shape) ** 2
    for name, value in zip(system.damper_names, system.damping * motion, strict=True):
        add(name, float(value))
    if system.mass_proportional:
        add(
            "damping.mass_proportional", float(system.mass_proportional * np.real(shape.conj() @ (system.mass @ shape)))
        )
    if system.stiffness_proportional:
        add(
            "damping.stiffness_proportional",
            float(system.stiffness_proportional * np.real(shape.conj() @ (system.K @ shape))),
        )
    if system.extra_damping is not None:
        add("matrix C", float(np.real(shape.conj() @ (system.extra_damping @ shape))))
    total = sum(power.values())
    largest = max((abs(value) for value in power.values()), default=0.0)
    return {name: value / total for name, value in power.items()} if abs(total) > 1e-12 * largest else {}
