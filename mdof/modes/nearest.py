"""Some modes of a large model: from the roots nearest to a frequency to DampedModes, every one verified."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Any

import numpy as np

from mdof.eigen.blocks import rotate_equal
from mdof.eigen.partial import Nearest, Pencil, nearest_roots
from mdof.eigen.quadratic import solve_complete
from mdof.eigen.reduce import normalise
from mdof.eigen.verify import GATE
from mdof.errors import UnverifiedError, UsageError
from mdof.findings import finding
from mdof.modes.mode import DampedModes, Verification
from mdof.modes.pairing import mode_frequencies, rising
from mdof.modes.physical import PhysicalResidual
from mdof.modes.regime import Numbers, Regime, classified
from mdof.modes.shapes import scaled_shapes
from mdof.system import System

if TYPE_CHECKING:
    from numpy.typing import NDArray

    Complex = NDArray[np.complex128]
    Real = NDArray[np.float64]

__all__ = ["LARGEST_BOUND", "obstacle", "solve_nearest"]

_EPS = float(np.finfo(np.float64).eps)
#: A relative forward bound above this is no answer.
LARGEST_BOUND = 1e-2
#: Damper columns up to which they count as few.
_FEW = 64
#: Roots computed beyond those asked for, so that pairs are not cut apart.
_SPARE = 4
#: Partners of single real roots that are looked for, and in how many steps.
_MOST_PARTNERS, _PARTNER_STEPS = 16, 6
#: Likeness from which two real roots may be those of one mode.
_LIKE = 0.5
#: Numbers in an array of shapes that are worked on together.
_PIECE = 4_000_000


def obstacle(system: System) -> str:
    """Why a system cannot be solved in part; empty where it can."""
    if not system.is_symmetric:
        return "it is not symmetric"
    if system.has_floating_loss_factors:
        return "its loss factors state no reference frequency"
    if np.any(system.stiffness < 0) or np.any(system.damping < 0):
        return "it has negative stiffness or damping"
    return ""


def solve_nearest(
    system: System, count: int, near: float, progress: Callable[[int, int], None] | None = None
) -> DampedModes:
    """The ``count`` modes whose natural frequency is nearest to ``near`` [rad/s], without the complete spectrum.

    Raises
    ------
    UsageError
        If the system is not of the kind that can be solved in part.
    UnverifiedError
        If a mode does not settle or cannot be verified.
    """
    why_not = obstacle(system)
    if why_not:
        raise UsageError(f"this system cannot be solved in part: {why_not}; solve it whole, without `count`")
    found = nearest_roots(_pencil(system), min(count + _SPARE, system.size), near, _solve_small, progress)
    found = _with_partners(system, found)
    physical = PhysicalResidual(system, None)
    values, bounds, backward = _refined(system, physical, found)
    vectors = found.vectors
    pairs = _pairs(system, values, vectors)
    roots, numbers = classified(values, bounds, pairs, set())
    sizes = mode_frequencies(roots)
    chosen = np.argsort(np.abs(sizes - near), kind="stable")[:count]
    chosen = chosen[rising(sizes[chosen], np.array([numbers[index].decay_rate for index in chosen]))]
    pairs, numbers, roots = [pairs[index] for index in chosen], [numbers[index] for index in chosen], roots[chosen]
    slow = np.array([pair[0] for pair in pairs])
    verification = _verified(system, backward[slow], numbers, pairs)
    shapes, reduced = scaled_shapes(system, vectors[:, slow])
    fast_shapes = np.full_like(shapes, np.nan)
    for index, (first, second) in enumerate(pairs):
        if second not in (-1, first):
            fast_shapes[:, [index]] = scaled_shapes(system, vectors[:, [second]])[0]
    unknown = np.full(len(pairs), np.nan)
    return DampedModes(
        system=system,
        eigenvalues=_frozen(roots),
        regimes=tuple(entry.regime for entry in numbers),
        natural_frequencies=_frozen(_column(numbers, "natural_frequency")),
        damping_ratios=_frozen(_column(numbers, "damping_ratio")),
        decay_rates=_frozen(_column(numbers, "decay_rate")),
        shapes=_frozen(shapes),
        fast_shapes=_frozen(fast_shapes),
        reduced_shapes=_frozen(reduced),
        undamped_frequencies=_frozen(unknown.copy()),
        shortcut_damping_ratios=_frozen(unknown.copy()),
        backward_errors=_frozen(backward[slow]),
        damping_ratio_bounds=_frozen(_column(numbers, "damping_ratio_bound")),
        frequency_bounds=_frozen(_column(numbers, "frequency_bound")),
        damping_references=_frozen(unknown.copy()),
        method=found.method,
        loss_reference="as dashpots matched at their stated frequencies" if np.any(system.loss_factor) else "",
        findings=_findings(system, near, pairs),
        verification=verification,
    )


def _pencil(system: System) -> Pencil:
    mass, damping, stiffness = system.M, system.C, system.K
    few = (
        system.damper_columns.shape[1] <= _FEW
        and not np.any(system.loss_factor)
        and system.extra_damping is None
        and not (system.mass_proportional or system.stiffness_proportional)
    )
    pushes = np.zeros((system.size, 0))
    if few:
        pushes = system.damper_columns.toarray() * np.sqrt(system.damping)
        pushes = pushes[:, np.any(pushes != 0, axis=0)]
    forces = PhysicalResidual(system, None).forces
    return Pencil(mass=mass, damping=damping, stiffness=stiffness, forces=forces, pushes=pushes)


def _solve_small(mass: Real, damping: Real, stiffness: Real) -> tuple[Complex, Complex]:
    problem = rotate_equal(normalise(System.from_matrices(mass, damping, stiffness)))[0]
    roots = solve_complete(problem)
    return roots.values, problem.recover @ roots.vectors


def _with_partners(system: System, found: Nearest) -> Nearest:
    """The other root of overdamped modes of which one was found, by inverse iteration from its Rayleigh quotient."""
    from scipy.sparse.linalg import splu

    mass, damping, stiffness = system.M, system.C, system.K
    values, vectors = found.values, found.vectors
    alone = [first for first, second in _pairs(system, values, vectors) if second < 0][:_MOST_PARTNERS]
    for index in alone:
        x = vectors[:, index].real
        # The product of the two roots is that of the quadratic of their common shape.
        root = float(x @ (stiffness @ x)) / (float(x @ (mass @ x)) * float(values[index].real))
        y, step = x, np.inf
        for _ in range(_PARTNER_STEPS):
            quadratic = (root**2 * mass + root * damping + stiffness).tocsc()
            try:
                y = splu(quadratic).solve((2 * root) * (mass @ y) + damping @ y)
            except RuntimeError:
                # The root itself, to the last digit: a little beside it the factors exist.
                root *= 1 + 1e-11
                continue
            y = y / np.linalg.norm(y)
            step = -float(y @ (quadratic @ y)) / float(y @ ((2 * root) * (mass @ y) + damping @ y))
            root += step
            if abs(step) <= 1e-13 * abs(root):
                break
        new = np.isfinite(root) and np.all(np.abs(values - root) > 1e-6 * abs(root))
        if new and _likeness(system, mass @ x, x, y) >= _LIKE and abs(step) <= 1e-9 * abs(root):
            values, vectors = np.append(values, complex(root)), np.column_stack([vectors, y.astype(np.complex128)])
    return Nearest(values=values, vectors=vectors, method=found.method)


def _refined(system: System, physical: PhysicalResidual, found: Nearest) -> tuple[Complex, Real, Real]:
    """Rayleigh step on every root from the factors, structured forward bounds [1/s] and backward errors.

    A few shapes at a time: of a million coordinates each takes 16 MB in every array.
    """
    values, x = found.values.copy(), found.vectors
    step = max(1, _PIECE // system.size)
    pieces = [slice(start, start + step) for start in range(0, len(values), step)]
    for piece in pieces:
        inertia, drag, elastic = physical.forces(x[:, piece])
        own, root = x[:, piece], values[piece]
        slope = _dots(own, 2 * root * inertia + drag)
        moved = root - _dots(own, root**2 * inertia + root * drag + elastic) / slope
        values[piece] = np.where(root.imag == 0, moved.real, moved)
    # What the residual does through all other modes: its square over the distance to the next one.
    mass = np.maximum(system.mass.diagonal(), np.finfo(float).tiny)
    others = np.concatenate([values, values[values.imag > 0].conj()])
    distance = np.abs(values[:, None] - others[None, :])
    distance[np.arange(len(values)), np.arange(len(values))] = np.inf
    size = np.abs(values)
    gap = np.minimum(distance.min(axis=1), size)
    bounds, backward = np.empty(len(values)), np.empty(len(values))
    for piece in pieces:
        own, root = x[:, piece], values[piece]
        inertia, drag, elastic = physical.forces(own)
        uncertain, slope, _ = physical.uncertainty(root, own, (inertia, drag, elastic))
        rest = root**2 * inertia + root * drag + elastic
        second = (1.0 / mass) @ (rest.real**2 + rest.imag**2) / (gap[piece] * size[piece])
        bounds[piece] = (uncertain + second) / np.abs(slope)
        backward[piece] = physical.backward_errors(root, own)
    return values, bounds, backward


def _pairs(system: System, values: Complex, vectors: Complex) -> list[tuple[int, int]]:
    """(slow, fast) indices; equal for complex pairs, -1 for a real root whose partner is not among the roots found."""
    pairs = [(int(index), int(index)) for index in np.nonzero(values.imag > 0)[0]]
    real = np.nonzero(values.imag == 0)[0]
    if len(real):
        x = vectors[:, real]
        slope = _dots(x, 2 * values[real] * (system.mass @ x) + system.C @ x).real
        slow, fast = list(real[slope > 0]), list(real[slope <= 0])
        for first in slow:
            weighted = system.mass @ vectors[:, first]
            like = [_likeness(system, weighted, vectors[:, first], vectors[:, second]) for second in fast]
            best = int(np.argmax(like)) if like else -1
            others = [value for index, value in enumerate(like) if index != best]
            if like and like[best] >= _LIKE and like[best] >= 2 * max(others, default=0.0):
                pairs.append((int(first), int(fast.pop(best))))
            else:
                pairs.append((int(first), -1))
        pairs += [(int(second), -1) for second in fast]
    return pairs


def _likeness(system: System, weighted: Any, first: Any, second: Any) -> float:
    """Mass-weighted modal assurance criterion of two shapes."""
    own = abs(np.vdot(first, weighted)) * abs(np.vdot(second, system.mass @ second))
    return float(abs(np.vdot(second, weighted)) ** 2 / own) if own > 0 else 0.0


def _verified(system: System, backward: Real, numbers: list[Numbers], pairs: list[tuple[int, int]]) -> Verification:
    gate = float(backward.max(initial=0.0)) / (system.size * _EPS)
    largest = float(np.nanmax(_column(numbers, "frequency_bound"), initial=0.0))
    if not gate < GATE or not largest <= LARGEST_BOUND:
        raise UnverifiedError(
            f"modes of this part are only known to {100 * largest:.2g} %, with a residual of {gate:.3g} times n times "
            "the unit roundoff",
            "ask for a few more modes, or for those near another frequency",
        )
    if any(entry.regime in (Regime.UNSTABLE, Regime.DIVERGENT) for entry in numbers):
        raise UnverifiedError(
            "a mode grows although nothing in the model can feed it", "ask for the modes near another frequency"
        )
    count = sum(1 if second < 0 else 2 for _, second in pairs)
    return Verification(
        status="verified",
        largest_scaled_residual=gate,
        largest_frequency_bound=largest,
        eigenvalues_expected=count,
        eigenvalues_found=count,
    )


def _findings(system: System, near: float, pairs: list[tuple[int, int]]) -> tuple[Any, ...]:
    text = (
        f"{len(pairs)} modes nearest to {near / (2 * np.pi):.4g} Hz, of {system.degrees_of_freedom} degrees of "
        "freedom; that none is missing between them is not proven, and the damping shortcut was not judged"
    )
    found = [finding("partial-spectrum", text)]
    single = tuple(index + 1 for index, pair in enumerate(pairs) if pair[1] < 0)
    if single:
        found.append(
            finding("partner-unresolved", "real roots whose partner is not among the roots computed", modes=single)
        )
    return tuple(found)


def _dots(first: Any, second: Any) -> Any:
    return np.einsum("ij,ij->j", first, second)


def _column(numbers: list[Numbers], name: str) -> Real:
    values = (getattr(entry, name) for entry in numbers)
    return np.array([np.nan if value is None else value for value in values], dtype=np.float64)


def _frozen(values: Any) -> Any:
    values.flags.writeable = False
    return values
