"""The model written out: sets and named points expanded, everything SI; for the network, the digest and the archive."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Iterator, Mapping
from typing import Any

import numpy as np

from mdof.description.bodies import Body, MassProperties, mass_properties
from mdof.description.connections import Connection, effective
from mdof.description.quantities import Quantity

__all__ = ["digest_of", "expanded", "kind_words", "to_si"]


def expanded(model: Any) -> Iterator[tuple[str, dict[str, Any]]]:
    """Every connection by its full name, with values as :class:`Quantity` and its property set written out.

    Yields
    ------
    name : ``spring``, or ``spring/a`` for each named point.
    described : keys ``between``, ``kind``, and what the network's edges carry.
    """
    grounds = {"ground", *model.supports}
    directions = {name: body.directions or model.directions for name, body in model.bodies.items()}
    for name, connection in model.connections.items():
        shared = model.property_sets[connection.uses] if connection.uses is not None else None
        described = _described(connection, effective(connection, shared), directions, grounds)
        if isinstance(connection.at, dict):
            for point, at in connection.at.items():
                yield f"{name}/{point}", {**described, "at": at}
        else:
            if connection.at is not None:
                described["at"] = connection.at
            yield name, described


def _described(
    connection: Connection, values: dict[str, Any], directions: Mapping[str, tuple[str, ...]], grounds: set[str]
) -> dict[str, Any]:
    between = connection.rigid or connection.between or ()
    result: dict[str, Any] = {"between": between, "kind": "spring"}
    if connection.rigid is not None:
        result["kind"] = "rigid"
        return result
    if connection.ends is not None:
        result["ends"] = connection.ends
    if connection.axis is not None:
        result["axis"] = connection.axis
    if connection.axes is not None:
        result["axes"] = _frame(connection.axes.x, connection.axes.y)
    if connection.beam is not None:
        beam = connection.beam
        result["kind"] = "beam"
        result["beam"] = {
            field: value for field in type(beam).model_fields if (value := getattr(beam, field)) is not None
        }
    elif connection.gear is not None:
        gear = connection.gear
        result["kind"] = "gear"
        result["gear"] = {"radii": gear.radii} if gear.radii is not None else {"ratio": gear.ratio}
    only = (
        _only_direction(between, directions, grounds)
        if result["kind"] == "spring" and connection.axis is None and connection.ends is None
        else None
    )

    def spread(value: Any) -> Any:
        return {only: value} if only is not None and isinstance(value, Quantity) else value

    for key in ("stiffness", "damping", "inertance"):
        if key in values:
            result[key] = spread(values[key])
    if "loss_factor" in values:
        result["loss_factor"] = values["loss_factor"]
    if "reference_frequency" in values:
        result["reference_frequency"] = values["reference_frequency"]
    if values.get("branches"):
        result["branches"] = [
            {"stiffness": spread(branch.stiffness), "damping": spread(branch.damping)} for branch in values["branches"]
        ]
    if values.get("limits") is not None:
        limits = values["limits"]
        result["limits"] = {
            field: value for field in ("travel", "load") if (value := getattr(limits, field)) is not None
        }
    if values.get("after_levelling"):
        result["after_levelling"] = True
    return result


def _only_direction(
    between: tuple[str, ...], directions: Mapping[str, tuple[str, ...]], grounds: set[str]
) -> str | None:
    moving = {direction for name in between if name not in grounds for direction in directions[name]}
    return moving.pop() if len(moving) == 1 else None


def _frame(first: tuple[float, float, float], second: tuple[float, float, float]) -> tuple[tuple[float, ...], ...]:
    """Rows are the unit vectors of local x, y, z; y is made exactly square to x."""
    x, y = np.array(first), np.array(second)
    x = x / np.linalg.norm(x)
    y = y - (y @ x) * x
    y = y / np.linalg.norm(y)
    return tuple(tuple(float(part) for part in row) for row in (x, y, np.cross(x, y)))


def kind_words(edge: Mapping[str, Any]) -> str:
    """What a connection is, in words: ``spring and damper``, ``beam``, ``rigid link`` .."""
    kind = edge.get("kind", "spring")
    if kind != "spring":
        words = {"rigid": "rigid link", "gear": "gear"}.get(kind, str(kind))
        return "gear with mesh stiffness" if kind == "gear" and edge.get("stiffness") is not None else words
    parts = []
    if edge.get("stiffness") is not None:
        parts.append("spring")
    if edge.get("damping") is not None:
        parts.append("damper")
    if edge.get("inertance") is not None:
        parts.append("inerter")
    if edge.get("branches"):
        parts.append("series branch" if len(edge["branches"]) == 1 else "series branches")
    return " and ".join([", ".join(parts[:-1]), parts[-1]]) if len(parts) > 1 else (parts[0] if parts else "nothing")


def to_si(model: Any) -> dict[str, Any]:
    """The resolved model as plain JSON values in SI units; see :meth:`mdof.Model.to_si`."""
    result: dict[str, Any] = {
        "grammar": 1,
        "title": model.title,
        "directions": list(model.directions),
        "supports": {
            name: _plain({"centre": support.centre} if support.centre is not None else {})
            for name, support in model.supports.items()
        },
        "bodies": {name: _body(body, model.directions) for name, body in model.bodies.items()},
        "connections": {name: _plain(described) for name, described in expanded(model)},
    }
    if model.reference_frequency is not None:
        result["reference_frequency"] = _plain(model.reference_frequency)
    if model.damping is not None:
        result["damping"] = _section(model.damping)
    for key in ("watch", "loads"):
        entries = getattr(model, key)
        if entries:
            result[key] = {name: _section(entry) for name, entry in entries.items()}
    criteria = _section(model.criteria)
    if criteria:
        result["criteria"] = criteria
    return result


def _body(body: Body, directions: tuple[str, ...]) -> dict[str, Any]:
    result: dict[str, Any] = {"directions": list(body.directions or directions), "massless": body.massless}
    if body.made_of is None and body.massless:
        result["mass"] = 0.0
        result["centre"] = _plain(body.centre) if body.centre is not None else [0.0, 0.0, 0.0]
    else:
        result |= _mass(body, mass_properties(body))
    if body.made_of is not None:
        result["made_of"] = [_section(part) for part in body.made_of]
    if body.spin is not None:
        result["spin"] = _section(body.spin)
    return result


def _mass(body: Body, properties: MassProperties) -> dict[str, Any]:
    written = body.mass or body.weight
    mass: Any = properties.mass
    if written is not None:
        mass = Quantity(
            properties.mass, written.text, "mass", written.tolerance, written.source, written.status
        ).to_si()
    result: dict[str, Any] = {"mass": mass, "centre": list(properties.centre)}
    if body.centre is not None:
        result["centre"] = _plain(body.centre)
    if properties.inertia is not None:
        tensor = properties.inertia + 0.0
        result["inertia"] = {
            "xx": float(tensor[0, 0]),
            "yy": float(tensor[1, 1]),
            "zz": float(tensor[2, 2]),
            "xy": -float(tensor[0, 1]) + 0.0,
            "yz": -float(tensor[1, 2]) + 0.0,
            "xz": -float(tensor[0, 2]) + 0.0,
        }
        if isinstance(body.inertia, Quantity):
            result["inertia"] |= {key: body.inertia.to_si() for key in ("xx", "yy", "zz")}
        elif body.inertia is not None:
            result["inertia"] |= {key: value.to_si() for key, value in body.inertia.items()}
    return result


def _section(section: Any) -> dict[str, Any]:
    return {name: _plain(value) for name in type(section).model_fields if (value := getattr(section, name)) is not None}


def _plain(value: Any) -> Any:
    if isinstance(value, Quantity):
        return value.to_si()
    if isinstance(value, Mapping):
        return {key: _plain(entry) for key, entry in value.items()}
    if isinstance(value, list | tuple):
        return [_plain(entry) for entry in value]
    if hasattr(type(value), "model_fields"):
        return _section(value)
    return value + 0.0 if isinstance(value, float) else value


def digest_of(content: Mapping[str, Any]) -> str:
    """``sha256:<hex>`` of the canonical JSON text: keys sorted, no blanks, ASCII only."""
    text = json.dumps(content, sort_keys=True, separators=(",", ":"), allow_nan=False)
    return f"sha256:{hashlib.sha256(text.encode()).hexdigest()}"
