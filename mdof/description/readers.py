"""Readers of single fields: quantities, points, directions, values by direction, names."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from typing import Any, cast

from mdof.description.fields import Reads, context_of
from mdof.description.quantities import (
    DIRECTIONS,
    MOST_UNKNOWN,
    QUANTITY_KEYS,
    Context,
    Quantity,
    Refused,
    Trouble,
    kind_of,
    read_quantity,
    refuse,
    unknown_key,
)
from mdof.units import DIMENSIONS, nearest


def of(*dimensions: str, positive: bool = False, at_least_zero: bool = False) -> Reads:
    """Reader of one quantity of the given dimension(s)."""

    def function(raw: Any, info: Any) -> Quantity:
        value = read_quantity(raw, dimensions, context_of(info))
        if positive and value.value <= 0:
            raise refuse(
                f"{_written_of(value)} must be greater than zero", f"write {DIMENSIONS[value.dimension].example}"
            )
        if at_least_zero and value.value < 0:
            raise refuse(f"{_written_of(value)} must not be negative", f"write {DIMENSIONS[value.dimension].example}")
        return value

    return Reads(function, {"x-quantity": list(dimensions)})


def plain(*dimensions: str, positive: bool = False, at_least_zero: bool = False) -> Reads:
    """Like :func:`of`, but the field holds the bare SI float."""
    reader = of(*dimensions, positive=positive, at_least_zero=at_least_zero)
    return Reads(lambda raw, info: reader.function(raw, info).value, reader.schema)


def _written_of(value: Quantity) -> str:
    return f"{DIMENSIONS[value.dimension].words} of {value.text}"


def _triple(raw: Any, what: str) -> Sequence[Any]:
    if hasattr(raw, "tolist"):
        raw = raw.tolist()
    if not isinstance(raw, list | tuple) or len(raw) != 3:
        count = f"{len(raw)} values" if isinstance(raw, list | tuple) else kind_of(raw)
        comma = isinstance(raw, list | tuple) and len(raw) > 3
        raise refuse(
            f"{count} where three belong", f"write {what}" + (", with decimal points and not commas" if comma else "")
        )
    return raw


def three_of(raw: Sequence[Any], dimension: str, context: Context) -> tuple[Quantity, ...]:
    """Three quantities; what several of them lack is said once."""
    bare = [entry for entry in raw if isinstance(entry, int | float) and not isinstance(entry, bool)]
    if len(bare) > 1 and dimension not in context.units and "" not in context.units:
        unit = DIMENSIONS[dimension].unit
        shown = ", ".join(
            f"{entry:g} {unit}" if entry in bare else entry[:20] if isinstance(entry, str) else ".." for entry in raw
        )
        raise refuse(
            f"{len(bare)} of three numbers have no unit and `units` does not cover {dimension}",
            f"write [{shown}], or add `{dimension}: {unit}` to `units` (`units: SI` covers all)",
        )
    return each(raw, lambda entry: read_quantity(entry, (dimension,), context))


def each(raw: Sequence[Any], function: Callable[[Any], Any]) -> tuple[Any, ...]:
    """The function of every entry; complaints of all entries together."""
    values: list[Any] = []
    entries: list[Trouble] = []
    for index, entry in enumerate(raw):
        try:
            values.append(function(entry))
        except Refused as refused:
            entries.extend(trouble.below((index,)) for trouble in refused.entries)
    if entries:
        raise Refused(*entries)
    return tuple(values)


def triple_of(dimension: str, what: str) -> Reads:
    """Reader of three quantities in a list."""

    def function(raw: Any, info: Any) -> tuple[Quantity, ...]:
        context = context_of(info)
        return three_of(_triple(raw, what), dimension, context)

    schema = {"type": "array", "items": {"x-quantity": [dimension]}, "minItems": 3, "maxItems": 3}
    return Reads(function, schema)


POINT_WORDS = "[x, y, z] in the units of length"
POINT = triple_of("length", POINT_WORDS)


def read_point(raw: Any, context: Context) -> tuple[Quantity, ...]:
    """A point in space, three lengths."""
    return three_of(_triple(raw, POINT_WORDS), "length", context)


def _vector(raw: Any, info: Any) -> tuple[float, float, float]:
    context = context_of(info)
    values = each(
        _triple(raw, "a direction [x, y, z] such as [1, 0, 0]"),
        lambda entry: read_quantity(entry, ("number",), context).value,
    )
    if not any(values) or not math.isfinite(math.hypot(*values)):
        raise refuse("a direction of length zero", "write [1, 0, 0] for the x direction")
    return cast("tuple[float, float, float]", values)


VECTOR = Reads(_vector, {"type": "array", "items": {"type": "number"}, "minItems": 3, "maxItems": 3})


def _directions(raw: Any, _info: Any) -> tuple[str, ...]:
    if not isinstance(raw, list | tuple) or not raw:
        raise refuse(
            f"{kind_of(raw) if not isinstance(raw, list | tuple) else 'an empty list'} where directions belong",
            "write a list such as [x, y, z, rx, ry, rz]",
        )
    entries = []
    for index, entry in enumerate(raw[:MOST_UNKNOWN]):
        if entry not in DIRECTIONS:
            close = nearest(str(entry), DIRECTIONS)
            way = f"did you mean `{close}`? " if close else ""
            entries.append(
                Trouble(
                    (index,), f"unknown direction `{str(entry)[:40]}`", f"{way}directions are {', '.join(DIRECTIONS)}"
                )
            )
        elif entry in raw[:index]:
            entries.append(Trouble((index,), f"the direction `{entry}` is written twice", "keep one"))
    if entries:
        raise Refused(*entries)
    return tuple(direction for direction in DIRECTIONS if direction in raw)


DIRECTION_LIST = Reads(
    _directions,
    {"type": "array", "items": {"enum": list(DIRECTIONS)}, "minItems": 1, "maxItems": 6, "uniqueItems": True},
)


def choice(options: Sequence[str]) -> Reads:
    """Reader of one word out of a few."""

    def function(raw: Any, _info: Any) -> str:
        if raw in options:
            return str(raw)
        close = nearest(str(raw), options)
        way = f"did you mean `{close}`? " if close else ""
        raise refuse(f"unknown word `{str(raw)[:40]}`", f"{way}write one of {', '.join(options)}")

    return Reads(function, {"enum": list(options)})


def _truth(raw: Any, _info: Any) -> bool:
    if isinstance(raw, bool):
        return raw
    raise refuse(f"{kind_of(raw)} where true or false belongs", "write true or false")


TRUTH = Reads(_truth, {"type": "boolean"})


def _text(raw: Any, _info: Any) -> str:
    if isinstance(raw, str) and raw.strip():
        return raw
    shown = "empty text" if isinstance(raw, str) else kind_of(raw)
    raise refuse(f"{shown} where text belongs", "write text; put numbers meant as text in quotes")


TEXT = Reads(_text, {"type": "string", "minLength": 1})

NAME_RULE = "a name may hold any printable text except `.` and `/`, without blanks at its ends"


def name_fault(name: Any) -> str | None:
    """Why a text cannot be a name, or None."""
    if not isinstance(name, str):
        return f"the name {str(name)[:40]!r} is not text"
    if not name or name != name.strip():
        return "a name is empty or has blanks at its ends"
    if "." in name or "/" in name:
        return f"the name `{name[:60]}` holds `{'.' if '.' in name else '/'}`"
    if not name.isprintable():
        return f"the name {name[:60]!r} holds characters that cannot be printed"
    return "the name is longer than 100 characters" if len(name) > 100 else None


def named_list(count: int, words: str) -> Reads:
    """Reader of a list of so many names."""

    def function(raw: Any, _info: Any) -> tuple[str, ...]:
        if not isinstance(raw, list | tuple) or len(raw) != count:
            shown = f"{len(raw)} names" if isinstance(raw, list | tuple) else kind_of(raw)
            raise refuse(f"{shown} where {count} names belong", f"write {words}")
        entries = [
            Trouble(
                (index,),
                f"{kind_of(entry)} where a name belongs",
                "write the name of a body, or ground; put numbers in quotes",
            )
            for index, entry in enumerate(raw)
            if not isinstance(entry, str)
        ]
        if entries:
            raise Refused(*entries)
        return tuple(raw)

    return Reads(function, {"type": "array", "items": {"type": "string"}, "minItems": count, "maxItems": count})


def by_direction(translation: str, rotation: str, words: str) -> Reads:
    """Reader of one value, or of values by direction; rotations have their own dimension."""

    def function(raw: Any, info: Any) -> Quantity | dict[str, Quantity]:
        context = context_of(info)
        if isinstance(raw, Mapping) and not any(key in raw for key in QUANTITY_KEYS):
            return _read_directions(raw, translation, rotation, context, words)
        known = info.data or {}
        # What a single bare number means: along a line or tooth contact it is a translation.
        gear = known.get("gear")
        along = (
            known.get("axis") is not None
            or known.get("ends") is not None
            or (gear is not None and gear.radii is not None)
        )
        turning = (context.torsional and not along) or (gear is not None and gear.ratio is not None)
        order = (rotation, translation) if turning else (translation, rotation)
        return read_quantity(raw, order if rotation != translation else (translation,), context)

    one = {"x-quantity": sorted({translation, rotation}, key=[translation, rotation].index)}
    many = {
        "type": "object",
        "properties": {
            name: {
                "description": f"{'About' if name[0] == 'r' else 'Along'} {name[-1]}.",
                "x-quantity": [rotation if name[0] == "r" else translation],
            }
            for name in DIRECTIONS
        },
        "additionalProperties": False,
        "minProperties": 1,
    }
    return Reads(function, {"anyOf": [one, many]})


def _read_directions(
    raw: Mapping[Any, Any], translation: str, rotation: str, context: Context, words: str
) -> dict[str, Quantity]:
    if not raw:
        raise refuse("an empty mapping", f"write {words}")
    values: dict[str, Quantity] = {}
    entries: list[Trouble] = []
    for key, entry in raw.items():
        if len(entries) >= MOST_UNKNOWN:
            break
        if key not in DIRECTIONS:
            entries.append(unknown_key(key, DIRECTIONS, "direction"))
            continue
        try:
            values[str(key)] = read_quantity(entry, (rotation if key[0] == "r" else translation,), context)
        except Refused as refused:
            entries.extend(trouble.below((str(key),)) for trouble in refused.entries)
    if entries:
        raise Refused(*entries)
    return {direction: values[direction] for direction in DIRECTIONS if direction in values}
