"""Units at the edge: what an engineer writes becomes an SI number, and nothing else in mdof knows units.

Pint judges what a unit is worth. It works here on a short list of definitions (:data:`DEFINITIONS`) in exact
fractions, so that ``1000 mm`` and ``1 m`` give the very same float: the value as written times the exact factor,
rounded once. Angles are a dimension of their own, which keeps Hz, rpm and rad/s apart from a bare 1/s.

Two letters are told apart by what is asked for: ``g`` is a gram unless an acceleration (or a spectrum of it) is asked
for, where it is standard gravity; ``g0`` is always standard gravity. ``lb``, ``kg`` and ``oz`` are masses; ``lbf``,
``kgf`` and ``ozf`` are forces.
"""

from __future__ import annotations

import difflib
import math
import re
from collections.abc import Mapping
from fractions import Fraction
from functools import lru_cache
from typing import Any

from mdof.errors import UsageError
from mdof.unit_tables import COMMON, DEFINITIONS, DIMENSIONS, HINTS, NAMES, TWO_PI, Dimension, Exponents

__all__ = ["DIMENSIONS", "Dimension", "QuantityError", "convert", "factor", "nearest", "read"]

_MOST_COMPARED = 1000
_LONGEST_UNIT = 80
_LONGEST_NUMBER = 60
_NUMBER = re.compile(r"[-+]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][-+]?[0-9]+)?")
_TOKEN = re.compile(r"\s*([A-Za-z%]+0?|[0-9]+|[*/^()-])")
_SIGNS = str.maketrans({"·": "*", "⋅": "*", "×": "*", "²": "^2", "³": "^3", "⁴": "^4", "µ": "u", "μ": "u", "°": "deg"})


class QuantityError(UsageError):
    """A number or unit that cannot be read as asked: ``message`` says what is wrong, ``expected`` what to write."""

    def __init__(self, message: str, expected: str = "") -> None:
        self.message = message
        self.expected = expected
        super().__init__(f"{message}; {expected}" if expected else message)


_WORDS: dict[Exponents, str] = {}
for _entry in DIMENSIONS.values():
    for _key in _entry.exponents:
        _WORDS.setdefault(_key, _entry.words)


def nearest(word: str, choices: Any) -> str | None:
    """The choice that looks most like ``word``, or None where none does."""
    options = [str(choice) for choice in choices]
    if len(options) > _MOST_COMPARED:
        # Comparing is slow; among many names those of about the same length are enough.
        options.sort(key=lambda option: abs(len(option) - len(word)))
        options = options[:_MOST_COMPARED]
    folded = {option.casefold(): option for option in reversed(options)}
    if word.casefold() in folded:
        return folded[word.casefold()]
    found = difflib.get_close_matches(word[:60], options, n=1, cutoff=0.6)
    return found[0] if found else None


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
        number, unit = _split(value, names)
    else:
        number, unit = _plain(value, names), ""
    if unit:
        worth, name = _judged(value, number, unit, names)
    else:
        wanted = DIMENSIONS[names[0]]
        if isinstance(value, str) and wanted.name != "number":
            raise QuantityError(
                f"`{_short(value)}` has no unit", f"write {_with_unit(value.strip(), wanted, defaults)}"
            )
        if isinstance(value, str):
            raise QuantityError(
                f"`{_short(value)}` is a number in quotes, which is text",
                f"write {_short(value.strip())} without quotes",
            )
        worth, name = _default_factor(number, wanted, defaults), wanted.name
    try:
        result = float(number * worth) if number else 0.0
    except OverflowError:
        result = math.inf
    if number and (result == 0.0 or not math.isfinite(result)):
        raise QuantityError(f"{_short(str(value))} is beyond the range of numbers", f"write {_as_example(names)}")
    return result, name


def convert(value: Any, dimension: str, defaults: Mapping[str, str] | None = None) -> float:
    """The SI value alone; see :func:`read`. ``convert("60Hz", "frequency")`` gives rad/s."""
    return read(value, dimension, defaults)[0]


def factor(unit: str, dimension: str | None = None) -> tuple[Fraction, Exponents]:
    """What one of ``unit`` is in SI, exactly, with its exponents of mass, length, time and angle.

    With ``dimension`` the unit must be of that kind, and ``g`` is told apart by it.
    """
    if dimension is None:
        return _factor(unit)
    worth, _ = _judged(f"1 {unit}", Fraction(1), unit, (dimension,))
    return worth, DIMENSIONS[dimension].exponents[0]


def _split(text: str, names: tuple[str, ...]) -> tuple[Fraction, str]:
    stripped = text.strip()
    match = _NUMBER.match(stripped) if len(stripped) <= _LONGEST_NUMBER + _LONGEST_UNIT else None
    if match is None:
        what = f"`{_short(text)}` is not a number" if stripped else "empty text where a number belongs"
        raise QuantityError(what, f"write {_as_example(names)}")
    rest = stripped[match.end() :]
    if rest[:1] in (",", "_", ":", ".") or rest[:1].isdigit():
        raise QuantityError(
            f"`{_short(text)}` is not a number",
            f"write digits with a decimal point only, such as {DIMENSIONS[names[0]].example}",
        )
    return _exact(match.group(), names), rest.strip()


def _plain(value: Any, names: tuple[str, ...]) -> Fraction:
    if isinstance(value, bool) or not hasattr(value, "__float__") or isinstance(value, complex):
        raise QuantityError(f"{_kind(value)} where a number belongs", f"write {_as_example(names)}")
    try:
        number = float(value)
    except (TypeError, ValueError, OverflowError):
        raise QuantityError(f"{_kind(value)} is beyond the range of numbers", f"write {_as_example(names)}") from None
    if not math.isfinite(number):
        raise QuantityError(f"{number} is not a number to calculate with", f"write {_as_example(names)}")
    # The shortest decimal text of the float is what was written.
    return Fraction(repr(number))


def _exact(text: str, names: tuple[str, ...]) -> Fraction:
    # float() judges the size first, because an exact 1e999999999 would fill the memory.
    number = float(text) if len(text) <= _LONGEST_NUMBER else math.inf
    if not math.isfinite(number) or (number == 0.0 and re.search(r"[1-9]", re.split("[eE]", text)[0])):
        raise QuantityError(f"{_short(text)} is beyond the range of numbers", f"write {_as_example(names)}")
    return Fraction(text) if number else Fraction(0)


def _default_factor(number: Fraction, wanted: Dimension, defaults: Mapping[str, str] | None) -> Fraction:
    if wanted.name == "number":
        return Fraction(1)
    defaults = defaults or {}
    shown = f"{float(number):.12g}"
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


def _judged(value: Any, number: Fraction, unit: str, names: tuple[str, ...]) -> tuple[Fraction, str]:
    """Factor to SI and the dimension that fits; refuses a unit of another kind with the text to write."""
    found, exponents = _factor(unit)
    for name in names:
        if exponents in DIMENSIONS[name].exponents:
            return _to_kept(found, name), name
    gravity = re.sub(r"(?<![A-Za-z])g(?![A-Za-z0])", "g0", unit)
    if gravity != unit:
        with_gravity, gravity_exponents = _factor(gravity)
        for name in names:
            if gravity_exponents in DIMENSIONS[name].exponents:
                return _to_kept(with_gravity, name), name
    raise _mismatch(str(value), number, unit, found, exponents, names)


def _to_kept(found: Fraction, name: str) -> Fraction:
    return found * _spectrum_scale() if name == "acceleration_spectrum" else found


def _spectrum_scale() -> Fraction:
    # A spectrum is kept per Hz, not per rad/s.
    return Fraction(TWO_PI)


def _mismatch(
    value: str, number: Fraction, unit: str, found: Fraction, exponents: Exponents, names: tuple[str, ...]
) -> QuantityError:
    wanted = DIMENSIONS[names[0]]
    is_what = _WORDS.get(exponents, "something else")
    message = f"`{_short(value)}` is {is_what}, not {wanted.words}"
    shown = f"{float(number):.12g}"
    if wanted.name == "mass" and exponents == (1, 1, -2, 0):
        as_mass = {"lbf": f"`{shown} lb`", "kgf": f"`{shown} kg`"}.get(
            unit, f"`{float(number * found) / 9.80665:.6g} kg`"
        )
        return QuantityError(message, f"write {as_mass}, or `weight: {_short(value)}` instead of `mass`")
    if wanted.name == "force" and exponents == (1, 0, 0, 0):
        as_force = {"kg": f"`{shown} kgf`", "lb": f"`{shown} lbf`", "oz": f"`{shown} ozf`"}.get(unit)
        newton = f"`{float(number * found) * 9.80665:.6g} N`"
        way = f"write {as_force} or {newton}" if as_force else f"write {newton}"
        return QuantityError(message, f"{way} for its weight, or give it as `mass`")
    for name in names:
        for swapped, weak in (("kg", "kgf"), ("lb", "lbf"), ("oz", "ozf"), ("lbf", "lb"), ("kgf", "kg")):
            other = re.sub(rf"(?<![A-Za-z]){swapped}(?![A-Za-z])", weak, unit)
            if other != unit and _factor(other)[1] in DIMENSIONS[name].exponents:
                kind = "a mass" if swapped in ("kg", "lb", "oz") else "a force"
                return QuantityError(f"`{_short(value)}`: {swapped} is {kind}", f"write `{shown} {other}`")
    if wanted.name == "frequency" and exponents == (0, 0, -1, 0):
        return QuantityError(
            f"`{_short(value)}` may mean hertz or radians a second", f"write {shown} Hz, {shown} rpm or {shown} rad/s"
        )
    if wanted.name == "number":
        return QuantityError(f"`{_short(value)}` has a unit where a number without unit belongs", f"write {shown}")
    return QuantityError(message, f"write {_as_example(names)}")


@lru_cache(maxsize=2048)
def _factor(unit: str) -> tuple[Fraction, Exponents]:
    clean = (
        unit.strip().translate(_SIGNS).replace("**", "^").replace(" ", "") if " " not in unit.strip() else _joined(unit)
    )
    common = COMMON.get(clean)
    if common is not None:
        return _fraction(common[0]), common[1]
    powers = _parse(unit, clean)
    return _ask_pint(tuple(sorted(powers.items())))


def _joined(unit: str) -> str:
    """The unit without blanks; blanks between two names are refused because `N/m s` has two readings."""
    clean = re.sub(r"\s*([*/^()])\s*", r"\1", unit.strip().translate(_SIGNS).replace("**", "^"))
    if re.search(r"\s", clean):
        raise QuantityError(
            f"`{_short(unit)}` is not a unit", f"join units with * and /, such as {re.sub(r'[ ]+', '*', _short(clean))}"
        )
    return clean


def _fraction(text: str) -> Fraction:
    if "*" in text:
        left, right = text.split("*")
        return Fraction(left) * Fraction(right)
    if "/" in text:
        left, right = text.split("/")
        return Fraction(left) / Fraction(right)
    return Fraction(text)


def _parse(written: str, text: str) -> dict[str, int]:
    """Unit names with their exponents; products and quotients left to right, parentheses at most three deep."""
    wrong = QuantityError(
        f"`{_short(written)}` is not a unit", "join units with * and /, powers with ^, such as N*s/m or kg*m^2"
    )
    if not text or len(text) > _LONGEST_UNIT:
        raise wrong
    tokens, place = [], 0
    while place < len(text):
        match = _TOKEN.match(text, place)
        if match is None:
            raise wrong
        tokens.append(match.group(1))
        place = match.end()
    result: dict[str, int] = {}
    # Per open parenthesis: the sign in force outside it and the powers collected there.
    stack: list[tuple[int, dict[str, int]]] = []
    current, sign, expect_name, index = result, 1, True, 0
    last: dict[str, int] | None = None
    last_sign = 1
    while index < len(tokens):
        token = tokens[index]
        index += 1
        if expect_name:
            if token == "(" and len(stack) < 3:
                stack.append((sign, current))
                current, sign = {}, 1
                continue
            if token == "1":
                last = {}
            elif token[0].isalpha() or token == "%":
                last = {_known(token, written): 1}
            else:
                raise wrong
            last_sign, expect_name = sign, False
        elif token in "*/":
            _add(current, last, last_sign)
            last, sign, expect_name = None, (1 if token == "*" else -1), True
        elif token == ")" and stack:
            _add(current, last, last_sign)
            last = current
            sign, current = stack.pop()
            last_sign = sign
        elif token == "^" and last is not None and index < len(tokens):
            minus = tokens[index] == "-"
            index += minus
            digits = tokens[index] if index < len(tokens) else ""
            index += 1
            if not digits.isdigit() or len(digits) > 1:
                raise wrong
            last = {name: power * int(digits) * (-1 if minus else 1) for name, power in last.items()}
        else:
            raise wrong
    if expect_name or stack:
        raise wrong
    _add(current, last, last_sign)
    if any(abs(power) > 9 for power in result.values()):
        raise wrong
    return {name: power for name, power in result.items() if power}


def _add(into: dict[str, int], powers: dict[str, int] | None, sign: int) -> None:
    for name, power in (powers or {}).items():
        into[name] = into.get(name, 0) + sign * power


def _known(name: str, written: str) -> str:
    if name == "%":
        return "percent"
    if name in NAMES and name != "percent":
        return name
    hint = HINTS.get(name) or nearest(name, NAMES - {"percent"})
    raise QuantityError(
        f"`{_short(written)}` is not a unit mdof knows"
        if name == written
        else f"`{_short(name)}` in `{_short(written)}` is not a unit mdof knows",
        f"write {hint}" if hint else "join units with * and /, such as N*s/m; the manual lists the units",
    )


@lru_cache(maxsize=2048)
def _ask_pint(powers: tuple[tuple[str, int], ...]) -> tuple[Fraction, Exponents]:
    if not powers:
        return Fraction(1), (0, 0, 0, 0)
    registry = _registry()
    unit = registry.parse_units(" * ".join(f"{name} ** {power}" for name, power in powers))
    worth, _ = registry.get_base_units(unit)
    kinds = unit.dimensionality
    exponents = tuple(int(kinds.get(f"[{kind}]", 0)) for kind in ("mass", "length", "time", "angle"))
    return Fraction(worth), exponents  # type: ignore[return-value]


@lru_cache(maxsize=1)
def _registry() -> Any:
    import pint

    registry: Any = pint.UnitRegistry(None, cache_folder=None, non_int_type=Fraction)
    for line in DEFINITIONS.splitlines():
        if line:
            registry.define(line)
    return registry


def _with_unit(shown: str, wanted: Dimension, defaults: Mapping[str, str] | None) -> str:
    if wanted.always:
        return f"{shown} Hz, {shown} rpm or {shown} rad/s"
    return f"{shown} {(defaults or {}).get(wanted.name) or wanted.unit}".strip()


def _as_example(names: tuple[str, ...]) -> str:
    wanted = DIMENSIONS[names[0]]
    return f"{wanted.words} such as {wanted.example}"


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
    return f"`{_short(str(value))}`"


def _short(text: str) -> str:
    """Text fit for one line of a message."""
    shown = "".join(character if character.isprintable() else " " for character in text[:61])
    return shown if len(text) <= 60 else f"{shown[:60]}…"
