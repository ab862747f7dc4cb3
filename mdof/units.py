"""Units at the edge: what an engineer writes becomes an SI number, and nothing else in mdof knows units.

Pint judges what a unit is worth. It works here on a short list of definitions (:data:`DEFINITIONS`) in exact
fractions, so that ``1000 mm`` and ``1 m`` give the very same float: the value as written times the exact factor,
rounded once. Angles are a dimension of their own, which keeps Hz, rpm and rad/s apart from a bare 1/s.

Two letters are told apart by what is asked for: ``g`` is a gram unless an acceleration (or a spectrum of it) is asked
for, where it is standard gravity; ``g0`` is always standard gravity. ``lb``, ``kg`` and ``oz`` are masses; ``lbf``,
``kgf`` and ``ozf`` are forces.
"""

from __future__ import annotations

import math
import re
from collections.abc import Mapping
from fractions import Fraction
from functools import lru_cache
from typing import Any

from mdof.unit_parsing import LONGEST_UNIT, QuantityError, factor_of, nearest, short
from mdof.unit_tables import DIMENSIONS, TWO_PI, Dimension, Exponents

__all__ = ["DIMENSIONS", "Dimension", "QuantityError", "convert", "factor", "nearest", "read"]

_LONGEST_NUMBER = 60
_NUMBER = re.compile(r"[-+]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][-+]?[0-9]+)?")


_WORDS: dict[Exponents, str] = {}
for _entry in DIMENSIONS.values():
    for _key in _entry.exponents:
        _WORDS.setdefault(_key, _entry.words)


def read(value: Any, dimension: str | tuple[str, ...], defaults: Mapping[str, str] | None = None) -> tuple[float, str]:
    """The SI value of a number or quantity text, and which of the dimensions asked for it has.

    Parameters
    ----------
    value : a real number, or text such as ``"3.2e5 N/m"``.
    dimension : name(s) from :data:`DIMENSIONS`; a bare number takes the first.
    defaults : unit of bare numbers by dimension name; ``{"": "SI"}`` covers all with SI.

    Raises
    ------
    QuantityError
        If it cannot be read, is not finite, has a unit of another kind, or lacks a unit it needs.
    """
    names = (dimension,) if isinstance(dimension, str) else dimension
    if isinstance(value, str):
        text, unit = _split(value, names)
    else:
        text, unit = _plain(value, names), ""
    if unit:
        worth, name = _judged(value, text, unit, names)
    else:
        wanted = DIMENSIONS[names[0]]
        if isinstance(value, str) and wanted.name != "number":
            raise QuantityError(f"`{short(value)}` has no unit", f"write {_with_unit(value.strip(), wanted, defaults)}")
        if isinstance(value, str):
            raise QuantityError(
                f"`{short(value)}` is a number in quotes, which is text",
                f"write {short(value.strip())} without quotes",
            )
        worth, name = _default_factor(text, wanted, defaults), wanted.name
    number = float(text)
    if number == 0.0:
        return 0.0, name
    try:
        # In the SI unit itself float() has rounded once already; most numbers are, and fractions take their time.
        result = number if worth == 1 else float(Fraction(text) * worth)
    except OverflowError:
        result = math.inf
    if result == 0.0 or not math.isfinite(result):
        raise QuantityError(f"{short(str(value))} is beyond the range of numbers", f"write {_as_example(names)}")
    return result, name


def convert(value: Any, dimension: str, defaults: Mapping[str, str] | None = None) -> float:
    """The SI value alone; see :func:`read`. ``convert("60Hz", "frequency")`` gives rad/s."""
    return read(value, dimension, defaults)[0]


def factor(unit: str, dimension: str | None = None) -> tuple[Fraction, Exponents]:
    """What one of ``unit`` is in SI, exactly, with its exponents of mass, length, time and angle.

    With ``dimension`` the unit must be of that kind, and ``g`` is told apart by it.
    """
    if dimension is None:
        return factor_of(unit)
    worth, _ = _judged(f"1 {unit}", "1", unit, (dimension,))
    return worth, DIMENSIONS[dimension].exponents[0]


def _split(text: str, names: tuple[str, ...]) -> tuple[str, str]:
    """The number, as text that float() and Fraction() read without harm, and the unit."""
    stripped = text.strip()
    match = _NUMBER.match(stripped) if len(stripped) <= _LONGEST_NUMBER + LONGEST_UNIT else None
    if match is None:
        what = f"`{short(text)}` is not a number" if stripped else "empty text where a number belongs"
        key, colon, after = stripped.partition(":")
        if colon and key.isidentifier() and after[:1].strip():
            raise QuantityError(what, f"put a blank after the colon: `{short(f'{key}: {after}')}`")
        raise QuantityError(what, f"write {_as_example(names)}")
    rest = stripped[match.end() :]
    if rest[:1] in (",", "_", ":", ".") or rest[:1].isdigit():
        way = _without_comma(stripped) or (
            f"write digits with a decimal point only, e.g. {DIMENSIONS[names[0]].example}"
        )
        raise QuantityError(f"`{short(text)}` is not a number", way)
    return _in_range(match.group(), names), rest.strip()


def _without_comma(text: str) -> str | None:
    """What to write instead of ``0,5 m``; a comma before three digits may also group thousands."""
    comma = re.fullmatch(r"([-+]?[0-9]+),([0-9]+)((?:[eE][-+]?[0-9]+)?(?:[^0-9.,].*)?)", text)
    if comma is None:
        return None
    before, after, rest = comma.groups()
    point = f"write {short(f'{before}.{after}{rest}')}, with a decimal point"
    whole = f" (or {short(f'{before}{after}{rest}')} if the comma groups thousands)"
    return point + (whole if len(after) == 3 and before.lstrip("+-") != "0" else "")


def _plain(value: Any, names: tuple[str, ...]) -> str:
    if isinstance(value, bool) or not hasattr(value, "__float__") or isinstance(value, complex):
        raise QuantityError(f"{_kind(value)} where a number belongs", f"write {_as_example(names)}")
    try:
        number = float(value)
    except (TypeError, ValueError, OverflowError):
        raise QuantityError(f"{_kind(value)} is beyond the range of numbers", f"write {_as_example(names)}") from None
    if not math.isfinite(number):
        raise QuantityError(f"{number} is not a number to calculate with", f"write {_as_example(names)}")
    # The shortest decimal text of the float is what was written.
    return repr(number or 0.0)  # no negative zero


def _in_range(text: str, names: tuple[str, ...]) -> str:
    # float() judges the size first, because an exact 1e999999999 would fill the memory.
    number = float(text) if len(text) <= _LONGEST_NUMBER else math.inf
    if not math.isfinite(number) or (number == 0.0 and re.search(r"[1-9]", re.split("[eE]", text)[0])):
        raise QuantityError(f"{short(text)} is beyond the range of numbers", f"write {_as_example(names)}")
    return text if number else "0"


def _default_factor(text: str, wanted: Dimension, defaults: Mapping[str, str] | None) -> Fraction:
    if wanted.name == "number":
        return Fraction(1)
    defaults = defaults or {}
    shown = f"{float(text):.12g}"
    if wanted.always:
        raise QuantityError(f"{wanted.words} always needs its unit", f"write {shown} Hz, {shown} rpm or {shown} rad/s")
    unit = defaults.get(wanted.name)
    if unit is None and "" not in defaults:
        raise QuantityError(
            f"{shown} has no unit and `units` does not cover {wanted.name}",
            f"write {_with_unit(shown, wanted, None)}, or add `{wanted.name}: {wanted.unit}` to `units` (`units: "
            "SI` covers all)",
        )
    return Fraction(1) if unit is None else factor(unit, wanted.name)[0]


def _judged(value: Any, text: str, unit: str, names: tuple[str, ...]) -> tuple[Fraction, str]:
    """Factor to SI and the dimension that fits; refuses a unit of another kind with the text to write."""
    fitting = _fitting(unit, names)
    if fitting is None:
        raise _mismatch(str(value), text, unit, *factor_of(unit), names)
    return fitting


@lru_cache(maxsize=2048)
def _fitting(unit: str, names: tuple[str, ...]) -> tuple[Fraction, str] | None:
    """Factor to SI and the first of the dimensions that the unit has, with ``g`` as gravity where only that fits."""
    found, exponents = factor_of(unit)
    for name in names:
        if exponents in DIMENSIONS[name].exponents:
            return _to_kept(found, name), name
    gravity = re.sub(r"(?<![A-Za-z])g(?![A-Za-z0])", "g0", unit)
    if gravity != unit:
        with_gravity, gravity_exponents = factor_of(gravity)
        for name in names:
            if gravity_exponents in DIMENSIONS[name].exponents:
                return _to_kept(with_gravity, name), name
    return None


def _to_kept(found: Fraction, name: str) -> Fraction:
    return found * _spectrum_scale() if name == "acceleration_spectrum" else found


def _spectrum_scale() -> Fraction:
    # A spectrum is kept per Hz, not per rad/s.
    return Fraction(TWO_PI)


def _mismatch(
    value: str, text: str, unit: str, found: Fraction, exponents: Exponents, names: tuple[str, ...]
) -> QuantityError:
    wanted = DIMENSIONS[names[0]]
    is_what = _WORDS.get(exponents, "something else")
    message = f"`{short(value)}` is {is_what}, not {wanted.words}"
    shown = f"{float(text):.12g}"
    try:
        in_si = float(Fraction(text) * found)
    except OverflowError:
        in_si = math.inf
    showable = math.isfinite(in_si * 9.80665)
    if showable and wanted.name == "mass" and exponents == (1, 1, -2, 0):
        as_mass = {"lbf": f"`{shown} lb`", "kgf": f"`{shown} kg`"}.get(unit, f"`{in_si / 9.80665:.6g} kg`")
        return QuantityError(message, f"write {as_mass}, or `weight: {short(value)}` instead of `mass`")
    if showable and wanted.name == "force" and exponents == (1, 0, 0, 0):
        as_force = {"kg": f"`{shown} kgf`", "lb": f"`{shown} lbf`", "oz": f"`{shown} ozf`"}.get(unit)
        newton = f"`{in_si * 9.80665:.6g} N`"
        way = f"write {as_force} or {newton}" if as_force else f"write {newton}"
        return QuantityError(message, f"{way} for its weight, or give it as `mass`")
    for name in names:
        for swapped, weak in (("kg", "kgf"), ("lb", "lbf"), ("oz", "ozf"), ("lbf", "lb"), ("kgf", "kg")):
            other = re.sub(rf"(?<![A-Za-z]){swapped}(?![A-Za-z])", weak, unit)
            if other != unit and factor_of(other)[1] in DIMENSIONS[name].exponents:
                kind = "a mass" if swapped in ("kg", "lb", "oz") else "a force"
                return QuantityError(f"`{short(value)}`: {swapped} is {kind}", f"write `{shown} {other}`")
    if wanted.name == "frequency" and exponents == (0, 0, -1, 0):
        return QuantityError(
            f"`{short(value)}` may mean hertz or radians a second", f"write {shown} Hz, {shown} rpm or {shown} rad/s"
        )
    if wanted.name == "number":
        return QuantityError(f"`{short(value)}` has a unit where a number without unit belongs", f"write {shown}")
    return QuantityError(message, f"write {_as_example(names)}")


def _with_unit(shown: str, wanted: Dimension, defaults: Mapping[str, str] | None) -> str:
    if wanted.always:
        return f"{shown} Hz, {shown} rpm or {shown} rad/s"
    return f"{shown} {(defaults or {}).get(wanted.name) or wanted.unit}".strip()


def _as_example(names: tuple[str, ...]) -> str:
    wanted = DIMENSIONS[names[0]]
    if wanted.name == "number":
        return f"{wanted.words}, e.g. {wanted.example}"
    return f"{wanted.words} with its unit, e.g. {wanted.example}"


def _kind(value: Any) -> str:
    if value is None:
        return "nothing"
    if isinstance(value, bool):
        return "true or false"
    if isinstance(value, Mapping):
        return "a mapping"
    if isinstance(value, list | tuple):
        return "a list"
    if isinstance(value, int | float):
        return "this number"
    return f"`{short(str(value))}`"
