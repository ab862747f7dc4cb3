"""Short texts: the check of a model, screening lines, lists of archived runs."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING, Any

from mdof.report.look import DASH, Look, aligned, columns, frequency, grid, percent, plural, styled

if TYPE_CHECKING:
    from mdof.report.checking import CheckedModel
    from mdof.report.screening import Screening

__all__ = ["check_text", "run_facts", "run_list", "screening_line"]


#: Below this width a list of runs takes several lines a run.
_ROOMY = 150


def check_text(checked: CheckedModel, look: Look) -> str:
    """Bodies with mass and centre, totals, connections by kind, free directions."""
    totals = checked.summary
    flat = all(at == (0.0, 0.0, 0.0) for _, at in checked.bodies.values())
    names = [*checked.bodies, f"all {len(checked.bodies)}"]
    # A torsional train has no masses but inertias.
    turning = totals.total_mass == 0 and any(checked.inertias.values())
    amounts = (
        [*checked.inertias.values(), None]
        if turning
        else [*(mass for mass, _ in checked.bodies.values()), totals.total_mass]
    )
    masses, unit = aligned(amounts, 5, 3), "inertia kg m²" if turning else "mass kg"
    centres = [*(at for _, at in checked.bodies.values()), totals.centre_of_gravity]
    table = grid()
    heads = ["body", unit] + ([] if flat else [f"{f'centre {axis} m':>10}" for axis in "xyz"])
    columns(table, [styled(head, "bold") for head in heads])
    for name, mass, at in zip(names, masses, centres, strict=True):
        cells = [name, f"{mass:>{len(unit)}}"]
        if not flat:
            cells += [f"{DASH:>10}"] * 3 if at is None else [f"{value:>z10.3f}" for value in at]
        columns(table, [styled(cell, "bold" if name is names[-1] else "") for cell in cells])
    facts = grid()
    kinds = ", ".join(f"{count} × {kind}" for kind, count in totals.connections.items()) or "none"
    columns(facts, [styled("connections", "dim"), f"{sum(totals.connections.values())}: {kinds}"])
    if len(totals.grounds) > 1:
        columns(facts, [styled("grounds", "dim"), ", ".join(totals.grounds)])
    free = "; ".join(totals.free_directions) or "none; every body is tied to something in each of its directions"
    columns(facts, [styled("free", "dim"), free])
    return look.render(table, "", facts)


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
    table = grid()
    columns(table, [word, text])
    return look.render(table)


def run_list(headers: Sequence[Any], look: Look) -> str:
    """A folder of runs, oldest first."""
    if not headers:
        return look.render(styled("no runs"))
    if look.width is not None and look.width < _ROOMY:
        parts: list[Any] = []
        for run in headers:
            state = f" [{run.state}]" if run.state else ""
            facts = f"{plural(run.number_of_modes, 'mode')}, least ratio {percent(run.least_damping_ratio)}, "
            facts += plural(run.number_of_findings, "finding")
            parts += [
                styled(f"{_moment(run)}  {run.title}{state}", "bold"),
                styled(f"    {facts}"),
                styled(f"    {run.path.name}"),
            ]
        return look.render(*parts)
    table = grid()
    heads = ["written (UTC)", "model", "state", "modes", "least ratio", "findings", "file"]
    columns(table, [styled(head, "bold") for head in heads])
    for run in headers:
        cells = [
            _moment(run),
            run.title,
            run.state or "as written",
            f"{run.number_of_modes:>5}",
            f"{percent(run.least_damping_ratio):>11}",
            f"{run.number_of_findings:>8}",
            run.path.name,
        ]
        columns(table, cells)
    return look.render(table)


def _moment(run: Any) -> str:
    return str(run.written_utc).replace("T", " ").removesuffix("Z")


def run_facts(header: Any, versions: Mapping[str, str], look: Look) -> str:
    """Where a run came from and what computed it."""
    table = grid()
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
        columns(table, [styled(name, "dim"), value])
    return look.render(table)
