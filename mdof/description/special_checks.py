"""Checks of beams, gears and rigid links, which have rules of their own. Paths start below the connection."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any

import numpy as np

from mdof.description.connections import Connection
from mdof.description.quantities import Quantity, Trouble
from mdof.description.surroundings import Surroundings, unknown_name

__all__ = ["beam_troubles", "gear_troubles", "rigid_link_troubles", "rigid_troubles"]

_ORDINARY = (
    "stiffness",
    "damping",
    "inertance",
    "loss_factor",
    "reference_frequency",
    "branches",
    "limits",
    "after_levelling",
    "uses",
    "at",
    "ends",
    "axis",
    "axes",
    "gear",
    "beam",
    "between",
)


def _refuse_beside(connection: Connection, kind: str, names: tuple[str, ...]) -> Iterator[Trouble]:
    for name in names:
        if getattr(connection, name) is not None:
            yield Trouble(
                (name,),
                f"`{name}` has no meaning for a {kind}",
                f"remove it, or make it a connection of its own beside the {kind}",
                True,
            )


def beam_troubles(connection: Connection, values: dict[str, Any]) -> Iterator[Trouble]:
    yield from _refuse_beside(
        connection, "beam", ("stiffness", "damping", "inertance", "branches", "axis", "axes", "gear", "at")
    )
    if connection.uses is not None and any(
        name in values for name in ("stiffness", "damping", "inertance", "branches")
    ):
        yield Trouble(
            ("uses",), "a beam takes its stiffness from its section, not from a property set", "remove `uses`"
        )
    if isinstance(values.get("loss_factor"), dict):
        yield Trouble(("loss_factor",), "loss factors by direction for a beam", "write one loss factor")
    if connection.ends is None:
        yield Trouble((), "a beam needs its two ends", "write `ends: [[x, y, z], [x, y, z]]`", True)
        return
    start, stop = (np.array([value.value for value in end]) for end in connection.ends)
    towards = np.array(connection.beam.towards if connection.beam is not None else (0.0, 0.0, 1.0))
    if np.linalg.norm(np.cross(stop - start, towards)) <= 1e-6 * np.linalg.norm(stop - start) * np.linalg.norm(towards):
        yield Trouble(("beam", "towards"), "`towards` points along the beam", "give a direction across it")


def gear_troubles(connection: Connection, values: dict[str, Any], around: Surroundings) -> Iterator[Trouble]:
    gear = connection.gear
    if gear is None:
        return
    yield from _refuse_beside(connection, "gear", ("inertance", "branches", "axes", "at", "ends"))
    if (gear.radii is None) == (gear.ratio is None):
        yield Trouble(
            ("gear",), "a gear has either `radii` or `ratio`", "write {radii: [336 mm, 105 mm]} or {ratio: 3.2}"
        )
        return
    for name in ("stiffness", "damping"):
        value = values.get(name)
        path = (name,) if getattr(connection, name) is not None else ("uses",)
        if isinstance(value, dict):
            yield Trouble(path, f"{name} by direction for a gear", f"write one {name}, along the line of action")
        elif value is not None and (gear.radii is not None) == value.dimension.startswith("rotational"):
            way = (
                "N/m along the line of action"
                if gear.radii is not None
                else "N*m/rad at the second shaft, or give `radii`"
            )
            yield Trouble(
                path,
                f"{value.text} does not fit this gear",
                f"give it in {way}".replace("N/m", "N*s/m").replace("N*m/", "N*m*s/")
                if name == "damping"
                else f"give it in {way}",
            )
    if "stiffness" not in values:
        for name in ("damping", "loss_factor"):
            if name in values:
                path = (name,) if getattr(connection, name) is not None else ("uses",)
                yield Trouble(
                    path,
                    f"a rigid gear has no {name.replace('_', ' ')}",
                    "give the mesh `stiffness` as well, or remove it",
                    True,
                )
    elif isinstance(values["stiffness"], Quantity) and values["stiffness"].value <= 0:
        yield Trouble(
            ("stiffness",), "the stiffness of a mesh must be greater than zero", "leave it out for a rigid gear"
        )
    turns: set[str] = set()
    for index, name in enumerate(connection.between or ()):
        directions = around.bodies.get(name)
        if directions is None:
            continue
        own = [direction for direction in directions if direction.startswith("r")]
        turns.update(own)
        if not own:
            yield Trouble(
                ("between", index),
                f"`{name}` does not turn",
                "a gear joins rotations; add rx, ry or rz to its `directions`",
            )
    if connection.axis is None and len(turns) > 1:
        yield Trouble(
            (),
            f"the gear does not say which of {', '.join(sorted(turns))} it joins",
            "write `axis: [1, 0, 0]` along the shafts",
            True,
        )


def rigid_link_troubles(connection: Connection, around: Surroundings) -> Iterator[Trouble]:
    names = connection.rigid or ()
    yield from _refuse_beside(connection, "rigid link", _ORDINARY)
    for index, name in enumerate(names):
        if name in around.grounds:
            yield Trouble(
                ("rigid", index),
                f"a rigid link joins two bodies, and `{name}` is a ground",
                "narrow the body's `directions` to hold it",
            )
        elif name not in around.bodies:
            yield unknown_name(("rigid", index), "body", name, around.bodies)
    host, rider = names
    if host == rider and host in around.bodies:
        yield Trouble(("rigid",), f"`{host}` is connected to itself", "name two different bodies")
        return
    host_directions, rider_directions = around.bodies.get(host), around.bodies.get(rider)
    if host_directions is not None and rider_directions is not None:
        lacking = [direction for direction in rider_directions if direction not in host_directions]
        if lacking:
            yield Trouble(
                ("rigid",),
                f"the rider `{rider}` moves in {', '.join(lacking)}, which the host `{host}` lacks",
                f"give `{host}` these directions, or take them from `{rider}`",
            )


def rigid_troubles(connections: Mapping[str, Connection]) -> Iterator[Trouble]:
    """Riders with two hosts and rigid links in a circle; paths start at the connection's name."""
    host_of: dict[str, tuple[str, str]] = {}
    for name, connection in connections.items():
        if connection.rigid is None or connection.rigid[0] == connection.rigid[1]:
            continue
        host, rider = connection.rigid
        if rider in host_of:
            yield Trouble(
                (name, "rigid", 1),
                f"`{rider}` already rides on `{host_of[rider][0]}` (connection {host_of[rider][1]})",
                "give each rider one host",
            )
            continue
        step, count = host, 0
        while step in host_of and step != rider and count <= len(host_of):
            step, count = host_of[step][0], count + 1
        if step == rider:
            yield Trouble((name, "rigid"), f"rigid links run in a circle through `{rider}`", "remove one of them")
            continue
        host_of[rider] = (host, name)
