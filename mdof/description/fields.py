"""Readers of single values: quantities, points, directions, values by direction; and the base of every schema class.

A reader turns what the file says into an SI value or complains; several complaints of one value are kept together,
each with the key path below that value. Pydantic carries them upwards and nests the paths.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, field
from itertools import islice
from typing import Any, ClassVar

from pydantic import BaseModel, ConfigDict, ValidationError, model_validator
from pydantic_core import InitErrorDetails, PydanticCustomError, core_schema

from mdof.units import DIMENSIONS, QuantityError, nearest, read

__all__ = ["DIRECTIONS", "Context", "Quantity", "Reads", "Scaled", "Section", "Trouble", "troubles"]

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


def _details(entry: Trouble, value: Any = None) -> InitErrorDetails:
    context = {"message": entry.message, "expected": entry.expected, "on_key": entry.on_key}
    return InitErrorDetails(type=PydanticCustomError("mdof", "{message}", context), loc=entry.path, input=value)


def as_validation_error(entries: Iterable[Trouble]) -> ValidationError:
    """Complaints in the form that pydantic nests into its own."""
    return ValidationError.from_exception_data("model", [_details(entry) for entry in entries])


class Reads:
    """Annotation that reads a field by a function of the raw value and the validation info."""

    def __init__(self, function: Callable[[Any, Any], Any], schema: Mapping[str, Any]) -> None:
        self.function = function
        self.schema = schema

    def __get_pydantic_core_schema__(self, source: Any, handler: Any) -> core_schema.CoreSchema:
        return core_schema.with_info_plain_validator_function(self._read)

    def __get_pydantic_json_schema__(self, schema: Any, handler: Any) -> dict[str, Any]:
        return dict(self.schema)

    def _read(self, value: Any, info: Any) -> Any:
        try:
            return self.function(value, info)
        except Refused as refused:
            raise as_validation_error(refused.entries) from None


def context_of(info: Any) -> Context:
    """The reading context of a validation; without one no bare number has a unit."""
    return info.context if isinstance(info.context, Context) else Context()


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


def unknown_key(key: Any, known: Iterable[str], what: str = "key") -> Trouble:
    choices = list(known)
    close = nearest(str(key), choices)
    listed = f"the {what}s here are {', '.join(choices)}"
    expected = f"did you mean `{close}`? {listed}" if close else listed
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


class Section(BaseModel):
    """A mapping of the model file: frozen, no unknown keys, every complaint kept."""

    model_config = ConfigDict(frozen=True, extra="forbid", arbitrary_types_allowed=True, defer_build=True)

    #: What a reader of the file would write here, for the message when something else stands there.
    example: ClassVar[str] = "a mapping of keys"

    @classmethod
    def shorthand(cls, raw: Any) -> Any:
        """A chance to accept a shorter form; returns a mapping, or the value unchanged."""
        return raw

    @model_validator(mode="wrap")
    @classmethod
    def _strict(cls, raw: Any, handler: Any) -> Any:
        if isinstance(raw, cls):
            return raw
        raw = cls.shorthand(raw)
        if not isinstance(raw, Mapping):
            raise as_validation_error([Trouble((), f"{kind_of(raw)} where a mapping belongs", f"write {cls.example}")])
        fields = cls.model_fields
        entries = [unknown_key(key, fields) for key in islice((key for key in raw if key not in fields), MOST_UNKNOWN)]
        entries += [
            Trouble((key,), "no value is given", f"write one, or remove the key `{key}`")
            for key in raw
            if key in fields and raw[key] is None
        ]
        known = {key: value for key, value in raw.items() if key in fields and value is not None}
        try:
            made = handler(known)
        except ValidationError as error:
            missing = [key for key in raw if key in fields and raw[key] is None]
            entries += [entry for entry in troubles(error, cls) if not (entry.path and entry.path[0] in missing)]
        if entries:
            raise as_validation_error(entries)
        return made


def troubles(error: ValidationError, owner: type[BaseModel] | None = None) -> list[Trouble]:
    """The complaints inside a pydantic error, in mdof's words."""
    result = []
    for entry in error.errors(include_url=False, include_input=True):
        path = tuple(entry["loc"])
        context = entry.get("ctx", {})
        kind = entry["type"]
        if kind == "mdof":
            result.append(Trouble(path, context["message"], context["expected"], context["on_key"]))
        elif kind == "missing":
            name = str(path[-1])
            known = owner.model_fields.get(name) if owner is not None and len(path) == 1 else None
            result.append(
                Trouble(
                    path,
                    f"`{name}` is missing",
                    f"add it: {known.description}" if known and known.description else "add it",
                )
            )
        else:
            what = {
                "tuple_type": "a list belongs here",
                "list_type": "a list belongs here",
                "dict_type": "a mapping belongs here",
                "too_short": "too few entries",
                "too_long": "too many entries",
            }.get(kind, entry["msg"])
            result.append(Trouble(path, what, ""))
    return result
