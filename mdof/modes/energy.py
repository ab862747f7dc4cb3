"""Who moves and who dissipates in a mode."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from mdof.modes.mode import DampedModes
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


def energy_shares(modes: DampedModes) -> tuple[EnergyShares, ...]:
    """Kinetic energy by coordinate and dissipated energy by connection of every mode."""
    kinetic = kinetic_shares(modes.system, modes.reduced_shapes)
    names, dissipated = _dissipated(modes)
    return tuple(
        EnergyShares(
            kinetic=kinetic[:, index],
            dissipated={names[row]: float(column[row]) for row in np.nonzero(column)[0]},
        )
        for index, column in enumerate(dissipated.T)
    )


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
    row, column = system.own_coordinates
    result[row] = share[column]
    return result


def _dissipated(modes: DampedModes) -> tuple[list[str], NDArray[np.float64]]:
    """Names of whatever dissipates and its share in every mode, shape (n_names, n_modes)."""
    system, shapes = modes.system, modes.reduced_shapes
    power = [_loss_power(modes), system.damping[:, None] * np.abs(system.damper_columns.T @ shapes) ** 2]
    names = [*system.spring_names, *system.damper_names]
    whole = {
        "damping.mass_proportional": (system.mass_proportional, system.mass),
        "damping.stiffness_proportional": (system.stiffness_proportional, system.K),
        "matrix C": (1.0, system.extra_damping),
    }
    for name, (weight, matrix) in whole.items():
        if weight and matrix is not None:
            power.append(weight * np.real(np.sum(shapes.conj() * (matrix @ shapes), axis=0))[None, :])
            names.append(name)
    distinct = list(dict.fromkeys(names))
    row = {name: index for index, name in enumerate(distinct)}
    total = np.zeros((len(distinct), shapes.shape[1]))
    np.add.at(total, [row[name] for name in names], np.vstack(power))
    amount, largest = total.sum(axis=0), np.abs(total).max(axis=0, initial=0.0)
    told = np.abs(amount) > 1e-12 * largest
    return distinct, np.where(told, np.divide(total, amount, out=np.zeros_like(total), where=told), 0.0)


def _loss_power(modes: DampedModes) -> NDArray[np.float64]:
    """Power lost in loss factors, each matched at its own reference or at the mode's, shape (n_springs, n_modes)."""
    system = modes.system
    motion = np.abs(system.spring_columns.T @ modes.reduced_shapes) ** 2
    if not np.isfinite(modes.damping_references).any():
        return np.asarray(system.loss_damping()[:, None] * motion)
    references = (None if np.isnan(value) else float(value) for value in modes.damping_references)
    return np.asarray(np.column_stack([system.loss_damping(value) for value in references]) * motion)
