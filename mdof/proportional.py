"""Damping of the whole: proportional to mass and stiffness, fitted to two ratios, or one ratio for every mode."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

if TYPE_CHECKING:
    from collections.abc import Mapping

    from mdof.system import System

__all__ = ["with_proportional_damping"]


def with_proportional_damping(system: System, damping: Mapping[str, Any]) -> System:
    """Add the damping of the whole; see the manual's page on the model file."""
    if damping.get("two_ratios"):
        (w1, z1), (w2, z2) = sorted((float(w), float(z)) for w, z in damping["two_ratios"])
        # ζ(ω) = α/(2ω) + βω/2 through both targets (Rayleigh damping).
        alpha, beta = np.linalg.solve([[0.5 / w1, 0.5 * w1], [0.5 / w2, 0.5 * w2]], [z1, z2])
        return system.with_values(
            mass_proportional=float(alpha), stiffness_proportional=float(beta), two_ratios=((w1, z1), (w2, z2))
        )
    if damping.get("mode_ratios"):
        return _with_mode_ratios(system, float(damping["mode_ratios"]))
    return system.with_values(
        mass_proportional=float(damping.get("mass_proportional") or 0.0),
        stiffness_proportional=float(damping.get("stiffness_proportional") or 0.0),
    )


def _with_mode_ratios(system: System, ratio: float) -> System:
    """Give every undamped mode of what has no damping of its own the same ratio.

    With (ω, φ) the undamped modes on the springs of connections without damping or loss factor, mass-normalised, the
    added damping is Σ (Mφ) 2ζω (Mφ)ᵀ: one damper column a mode, kept as a factor like any other.
    """
    from scipy.linalg import cholesky, eigh, solve_triangular, svd
    from scipy.sparse import csc_array, hstack

    own = set(system.damper_names)
    without = np.array([name not in own for name in system.spring_names], dtype=bool) & (system.loss_factor == 0)
    columns = system.spring_columns[:, without].toarray()
    stiffness = (columns * system.stiffness[without]) @ columns.T
    mass = system.mass.toarray()
    heavy = np.nonzero(np.diag(mass) > 0)[0]
    light = np.nonzero(np.diag(mass) <= 0)[0]
    if len(light):
        inner = np.linalg.pinv(stiffness[np.ix_(light, light)], hermitian=True)
        cross = stiffness[np.ix_(light, heavy)]
        condensed = stiffness[np.ix_(heavy, heavy)] - cross.T @ inner @ cross
    else:
        condensed = stiffness
    block = mass[np.ix_(heavy, heavy)]
    if len(light) or np.any(system.stiffness[without] < 0):
        squares, shapes = eigh(condensed, block)
        moving = squares > 1e-12 * max(squares.max(initial=0.0), 0.0)
        frequencies, momenta = np.sqrt(squares[moving]), block @ shapes[:, moving]
    else:
        # From the factors, soft modes keep their digits beside stiff ones.
        lower = cholesky(block, lower=True)
        rows = np.sqrt(system.stiffness[without])[:, None] * solve_triangular(lower, columns, lower=True).T
        _, size, right = svd(rows, full_matrices=False)
        moving = size > 16 * len(block) * np.finfo(float).eps * size.max(initial=0.0)
        frequencies, momenta = size[moving], lower @ right[moving].T
    added = np.zeros((system.size, len(frequencies)))
    added[heavy] = momenta
    values = 2 * ratio * frequencies
    count = len(values)
    return system.with_values(
        damper_columns=hstack([system.damper_columns, csc_array(added)], format="csc"),
        damping=np.concatenate([system.damping, values]),
        damper_names=system.damper_names + ("damping.mode_ratios",) * count,
        damper_spring=np.concatenate([system.damper_spring, np.full(count, -1)]),
        damper_grounded=np.concatenate([system.damper_grounded, np.ones(count, dtype=bool)]),
    )
