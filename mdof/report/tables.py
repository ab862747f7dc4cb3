"""The mode table, findings and cautions, as text for a terminal of any width or a pipe."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Protocol

from rich.cells import cell_len

from mdof.findings import Severity
from mdof.report.layout import Grid, Paragraph, fold, pad, styled
from mdof.report.leaders import Mover, Taker, dissipates_most, moves_most
from mdof.report.look import DASH, Look, aligned, number, percent, plural

if TYPE_CHECKING:
    from collections.abc import Iterable

    from mdof.findings import Finding

__all__ = [
    "ModeLike",
    "cautions",
    "findings_block",
    "heading",
    "mode_table",
    "provenance",
]

_WIDE, _MIDDLE, _NARROW = 150, 104, 72
_STYLES = {"unstable": "bold red", "divergent": "bold red", "rigid body": "dim", "relaxation": "dim"}
_SEVERITY = {Severity.SERIOUS: "bold red", Severity.WARNING: "bold yellow", Severity.NOTE: "bold cyan"}
_ORDER = {Severity.SERIOUS: 0, Severity.WARNING: 1, Severity.NOTE: 2}
_GAUGE = 10


class ModeLike(Protocol):
    """What a row of the table needs: a solved mode or one read from an archive."""

    @property
    def number(self) -> int: ...
    @property
    def regime(self) -> str: ...
    @property
    def natural_frequency(self) -> float | None: ...
    @property
    def damped_frequency(self) -> float | None: ...
    @property
    def damping_ratio(self) -> float | None: ...
    @property
    def decay_rate(self) -> float: ...
    @property
    def time_to_two_percent(self) -> float | None: ...
    @property
    def undamped_frequency(self) -> float | None: ...
    @property
    def shortcut_damping_ratio(self) -> float | None: ...
    @property
    def shape(self) -> Any: ...
    @property
    def energy(self) -> Any: ...


def heading(title: str, file: str | None, state: str | None, degrees_of_freedom: int, look: Look) -> str:
    """Title, file, state and size of what was solved."""
    facts = [
        file or "built in code",
        f"state {state}" if state else "as written",
        plural(degrees_of_freedom, "degree of freedom", "degrees of freedom"),
    ]
    return look.render(styled(title, "bold"), styled(" · ".join(facts), "dim"))


def provenance(
    method: str,
    loss_reference: str,
    verification: dict[str, Any],
    look: Look,
    facts: Sequence[tuple[str, str]] = (),
) -> str:
    """What stands out, in ``facts``; then how the numbers came about: method, loss-factor reference, verification."""
    found, expected = verification["eigenvalues_found"], verification["eigenvalues_expected"]
    residual = number(verification["largest_scaled_residual"], 2)
    table = Grid()
    for name, fact in facts:
        table.add(styled(name, "dim"), fact)
    table.add(styled("solved by", "dim"), method)
    if loss_reference:
        table.add(styled("loss factors", "dim"), loss_reference)
    text = f"{found} of {expected} eigenvalues, largest scaled residual {residual} (passes below 10)"
    table.add(styled(str(verification["status"]), "dim"), text)
    return look.render(table)


def mode_table(modes: Iterable[ModeLike], bodies: Sequence[str], directions: Sequence[str], look: Look) -> str:
    """All modes, one row each; in a narrow terminal three short lines each.

    Parameters
    ----------
    bodies, directions : of every described coordinate, as in ``System.coordinate_bodies``.
    """
    rows = list(modes)
    if not rows:
        return look.render(styled("no modes"))
    energies = [mode.energy for mode in rows]
    movers = [moves_most(mode, bodies, directions, energy) for mode, energy in zip(rows, energies, strict=True)]
    takers = [dissipates_most(mode, energy) for mode, energy in zip(rows, energies, strict=True)]
    if look.width is not None and look.width < _NARROW:
        return _records(rows, movers, takers, look)
    wide = look.width is None or look.width >= _WIDE
    middle = wide or (look.width or 0) >= _MIDDLE
    natural = [mode.natural_frequency for mode in rows]
    table = [
        _Column("", "no.", [str(mode.number) for mode in rows]),
        _Column("natural", "Hz", aligned(_scaled(natural, 1 / (2 * math.pi)))),
    ]
    if middle:
        table.append(_Column("", "rpm", aligned(_scaled(natural, 30 / math.pi))))
    if wide:
        table.append(_Column("", "rad/s", aligned(natural)))
    damped = _scaled([mode.damped_frequency for mode in rows], 1 / (2 * math.pi))
    table += [
        _Column("damped", "Hz", aligned(damped)),
        _Column("ratio", "%", aligned(_scaled([mode.damping_ratio for mode in rows], 100), 3, 3)),
    ]
    if wide:
        undamped = _scaled([mode.undamped_frequency for mode in rows], 1 / (2 * math.pi))
        table += [
            _Column("0.1 % to", "100 % log", [_gauge(mode.damping_ratio) for mode in rows], left=True),
            _Column("shortcut", "%", aligned(_scaled([mode.shortcut_damping_ratio for mode in rows], 100), 3, 3)),
            _Column("undamped", "Hz", aligned(undamped)),
        ]
    table += [
        _Column("", "regime", [_regime(mode) for mode in rows], left=True, least=11),
        _Column("2 % in", "s", aligned([mode.time_to_two_percent for mode in rows], 3)),
    ]
    styles = [_STYLES.get(str(mode.regime), "") for mode in rows]
    gap = 2 if middle else 1
    # Where room is short the shares go before names are folded.
    for shares in ((True, True), (False, True), (False, False)):
        whole = table + _leaders("moves", movers, shares[0]) + _leaders("damps", takers, shares[1])
        if look.width is None or sum(column.width + gap for column in whole) - gap <= look.width:
            break
    return _laid_out(whole, styles, gap, look) or _records(rows, movers, takers, look)


def _regime(mode: ModeLike) -> str:
    """The regime, with the rate of decay or growth where that is all there is to tell."""
    if mode.natural_frequency is not None or mode.decay_rate == 0:
        return str(mode.regime)
    return f"{mode.regime} {number(abs(mode.decay_rate), 3)} 1/s"


def _leaders(heading: str, leaders: Sequence[Mover | Taker | None], shares: bool) -> list[_Column]:
    names = [DASH if leader is None else leader.name for leader in leaders]
    if not shares:
        return [_Column(heading, "most", names, left=True, least=8)]
    parts = ["" if leader is None or leader.share is None else f"{100 * leader.share:.0f} %" for leader in leaders]
    return [_Column(heading, "most", parts), _Column("", "", names, left=True, least=8)]


@dataclass
class _Column:
    """One column: two lines of heading, its cells, and how narrow it may become where it has to give way."""

    name: str
    unit: str
    cells: list[str]
    left: bool = False
    least: int | None = None
    width: int = 0

    def __post_init__(self) -> None:
        self.width = max(cell_len(text) for text in (self.name, self.unit, *self.cells))

    def lines(self, text: str) -> list[str]:
        parts = [text] if self.least is None else fold(text, self.width)
        return [pad(part, self.width) if self.left else f"{part:>{self.width}}" for part in parts]


def _laid_out(table: list[_Column], styles: list[str], gap: int, look: Look) -> str:
    """Rows as text.

    Names give way where room is short, the widest column first, and fold; the text is empty if even that is too wide.
    """
    spare = math.inf if look.width is None else look.width - sum(column.width + gap for column in table) + gap
    while spare < 0:
        givers = [column for column in table if column.least is not None and column.width > column.least]
        if not givers:
            return ""
        max(givers, key=lambda column: column.width).width -= 1
        spare += 1
    lines: list[Paragraph] = []
    blank = " " * gap
    heads = [[column.name for column in table], [column.unit for column in table]]
    rows = [(cells, "bold") for cells in heads[:1]] + [(cells, "dim") for cells in heads[1:]]
    rows += [([column.cells[index] for column in table], style) for index, style in enumerate(styles)]
    for cells, style in rows:
        folded = [column.lines(cell) for column, cell in zip(table, cells, strict=True)]
        for line in range(max(map(len, folded))):
            parts = [
                part[line] if line < len(part) else " " * column.width
                for column, part in zip(table, folded, strict=True)
            ]
            lines.append(Paragraph(wrap=False).append(blank.join(parts).rstrip(), style))
    return look.render(*lines)


def _scaled(values: Iterable[float | None], factor: float) -> list[float | None]:
    return [None if value is None else value * factor for value in values]


def _gauge(ratio: float | None) -> str:
    """A bar for the damping ratio on a logarithmic scale from 0.1 % to 100 %."""
    if ratio is None or ratio <= 0:
        return ""
    filled = round(_GAUGE * min(1.0, max(0.0, (math.log10(ratio) + 3) / 3)))
    return "▪" * filled + "·" * (_GAUGE - filled)


def _records(rows: Sequence[ModeLike], movers: Sequence[Mover], takers: Sequence[Taker | None], look: Look) -> str:
    """Three short lines a mode, for narrow terminals."""
    lines: list[Paragraph] = []
    room = len(str(rows[-1].number))
    for mode, mover, taker in zip(rows, movers, takers, strict=True):
        style = _STYLES.get(str(mode.regime), "")
        first = styled(f"{mode.number:>{room}}  ", "bold")
        lines.append(first)
        if mode.natural_frequency is None:
            first.append(_regime(mode), style)
        else:
            damped = DASH if mode.damped_frequency is None else number(mode.damped_frequency / (2 * math.pi))
            time = mode.time_to_two_percent
            settled = "" if time is None else f", falls to 2 % in {number(time, 3)} s"
            first.append(f"{number(mode.natural_frequency / (2 * math.pi))} Hz", "bold")
            first.append(f" (damped {damped} Hz), ratio {percent(mode.damping_ratio)}")
            lines.append(styled(f"{mode.regime}{settled}", style, room + 2))
        lines.append(styled(f"moves {mover}; damps {taker or DASH}", "dim", room + 2))
    return look.render(*lines)


def findings_block(findings: Iterable[Finding], look: Look) -> str:
    """Findings, serious ones first: severity and code, what was seen, what to do."""
    ordered = sorted(findings, key=lambda item: _ORDER[item.severity])
    if not ordered:
        return ""
    parts: list[Paragraph] = []
    for item in ordered:
        head = styled(f"{item.severity}", _SEVERITY[item.severity]).append(f"  {item.code}", "bold")
        if item.modes:
            head.append(f"  {_numbers(item.modes)}", "dim")
        parts += [head, styled(item.message, "", 4), styled(f"→ {item.advice}", "", 4)]
    return look.render(*parts)


def _numbers(modes: Sequence[int]) -> str:
    """``mode 3``, ``modes 2-4, 11``."""
    runs: list[list[int]] = []
    for mode in sorted(modes):
        if runs and mode == runs[-1][-1] + 1:
            runs[-1].append(mode)
        else:
            runs.append([mode])
    texts = [f"{run[0]}-{run[-1]}" if len(run) > 2 else ", ".join(map(str, run)) for run in runs]
    return f"{'mode' if len(modes) == 1 else 'modes'} {', '.join(texts)}"


def cautions(look: Look) -> str:
    """What every reader of a prediction should keep in mind."""
    text = (
        "Linear, small-motion, lumped model: no stops, lift-off or backlash. A prediction is not an acceptance: test "
        "as installed. Safety-critical use (fire pumps, emergency sets) needs independent checking by a qualified "
        "engineer."
    )
    return look.render(styled(text, "dim"))
