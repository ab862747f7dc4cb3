"""What a connection is checked against, and how a name that nothing goes by is told."""

from __future__ import annotations

from collections.abc import Mapping, Set
from dataclasses import dataclass
from typing import Any

from mdof.description.connections import PropertySet
from mdof.description.quantities import Trouble
from mdof.units import nearest

__all__ = ["Surroundings", "unknown_name"]


@dataclass(frozen=True, kw_only=True, slots=True)
class Surroundings:
    """What a connection is checked against.

    ``bodies`` maps every body that was written to its directions, or to None where the body could not be read.
    """

    bodies: Mapping[str, tuple[str, ...] | None]
    grounds: Set[str]
    sets: Mapping[str, PropertySet | None]


def unknown_name(path: tuple[str | int, ...], what: str, name: str, choices: Any) -> Trouble:
    """Complaint about a name nothing goes by."""
    options = list(choices)
    close = nearest(name, options)
    listed = ", ".join(options[:12]) + (", .." if len(options) > 12 else "")
    expected = (
        f"did you mean `{close}`?" if close else (f"known here: {listed}" if listed else f"there is no {what} to name")
    )
    return Trouble(path, f"unknown {what} `{name[:60]}`", expected)
