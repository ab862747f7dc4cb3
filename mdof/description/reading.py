"""Reading a model file: bytes to text, text to a strict document, document to a Model."""

from __future__ import annotations

import os
import re
import stat
from pathlib import Path

from mdof.description.document import Document
from mdof.description.schema import Model
from mdof.description.strict_yaml import parse
from mdof.errors import ModelError, Problem
from mdof.units import nearest

__all__ = ["LARGEST_FILE", "load", "read_document"]

#: Largest model file read [bytes].
LARGEST_FILE = 4 * 1024 * 1024

_CONTROL = re.compile("[\x00-\x08\x0b\x0c\x0e-\x1f\x7f-\x9f\u2028\u2029\ufeff\ufffe\uffff]")


def load(path: str | os.PathLike[str], state: str | None = None) -> Model:
    """Read and validate a model file.

    Parameters
    ----------
    path : file in the model grammar, UTF-8 YAML.
    state : name of one of its states, optional.

    Raises
    ------
    ModelError
        With every problem of the file, each with its place, in file order.
    UsageError
        If the model has no such state.
    """
    document = read_document(path)
    if not document.complete or not isinstance(document.data, dict):
        raise ModelError(_as_mapping(document))
    return Model.from_document(document, state)


def read_document(path: str | os.PathLike[str]) -> Document:
    """The strict document of a file; its YAML problems are inside.

    Raises
    ------
    ModelError
        If the file cannot be read as text at all.
    """
    shown = os.fspath(path)
    if isinstance(shown, bytes):
        shown = os.fsdecode(shown)
    return parse(_decoded(_bytes(shown), shown), shown)


def _as_mapping(document: Document) -> list[Problem]:
    if document.problems:
        return document.problems
    if document.data is None:
        return [
            Problem(
                path="",
                message="the file is empty",
                expected="a model needs at least `bodies:`",
                file=document.file,
                line=1,
                column=1,
            )
        ]
    what = "a list" if isinstance(document.data, list) else "one value"
    span = document.find(())
    return [
        document.problem_at(
            span.line, span.column, (), f"the file holds {what}", "a model is a mapping of keys such as `bodies:`"
        )
    ]


def _bytes(path: str) -> bytes:
    def failed(message: str, expected: str) -> ModelError:
        return ModelError([Problem(path="", message=message, expected=expected, file=path)])

    too_large = f"a model file is at most {LARGEST_FILE // 1024**2} MB"
    try:
        status = Path(path).stat()
        if stat.S_ISDIR(status.st_mode):
            raise failed("this is a folder, not a model file", "name a file such as pump.yaml")
        if status.st_size > LARGEST_FILE:
            raise failed(f"the file has {status.st_size / 1024**2:.1f} MB", too_large)
        with open(path, "rb") as stream:
            content = stream.read(LARGEST_FILE + 1)
    except FileNotFoundError:
        raise failed("there is no such file", _similar_file(path)) from None
    except PermissionError:
        raise failed("the file may not be read", "check its permissions") from None
    except (OSError, ValueError) as error:
        raise failed(
            f"the file cannot be read ({getattr(error, 'strerror', None) or error})", "check the name"
        ) from None
    if len(content) > LARGEST_FILE:
        raise failed(f"the file has more than {LARGEST_FILE // 1024**2} MB", too_large)
    return content


def _similar_file(path: str) -> str:
    """A model file beside it whose name, but for its ending, is nearly the same."""
    try:
        beside = [entry for entry in Path(path).absolute().parent.iterdir() if entry.suffix in (".yaml", ".yml")]
        stems = {entry.stem: entry.name for entry in beside[:2000] if entry.is_file()}
    except (OSError, ValueError):
        return "check the name and the folder"
    close = nearest(Path(path).stem, stems, cutoff=0.66)
    return f"did you mean `{stems[close]}`?" if close else "check the name and the folder"


def _decoded(content: bytes, path: str) -> str:
    if content[:2] in (b"\xff\xfe", b"\xfe\xff"):
        raise ModelError(
            [
                Problem(
                    path="", message="the file is UTF-16 text", expected="save it as UTF-8", file=path, line=1, column=1
                )
            ]
        )
    start = 3 if content[:3] == b"\xef\xbb\xbf" else 0
    try:
        text = content[start:].decode("utf-8")
    except UnicodeDecodeError as error:
        before = content[start : start + error.start].decode("utf-8")
        if _CONTROL.search(before) or b"\x00" in content[:4096]:
            raise _binary(path) from None
        document = Document(before, path)
        line, column = len(document.lines), len(document.lines[-1]) + 1
        message = f"the byte 0x{content[start + error.start]:02x} is not UTF-8 text"
        raise ModelError([document.problem_at(line, column, (), message, "save the file as UTF-8")]) from None
    bad = _CONTROL.search(text)
    if bad is not None:
        if "\x00" in text[:4096] or len(_CONTROL.findall(text[:4096])) > 8:
            raise _binary(path)
        document = Document(text, path)
        before = text[: bad.start()]
        lines = re.split(r"\r\n|\r|\n", before)
        message = f"the character U+{ord(bad.group()):04X} is not text a person can see"
        raise ModelError([document.problem_at(len(lines), len(lines[-1]) + 1, (), message, "remove it")])
    return text


def _binary(path: str) -> ModelError:
    return ModelError(
        [Problem(path="", message="this is not a text file", expected="a model file is UTF-8 YAML text", file=path)]
    )
