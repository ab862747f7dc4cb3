"""Roots that rounding cannot tell apart: their mean over the invariant subspace, and how well that is known."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from mdof.eigen.blocks import connected

if TYPE_CHECKING:
    from numpy.typing import NDArray

__all__ = ["average_clusters"]

_EPS = float(np.finfo(np.float64).eps)


def average_clusters(
    values: NDArray[np.complex128],
    bounds: NDArray[np.float64],
    block: NDArray[np.int64],
    partner: NDArray[np.int64],
    states: list[NDArray[np.float64] | None],
    meeting: NDArray[np.bool_],
    amplification: float = 1.0,
) -> tuple[NDArray[np.complex128], NDArray[np.float64], NDArray[np.bool_]]:
    """Replace roots that cannot be told apart by their mean, whose own bound comes from the spectral projector.

    A nearly defective eigenvalue moves by the square root of rounding; the mean of the colliding roots does not.
    ``partner`` is filled in place for real roots that collide. ``meeting`` marks roots whose slope xᵀ(2λM + D)x all
    but vanishes, as that of a double root does: equal real roots of unlike motions have slopes of their own, and are
    no pair.
    """
    from scipy.linalg import schur

    values, bounds = values.copy(), bounds.copy()
    clustered = np.zeros(len(values), dtype=bool)
    for number, state in enumerate(states):
        own = np.nonzero((block == number) & (values != 0))[0]
        if state is None or not len(own):
            continue
        triangle: NDArray[np.float64] | None = None
        reach = 4 * bounds[own]
        reach = np.minimum(reach, 1e-6 * np.abs(values[own]))
        own_values = values[own]
        near = np.abs(own_values[:, None] - own_values[None, :]) <= reach[:, None] + reach[None, :]
        touches_axis = (own_values.imag > 0) & (own_values.imag <= reach)
        near_mirror = np.abs(own_values.conj()[:, None] - own_values[None, :]) <= reach[:, None] + reach[None, :]
        near |= near_mirror & (touches_axis[:, None] | touches_axis[None, :])
        if np.count_nonzero(near) == len(own) and not touches_axis.any():
            continue
        for group in connected(near):
            members = own[group]
            on_axis = bool(np.any(touches_axis[group])) or bool(np.all(values[members].imag == 0))
            if len(members) == 1 and not touches_axis[group[0]]:
                continue
            if on_axis and not meeting[members].any():
                continue
            weight = np.where(values[members].imag > 0, 2.0, 1.0) if on_axis else np.ones(len(members))
            mean = complex(np.sum(weight * (values[members].real if on_axis else values[members])) / weight.sum())
            if triangle is None:
                triangle, basis = schur(state, output="real")
            known, split = _uncertainty(triangle, basis, values[members], on_axis, amplification)
            spread = float(np.max(np.abs(values[members] - mean)))
            values[members] = mean
            bounds[members] = known + spread + split
            clustered[members] = True
            if on_axis:
                singles = [int(index) for index, size in zip(members, weight, strict=True) if size == 1.0]
                for first, second in zip(singles[::2], singles[1::2], strict=False):
                    partner[first], partner[second] = second, first
                for index, size in zip(members, weight, strict=True):
                    if size == 2.0:
                        partner[index] = index
    return values, bounds, clustered


def _uncertainty(
    triangle: NDArray[np.float64],
    basis: NDArray[np.float64],
    members: NDArray[np.complex128],
    on_axis: bool,
    amplification: float,
) -> tuple[float, float]:
    """How well the mean of a cluster is known, and how much farther from it than computed a member may lie.

    The mean is as good as rounding of the state matrix over LAPACK's reciprocal condition number of the spectral
    projector. A member's distance to it is the k-th root of numbers of the size of that rounding times the coupling
    within the cluster: the departure of its k by k block from a multiple of the identity.
    """
    from scipy.linalg import lapack

    centre = members.mean() if not on_axis else members.real.mean()
    radius = 4 * float(np.max(np.abs(members - centre))) + 1e-12 * abs(centre)
    real, imaginary = np.diag(triangle), np.zeros(len(triangle))
    below = np.nonzero(np.diag(triangle, -1))[0]
    block = np.sqrt(np.abs(np.diag(triangle, -1)[below])) * np.sqrt(np.abs(np.diag(triangle, 1)[below]))
    imaginary[below] = block
    imaginary[below + 1] = block
    chosen = np.abs(real + 1j * imaginary - complex(centre.real, abs(centre.imag))) <= radius
    norm = float(np.linalg.norm(triangle))
    condition = 1.0
    if chosen.any() and not chosen.all():
        result = lapack.dtrsen(
            chosen.astype(np.int32),
            triangle,
            basis,
            job=b"E",
            lwork=len(triangle) ** 2,
            liwork=len(triangle) ** 2,
        )
        # A cluster that cannot be parted from the rest is not known at all.
        condition = float(result[5]) if result[7] == 0 and result[5] > 0 else _EPS
        triangle = result[0]
    known = 8 * len(triangle) * _EPS * amplification * norm / condition
    count = int(chosen.sum()) if chosen.any() else len(triangle)
    own = triangle[:count, :count]
    # A complex cluster comes with its mirror image: each of the two has half of the members.
    power = max(count if on_axis else count // 2, 1)
    coupling = float(np.linalg.norm(own - centre.real * np.eye(count)))
    if not on_axis:
        coupling = _coupling(own, complex(centre))
    return known, float((known * max(coupling, known) ** (power - 1)) ** (1 / power)) if power > 1 else 0.0


def _coupling(own: NDArray[np.float64], centre: complex) -> float:
    """Norm of what a block with the double-sided cluster centre, centre* adds to the two multiples of the identity."""
    from scipy.linalg import schur

    # In complex Schur form, eigenvalues of the upper half-plane first, the leading half is the cluster itself.
    upper, _, count = schur(own.astype(np.complex128), output="complex", sort=lambda value: value.imag > 0)
    part = upper[:count, :count]
    return float(np.linalg.norm(part - centre * np.eye(count)))
