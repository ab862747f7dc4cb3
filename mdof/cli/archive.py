"""``mdof archive``: list and show archived runs."""

from __future__ import annotations

import sys
from typing import TYPE_CHECKING

import click

from mdof.cli.options import format_option
from mdof.cli.session import Session
from mdof.errors import UsageError

if TYPE_CHECKING:
    from mdof.archive.store import ArchivedRun


@click.group(short_help="List and show archived runs.")
def archive() -> None:
    """Runs are written by `mdof modes --archive FOLDER`, one file each, and never changed."""


@archive.command("list", short_help="What a folder of runs holds.")
@click.argument("folder", type=click.Path())
@format_option("table", "json")
@click.pass_obj
def list_command(session: Session, folder: str, form: str) -> None:
    """List the runs of FOLDER, oldest first, after verifying their digests.

    Files that are damaged or no runs are named on standard error, and the status is 4.
    """
    session.load("mdof.archive.store")
    from mdof.archive.store import list_runs

    listing = list_runs(folder)
    if form == "json":
        from mdof.report.records import json_line, list_record

        for header in listing.runs:
            session.data(json_line(list_record(header)))
    else:
        from mdof.report.summaries import run_list

        session.data(run_list(listing.runs, session.look()))
    for error in listing.damaged:
        session.report(error)


@archive.command("show", short_help="Runs in full, after verifying their digests.")
@click.argument("runs", metavar="RUN...", nargs=-1, required=True, type=click.Path())
@format_option("table", "json")
@click.option("--source", is_flag=True, help="Print the model file as it was, and nothing else.")
@click.pass_obj
def show_command(session: Session, runs: tuple[str, ...], form: str, source: bool) -> None:
    """Show the modes, findings and origin of each RUN, after verifying its digest; nothing is computed anew.

    A damaged file is named on standard error, the others are shown, and the status is 4.
    """
    session.load("mdof.archive.store")
    from mdof.archive.store import read_run
    from mdof.errors import MdofError

    for index, run in enumerate(runs):
        try:
            found = read_run(run)
            if source and found.source is None:
                raise UsageError(f"{run}: holds no model file; its model was built in code")
        except MdofError as error:
            session.report(error)
            continue
        if form == "table" and index:
            session.data("\n")
        _show(session, found, form, source=source)


def _show(session: Session, found: ArchivedRun, form: str, *, source: bool) -> None:
    header = found.header
    if source:
        session.data(found.source or "")
        return
    if form == "json":
        from mdof.report.records import json_line, run_record

        session.data(json_line(run_record(found)))
    else:
        from mdof.report import summaries, tables
        from mdof.report.standing import least_damped_line

        look = session.look()
        session.data(
            tables.heading(header.title, header.model_file, header.state, header.degrees_of_freedom, look)
            + "\n"
            + tables.mode_table(found.modes, found.bodies, found.directions, look)
            + "\n"
            + tables.provenance(
                header.method, header.loss_reference, found.verification, look, least_damped_line(found.modes)
            )
            + summaries.run_facts(header, found.versions, look)
        )
    if found.findings:
        from mdof.report.tables import findings_block

        session.say(("\n" if form == "table" else "") + findings_block(found.findings, session.look(sys.stderr)))
