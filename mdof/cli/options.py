"""Arguments and options that several commands share."""

from __future__ import annotations

import re
from collections.abc import Callable
from typing import Any, TypeVar

import click

__all__ = ["RATIO", "Word", "format_option", "model_arguments", "state_option"]

F = TypeVar("F", bound=Callable[..., Any])


class Word(click.ParamType[str]):
    """One of a few words; a wrong one is answered with the nearest."""

    name = "word"

    def __init__(self, *words: str) -> None:
        self.words = words

    def get_metavar(self, param: click.Parameter, ctx: click.Context | None = None) -> str:
        return "|".join(self.words)

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> str:
        from mdof.cli.app import nearest

        text = str(value)
        if text not in self.words:
            self.fail(f"{text!r} is not known{nearest(text, self.words)}", param, ctx)
        return text


class Ratio(click.ParamType[float]):
    """A damping ratio, as a number (0.05) or in per cent (5%)."""

    name = "ratio"

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> float:
        if isinstance(value, float):
            return value
        match = re.fullmatch(r"\s*([0-9]*\.?[0-9]+(?:[eE][-+]?[0-9]+)?)\s*(%?)\s*", str(value))
        if match is None:
            self.fail(f"{value!r} is not a damping ratio; write 0.05 or 5%", param, ctx)
        ratio = float(match[1]) / (100 if match[2] else 1)
        if ratio > 1:
            self.fail(f"{value!r} asks for more than critical damping; write 0.05 or 5% for five per cent", param, ctx)
        return ratio


RATIO = Ratio()


def model_arguments(command: F) -> F:
    """``MODEL...``: one or more model files."""
    return click.argument("models", metavar="MODEL...", nargs=-1, required=True, type=click.Path())(command)


def state_option(command: F) -> F:
    """``--state NAME|all``."""
    return click.option(
        "--state", metavar="NAME|all", help="A state of the model, or all of them and the model as written."
    )(command)


def format_option(*formats: str) -> Callable[[F], F]:
    """``--format``; the first one is the default."""
    return click.option(
        "--format",
        "form",
        type=Word(*formats),
        default=formats[0],
        show_default=True,
        help="What to print on standard output.",
    )
