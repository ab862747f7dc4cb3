"""What only shows once all parts of a model are there: names that nothing goes by, contradictions, missing values."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from typing import Any

from mdof.description.body_checks import body_troubles
from mdof.description.connection_checks import connection_troubles, property_set_troubles
from mdof.description.quantities import Trouble
from mdof.description.special_checks import rigid_troubles
from mdof.description.surroundings import Surroundings, unknown_name
from mdof.description.whole import Damping, Load

__all__ = ["MOST_TROUBLES", "Parts", "check_whole"]


#: Complaints after which checking stops; a file with more is not a model with slips in it.
MOST_TROUBLES = 200


@dataclass(slots=True)
class Parts:
    """What is built so far, and the complaints."""

    values: dict[str, Any] = field(default_factory=dict)
    troubles: list[Trouble] = field(default_factory=list)


def check_whole(
    parts: Parts, written: Mapping[str, dict[str, Any]], directions: tuple[str, ...], given: Mapping[str, Any]
) -> None:
    """What only the whole model shows."""
    add = parts.troubles.append
    bodies, supports = written["bodies"], written["supports"]
    if not bodies and not any(trouble.path[:1] == ("bodies",) for trouble in parts.troubles):
        add(
            Trouble(
                ("bodies",) if "bodies" in given else (),
                "the model has no body",
                "write `bodies: {machine: 10 kg}`",
                True,
            )
        )
    for name in bodies:
        if name == "ground":
            add(
                Trouble(
                    ("bodies", name),
                    "`ground` is the ground, which always exists and never moves",
                    "give the body another name",
                    True,
                )
            )
        elif name in supports:
            add(Trouble(("bodies", name), f"`{name}` is also a support", "give one of them another name", True))
    if "ground" in supports:
        add(
            Trouble(
                ("supports", "ground"),
                "`ground` always exists and never moves",
                "give a support that moves another name",
                True,
            )
        )
    own = list(parts.troubles)
    for name, body in bodies.items():
        if body is not None and not any(trouble.path[:2] == ("bodies", name) for trouble in own):
            parts.troubles.extend(
                trouble.below(("bodies", name)) for trouble in body_troubles(body, body.directions or directions)
            )
    for name, values in written["property_sets"].items():
        if values is not None:
            parts.troubles.extend(trouble.below(("property_sets", name)) for trouble in property_set_troubles(values))
    around = Surroundings(
        bodies={name: None if body is None else body.directions or directions for name, body in bodies.items()},
        grounds={"ground", *supports},
        sets=written["property_sets"],
    )
    valid = parts.values["connections"]
    for name, connection in valid.items():
        if len(parts.troubles) >= MOST_TROUBLES:
            return
        parts.troubles.extend(
            trouble.below(("connections", name)) for trouble in connection_troubles(connection, around)
        )
    parts.troubles.extend(trouble.below(("connections",)) for trouble in rigid_troubles(valid))
    parts.troubles.extend(_whole(parts.values, written, around))


def _whole(values: Mapping[str, Any], written: Mapping[str, dict[str, Any]], around: Surroundings) -> Iterator[Trouble]:
    damping = values["damping"]
    if damping is not None:
        proportional = damping.mass_proportional is not None or damping.stiffness_proportional is not None
        forms = [proportional, damping.two_ratios is not None, damping.mode_ratios is not None]
        if sum(forms) != 1:
            what = "several forms of damping of the whole" if any(forms) else "no damping is given"
            yield Trouble(("damping",), what, f"write one of {Damping.example}")
    for name, watch in values["watch"].items():
        if watch.on not in around.bodies:
            yield unknown_name(("watch", name, "on"), "body", watch.on, around.bodies)
    for name, load in values["loads"].items():
        for trouble in _load(load, around):
            yield trouble.below(("loads", name))
    criteria = values["criteria"]
    if criteria is not None:
        least = criteria.least_damping_ratio
        if least is not None and least > 1:
            way = f"write {least / 100:g} or {least:g} %" if least <= 100 else "write a ratio such as 5 %"
            yield Trouble(("criteria", "least_damping_ratio"), f"{least:g} times critical damping is asked for", way)
        for key, entry in (("settle", criteria.settle), ("velocity_limit", criteria.velocity_limit)):
            if entry is not None and entry.at is not None and entry.at not in written["watch"]:
                yield unknown_name(("criteria", key, "at"), "watched point", entry.at, written["watch"])


def _load(load: Load, around: Surroundings) -> Iterator[Trouble]:
    kinds = [name for name in ("unbalance", "force", "moment", "base") if getattr(load, name) is not None]
    if len(kinds) != 1:
        what = "the load says nothing" if not kinds else f"the load is {' and '.join(kinds)} at once"
        yield Trouble((), what, "give one of unbalance, force, moment or base", True)
        return
    kind = kinds[0]
    needs = {
        "unbalance": ("on", "axis", "speed"),
        "force": ("on",),
        "moment": ("on",),
        "base": ("direction", "acceleration_spectrum"),
    }[kind]
    for name in needs:
        if getattr(load, name) is None:
            yield Trouble((), f"`{name}` is missing", f"a load by {kind} needs {', '.join(needs)}", True)
    allowed = {
        "unbalance": ("on", "at", "axis", "speed", "order", "orders"),
        "force": ("on", "at", "speed", "order", "orders"),
        "moment": ("on", "speed", "order", "orders"),
        "base": ("direction", "acceleration_spectrum"),
    }[kind]
    for name in ("on", "at", "axis", "direction", "acceleration_spectrum", "speed", "order", "orders"):
        if getattr(load, name) is not None and name not in allowed:
            yield Trouble((name,), f"`{name}` has no meaning for a load by {kind}", "remove it", True)
    if load.order is not None and load.orders is not None:
        yield Trouble(("orders",), "`order` and `orders` are both given", "keep one", True)
    if load.on is not None and load.on not in around.bodies:
        yield unknown_name(("on",), "body", load.on, around.bodies)
    if load.base is not None and load.base not in around.grounds:
        yield unknown_name(("base",), "support", load.base, around.grounds)
