"""mdof.solve: from a System to verified damped modes."""

from __future__ import annotations

import dataclasses
from collections.abc import Callable
from typing import TYPE_CHECKING, Any

import numpy as np

from mdof.eigen.blocks import rotate_equal
from mdof.eigen.choose import METHODS
from mdof.eigen.floating import solve_floating
from mdof.eigen.quadratic import solve_complete
from mdof.eigen.reduce import NormalisedProblem, normalise
from mdof.eigen.threads import suited_threads
from mdof.eigen.verify import GATE, real_times
from mdof.errors import UnverifiedError, UsageError
from mdof.modes.mode import DampedModes, Verification
from mdof.modes.pairing import Pairing, mode_frequencies, pair_roots, rising
from mdof.modes.physical import PhysicalResidual
from mdof.modes.proportionality import proportionality_findings, shortcut
from mdof.modes.regime import Numbers, Regime, classified
from mdof.modes.remarks import mode_findings
from mdof.modes.shapes import scaled_shapes
from mdof.system import System

if TYPE_CHECKING:
    from numpy.typing import NDArray

__all__ = ["solve"]

_EPS = float(np.finfo(np.float64).eps)
#: A relative forward bound above this is no answer.
_LARGEST_BOUND = 1e-2
#: Coordinates from which some modes are found without the others.
_LARGE = 1500


def solve(
    system: System,
    count: int | None = None,
    near: float = 0.0,
    method: str = "auto",
    progress: Callable[[int, int], None] | None = None,
) -> DampedModes:
    """All damped modes of a system, every one verified.

    Parameters
    ----------
    system : System
    count : int, optional
        How many modes to return; default all.
    near : float [rad/s]
        With ``count``: return the modes whose natural frequency is nearest to this.
    method : {"auto", "dense", "few dampers", "partial"}
        ``"auto"`` takes the cheapest kernel that fits, block by block; the others force one where it is defined.
        ``"partial"`` computes ``count`` modes of a large sparse system and no others.
    progress : callable, optional
        Called during a long partial solve with the number of settled roots and of wanted ones.

    Returns
    -------
    DampedModes

    Raises
    ------
    UsageError
        If an option is not what it should be.
    UnverifiedError
        If the numbers cannot be verified; nothing is returned then.
    """
    if not isinstance(system, System):
        raise UsageError(f"solve takes a System, not {type(system).__name__}; make one with mdof.assemble(model)")
    if method not in METHODS:
        raise UsageError(f"method must be one of {', '.join(map(repr, METHODS))}, not {method!r}")
    if count is not None and (isinstance(count, bool) or not isinstance(count, (int, np.integer)) or count < 1):
        raise UsageError(f"count must be a positive whole number, not {count!r}")
    if count is None and near:
        raise UsageError("near goes with count: say how many modes to return")
    if isinstance(near, bool) or not isinstance(near, (int, float, np.number)) or not np.isfinite(near) or near < 0:
        raise UsageError(f"near must be a frequency in rad/s, not {near!r}")
    if method == "partial" or (method == "auto" and count is not None and _large(system, count)):
        from mdof.modes.nearest import solve_nearest

        if count is None:
            raise UsageError("the method 'partial' needs to know how many modes: give `count`")
        return solve_nearest(system, int(count), float(near), progress)
    quiet = np.errstate(over="ignore", invalid="ignore", divide="ignore", under="ignore")
    with quiet, suited_threads(system.size):
        try:
            return _Solution(system, method).modes(count, float(near))
        except np.linalg.LinAlgError as error:
            raise UnverifiedError(
                f"the eigenvalue computation broke down ({error})", "look for values near the ends of the number range"
            ) from None


def _large(system: System, count: int) -> bool:
    """True where some modes are wanted of a system so large and sparse that finding all would be a waste."""
    from mdof.modes.nearest import obstacle

    few = system.size >= _LARGE and count <= system.size // 20
    return few and system.K.nnz <= 0.02 * system.size**2 and not obstacle(system)


class _Solution:
    """The steps of one solve."""

    def __init__(self, system: System, method: str) -> None:
        self.system = system
        self.problem: NormalisedProblem = rotate_equal(normalise(system))[0]
        self.references: NDArray[np.float64] | None = None
        if len(self.problem.loss_rows):
            self.roots, self.references = solve_floating(
                self.problem, lambda roots: pair_roots(roots, self.problem.heavy).pairs
            )
        else:
            self.roots = solve_complete(self.problem, method)
        self.pairing: Pairing = pair_roots(self.roots, self.problem.heavy)
        physical = PhysicalResidual(system, self.references)
        roots = self.roots
        polished, self.reduced, errors = physical.polish(
            roots.computed,
            real_times(self.problem.recover, self.pairing.vectors),
            np.where(roots.clustered, 0.0, roots.bounds),
        )
        bounds = roots.bounds + np.abs(polished - roots.computed)
        if self.problem.symmetric and system.extra_stiffness is None:
            bounds = np.maximum(bounds, self._physical_bounds(physical, polished))
        self.roots = dataclasses.replace(roots, values=np.where(roots.clustered, roots.values, polished), bounds=bounds)
        #: The larger of the backward errors in mass-normalised and in physical coordinates, per root.
        self.backward: NDArray[np.float64] = np.maximum(errors, roots.backward)

    def _physical_bounds(self, physical: PhysicalResidual, values: NDArray[np.complex128]) -> NDArray[np.float64]:
        """First-order bounds from the model's own numbers, for simple roots; 0 for others [1/s]."""
        roots = self.roots
        uncertain, slope, inertia = physical.uncertainty(values, self.reduced)
        members = np.bincount(roots.block, weights=np.where(roots.values.imag > 0, 2, 1))
        with np.errstate(divide="ignore", invalid="ignore"):
            bounds = uncertain / np.abs(slope)
            # The quadratic of a mode that nothing couples bounds its roots even where they meet.
            double = np.sqrt(2 * uncertain / np.abs(inertia))
        bounds = np.where(members[roots.block] <= 2, np.fmin(bounds, double), bounds)
        return np.where(roots.clustered | (values == 0), 0.0, np.nan_to_num(bounds, posinf=np.inf))

    def modes(self, count: int | None, near: float) -> DampedModes:
        roots, pairing = self.roots, self.pairing
        values, numbers = classified(roots.values, roots.bounds, pairing.pairs, pairing.relaxation)
        frequency = mode_frequencies(values)
        order = rising(frequency, np.array([entry.decay_rate for entry in numbers]))
        if count is not None:
            order = order[np.sort(np.argsort(np.abs(frequency[order] - near), kind="stable")[:count])]
        values = values[order]
        pairs = [pairing.pairs[index] for index in order]
        numbers = [numbers[index] for index in order]
        slow, fast = np.array(pairs, dtype=np.int64).reshape(-1, 2).T
        reduced, backward = self.reduced, self.backward
        verification = self._verify(numbers)
        paired = (fast >= 0) & (fast != slow)
        # Slow and fast shapes in one go.
        described, own = scaled_shapes(self.system, reduced[:, np.concatenate([slow, fast[paired]])])
        shapes, own = described[:, : len(slow)], own[:, : len(slow)]
        fast_shapes = np.full_like(shapes, np.nan)
        fast_shapes[:, paired] = described[:, len(slow) :]
        plain = shortcut(self.problem)
        with_ratio = np.array([entry.damping_ratio is not None for entry in numbers])
        nearest = np.where(with_ratio, plain.nearest(pairing.vectors[:, slow], self.problem.heavy), -1)
        easy = np.append(plain.ratios(), np.nan)[nearest]
        undamped = np.append(plain.frequencies, np.nan)[nearest]
        ratios, frequencies = _array(numbers, "damping_ratio"), _array(numbers, "natural_frequency")
        references = np.full(len(pairs), np.nan) if self.references is None else self.references[slow]
        findings = mode_findings(self.system, self.problem, numbers, pairs, pairing, shapes)
        findings += proportionality_findings(self.system, self.problem, plain, nearest, ratios, frequencies)
        return DampedModes(
            system=self.system,
            eigenvalues=_frozen(values),
            regimes=tuple(entry.regime for entry in numbers),
            natural_frequencies=_frozen(frequencies),
            damping_ratios=_frozen(ratios),
            decay_rates=_frozen(np.array([entry.decay_rate for entry in numbers])),
            shapes=_frozen(shapes),
            fast_shapes=_frozen(fast_shapes),
            reduced_shapes=_frozen(own),
            undamped_frequencies=_frozen(undamped),
            shortcut_damping_ratios=_frozen(easy),
            backward_errors=_frozen(np.maximum(backward[slow], backward[np.maximum(slow, fast)])),
            damping_ratio_bounds=_frozen(_array(numbers, "damping_ratio_bound")),
            frequency_bounds=_frozen(_array(numbers, "frequency_bound")),
            damping_references=_frozen(references),
            method=roots.method,
            loss_reference=_loss_reference(self.system),
            findings=tuple(findings),
            verification=verification,
        )

    def _verify(self, numbers: list[Numbers]) -> Verification:
        roots, problem = self.roots, self.problem
        size = problem.recover.shape[1]
        gate = float(self.backward.max(initial=0.0)) / (size * _EPS)
        # What the given numbers do not determine is said first; such pairs leave large residuals too.
        bounds = _array(numbers, "frequency_bound")
        largest = float(np.nanmax(bounds)) if np.any(np.isfinite(bounds)) else 0.0
        if np.any(np.isinf(bounds)) or largest > _LARGEST_BOUND:
            raise UnverifiedError(
                f"rounding of the given numbers alone may move an eigenvalue by {100 * largest:.2g} %",
                "look for a near-mechanism, cancelling stiffness or values over 12 orders of magnitude",
            )
        if not gate < GATE:
            raise UnverifiedError(
                f"an eigenpair leaves a residual {gate:.3g} times n times the unit roundoff; {GATE:g} is the limit",
                "look for stiffness, mass or damping values that differ by more than 12 orders of magnitude",
            )
        expected = size + problem.heavy
        if roots.count != expected:
            raise UnverifiedError(f"{roots.count} eigenvalues found where {expected} are expected", "report this model")
        growing = [entry for entry in numbers if entry.regime in (Regime.UNSTABLE, Regime.DIVERGENT)]
        if growing and problem.passive:
            raise UnverifiedError(
                "a mode grows although nothing in the model can feed it",
                "look for values that differ by more than 12 orders",
            )
        return Verification(
            status="verified",
            largest_scaled_residual=gate,
            largest_frequency_bound=largest,
            eigenvalues_expected=expected,
            eigenvalues_found=roots.count,
        )


def _array(numbers: list[Numbers], name: str) -> NDArray[np.float64]:
    values = (getattr(entry, name) for entry in numbers)
    return np.array([np.nan if value is None else value for value in values], dtype=np.float64)


def _frozen(values: Any) -> Any:
    values.flags.writeable = False
    return values


def _loss_reference(system: System) -> str:
    lossy = system.loss_factor != 0
    if not lossy.any():
        return ""
    stated = np.unique(np.round(system.loss_reference[lossy & np.isfinite(system.loss_reference)] / (2 * np.pi), 6))
    parts = []
    if len(stated):
        parts.append(
            "as dashpots matched at "
            + ", ".join(f"{value:g} Hz" for value in stated[:4])
            + (" and others" if len(stated) > 4 else "")
        )
    if system.has_floating_loss_factors:
        parts.append("as dashpots matched at each mode's own frequency")
    return " and ".join(parts)
