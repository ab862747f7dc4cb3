"""States: a partial model merged key by key over the whole one, and values scaled by path."""

from __future__ import annotations

import re
from collections.abc import Mapping
from typing import Any

from mdof.description.bodies import Body
from mdof.description.build import NAMED, TOP
from mdof.description.quantities import MOST_UNKNOWN, Scaled, Trouble, kind_of
from mdof.description.readers import NAME_RULE, name_fault
from mdof.description.surroundings import unknown_name
from mdof.units import QuantityError, convert, nearest

__all__ = ["chain", "merge", "state_of"]

_FIXED = ("units", "states")
_NUMBER = re.compile(r"\s*[-+]?(?:[0-9]|\.[0-9])")
_QUANTITY_KEYS = frozenset(("value", "tolerance", "source", "status"))


def chain(states: Any, name: str) -> tuple[list[str], list[Trouble]]:
    """The states a state builds on, itself last; and complaints about `from`."""
    names, complaints = [name], []
    step = name
    while True:
        state = states.get(step)
        parent = state.get("from") if isinstance(state, Mapping) else None
        if parent is None:
            break
        path = ("states", step, "from")
        if not isinstance(parent, str):
            complaints.append(
                Trouble(path, f"{kind_of(parent)} where the name of a state belongs", "write the name of another state")
            )
            break
        if parent not in states:
            complaints.append(unknown_name(path, "state", parent, [other for other in states if other != step]))
            break
        if parent in names:
            if parent == name:
                complaints.append(
                    Trouble(
                        ("states", name, "from"),
                        f"the states run in a circle: {' from '.join([*names, parent])}",
                        "let one of them start from the model",
                    )
                )
            break
        names.append(parent)
        step = parent
    return names[::-1], complaints


def state_of(raw: Mapping[str, Any], name: str) -> tuple[dict[str, Any], list[Trouble]]:
    """The whole model in a state, as plain values; and complaints about how the state is written."""
    states = raw["states"]
    names, complaints = chain(states, name)
    complaints = [trouble for trouble in complaints if trouble.path[1] == name]
    result: dict[str, Any] = {key: value for key, value in raw.items() if key != "states"}
    for step in names:
        found: list[Trouble] = []
        overlay = states[step]
        if isinstance(overlay, Mapping):
            result = merge(result, overlay, ("states", step), found)
        elif overlay is not None:
            found.append(
                Trouble(
                    ("states", step),
                    f"{kind_of(overlay)} where a partial model belongs",
                    "write {bodies: {tank: {mass: 160 kg}}}",
                )
            )
        if step == name:
            complaints.extend(found)
    fault = name_fault(name)
    if fault:
        complaints.insert(0, Trouble(("states", name), fault, NAME_RULE, True))
    return result, complaints


def merge(
    base: dict[str, Any], overlay: Mapping[Any, Any], path: tuple[str | int, ...], found: list[Trouble]
) -> dict[str, Any]:
    """``overlay`` over ``base``: mappings key by key, lists and values replaced, null removes; shares the unchanged."""
    result = dict(base)
    for key, value in overlay.items():
        where = (*path, key)
        if key in ("from", "scale"):
            continue
        if key in _FIXED:
            found.append(Trouble(where, f"a state cannot change `{key}`", "remove it", True))
        elif key not in TOP:
            close = nearest(str(key), [*TOP, "from", "scale"])
            found.append(
                Trouble(
                    where,
                    f"unknown key `{str(key)[:60]}`",
                    f"did you mean `{close}`?" if close else f"the keys here are from, scale, {', '.join(TOP)}",
                    True,
                )
            )
        elif key in NAMED and isinstance(value, Mapping):
            result[key] = _merge_named(str(key), result.get(key), value, where, found)
        else:
            _put(result, key, value, where, found)
    if "scale" in overlay:
        result = _scale(result, overlay["scale"], (*path, "scale"), found)
    return result


def _merge_named(
    section: str, base: Any, overlay: Mapping[Any, Any], path: tuple[str | int, ...], found: list[Trouble]
) -> Any:
    entries = dict(base) if isinstance(base, Mapping) else {}
    for name, value in overlay.items():
        where = (*path, name)
        if name not in entries:
            trouble = unknown_name(where, f"name in {section}", str(name), entries)
            extra = (
                "a state changes what the model has; describe it there, and remove it with null where it is not wanted"
            )
            found.append(
                Trouble(
                    where,
                    trouble.message,
                    f"{trouble.expected} {extra}" if trouble.expected.endswith("?") else extra,
                    True,
                )
            )
            continue
        if section == "bodies" and value is not None:
            entries[name], value = Body.shorthand(entries[name]), Body.shorthand(value)
        _put(entries, name, value, where, found)
    return entries


def _put(into: dict[Any, Any], key: Any, value: Any, path: tuple[str | int, ...], found: list[Trouble]) -> None:
    if value is None:
        if key in into:
            del into[key]
        else:
            found.append(Trouble(path, "there is nothing to remove", "remove this line", True))
        return
    old = into.get(key)
    if not isinstance(value, Mapping) or not isinstance(old, Mapping) or _unlike(old, value):
        into[key] = _without_null(value)
        return
    merged = dict(old)
    for inner, entry in value.items():
        _put(merged, inner, entry, (*path, inner), found)
    into[key] = merged


def _unlike(old: Mapping[Any, Any], new: Mapping[Any, Any]) -> bool:
    """True where one is a quantity with what is known about it and the other a mapping of another kind."""
    return bool(old) and bool(new) and (set(old) <= _QUANTITY_KEYS) != (set(new) <= _QUANTITY_KEYS)


def _without_null(value: Any) -> Any:
    if isinstance(value, Mapping):
        return {key: _without_null(entry) for key, entry in value.items() if entry is not None}
    return value


def _scale(model: dict[str, Any], factors: Any, path: tuple[str | int, ...], found: list[Trouble]) -> dict[str, Any]:
    if not isinstance(factors, Mapping):
        found.append(
            Trouble(
                path,
                f"{kind_of(factors)} where paths and factors belong",
                "write {property_sets.rubber.stiffness: 1.4}",
            )
        )
        return model
    for target, raw_factor in factors.items():
        if len(found) >= MOST_UNKNOWN:
            break
        where = (*path, target)
        try:
            factor = convert(raw_factor, "number")
        except QuantityError as error:
            found.append(Trouble(where, error.message, error.expected))
            continue
        model = _scale_at(model, str(target).split("."), factor, where, found)
    return model


def _scale_at(
    model: dict[str, Any], steps: list[str], factor: float, where: tuple[str | int, ...], found: list[Trouble]
) -> dict[str, Any]:
    if steps[0] in ("title", "units", "directions", "states", "watch"):
        found.append(
            Trouble(
                where,
                f"`{steps[0]}` holds nothing to scale",
                "name a value of a body, connection, property set or load",
                True,
            )
        )
        return model
    result = dict(model)
    node: Any = result
    for depth, step in enumerate(steps):
        last = depth == len(steps) - 1
        if isinstance(node, list):
            known: list[Any] = list(range(len(node)))
            key: Any = int(step) if step.isdigit() and len(step) < 6 else step
        else:
            known, key = list(node), step
        if key not in known:
            found.append(_unknown_step(result, steps, depth, known, where))
            return model
        child = node[key]
        if steps[0] == "bodies" and depth == 1 and not last:
            child = Body.shorthand(child)
        if last:
            try:
                node[key] = _scaled(child, factor)
            except ValueError as error:
                found.append(
                    Trouble(
                        where,
                        f"`{'.'.join(steps)}` holds {error}, which cannot be scaled",
                        "name the numbers to scale, such as property_sets.rubber.stiffness",
                        True,
                    )
                )
                return model
        elif isinstance(child, Mapping):
            node[key] = dict(child)
        elif isinstance(child, list | tuple):
            node[key] = list(child)
        else:
            found.append(
                Trouble(
                    where,
                    f"`{'.'.join(steps[: depth + 1])}` is one value and has no `{steps[depth + 1]}`",
                    f"write {'.'.join(steps[: depth + 1])}",
                    True,
                )
            )
            return model
        node = node[key]
    return result


def _unknown_step(
    model: Mapping[str, Any], steps: list[str], depth: int, known: list[Any], where: tuple[str | int, ...]
) -> Trouble:
    start = ".".join(steps[:depth])
    close = nearest(steps[depth], known)
    expected = (
        f"did you mean `{'.'.join([*steps[:depth], close])}`?"
        if close
        else f"known there: {', '.join(str(key) for key in known[:12])}"
    )
    if steps[0] == "connections" and depth == 2:
        uses = model["connections"][steps[1]].get("uses")
        if uses is not None:
            expected = f"its values come from property_sets.{uses}; scale those, or write the value at the connection"
    return Trouble(
        where,
        f"unknown path: {'nothing' if not start else f'`{start}`'} has no `{steps[depth]}`"
        if start
        else f"unknown path `{steps[0]}`",
        expected,
        True,
    )


def _scaled(value: Any, factor: float) -> Any:
    if isinstance(value, Mapping):
        if "value" in value:
            return {**value, "value": _scaled(value["value"], factor)}
        return {key: _scaled(entry, factor) for key, entry in value.items()}
    if hasattr(value, "tolist"):
        value = value.tolist()
    if isinstance(value, list | tuple):
        return [_scaled(entry, factor) for entry in value]
    if isinstance(value, bool) or value is None:
        raise ValueError("true or false" if isinstance(value, bool) else "nothing")
    if isinstance(value, str) and not _NUMBER.match(value):
        raise ValueError(f"the text `{value[:40]}`")
    return Scaled(value, factor)
