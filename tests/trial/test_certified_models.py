"""The large demo models against certified eigenvalues: intervals that surely hold the roots of the very same factors.

Needs python-flint (the extra ``certify``); ball arithmetic after Johansson F., Arb, IEEE Transactions on Computers 66
(2017). The matrices are multiplied out from the factors inside it, so that rounded sums cannot hide an error.
"""

from __future__ import annotations

from pathlib import Path

import mpmath as mp
import numpy as np
import pytest

import mdof

flint = pytest.importorskip("flint", reason="python-flint is not installed: pip install python-flint")
MODELS = Path(__file__).parents[2] / "models"
DIGITS = 40


def certified_roots(system: mdof.System) -> list[mp.mpc]:
    """All eigenvalues as midpoints of enclosures that do not overlap, narrower than the digits they are taken to."""
    old, flint.ctx.prec = flint.ctx.prec, 400
    try:
        n = system.size

        def exact(values: np.ndarray) -> flint.arb_mat:
            return flint.arb_mat(*values.shape, [flint.arb(float(value)) for value in values.ravel()])

        def gram(columns: np.ndarray, weights: list[flint.arb]) -> flint.arb_mat:
            B = exact(columns)
            scaled = flint.arb_mat(
                *columns.shape, [B[i, j] * weights[j] for i in range(len(columns)) for j in range(len(weights))]
            )
            return scaled * B.transpose()

        springs, dampers = system.spring_columns.toarray(), system.damper_columns.toarray()
        K = gram(springs, [flint.arb(float(k)) for k in system.stiffness])
        C = gram(dampers, [flint.arb(float(c)) for c in system.damping])
        lossy = zip(system.loss_factor, system.stiffness, system.loss_reference, strict=True)
        C = C + gram(
            springs,
            [
                flint.arb(float(e)) * flint.arb(float(k)) / flint.arb(float(w)) if e else flint.arb(0)
                for e, k, w in lossy
            ],
        )
        inverse = exact(system.M.toarray()).inv()
        below, beside, time = inverse * K, inverse * C, flint.arb(128)
        state = flint.acb_mat(2 * n, 2 * n)
        for i in range(n):
            state[i, n + i] = 1
            for j in range(n):
                state[n + i, j] = -flint.acb(below[i, j]) / time**2
                state[n + i, n + j] = -flint.acb(beside[i, j]) / time
        enclosures = [value * time for value in state.eig()]  # raises where two cannot be told apart
        assert max(max(value.real.rad(), value.imag.rad()) for value in enclosures) < flint.arb("1e-30")
        parts = [
            (value.real.mid().str(DIGITS, radius=False), value.imag.mid().str(DIGITS, radius=False))
            for value in enclosures
        ]
        with mp.workdps(DIGITS):
            return [mp.mpc(real, imaginary) for real, imaginary in parts]
    finally:
        flint.ctx.prec = old


@pytest.mark.parametrize(
    ("file", "state"),
    [("firewater_skid.yaml", None), ("firewater_skid.yaml", "tie_rods_tight"), ("floor_fan.yaml", None)],
)
def test_every_mode_is_inside_its_stated_bounds(file: str, state: str | None) -> None:
    system = mdof.assemble(mdof.load(MODELS / file, state))
    modes = mdof.solve(system)
    left = certified_roots(system)
    assert len(left) == 2 * system.size
    slack = []
    with mp.workdps(DIGITS):
        for mode in modes:
            mates = []
            for value in mode.eigenvalues:
                mate = min(left, key=lambda root: abs(root - mp.mpc(value)))
                left.remove(mate)
                mates.append(mate)
            frequency = mp.sqrt(abs(mates[0] * mates[1]))
            error = abs(mp.mpf(mode.natural_frequency) / frequency - 1)
            assert error <= mode.frequency_bound
            assert (
                abs(mp.mpf(mode.damping_ratio) + mp.re(mates[0] + mates[1]) / (2 * frequency))
                <= mode.damping_ratio_bound
            )
            slack.append(float(mode.frequency_bound / max(error, mp.mpf(2) ** -52)))
    assert not left
    assert np.median(slack) < 100, "the bounds say too little"
