"""The accuracy campaign in short: every family of awkward systems against exact arithmetic."""

from __future__ import annotations

import dataclasses
import sys
from pathlib import Path

import numpy as np
import pytest

import mdof

pytest.importorskip("flint", reason="python-flint is not installed: pip install python-flint")
sys.path.insert(0, str(Path(__file__).parents[2] / "scripts"))
import bench_accuracy
from accuracy_cases import FAMILIES


@pytest.mark.parametrize("family", FAMILIES)
def test_no_number_is_silently_wrong(family: str) -> None:
    (tally,) = bench_accuracy.run(12, seed=7, families=[family]).values()
    assert tally.silent == []
    assert tally.unlike == 0
    assert tally.easy_refused == 0


def test_the_campaign_notices_a_wrong_ratio_and_a_missing_root() -> None:
    system = FAMILIES["ordinary"](np.random.default_rng(3))
    modes = mdof.solve(system)
    truth = bench_accuracy.exact_roots(system)
    assert bench_accuracy.judged(modes, truth)[0] == []
    wrong = dataclasses.replace(modes, damping_ratios=modes.damping_ratios + 1e-9)
    assert "ratio off by 1.00e-09" in bench_accuracy.judged(wrong, truth)[0][0]
    assert "roots where there are" in bench_accuracy.judged(modes, truth[:-1])[0][0]
