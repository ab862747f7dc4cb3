"""``mdof modes``: solve models and show, draw and archive their modes."""

from __future__ import annotations

import sys
from typing import TYPE_CHECKING

import click

from mdof.cli.options import format_option, model_arguments, state_option
from mdof.cli.session import Session
from mdof.errors import UnverifiedError

if TYPE_CHECKING:
    from mdof.certify import Certificate
    from mdof.description.schema import Model
    from mdof.modes.mode import DampedModes


@click.command(short_help="Every mode: frequency, damping ratio, regime, who dissipates.")
@model_arguments
@state_option
@format_option("table", "json", "csv")
@click.option("--archive", metavar="FOLDER", type=click.Path(), help="Archive every run as one file in this folder.")
@click.option("--figure", metavar="FILE", type=click.Path(), help="Draw pole map and mode shapes: .svg, .png or .pdf.")
@click.option(
    "--certify", "wants_proof", is_flag=True, help="Prove every mode by exact and ball arithmetic (extra `certify`)."
)
@click.pass_obj
def modes(
    session: Session,
    models: tuple[str, ...],
    state: str | None,
    form: str,
    archive: str | None,
    figure: str | None,
    wants_proof: bool,
) -> None:
    """Find every damped mode of each MODEL, verified.

    The table gives natural and damped frequency, damping ratio, regime, the time to fall to 2 %, which body moves most
    and which connection dissipates most. With several models the status is the largest of all.
    """
    if archive is not None:
        from mdof.archive.envelope import probe_folder

        probe_folder(archive)
    if figure is not None:
        from mdof.report.figures import check_figure

        check_figure(figure, several=len(models) > 1 or state == "all")
    session.load("mdof.description.reading", "mdof.modes.analysis", "mdof.report.checking", "mdof.report.tables")
    if archive is not None:
        session.load("mdof.archive.run")
    if figure is not None:
        session.load("mdof.report.pages")
    drawn: list[tuple[Model, DampedModes]] = []
    shown = 0

    def work(model: Model) -> None:
        nonlocal shown
        from mdof.report.checking import solve_model

        result = solve_model(model)
        proof = None
        if wants_proof:
            from mdof.certify import certify

            proof = certify(result, say=session.say)
        _show(session, model, result, form, first=shown == 0, proof=proof)
        shown += 1
        if proof is not None and proof.contradicted:
            session.worsen(UnverifiedError.exit_status)
            if archive is not None or figure is not None:
                session.say("neither archived nor drawn, as the proof contradicts it")
            return
        if archive is not None:
            from mdof.archive.run import write_run

            path = write_run(archive, model, result, command_line=session.command_line)
            session.say(f"archived {path}")
        if figure is not None:
            drawn.append((model, result))

    session.each_model(models, state, work)
    if figure is not None and drawn:
        from mdof.report.figures import draw_modes

        draw_modes(figure, drawn)
        session.say(f"drawn {figure}")
    if form == "table" and shown:
        from mdof.report.tables import cautions

        session.say("\n" + cautions(session.look(sys.stderr)))


def _show(
    session: Session, model: Model, result: DampedModes, form: str, *, first: bool, proof: Certificate | None
) -> None:
    from mdof.report import records

    if form == "json":
        record = records.modes_record(model, result)
        if proof is not None:
            from mdof.report.proof_record import proof_record

            record["proof"] = proof_record(proof)
        session.data(records.json_line(record))
    elif form == "csv":
        rows = [records.MODE_COLUMNS] if first else []
        session.data(b"".join(records.csv_line(row) for row in [*rows, *records.mode_csv_rows(model, result)]))
    else:
        from mdof.report import tables
        from mdof.report.standing import criteria_line, least_damped_line

        look, system = session.look(), result.system
        session.data(
            ("" if first else "\n")
            + tables.heading(model.title, model.file, model.state, system.degrees_of_freedom, look)
            + "\n"
            + tables.mode_table(result, system.coordinate_bodies, system.coordinate_directions, look)
            + "\n"
            + tables.provenance(
                result.method,
                result.loss_reference,
                records.verification_record(result.verification),
                look,
                [*least_damped_line(result), *criteria_line(result, model.criteria)],
            )
        )
    if proof is not None:
        _show_proof(session, proof, form)
    if result.findings:
        from mdof.report.tables import findings_block

        session.say(("\n" if form == "table" else "") + findings_block(result.findings, session.look(sys.stderr)))


def _show_proof(session: Session, proof: Certificate, form: str) -> None:
    """The table on standard output; its reasons, and without a table its summary, on standard error."""
    from mdof.report.proof_table import proof_reasons, proof_table

    if form == "table":
        session.data("\n" + proof_table(proof, session.look()))
    else:
        session.say(proof.summary)
    session.say(proof_reasons(proof, session.look(sys.stderr)))
