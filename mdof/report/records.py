"""Results for programs: one JSON object a model and state, and CSV (RFC 4180) with a unit in every header."""

from __future__ import annotations

import json
import math
from collections.abc import Iterable, Sequence
from typing import TYPE_CHECKING, Any

from mdof.report.leaders import dissipates_most, kinetic_by_body, moves_most

if TYPE_CHECKING:
    from mdof.description.schema import Model
    from mdof.findings import Finding
    from mdof.modes.mode import DampedModes, Verification
    from mdof.report.screening import Screening

__all__ = [
    "MODE_COLUMNS",
    "csv_line",
    "json_line",
    "list_record",
    "mode_csv_rows",
    "modes_record",
    "run_record",
    "screen_record",
    "verification_record",
]


def json_line(record: dict[str, Any]) -> bytes:
    """One object on one line, UTF-8; NaN and infinity cannot occur in it."""
    text = json.dumps(record, ensure_ascii=False, allow_nan=False, separators=(", ", ": "))
    # A file name that is no valid UTF-8 keeps its odd bytes as escapes, which JSON allows.
    return text.encode("utf-8", "backslashreplace") + b"\n"


def csv_line(fields: Iterable[Any]) -> bytes:
    """One CSV record: quotes where needed, doubled inside, CRLF at the end; an undefined value is an empty field."""
    texts = ["" if field is None else repr(field) if isinstance(field, float) else str(field) for field in fields]
    quoted = ['"' + text.replace('"', '""') + '"' if set(text) & set('",\r\n') else text for text in texts]
    return ",".join(quoted).encode("utf-8", "backslashreplace") + b"\r\n"


def envelope(command: str, model: Model) -> dict[str, Any]:
    """What every JSON object starts with."""
    return {
        "command": command,
        "model": {"title": model.title, "file": model.file, "digest": model.digest},
        "state": model.state,
    }


def finding_records(findings: Iterable[Finding]) -> list[dict[str, Any]]:
    """Findings as plain data."""
    return [
        {
            "code": item.code,
            "severity": str(item.severity),
            "modes": list(item.modes),
            "bodies": list(item.bodies),
            "connections": list(item.connections),
            "message": item.message,
            "advice": item.advice,
        }
        for item in findings
    ]


def verification_record(verification: Verification) -> dict[str, Any]:
    """The verdict on the eigenpairs as plain data."""
    return {
        "status": verification.status,
        "largest_scaled_residual": _finite(verification.largest_scaled_residual),
        "eigenvalues_expected": verification.eigenvalues_expected,
        "eigenvalues_found": verification.eigenvalues_found,
    }


def modes_record(model: Model, modes: DampedModes) -> dict[str, Any]:
    """The object that ``mdof modes --format json`` prints."""
    system = modes.system
    return {
        **envelope("modes", model),
        "degrees_of_freedom": system.degrees_of_freedom,
        "method": modes.method,
        "modes": [
            _mode_record(
                mode,
                system.coordinate_bodies,
                system.coordinate_directions,
                frequency_bound=_finite(mode.frequency_bound),
            )
            for mode in modes
        ],
        "findings": finding_records(modes.findings),
        "verification": verification_record(modes.verification),
    }


def _mode_record(mode: Any, bodies: Sequence[str], directions: Sequence[str], **more: float | None) -> dict[str, Any]:
    """One mode, solved or archived, with what is known ``more`` of it before its shape."""
    labels = [f"{body}.{direction}" for body, direction in zip(bodies, directions, strict=True)]
    energy = mode.energy
    mover = moves_most(mode, bodies, directions, energy)
    record: dict[str, Any] = {
        "number": mode.number,
        "regime": str(mode.regime),
        "eigenvalues": [[value.real, value.imag] for value in mode.eigenvalues],
        "natural_frequency_hz": _hertz(mode.natural_frequency),
        "damped_frequency_hz": _hertz(mode.damped_frequency),
        "damping_ratio": _finite(mode.damping_ratio),
        "decay_rate": _finite(mode.decay_rate),
        "time_to_two_percent": _finite(mode.time_to_two_percent),
        "undamped_frequency_hz": _hertz(mode.undamped_frequency),
        "shortcut_damping_ratio": _finite(mode.shortcut_damping_ratio),
        "moves_most": {"body": mover.body, "direction": mover.direction},
        "kinetic_energy": kinetic_by_body(mode, bodies, energy),
        "dissipated_energy": dict(energy.dissipated) or None,
        "backward_error": _finite(mode.backward_error),
        "damping_ratio_bound": _finite(mode.damping_ratio_bound),
        **more,
        "shape": _shape(mode.shape, labels),
    }
    if mode.fast_shape is not None:
        record["fast_shape"] = _shape(mode.fast_shape, labels)
    return record


def _shape(shape: Any, labels: Sequence[str]) -> dict[str, list[float]]:
    pairs = zip(labels, shape.real.tolist(), shape.imag.tolist(), strict=True)
    return {label: [real, imaginary] for label, real, imaginary in pairs}


def _finite(value: float | None) -> float | None:
    return None if value is None or not math.isfinite(value) else float(value)


def _hertz(value: float | None) -> float | None:
    return None if value is None else _finite(value / (2 * math.pi))


def screen_record(model: Model, modes: DampedModes, result: Screening) -> dict[str, Any]:
    """The object that ``mdof screen --format json`` prints."""
    return {
        **envelope("screen", model),
        "results": {
            "passed": result.passed,
            "least_damping_ratio": result.least_damping_ratio,
            "below_hz": _hertz(result.below),
            "judged": result.judged,
            "failing": [
                {
                    "number": mode.number,
                    "regime": str(mode.regime),
                    "natural_frequency_hz": _hertz(mode.natural_frequency),
                    "damping_ratio": _finite(mode.damping_ratio),
                }
                for mode in result.failing
            ],
        },
        "findings": finding_records(modes.findings),
        "verification": verification_record(modes.verification),
    }


def _header_record(command: str, header: Any) -> dict[str, Any]:
    return {
        "command": command,
        "model": {"title": header.title, "file": header.model_file, "digest": header.digest},
        "state": header.state,
        "results": {
            "run": header.path.name,
            "written_utc": header.written_utc,
            "command": header.command,
            "degrees_of_freedom": header.degrees_of_freedom,
            "number_of_modes": header.number_of_modes,
            "number_of_findings": header.number_of_findings,
            "least_damping_ratio": header.least_damping_ratio,
            "mdof_version": header.mdof_version,
            "source_digest": header.source_digest,
            "file_digest": f"sha256:{header.file_digest}",
        },
    }


# Archived runs come from a floor of their own, so their type is not named here.
def list_record(header: Any) -> dict[str, Any]:
    """One line of ``mdof archive list --format json``."""
    return {**_header_record("archive list", header), "findings": [], "verification": None}


def run_record(run: Any) -> dict[str, Any]:
    """The object that ``mdof archive show --format json`` prints."""
    record = _header_record("archive show", run.header)
    record["results"] |= {
        "command_line": list(run.header.command_line),
        "versions": dict(run.versions),
        "method": run.header.method,
        "modes": [_mode_record(mode, run.bodies, run.directions) for mode in run.modes],
    }
    return {**record, "findings": finding_records(run.findings), "verification": dict(run.verification)}


MODE_COLUMNS = (
    "model [text]",
    "state [text]",
    "mode [1]",
    "regime [text]",
    "natural frequency [Hz]",
    "damped frequency [Hz]",
    "damping ratio [1]",
    "decay rate [1/s]",
    "time to 2 % [s]",
    "first eigenvalue real [1/s]",
    "first eigenvalue imaginary [1/s]",
    "second eigenvalue real [1/s]",
    "second eigenvalue imaginary [1/s]",
    "undamped frequency [Hz]",
    "shortcut damping ratio [1]",
    "backward error [1]",
    "damping ratio bound [1]",
    "moves most [text]",
    "share of kinetic energy [1]",
    "dissipates most [text]",
    "share of dissipated energy [1]",
)


def mode_csv_rows(model: Model, modes: DampedModes) -> Iterable[tuple[Any, ...]]:
    """Rows under :data:`MODE_COLUMNS`."""
    system = modes.system
    for mode in modes:
        energy = mode.energy
        mover = moves_most(mode, system.coordinate_bodies, system.coordinate_directions, energy)
        taker = dissipates_most(mode, energy)
        roots: list[float | None] = [part for value in mode.eigenvalues for part in (value.real, value.imag)]
        yield (
            model.file or model.title,
            model.state,
            mode.number,
            str(mode.regime),
            _hertz(mode.natural_frequency),
            _hertz(mode.damped_frequency),
            _finite(mode.damping_ratio),
            _finite(mode.decay_rate),
            _finite(mode.time_to_two_percent),
            *[*roots, None, None][:4],
            _hertz(mode.undamped_frequency),
            _finite(mode.shortcut_damping_ratio),
            _finite(mode.backward_error),
            _finite(mode.damping_ratio_bound),
            mover.name,
            mover.share,
            taker.name if taker else None,
            taker.share if taker else None,
        )
