"""One call of the program: its streams, its worst status, and the loop over models and states."""

from __future__ import annotations

import errno
import gc
import os
import sys
from collections.abc import Callable, Sequence
from importlib import import_module
from typing import TYPE_CHECKING, Any, TextIO

from mdof.errors import MdofError, ModelError, OutputError, UnverifiedError

if TYPE_CHECKING:
    from mdof.description.schema import Model
    from mdof.report.look import Look

__all__ = ["Session"]

_MOST_PROBLEMS = 30
#: Signs that terminals with old encodings lack.
_PLAIN = str.maketrans({"–": "-", "·": "-", "×": "x", "→": "->", "▪": "#", "²": "2", "ζ": "zeta", "λ": "lambda"})


class Session:
    """Data go to standard output; findings, progress and errors to standard error.

    A reader that closes the pipe early (``| head``) is no error: the rest of the output is dropped, and the work and
    the status stay what they are.
    """

    def __init__(self, words: Sequence[str]) -> None:
        self.command_line = ("mdof", *words[1:])
        self.status = 0
        self._deaf: set[int] = set()

    def worsen(self, status: int) -> None:
        """Keep the largest status of all models."""
        self.status = max(self.status, status)

    def look(self, stream: TextIO | None = None) -> Look:
        """How standard output (default) or another stream shows things."""
        from mdof.report.look import Look

        place = sys.stdout if stream is None else stream
        return Look() if place is None else Look.of(place)

    def data(self, content: str | bytes) -> None:
        """Write results to standard output."""
        try:
            self._write(sys.stdout, content)
        except OSError as error:
            self._deaf.add(id(sys.stdout))
            raise OutputError(f"standard output cannot be written: {error.strerror or error}") from error

    def say(self, text: str) -> None:
        """Write findings, progress or errors to standard error."""
        if text:
            try:
                self._write(sys.stderr, text if text.endswith("\n") else text + "\n")
            except OSError:
                self._deaf.add(id(sys.stderr))

    def _write(self, stream: TextIO | None, content: str | bytes) -> None:
        if stream is None or id(stream) in self._deaf:
            return
        try:
            if isinstance(content, str):
                encoding = stream.encoding or "utf-8"
                if not encoding.lower().replace("-", "").startswith("utf"):
                    content = content.translate(_PLAIN)
                content = content.encode(encoding, "backslashreplace")
            stream.buffer.write(content)
            stream.flush()
        except (BrokenPipeError, OSError) as error:
            if not isinstance(error, BrokenPipeError) and error.errno not in (errno.EPIPE, errno.EINVAL):
                _silence(stream)
                raise
            self._deaf.add(id(stream))
            _silence(stream)

    def report(self, error: MdofError, name: str | None = None) -> None:
        """Say what went wrong and keep its status."""
        self.worsen(error.exit_status)
        if isinstance(error, ModelError):
            shown = [str(problem) for problem in error.problems[:_MOST_PROBLEMS]]
            if len(error.problems) > _MOST_PROBLEMS:
                shown.append(f"and {len(error.problems) - _MOST_PROBLEMS} more of them")
            self.say("\n".join(shown))
        elif isinstance(error, UnverifiedError):
            self.say(f"{name or 'mdof'}: not verified, no result: {error}")
        else:
            self.say(f"{name}: {error}" if name else f"mdof: {error}")

    def load(self, *modules: str) -> None:
        """Import what a command needs, with the collector of reference cycles off.

        Modules are there to stay; looking through the growing heap for garbage costs a tenth of a short call.
        """
        collecting = gc.isenabled()
        gc.disable()
        try:
            for name in modules:
                import_module(name)
        finally:
            gc.freeze()
            if collecting:
                gc.enable()

    def each_model(self, paths: Sequence[str], state: str | None, work: Callable[[Model], Any]) -> None:
        """Do ``work`` for every model and state; one that fails does not hide the others."""
        import mdof

        for path in paths:
            try:
                model = mdof.load(path, state=None if state == "all" else state)
            except MdofError as error:
                self.report(error, path)
                continue
            for name in (None, *model.state_names) if state == "all" else (state,):
                try:
                    work(model.with_state(name) if name and state == "all" else model)
                except OutputError as error:
                    self.report(error)
                except MdofError as error:
                    self.report(error, f"{path} [{name}]" if name else path)

    def finish(self) -> int:
        """The exit status, after everything was written."""
        for stream in (sys.stdout, sys.stderr):
            if stream is not None and id(stream) not in self._deaf:
                try:
                    stream.flush()
                except OSError:
                    _silence(stream)
        return self.status


def _silence(stream: TextIO) -> None:
    """Send what is still buffered nowhere, so that leaving Python does not complain about the closed pipe."""
    try:
        nowhere = os.open(os.devnull, os.O_WRONLY)
        os.dup2(nowhere, stream.fileno())
        os.close(nowhere)
    except (OSError, ValueError):
        return
