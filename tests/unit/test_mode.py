"""mdof.modes.mode: what a solve hands back."""

from __future__ import annotations

import copy
import dataclasses
import pickle

import numpy as np
import pytest

import mdof


@pytest.fixture(scope="module")
def modes() -> mdof.DampedModes:
    K = np.array([[3.0, -1.0, 0.0], [-1.0, 2.0, 0.0], [0.0, 0.0, 1.0]])
    return mdof.solve(mdof.System.from_matrices(np.eye(3), np.diag([0.1, 0.0, 5.0]), K))


def test_modes_are_a_sequence(modes: mdof.DampedModes) -> None:
    assert len(modes) == 3
    assert [mode.number for mode in modes] == [1, 2, 3]
    assert modes[-1] is modes[2]
    assert modes[1:] == (modes[1], modes[2])
    with pytest.raises(IndexError):
        modes[3]


def test_undefined_numbers_are_none_and_never_nan(modes: mdof.DampedModes) -> None:
    (overdamped,) = [mode for mode in modes if mode.regime == "overdamped"]
    assert overdamped.damped_frequency is None
    assert overdamped.fast_shape is not None
    for mode in modes:
        if mode is not overdamped:
            assert mode.fast_shape is None
            assert mode.damped_frequency == abs(mode.eigenvalues[0].imag)


def test_damped_frequency_and_ratio_belong_together(modes: mdof.DampedModes) -> None:
    mode = modes[0] if modes[0].damped_frequency else modes[1]
    assert mode.natural_frequency is not None
    assert mode.damping_ratio is not None
    wanted = mode.natural_frequency * np.sqrt(1 - mode.damping_ratio**2)
    assert mode.damped_frequency == pytest.approx(wanted, rel=1e-12)


def test_results_copy_and_pickle_with_their_energies(modes: mdof.DampedModes) -> None:
    for again in (pickle.loads(pickle.dumps(modes)), copy.deepcopy(modes)):
        assert again.natural_frequencies == pytest.approx(modes.natural_frequencies)
        assert again[0].energy.dissipated == modes[0].energy.dissipated
    assert pickle.loads(pickle.dumps(modes[0])).energy.dissipated == modes[0].energy.dissipated


def test_the_text_of_a_result_is_short(modes: mdof.DampedModes) -> None:
    assert repr(modes).startswith("DampedModes(3 modes, verified, ")
    assert len(repr(modes[0])) < 2000


def test_results_are_frozen(modes: mdof.DampedModes) -> None:
    for thing, name in ((modes, "method"), (modes[0], "number"), (modes.verification, "status")):
        with pytest.raises(dataclasses.FrozenInstanceError):
            setattr(thing, name, "other")


def test_a_mode_holds_the_numbers_of_its_own_column(modes: mdof.DampedModes) -> None:
    for index, mode in enumerate(modes):
        assert mode.regime is modes.regimes[index]
        assert mode.decay_rate == modes.decay_rates[index]
        assert mode.backward_error == modes.backward_errors[index]
        assert mode.shape.tolist() == modes.shapes[:, index].tolist()
        assert mode.reduced_shape.tolist() == modes.reduced_shapes[:, index].tolist()
        assert mode.energy is modes.energies[index]
        assert mode.frequency_bound == modes.frequency_bounds[index]
        assert mode.damping_ratio_bound == modes.damping_ratio_bounds[index]
        assert mode.undamped_frequency == modes.undamped_frequencies[index]
        assert mode.shortcut_damping_ratio == modes.shortcut_damping_ratios[index]
        assert mode.damping_reference is None


def test_a_mode_knows_its_time_to_two_percent(modes: mdof.DampedModes) -> None:
    for mode in modes:
        if mode.damped_frequency:
            assert mode.time_to_two_percent == pytest.approx(np.log(50) / mode.decay_rate)


def test_a_single_root_has_no_partner_in_the_mode_and_nan_in_the_array() -> None:
    M, C = np.diag([1.0, 0.0]), np.diag([0.1, 2.0])
    modes = mdof.solve(mdof.System.from_matrices(M, C, np.diag([1.0, 6.0])))
    (single,) = (mode for mode in modes if mode.regime == "relaxation")
    assert single.eigenvalues == pytest.approx((-3.0,), rel=1e-14)
    assert np.isnan(modes.eigenvalues[single.number - 1, 1])
    assert single.damped_frequency is single.natural_frequency is single.damping_ratio is single.fast_shape is None
