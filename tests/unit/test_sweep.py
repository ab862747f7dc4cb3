"""mdof.modes.sweep: one damper over many values."""

from __future__ import annotations

import numpy as np
import pytest

import mdof
from mdof import System, UsageError


def row(n: int, damping: dict[int, float]) -> System:
    """n unit masses between walls on unit springs, with dampers to ground."""
    K = 2 * np.eye(n) - np.eye(n, k=1) - np.eye(n, k=-1)
    count = len(damping)
    columns = np.zeros((n, count))
    columns[list(damping), range(count)] = 1
    return System.from_matrices(np.eye(n), np.zeros((n, n)), K).with_values(
        damper_columns=columns,
        damping=np.array(list(damping.values())),
        damper_names=tuple(f"pot {index}" for index in range(count)),
        damper_spring=np.full(count, -1),
        damper_grounded=np.ones(count, dtype=bool),
    )


def test_every_value_gives_what_a_solve_gives() -> None:
    system = row(9, {1: 0.3, 5: 0.1})
    values = [0.0, 0.05, 0.4, 2.0, 7.0]
    swept = mdof.sweep(system, "pot 1", values)
    for index, value in enumerate(values):
        alone = mdof.solve(system.with_values(damping=np.array([0.3, value])))
        mine, theirs = np.sort(swept.natural_frequencies[index]), np.sort(alone.natural_frequencies)
        np.testing.assert_allclose(mine[~np.isnan(mine)], theirs[~np.isnan(theirs)], rtol=1e-11)
        assert swept.frequency_bounds[index][~np.isnan(swept.frequency_bounds[index])].max() < 1e-10


def test_one_oscillator_goes_through_its_critical_damping() -> None:
    swept = mdof.sweep(row(1, {0: 1.0}), "pot 0", np.linspace(0, 6, 13))
    np.testing.assert_allclose(swept.natural_frequencies[:, 0], np.sqrt(2), rtol=1e-12)
    np.testing.assert_allclose(swept.damping_ratios[:, 0], np.linspace(0, 6, 13) / (2 * np.sqrt(2)), rtol=1e-9)
    assert swept.regimes[0][0] == "undamped"
    assert swept.regimes[-1][0] == "overdamped"


def test_crossing_frequencies_cross() -> None:
    """Two oscillators that do not touch: damping one moves its root through the other's frequency, not into it."""
    system = System.from_matrices(np.eye(2), np.zeros((2, 2)), np.diag([4.0, 3.0])).with_values(
        damper_columns=np.eye(2, 1),
        damping=np.ones(1),
        damper_names=("pot",),
        damper_spring=np.array([-1]),
        damper_grounded=np.array([True]),
    )
    swept = mdof.sweep(system, "pot", np.linspace(0.1, 3.5, 18))
    damped = np.abs(swept.eigenvalues.imag)
    quiet = int(np.argmin(np.ptp(damped, axis=0)))
    np.testing.assert_allclose(damped[:, quiet], np.sqrt(3), rtol=1e-12)
    values = np.linspace(0.1, 3.5, 18)
    np.testing.assert_allclose(damped[:, 1 - quiet], np.sqrt(4 - values**2 / 4), rtol=1e-10)
    assert np.all(swept.confidence > 0.99)


def test_fine_and_coarse_values_lead_along_the_same_branches() -> None:
    """Where every step is sure, a branch does not depend on how many values lie between its ends."""
    ends = []
    for count in (60, 237):
        swept = mdof.sweep(row(70, {20: 1.0}), "pot 0", np.geomspace(1e-2, 1.0, count))
        assert any("secular form" in method for method in swept.methods)
        assert swept.confidence.min() > 0.8
        ends.append(swept.eigenvalues[[0, -1]])
    np.testing.assert_allclose(ends[0], ends[1], rtol=1e-9)


@pytest.mark.parametrize(
    ("damper", "values", "words"),
    [
        ("pod", [1.0], "pot 0"),
        ("pot 0", [], "one or more"),
        ("pot 0", [-1.0], "at least 0"),
        ("pot 0", [np.inf], "finite"),
    ],
)
def test_wrong_sweeps_are_refused(damper: str, values: list[float], words: str) -> None:
    with pytest.raises(UsageError, match=words):
        mdof.sweep(row(2, {0: 1.0}), damper, values)
