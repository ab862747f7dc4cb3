"""``mdof check``: read models and say what is in them."""

from __future__ import annotations

import json
import sys
from typing import TYPE_CHECKING

import click

from mdof.cli.options import format_option, state_option
from mdof.cli.session import Session

if TYPE_CHECKING:
    from mdof.description.schema import Model


@click.command(short_help="Read models and say what is in them.")
@click.argument("models", metavar="MODEL...", nargs=-1, type=click.Path())
@click.option("--schema", is_flag=True, help="Print the JSON Schema of model files, for editors; needs no MODEL.")
@state_option
@format_option("table", "json")
@click.pass_context
def check(ctx: click.Context, models: tuple[str, ...], schema: bool, state: str | None, form: str) -> None:
    """Read each MODEL and print bodies with mass, centre of gravity and inertia, connections with their values, free
    directions and findings.

    Nothing is solved. Everything that is wrong with a file is reported at once, with line, column and key path.
    """
    session: Session = ctx.obj
    if schema:
        if models:
            raise click.UsageError("--schema describes model files in general and takes no MODEL", ctx)
        import mdof

        session.data(json.dumps(mdof.Model.json_schema(), indent=2, ensure_ascii=False) + "\n")
        return
    if not models:
        raise click.UsageError("Missing argument 'MODEL...'.", ctx)
    session.load("mdof.description.reading", "mdof.report.checking", "mdof.report.check_table")
    shown = 0

    def work(model: Model) -> None:
        nonlocal shown
        from mdof.report.checking import check_model

        checked = check_model(model)
        if form == "json":
            from mdof.report.check_record import check_record
            from mdof.report.records import json_line

            session.data(json_line(check_record(model, checked)))
        else:
            from mdof.report.check_table import check_text
            from mdof.report.tables import heading

            look = session.look()
            head = heading(model.title, model.file, model.state, checked.summary.degrees_of_freedom, look)
            session.data(("\n" if shown else "") + head + "\n" + check_text(checked, look))
        shown += 1
        if checked.findings:
            from mdof.report.tables import findings_block

            session.say(("\n" if form == "table" else "") + findings_block(checked.findings, session.look(sys.stderr)))

    session.each_model(models, state, work)
