"""The command group: finds commands by name without loading them all, and turns errors into messages and statuses."""

from __future__ import annotations

import sys
from collections.abc import Sequence
from importlib import import_module

import click

from mdof import __version__
from mdof.cli.session import Session
from mdof.errors import MdofError

__all__ = ["COMMANDS", "program", "run"]

#: Command, its module, and the line about it in ``mdof --help``.
COMMANDS: dict[str, tuple[str, str]] = {
    "check": ("mdof.cli.check", "Read models and say what is in them."),
    "modes": ("mdof.cli.modes", "Every mode: frequency, damping ratio, regime, who dissipates."),
    "screen": ("mdof.cli.screen", "Pass or fail each model on its damping ratios."),
    "archive": ("mdof.cli.archive", "List and show archived runs."),
    "manual": ("mdof.cli.manual", "The manual, page by page."),
}

_EXITS = """\b
Exit status:
  0    done
  1    a criterion is not met (screen)
  2    wrong usage or wrong input
  3    the numbers could not be verified
  4    an archived run is damaged
  130  interrupted
With several models the largest status wins.
"""


class Program(click.Group):
    """Commands by name, each loaded when it is called."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        return list(COMMANDS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        if cmd_name not in COMMANDS:
            return None
        command = getattr(import_module(COMMANDS[cmd_name][0]), cmd_name)
        return command if isinstance(command, click.Command) else None

    def resolve_command(
        self, ctx: click.Context, args: list[str]
    ) -> tuple[str | None, click.Command | None, list[str]]:
        if args and args[0] not in COMMANDS and not args[0].startswith("-"):
            raise click.UsageError(f"there is no command {args[0]!r}{nearest(args[0], COMMANDS)}", ctx)
        return super().resolve_command(ctx, args)

    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        with formatter.section("Commands"):
            formatter.write_dl([(name, text) for name, (_, text) in COMMANDS.items()])


def nearest(word: str, words: Sequence[str] | dict[str, tuple[str, str]]) -> str:
    """Advice that names the nearest valid word, or all of them."""
    from difflib import get_close_matches

    close = get_close_matches(word, list(words), n=1)
    return f"; did you mean {close[0]}?" if close else f"; there are {', '.join(words)}"


@click.group(
    cls=Program,
    invoke_without_command=True,
    context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100},
    epilog=_EXITS,
)
@click.version_option(__version__, prog_name="mdof", message="%(prog)s %(version)s")
@click.pass_context
def program(ctx: click.Context) -> None:
    """Modal damping of machinery on its mounts: every mode, how damped it is, and who damps it.

    Models are YAML files of bodies and connections; `mdof manual model-file` tells how to write one.
    """
    if ctx.invoked_subcommand is None:
        click.echo(ctx.get_help())


def run(arguments: Sequence[str] | None = None) -> int:
    """Run one command line and return the exit status."""
    session = Session(sys.argv if arguments is None else ["mdof", *arguments])
    try:
        args = None if arguments is None else list(arguments)
        status = program.main(args, prog_name="mdof", standalone_mode=False, obj=session)
        session.worsen(status if isinstance(status, int) else 0)
    except click.UsageError as error:
        session.say(_usage(error))
        session.worsen(2)
    except click.ClickException as error:
        session.say(f"mdof: {error.format_message()}")
        session.worsen(2)
    except MdofError as error:
        session.report(error)
    except (click.Abort, KeyboardInterrupt):
        session.say("interrupted")
        return 130
    return session.finish()


def _usage(error: click.UsageError) -> str:
    message = error.format_message().rstrip(".")
    path = error.ctx.command_path if error.ctx else "mdof"
    return f"{path}: {message[:1].lower()}{message[1:]}\n`{path} --help` shows what it takes"
