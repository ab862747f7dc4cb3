"""A YAML document as plain values, with the place of every value and key kept."""

from __future__ import annotations

import re
from collections.abc import Sequence
from typing import Any, NamedTuple

from mdof.errors import Problem

__all__ = ["Document", "Path", "Span", "dotted", "visible"]

Path = tuple[str | int, ...]


class Span(NamedTuple):
    """Where something stands in the text: 1-based line and column of its start, and of the place just after it."""

    line: int
    column: int
    end_line: int
    end_column: int


class Document:
    """One YAML document as plain values, and where each of them stands.

    Attributes
    ----------
    file : name as the user gave it, or None.
    text, lines : the source.
    data : nested dicts, lists, texts, numbers, booleans and None.
    values, keys : span of every value and of every key, by key path.
    problems : what is wrong with it as YAML; paths of unreadable values are in ``unreadable``.
    complete : False where reading stopped early.
    """

    def __init__(self, text: str, file: str | None) -> None:
        self.file = file
        self.text = text
        self.lines: Sequence[str] = re.split(r"\r\n|\r|\n", text)
        self.data: Any = None
        self.values: dict[Path, Span] = {}
        self.keys: dict[Path, Span] = {}
        self.problems: list[Problem] = []
        self.unreadable: set[Path] = set()
        self.complete = True

    def problem_at(self, line: int, column: int, path: Path, message: str, expected: str = "") -> Problem:
        """A problem at a known place (1-based)."""
        shown = self.lines[line - 1] if 0 < line <= len(self.lines) else None
        return Problem(
            path=dotted(path),
            message=visible(message),
            expected=visible(expected),
            file=self.file,
            line=line,
            column=column,
            source_line=shown,
        )

    def place(
        self, path: Path, message: str, expected: str = "", *, on_key: bool = False, shown: str | None = None
    ) -> Problem:
        """A problem with the value at ``path``, or with the nearest thing above it that was written.

        ``on_key`` points at the key instead; ``shown`` replaces the path in the message.
        """
        span = self.find(path, on_key=on_key)
        problem = self.problem_at(span.line, span.column, path, message, expected)
        if shown is None:
            return problem
        return Problem(
            path=shown,
            message=message,
            expected=expected,
            file=problem.file,
            line=problem.line,
            column=problem.column,
            source_line=problem.source_line,
        )

    def find(self, path: Path, *, on_key: bool = False) -> Span:
        """Span of the value at ``path``, else of the nearest key above it that was written."""
        if not on_key and path in self.values:
            return self.values[path]
        for length in range(len(path), 0, -1):
            key = path[:length]
            if length < len(path) and key in self.values and not isinstance(self.at(key), dict):
                # A short form such as `pump: 10 kg` stands for the value below it.
                return self.values[key]
            if key in self.keys:
                return self.keys[key]
            if key in self.values:
                return self.values[key]
        return self.values.get((), Span(1, 1, 1, 1))

    def at(self, path: Path) -> Any:
        """The value at ``path``, or None where nothing stands there."""
        node = self.data
        for step in path:
            if isinstance(node, dict):
                node = node.get(step)
            elif isinstance(node, list) and isinstance(step, int) and step < len(node):
                node = node[step]
            else:
                return None
        return node


def dotted(path: Path) -> str:
    """A key path as text, such as ``connections.spring.stiffness.x``."""
    return visible(".".join(str(part) for part in path))


def visible(text: str) -> str:
    """The text with everything that cannot be printed escaped, so that a message is one line and nothing but text."""
    if text.isprintable():
        return text
    return "".join(character if character.isprintable() else ascii(character)[1:-1] for character in text)
