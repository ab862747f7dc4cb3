"""Units at the edge: pint is the judge, twins are equal to the last bit, and look-alikes are told apart."""

from __future__ import annotations

import math
import subprocess
import sys
from fractions import Fraction

import pytest

from mdof import unit_parsing, unit_tables
from mdof.units import DIMENSIONS, QuantityError, convert, factor, read


@pytest.mark.parametrize("unit", sorted(set(unit_tables.COMMON) - {"1"}))
def test_the_table_of_common_units_agrees_with_pint(unit: str) -> None:
    """Breaks if a factor of the shortcut table differs from what pint says, by any amount."""
    assert unit_parsing._ask_pint(tuple(sorted(unit_parsing._parse(unit, unit).items()))) == factor(unit)


def test_the_short_registry_agrees_with_the_registry_pint_ships() -> None:
    """Breaks if one of our own definitions is wrong: every name both know must be worth the same."""
    import pint

    full = pint.UnitRegistry(cache_folder=None)
    same = {
        "in": "inch",
        "t": "metric_ton",
        "us": "microsecond",
        "um": "micrometer",
        "h": "hour",
        "mil": "thou",
        "kgf": "kilogram_force",
        "lbf": "pound_force",
        "ozf": "ounce_force",
        "kip": "kip",
        "oz": "ounce",
        "lb": "pound",
        "lbm": "pound",
        "g0": "standard_gravity",
        "percent": "percent",
        "rev": "turn",
        "min": "minute",
        "mbar": "millibar",
        "g": "gram",
        "s": "second",
        "m": "meter",
        "kg": "kilogram",
        "deg": "degree",
    }
    for name in sorted(unit_tables.NAMES - {"cpm", "Hz", "kHz", "rpm"}):
        ours = float(unit_parsing._ask_pint(((name, 1),))[0])
        theirs = full.Quantity(1, same.get(name, name)).to_base_units().magnitude
        theirs *= (
            0.001
            if "[mass]" in full.Quantity(1, same.get(name, name)).dimensionality
            and full.get_base_units("kilogram")[0] == 1000
            else 1
        )
        assert ours == pytest.approx(theirs, rel=1e-12), name


@pytest.mark.parametrize(
    ("text", "dimension", "value"),
    [
        ("3.2e5 N/m", "stiffness", 3.2e5),
        ("320 kN/m", "stiffness", 3.2e5),
        ("1 lbf/in", "stiffness", 4.4482216152605 / 0.0254),
        ("2 lbf*in/rad", "rotational_stiffness", 2 * 4.4482216152605 * 0.0254),
        ("2 kN*m", "rotational_stiffness", 2000.0),
        ("1 lbf*s/in", "damping", 4.4482216152605 / 0.0254),
        ("1 lbf*in*s^2", "inertia", 4.4482216152605 * 0.0254),
        ("3 kg·m²", "inertia", 3.0),
        ("12 g*m", "unbalance", 0.012),
        ("16 oz*in", "unbalance", 0.45359237 * 0.0254),
        ("1 slug", "mass", 14.593902937206364),
        ("0.3 g", "acceleration", 0.3 * 9.80665),
        ("0.3 g0", "acceleration", 0.3 * 9.80665),
        ("5 g", "mass", 0.005),
        ("0.01 g^2/Hz", "acceleration_spectrum", 0.01 * 9.80665**2),
        ("1 m^2/s^4/Hz", "acceleration_spectrum", 1.0),
        ("1 (m/s^2)^2/Hz", "acceleration_spectrum", 1.0),
        ("60Hz", "frequency", 120 * math.pi),
        ("60 rpm", "frequency", 2 * math.pi),
        ("180 deg", "angle", math.pi),
        ("8 %", "number", 0.08),
        ("0.8 1/s", "rate", 0.8),
        ("2 N*s/(mm)", "damping", 2000.0),
        ("0e999999999 kg", "mass", 0.0),
        (" 1.5 s ", "time", 1.5),
    ],
)
def test_what_a_text_is_worth(text: str, dimension: str, value: float) -> None:
    """Breaks if a trade unit is worth something else (definitions of 1959: 1 lb = 0.45359237 kg, 1 in = 25.4 mm)."""
    assert convert(text, dimension) == pytest.approx(value, rel=4e-16, abs=0)


@pytest.mark.parametrize(
    ("one", "other", "dimension"),
    [
        ("1000 mm", "1 m", "length"),
        ("0.1 m", "10 cm", "length"),
        ("60 rpm", "1 Hz", "frequency"),
        ("86.4 kN/m", "86400 N/m", "stiffness"),
        ("12 in", "1 ft", "length"),
        ("386.4 g*m", "0.3864 kg*m", "unbalance"),
        ("7.3 psi", "7.3 lbf/in^2", "pressure"),
    ],
)
def test_unit_twins_are_equal_to_the_last_bit(one: str, other: str, dimension: str) -> None:
    """Breaks if a value is rounded more than once on its way to SI."""
    assert convert(one, dimension) == convert(other, dimension)


def test_a_bare_number_with_a_default_unit_equals_its_text() -> None:
    """Breaks if 86.4 under `stiffness: kN/m` is not the very float of `86.4 kN/m`."""
    assert convert(86.4, "stiffness", {"stiffness": "kN/m"}) == convert("86.4 kN/m", "stiffness")


@pytest.mark.parametrize(
    ("value", "dimension", "words"),
    [
        ("240 lbf", "mass", ["is a force, not a mass", "`240 lb`", "`weight: 240 lbf`"]),
        ("240 N", "mass", ["is a force", "`24.4732 kg`"]),
        ("240 kg", "force", ["is a mass, not a force", "`240 kgf`", "`2353.6 N`"]),
        ("5 oz", "force", ["`5 ozf`"]),
        ("1e308 kN", "mass", ["is a force, not a mass", "with its unit, e.g. 100 kg"]),
        ("1e308 t", "force", ["is a mass, not a force", "9 kN"]),
        ("100 kg/mm", "stiffness", ["kg is a mass", "`100 kgf/mm`"]),
        ("3 lb/in", "stiffness", ["lb is a mass", "`3 lbf/in`"]),
        (12, "frequency", ["12 Hz", "12 rpm", "12 rad/s"]),
        ("12", "frequency", ["12 Hz"]),
        ("12 1/s", "frequency", ["hertz or radians", "12 Hz"]),
        (3, "mass", ["does not cover mass", "write 3 kg", "`mass: kg`"]),
        ("10", "mass", ["has no unit", "write 10 kg"]),
        ("0.1", "number", ["in quotes", "without quotes"]),
        ("5 m", "number", ["has a unit where a number without unit belongs", "write 5"]),
        ("5 N/m", "rotational_stiffness", ["is a stiffness, not a rotational stiffness", "N*m/rad"]),
        ("3 ton", "mass", ["write t for 1000 kg"]),
        ("5 lbs", "mass", ["lb for a mass or lbf for a force"]),
        ("1 Nm", "moment", ["write N*m"]),
        ("1 kg m^2", "inertia", ["kg*m^2"]),
        ("4 kg", "inertia", ["not a mass moment of inertia", "a mass moment of inertia with its unit, e.g. "]),
        ("5 kn/m", "stiffness", ["`kn` in `kn/m`", "write kN"]),
        ("1,000 kg", "mass", ["write 1.000 kg, with a decimal point (or 1000 kg if the comma groups thousands)"]),
        ("0,125 m", "length", ["write 0.125 m, with a decimal point"]),
        ("1,5e3 N/m", "stiffness", ["write 1.5e3 N/m, with a decimal point"]),
        ("1.500,5 N/m", "stiffness", ["write digits with a decimal point only"]),
        ("mass:180 kg", "mass", ["put a blank after the colon: `mass: 180 kg`"]),
        ("1 Nmm", "moment", ["write N*mm"]),
        ("1 kNmm", "moment", ["write kN*mm"]),
        ("1 knm", "moment", ["write kN*m"]),
        ("1 kN/mM", "stiffness", ["`mM` in `kN/mM`", "write mm"]),
        ("1 kg/mn", "stiffness", ["write mm for a length, or MN for a force"]),
        ("1_000 kg", "mass", ["decimal point"]),
        ("1:30 s", "time", ["decimal point"]),
        ("abc", "mass", ["is not a number", "with its unit, e.g. 100 kg"]),
        ("", "mass", ["empty text"]),
        (True, "mass", ["true or false"]),
        (None, "mass", ["nothing"]),
        ([1], "mass", ["a list"]),
        (float("nan"), "mass", ["nan"]),
        (float("inf"), "mass", ["inf"]),
        (10**400, "mass", ["range of numbers"]),
        ("1e400 kg", "mass", ["range of numbers"]),
        ("1e-400 kg", "mass", ["range of numbers"]),
        ("1e308 t", "mass", ["range of numbers"]),
        ("1e999999999 kg", "mass", ["range of numbers"]),
        ("10 m^999999", "length", ["is not a unit"]),
        ("1 " + "(" * 50 + "m" + ")" * 50, "length", ["is not a unit"]),
        ("(" * 100_000, "length", ["is not a number"]),
        ("1 " + "m*" * 100_000 + "m", "length", ["is not a number"]),
        ("1 m;import os", "length", ["is not a unit"]),
        ("1 __import__", "length", ["is not a unit"]),
        ("1 m//s", "velocity", ["is not a unit"]),
        ("1 /m", "length", ["is not a unit"]),
    ],
)
def test_wrong_input_says_what_to_write(value: object, dimension: str, words: list[str]) -> None:
    """Breaks if a look-alike unit passes, or if the message stops telling what to write."""
    with pytest.raises(QuantityError) as caught:
        convert(value, dimension, {})
    assert all(word in str(caught.value) for word in words), str(caught.value)
    assert len(str(caught.value)) < 400


def test_of_two_dimensions_the_unit_decides_and_a_bare_number_takes_the_first() -> None:
    """Breaks if a coupling's N*m/rad is taken for N/m."""
    both = ("stiffness", "rotational_stiffness")
    assert read("3 N*m/rad", both) == (3.0, "rotational_stiffness")
    assert read("3 N/m", both) == (3.0, "stiffness")
    assert read(3, both, {"": "SI"}) == (3.0, "stiffness")


def test_every_dimension_reads_its_own_example_and_its_si_unit_is_worth_one() -> None:
    """Breaks if a message shows an example that is itself refused, or an SI unit that is not 1."""
    for name, dimension in DIMENSIONS.items():
        assert convert(dimension.example if name != "number" else 0.05, name) > 0
        if dimension.unit:
            assert convert(f"1 {dimension.unit}", name) == 1.0


def test_factors_are_exact() -> None:
    """Breaks if a factor passes through a float."""
    assert factor("lbf/in")[0] == Fraction("0.45359237") * Fraction("9.80665") / Fraction("0.0254")


def test_common_units_do_not_import_pint() -> None:
    """Breaks if loading an ordinary model pays for pint's import."""
    code = (
        "import sys; from mdof.units import convert; convert('3 kN/m', 'stiffness'); convert('12 Hz', 'frequency'); "
        "assert 'pint' not in sys.modules"
    )
    subprocess.run([sys.executable, "-c", code], check=True)
