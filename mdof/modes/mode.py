"""Mode and DampedModes: what a solve hands back."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, field
from functools import cached_property, partial
from typing import TYPE_CHECKING, overload

import numpy as np

from mdof.modes.regime import Regime, time_to_two_percent

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from mdof.findings import Finding
    from mdof.modes.energy import EnergyShares
    from mdof.system import System

__all__ = ["DampedModes", "Mode", "Verification"]


@dataclass(frozen=True, kw_only=True, slots=True)
class Verification:
    """What was checked about the eigenpairs, and the verdict.

    Attributes
    ----------
    status : ``"verified"``; a solve that cannot be verified raises instead.
    largest_scaled_residual : largest backward error over n times the unit roundoff (below 10 passes).
    largest_frequency_bound : largest relative forward bound on a natural frequency or decay rate.
    eigenvalues_expected, eigenvalues_found : counts; they agree in a verified result.
    """

    status: str
    largest_scaled_residual: float
    largest_frequency_bound: float
    eigenvalues_expected: int
    eigenvalues_found: int


@dataclass(frozen=True, kw_only=True, slots=True, eq=False)
class Mode:
    """One mode of vibration.

    Attributes
    ----------
    number : int, from 1, by rising natural frequency.
    regime : Regime
    eigenvalues : tuple of one or two complex [1/s]
        The conjugate pair (positive imaginary part first), the real pair (slow first) or a single real root.
    natural_frequency : float or None [rad/s]
        sqrt of the product of the pair: |λ| of the damped system. None where undefined.
    damped_frequency : float or None [rad/s]
        Imaginary part of the pair; None for motions that do not oscillate.
    damping_ratio : float or None
    decay_rate : float [1/s]
        Rate of the slowest decay of the mode; negative where it grows. Of a rigid-body mode the rate at which its
        velocity decays, 0 where nothing slows it.
    shape : ndarray of complex, shape (n_described,)
        Largest component 1; of a real pair the slow shape.
    fast_shape : ndarray or None
        Of a real pair, the shape of the fast root.
    undamped_frequency, shortcut_damping_ratio : float or None [rad/s]
        The undamped frequency nearest in shape, and the ratio the proportional-damping shortcut gives there.
    backward_error : float
    damping_ratio_bound, frequency_bound : float or None
        Bound on the error of the ratio (absolute) and of |λ| (relative) from rounding in the solve.
    reduced_shape : ndarray of complex, shape (n,)
        The shape in the system's reduced coordinates, inner coordinates of series branches included.
    damping_reference : float or None [rad/s]
        Where loss factors that state no reference were matched for this mode.
    shares : callable
        Gives :attr:`energy`, which is worked out for all modes at once when first asked for.
    """

    number: int
    regime: Regime
    eigenvalues: tuple[complex, ...]
    natural_frequency: float | None
    damped_frequency: float | None
    damping_ratio: float | None
    decay_rate: float
    shape: NDArray[np.complex128]
    fast_shape: NDArray[np.complex128] | None
    undamped_frequency: float | None
    shortcut_damping_ratio: float | None
    backward_error: float
    damping_ratio_bound: float | None
    frequency_bound: float | None
    system: System = field(repr=False)
    reduced_shape: NDArray[np.complex128] = field(repr=False)
    damping_reference: float | None = None
    shares: Callable[[], EnergyShares] = field(repr=False)

    @property
    def time_to_two_percent(self) -> float | None:
        """Time to fall to 2 % for good [s], by the envelope or released from rest; None where it never does."""
        return time_to_two_percent(self.regime, self.eigenvalues)

    @property
    def energy(self) -> EnergyShares:
        """Kinetic energy by coordinate and dissipated energy by connection, each summing to 1."""
        return self.shares()


@dataclass(frozen=True, kw_only=True, eq=False)
class DampedModes(Sequence[Mode]):
    """All modes of a system, verified; a sequence of :class:`Mode`, built lazily.

    Array attributes are read-only and run over the modes: shape (n_modes,) unless stated; undefined is NaN in arrays
    and None in :class:`Mode`.

    Attributes
    ----------
    eigenvalues : ndarray of complex, shape (n_modes, 2) [1/s]; a missing partner is NaN.
    shapes : ndarray of complex, shape (n_described, n_modes); fast_shapes likewise, NaN where there is none.
    regimes : tuple of Regime
    method : which kernel solved it, in words.
    loss_reference : how loss factors were turned into dashpots, in words; empty without loss factors.
    reduced_shapes : ndarray of complex, shape (n, n_modes); shapes in reduced coordinates.
    damping_references : where loss factors without a stated reference were matched [rad/s]; NaN elsewhere.
    """

    system: System
    eigenvalues: NDArray[np.complex128]
    regimes: tuple[Regime, ...]
    natural_frequencies: NDArray[np.float64]
    damping_ratios: NDArray[np.float64]
    decay_rates: NDArray[np.float64]
    shapes: NDArray[np.complex128]
    fast_shapes: NDArray[np.complex128]
    reduced_shapes: NDArray[np.complex128]
    undamped_frequencies: NDArray[np.float64]
    shortcut_damping_ratios: NDArray[np.float64]
    backward_errors: NDArray[np.float64]
    damping_ratio_bounds: NDArray[np.float64]
    frequency_bounds: NDArray[np.float64]
    damping_references: NDArray[np.float64]
    method: str
    loss_reference: str
    findings: tuple[Finding, ...]
    verification: Verification

    def __len__(self) -> int:
        return len(self.regimes)

    @overload
    def __getitem__(self, index: int) -> Mode: ...
    @overload
    def __getitem__(self, index: slice) -> tuple[Mode, ...]: ...
    def __getitem__(self, index: int | slice) -> Mode | tuple[Mode, ...]:
        if isinstance(index, slice):
            return tuple(self._mode(i) for i in range(*index.indices(len(self))))
        return self._mode(range(len(self))[index])

    def __iter__(self) -> Iterator[Mode]:
        return (self._mode(index) for index in range(len(self)))

    @cached_property
    def energies(self) -> tuple[EnergyShares, ...]:
        """Kinetic and dissipated energy of every mode."""
        from mdof.modes.energy import energy_shares

        return energy_shares(self)

    def _shares(self, index: int) -> EnergyShares:
        return self.energies[index]

    @cached_property
    def _made(self) -> dict[int, Mode]:
        return {}

    def _mode(self, index: int) -> Mode:
        if index not in self._made:
            self._made[index] = self._make(index)
        return self._made[index]

    def _make(self, index: int) -> Mode:
        pair = tuple(complex(value) for value in self.eigenvalues[index] if not np.isnan(value))
        fast = self.fast_shapes[:, index]
        oscillates = len(pair) == 2 and pair[0].imag != 0
        return Mode(
            number=index + 1,
            regime=self.regimes[index],
            eigenvalues=pair,
            natural_frequency=_number(self.natural_frequencies[index]),
            damped_frequency=abs(pair[0].imag) if oscillates else None,
            damping_ratio=_number(self.damping_ratios[index]),
            decay_rate=float(self.decay_rates[index]),
            shape=self.shapes[:, index],
            fast_shape=None if np.isnan(fast).all() else fast,
            undamped_frequency=_number(self.undamped_frequencies[index]),
            shortcut_damping_ratio=_number(self.shortcut_damping_ratios[index]),
            backward_error=float(self.backward_errors[index]),
            damping_ratio_bound=_number(self.damping_ratio_bounds[index]),
            frequency_bound=_number(self.frequency_bounds[index]),
            damping_reference=_number(self.damping_references[index]),
            system=self.system,
            reduced_shape=self.reduced_shapes[:, index],
            shares=partial(self._shares, index),
        )

    def __repr__(self) -> str:
        return f"DampedModes({len(self)} modes, {self.verification.status}, {len(self.findings)} findings)"


def _number(value: np.float64) -> float | None:
    return None if np.isnan(value) else float(value)
