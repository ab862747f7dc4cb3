"""mdof.modes.hysteretic: complex stiffness, no dashpots."""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest

import mdof
from mdof import System, UsageError


def rubber(masses: list[float], columns: list[list[float]], k: list[float], eta: list[float]) -> System:
    system = System.from_factors(np.diag(masses), np.array(columns, dtype=float), k)
    return system.with_values(loss_factor=np.array(eta))


@pytest.mark.parametrize("eta", [0.01, 0.3, 1.5])
def test_one_loss_factor_everywhere_is_that_of_every_mode(eta: float) -> None:
    system = rubber([2.0, 1.0], [[1, -1], [0, 1]], [100.0, 400.0], [eta, eta])
    modes = mdof.hysteretic_modes(system)
    undamped = mdof.solve(rubber([2.0, 1.0], [[1, -1], [0, 1]], [100.0, 400.0], [0.0, 0.0]))
    assert modes.loss_factors == pytest.approx([eta] * 2, rel=1e-14)
    assert modes.natural_frequencies == pytest.approx(undamped.natural_frequencies, rel=1e-14)
    # λ² = −ω² (1 + jη) by definition.
    assert modes.eigenvalues**2 == pytest.approx(-(modes.natural_frequencies**2) * (1 + 1j * eta), rel=1e-14)
    assert np.all(modes.eigenvalues.real < 0)


@pytest.mark.parametrize("seed", range(8))
def test_unlike_loss_factors_against_forty_digits(seed: int) -> None:
    rng = np.random.default_rng(seed)
    n = int(rng.integers(2, 5))
    masses, k, eta = 10 ** rng.uniform(-1, 1, n), 10 ** rng.uniform(0, 6, n), 10 ** rng.uniform(-3, 0, n)
    columns = np.eye(n) - np.eye(n, k=1)
    modes = mdof.hysteretic_modes(rubber(list(masses), columns.tolist(), list(k), list(eta)))
    with mp.workdps(40):
        B = mp.matrix(columns.tolist())
        stiffness = B * mp.diag([mp.mpf(float(a)) * mp.mpc(1, float(b)) for a, b in zip(k, eta, strict=True)]) * B.T
        exact, _ = mp.eig(mp.diag([1 / mp.mpf(float(m)) for m in masses]) * stiffness)
        exact = sorted(exact, key=lambda value: value.real)
        for index, value in enumerate(exact):
            frequency, loss = mp.sqrt(value.real), value.imag / value.real
            assert abs(modes.natural_frequencies[index] / frequency - 1) <= modes.frequency_bounds[index] + 2.0**-52
            assert abs(modes.loss_factors[index] - loss) <= modes.loss_factor_bounds[index] + 2.0**-52
    assert modes.frequency_bounds.max() < 1e-11
    assert modes.verification.status == "verified"


def test_a_free_motion_has_no_loss_factor() -> None:
    modes = mdof.hysteretic_modes(rubber([1.0, 3.0], [[1], [-1]], [12.0], [0.2]))
    assert modes.natural_frequencies == pytest.approx([0.0, 4.0])
    assert np.isnan(modes.loss_factors[0])
    assert modes.loss_factors[1] == pytest.approx(0.2, rel=1e-14)
    assert np.abs(modes.shapes[:, 0]) == pytest.approx([1, 1])
    assert len(modes) == 2


def test_light_loss_factors_agree_with_matched_dashpots() -> None:
    """ζ = η/2 to first order, mode by mode."""
    system = rubber([2.0, 1.0], [[1, -1], [0, 1]], [100.0, 400.0], [0.002, 0.0005])
    assert mdof.solve(system).damping_ratios == pytest.approx(mdof.hysteretic_modes(system).loss_factors / 2, rel=1e-5)


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"mass_proportional": 0.1}, "proportional damping"),
        ({"stiffness": np.array([-1.0, 5.0])}, "negative stiffness"),
        ({"extra_damping": np.eye(2)}, "a damping matrix"),
        ({"mass": np.diag([1.0, 0.0])}, "no mass"),
        ({"loss_factor": np.array([-0.1, 0.0])}, "negative loss factors"),
    ],
)
def test_what_is_not_purely_hysteretic_is_refused(changes: dict[str, object], words: str) -> None:
    system = rubber([1.0, 1.0], [[1, -1], [0, 1]], [5.0, 7.0], [0.1, 0.1])
    with pytest.raises(UsageError, match=words):
        mdof.hysteretic_modes(system.with_values(**changes))
