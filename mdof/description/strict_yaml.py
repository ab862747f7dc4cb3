"""Strict YAML: text to plain values, with the place of every value and key kept.

Built on the events of PyYAML's C parser with a stack of its own, so nesting costs no recursion and every trap of the
language is closed here: aliases, anchors, tags, merge keys, duplicate keys, and every spelling that YAML 1.1 and
YAML 1.2 read differently (``010``, ``1:30``, ``1_000``, ``1e5``, ``yes``).
"""

from __future__ import annotations

from typing import Any

from mdof.description.document import Document, Path, Span
from mdof.description.scalars import resolve
from mdof.description.yaml_syntax import DEEPEST, decimal_comma, hidden_character, span_of, syntax_problem

__all__ = ["parse"]

_MOST_VALUES = 400_000
_MOST_PROBLEMS = 200


class _Stopped(Exception):
    """Reading cannot go on; the reason is already among the problems."""


class _Frame:
    """An open mapping or list; ``place`` is the path of the value that follows the key just read."""

    __slots__ = ("container", "dropped", "key", "mapping", "path", "place")

    def __init__(self, container: Any, path: Path, dropped: bool) -> None:
        self.container = container
        self.mapping = isinstance(container, dict)
        self.path = path
        self.place = path
        self.dropped = dropped
        self.key: str | None = None


def parse(text: str, file: str | None = None) -> Document:
    """Read YAML text strictly. Never raises for wrong text: the problems are in the document."""
    document = Document(text, file)
    _refuse_tabs(document)
    if document.problems:
        document.complete = False
        return document
    import yaml

    loader = getattr(yaml, "CSafeLoader", yaml.SafeLoader)
    try:
        _Builder(document).run(yaml.parse(text, Loader=loader))
    except _Stopped:
        document.complete = False
    except yaml.MarkedYAMLError as error:
        document.complete = False
        document.problems.append(syntax_problem(document, error))
    except yaml.YAMLError as error:
        document.complete = False
        document.problems.append(
            document.problem_at(1, 1, (), f"this is not YAML text ({str(error).splitlines()[0][:80]})")
        )
    return document


def _refuse_tabs(document: Document) -> None:
    for number, line in enumerate(document.lines, 1):
        if "\t" in line:
            content = line.lstrip(" \t")
            lead = line[: len(line) - len(content)]
            if "\t" in lead and content and not content.startswith("#"):
                document.problems.append(
                    document.problem_at(
                        number, lead.index("\t") + 1, (), "the line is indented with a tab", "indent with spaces"
                    )
                )
                if len(document.problems) >= _MOST_PROBLEMS:
                    return


class _Builder:
    """Turns events into values without recursion."""

    def __init__(self, document: Document) -> None:
        self.document = document
        self.stack: list[_Frame] = []
        self.count = 0

    def complain(self, event: Any, path: Path, message: str, expected: str = "", *, unreadable: bool = True) -> None:
        mark = event.start_mark
        self.document.problems.append(self.document.problem_at(mark.line + 1, mark.column + 1, path, message, expected))
        if unreadable:
            self.document.unreadable.add(path)
        if len(self.document.problems) >= _MOST_PROBLEMS:
            self.document.problems.append(
                self.document.problem_at(mark.line + 1, mark.column + 1, (), "too many errors; reading stopped here")
            )
            raise _Stopped

    def run(self, events: Any) -> None:
        documents = 0
        for event in events:
            kind = type(event).__name__
            if kind == "ScalarEvent":
                self.scalar(event)
            elif kind in ("MappingStartEvent", "SequenceStartEvent"):
                self.open(event, kind == "MappingStartEvent")
            elif kind in ("MappingEndEvent", "SequenceEndEvent"):
                self.close(event)
            elif kind == "AliasEvent":
                self.alias(event)
            elif kind == "DocumentStartEvent":
                documents += 1
                if documents > 1:
                    self.complain(event, (), "a second document starts here", "keep one model in a file")
                    raise _Stopped

    def here(self) -> Path:
        """Path of the value that comes next."""
        if not self.stack:
            return ()
        frame = self.stack[-1]
        return (*frame.path, len(frame.container)) if frame.key is None else frame.place

    def wants_key(self) -> bool:
        return bool(self.stack) and self.stack[-1].mapping and self.stack[-1].key is None

    def dropped(self) -> bool:
        """True where what comes next is read and thrown away; a frame inherits it from the one around it."""
        return bool(self.stack) and self.stack[-1].dropped

    def refuse_decoration(self, event: Any, path: Path) -> None:
        if event.anchor is not None:
            self.complain(
                event,
                path,
                f"anchors (&{event.anchor[:40]}) are not read",
                "write the value out, or use `property_sets`",
                unreadable=False,
            )
        if event.tag is not None:
            self.complain(event, path, f"tags ({event.tag[:40]}) are not read", "remove the tag")

    def alias(self, event: Any) -> None:
        if self.wants_key():
            self.complain(
                event, self.stack[-1].path, f"a key cannot be an alias (*{event.anchor[:40]})", "write the key out"
            )
            self.await_value(f"*{event.anchor}", dropped=True)
            return
        path = self.here()
        if not self.dropped():
            self.complain(
                event,
                path,
                f"aliases (*{event.anchor[:40]}) are not read",
                "write the value out, or use `property_sets`",
            )
        self.put(None, event, path)

    def await_value(self, key: str, *, dropped: bool = False) -> None:
        """The mapping on top has read a key; a dropped one takes its value with it."""
        frame = self.stack[-1]
        frame.key = key
        frame.place = (*frame.path, key)
        frame.dropped = frame.dropped or dropped

    def scalar(self, event: Any) -> None:
        plain = event.implicit[0] and event.style in (None, "")
        is_key = self.wants_key()
        if not event.value.isprintable() and (hidden := hidden_character(event.value)):
            where = self.stack[-1].path if is_key else self.here()
            self.complain(event, where, f"the text holds U+{ord(hidden):04X}, which a person cannot see", "remove it")
        if is_key:
            self.key(event, plain)
            return
        path = self.here()
        if event.anchor is not None or event.tag is not None:
            self.refuse_decoration(event, path)
        value: Any = event.value
        if plain:
            value, complaint, expected = resolve(event.value)
            if complaint and not self.dropped():
                self.complain(event, path, complaint, expected)
            elif not event.value and self.comma(path):
                self.stack[-1].dropped = True
        self.put(value, event, path)

    def comma(self, path: Path) -> bool:
        """Complain where a key without a value, as in ``{mass: 0,5 kg}``, is the rest of a number."""
        frame = self.stack[-1] if self.stack else None
        if frame is None or frame.key is None or frame.dropped or not frame.container:
            return False
        span, before = self.document.keys[path], next(reversed(frame.container))
        meant = decimal_comma(self.document, span.line, span.column, frame.key)
        if meant is None:
            return False
        number, problems = (*frame.path, before), self.document.problems
        if problems and (problems[-1].line, problems[-1].column) == span[:2]:
            problems.pop()  # digits for a key, which this explains
        what, way = f"a comma stands in the number of `{before[:40]}`", f"write {before[:40]}: {meant[:40]}"
        place = self.document.values[number]
        problems.append(
            self.document.problem_at(place.line, place.column, number, what, f"{way}, with a decimal point")
        )
        self.document.unreadable.add(number)
        return True

    def key(self, event: Any, plain: bool) -> None:
        frame = self.stack[-1]
        name = event.value
        self.await_value(name)
        path = frame.place
        if event.anchor is not None or event.tag is not None:
            self.refuse_decoration(event, path)
        if plain and name == "<<":
            self.complain(event, path, "merge keys (<<) are not read", "write the keys out, or use `property_sets`")
            frame.dropped = True
        elif plain and name not in ("on", "On", "ON"):
            # `on` is a key of the grammar and is read as the text it is.
            value, complaint, _ = resolve(name)
            if complaint or not isinstance(value, str):
                what = (
                    f"the key `{name[:40]}` is not text to every YAML reader"
                    if name
                    else "a key is missing before the colon"
                )
                self.complain(
                    event,
                    path,
                    what,
                    f'write "{name[:40]}" in quotes' if name else "write key: value",
                    unreadable=False,
                )
        if name in frame.container and not frame.dropped:
            first = self.document.keys[path]
            self.complain(
                event,
                path,
                f"the key `{name[:60]}` is written twice",
                f"keep one; the first is on line {first.line}",
                unreadable=False,
            )
            frame.dropped = True
        if not frame.dropped:
            self.document.keys.setdefault(path, span_of(event))

    def open(self, event: Any, mapping: bool) -> None:
        if len(self.stack) >= DEEPEST:
            self.complain(event, self.stack[2].path, "nested too deeply for a model", f"use at most {DEEPEST} levels")
            raise _Stopped
        if self.wants_key():
            frame = self.stack[-1]
            self.complain(
                event,
                frame.path,
                "a mapping or list cannot be a key",
                "write a plain name; put text with braces in quotes",
                unreadable=False,
            )
            # The complex key is read and thrown away together with its value.
            self.await_value("", dropped=True)
            self.stack.append(_Frame({} if mapping else [], (*frame.path, "?"), True))
            return
        path = self.here()
        if event.anchor is not None or event.tag is not None:
            self.refuse_decoration(event, path)
        container: Any = {} if mapping else []
        self.put(container, event, path, closes=False)
        self.stack.append(_Frame(container, path, self.dropped()))

    def close(self, event: Any) -> None:
        frame = self.stack.pop()
        started = self.document.values.get(frame.path)
        if started is not None and not frame.dropped:
            end = event.end_mark
            self.document.values[frame.path] = Span(started.line, started.column, end.line + 1, end.column + 1)
        if frame.path and frame.path[-1] == "?" and self.stack and self.stack[-1].key == "":
            return
        self.after_value()

    def put(self, value: Any, event: Any, path: Path, closes: bool = True) -> None:
        self.count += 1
        if self.count > _MOST_VALUES:
            self.complain(event, (), f"more than {_MOST_VALUES} values in one model", "split the model")
            raise _Stopped
        frame = self.stack[-1] if self.stack else None
        if frame is None or not frame.dropped:
            self.document.values[path] = span_of(event)
            if frame is None:
                self.document.data = value
            elif frame.mapping:
                frame.container[frame.key] = value
            else:
                frame.container.append(value)
        if closes:
            self.after_value()

    def after_value(self) -> None:
        if self.stack and self.stack[-1].mapping:
            frame = self.stack[-1]
            frame.key = None
            # A mapping inside a dropped value stays dropped; only what this mapping dropped itself ends here.
            frame.dropped = len(self.stack) > 1 and self.stack[-2].dropped
