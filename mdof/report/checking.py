"""What a model holds, before anything is solved."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Any

import numpy as np

import mdof
from mdof.description.network import network_findings, summary
from mdof.description.plausibility import radii_of_gyration
from mdof.description.resolved import kind_words

if TYPE_CHECKING:
    from mdof.description.network import Summary
    from mdof.description.schema import Model
    from mdof.findings import Finding
    from mdof.modes.mode import DampedModes

__all__ = ["CheckedModel", "ConnectionFacts", "Values", "check_model", "solve_model"]

#: Which value, with one number or several by direction.
Values = tuple[tuple[str, float | dict[str, float]], ...]


@dataclass(frozen=True, kw_only=True, slots=True)
class ConnectionFacts:
    """A connection, or several points of one that have the same values; SI.

    Attributes
    ----------
    name : the connection's name without its point.
    words : what it is.
    between : names of its two ends.
    values : which (``stiffness``, ``damping``, ``inertance``, ``loss_factor``) with one number or several by direction.
    branches : the same of every series branch.
    geometry : what a gear or beam is made of, by its name in the model file.
    loss_reference : frequency of its own at which its loss factor holds [rad/s]; None where it has none.
    count : number of points.
    """

    name: str
    words: str
    between: tuple[str, str]
    values: Values
    branches: tuple[Values, ...] = ()
    geometry: tuple[tuple[str, tuple[float, ...]], ...] = ()
    loss_reference: float | None = None
    count: int = 1


@dataclass(frozen=True, kw_only=True, slots=True)
class CheckedModel:
    """A model that can be assembled, in a few numbers; SI.

    Attributes
    ----------
    bodies : name to (mass [kg], centre [m]).
    inertias : name to the moments of inertia about x, y, z through its centre [kg m²]; None where none is given.
    products : name to its products of inertia by ``xy``, ``yz``, ``xz`` (the integral of x y dm ..) other than zero.
    radii : name to the radii of gyration about x, y, z [m]; None without mass or inertia.
    connections : every connection with its values, points of equal values together.
    loss_reference : the model's own frequency for loss factors [rad/s], or None.
    summary : totals, connections by kind, free directions.
    findings : what the network alone shows.
    """

    bodies: dict[str, tuple[float, tuple[float, float, float]]]
    inertias: dict[str, tuple[float, float, float] | None]
    products: dict[str, dict[str, float]]
    radii: dict[str, tuple[float, float, float] | None]
    connections: tuple[ConnectionFacts, ...]
    loss_reference: float | None
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
    products: dict[str, dict[str, float]] = {}
    for name in totals.bodies:
        data = graph.nodes[name]
        x, y, z = (float(value) for value in data.get("centre", (0.0, 0.0, 0.0)))
        bodies[name] = (float(data.get("mass") or 0.0), (x, y, z))
        inertias[name], products[name] = None, {}
        if data.get("inertia") is not None:
            tensor = np.asarray(data["inertia"], dtype=float)
            inertias[name] = (float(tensor[0, 0]), float(tensor[1, 1]), float(tensor[2, 2]))
            # The tensor holds the products with a minus sign.
            each = (("xy", tensor[0, 1]), ("yz", tensor[1, 2]), ("xz", tensor[0, 2]))
            products[name] = {key: -float(value) for key, value in each if abs(value) > 1e-12 * tensor.max()}
    return CheckedModel(
        bodies=bodies,
        inertias=inertias,
        products=products,
        radii={name: radii_of_gyration(graph.nodes[name]) for name in totals.bodies},
        connections=_connections(graph),
        loss_reference=graph.graph.get("reference_frequency"),
        summary=totals,
        findings=network_findings(graph),
    )


def _connections(graph: Any) -> tuple[ConnectionFacts, ...]:
    found: list[ConnectionFacts] = []
    for _, _, key, edge in graph.edges(keys=True, data=True):
        facts = ConnectionFacts(
            name=key.split("/", 1)[0],
            words=edge.get("label") or kind_words(edge),
            between=(str(edge["between"][0]), str(edge["between"][1])),
            values=_values(edge),
            branches=tuple(_values(branch) for branch in edge.get("branches") or ()),
            geometry=tuple(
                (part, _numbers(value)) for part, value in (edge.get("gear") or edge.get("beam") or {}).items()
            ),
            loss_reference=edge.get("reference_frequency") if edge.get("loss_factor") is not None else None,
        )
        same = next((index for index, other in enumerate(found) if replace(other, count=1) == facts), None)
        if same is None:
            found.append(facts)
        else:
            found[same] = replace(found[same], count=found[same].count + 1)
    return tuple(found)


def _values(source: Mapping[str, Any]) -> Values:
    names = ("stiffness", "damping", "inertance", "loss_factor")
    return tuple((name, source[name]) for name in names if source.get(name) is not None)


def _numbers(value: Any) -> tuple[float, ...]:
    return tuple(float(part) for part in np.atleast_1d(np.asarray(value, dtype=float)))


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
