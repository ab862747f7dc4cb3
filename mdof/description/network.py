"""The network: a networkx MultiGraph with bodies as nodes, connections as edges and SI attributes.

A graph made by hand with the same attributes is equally good for :func:`mdof.assemble`;
:func:`validate_graph` checks one.

Graph attributes
    ``title``, ``directions`` (default ``("x",)``), ``damping`` (``{}``, ``{mass_proportional [1/s],
    stiffness_proportional [s]}``, ``{two_ratios: [(ω, ζ), (ω, ζ)]}`` or ``{mode_ratios: ζ}``), ``reference_frequency``
    [rad/s] or None.
Node attributes
    ``kind`` ``"body"`` (default) or ``"ground"``; ``mass`` [kg]; ``centre`` (3,) [m]; ``centre_assumed``, true where
    none was given; ``inertia`` (3, 3) [kg m²] about the centre; ``directions``; ``massless``; ``spin`` ``{axis (3,),
    speed [rad/s], polar_inertia [kg m²]}``.
Edge attributes, the key being the connection's name
    ``between`` (a, b): relative motion is a minus b, which the graph itself forgets; ``kind`` ``"spring"`` (default),
    ``"beam"``, ``"rigid"`` or ``"gear"``; ``at`` (3,) [m], absent for the centre of the first body that is not a
    ground; ``ends`` ((3,), (3,)) [m]; ``axis`` (3,) or ``axes`` (3, 3), rows being local x, y, z; ``stiffness``,
    ``damping``, ``inertance``: one float, or floats by direction; ``loss_factor`` likewise; ``reference_frequency``
    [rad/s]; ``branches``; ``beam``; ``gear``; ``after_levelling``; ``limits``; ``label``, what it is in words.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import networkx as nx
import numpy as np

from mdof.description.bodies import Body, mass_properties
from mdof.description.graph_check import validate_graph
from mdof.description.network_findings import Summary, network_findings, summary
from mdof.description.quantities import Quantity
from mdof.description.resolved import expanded, kind_words

if TYPE_CHECKING:
    from mdof.description.schema import Model

__all__ = ["Summary", "network", "network_findings", "summary", "validate_graph"]


def network(model: Model) -> nx.MultiGraph:
    """The model as a graph; every named point of a connection becomes an edge ``connection/point``."""
    damping = model.damping
    graph = nx.MultiGraph(
        title=model.title,
        directions=model.directions,
        reference_frequency=None if model.reference_frequency is None else model.reference_frequency.value,
        damping={}
        if damping is None
        else _floats(
            {name: value for name in type(damping).model_fields if (value := getattr(damping, name)) is not None}
        ),
    )
    for name, body in model.bodies.items():
        graph.add_node(name, **_body(body, model.directions))
    graph.add_node("ground", kind="ground", centre=np.zeros(3))
    for name, support in model.supports.items():
        graph.add_node(name, kind="ground", centre=np.zeros(3) if support.centre is None else _array(support.centre))
    for name, described in expanded(model):
        first, second = described["between"]
        attributes = {
            key: _ARRAYS[key](value) if key in _ARRAYS else _floats(value) for key, value in described.items()
        }
        attributes["label"] = kind_words(attributes)
        graph.add_edge(first, second, key=name, **attributes)
    return graph


def _body(body: Body, directions: tuple[str, ...]) -> dict[str, Any]:
    properties = mass_properties(body)
    result: dict[str, Any] = {
        "kind": "body",
        "mass": properties.mass,
        "centre": np.array(properties.centre),
        "directions": body.directions or directions,
        "massless": body.massless,
    }
    if body.centre is None and body.made_of is None:
        result["centre_assumed"] = True
    if properties.inertia is not None and not body.massless:
        result["inertia"] = properties.inertia
    if body.spin is not None:
        result["spin"] = {
            "axis": np.array(body.spin.axis),
            "speed": body.spin.speed.value,
            "polar_inertia": body.spin.polar_inertia.value,
        }
    return result


def _array(values: Any) -> np.ndarray[Any, np.dtype[np.float64]]:
    return np.array([float(value) for value in values])


def _beam(values: dict[str, Any]) -> dict[str, Any]:
    return {key: value.value if isinstance(value, Quantity) else _array(value) for key, value in values.items()}


_ARRAYS: dict[str, Any] = {
    "at": _array,
    "axis": _array,
    "axes": lambda rows: np.array(rows, dtype=np.float64),
    "ends": lambda ends: (_array(ends[0]), _array(ends[1])),
    "beam": _beam,
}


def _floats(value: Any) -> Any:
    """Quantities as SI floats, in containers of the same form."""
    if isinstance(value, Quantity):
        return value.value
    if isinstance(value, dict):
        return {key: _floats(entry) for key, entry in value.items()}
    if isinstance(value, tuple):
        return tuple(_floats(entry) for entry in value)
    if isinstance(value, list):
        return [_floats(entry) for entry in value]
    return value
