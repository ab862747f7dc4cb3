"""Write one run as one HDF5 file, once.

The file is written under a hidden temporary name in the same folder, flushed to disk, sealed with a digest and then
given its lasting name without ever overwriting one. The layout is documented in ``mdof manual archive``.
"""

from __future__ import annotations

import json
import os
import platform
import re
import sys
import time
import unicodedata
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

import h5py
import numpy as np

from mdof import __version__
from mdof.archive.envelope import BLOCK_SIZE, LAYOUT_VERSION, probe_folder, publish, seal, temporary_beside
from mdof.errors import OutputError

if TYPE_CHECKING:
    from mdof.description.schema import Model
    from mdof.findings import Finding
    from mdof.modes.mode import DampedModes
    from mdof.system import System

__all__ = ["probe_folder", "write_run"]

_TEXT = h5py.string_dtype("utf-8")
_TEXT_IN_FILE = h5py.h5t.py_create(_TEXT, logical=True)
_TEXT_IN_MEMORY = h5py.h5t.py_create(_TEXT)
_MIXED = "for x, y, z and rx, ry, rz: "


def write_run(
    folder: str | os.PathLike[str],
    model: Model,
    modes: DampedModes,
    *,
    command: str = "modes",
    command_line: Sequence[str] = (),
    now: float | None = None,
) -> Path:
    """Archive one solved model.

    Parameters
    ----------
    folder : made where it is missing.
    model : the model that was solved, in its state.
    modes : its verified modes; the system is taken from them.
    command : the analysis, kept as attribute ``command``.
    command_line : the words the run was started with; may be empty.
    now : seconds since 1970 UTC; default the clock.

    Returns
    -------
    Path of the new file, ``UTCTIME-MODEL-DIGEST.h5``.

    Raises
    ------
    OutputError
        If it cannot be written; nothing is left behind.
    """
    folder = Path(folder)
    probe_folder(folder)
    digest = model.digest
    moment = time.time() if now is None else now
    try:
        folder.mkdir(parents=True, exist_ok=True)
        with temporary_beside(folder, ".h5.part") as temporary:
            # v110 files are compact and quick to write, and every HDF5 since 1.10 (h5py 3 and later) reads them.
            with h5py.File(temporary, "x", libver=("v110", "v110"), userblock_size=BLOCK_SIZE, locking=False) as file:
                _fill(file, model, modes, digest, command, command_line, moment)
            seal(temporary)
            return publish(temporary, folder, run_stem(model, digest, moment), ".h5")
    except (OSError, RuntimeError) as error:  # h5py reports a full disk as either
        reason = getattr(error, "strerror", None) or error
        raise OutputError(f"{folder}: the run could not be archived: {reason}") from error


def run_stem(model: Model, digest: str, moment: float) -> str:
    """``UTCTIME-MODEL-DIGEST``: sorts by time, says what it is, and holds nothing a file system could dislike."""
    name = Path(model.file).stem if model.file else model.title
    if model.state:
        name = f"{name} {model.state}"
    ascii_name = unicodedata.normalize("NFKD", name).encode("ascii", "ignore").decode()
    slug = re.sub(r"[^A-Za-z0-9]+", "-", ascii_name).strip("-")[:60].strip("-").lower() or "model"
    stamp = time.strftime("%Y%m%dT%H%M%SZ", time.gmtime(moment))
    return f"{stamp}-{slug}-{digest.removeprefix('sha256:')[:8]}"


def _fill(
    file: h5py.File,
    model: Model,
    modes: DampedModes,
    digest: str,
    command: str,
    command_line: Sequence[str],
    moment: float,
) -> None:
    ratios = modes.damping_ratios[np.isfinite(modes.damping_ratios)]
    attributes: dict[str, Any] = {
        "layout": "mdof run",
        "layout_version": LAYOUT_VERSION,
        "command": command,
        "command_line": json.dumps(list(command_line), ensure_ascii=False),
        "written_utc": time.strftime("%Y-%m-%dT%H:%M:%SZ", time.gmtime(moment)),
        "title": model.title,
        "model_file": model.file or "",
        "state": model.state or "",
        "digest": digest,
        "source_digest": model.source_digest or "",
        "mdof_version": __version__,
        "degrees_of_freedom": modes.system.degrees_of_freedom,
        "number_of_modes": len(modes),
        "number_of_findings": len(modes.findings),
        "least_damping_ratio": float(ratios.min()) if len(ratios) else np.nan,
        "method": modes.method,
        "loss_reference": modes.loss_reference,
    }
    for name, value in attributes.items():
        if isinstance(value, str):
            _describe(file, **{name: value})
        else:
            file.attrs[name] = value
    group = file.create_group("model")
    if model.source_text is not None:
        _put(group, "source", model.source_text, "text", "the model file, byte for byte as UTF-8 text")
    resolved = json.dumps(model.to_si(), ensure_ascii=False, sort_keys=True, separators=(",", ":"))
    _put(group, "resolved", resolved, "text", "the model in SI as canonical JSON, expanded and with the state merged")
    _put_system(file.create_group("system"), modes.system)
    _put_modes(file.create_group("modes"), modes)
    _put_findings(file.create_group("findings"), modes.findings)
    _put_verification(file.create_group("verification"), modes)
    _put_versions(file.create_group("versions"))


def _put(group: h5py.Group, name: str, values: Any, unit: str, description: str, labels: Sequence[str] = ()) -> None:
    """One dataset with its unit, its meaning and a label for every dimension."""
    if isinstance(values, str) or (isinstance(values, (tuple, list)) and all(isinstance(item, str) for item in values)):
        data = group.create_dataset(name, data=_nul_free(values), dtype=_TEXT)
    else:
        data = group.create_dataset(name, data=values)
    _describe(data, unit=unit, description=description)
    if labels:
        _describe(data, DIMENSION_LABELS=labels)  # the attribute that HDF5's own dimension scales use


def _describe(item: h5py.HLObject, **texts: str | Sequence[str]) -> None:
    """Text attributes; the low-level interface makes the hundreds of them in a third of the time."""
    for name, text in texts.items():
        content = np.asarray(_nul_free(text), dtype=object)
        space = h5py.h5s.create_simple(content.shape)
        attribute = h5py.h5a.create(item.id, name.encode(), _TEXT_IN_FILE, space)
        attribute.write(content, mtype=_TEXT_IN_MEMORY)


def _nul_free(values: Any) -> Any:
    """Texts without NUL, which a variable-length string cannot hold."""
    if isinstance(values, str):
        return values.replace("\0", "\ufffd")
    return np.array([value.replace("\0", "\ufffd") for value in values], dtype=object)


def _put_matrix(group: h5py.Group, name: str, matrix: Any, unit: str, description: str) -> None:
    """A sparse matrix by its compressed columns."""
    matrix = matrix.tocsc()
    matrix.sort_indices()
    part = group.create_group(name)
    part.attrs["shape"] = matrix.shape
    _describe(part, format="csc", description=description)
    _put(part, "data", matrix.data, unit, f"{description}: stored entries, column by column", ["entry"])
    _put(part, "indices", matrix.indices.astype(np.int64), "1", "row of each stored entry, from 0", ["entry"])
    _put(part, "indptr", matrix.indptr.astype(np.int64), "1", "where each column starts in data", ["column"])


def _put_system(group: h5py.Group, system: System) -> None:
    _put_matrix(group, "M", system.M, _MIXED + "kg, kg m, kg m^2", "mass matrix in reduced coordinates")
    _put_matrix(
        group,
        "C",
        system.C,
        _MIXED + "N s/m, N s, N m s",
        "viscous damping matrix, loss factors with a stated reference frequency included as dashpots",
    )
    _put_matrix(group, "K", system.K, _MIXED + "N/m, N, N m", "stiffness matrix in reduced coordinates")
    _put_matrix(group, "recovery", system.recovery, "1, m", "described coordinates from reduced ones")
    label = ["coordinate"]
    _put(group, "bodies", system.coordinate_bodies, "text", "body of each described coordinate", label)
    _put(group, "directions", system.coordinate_directions, "text", "direction of each described coordinate", label)


def _put_modes(group: h5py.Group, modes: DampedModes) -> None:
    one = ["mode"]
    square = ["coordinate", "mode"]
    _put(
        group, "eigenvalues", modes.eigenvalues, "1/s", "eigenvalue pairs; a missing partner is NaN", ["mode", "member"]
    )
    _put(group, "regimes", tuple(str(regime) for regime in modes.regimes), "text", "what each mode does by itself", one)
    for name, values, unit, description in (
        ("natural_frequencies", modes.natural_frequencies, "rad/s", "|eigenvalue| of the damped system"),
        ("damping_ratios", modes.damping_ratios, "1", "damping ratio; NaN where undefined"),
        ("decay_rates", modes.decay_rates, "1/s", "slowest decay of the mode; negative where it grows"),
        ("undamped_frequencies", modes.undamped_frequencies, "rad/s", "undamped natural frequency nearest in shape"),
        ("shortcut_damping_ratios", modes.shortcut_damping_ratios, "1", "damping ratio by the proportional shortcut"),
        ("backward_errors", modes.backward_errors, "1", "scaled residual of the eigenpair"),
        ("damping_ratio_bounds", modes.damping_ratio_bounds, "1", "absolute error bound of the damping ratio"),
        ("frequency_bounds", modes.frequency_bounds, "1", "relative error bound of the natural frequency"),
        ("damping_references", modes.damping_references, "rad/s", "where loss factors without reference were matched"),
    ):
        _put(group, name, values, unit, description, one)
    _put(group, "shapes", modes.shapes, "m, rad", "complex mode shapes, largest component 1", square)
    own = ["reduced coordinate", "mode"]
    _put(group, "reduced_shapes", modes.reduced_shapes, "m, rad", "the same in the coordinates of M, C and K", own)
    if not np.isnan(modes.fast_shapes).all():
        _put(group, "fast_shapes", modes.fast_shapes, "m, rad", "shapes of fast real roots; else NaN", square)
    kinetic = np.zeros((len(modes.system.coordinate_bodies), len(modes)))
    dissipated: dict[str, np.ndarray[Any, np.dtype[np.float64]]] = {}
    for index, mode in enumerate(modes):
        shares = mode.energy
        kinetic[:, index] = shares.kinetic
        for name, share in shares.dissipated.items():
            dissipated.setdefault(name, np.zeros(len(modes)))[index] = share
    _put(group, "kinetic_shares", kinetic, "1", "share of the kinetic energy of the mode by coordinate", square)
    _put(group, "connections", tuple(dissipated), "text", "connections that dissipate in any mode", ["connection"])
    rows = np.array(list(dissipated.values())).reshape(len(dissipated), len(modes))
    _put(group, "dissipated_shares", rows, "1", "share of the dissipated energy of the mode", ["connection", "mode"])


def _put_findings(group: h5py.Group, findings: Sequence[Finding]) -> None:
    label = ["finding"]
    for name, values, description in (
        ("code", [item.code for item in findings], "code of each finding"),
        ("severity", [str(item.severity) for item in findings], "note, warning or serious"),
        ("message", [item.message for item in findings], "what was seen"),
        ("advice", [item.advice for item in findings], "what to do about it"),
        ("modes", [json.dumps(list(item.modes)) for item in findings], "mode numbers concerned, as JSON"),
        ("bodies", [json.dumps(list(item.bodies)) for item in findings], "bodies concerned, as JSON"),
        ("connections", [json.dumps(list(item.connections)) for item in findings], "connections concerned, as JSON"),
    ):
        _put(group, name, values, "text", description, label)


def _put_verification(group: h5py.Group, modes: DampedModes) -> None:
    verdict = modes.verification
    _put(group, "status", verdict.status, "text", "verdict on the eigenpairs")
    _put(group, "largest_scaled_residual", verdict.largest_scaled_residual, "1", "below 10 passes")
    _put(group, "largest_frequency_bound", verdict.largest_frequency_bound, "1", "largest relative error bound")
    _put(group, "eigenvalues_expected", verdict.eigenvalues_expected, "1", "number of eigenvalues the system has")
    _put(group, "eigenvalues_found", verdict.eigenvalues_found, "1", "number of eigenvalues found")


def _put_versions(group: h5py.Group) -> None:
    """What computed this run. A package that was not loaded took no part and is not asked for its version."""
    group.attrs["mdof"] = __version__
    group.attrs["python"] = platform.python_version()
    group.attrs["platform"] = f"{sys.platform} {platform.machine()}"
    group.attrs["hdf5"] = h5py.version.hdf5_version
    for name in ("numpy", "scipy", "networkx", "h5py", "pydantic", "pint", "yaml"):
        version = getattr(sys.modules.get(name), "__version__", None)
        if isinstance(version, str):
            group.attrs["pyyaml" if name == "yaml" else name] = version
    build: Any = np.show_config(mode="dicts")
    blas = build.get("Build Dependencies", {}).get("blas", {}) if isinstance(build, dict) else {}
    group.attrs["blas"] = f"{blas.get('name', 'unknown')} {blas.get('version', '')}".strip()
