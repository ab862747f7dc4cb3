"""What a model holds, before anything is solved."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Any

import numpy as np

import mdof
from mdof.description.network import network_findings, summary
from mdof.description.resolved import kind_words

if TYPE_CHECKING:
    from mdof.description.network import Summary
    from mdof.description.schema import Model
    from mdof.findings import Finding
    from mdof.modes.mode import DampedModes

__all__ = ["CheckedModel", "ConnectionFacts", "check_model", "solve_model"]


@dataclass(frozen=True, kw_only=True, slots=True)
class ConnectionFacts:
    """A connection, or several points of one that have the same values; SI.

    Attributes
    ----------
    name : the connection's name without its point.
    words : what it is.
    between : names of its two ends.
    values : which (``stiffness``, ``damping``, ``inertance``, ``loss_factor``) with one number or several by direction.
    remark : what else it has.
    count : number of points.
    """

    name: str
    words: str
    between: tuple[str, str]
    values: tuple[tuple[str, float | dict[str, float]], ...]
    remark: str = ""
    count: int = 1


@dataclass(frozen=True, kw_only=True, slots=True)
class CheckedModel:
    """A model that can be assembled, in a few numbers; SI.

    Attributes
    ----------
    bodies : name to (mass [kg], centre [m]).
    inertias : name to the moments of inertia about x, y, z through its centre [kg m²]; None where none is given.
    connections : every connection with its values, points of equal values together.
    summary : totals, connections by kind, free directions.
    findings : what the network alone shows.
    """

    bodies: dict[str, tuple[float, tuple[float, float, float]]]
    inertias: dict[str, tuple[float, float, float] | None]
    connections: tuple[ConnectionFacts, ...]
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
    inertias: dict[str, tuple[float, float, float] | None] = {}
    for name in totals.bodies:
        data = graph.nodes[name]
        x, y, z = (float(value) for value in data.get("centre", (0.0, 0.0, 0.0)))
        bodies[name] = (float(data.get("mass") or 0.0), (x, y, z))
        inertia = data.get("inertia")
        moments = None if inertia is None else np.diag(np.asarray(inertia, dtype=float))
        inertias[name] = None if moments is None else (float(moments[0]), float(moments[1]), float(moments[2]))
    return CheckedModel(
        bodies=bodies,
        inertias=inertias,
        connections=_connections(graph),
        summary=totals,
        findings=network_findings(graph),
    )


def _connections(graph: Any) -> tuple[ConnectionFacts, ...]:
    found: list[ConnectionFacts] = []
    for _, _, key, edge in graph.edges(keys=True, data=True):
        values: list[tuple[str, float | dict[str, float]]] = []
        for which in ("stiffness", "damping", "inertance", "loss_factor"):
            if edge.get(which) is not None:
                values.append((which, edge[which]))
        branches = len(edge.get("branches") or ())
        remark = "" if not branches else f"{branches} series branch{'es' if branches > 1 else ''}"
        facts = ConnectionFacts(
            name=key.split("/", 1)[0],
            words=edge.get("label") or kind_words(edge),
            between=(str(edge["between"][0]), str(edge["between"][1])),
            values=tuple(values),
            remark=remark,
        )
        same = next((index for index, other in enumerate(found) if replace(other, count=1) == facts), None)
        if same is None:
            found.append(facts)
        else:
            found[same] = replace(found[same], count=found[same].count + 1)
    return tuple(found)


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
