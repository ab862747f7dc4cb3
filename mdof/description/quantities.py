"""Single values of the file: numbers with what is known about them, and complaints about what stands there instead."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from typing import Any

from mdof.units import DIMENSIONS, QuantityError, nearest, read

__all__ = [
    "DIRECTIONS",
    "MOST_UNKNOWN",
    "QUANTITY_KEYS",
    "Context",
    "Quantity",
    "Refused",
    "Scaled",
    "Trouble",
    "kind_of",
    "read_quantity",
    "refuse",
    "unknown_key",
]

#: Unknown keys told of one mapping; more of them are no slip of the pen.
MOST_UNKNOWN = 20

DIRECTIONS = ("x", "y", "z", "rx", "ry", "rz")
STATUS_WORDS = "a word such as measured, calculated, quoted or assumed"


@dataclass(frozen=True, slots=True)
class Quantity:
    """A number of the model with what is known about it.

    Attributes
    ----------
    value : SI value.
    text : as written.
    dimension : key of :data:`mdof.units.DIMENSIONS`.
    tolerance : relative, 0.08 for 8 %; None where none is stated.
    source, status : where the number comes from and how good it is; None where not stated.
    """

    value: float
    text: str = ""
    dimension: str = "number"
    tolerance: float | None = None
    source: str | None = None
    status: str | None = None

    def __float__(self) -> float:
        return self.value

    def to_si(self) -> float | dict[str, Any]:
        """The bare SI number, or a mapping where something more is known about it."""
        value = self.value + 0.0  # no negative zero
        known = {"tolerance": self.tolerance, "source": self.source, "status": self.status}
        stated = {key: entry for key, entry in known.items() if entry is not None}
        return {"value": value, **stated} if stated else value


@dataclass(frozen=True, slots=True)
class Scaled:
    """A value of the file times a factor, as a state's ``scale`` makes it."""

    raw: Any
    factor: float


@dataclass(frozen=True, slots=True)
class Context:
    """What the meaning of a value depends on: units of bare numbers, and the directions bodies may move in."""

    units: Mapping[str, str] = field(default_factory=dict)
    directions: tuple[str, ...] = ("x",)

    @property
    def torsional(self) -> bool:
        """True where every direction is a rotation."""
        return all(direction.startswith("r") for direction in self.directions)


@dataclass(frozen=True, slots=True)
class Trouble:
    """One complaint: a key path, what is wrong, what to write, and whether the key itself is meant."""

    path: tuple[str | int, ...]
    message: str
    expected: str = ""
    on_key: bool = False

    def below(self, path: tuple[str | int, ...]) -> Trouble:
        """The same complaint seen from further up."""
        return Trouble((*path, *self.path), self.message, self.expected, self.on_key)


class Refused(Exception):
    """Complaints of a reader on their way to pydantic."""

    def __init__(self, *entries: Trouble) -> None:
        self.entries = entries
        super().__init__()


def refuse(message: str, expected: str = "", path: tuple[str | int, ...] = (), on_key: bool = False) -> Refused:
    """A single complaint, ready to raise."""
    return Refused(Trouble(path, message, expected, on_key))


def read_quantity(raw: Any, dimensions: tuple[str, ...], context: Context) -> Quantity:
    """A number, a quantity text or ``{value, tolerance, source, status}``.

    Raises
    ------
    Refused
        With every complaint about it.
    """
    if isinstance(raw, Quantity):
        if raw.dimension in dimensions:
            return raw
        raise refuse(f"this is {DIMENSIONS[raw.dimension].words}", f"give {DIMENSIONS[dimensions[0]].words}")
    factor = 1.0
    while isinstance(raw, Scaled):
        factor *= raw.factor
        raw = raw.raw
    if isinstance(raw, Mapping):
        return _quantity_mapping(raw, dimensions, context, factor)
    try:
        value, dimension = read(raw, dimensions, context.units)
    except QuantityError as error:
        raise refuse(error.message, error.expected) from None
    return Quantity(value * factor if factor != 1.0 else value, _written(raw), dimension)


QUANTITY_KEYS = ("value", "tolerance", "source", "status")


def _quantity_mapping(raw: Mapping[Any, Any], dimensions: tuple[str, ...], context: Context, factor: float) -> Quantity:
    entries = [unknown_key(key, QUANTITY_KEYS) for key in raw if key not in QUANTITY_KEYS]
    value, tolerance = Quantity(0.0), None
    if "value" not in raw:
        entries.append(
            Trouble((), "`value` is missing", f"write {{value: {DIMENSIONS[dimensions[0]].example}, tolerance: 8 %}}")
        )
    elif isinstance(raw["value"], Mapping):
        entries.append(
            Trouble(("value",), "a mapping where a number belongs", f"write {DIMENSIONS[dimensions[0]].example}")
        )
    else:
        try:
            value = read_quantity(raw["value"], dimensions, context)
        except Refused as refused:
            entries.extend(entry.below(("value",)) for entry in refused.entries)
    if "tolerance" in raw:
        try:
            tolerance = read_quantity(raw["tolerance"], ("number",), context).value
        except Refused as refused:
            entries.extend(entry.below(("tolerance",)) for entry in refused.entries)
        else:
            if not 0.0 <= tolerance < 1.0:
                shown = f"{tolerance:g}"
                way = (
                    f"write {shown} %"
                    if 1.0 <= tolerance < 100.0
                    else "write a share from 0 to below 100 %, such as 8 %"
                )
                entries.append(Trouble(("tolerance",), f"a tolerance of {tolerance * 100:g} % is not possible", way))
    words = {}
    for key in ("source", "status"):
        if key in raw:
            words[key] = raw[key]
            if not isinstance(raw[key], str) or not raw[key].strip():
                entries.append(
                    Trouble(
                        (key,),
                        "text belongs here",
                        f"write {STATUS_WORDS}" if key == "status" else 'write text such as "test sheet 12"',
                    )
                )
    if entries:
        raise Refused(*entries)
    return Quantity(
        value.value * factor if factor != 1.0 else value.value,
        value.text,
        value.dimension,
        tolerance,
        words.get("source"),
        words.get("status"),
    )


def _written(raw: Any) -> str:
    return raw if isinstance(raw, str) else f"{raw}"


#: What people call a damping ratio.
_RATIOS = ("damping_ratio", "zeta", "ratio")


def unknown_key(key: Any, known: Iterable[str], what: str = "key") -> Trouble:
    """Complaint about a key that nothing goes by, with the nearest one that is known."""
    choices = list(known)
    close = nearest(str(key), choices)
    listed = f"the {what}s here are {', '.join(choices)}"
    expected = f"did you mean `{close}`? {listed}" if close else listed
    name, colon, rest = str(key).partition(":")
    if colon and name in choices:
        expected = f"put a blank after the colon: `{name}: {rest.strip()[:30]}`"
    elif key in _RATIOS and "loss_factor" in choices:
        expected = (
            "one connection takes `loss_factor`, twice the damping ratio it alone would give; a ratio of the whole "
            "machine belongs under `damping`"
        )
    return Trouble((str(key),), f"unknown {what} `{str(key)[:60]}`", expected, True)


def kind_of(raw: Any) -> str:
    """What stands there instead of what belongs there."""
    if raw is None:
        return "nothing"
    if isinstance(raw, Mapping):
        return "a mapping"
    if isinstance(raw, list | tuple):
        return "a list"
    return "text" if isinstance(raw, str) else "one value"
