"""What a model holds, for programs."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, Any

from mdof.report.records import envelope, finding_records

if TYPE_CHECKING:
    from collections.abc import Sequence

    from mdof.description.schema import Model
    from mdof.report.checking import CheckedModel, ConnectionFacts, Values

__all__ = ["check_record"]

_VALUES = ("stiffness", "damping", "inertance", "loss_factor")


def check_record(model: Model, checked: CheckedModel) -> dict[str, Any]:
    """The object that ``mdof check --format json`` prints; nothing was solved, so nothing is verified."""
    totals = checked.summary
    return {
        **envelope("check", model),
        "results": {
            "degrees_of_freedom": totals.degrees_of_freedom,
            "bodies": [
                {
                    "name": name,
                    "mass": mass,
                    "centre": list(at),
                    "inertia": _list(checked.inertias[name]),
                    "products_of_inertia": checked.products[name],
                    "radii_of_gyration": _list(checked.radii[name]),
                }
                for name, (mass, at) in checked.bodies.items()
            ],
            "grounds": list(totals.grounds),
            "total_mass": totals.total_mass,
            "centre_of_gravity": _list(totals.centre_of_gravity),
            "reference_frequency_hz": _hertz(checked.loss_reference),
            "connections": dict(totals.connections),
            "connection_values": [_connection(fact) for fact in checked.connections],
            "groups": [list(group) for group in totals.groups],
            "free_directions": list(totals.free_directions),
        },
        "findings": finding_records(checked.findings),
        "verification": None,
    }


def _connection(fact: ConnectionFacts) -> dict[str, Any]:
    return {
        "name": fact.name,
        "points": fact.count,
        "kind": fact.words,
        "between": list(fact.between),
        **_named(fact.values, _VALUES),
        "reference_frequency_hz": _hertz(fact.loss_reference),
        "branches": [_named(branch, _VALUES[:2]) for branch in fact.branches],
        "geometry": {part: list(numbers) for part, numbers in fact.geometry},
    }


def _named(values: Values, names: Sequence[str]) -> dict[str, Any]:
    return {**dict.fromkeys(names), **dict(values)}


def _list(values: tuple[float, ...] | None) -> list[float] | None:
    return None if values is None else list(values)


def _hertz(value: float | None) -> float | None:
    return None if value is None else value / (2 * math.pi)
