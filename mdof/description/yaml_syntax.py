"""What the YAML parser says about broken syntax, in words a writer of models understands."""

from __future__ import annotations

import re
from typing import Any

from mdof.description.document import Document, Path, Span
from mdof.errors import Problem

__all__ = ["DEEPEST", "decimal_comma", "hidden_character", "span_of", "syntax_problem"]


#: Deeper than any model can mean.
DEEPEST = 24


def hidden_character(text: str) -> str | None:
    """A character of the text that is neither printed nor white space, if there is one."""
    return next((character for character in text if not (character.isprintable() or character.isspace())), None)


def decimal_comma(document: Document, line: int, column: int, text: str) -> str | None:
    """The number of which ``text``, which starts at this place (1-based), is the part after a decimal comma."""
    before = re.search(r"(?<![^\s:])[-+]?[0-9]+,$", document.lines[line - 1][: column - 1])
    return f"{before.group()[:-1]}.{text}" if before and text[:1].isdigit() else None


def span_of(event: Any) -> Span:
    start, end = event.start_mark, event.end_mark
    return Span(start.line + 1, start.column + 1, end.line + 1, end.column + 1)


#: Part of the parser's text (libyaml's, or that of PyYAML's own parser), what it means, what to do.
_SYNTAX = (
    ("exceeded maximum nesting depth", "nested too deeply for a model", f"use at most {DEEPEST} levels"),
    (
        "mapping values are not allowed",
        "there is a second `key: value` on this line",
        "start it on a line of its own, or put text with `: ` in quotes",
    ),
    ("could not find expected ':'", "a key without a colon", "write key: value (with a blank after the colon)"),
    (
        "expected ',' or '}'",
        "a { ... } is not closed here, or a comma is missing",
        "close it with } or separate its keys with commas",
    ),
    (
        "expected ',' or ']'",
        "a [ ... ] is not closed here, or a comma is missing",
        "close it with ] or separate its values with commas",
    ),
    (
        "did not find expected key",
        "this line does not line up with the keys above it",
        "indent the keys of one mapping equally",
    ),
    (
        "did not find expected '-' indicator",
        "this line does not line up with the list above it",
        "indent the dashes of one list equally",
    ),
    (
        "expected <block end>",
        "this line does not line up with the lines above it",
        "indent the keys of one mapping, or the dashes of one list, equally",
    ),
    ("did not find expected node content", "a value is missing here", "write a value"),
    (
        "block sequence entries are not allowed",
        "a list starts with a dash in the wrong place",
        "start it on a line of its own",
    ),
    ("found unexpected end of stream", "a quote is opened and never closed", "close the quote"),
    (
        "found character that cannot start any token",
        "a value cannot start with this character",
        "put the text in quotes",
    ),
    ("found a tab character", "a tab stands where only spaces may", "use spaces"),
    ("found undefined tag handle", "tags (!...) are not read", "remove the tag"),
    (
        "found unknown escape character",
        "this backslash sequence means nothing inside double quotes",
        "use single quotes, or double the backslash",
    ),
    ("found undefined alias", "aliases (*...) are not read", "write the value out, or use `property_sets`"),
    (
        "did not find expected <document start>",
        "something stands after the end of the model",
        "put everything into one mapping of keys",
    ),
    (
        "did not find expected alphabetic or numeric character",
        "a value cannot start with & or *",
        "put the text in quotes",
    ),
    ("found incompatible YAML document", "this YAML version is not known", "remove the %YAML line"),
    ("found unexpected document indicator", "a quote is opened and never closed", "close the quote"),
)


def syntax_problem(document: Document, error: Any) -> Problem:
    """A parser error in an engineer's words, at its place."""
    mark = error.problem_mark or error.context_mark
    line, column = (mark.line + 1, mark.column + 1) if mark is not None else (1, 1)
    text = str(error.problem or error.context or "")
    message, expected = f"this is not YAML ({text[:80]})", "check the punctuation here and on the line above"
    for start, what, way in _SYNTAX:
        if start in text:
            message, expected = what, way
            break
    glued = _glued_colon(document, line) if text.startswith("mapping values are not allowed") else None
    if glued is not None:
        return document.problem_at(*glued)
    if error.context_mark is not None and mark is not error.context_mark and error.context_mark.line + 1 != line:
        message = f"{message} (it began on line {error.context_mark.line + 1})"
    if line > len(document.lines) or (line == len(document.lines) and not document.lines[-1].strip()):
        # The parser noticed at the end of the text; the line with something on it is the useful place.
        while line > 1 and (line > len(document.lines) or not document.lines[line - 1].strip()):
            line -= 1
        column = len(document.lines[line - 1].rstrip()) + 1
    return document.problem_at(line, column, (), message, expected)


def _glued_colon(document: Document, line: int) -> tuple[int, int, Path, str, str] | None:
    """The complaint about ``mass:180 kg`` on this line or the one above: to YAML it is text that goes on below."""
    for number in (line, line - 1):
        found = re.match(r"\s*(?:- )?(([A-Za-z_]+):([-+.0-9\[{][^:]*))", document.lines[number - 1]) if number else None
        if found is not None:
            way = f"put a blank after the colon: `{found[2]}: {found[3].strip()[:40]}`"
            return number, found.start(1) + 1, (), f"`{found[1].strip()[:40]}` is text, not a key and its value", way
    return None
