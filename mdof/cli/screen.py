"""``mdof screen``: pass or fail models on their damping ratios."""

from __future__ import annotations

import sys
from typing import TYPE_CHECKING, Any

import click

from mdof.cli.options import RATIO, format_option, model_arguments, state_option
from mdof.cli.session import Session
from mdof.errors import UsageError

if TYPE_CHECKING:
    from mdof.description.schema import Model


@click.command(short_help="Pass or fail each model on its damping ratios.")
@model_arguments
@click.option(
    "--least-damping-ratio", metavar="RATIO", type=RATIO, help="Every judged mode needs at least this: 0.05 or 5%."
)
@click.option("--below", metavar="FREQUENCY", help="Judge only modes below this, with its unit: 60Hz, 3600rpm.")
@state_option
@format_option("table", "json")
@click.pass_obj
def screen(
    session: Session,
    models: tuple[str, ...],
    least_damping_ratio: float | None,
    below: str | None,
    state: str | None,
    form: str,
) -> None:
    """Judge every MODEL: one line a model and state, pass, or FAIL with the failing modes.

    Limits come from the options; what they leave open comes from `criteria` in the model. There is no limit of our own:
    without one the model is not judged (status 2). Rigid-body motions and relaxation roots are left out, growing modes
    always fail. Status 1 when any model fails. Where no mode is judged the line says `none`, with a warning.
    """
    stated_below = None
    if below is not None:
        from mdof.units import QuantityError, convert

        try:
            stated_below = convert(below, "frequency")
        except QuantityError as error:
            raise click.BadParameter(f"{error}", param_hint="'--below'") from error
        if stated_below <= 0:
            raise click.BadParameter(f"{below} is not above zero", param_hint="'--below'")

    session.load("mdof.description.reading", "mdof.modes.analysis", "mdof.report.checking", "mdof.report.summaries")

    def work(model: Model) -> None:
        from mdof.report.checking import solve_model
        from mdof.report.screening import screen as judge

        ratio, limit = _limits(model, least_damping_ratio, stated_below)
        modes = solve_model(model)
        result = judge(modes, ratio, limit)
        if result.failing:
            session.worsen(1)
        if form == "json":
            from mdof.report.records import json_line, screen_record

            session.data(json_line(screen_record(model, modes, result)))
        else:
            from mdof.report.summaries import screening_line

            session.data(screening_line(model.file or model.title, model.state, result, session.look()))
        if not result.judged:
            from mdof.report.summaries import unjudged_warning

            session.say(unjudged_warning(model.file or model.title, model.state, session.look(sys.stderr)))
        serious = [item for item in modes.findings if item.severity == "serious"]
        if serious:
            from mdof.report.tables import findings_block

            session.say(findings_block(serious, session.look(sys.stderr)))

    session.each_model(models, state, work)


def _limits(model: Model, ratio: float | None, below: float | None) -> tuple[float, float | None]:
    """The option wins over the criteria of the model."""
    criteria: Any = model.criteria
    if ratio is None and criteria is not None:
        ratio = criteria.least_damping_ratio
    if below is None and criteria is not None:
        below = criteria.below
    if ratio is None:
        raise UsageError(
            "no limit to judge by; give --least-damping-ratio 0.05, or `criteria: {least_damping_ratio: 0.05}` "
            "in the model"
        )
    return float(ratio), None if below is None else float(below)
