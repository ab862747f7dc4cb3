"""The JSON Schema of the model file, so that editors complete keys and show what each means."""

from __future__ import annotations

from collections.abc import Mapping
from functools import lru_cache
from typing import Annotated, Any

from pydantic import Field
from pydantic.json_schema import GenerateJsonSchema

from mdof.description.bodies import Body, Support
from mdof.description.connections import Connection, PropertySet
from mdof.description.fields import Section
from mdof.description.quantities import Quantity
from mdof.description.readers import DIRECTION_LIST, TEXT, of
from mdof.description.whole import Criteria, Damping, Load, Watch
from mdof.units import DIMENSIONS

__all__ = ["ModelFile", "json_schema"]


class ModelFile(Section):
    """A machine on its mounts: bodies, the connections that join them, and what is asked of it."""

    title: Annotated[str, TEXT] = Field("Untitled model", description="What the machine is, in a line.")
    units: Any = Field(
        None,
        description="What a bare number means, by dimension, such as {length: mm, stiffness: kN/m}; SI covers "
        "all. A number with its own unit always wins.",
    )
    directions: Annotated[tuple[str, ...], DIRECTION_LIST] = Field(
        ("x",), description="Directions every body may move in; a body may narrow them."
    )
    reference_frequency: Annotated[Quantity | None, of("frequency")] = Field(
        None, description="Frequency at which loss factors without their own reference act as dashpots in modes."
    )
    supports: dict[str, Support] = Field({}, description="Named grounds, which loads may move; `ground` always exists.")
    property_sets: dict[str, PropertySet] = Field({}, description="Values that several connections share.")
    bodies: dict[str, Body] = Field(description="The rigid bodies, by name.")
    connections: dict[str, Connection] = Field({}, description="What joins the bodies, by name.")
    damping: Damping | None = Field(None, description="Damping of the whole, besides that of the connections.")
    watch: dict[str, Watch] = Field({}, description="Points someone asks about, by name.")
    loads: dict[str, Load] = Field({}, description="What shakes the machine, by name.")
    criteria: Criteria | None = Field(None, description="Limits the user sets.")
    states: Any = Field(
        None, description="States by name: partial models merged over this one key by key; lists replace, null removes."
    )


class _Generator(GenerateJsonSchema):
    """Field descriptions stay, titles made from names go: they say nothing an editor needs."""

    def field_title_should_be_set(self, schema: Any) -> bool:
        return False


@lru_cache(maxsize=1)
def _made() -> dict[str, Any]:
    schema = ModelFile.model_json_schema(schema_generator=_Generator)
    definitions = schema.pop("$defs", {})
    properties = schema["properties"]
    for section, name in (
        ("supports", "Support"),
        ("property_sets", "PropertySet"),
        ("bodies", "Body"),
        ("connections", "Connection"),
        ("watch", "Watch"),
        ("loads", "Load"),
    ):
        entry: dict[str, Any] = {"$ref": f"#/$defs/{name}"}
        if name == "Body":
            entry = {"anyOf": [{"x-quantity": ["mass"]}, entry]}
        properties[section] |= {
            "additionalProperties": entry,
            "propertyNames": {"pattern": r"^[^./\s]([^./]*[^./\s])?$", "maxLength": 100},
        }
        properties[section].pop("default", None)
    properties["bodies"]["minProperties"] = 1
    named = [name for name, dimension in DIMENSIONS.items() if not dimension.always and name != "number"]
    table = {
        name: {
            "type": "string",
            "description": f"Unit of {DIMENSIONS[name].words}.",
            "examples": [DIMENSIONS[name].unit],
        }
        for name in named
    }
    properties["units"] = {
        "description": properties["units"]["description"],
        "anyOf": [{"const": "SI"}, {"type": "object", "properties": table, "additionalProperties": False}],
    }
    partial = {
        "from": {"type": "string", "description": "State this one starts from."},
        "scale": {
            "type": "object",
            "description": "Factors by path, such as property_sets.rubber.stiffness: 1.4.",
            "additionalProperties": {"x-quantity": ["number"]},
        },
    }
    changes = {
        name: {"description": f"Changes to `{name}`, merged key by key."}
        for name in properties
        if name not in ("units", "states")
    }
    properties["states"] = {
        "type": "object",
        "description": properties["states"]["description"],
        "additionalProperties": {"type": "object", "properties": partial | changes, "additionalProperties": False},
    }
    whole = {
        "$schema": "https://json-schema.org/draft/2020-12/schema",
        **schema,
        "title": "mdof model file, grammar version 1",
        "$defs": definitions,
    }
    used: set[str] = set()
    finished: dict[str, Any] = _with_quantities(whole, used)
    finished["$defs"] = dict(sorted(finished["$defs"].items())) | {
        f"quantity_{name}": _quantity(name.split("_or_")) for name in sorted(used)
    }
    return finished


def json_schema() -> dict[str, Any]:
    """JSON Schema of the model file, draft 2020-12; a quantity may be a number, a text with its unit, or a mapping."""
    import copy

    return copy.deepcopy(_made())


def _with_quantities(node: Any, used: set[str]) -> Any:
    """Replace each quantity's mark by a reference to the one definition of its dimension."""
    if isinstance(node, list):
        return [_with_quantities(entry, used) for entry in node]
    if not isinstance(node, Mapping):
        return node
    result = {
        key: _with_quantities(entry, used)
        for key, entry in node.items()
        if key not in ("x-quantity", "default") or "x-quantity" not in node
    }
    if "x-quantity" in node:
        name = "_or_".join(node["x-quantity"])
        used.add(name)
        result["$ref"] = f"#/$defs/quantity_{name}"
    if "default" in result and result["default"] is None:
        del result["default"]
    return result


def _quantity(names: list[str]) -> dict[str, Any]:
    words = " or ".join(DIMENSIONS[name].words for name in names)
    examples = [DIMENSIONS[name].example for name in names]
    text = {
        "type": "string",
        "description": f"{words}, a number with its unit.",
        "examples": examples,
        "pattern": r"^\s*[-+]?(\d|\.\d)",
    }
    number = {
        "type": "number",
        "description": "A bare number; `units` says its unit: "
        f"{', '.join(DIMENSIONS[name].unit or 'none' for name in names)} under SI.",
    }
    always = all(DIMENSIONS[name].always for name in names)
    forms = [text] if always else [number, text]
    known = {
        "type": "object",
        "description": "The number with what is known about it.",
        "properties": {
            "value": {"anyOf": forms, "description": "The number."},
            "tolerance": {
                "anyOf": [
                    {"type": "number", "minimum": 0, "exclusiveMaximum": 1},
                    {"type": "string", "pattern": r"^\s*\d+(\.\d*)?\s*%$"},
                ],
                "description": "How far it may be off, such as 8 %.",
            },
            "source": {"type": "string", "description": "Where the number comes from."},
            "status": {
                "type": "string",
                "description": "How good it is.",
                "examples": ["measured", "calculated", "quoted", "assumed"],
            },
        },
        "required": ["value"],
        "additionalProperties": False,
    }
    return {"description": words, "anyOf": [*forms, known]}
