"""From the plain values of a document to validated parts of a model, with every complaint at once."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

from pydantic import ValidationError

from mdof.description.bodies import Body, Support
from mdof.description.connections import Connection, PropertySet
from mdof.description.fields import Section, troubles
from mdof.description.quantities import Context, Refused, Trouble, kind_of, unknown_key
from mdof.description.readers import DIRECTION_LIST, NAME_RULE, TEXT, name_fault
from mdof.description.readers import of as quantity_of
from mdof.description.whole import Criteria, Damping, Load, Watch
from mdof.description.whole_checks import MOST_TROUBLES, Parts, check_whole
from mdof.units import DIMENSIONS, QuantityError, factor, nearest

__all__ = ["NAMED", "TOP", "Memory", "build"]

#: Sections that hold named entries.
NAMED: dict[str, type[Section]] = {
    "supports": Support,
    "property_sets": PropertySet,
    "bodies": Body,
    "connections": Connection,
    "watch": Watch,
    "loads": Load,
}
#: Every key a model file may have.
TOP = (
    "title",
    "units",
    "directions",
    "reference_frequency",
    "supports",
    "property_sets",
    "bodies",
    "connections",
    "damping",
    "watch",
    "loads",
    "criteria",
    "states",
)


@dataclass(slots=True)
class Memory:
    """Entries already validated, by identity of what was written: states share most of them with the model."""

    entries: dict[tuple[int, str, int], tuple[Any, Any, list[Trouble]]] = field(default_factory=dict)


def build(raw: Mapping[str, Any], memory: Memory | None = None) -> tuple[dict[str, Any], list[Trouble]]:
    """Validate a whole model.

    Returns
    -------
    values : fields of the model; only complete where there are no complaints.
    troubles : every complaint, paths from the top of the model.
    """
    parts = Parts()
    memory = memory or Memory()
    misspelt: set[str | None] = set()
    for key in raw:
        if len(parts.troubles) >= MOST_TROUBLES:
            break
        if key not in TOP:
            if key == "matrices":
                parts.troubles.append(
                    Trouble(
                        (key,),
                        "`matrices` is not supported yet in this version of the grammar",
                        "describe the bodies here",
                        True,
                    )
                )
            else:
                parts.troubles.append(unknown_key(key, TOP))
                misspelt.add(nearest(str(key), TOP))
        elif raw[key] is None:
            parts.troubles.append(Trouble((key,), "no value is given", f"write one, or remove the key `{key}`"))
    given = {key: value for key, value in raw.items() if value is not None}
    # Units under a misspelt key are there: every bare number would be told to lack them.
    units = _units(given.get("units", "SI" if "units" in misspelt else {}), parts)
    directions = _single(parts, "directions", DIRECTION_LIST, given, Context(units)) or ("x",)
    context = Context(units, directions)
    parts.values["units"] = units
    parts.values["directions"] = directions
    parts.values["title"] = _single(parts, "title", TEXT, given, context) or "Untitled model"
    parts.values["reference_frequency"] = _single(
        parts, "reference_frequency", quantity_of("frequency", positive=True), given, context
    )
    written = {name: _named(parts, name, given, context, memory) for name in NAMED}
    for name, section in (("damping", Damping), ("criteria", Criteria)):
        parts.values[name] = None
        if name in given:
            parts.values[name] = _validated(parts, section, given[name], (name,), context, memory)
    if not misspelt & {*NAMED, "units", "directions"}:
        # Without a section that hides under a wrong name everything that refers to it would be wrong, too.
        check_whole(parts, written, directions, given)
    if parts.values["criteria"] is None:
        parts.values["criteria"] = Criteria.model_validate({})
    return parts.values, parts.troubles


def _units(raw: Any, parts: Parts) -> dict[str, str]:
    if raw == "SI":
        return {"": "SI"}
    if not isinstance(raw, Mapping):
        parts.troubles.append(
            Trouble(
                ("units",),
                f"{kind_of(raw)} where the units of bare numbers belong",
                "write `units: SI` or {length: mm, stiffness: kN/m}",
            )
        )
        return {"": "SI"}
    known = [name for name, dimension in DIMENSIONS.items() if not dimension.always and name != "number"]
    result = {}
    for key, unit in raw.items():
        path = ("units", key)
        if key not in known:
            if key in DIMENSIONS:
                parts.troubles.append(
                    Trouble(
                        path,
                        f"{DIMENSIONS[key].words} never takes its unit from here",
                        "write the unit beside every such number",
                        True,
                    )
                )
            else:
                parts.troubles.append(unknown_key(key, known).below(("units",)))
            continue
        if not isinstance(unit, str):
            parts.troubles.append(
                Trouble(path, f"{kind_of(unit)} where a unit belongs", f"write a unit such as {DIMENSIONS[key].unit}")
            )
            continue
        try:
            factor(unit, key)
        except QuantityError as error:
            known_unit = "not a unit mdof knows" in error.message
            message = error.message if known_unit else f"`{unit[:40]}` is not a unit of {DIMENSIONS[key].words}"
            parts.troubles.append(
                Trouble(path, message, error.expected if known_unit else f"write a unit such as {DIMENSIONS[key].unit}")
            )
            result[key] = DIMENSIONS[key].unit
        else:
            result[key] = unit
    return result


@dataclass(slots=True)
class _Info:
    """What readers see outside a schema class."""

    context: Context
    data: dict[str, Any]


def _single(parts: Parts, name: str, reader: Any, given: Mapping[str, Any], context: Context) -> Any:
    if name not in given:
        return None
    try:
        return reader.function(given[name], _Info(context, {}))
    except Refused as refused:
        parts.troubles.extend(trouble.below((name,)) for trouble in refused.entries)
        return None


def _validated(
    parts: Parts, section: type[Section], raw: Any, path: tuple[str | int, ...], context: Context, memory: Memory
) -> Any:
    # What a bare number means hangs on the directions, so those belong to the key; the raw value is kept alive with it.
    key = (id(raw), section.__name__, hash(context.directions))
    if key in memory.entries:
        _, made, found = memory.entries[key]
    else:
        made, found = None, []
        try:
            made = section.model_validate(raw, context=context)
        except ValidationError as error:
            found = troubles(error)
        memory.entries[key] = (raw, made, found)
    parts.troubles.extend(trouble.below(path) for trouble in found)
    return made


def _named(parts: Parts, name: str, given: Mapping[str, Any], context: Context, memory: Memory) -> dict[str, Any]:
    """All entries of a section as written, None for those that are wrong; the valid ones go to the model."""
    section = NAMED[name]
    parts.values[name] = {}
    if name not in given:
        return {}
    raw = given[name]
    if not isinstance(raw, Mapping):
        parts.troubles.append(
            Trouble((name,), f"{kind_of(raw)} where named entries belong", f"write {{name: {section.example}}}")
        )
        return {}
    written: dict[str, Any] = {}
    for key, entry in raw.items():
        if len(parts.troubles) >= MOST_TROUBLES:
            break
        fault = name_fault(key)
        if fault:
            parts.troubles.append(Trouble((name, key), fault, NAME_RULE, True))
        if entry is None:
            parts.troubles.append(Trouble((name, key), "nothing is described", f"write {section.example}"))
            written[key] = None
            continue
        written[key] = _validated(parts, section, entry, (name, key), context, memory)
    parts.values[name] = {key: entry for key, entry in written.items() if entry is not None}
    return written
