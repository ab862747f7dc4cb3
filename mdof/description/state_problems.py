"""Problems of states, told where the state was written."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from mdof.description.build import Memory, build
from mdof.description.document import Document, dotted, visible
from mdof.description.document import Path as KeyPath
from mdof.description.quantities import Trouble, kind_of
from mdof.description.readers import NAME_RULE
from mdof.description.states import chain, state_of
from mdof.description.whole_checks import MOST_TROUBLES
from mdof.errors import Problem

__all__ = ["place_in_state", "placed", "state_problems"]


_MOST_STATES = 100


def state_problems(
    raw: Mapping[str, Any], document: Document | None, memory: Memory, seen: set[tuple[KeyPath, str]]
) -> list[Problem]:
    """What is wrong with the states of a model, each fault told once, in the state that makes it.

    ``seen`` holds path and message of what is wrong with the model itself and is not told again.
    """
    states = raw.get("states")
    if states is None:
        return (
            [placed(Trouble(("states",), "no value is given", "remove the key `states`"), document)]
            if "states" in raw
            else []
        )
    if not isinstance(states, Mapping):
        return [
            placed(
                Trouble(
                    ("states",),
                    f"{kind_of(states)} where named states belong",
                    f"write {{cold: {{scale: {{..}}}}}}; {NAME_RULE}",
                ),
                document,
            )
        ]
    if len(states) > _MOST_STATES:
        message = f"{len(states)} states in one model"
        return [placed(Trouble(("states",), message, f"keep at most {_MOST_STATES}", True), document)]
    problems: list[Problem] = []
    known: dict[str, set[tuple[KeyPath, str]]] = {}
    # A state after the ones it builds on, so that a fault is told once, where it was made.
    for name in sorted(states, key=lambda name: len(chain(states, name)[0])):
        if len(problems) >= MOST_TROUBLES:
            break
        merged, written = state_of(raw, name)
        problems += [placed(trouble, document) for trouble in written]
        _, found = build(merged, memory)
        names = chain(states, name)[0]
        told = seen.union(*(known.get(parent, set()) for parent in names[:-1]))
        known[name] = {(trouble.path, trouble.message) for trouble in found}
        for trouble in found:
            if (trouble.path, trouble.message) not in told:
                problems.append(
                    place_in_state(
                        document, trouble.path, name, trouble.message, trouble.expected, None, trouble.on_key
                    )
                )
    return problems


def placed(trouble: Trouble, document: Document | None) -> Problem:
    """The complaint with its place in the file; without a file, with its key path alone."""
    if document is None:
        return Problem(path=dotted(trouble.path), message=visible(trouble.message), expected=visible(trouble.expected))
    return document.place(trouble.path, trouble.message, trouble.expected, on_key=trouble.on_key)


def place_in_state(
    document: Document | None,
    path: KeyPath,
    state: str | None,
    message: str,
    expected: str,
    shown: str | None,
    on_key: bool = False,
) -> Problem:
    """Place a problem of a model in a state: in the state's own lines if it wrote them, else where the model did."""
    if state is None or document is None:
        where = path if state is None else ("states", state, *path)
        if document is None:
            return Problem(path=shown or dotted(where), message=visible(message), expected=visible(expected))
        return document.place(path, message, expected, on_key=on_key, shown=shown)
    best: KeyPath = ()
    states = document.data.get("states", {})
    for step in reversed(chain(states, state)[0]):
        candidates = [("states", step, *path[:length]) for length in range(len(path), 0, -1)]
        scale = states[step].get("scale") if isinstance(states[step], Mapping) else None
        candidates += [
            ("states", step, "scale", target) for target in scale or () if dotted(path).startswith(str(target))
        ]
        for candidate in candidates:
            if candidate in document.values and len(candidate) > len(best):
                best = candidate
                break
        if best:
            break
    if not best:
        if shown is not None and any(path[:length] in document.values for length in range(1, len(path) + 1)):
            return document.place(path, message, expected, on_key=on_key, shown=shown)
        best = ("states", state)
    on_key = len(best) == 2 or (on_key and len(best) >= len(path))
    return document.place(best, message, expected, on_key=on_key, shown=shown or dotted(("states", state, *path)))
