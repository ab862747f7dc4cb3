"""The command line. Each file holds one family of commands: arguments, calls, exit status; nothing is computed here."""

from __future__ import annotations

from collections.abc import Sequence

__all__ = ["main"]


def main(arguments: Sequence[str] | None = None) -> int:
    """Run one command and return its exit status; the console script ``mdof`` exits with it."""
    try:
        from mdof.cli.app import run

        return run(arguments)
    except KeyboardInterrupt:
        return 130
