"""What a model holds, before anything is solved."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

import mdof
from mdof.description.network import network_findings, summary

if TYPE_CHECKING:
    from mdof.description.network import Summary
    from mdof.description.schema import Model
    from mdof.findings import Finding
    from mdof.modes.mode import DampedModes

__all__ = ["CheckedModel", "check_model", "solve_model"]


@dataclass(frozen=True, kw_only=True, slots=True)
class CheckedModel:
    """A model that can be assembled, in a few numbers; SI.

    Attributes
    ----------
    bodies : name to (mass [kg], centre [m]).
    inertias : name to the largest moment of inertia about its centre [kg m²]; 0 where none is given.
    summary : totals, connections by kind, free directions.
    findings : what the network alone shows.
    """

    bodies: dict[str, tuple[float, tuple[float, float, float]]]
    inertias: dict[str, float]
    summary: Summary
    findings: tuple[Finding, ...]


def check_model(model: Model) -> CheckedModel:
    """Build the network of a model, assemble it, and count what it holds.

    Raises
    ------
    ModelError
        If the model cannot be assembled.
    """
    graph = mdof.network(model)
    mdof.assemble(graph)
    totals = summary(graph)
    bodies: dict[str, tuple[float, tuple[float, float, float]]] = {}
    inertias: dict[str, float] = {}
    for name in totals.bodies:
        data = graph.nodes[name]
        x, y, z = (float(value) for value in data.get("centre", (0.0, 0.0, 0.0)))
        bodies[name] = (float(data.get("mass") or 0.0), (x, y, z))
        inertia = data.get("inertia")
        inertias[name] = 0.0 if inertia is None else float(np.max(inertia))
    return CheckedModel(bodies=bodies, inertias=inertias, summary=totals, findings=network_findings(graph))


def solve_model(model: Model) -> DampedModes:
    """The modes of a model, with the findings of its network besides those of the modes.

    Raises
    ------
    ModelError, UnverifiedError
        As :func:`mdof.assemble` and :func:`mdof.solve`.
    """
    graph = mdof.network(model)
    modes = mdof.solve(mdof.assemble(graph))
    # The modes themselves say better what nobody holds.
    network = [item for item in network_findings(graph) if item.code != "unheld-body"]
    return replace(modes, findings=(*modes.findings, *network)) if network else modes
