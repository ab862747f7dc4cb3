"""What a model holds, as tables: bodies with their inertia, connections with their values."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import TYPE_CHECKING

from mdof.report.layout import Grid, Paragraph, styled
from mdof.report.look import DASH, Look, aligned, frequency, number, plural

if TYPE_CHECKING:
    from mdof.report.checking import CheckedModel, ConnectionFacts

__all__ = ["check_text"]

#: Ratio up to which values share a prefix.
_ALIKE = 200.0
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
    inertias = [", ".join(_brief(value) for value in entry) if entry else "" for entry in moments]
    for index, products in enumerate(checked.products.values()):
        inertias[index] += "".join(f"; {key} {_brief(value)}" for key, value in products.items())
    columns = [("body", names), (head, [f"{amount:>{len(head)}}" for amount in shown])]
    if not flat:
        for axis, letter in enumerate("xyz"):
            places = [DASH if math.isnan(at[axis]) else f"{at[axis]:z.3f}" for at in centres]
            columns.append((f"{f'centre {letter} m':>10}", [f"{place:>10}" for place in places]))
    spatial = not turning and any(moments)
    if spatial:
        columns.append(("inertia x, y, z kg m²", inertias))
        radii = [", ".join(number(value, 2) for value in entry) if entry else "" for entry in checked.radii.values()]
        columns.append(("radii of gyration m", [*radii, ""]))
    # Radii of gyration show a slip of ten at once, but follow from what stands beside them.
    for count in (len(columns), len(columns) - 1 if spatial else len(columns)):
        table = Grid()
        table.add(*[styled(text, "bold") for text, _ in columns[:count]])
        for index in range(len(names)):
            style = "bold" if index == len(checked.bodies) else ""
            table.add(*[styled(cells[index], style) for _, cells in columns[:count]])
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
        if fact.loss_reference is not None:
            values[-1] += f" at {frequency(fact.loss_reference)}"
        if fact.branches:
            each = (
                ", ".join(f"{_NAMES[which]} {_value(which, entry)}" for which, entry in one) for one in fact.branches
            )
            values.append(f"{plural(len(fact.branches), 'series branch', 'series branches')} ({'; '.join(each)})")
        values += [f"{part.replace('_', ' ')} {_made(part, entry)}" for part, entry in fact.geometry]
        text = "; ".join(values)
        table.add(name, ends, text)
        lines += [styled(f"{name}, {ends}", "bold"), styled(text, "", 4)]
    return [table] if look.width is None or look.width >= 90 else lines


def _made(part: str, values: tuple[float, ...]) -> str:
    """``0.336, 0.105 m`` for the radii of a gear, ``0, 0, 1`` for a direction."""
    unit = _PARTS.get(part, "")
    return f"{', '.join(_brief(value) for value in values)} {unit}".strip()


#: Units of what gears and beams are made of.
_PARTS = {
    "radii": "m",
    "youngs_modulus": "N/m²",
    "shear_modulus": "N/m²",
    "area": "m²",
    "second_moments": "m⁴",
    "torsion_constant": "m⁴",
    "shear_areas": "m²",
}
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
    """Values of about one size with one prefix, others with their own."""
    # Kilograms have their prefix already.
    prefixes = ((1.0, ""),) if unit.startswith("kg") else _PREFIXES
    sizes = [abs(value) for value in values.values() if value]
    alike = not sizes or max(sizes) <= _ALIKE * min(sizes)
    together: dict[tuple[float, str], dict[str, float]] = {}
    for direction, value in values.items():
        size = max(sizes, default=0.0) if alike or not value else abs(value)
        place = next(((scale, prefix) for scale, prefix in prefixes if size >= scale), (1.0, ""))
        together.setdefault(place, {})[direction] = value
    return ", ".join(f"{_directed(part, scale)} {prefix}{unit}" for (scale, prefix), part in together.items())


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
