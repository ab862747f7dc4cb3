"""The Model: a validated description of a machine on its mounts, from a file or built in code."""

from __future__ import annotations

import copy
import hashlib
from collections.abc import Mapping
from types import MappingProxyType
from typing import TYPE_CHECKING, Any

from mdof.description.build import Memory, build
from mdof.description.document import Document
from mdof.description.document import Path as KeyPath
from mdof.description.quantities import Quantity
from mdof.description.resolved import digest_of, to_si
from mdof.description.state_problems import place_in_state, placed, state_problems
from mdof.description.states import state_of
from mdof.description.whole_checks import MOST_TROUBLES
from mdof.errors import ModelError, Problem, UsageError
from mdof.units import nearest

if TYPE_CHECKING:
    from mdof.description.bodies import Body, Support
    from mdof.description.connections import Connection, PropertySet
    from mdof.description.whole import Criteria, Damping, Load, Watch

__all__ = ["Model", "Quantity"]


class Model:
    """A machine described: bodies, connections, and what is known about them. Immutable.

    ``mdof.load`` makes one from a file; ``Model(**mapping)`` makes one from the same keys in code::

        mdof.Model(units="SI", bodies={"machine": 50}, connections={
            "mount": {"between": ["machine", "ground"], "stiffness": 2.0e4, "damping": 120}})

    Attributes
    ----------
    title : str
    directions : tuple of str
        Directions every body may move in, unless it narrows them.
    bodies, supports, property_sets, connections, watch, loads : mapping of name to description, in file order
    damping : Damping or None
    reference_frequency : Quantity or None [rad/s]
    criteria : Criteria; its numbers are SI, None where not set.
    states : mapping of name to the partial model as written.
    file, source_text : name and text of the file; None for a model built in code.
    state : name of the state this model is in, or None.

    Raises
    ------
    ModelError
        With every problem found, in file order.
    """

    __slots__ = (
        "__weakref__",
        "_content",
        "_document",
        "_raw",
        "bodies",
        "connections",
        "criteria",
        "damping",
        "directions",
        "file",
        "loads",
        "property_sets",
        "reference_frequency",
        "source_text",
        "state",
        "states",
        "supports",
        "title",
        "units",
        "watch",
    )

    title: str
    units: Mapping[str, str]
    directions: tuple[str, ...]
    bodies: Mapping[str, Body]
    supports: Mapping[str, Support]
    property_sets: Mapping[str, PropertySet]
    connections: Mapping[str, Connection]
    watch: Mapping[str, Watch]
    loads: Mapping[str, Load]
    damping: Damping | None
    reference_frequency: Quantity | None
    criteria: Criteria
    states: Mapping[str, Any]
    file: str | None
    source_text: str | None
    state: str | None
    _raw: Mapping[str, Any]
    _document: Document | None
    _content: dict[str, Any] | None

    def __init__(self, **mapping: Any) -> None:
        raw = copy.deepcopy(mapping)
        self._fill(raw, None, _checked(raw, None), None)

    @classmethod
    def from_document(cls, document: Document, state: str | None = None) -> Model:
        """A model from a document read without problems, in one of its states."""
        values = _checked(document.data, document)
        model = cls.__new__(cls)
        model._fill(document.data, document, values, None)
        return model if state is None else model.with_state(state)

    def _fill(
        self, raw: Mapping[str, Any], document: Document | None, values: Mapping[str, Any], state: str | None
    ) -> None:
        put = object.__setattr__
        for name, value in values.items():
            put(self, name, MappingProxyType(value) if isinstance(value, dict) else value)
        put(self, "states", MappingProxyType(dict(raw.get("states") or {})))
        put(self, "file", document.file if document is not None else None)
        put(self, "source_text", document.text if document is not None else None)
        put(self, "state", state)
        put(self, "_raw", raw)
        put(self, "_document", document)
        put(self, "_content", None)

    def __setattr__(self, name: str, value: Any) -> None:
        raise AttributeError("a Model cannot be changed; build another one, or use with_state")

    def __delattr__(self, name: str) -> None:
        self.__setattr__(name, None)

    def __reduce__(self) -> tuple[Any, ...]:
        return _remade, (self._raw, self._document, self.state)

    def __repr__(self) -> str:
        state = f", state {self.state!r}" if self.state else ""
        return f"Model({self.title!r}{state}: {len(self.bodies)} bodies, {len(self.connections)} connections)"

    @property
    def state_names(self) -> tuple[str, ...]:
        """Names of the states, in file order."""
        return tuple(self.states)

    def with_state(self, name: str | None) -> Model:
        """The model in one of its states; None gives it as described.

        Raises
        ------
        UsageError
            If there is no such state.
        """
        if name is not None and name not in self.states:
            close = nearest(str(name), self.states)
            known = f"its states are {', '.join(self.states)}" if self.states else "it has no states"
            raise UsageError(
                f"the model has no state `{name}`; " + (f"did you mean `{close}`? " if close else "") + known
            )
        raw = self._raw if name is None else state_of(self._raw, name)[0]
        values, found = build(raw)
        if found:
            raise ModelError([placed(trouble, self._document) for trouble in found])
        model = Model.__new__(Model)
        model._fill(self._raw, self._document, _titled(values, self._raw, self._document), name)
        return model

    def to_si(self) -> dict[str, Any]:
        """The resolved model in SI units as plain JSON values.

        Property sets and named points are written out, the state is merged. A number is a float, or a mapping
        ``{value, tolerance, source, status}`` where something more is known about it.
        """
        content = self._content
        if content is None:
            content = to_si(self)
            object.__setattr__(self, "_content", content)
        return copy.deepcopy(content)

    @property
    def digest(self) -> str:
        """``sha256:<hex>`` of the canonical JSON of :meth:`to_si`; the order of keys in the file does not matter."""
        return digest_of(self.to_si())

    @property
    def source_digest(self) -> str | None:
        """``sha256:<hex>`` of the source text as UTF-8, or None for a model built in code."""
        return None if self.source_text is None else f"sha256:{hashlib.sha256(self.source_text.encode()).hexdigest()}"

    @classmethod
    def json_schema(cls) -> dict[str, Any]:
        """JSON Schema (draft 2020-12) of the model file, for editors."""
        from mdof.description.editor_schema import json_schema

        return json_schema()

    def locate(self, path: str, message: str, expected: str = "") -> Problem:
        """A problem with what stands at ``path``, placed in the model's file if it has one.

        ``path`` is a key path such as ``connections.spring/a.stiffness``; a full connection name is understood.
        """
        if self._document is None:
            return Problem(path=path, message=message, expected=expected)
        keys: list[str | int] = []
        for part in path.split("."):
            name, _, point = part.partition("/")
            keys.append(int(part) if part.isdigit() and (*keys, part) not in self._document.values else name)
            if point and len(keys) == 2:
                keys += ["at", point] if path.count(".") == 1 else []
        return place_in_state(self._document, tuple(keys), self.state, message, expected, path)


def _remade(raw: Mapping[str, Any], document: Document | None, state: str | None) -> Model:
    model = Model(**raw) if document is None else Model.from_document(document)
    return model if state is None else model.with_state(state)


def _titled(values: dict[str, Any], raw: Mapping[str, Any], document: Document | None) -> dict[str, Any]:
    if document is not None and document.file and "title" not in raw:
        stem = document.file.replace("\\", "/").rsplit("/", 1)[-1]
        values["title"] = stem.rsplit(".", 1)[0] or stem
    return values


def _checked(raw: Mapping[str, Any], document: Document | None) -> dict[str, Any]:
    """Validated values of the model as described; raises with the problems of it and of every state."""
    memory = Memory()
    values, found = build({key: value for key, value in raw.items() if key != "states"}, memory)
    problems = list(document.problems) if document is not None else []
    unreadable = document.unreadable if document is not None else set()
    seen: set[tuple[KeyPath, str]] = set()
    for trouble in found:
        if not any(_follows(trouble.path, path) for path in unreadable):
            problems.append(placed(trouble, document))
        seen.add((trouble.path, trouble.message))
    problems.extend(state_problems(raw, document, memory, seen))
    if problems:
        raise ModelError(_in_order(problems))
    return _titled(values, raw, document)


def _follows(path: KeyPath, unreadable: KeyPath) -> bool:
    """True where a complaint is about an unreadable value, or about what the body or connection around it lacks."""
    return path[: len(unreadable)] == unreadable or (len(path) >= 2 and unreadable[: len(path)] == path)


def _in_order(problems: list[Problem]) -> list[Problem]:
    """In file order; of several about one thing only the first, which is nearest to the text."""
    told: set[tuple[Any, ...]] = set()
    result = []
    for problem in sorted(problems, key=lambda problem: (problem.line or 0, problem.column or 0)):
        place = (problem.path, problem.line, problem.column)
        if problem.line is None or place not in told:
            result.append(problem)
        told.add(place)
    if len(result) > MOST_TROUBLES:
        rest = Problem(path="", message=f"and {len(result) - MOST_TROUBLES} more", file=result[0].file)
        return [*result[:MOST_TROUBLES], rest]
    return result
