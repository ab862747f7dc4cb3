"""The table of proofs, below the mode table."""

from __future__ import annotations

from typing import TYPE_CHECKING

from mdof.certify import Verdict
from mdof.report.layout import Grid, Paragraph, styled
from mdof.report.look import DASH, Look

if TYPE_CHECKING:
    from collections.abc import Iterable

    from mdof.certify import Certificate

__all__ = ["proof_reasons", "proof_table"]

_STYLES = {Verdict.PROVEN: "green", Verdict.CONTRADICTED: "bold red", Verdict.UNDECIDED: "yellow"}
#: Columns of a terminal from which there is room for the ratio, and for the regime.
_NARROW, _ROOMY = 60, 84


def proof_table(certificate: Certificate, look: Look) -> str:
    """Number, proven digits of frequency and ratio, regime and verdict of every mode, then one line for all."""
    proofs = certificate.modes
    room = _ROOMY if look.width is None else look.width
    columns = {
        "no.": _right([str(proof.number) for proof in proofs], len("no.")),
        "Hz, proven digits": _pointed(proof.frequency_digits for proof in proofs),
    }
    if room >= _NARROW:
        columns["ratio, %"] = _pointed(proof.ratio_digits for proof in proofs)
    if room >= _ROOMY:
        columns["regime"] = [proof.regime for proof in proofs]
    table = Grid()
    table.add(*(styled(head, "bold") for head in (*columns, "verdict")))
    for proof, *cells in zip(proofs, *columns.values(), strict=True):
        how = ", exactly" if proof.exact else ""
        if proof.correction:
            how = f", directions to {proof.correction:.0e}"
        table.add(*cells, styled(f"{proof.verdict}{how}", _STYLES[proof.verdict]))
    style = "bold red" if certificate.contradicted else "bold"
    return look.render(*([table] if proofs else []), styled(certificate.summary, style))


def proof_reasons(certificate: Certificate, look: Look) -> str:
    """Why modes are contradicted or undecided, one paragraph each; empty where all are proven."""
    parts: list[Paragraph] = []
    for proof in certificate.modes:
        if proof.reason:
            parts.append(styled(f"mode {proof.number} ", "bold").append(str(proof.verdict), _STYLES[proof.verdict]))
            parts.append(styled(proof.reason, indent=4))
    return look.render(*parts) if parts else ""


def _right(texts: list[str], least: int) -> list[str]:
    width = max([least, *map(len, texts)])
    return [f"{text:>{width}}" for text in texts]


def _pointed(texts: Iterable[str | None]) -> list[str]:
    """Numbers with their decimal points below each other."""
    cells = [DASH if text is None else text for text in texts]
    heads = [cell.partition(".")[0] for cell in cells]
    width = max((len(head) for head in heads), default=0)
    return [" " * (width - len(head)) + cell for cell, head in zip(cells, heads, strict=True)]
