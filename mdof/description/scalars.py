"""What an unquoted YAML scalar means, and every spelling that YAML 1.1 and YAML 1.2 read differently."""

from __future__ import annotations

import re
from typing import Any

__all__ = ["resolve"]

_INTEGER = re.compile(r"[-+]?(?:0|[1-9][0-9]*)")
_FLOAT = re.compile(r"[-+]?(?:[0-9]+\.[0-9]*|\.[0-9]+)(?:[eE][-+][0-9]+)?")
_LOOSE_FLOAT = re.compile(r"([-+]?)([0-9]*\.?[0-9]*)[eE]([-+]?)([0-9]+)")
_OTHER_BASE = re.compile(r"[-+]?0(?:[0-9_]+|o[0-7_]+|x[0-9a-fA-F_]+|b[01_]+)")
_GROUPED = re.compile(r"[-+]?[0-9][0-9_]*_[0-9_]*(?:\.[0-9_]*)?")
_BASE_SIXTY = re.compile(r"[-+]?[0-9][0-9_]*(?::[0-5]?[0-9])+(?:\.[0-9_]*)?")
_NOT_FINITE = re.compile(r"[-+]?\.(?:inf|Inf|INF)|\.(?:nan|NaN|NAN)")
_TRUTHS = {"true": True, "True": True, "TRUE": True, "false": False, "False": False, "FALSE": False}
_NULLS = frozenset(("", "~", "null", "Null", "NULL"))
_SWITCH_WORDS = frozenset(
    spelling for word in ("yes", "no", "on", "off") for spelling in (word, word.title(), word.upper())
)


def resolve(text: str) -> tuple[Any, str, str]:
    """What an unquoted scalar means, and where it has two meanings a complaint and what to write instead."""
    if text in _NULLS:
        return None, "", ""
    if text in _TRUTHS:
        return _TRUTHS[text], "", ""
    if text in _SWITCH_WORDS:
        truth = text.lower() in ("yes", "on")
        return (
            truth,
            f"`{text}` is true or false to some YAML readers and text to others",
            f'write true or false, or "{text}" in quotes',
        )
    first = text[0]
    if not (first.isdigit() or first in "+-."):
        return text, "", ""
    if _INTEGER.fullmatch(text):
        return (
            (int(text), "", "")
            if len(text) < 300
            else (0, "this number is too long", "write it as 1.0e+300 or shorter")
        )
    if _FLOAT.fullmatch(text):
        number = float(text)
        if number in (float("inf"), float("-inf")):
            return 0.0, f"{text[:40]} is beyond the range of numbers", "write a number below 1.0e+308"
        return number, "", ""
    loose = _LOOSE_FLOAT.fullmatch(text)
    if loose and re.search(r"[0-9]", loose.group(2)):
        sign, digits, exponent_sign, exponent = loose.groups()
        mantissa = digits if "." in digits else f"{digits}.0"
        better = f"{sign}{mantissa}e{exponent_sign or '+'}{exponent}"
        number = float(text)
        finite = abs(number) != float("inf")
        return (
            (number if finite else 0.0),
            f"`{text[:40]}` is a number to some YAML readers and text to others",
            f"write {better[:40]}",
        )
    if _OTHER_BASE.fullmatch(text):
        plain = text.lstrip("+-").lstrip("0_") or "0"
        meant = (
            f'write {plain[:40]}, or "{text[:40]}" in quotes for text'
            if plain.isdigit()
            else "write it as a decimal number"
        )
        return 0, f"`{text[:40]}` is an octal, hexadecimal or binary number to some YAML readers", meant
    if _GROUPED.fullmatch(text):
        return (
            0,
            f"`{text[:40]}` is a number to some YAML readers and text to others",
            f"write {text.replace('_', '')[:40]}",
        )
    if _BASE_SIXTY.fullmatch(text):
        return (
            0,
            f"`{text[:40]}` is a base-60 number to some YAML readers",
            f'write a decimal number with its unit, or "{text[:40]}" in quotes for text',
        )
    if _NOT_FINITE.fullmatch(text):
        return 0.0, f"`{text}` is not a number to calculate with", "write a finite number"
    return text, "", ""
