"""What a model holds, as tables: bodies with their inertia, connections with their values."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import TYPE_CHECKING

from mdof.report.layout import Grid, Paragraph, styled
from mdof.report.look import DASH, Look, aligned, number

if TYPE_CHECKING:
    from mdof.report.checking import CheckedModel, ConnectionFacts

__all__ = ["check_text"]

_PREFIXES = ((1e9, "G"), (1e6, "M"), (1e3, "k"), (1.0, ""))
_LINEAR = {"stiffness": "N/m", "damping": "N s/m", "inertance": "kg"}
_TURNING = {"stiffness": "N m/rad", "damping": "N m s/rad", "inertance": "kg m²"}


def check_text(checked: CheckedModel, look: Look) -> str:
    """Bodies with mass, centre and inertia, connections with their values, counts, free directions."""
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
    parts = [*_bodies(checked, look), styled("")]
    if checked.connections:
        parts += [*_connections(checked.connections, look), styled("")]
    return look.render(*parts, facts)


def _bodies(checked: CheckedModel, look: Look) -> list[Grid | Paragraph]:
    """A table of the bodies; in a narrow terminal two lines a body."""
    totals = checked.summary
    names = list(checked.bodies)
    centres = [at for _, at in checked.bodies.values()]
    moments = list(checked.inertias.values())
    flat = all(at == (0.0, 0.0, 0.0) for at in centres)
    # A torsional train has no masses but inertias, which its gears keep from being added up.
    turning = totals.total_mass == 0 and any(moments)
    amounts = [max(entry or (0.0,)) for entry in moments] if turning else [mass for mass, _ in checked.bodies.values()]
    unit = "kg m²" if turning else "kg"
    if not turning:
        names.append(f"all {len(names)}")
        amounts.append(totals.total_mass)
        centres.append(totals.centre_of_gravity or (math.nan,) * 3)
        moments.append(None)
    shown = aligned(amounts, 5, 3)
    head = f"{'inertia' if turning else 'mass'} {unit}"
    spatial = not turning and any(moments)
    table = Grid()
    heads = ["body", head, *([] if flat else [f"{f'centre {axis} m':>10}" for axis in "xyz"])]
    heads += ["inertia x, y, z kg m²"] if spatial else []
    table.add(*[styled(text, "bold") for text in heads])
    inertias = [", ".join(_brief(value) for value in entry) if entry else "" for entry in moments]
    for name, amount, at, inertia in zip(names, shown, centres, inertias, strict=True):
        places = [f"{DASH if math.isnan(value) else f'{value:z.3f}':>10}" for value in at]
        style = "bold" if name is names[-1] and not turning else ""
        cells = [name, f"{amount:>{len(head)}}", *([] if flat else places), *([inertia] if spatial else [])]
        table.add(*[styled(text, style) for text in cells])
    if look.width is None or table.width <= look.width:
        return [table]
    lines: list[Grid | Paragraph] = []
    for name, amount, at, inertia in zip(names, shown, centres, inertias, strict=True):
        text = f"{amount.strip()} {unit}"
        text += "" if flat or math.isnan(at[0]) else f" at {', '.join(f'{value:z.3f}' for value in at)} m"
        text += f"; inertia {inertia} kg m²" if spatial and inertia else ""
        lines += [styled(name, "bold"), styled(text, "", 4)]
    return lines


def _connections(facts: tuple[ConnectionFacts, ...], look: Look) -> list[Grid | Paragraph]:
    """A table of the connections, equal points of one in one line; several lines each where room is short."""
    table = Grid()
    table.add(*[styled(text, "bold") for text in ("connection", "between", "values, each point")])
    lines: list[Grid | Paragraph] = []
    for fact in facts:
        name = fact.name + (f" ×{fact.count}" if fact.count > 1 else "")
        ends = f"{fact.between[0]} – {fact.between[1]}"
        values = [f"{DASH} ({fact.words})"] if not fact.values else []
        for which, entry in fact.values:
            values.append(f"{_NAMES[which]} {_value(which, entry)}")
        text = "; ".join(values) + (f"; {fact.remark}" if fact.remark else "")
        table.add(name, ends, text)
        lines += [styled(f"{name}, {ends}", "bold"), styled(text, "", 4)]
    return [table] if look.width is None or look.width >= 90 else lines


_NAMES = {"stiffness": "k", "damping": "c", "inertance": "b", "loss_factor": "η"}


def _value(which: str, entry: float | Mapping[str, float]) -> str:
    """``x y 272, z 320 kN/m; rx 3.6 MN m/rad``."""
    if which == "loss_factor":
        return _directed(entry, 1.0) if isinstance(entry, Mapping) else _brief(entry)
    if not isinstance(entry, Mapping):
        return _scaled({"": entry}, _LINEAR[which])
    linear = {key: value for key, value in entry.items() if not key.startswith("r")}
    turning = {key: value for key, value in entry.items() if key.startswith("r")}
    parts = [_scaled(linear, _LINEAR[which])] if linear else []
    parts += [_scaled(turning, _TURNING[which])] if turning else []
    return " and ".join(parts)


def _scaled(values: Mapping[str, float], unit: str) -> str:
    largest = max(abs(value) for value in values.values())
    # Kilograms have their prefix already.
    prefixes = ((1.0, ""),) if unit.startswith("kg") else _PREFIXES
    scale, prefix = next(((scale, prefix) for scale, prefix in prefixes if largest >= scale), (1.0, ""))
    return f"{_directed(values, scale)} {prefix}{unit}"


def _directed(values: Mapping[str, float], scale: float) -> str:
    """Directions of equal value together."""
    together: dict[float, list[str]] = {}
    for direction, value in values.items():
        together.setdefault(value, []).append(direction)
    return ", ".join(f"{' '.join(names)} {_brief(value / scale)}".strip() for value, names in together.items())


def _brief(value: float) -> str:
    """Four digits, without zeros that say nothing."""
    text = number(value, 4)
    return text.rstrip("0").rstrip(".") if "." in text and "e" not in text else text
