"""What units there are, what kinds of number a model holds, and what people write by mistake. Data, no logic."""

from __future__ import annotations

from dataclasses import dataclass

__all__ = ["COMMON", "DEFINITIONS", "DIMENSIONS", "HINTS", "NAMES", "TWO_PI", "Dimension", "Exponents"]

#: Exponents of mass, length, time and angle.
Exponents = tuple[int, int, int, int]

TWO_PI = "6.28318530717958647692528676655900576839"

#: What pint is told. One unit a line, no prefixes: what is not listed does not exist.
DEFINITIONS = f"""
kg = [mass]
m = [length]
s = [time]
rad = [angle]
percent = 1/100
g = 1/1000 * kg
mg = 1/1000000 * kg
t = 1000 * kg
lb = 0.45359237 * kg
lbm = lb
oz = 1/16 * lb
um = 1/1000000 * m
mm = 1/1000 * m
cm = 1/100 * m
km = 1000 * m
in = 0.0254 * m
mil = 1/1000 * in
ft = 12 * in
ms = 1/1000 * s
us = 1/1000000 * s
min = 60 * s
h = 3600 * s
mrad = 1/1000 * rad
rev = {TWO_PI} * rad
deg = 1/360 * rev
Hz = rev / s
kHz = 1000 * Hz
rpm = rev / min
cpm = rev / min
g0 = 9.80665 * m / s ** 2
N = kg * m / s ** 2
mN = 1/1000 * N
kN = 1000 * N
MN = 1000000 * N
kgf = kg * g0
lbf = lb * g0
ozf = oz * g0
kip = 1000 * lbf
slug = lbf * s ** 2 / ft
Pa = N / m ** 2
kPa = 1000 * Pa
MPa = 1000000 * Pa
GPa = 1000000000 * Pa
bar = 100000 * Pa
mbar = 100 * Pa
psi = lbf / in ** 2
ksi = 1000 * psi
"""

NAMES = frozenset(line.split()[0] for line in DEFINITIONS.splitlines() if line)

# The units most files use, so that pint need not be imported for them (70 ms); a test holds each against pint.
COMMON: dict[str, tuple[str, Exponents]] = {
    "kg": ("1", (1, 0, 0, 0)),
    "g": ("1/1000", (1, 0, 0, 0)),
    "t": ("1000", (1, 0, 0, 0)),
    "lb": ("0.45359237", (1, 0, 0, 0)),
    "m": ("1", (0, 1, 0, 0)),
    "mm": ("1/1000", (0, 1, 0, 0)),
    "in": ("0.0254", (0, 1, 0, 0)),
    "m^2": ("1", (0, 2, 0, 0)),
    "m^4": ("1", (0, 4, 0, 0)),
    "s": ("1", (0, 0, 1, 0)),
    "1/s": ("1", (0, 0, -1, 0)),
    "rad": ("1", (0, 0, 0, 1)),
    "rad/s": ("1", (0, 0, -1, 1)),
    "Hz": (TWO_PI, (0, 0, -1, 1)),
    "rpm": (f"{TWO_PI}/60", (0, 0, -1, 1)),
    "%": ("1/100", (0, 0, 0, 0)),
    "1": ("1", (0, 0, 0, 0)),
    "N": ("1", (1, 1, -2, 0)),
    "kN": ("1000", (1, 1, -2, 0)),
    "lbf": ("0.45359237*9.80665", (1, 1, -2, 0)),
    "N*m": ("1", (1, 2, -2, 0)),
    "N/m": ("1", (1, 0, -2, 0)),
    "N/mm": ("1000", (1, 0, -2, 0)),
    "kN/m": ("1000", (1, 0, -2, 0)),
    "kN/mm": ("1000000", (1, 0, -2, 0)),
    "N*s/m": ("1", (1, 0, -1, 0)),
    "kN*s/m": ("1000", (1, 0, -1, 0)),
    "N*m/rad": ("1", (1, 2, -2, -1)),
    "N*m*s/rad": ("1", (1, 2, -1, -1)),
    "kg*m^2": ("1", (1, 2, 0, 0)),
    "kg*m": ("1", (1, 1, 0, 0)),
    "g*m": ("1/1000", (1, 1, 0, 0)),
    "m/s": ("1", (0, 1, -1, 0)),
    "mm/s": ("1/1000", (0, 1, -1, 0)),
    "m/s^2": ("1", (0, 1, -2, 0)),
    "N/m^2": ("1", (1, -1, -2, 0)),
    "Pa": ("1", (1, -1, -2, 0)),
    "GPa": ("1000000000", (1, -1, -2, 0)),
    "kg/m^3": ("1", (1, -3, 0, 0)),
    "m^3": ("1", (0, 3, 0, 0)),
    "m^2/s^4/Hz": (f"1/{TWO_PI}", (0, 2, -3, -1)),
}

# What people write for something that exists here under another name, or that means two things.
HINTS = {
    "mn": "mm for a length, or MN for a force",
    "lbs": "lb for a mass or lbf for a force",
    "pound": "lb for a mass or lbf for a force",
    "pounds": "lb for a mass or lbf for a force",
    "ton": "t for 1000 kg, or the number in lb or kg (a ton has several sizes)",
    "tons": "t for 1000 kg, or the number in lb or kg (a ton has several sizes)",
    "tonne": "t",
    "kp": "kgf",
    "kgm": "kg*m",
    "Nm": "N*m",
    "Nms": "N*m*s",
    "Ns": "N*s",
    "kNm": "kN*m",
    "kNs": "kN*s",
    "sec": "s",
    "inch": "in",
    "inches": "in",
    "feet": "ft",
    "cps": "Hz",
    "G": "g0 (standard gravity)",
    "gs": "g0 (standard gravity)",
    "l": "m^3 (1 litre is 1.0e-3 m^3)",
    "K": "no temperature",
    "c": "%",
}


@dataclass(frozen=True, kw_only=True, slots=True)
class Dimension:
    """A kind of number a model holds.

    Attributes
    ----------
    name : key in the model's ``units`` table.
    words : what it is called in a message, with its article.
    unit : SI unit of the number kept; ``""`` for a ratio.
    exponents : the dimensions it may be written in (rotational stiffness with and without ``/rad``).
    example : a way to write one.
    always : True where a bare number is never taken, whatever ``units`` says.
    """

    name: str
    words: str
    unit: str
    exponents: tuple[Exponents, ...]
    example: str
    always: bool = False


def _dimension(
    name: str, words: str, unit: str, example: str, *exponents: Exponents, always: bool = False
) -> tuple[str, Dimension]:
    return name, Dimension(name=name, words=words, unit=unit, exponents=exponents, example=example, always=always)


#: Every dimension of the model file.
DIMENSIONS: dict[str, Dimension] = dict(
    [
        _dimension("mass", "a mass", "kg", "100 kg", (1, 0, 0, 0)),
        _dimension("force", "a force", "N", "9 kN", (1, 1, -2, 0)),
        _dimension("length", "a length", "m", "25 mm", (0, 1, 0, 0)),
        _dimension("area", "an area", "m^2", "1200 mm^2", (0, 2, 0, 0)),
        _dimension("volume", "a volume", "m^3", "0.4 m^3", (0, 3, 0, 0)),
        _dimension("second_moment", "a second moment of area", "m^4", "8.0e4 mm^4", (0, 4, 0, 0)),
        _dimension("density", "a density", "kg/m^3", "840 kg/m^3", (1, -3, 0, 0)),
        _dimension("time", "a time", "s", "1.5 s", (0, 0, 1, 0)),
        _dimension("rate", "a rate", "1/s", "0.8 1/s", (0, 0, -1, 0)),
        _dimension("frequency", "a frequency or speed", "rad/s", "12 Hz", (0, 0, -1, 1), always=True),
        _dimension("angle", "an angle", "rad", "30 deg", (0, 0, 0, 1)),
        _dimension("inertia", "a mass moment of inertia", "kg*m^2", "20 kg*m^2", (1, 2, 0, 0)),
        _dimension("unbalance", "an unbalance", "kg*m", "12 g*m", (1, 1, 0, 0)),
        _dimension("moment", "a moment", "N*m", "60 N*m", (1, 2, -2, 0)),
        _dimension("pressure", "a pressure or modulus", "Pa", "210 GPa", (1, -1, -2, 0)),
        _dimension("stiffness", "a stiffness", "N/m", "500 kN/m", (1, 0, -2, 0)),
        _dimension("damping", "a damping", "N*s/m", "2000 N*s/m", (1, 0, -1, 0)),
        _dimension(
            "rotational_stiffness", "a rotational stiffness", "N*m/rad", "50 kN*m/rad", (1, 2, -2, -1), (1, 2, -2, 0)
        ),
        _dimension(
            "rotational_damping", "a rotational damping", "N*m*s/rad", "10 N*m*s/rad", (1, 2, -1, -1), (1, 2, -1, 0)
        ),
        _dimension("velocity", "a velocity", "m/s", "4.5 mm/s", (0, 1, -1, 0)),
        _dimension("acceleration", "an acceleration", "m/s^2", "0.3 g0", (0, 1, -2, 0)),
        _dimension("acceleration_spectrum", "an acceleration spectrum", "m^2/s^4/Hz", "0.01 g^2/Hz", (0, 2, -3, -1)),
        _dimension("number", "a number without unit", "", "0.05", (0, 0, 0, 0)),
    ]
)
