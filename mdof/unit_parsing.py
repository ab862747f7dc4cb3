"""Unit expressions: names, powers and their exact factors to SI."""

from __future__ import annotations

import difflib
import re
from fractions import Fraction
from functools import lru_cache
from typing import Any

from mdof.errors import UsageError
from mdof.unit_tables import COMMON, DEFINITIONS, HINTS, NAMES, Exponents

__all__ = ["QuantityError", "factor_of", "fraction", "known", "nearest", "short"]


_MOST_COMPARED = 1000
#: Units that are written before another one without a sign between them.
_BEFORE = ("N", "kN", "kg", "g", "lb", "lbf", "kgf")
LONGEST_UNIT = 80
_TOKEN = re.compile(r"\s*([A-Za-z%]+0?|[0-9]+|[*/^()-])")
_SIGNS = str.maketrans({"·": "*", "⋅": "*", "×": "*", "²": "^2", "³": "^3", "⁴": "^4", "µ": "u", "μ": "u", "°": "deg"})


class QuantityError(UsageError):
    """A number or unit that cannot be read as asked: ``message`` says what is wrong, ``expected`` what to write."""

    def __init__(self, message: str, expected: str = "") -> None:
        self.message = message
        self.expected = expected
        super().__init__(f"{message}; {expected}" if expected else message)


def nearest(word: str, choices: Any, cutoff: float = 0.6) -> str | None:
    """The choice that looks most like ``word``, or None where none does; ``cutoff`` is the likeness needed, 0 to 1."""
    options = [str(choice) for choice in choices]
    if len(options) > _MOST_COMPARED:
        # Comparing is slow; among many names those of about the same length are enough.
        options.sort(key=lambda option: abs(len(option) - len(word)))
        options = options[:_MOST_COMPARED]
    folded = {option.casefold(): option for option in reversed(options)}
    if word.casefold() in folded:
        return folded[word.casefold()]
    found = difflib.get_close_matches(word[:60], options, n=1, cutoff=cutoff)
    return found[0] if found else None


@lru_cache(maxsize=2048)
def factor_of(unit: str) -> tuple[Fraction, Exponents]:
    """What one of ``unit`` is in SI, exactly, with its exponents of mass, length, time and angle.

    Raises
    ------
    QuantityError
        If it is not a unit, with what to write instead.
    """
    clean = (
        unit.strip().translate(_SIGNS).replace("**", "^").replace(" ", "") if " " not in unit.strip() else _joined(unit)
    )
    common = COMMON.get(clean)
    if common is not None:
        return fraction(common[0]), common[1]
    powers = _parse(unit, clean)
    return _ask_pint(tuple(sorted(powers.items())))


def _joined(unit: str) -> str:
    """The unit without blanks; blanks between two names are refused because `N/m s` has two readings."""
    clean = re.sub(r"\s*([*/^()])\s*", r"\1", unit.strip().translate(_SIGNS).replace("**", "^"))
    if re.search(r"\s", clean):
        joined = re.sub(r"[ ]+", "*", short(clean))
        real = all(name in NAMES for name in re.findall(r"[^\W\d_]+", joined))
        raise QuantityError(
            f"`{short(unit)}` is not a unit", f"join units with * and /, such as {joined if real else 'N*s/m'}"
        )
    return clean


def fraction(text: str) -> Fraction:
    """A factor of the table of common units: a decimal number, a product or a quotient of two."""
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
        f"`{short(written)}` is not a unit", "join units with * and /, powers with ^, such as N*s/m or kg*m^2"
    )
    if not text or len(text) > LONGEST_UNIT:
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
                last = {known(token, written): 1}
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


def known(name: str, written: str) -> str:
    """The name if pint was told of it, refused with the nearest one if not; ``written`` is the whole unit."""
    if name == "%":
        return "percent"
    if name in NAMES and name != "percent":
        return name
    hint = HINTS.get(name) or _run_together(name) or nearest(name, sorted(NAMES - {"percent"}))
    raise QuantityError(
        f"`{short(written)}` is not a unit mdof knows"
        if name == written
        else f"`{short(name)}` in `{short(written)}` is not a unit mdof knows",
        f"write {hint}" if hint else "join units with * and /, such as N*s/m; the manual lists the units",
    )


def _run_together(name: str) -> str | None:
    """``N*mm`` for ``Nmm``: two units without a sign between them, the first a force or a mass."""
    for place in range(1, len(name)):
        first, second = name[:place], name[place:]
        exact = [unit for unit in _BEFORE if unit == first] or [unit for unit in _BEFORE if unit.lower() == first]
        if len(exact) == 1 and second in NAMES:
            return f"{exact[0]}*{second}"
    return None


@lru_cache(maxsize=2048)
def _ask_pint(powers: tuple[tuple[str, int], ...]) -> tuple[Fraction, Exponents]:
    if not powers:
        return Fraction(1), (0, 0, 0, 0)
    registry = _registry()
    unit = registry.parse_units(" * ".join(f"{name} ** {power}" for name, power in powers))
    worth, _ = registry.get_base_units(unit)
    kinds = unit.dimensionality
    mass, length, time, angle = (int(kinds.get(f"[{kind}]", 0)) for kind in ("mass", "length", "time", "angle"))
    return Fraction(worth), (mass, length, time, angle)


@lru_cache(maxsize=1)
def _registry() -> Any:
    import pint

    registry: Any = pint.UnitRegistry(None, cache_folder=None, non_int_type=Fraction)
    for line in DEFINITIONS.splitlines():
        if line:
            registry.define(line)
    return registry


def short(text: str) -> str:
    """Text fit for one line of a message."""
    shown = "".join(character if character.isprintable() else " " for character in text[:61])
    return shown if len(text) <= 60 else f"{shown[:60]}…"
