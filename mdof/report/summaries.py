"""Short texts: the check of a model, screening lines, lists of archived runs."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING, Any

from mdof.report.layout import Grid, Paragraph, styled
from mdof.report.look import DASH, Look, aligned, frequency, percent, plural

if TYPE_CHECKING:
    from mdof.report.checking import CheckedModel
    from mdof.report.screening import Screening

__all__ = ["check_text", "run_facts", "run_list", "screening_line"]


def check_text(checked: CheckedModel, look: Look) -> str:
    """Bodies with mass and centre, totals, connections by kind, free directions."""
    totals = checked.summary
    facts = Grid()
    kinds = ", ".join(f"{count} × {kind}" for kind, count in totals.connections.items()) or "none"
    facts.add(styled("connections", "dim"), f"{sum(totals.connections.values())}: {kinds}")
    if len(totals.grounds) > 1:
        facts.add(styled("grounds", "dim"), ", ".join(totals.grounds))
    free = "; ".join(totals.free_directions)
    if not free:
        together = any(item.code == "unheld-body" for item in checked.findings)
        free = "none; every body is tied to something in each of its directions"
        free = "no body by itself, but bodies together, as told below" if together else free
    facts.add(styled("free", "dim"), free)
    return look.render(*_bodies(checked, look), styled(""), facts)


def _bodies(checked: CheckedModel, look: Look) -> list[Grid | Paragraph]:
    """A table of the bodies; in a narrow terminal two lines a body."""
    totals = checked.summary
    names = list(checked.bodies)
    centres = [at for _, at in checked.bodies.values()]
    flat = all(at == (0.0, 0.0, 0.0) for at in centres)
    # A torsional train has no masses but inertias, which its gears keep from being added up.
    turning = totals.total_mass == 0 and any(checked.inertias.values())
    amounts = list(checked.inertias.values()) if turning else [mass for mass, _ in checked.bodies.values()]
    unit = "kg m²" if turning else "kg"
    if not turning:
        names.append(f"all {len(names)}")
        amounts.append(totals.total_mass)
        centres.append(totals.centre_of_gravity or (math.nan,) * 3)
    shown = aligned(amounts, 5, 3)
    head = f"{'inertia' if turning else 'mass'} {unit}"
    table = Grid()
    axes = "" if flat else "xyz"
    table.add(*[styled(text, "bold") for text in ("body", head, *(f"{f'centre {axis} m':>10}" for axis in axes))])
    for name, amount, at in zip(names, shown, centres, strict=True):
        places = [f"{DASH if math.isnan(value) else f'{value:z.3f}':>10}" for value in at]
        style = "bold" if name is names[-1] and not turning else ""
        table.add(*[styled(text, style) for text in (name, f"{amount:>{len(head)}}", *(() if flat else places))])
    if look.width is None or table.width <= look.width:
        return [table]
    lines: list[Grid | Paragraph] = []
    for name, amount, at in zip(names, shown, centres, strict=True):
        place = "" if flat or math.isnan(at[0]) else f" at {', '.join(f'{value:z.3f}' for value in at)} m"
        lines += [styled(name, "bold"), styled(f"{amount.strip()} {unit}{place}", "", 4)]
    return lines


def screening_line(name: str, state: str | None, result: Screening, look: Look) -> str:
    """One line a model and state: the verdict, then the modes that fail."""
    what = f"{name} [{state}]" if state else name
    limit = f"at least {percent(result.least_damping_ratio)}"
    scope = "" if result.below is None else f" below {frequency(result.below)}"
    judged = f"{plural(result.judged, 'mode')}{scope}, {limit}"
    if result.passed:
        return _verdict(styled("pass", "bold green"), f"{what}  {judged}", look)
    failing = "; ".join(
        f"mode {mode.number} at {frequency(mode.natural_frequency)} has {percent(mode.damping_ratio)}"
        if mode.regime not in ("unstable", "divergent")
        else f"mode {mode.number} {mode.regime}"
        for mode in result.failing
    )
    return _verdict(styled("FAIL", "bold red"), f"{what}  {len(result.failing)} of {judged}: {failing}", look)


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
