"""One oscillator against textbook examples: constants, critical damping, damping measures, units."""

from __future__ import annotations

import math

import numpy as np
import pytest
from published import oscillator, read

import mdof

CASES = read("one_oscillator.yaml")


def test_every_case_is_used() -> None:
    assert {f"test_{name}" for name in CASES} <= set(globals())


def one(mass: object, stiffness: object, damping: object = None, **more: object) -> mdof.Mode:
    """One body on one mount, given as an engineer writes it in a file."""
    mount = {"between": ["m", "ground"], "stiffness": stiffness, **({} if damping is None else {"damping": damping})}
    model = mdof.Model(title="one", bodies={"m": mass}, connections={"mount": {**mount, **more}})
    modes = mdof.solve(mdof.assemble(model))
    assert modes.verification.status == "verified"
    return modes[0]


def critical_damping(mode: mdof.Mode, damping: float) -> float:
    return damping / mode.damping_ratio


def test_small_spring_and_bolt() -> None:
    case = CASES["small_spring_and_bolt"]
    m, k, c, x0 = (case.inputs[key] for key in ("m", "k", "c", "x0"))
    mode = one(f"{m} kg", f"{k} N/m", f"{c} N*s/m")
    w = mode.natural_frequency
    case.check(
        f_hz=w / (2 * math.pi),
        period_s=2 * math.pi / w,
        c_crit=critical_damping(mode, c),
        zeta=mode.damping_ratio,
        v_max=x0 * w,
        a_max=x0 * w**2,
    )


def test_motorcycle_shock_absorber() -> None:
    """From the wanted decay to k and c, and back through the solver."""
    case = CASES["motorcycle_shock_absorber"]
    m, period = case.inputs["m"], case.inputs["Td"]
    delta = 2 * math.log(case.inputs["half_cycle_ratio"])
    zeta = delta / math.hypot(2 * math.pi, delta)
    w = 2 * math.pi / period / math.sqrt(1 - zeta**2)
    k, c = m * w**2, 2 * zeta * m * w
    mode = one(f"{m!r} kg", f"{k!r} N/m", f"{c!r} N*s/m")
    decrement = 2 * math.pi * mode.decay_rate / mode.damped_frequency
    case.check(
        delta=decrement,
        zeta=mode.damping_ratio,
        omega_n=mode.natural_frequency,
        c_crit=critical_damping(mode, c),
        c=c,
        k=k,
    )
    assert 2 * math.pi / mode.damped_frequency == pytest.approx(period, rel=1e-12)


def test_cannon_recoil() -> None:
    case = CASES["cannon_recoil"]
    m, k = case.inputs["m"], case.inputs["k"]
    swinging = one(f"{m} kg", f"{k} N/m", "1000 N*s/m")
    c_crit = critical_damping(swinging, 1000.0)
    case.check(c_crit=c_crit)
    mode = one(f"{m} kg", f"{k} N/m", f"{2 * math.sqrt(m * k)!r} N*s/m")
    assert mode.regime is mdof.Regime.CRITICALLY_DAMPED
    assert one(f"{m} kg", f"{k} N/m", f"{c_crit * (1 + 1e-6)!r} N*s/m").regime is mdof.Regime.OVERDAMPED
    assert one(f"{m} kg", f"{k} N/m", f"{c_crit * (1 - 1e-6)!r} N*s/m").regime is mdof.Regime.UNDERDAMPED


def test_elevated_water_tank() -> None:
    """Kip, inch and second, with the source's own gravity: any consistent units do in matrices."""
    case = CASES["elevated_water_tank"]
    data = case.inputs
    zeta = math.log(data["u0_in"] / data["u4_in"]) / (2 * math.pi * data["cycles"])
    w = 2 * math.pi * data["cycles"] / data["time_s"]
    k = data["force_kip"] / data["u0_in"]
    mode = oscillator(k / w**2, 2 * zeta * k / w, k)
    case.check(
        zeta=mode.damping_ratio,
        Td=2 * math.pi / mode.natural_frequency,
        k=k,
        omega_n=mode.natural_frequency,
        weight_kip=data["g_in"] * k / mode.natural_frequency**2,
        c=2 * mode.damping_ratio * k / mode.natural_frequency,
    )


def test_weight_on_a_spring_us_units() -> None:
    case = CASES["weight_on_a_spring_us_units"]
    weight, k, c, g = (case.inputs[key] for key in ("weight", "k", "c", "g_in"))
    mode = oscillator(weight / g, c, k)
    decrement = 2 * math.pi * mode.decay_rate / mode.damped_frequency
    case.check(
        omega_n=mode.natural_frequency,
        c_crit=critical_damping(mode, c),
        zeta=mode.damping_ratio,
        delta=decrement,
        ratio=math.exp(decrement),
    )
    # The same through the units of a model file, with standard gravity (386.0886 in/s2) instead of the source's 386.
    typed = one({"weight": f"{weight} lbf"}, f"{k} lbf/in", f"{c} lbf*s/in")
    standard = 9.80665 / 0.0254
    assert typed.natural_frequency == pytest.approx(mode.natural_frequency * math.sqrt(standard / g), rel=1e-12)
    assert typed.damping_ratio == pytest.approx(mode.damping_ratio * math.sqrt(standard / g), rel=1e-12)
    assert abs(typed.natural_frequency - case.published["omega_n"]) <= case.tolerance["omega_n"]["abs"]


def test_damping_measures() -> None:
    """A loss factor of 2 zeta at a mode's own frequency gives it the ratio zeta; every other measure follows."""
    case = CASES["damping_measures"]
    zeta = case.inputs["zeta"]
    mode = one("2 kg", "800 N/m", loss_factor=2 * zeta)
    assert mode.damping_ratio == pytest.approx(zeta, rel=1e-12)
    decrement = 2 * math.pi * mode.decay_rate / mode.damped_frequency
    case.check(
        Q=1 / (2 * mode.damping_ratio),
        loss_factor=2 * mode.damping_ratio,
        delta=decrement,
        energy_loss_per_cycle_pct=100 * (1 - math.exp(-2 * decrement)),
        dB_per_cycle=20 * decrement / math.log(10),
    )


def test_static_deflection_rule() -> None:
    """A weight that presses its spring together by so many millimetres, whatever the weight."""
    case = CASES["static_deflection_rule"]

    def spring(stiffness: str, weight: str) -> float:
        return one({"weight": weight}, stiffness).natural_frequency / (2 * math.pi)

    case.check(
        constant_mm=spring("5 kN/mm", "5 kN"),
        constant_in=spring("240 lbf/in", "240 lbf"),
        constant_rpm_in=60 * spring("240 lbf/in", "240 lbf"),
        f=[spring(f"{5 / deflection!r} kN/mm", "5 kN") for deflection in case.inputs["deltas_mm"]],
    )


def test_instrument_on_rubber_pads() -> None:
    case = CASES["instrument_on_rubber_pads"]
    weight, k, g = (case.inputs[key] for key in ("weight", "k", "g_in"))
    case.check(fn=oscillator(weight / g, 0.0, k).natural_frequency / (2 * math.pi))
    typed = one({"weight": f"{weight} lbf"}, f"{k} lbf/in")
    assert typed.natural_frequency / (2 * math.pi) == pytest.approx(
        case.published["fn"], abs=case.tolerance["fn"]["abs"]
    )


def test_response_function_names() -> None:
    case = CASES["response_function_names"]
    mode = one(f"{case.inputs['m']} kg", f"{case.inputs['k']} N/m", f"{case.inputs['c']} N*s/m")
    case.check(zeta=mode.damping_ratio)
    assert np.isclose(mode.natural_frequency, 20.0, rtol=1e-14)
