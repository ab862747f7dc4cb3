"""Chains of equal masses against closed forms, and proportional damping fitted to them."""

from __future__ import annotations

import numpy as np
import pytest
from published import chain, read, solve

import mdof

CASES = read("chains.yaml")


def test_every_case_is_used() -> None:
    assert {f"test_{name}" for name in CASES} <= set(globals())


def beaded(inputs: dict, damping: dict | None = None) -> mdof.System:
    """N masses between two walls."""
    count = inputs["N"]
    return chain([inputs["m"]] * count, [inputs["k"]] * (count + 1), damping=damping)


def test_beaded_string() -> None:
    case = CASES["beaded_string"]
    modes = mdof.solve(beaded(case.inputs))
    case.check(w=modes.natural_frequencies, closed_form=modes.natural_frequencies)


@pytest.mark.parametrize("name", ["two_ratios_first_and_last", "two_ratios_first_and_second"])
def test_two_ratios(name: str) -> None:
    case = CASES[name]
    w = mdof.solve(beaded(case.inputs)).natural_frequencies
    targets = [(w[number - 1], case.inputs["zeta"]) for number in case.inputs["modes"]]
    system = beaded(case.inputs, {"two_ratios": targets})
    modes = mdof.solve(system)
    assert "non-proportional-damping" not in {finding.code for finding in modes.findings}
    C = system.C.toarray()
    case.check(
        rel=1e-11,
        beta_M=system.mass_proportional,
        beta_K=system.stiffness_proportional,
        c_diag=C[0, 0],
        c_off=C[0, 1],
        zeta_pct=100 * modes.damping_ratios,
    )


test_two_ratios_first_and_last = test_two_ratios_first_and_second = test_two_ratios


def caughey(case) -> tuple[np.ndarray, mdof.DampedModes]:
    """Factors of the series C = M sum_b beta_b (M^-1 K)^b fitted at the wanted modes, and the modes that result."""
    bare = beaded(case.inputs)
    M, K = bare.M.toarray(), bare.K.toarray()
    w = mdof.solve(bare).natural_frequencies[np.array(case.inputs["modes"]) - 1]
    powers = case.inputs["powers"]
    beta = np.linalg.solve(
        np.array([[0.5 * value ** (2 * b - 1) for b in powers] for value in w]), np.full(3, case.inputs["zeta"])
    )
    A = np.linalg.solve(M, K)
    C = M @ sum(factor * np.linalg.matrix_power(A, b) for factor, b in zip(beta, powers, strict=True))
    return beta, solve(M, (C + C.T) / 2, K)


def test_caughey_three_powers() -> None:
    case = CASES["caughey_three_powers"]
    beta, modes = caughey(case)
    case.check(rel=1e-10, beta=beta, zeta_pct=100 * modes.damping_ratios)
    assert set(modes.regimes) == {mdof.Regime.UNDERDAMPED}


def test_caughey_unstable() -> None:
    """The same series fitted elsewhere feeds the first mode; the answer must be called unstable, not averaged away."""
    case = CASES["caughey_unstable"]
    beta, modes = caughey(case)
    case.check(rel=1e-10, beta=beta, zeta_pct=100 * modes.damping_ratios)
    assert modes.regimes == (mdof.Regime.UNSTABLE, *[mdof.Regime.UNDERDAMPED] * 4)
    assert "unstable-mode" in {finding.code for finding in modes.findings}


def test_two_ratios_from_listed_frequencies() -> None:
    case = CASES["two_ratios_from_listed_frequencies"]
    w, zeta = case.inputs["w"], case.inputs["zeta"]
    M, K = np.eye(3), np.diag(np.square(w))
    fitted = chain([1.0], [1.0], damping={"two_ratios": [(w[number - 1], zeta) for number in case.inputs["modes"]]})
    a0, a1 = fitted.mass_proportional, fitted.stiffness_proportional
    modes = solve(M, a0 * M + a1 * K, K)
    case.check(rel=1e-11, a0=a0, a1=a1, zeta2=modes[1].damping_ratio)


def test_fixed_free_chain_of_three() -> None:
    case = CASES["fixed_free_chain_of_three"]
    modes = mdof.solve(chain([case.inputs["m"]] * 3, [case.inputs["k"]] * 3))
    case.check(w=modes.natural_frequencies)
    # Of the remembered digits only the third is off.
    np.testing.assert_allclose(modes.natural_frequencies[:2], case.published["w"][:2], atol=case.tolerance["w"]["abs"])


def test_closed_forms() -> None:
    """Three kinds of ends, with and without proportional damping: every frequency and ratio by formula."""
    case = CASES["closed_forms"]
    N, k, m, alpha, beta = (case.inputs[key] for key in ("N", "k", "m", "alpha", "beta"))
    j = np.arange(1, N + 1)
    ends = {
        "fixed-fixed": ([k] * (N + 1), 2 * np.sqrt(k / m) * np.sin(j * np.pi / (2 * (N + 1)))),
        "fixed-free": ([k] * N, 2 * np.sqrt(k / m) * np.sin((2 * j - 1) * np.pi / (2 * (2 * N + 1)))),
        "free-free": ([0.0] + [k] * (N - 1), 2 * np.sqrt(k / m) * np.sin((j - 1) * np.pi / (2 * N))),
    }
    worst = 0.0
    for springs, w in ends.values():
        for damping in ({}, {"mass_proportional": alpha, "stiffness_proportional": beta}):
            modes = mdof.solve(chain([m] * N, springs, damping=damping))
            elastic = w > 0
            free = [mode for mode in modes if mode.regime is mdof.Regime.RIGID_BODY]
            assert len(free) == int(np.sum(~elastic))
            rest = [mode for mode in modes if mode.regime is not mdof.Regime.RIGID_BODY]
            worst = max(
                worst, *(abs(mode.natural_frequency / value - 1) for mode, value in zip(rest, w[elastic], strict=True))
            )
            if damping:
                ratio = alpha / (2 * w[elastic]) + beta * w[elastic] / 2
                worst = max(
                    worst, *(abs(mode.damping_ratio / value - 1) for mode, value in zip(rest, ratio, strict=True))
                )
                # Against resting surroundings even the free motion dies away: at the mass-proportional rate.
                assert all(abs(min(mode.eigenvalues, key=lambda root: root.real) + alpha) < 1e-12 for mode in free)
            else:
                assert {mode.regime for mode in rest} == {mdof.Regime.UNDAMPED}
    assert worst < 1e-12
    case.check(atol=1e-12, max_rel_diff=worst)
