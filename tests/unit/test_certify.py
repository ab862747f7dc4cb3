"""mdof.certify: wrong numbers are contradicted, unknown ones stay undecided, and nobody else pays for python-flint."""

from __future__ import annotations

import dataclasses
import subprocess
import sys

import numpy as np
import pytest

import mdof
from mdof import System, UsageError
from mdof.certify import Verdict, certify
from mdof.report.look import Look
from mdof.report.proof_record import proof_record
from mdof.report.proof_table import proof_reasons, proof_table


def chain() -> mdof.DampedModes:
    """Two masses in a row, a damper on the first: two oscillating modes."""
    springs = np.array([[1.0, 1.0], [0.0, -1.0]])
    return mdof.solve(System.from_factors(np.diag([2.0, 1.0]), springs, [100.0, 60.0], [[1.0], [0.0]], [1.5]))


def changed(modes: mdof.DampedModes, name: str, factor: float) -> mdof.DampedModes:
    values = getattr(modes, name).copy()
    values[1] *= factor
    return dataclasses.replace(modes, **{name: values})


def test_every_mode_of_an_honest_answer_is_proven() -> None:
    certificate = certify(chain())
    assert certificate.summary == "2 of 2 modes proven at 128 bits"
    assert not certificate.contradicted
    assert certificate.eigenvalues_exact == certificate.eigenvalues_stated == 4
    assert proof_reasons(certificate, Look()) == ""


@pytest.mark.parametrize(
    ("name", "factor", "words"),
    [
        ("natural_frequencies", 1 + 1e-12, "natural frequency"),
        ("damping_ratios", 1 + 1e-11, "damping ratio"),
        ("decay_rates", 1 + 1e-9, "decay rate"),
        ("eigenvalues", 1 - 1e-12, "eigenvalue"),
        ("frequency_bounds", 1e-4, "natural frequency"),
    ],
)
def test_a_number_outside_its_bound_is_contradicted(name: str, factor: float, words: str) -> None:
    certificate = certify(changed(chain(), name, factor))
    assert [proof.verdict for proof in certificate.modes] == [Verdict.PROVEN, Verdict.CONTRADICTED]
    assert certificate.contradicted
    assert words in certificate.modes[1].reason
    assert certificate.summary == "1 of 2 modes proven at 128 bits, 1 contradicted"


@pytest.mark.parametrize("regime", [regime for regime in mdof.Regime if regime is not mdof.Regime.UNDERDAMPED])
def test_a_wrong_regime_is_contradicted(regime: mdof.Regime) -> None:
    modes = chain()
    certificate = certify(dataclasses.replace(modes, regimes=(regime, modes.regimes[1])))
    assert certificate.modes[0].verdict is Verdict.CONTRADICTED
    assert f"not {'free' if regime is mdof.Regime.RIGID_BODY else regime}" in certificate.modes[0].reason


def test_a_missing_mode_is_noticed() -> None:
    """A mode stated twice in place of another: its root is taken by the first, so that the second is wrong."""
    modes = chain()
    twice = {
        name: np.asarray(getattr(modes, name))[[0, 0]]
        for name in ("eigenvalues", "natural_frequencies", "damping_ratios", "decay_rates")
    }
    certificate = certify(dataclasses.replace(modes, **twice))
    assert certificate.number(Verdict.CONTRADICTED) == 1


def test_eigenvalues_that_the_factors_do_not_have_are_miscounted() -> None:
    """Modes of two masses stated of a system with one more."""
    modes = chain()
    springs = np.array([[1.0, 1.0, 0.0], [0.0, -1.0, 1.0], [0.0, 0.0, -1.0]])
    larger = System.from_factors(np.diag([2.0, 1.0, 1e-9]), springs, [100.0, 60.0, 1e9], [[1.0], [0.0], [0.0]], [1.5])
    certificate = certify(dataclasses.replace(modes, system=larger))
    assert certificate.miscounted
    assert certificate.contradicted
    assert "4 eigenvalues stated, the exact factors have 6" in certificate.summary


def test_some_modes_of_many_are_proven_without_a_count() -> None:
    n = 40
    springs = np.eye(n) - np.eye(n, k=1)
    system = System.from_factors(np.eye(n), springs, np.full(n, 1e4), springs[:, :1], [20.0])
    for method in ("dense", "partial"):
        certificate = certify(mdof.solve(system, count=3, method=method))
        assert certificate.number(Verdict.PROVEN) == 3
        assert not certificate.contradicted


def test_a_precision_too_low_leaves_modes_undecided() -> None:
    """Frequencies 1e-13 apart, coupled by a damper, need more than 64 bits."""
    system = System.from_factors(np.eye(2), np.eye(2), [1.0, 1 + 1e-13], np.array([[1.0], [1.0]]), [1e-14])
    modes = mdof.solve(system)
    low = certify(modes, first_bits=64, most_bits=64)
    assert not low.contradicted
    assert certify(modes).number(Verdict.PROVEN) == 2


def test_bits_must_make_sense() -> None:
    with pytest.raises(UsageError, match="64 or more"):
        certify(chain(), first_bits=10)
    with pytest.raises(UsageError, match="rising order"):
        certify(chain(), first_bits=256, most_bits=128)


def test_without_python_flint_the_error_says_what_to_install(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("mdof.certify.find_spec", lambda _: None)
    with pytest.raises(UsageError, match=r"pip install python-flint"):
        certify(chain())


def test_neither_solving_nor_the_result_types_load_python_flint() -> None:
    code = (
        "import sys, mdof, mdof.modes.analysis, mdof.certify, mdof.report.proof_table; sys.exit('flint' in sys.modules)"
    )
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0


def test_the_table_shows_proven_digits_and_what_is_wrong() -> None:
    certificate = certify(changed(chain(), "damping_ratios", 1.01))
    lines = proof_table(certificate, Look()).splitlines()
    assert lines[0].split() == ["no.", "Hz,", "proven", "digits", "ratio,", "%", "regime", "verdict"]
    first = certificate.modes[0]
    assert first.frequency_digits is not None
    low, high = first.natural_frequency or (0.0, 0.0)
    assert low <= float(first.frequency_digits) * 2 * np.pi * (1 + 1e-11)
    assert high >= float(first.frequency_digits) * 2 * np.pi * (1 - 1e-11)
    assert lines[1].split() == ["1", first.frequency_digits, first.ratio_digits, "underdamped", "proven"]
    assert lines[2].endswith("contradicted")
    assert lines[3] == "1 of 2 modes proven at 128 bits, 1 contradicted"
    assert "mode 2 contradicted" in proof_reasons(certificate, Look())
    for width in (40, 60, 80):
        assert all(len(line) <= width for line in proof_table(certificate, Look(width=width)).splitlines())


def test_the_record_holds_intervals_around_the_stated_numbers() -> None:
    modes = chain()
    record = proof_record(certify(modes))
    assert record["proven"] == 2
    for entry, mode in zip(record["modes"], modes, strict=True):
        assert entry["verdict"] == "proven"
        low, high = entry["natural_frequency_hz"]
        assert mode.natural_frequency is not None
        assert low == pytest.approx(mode.natural_frequency / (2 * np.pi), rel=1e-14)
        assert low <= high <= low * (1 + 2e-15)
