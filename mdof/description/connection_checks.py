"""What the schema cannot see about connections: who they join, and forms that contradict each other."""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import replace
from typing import Any

import numpy as np

from mdof.description.connections import DIRECTIONAL, Connection, PropertySet, Values, effective
from mdof.description.quantities import DIRECTIONS, Quantity, Trouble
from mdof.description.special_checks import beam_troubles, gear_troubles, rigid_link_troubles
from mdof.description.surroundings import Surroundings, unknown_name
from mdof.units import nearest

__all__ = ["connection_troubles", "property_set_troubles"]

#: What people call the ground.
_EARTH = re.compile(
    r"(?:^|[\W_\d])(?:base|deck|earth|fixed|floor|foundation|gnd|ground|slab|soil|wall)s?(?:$|[\W_\d])", re.IGNORECASE
)


def property_set_troubles(values: PropertySet) -> Iterator[Trouble]:
    """Complaints about a property set by itself."""
    yield from _tables(values)
    yield from _signs({name: getattr(values, name) for name in ("inertance", "loss_factor", "branches")})


def connection_troubles(connection: Connection, around: Surroundings) -> Iterator[Trouble]:
    """Complaints about one connection; paths start below it."""
    yield from _tables(connection)
    if connection.rigid is not None:
        yield from rigid_link_troubles(connection, around)
        return
    if connection.between is None:
        yield Trouble((), "the connection does not say what it joins", "write `between: [pump, ground]`", True)
        return
    yield from _ends_known("between", connection.between, around)
    shared = None
    if connection.uses is not None:
        if connection.uses not in around.sets:
            yield unknown_name(("uses",), "property set", connection.uses, around.sets)
            return
        shared = around.sets[connection.uses]
        if shared is None:
            return  # the set itself is wrong and already reported
    values = effective(connection, shared)
    yield from _place(connection)
    if connection.beam is not None:
        yield from beam_troubles(connection, values)
    elif connection.gear is not None:
        yield from gear_troubles(connection, values, around)
    else:
        yield from _values(connection, values, around)
    yield from _signs({name: getattr(connection, name) for name in ("inertance", "loss_factor", "branches")})


def _tables(values: Connection | PropertySet) -> Iterator[Trouble]:
    for name in ("stiffness_table", "loss_table"):
        if getattr(values, name) is not None:
            yield Trouble(
                (name,),
                f"`{name}` is not supported yet in this version of the grammar",
                "give `stiffness` and `loss_factor` at the frequency that matters",
                True,
            )


def _ends_known(key: str, names: tuple[str, ...], around: Surroundings) -> Iterator[Trouble]:
    known = [*around.bodies, *around.grounds]
    unknown = False
    for index, name in enumerate(names):
        if name not in around.bodies and name not in around.grounds:
            unknown = True
            trouble = unknown_name((key, index), "body or support", name, known)
            if _EARTH.search(name):
                way = "what never moves is `ground`; what moves belongs under `bodies` or `supports`"
                close = nearest(name, known)
                trouble = replace(trouble, expected=f"did you mean `{close}`? {way}" if close else way)
            yield trouble
    if not unknown and names[0] == names[1]:
        yield Trouble((key,), f"`{names[0]}` is connected to itself", "name two different ends")
    elif not unknown and all(name in around.grounds for name in names):
        yield Trouble((key,), "both ends are grounds, so nothing can move", "name at least one body")


def _place(connection: Connection) -> Iterator[Trouble]:
    if connection.at is not None and connection.ends is not None:
        yield Trouble(
            ("ends",),
            "`at` and `ends` exclude each other",
            "keep `at` for one point, `ends` for a force along a line",
            True,
        )
    if connection.axis is not None and connection.axes is not None:
        yield Trouble(
            ("axes",), "`axis` and `axes` exclude each other", "keep `axis` for one direction, `axes` for a frame", True
        )
    if connection.ends is not None:
        for name in ("axis", "axes"):
            if getattr(connection, name) is not None:
                yield Trouble(
                    (name,), f"`{name}` has no meaning beside `ends`, whose line is the direction", "remove one", True
                )
    if connection.axes is not None:
        x, y = (np.array(axis) / np.linalg.norm(axis) for axis in (connection.axes.x, connection.axes.y))
        if abs(x @ y) > 1e-3:
            yield Trouble(
                ("axes",),
                f"the axes x and y meet at {np.degrees(np.arccos(np.clip(x @ y, -1, 1))):.4g} degrees",
                "make y square to x",
            )


def _values(connection: Connection, values: dict[str, Any], around: Surroundings) -> Iterator[Trouble]:
    acting = [name for name in ("stiffness", "damping", "inertance", "branches") if name in values]
    if not acting:
        yield Trouble(
            (), "the connection does nothing", "give it `stiffness`, `damping` or a property set it `uses`", True
        )
        return
    moving = _moving(connection, around)
    lined = "ends" if connection.ends is not None else "axis" if connection.axis is not None else None
    for path, name, value in _each_value(connection, values):
        if isinstance(value, dict):
            if lined == "ends":
                yield Trouble(
                    path,
                    "between two distinct points only a force along their line is free of a false moment to ground",
                    f"write one {name} along the line, or use `at` one point for values by direction",
                )
            elif lined == "axis":
                yield Trouble(
                    path,
                    f"{name} by direction beside `axis`",
                    f"write one {name} along the axis, or `axes: {{x: [..], y: [..]}}` instead of `axis`",
                )
        elif name == "loss_factor":
            continue
        elif lined is not None:
            if value.dimension.startswith("rotational") or value.dimension == "inertia":
                way = (
                    f"write {{rx: {value.text}}} with `axes: {{x: [..], y: [..]}}`"
                    if lined == "axis"
                    else f"write it with `at`: {{rx: {value.text}}}"
                )
                yield Trouble(path, f"`{lined}` takes a {name} along a line, and {value.text} is about one", way)
        elif moving is not None:
            yield from _one_number(path, name, value, moving)
    loss = values.get("loss_factor")
    if loss is not None:
        yield from _loss(
            ("loss_factor",) if connection.loss_factor is not None else ("uses",), loss, values.get("stiffness")
        )


def _moving(connection: Connection, around: Surroundings) -> list[str] | None:
    """Directions either end may move in; None where an end could not be read."""
    moving: set[str] = set()
    for name in connection.between or ():
        if name in around.grounds:
            continue
        directions = around.bodies.get(name)
        if directions is None:
            return None
        moving.update(directions)
    return [direction for direction in DIRECTIONS if direction in moving]


def _each_value(connection: Connection, values: dict[str, Any]) -> Iterator[tuple[tuple[str | int, ...], str, Values]]:
    """Path, name and value of every value given; values of a property set are pointed at through `uses`."""
    for name in DIRECTIONAL:
        if name in values:
            yield (name,) if getattr(connection, name) is not None else ("uses",), name, values[name]
    own = connection.branches is not None
    for index, branch in enumerate(values.get("branches", ())):
        for name in ("stiffness", "damping"):
            yield ("branches", index, name) if own else ("uses",), name, getattr(branch, name)


def _one_number(path: tuple[str | int, ...], name: str, value: Quantity, moving: list[str]) -> Iterator[Trouble]:
    if len(moving) > 1:
        three = ", ".join(
            f"{direction}: {value.text if not direction.startswith('r') else '..'}"
            for direction in moving
            if direction in ("x", "y", "z")
        )
        yield Trouble(
            path,
            f"one {name} does not say in which of {', '.join(moving)} it acts",
            f"write {{{three or moving[0] + ': ' + value.text}}}",
        )
    elif moving:
        turning = value.dimension.startswith("rotational") or value.dimension == "inertia"
        if turning != moving[0].startswith("r"):
            wanted = "about a line, such as N*m/rad" if moving[0].startswith("r") else "along a line, such as N/m"
            yield Trouble(path, f"{value.text} does not fit the one direction {moving[0]}", f"give a {name} {wanted}")


def _loss(path: tuple[str | int, ...], loss: Values, stiffness: Values | None) -> Iterator[Trouble]:
    if stiffness is None:
        yield Trouble(path, "a loss factor without stiffness", "give `stiffness`, or use `damping`", True)
    elif isinstance(loss, dict) and isinstance(stiffness, dict):
        for direction, value in loss.items():
            if value.value and direction not in stiffness:
                where = (*path, direction) if path != ("uses",) else path
                yield Trouble(
                    where,
                    f"a loss factor in {direction} without stiffness there",
                    f"give stiffness in {direction}, or remove it",
                    True,
                )
    elif isinstance(loss, dict):
        yield Trouble(path, "loss factors by direction for one stiffness", "write one loss factor")


def _signs(values: dict[str, Any]) -> Iterator[Trouble]:
    for name in ("inertance", "loss_factor"):
        value = values.get(name)
        for direction, entry in value.items() if isinstance(value, dict) else ((None, value),):
            if entry is not None and entry.value < 0:
                path = (name,) if direction is None else (name, direction)
                yield Trouble(path, f"a negative {name.replace('_', ' ')}", "it must not be negative")
    for index, branch in enumerate(values.get("branches") or ()):
        stiffness, damping = branch.stiffness, branch.damping
        if isinstance(stiffness, dict) != isinstance(damping, dict):
            yield Trouble(
                ("branches", index),
                "stiffness and damping of a branch differ in form",
                "give both as one value, or both by the same directions",
            )
        elif isinstance(stiffness, dict) and set(stiffness) != set(damping):
            yield Trouble(
                ("branches", index),
                f"a branch has stiffness in {', '.join(stiffness)} and damping in {', '.join(damping)}",
                "a spring and a damper in series need both in every direction",
            )
        for name, part in (("stiffness", stiffness), ("damping", damping)):
            for direction, entry in part.items() if isinstance(part, dict) else ((None, part),):
                if entry.value <= 0:
                    where: tuple[str | int, ...] = (
                        "branches",
                        index,
                        name,
                        *(() if direction is None else (direction,)),
                    )
                    yield Trouble(
                        where,
                        f"the {name} of a branch must be greater than zero",
                        "remove the branch, or give it a value",
                    )
