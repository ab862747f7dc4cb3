"""Short texts: screening lines, lists of archived runs."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING, Any

from mdof.report.layout import Grid, Paragraph, styled
from mdof.report.look import DASH, Look, frequency, percent, plural

if TYPE_CHECKING:
    from mdof.report.screening import Screening

__all__ = ["run_facts", "run_list", "screening_line", "unjudged_warning"]


def screening_line(name: str, state: str | None, result: Screening, look: Look) -> str:
    """One line a model and state: the verdict, then the modes that fail, or why none was judged."""
    what = f"{name} [{state}]" if state else name
    limit = f"at least {percent(result.least_damping_ratio)}"
    scope = "" if result.below is None else f" below {frequency(result.below)}"
    judged = f"{plural(result.judged, 'mode')}{scope}, {limit}"
    if not result.judged:
        why = "none vibrates" if result.lowest is None else f"none{scope}; the lowest is at {frequency(result.lowest)}"
        return _verdict(styled("none", "bold yellow"), f"{what}  no mode judged: {why}", look)
    if result.passed:
        return _verdict(styled("pass", "bold green"), f"{what}  {judged}", look)
    failing = "; ".join(
        f"mode {mode.number} at {frequency(mode.natural_frequency)} has {percent(mode.damping_ratio)}"
        if mode.regime not in ("unstable", "divergent")
        else f"mode {mode.number} {mode.regime}"
        for mode in result.failing
    )
    return _verdict(styled("FAIL", "bold red"), f"{what}  {len(result.failing)} of {judged}: {failing}", look)


def unjudged_warning(name: str, state: str | None, look: Look) -> str:
    """What to do about a model of which no mode was judged."""
    what = f"{name} [{state}]" if state else name
    text = "no mode was judged, which is no pass; check the limits and their units"
    return look.render(styled("warning", "bold yellow").append(f"  {what}: {text}"))


def _verdict(word: Any, text: str, look: Look) -> str:
    table = Grid()
    table.add(word, text)
    return look.render(table)


def run_list(headers: Sequence[Any], look: Look) -> str:
    """A folder of runs, oldest first; several lines a run where a table has no room."""
    if not headers:
        return look.render(styled("no runs"))
    table = Grid()
    heads = ["written (UTC)", "model", "state", "modes", "least ratio", "findings", "file"]
    table.add(*[styled(head, "bold") for head in heads])
    for run in headers:
        table.add(
            _moment(run),
            run.title,
            run.state or "as written",
            f"{run.number_of_modes:>5}",
            f"{percent(run.least_damping_ratio):>11}",
            f"{run.number_of_findings:>8}",
            run.path.name,
        )
    if look.width is None or table.width <= look.width:
        return look.render(table)
    lines: list[Paragraph] = []
    for run in headers:
        state = f" [{run.state}]" if run.state else ""
        facts = f"{plural(run.number_of_modes, 'mode')}, least ratio {percent(run.least_damping_ratio)}, "
        facts += plural(run.number_of_findings, "finding")
        lines += [
            styled(f"{_moment(run)}  {run.title}{state}", "bold"),
            styled(facts, "", 4),
            styled(run.path.name, "", 4),
        ]
    return look.render(*lines)


def _moment(run: Any) -> str:
    return str(run.written_utc).replace("T", " ").removesuffix("Z")


def run_facts(header: Any, versions: Mapping[str, str], look: Look) -> str:
    """Where a run came from and what computed it."""
    table = Grid()
    order = sorted(versions, key=lambda name: (name not in ("mdof", "python", "platform"), name))
    for name, value in (
        ("run", header.path.name),
        ("written", header.written_utc),
        ("started with", " ".join(header.command_line) or DASH),
        ("model digest", header.digest),
        ("source digest", header.source_digest or DASH),
        ("file digest", f"sha256:{header.file_digest} (verified)"),
        ("computed by", ", ".join(f"{name} {versions[name]}" for name in order)),
    ):
        table.add(styled(name, "dim"), value)
    return look.render(table)
