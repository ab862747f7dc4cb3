"""Few dampers on many coordinates: all roots from the r-by-r secular form.

The characteristic polynomial is ``Π q_k(λ) · det G(λ)`` (Taslaman, SIAM J. Matrix Anal. Appl. 36, 2015). Real roots are
bracketed by inertia counts along the negative axis. Every oscillating mode k is followed from its pole by Newton's
method on its own scalar equation ``q_k + λ v_kᵀ G_k⁻¹ v_k = 0``, in which G_k leaves pole k out; roots that two modes
share are told apart by Ehrlich–Aberth steps. A root costs O(n r²) a step.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from mdof.eigen.secular import Secular
from mdof.eigen.state_matrix import BlockRoots

if TYPE_CHECKING:
    from numpy.typing import NDArray

    Complex = NDArray[np.complex128]
    Real = NDArray[np.float64]
    Index = NDArray[np.int64]

__all__ = ["NotResolved", "few_dampers"]

_EPS = float(np.finfo(np.float64).eps)
_NEWTON_STEPS = 30
_ABERTH_STEPS = 80
_GRID_PER_DECADE = 48
#: Roots closer than this, relative to their size, are one root found twice.
_SAME = 1e-9
#: Closer than this they collide for practical purposes, and their mean over an invariant subspace is wanted.
_CLOSE = 1e-6
#: A leading component below this share of the largest one leads no longer.
_LEAST_LEAD = 0.03


class NotResolved(ArithmeticError):
    """The secular form does not give all roots apart; the text says why, and another kernel takes over."""


def few_dampers(squares: Real, own: Real, columns: Real) -> BlockRoots:
    """All roots of ``λ² + λ (diag(δ) + V Vᵀ) + diag(ω²)``, one of each conjugate pair.

    Parameters
    ----------
    squares, own : ndarray, shape (n,) [1/s², 1/s]
        ω² ≥ 0 and δ ≥ 0 of the undamped modes. No two modes of equal ω² may share a damper.
    columns : ndarray, shape (n, r) [1/√s]
        Every mode is touched by some damper.

    Raises
    ------
    NotResolved
        If roots are missing, found twice or about to collide.
    """
    form = Secular(squares, own, columns)
    free = np.nonzero(squares == 0)[0]
    rates = _real_rates(form)
    wanted = 2 * form.size - len(free) - len(rates)
    if wanted % 2:
        raise NotResolved("the real roots found leave an odd number of others")
    modes = np.nonzero(squares > 0)[0]
    values, forces = _follow_modes(form, modes, 1j * np.sqrt(squares[modes]))
    below = values.imag < 0
    values[below], forces[below] = values[below].conj(), forces[below].conj()
    keep = _distinct(values)
    swinging = values[keep]
    lead, force = modes[keep], forces[keep]
    real_values = -rates.astype(np.complex128)
    missing = wanted // 2 - len(swinging)
    if missing < 0:
        raise NotResolved(f"{-missing} roots more than there should be")
    if missing:
        spare = np.setdiff1d(np.arange(len(modes)), keep)
        extra = _separate(form, 1j * np.sqrt(squares[modes[spare[:missing]]]), swinging, -rates, len(free))
        swinging = np.concatenate([swinging, extra])
        if len(_distinct(swinging)) < wanted // 2:
            raise NotResolved(f"{wanted // 2 - len(_distinct(swinging))} roots coincide or are missing")
        extra_lead, extra_force = _leading(form, extra)
        lead, force = np.concatenate([lead, extra_lead]), np.vstack([force, extra_force])
    if len(_distinct(swinging, _CLOSE)) < len(swinging) or np.any(np.diff(rates) <= _CLOSE * rates[1:]):
        raise NotResolved("roots are about to collide")
    _check_sums(form, swinging, rates)
    # The last step moved the roots; the forces follow.
    force = _forces(form, swinging, lead)
    found = np.concatenate([swinging, real_values])
    real_lead, real_force = _leading(form, real_values)
    vectors = form.vectors(found, np.vstack([force, real_force]), np.concatenate([lead, real_lead]))
    # A mode that ended far from its pole may hardly take part in its root; another one leads more accurately.
    faint = np.nonzero(np.abs(vectors).max(axis=0) > 1 / _LEAST_LEAD)[0]
    if len(faint):
        better, better_force = _leading(form, found[faint], np.argmax(np.abs(vectors[:, faint]), axis=0))
        vectors[:, faint] = form.vectors(found[faint], better_force, better)
    vectors = np.hstack([vectors, np.eye(form.size)[:, free]])
    if not np.all(np.isfinite(vectors)):
        raise NotResolved("a mode that no damper touches is among those that one should")
    found = np.concatenate([found, np.zeros(len(free))])
    return BlockRoots(found, vectors, None, np.full(len(found), -1), count=2 * form.size)


def _follow_modes(form: Secular, modes: Index, start: Complex) -> tuple[Complex, Complex]:
    """Newton's method for one root of every mode's own equation.

    Parameters
    ----------
    modes : shape (m,); start : shape (m,) [1/s]
        Where each mode begins: its pole, or its root for neighbouring dampers.

    Returns
    -------
    values : shape (m,); NaN where a mode did not settle
    forces : ndarray of complex, shape (m, r)
        g = G_k⁻¹ v_k, from which the vectors follow.
    """
    values = start.copy()
    forces = np.zeros((len(modes), form.rank), dtype=np.complex128)
    active = np.arange(len(modes))
    at_pole = start.real == 0
    for turn in range(_NEWTON_STEPS):
        now, mode = values[active], modes[active]
        # A mode of nearly equal frequency would stand in the way at the pole itself; a step aside is enough.
        aside = np.where(at_pole[active] & (turn == 0), (1 - 1e-7) * now - 1e-7 * np.abs(now), now)
        whole, slope = form.sums(aside, mode, slopes=turn > 0)
        v = form.columns[mode]
        try:
            g = np.linalg.solve(whole, v[:, :, None].astype(np.complex128))[:, :, 0]
        except np.linalg.LinAlgError:
            raise NotResolved("a mode's own equation is singular") from None
        damping = form.own[mode] + np.einsum("ij,ij->i", v, g)
        bend = -np.einsum("ij,ijk,ik->i", g, slope, g) if turn else np.zeros(len(active))
        # With the damping as a straight line in λ the equation is a quadratic, solved exactly.
        a, b = 1 + bend, damping - bend * now
        root = np.sqrt(b * b / 4 - a * form.squares[mode])
        first, second = (-b / 2 + root) / a, (-b / 2 - root) / a
        new = np.where(np.abs(first - now) < np.abs(second - now), first, second)
        values[active], forces[active] = new, g
        with np.errstate(invalid="ignore"):
            going = np.abs(new - now) > 8 * _EPS * np.abs(new)
        active = active[going & np.isfinite(new)]
        if not len(active):
            break
    else:
        slow = np.abs(values[active] - now[going & np.isfinite(new)]) > 1e-12 * np.abs(values[active])
        values[active[slow]] = np.nan
    return values, forces


def _real_rates(form: Secular) -> Real:
    """Rates s > 0 of all real roots λ = −s that inertia counts on a fine grid bracket, rising."""
    total = np.linalg.norm(form.columns, ord=2) ** 2 + form.own.max(initial=0.0)
    held = form.squares[form.squares > 0]
    if total == 0:
        return np.zeros(0)
    # Every real root has s² − s xᵀDx + ω² = 0 for some unit x.
    high = 2 * total
    damped = np.einsum("ij,ij->i", form.columns, form.columns) + form.own
    floor = [damped[form.squares == 0].min()] if np.any(form.squares == 0) else []
    low = 0.25 * min([*floor, float(held.min()) / total if len(held) else total])
    if not 0 < low < np.inf:
        raise NotResolved("the damping spans the whole number range")
    if low >= high:
        return np.zeros(0)  # every mode is underdamped
    grid = np.geomspace(low, high, max(16, int(_GRID_PER_DECADE * np.log10(high / low))))
    counts = form.negative(grid)
    inner = np.zeros(0)
    for _ in range(60):
        # Intervals whose count changes by more than one, or that are still wide, are halved until they hold one root.
        change = np.abs(np.diff(counts))
        wide = (change > 0) & (np.diff(grid) > 4 * _EPS * grid[1:])
        if not wide.any():
            break
        index = np.nonzero(wide)[0]
        inner = np.sqrt(grid[index] * grid[index + 1])
        between = form.negative(inner)
        grid, counts = np.insert(grid, index + 1, inner), np.insert(counts, index + 1, between)
        # Only the ends of intervals that still change are kept.
        kept = np.zeros(len(grid), dtype=bool)
        changing = np.nonzero(np.diff(counts))[0]
        kept[changing] = kept[changing + 1] = True
        grid, counts = grid[kept], counts[kept]
    change = np.abs(np.diff(counts))
    return np.repeat(np.sqrt(grid[:-1] * grid[1:]), change)


def _distinct(values: Complex, same: float = _SAME) -> Index:
    """Indices of the first of every group of equal values; lost ones (NaN) and those near the axis are left out."""
    good = np.nonzero(np.isfinite(values) & (values.imag > max(same, 1e-7) * np.abs(values)))[0]
    order = good[np.argsort(np.abs(values[good]), kind="stable")]
    ranked = values[order]
    size = np.abs(ranked)
    twice = np.zeros(len(order), dtype=bool)
    for shift in range(1, len(order)):
        near = size[shift:] - size[:-shift] <= same * size[shift:]
        if not near.any():
            break
        twice[shift:] |= near & (np.abs(ranked[shift:] - ranked[:-shift]) <= same * size[shift:])
    return np.sort(order[~twice])


def _separate(form: Secular, start: Complex, known: Complex, real: Real, zeros: int) -> Complex:
    """Ehrlich–Aberth steps for the roots that are still missing, all known ones divided out."""
    values = np.abs(start) * (1j - 0.05 * np.arange(1, len(start) + 1))
    fixed = np.concatenate([known, known.conj(), real])
    for _ in range(_ABERTH_STEPS):
        pull = form.log_slope(values)
        pull -= (1.0 / (values[:, None] - fixed[None, :])).sum(axis=1) + zeros / values
        apart = values[:, None] - values[None, :]
        np.fill_diagonal(apart, np.inf)
        pull -= (1.0 / apart).sum(axis=1) + (1.0 / (values[:, None] - values.conj()[None, :])).sum(axis=1)
        step = 1.0 / pull
        far = np.abs(step) > 0.5 * np.abs(values)
        step[far] *= 0.5 * np.abs(values[far]) / np.abs(step[far])
        values = values - step
        if not np.all(np.isfinite(values)):
            raise NotResolved("an Ehrlich–Aberth step leaves the number range")
        if np.all(np.abs(step) <= 1e-12 * np.abs(values)):
            return np.asarray(np.where(values.imag < 0, values.conj(), values), dtype=np.complex128)
    raise NotResolved(f"{len(values)} roots do not settle by Ehrlich–Aberth steps")


def _leading(form: Secular, values: Complex, lead: Index | None = None) -> tuple[Index, Complex]:
    """The leading mode of each root's vector, shape (m,), and g = G_k⁻¹ v_k without it, shape (m, r)."""
    if not len(values):
        return np.zeros(0, dtype=np.int64), np.zeros((0, form.rank), dtype=np.complex128)
    if lead is None:
        whole, _ = form.sums(values, slopes=False)
        rough = np.asarray(np.linalg.svd(whole)[2][:, -1:].conj(), dtype=np.complex128)
        lead = (
            np.argmax(np.abs(form.vectors(values, rough[:, 0])), axis=0) if len(values) else np.zeros(0, dtype=np.int64)
        )
    return lead, _forces(form, values, lead)


def _forces(form: Secular, values: Complex, lead: Index) -> Complex:
    """g = G_k⁻¹ v_k at given roots and leading modes, shape (m, r)."""
    whole, _ = form.sums(values, lead, slopes=False)
    force = np.linalg.solve(whole, form.columns[lead][:, :, None].astype(np.complex128))[:, :, 0]
    return np.asarray(force, dtype=np.complex128)


def _check_sums(form: Secular, swinging: Complex, rates: Real) -> None:
    """Sum of all roots against the trace of D, and of their squares against that of the squared state matrix."""
    trace = float(form.own.sum() + np.sum(form.columns**2))
    gram = form.columns.T @ form.columns
    squared = float(np.sum(gram**2) + np.sum(form.own**2) + 2 * np.sum(form.own[:, None] * form.columns**2))
    size = np.sqrt(squared + 2 * float(form.squares.sum()))
    first = abs(2 * swinging.real.sum() - rates.sum() + trace)
    second = abs(2 * (swinging**2).real.sum() + np.sum(rates**2) - squared + 2 * float(form.squares.sum()))
    limit = 1e4 * 2 * form.size * _EPS
    if first > limit * size or second > limit * size**2:
        raise NotResolved(f"sums of roots miss the traces by {first / size:.1e} and {second / size**2:.1e} of the norm")
