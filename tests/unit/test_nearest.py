"""mdof.modes.nearest and mdof.eigen.partial: some modes of a large sparse system."""

from __future__ import annotations

import numpy as np
import pytest
import scipy.sparse as sparse

import mdof
from mdof import Regime, System, UsageError


def grid(side: int, dampers: int, damping: float, seed: int = 0) -> System:
    """A plane grid of masses held at its edge, stiffness as a sparse matrix, dampers to ground as factors."""
    rng = np.random.default_rng(seed)
    one = sparse.eye_array(side)
    row = 2 * one - sparse.eye_array(side, k=1) - sparse.eye_array(side, k=-1)
    n = side * side
    K = (sparse.kron(row, one) + sparse.kron(one, row)).tocsc() * 100
    system = System.from_matrices(sparse.diags_array(rng.uniform(0.5, 2, n)), sparse.csc_array((n, n)), K)
    place = rng.choice(n, dampers, replace=False)
    columns = sparse.csc_array((np.ones(dampers), (place, np.arange(dampers))), shape=(n, dampers))
    return system.with_values(
        damper_columns=columns,
        damping=np.full(dampers, damping),
        damper_names=tuple(f"pot {index}" for index in range(dampers)),
        damper_spring=np.full(dampers, -1),
        damper_grounded=np.ones(dampers, dtype=bool),
    )


@pytest.mark.parametrize("near", [0.0, 9.0])
@pytest.mark.parametrize("damping", [0.01, 1.0, 30.0])
def test_some_modes_are_those_of_the_whole(damping: float, near: float) -> None:
    system = grid(12, 3, damping)
    some, whole = mdof.solve(system, count=8, near=near, method="partial"), mdof.solve(system)
    oscillating = [mode for mode in whole if mode.regime is not Regime.OVERDAMPED or near == 0]
    wanted = sorted(oscillating, key=lambda mode: abs(abs(mode.eigenvalues[0]) - near))
    for mode in some:
        value = mode.eigenvalues[0]
        nearest = min(wanted, key=lambda other: abs(other.eigenvalues[0] - value))
        assert mode.frequency_bound is not None
        assert abs(nearest.eigenvalues[0] - value) <= (mode.frequency_bound + 1e-11) * abs(value)
        # The same shape, up to the sign that ties leave open.
        like = abs(np.vdot(mode.shape, nearest.shape))
        assert like == pytest.approx(np.linalg.norm(mode.shape) * np.linalg.norm(nearest.shape), rel=1e-5)
    assert len(some) == 8
    assert some.verification.largest_frequency_bound < 1e-8
    assert "partial-spectrum" in {finding.code for finding in some.findings}


def test_damping_of_every_element_is_no_obstacle() -> None:
    system = grid(14, 2, 0.5).with_values(mass_proportional=0.02, stiffness_proportional=1e-3)
    some, whole = mdof.solve(system, count=6, method="partial"), mdof.solve(system)
    np.testing.assert_allclose(some.natural_frequencies, whole.natural_frequencies[:6], rtol=1e-10)
    np.testing.assert_allclose(some.damping_ratios, whole.damping_ratios[:6], rtol=1e-7)


def test_a_large_sparse_system_is_solved_in_part_by_itself() -> None:
    modes = mdof.solve(grid(45, 4, 0.2), count=5)
    assert modes.method.startswith("some modes")
    assert len(modes) == 5
    assert modes.natural_frequencies[0] == pytest.approx(np.pi / 46 * np.sqrt(2 * 100 / 1.25), rel=0.05)


def test_progress_is_reported() -> None:
    seen: list[tuple[int, int]] = []
    mdof.solve(grid(14, 2, 0.1), count=4, method="partial", progress=lambda done, of: seen.append((done, of)))
    assert seen[-1][0] == seen[-1][1]


@pytest.mark.parametrize(
    ("change", "words"),
    [
        ({"gyroscopic": sparse.csc_array(np.array([[0, 1.0], [-1.0, 0]]))}, "not symmetric"),
        ({"damping": np.array([-1.0])}, "negative"),
    ],
)
def test_what_cannot_be_solved_in_part_says_why(change: dict[str, object], words: str) -> None:
    system = System.from_matrices(np.eye(2), np.zeros((2, 2)), np.eye(2)).with_values(
        damper_columns=np.eye(2, 1),
        damping=np.ones(1),
        damper_names=("d",),
        damper_spring=np.array([-1]),
        damper_grounded=np.array([True]),
    )
    with pytest.raises(UsageError, match=words):
        mdof.solve(system.with_values(**change), count=1, method="partial")


def test_the_number_of_modes_must_be_given() -> None:
    with pytest.raises(UsageError, match="count"):
        mdof.solve(grid(5, 1, 0.1), method="partial")


def test_a_free_system_is_refused_with_advice() -> None:
    K = 2 * np.eye(60) - np.eye(60, k=1) - np.eye(60, k=-1)
    K[0, 0] = K[-1, -1] = 1
    with pytest.raises(mdof.UnverifiedError, match=r"moves freely|settle|only known"):
        mdof.solve(System.from_matrices(np.eye(60), np.zeros((60, 60)), K), count=3, method="partial")


def test_the_partner_of_a_fast_root_is_found_and_the_mode_takes_its_own_place() -> None:
    """A chain under heavy drag: a fast root near the frequency asked for belongs to a far slower mode."""
    n = 400
    columns = np.eye(n) - np.eye(n, k=1)
    chain = mdof.System.from_factors(np.eye(n), columns, np.full(n, 1e4)).with_values(mass_proportional=5.0)
    whole, part = mdof.solve(chain), mdof.solve(chain, count=6, near=3.0, method="partial")
    nearest = np.sort(np.argsort(np.abs(whole.natural_frequencies - 3.0), kind="stable")[:6])
    assert part.natural_frequencies == pytest.approx(whole.natural_frequencies[nearest], rel=1e-8)
    assert part.damping_ratios == pytest.approx(whole.damping_ratios[nearest], rel=1e-8)
    assert "partner-unresolved" not in {finding.code for finding in part.findings}
