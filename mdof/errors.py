"""The one error tree of mdof.

::

    MdofError
    ├── InputError             wrong input; nothing was computed, nothing written          (exit status 2)
    │   ├── ModelError         a model file or a Model built in code is wrong; carries problems
    │   ├── UsageError         a call or command line that cannot be carried out
    │   └── OutputError        a result could not be written where it was asked for
    ├── UnverifiedError        the numbers could not be verified; none is returned         (exit status 3)
    └── DamagedArchiveError    an archive file is not what its writer wrote                (exit status 4)

Errors carry data (file, line, key path, value, what was expected) besides their text, so that a program can act on
them. Engineering doubt is not an error but a :class:`mdof.findings.Finding`.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass


class MdofError(Exception):
    """Root of every error mdof raises on purpose."""

    exit_status = 2


class InputError(MdofError):
    """Wrong input of any kind."""


@dataclass(frozen=True, kw_only=True, slots=True)
class Problem:
    """One thing wrong with a model, placed as exactly as it is known.

    Attributes
    ----------
    path : key path such as ``connections.spring.stiffness.x``; empty for the whole file.
    message : what is wrong.
    expected : what to write instead; may be empty.
    file : name of the file as the user gave it; None for a model built in code.
    line, column : 1-based place in the file; None where there is none.
    source_line : the offending line as written, without its line end.
    """

    path: str
    message: str
    expected: str = ""
    file: str | None = None
    line: int | None = None
    column: int | None = None
    source_line: str | None = None

    def __str__(self) -> str:
        place = ":".join(str(part) for part in (self.file, self.line, self.column) if part is not None)
        head = ": ".join(part for part in (place, self.path, self.message) if part)
        text = f"{head}; {self.expected}" if self.expected else head
        if self.source_line is not None and self.source_line.strip():
            shown = self.source_line.replace("\t", " ")
            start = 0 if self.column is None or self.column <= 90 else self.column - 60
            text += f"\n    {shown[start : start + 160]}"
            if self.column is not None:
                text += f"\n    {' ' * (self.column - 1 - start)}^"
        return text


class ModelError(InputError):
    """A model is wrong; ``problems`` holds everything found in it, in file order."""

    def __init__(self, problems: Iterable[Problem]) -> None:
        self.problems = tuple(problems)
        super().__init__("\n".join(str(problem) for problem in self.problems))

    def __reduce__(self) -> tuple[object, ...]:
        # Exceptions pickle by their text; another process needs the data.
        return type(self), (self.problems,)


class UsageError(InputError):
    """A call that cannot be carried out as asked."""


class OutputError(InputError):
    """A result could not be written where it was asked for."""


class UnverifiedError(MdofError):
    """The numbers could not be verified, so none is returned.

    ``reason`` says which check failed and by how much, ``advice`` what to do about it.
    """

    exit_status = 3

    def __init__(self, reason: str, advice: str) -> None:
        self.reason = reason
        self.advice = advice
        super().__init__(f"{reason}; {advice}")

    def __reduce__(self) -> tuple[object, ...]:
        return type(self), (self.reason, self.advice)


class DamagedArchiveError(MdofError):
    """An archive file is not what its writer wrote."""

    exit_status = 4
