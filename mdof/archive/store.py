"""Read runs back: what a folder holds, and one run in full.

The digest in the user block is verified before HDF5 opens a file, so that a damaged file gives a reason and not a
crash. A run refers to nothing outside itself: links other than hard ones, data stored elsewhere, object references
and filters are refused.
"""

from __future__ import annotations

import json
import math
import os
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

import h5py
import numpy as np

from mdof.archive.envelope import check
from mdof.errors import DamagedArchiveError, UsageError
from mdof.findings import Finding, Severity
from mdof.modes.energy import EnergyShares
from mdof.modes.regime import Regime, time_to_two_percent

if TYPE_CHECKING:
    from numpy.typing import NDArray

__all__ = ["ArchivedMode", "ArchivedRun", "Listing", "RunHeader", "list_runs", "read_run"]

_MOST_OBJECTS = 10_000


@dataclass(frozen=True, kw_only=True, slots=True)
class RunHeader:
    """What a run says about itself in the attributes of its file.

    Attributes
    ----------
    path : where the file is.
    written_utc : ISO 8601 time of writing.
    state : name of the state of the model; None for the model as written.
    digest, source_digest : SHA-256 of the resolved SI model and of the model file; the latter None without a file.
    file_digest : SHA-256 of the run file after its user block, just verified.
    least_damping_ratio : smallest damping ratio of any mode; None where no mode has one.
    """

    path: Path
    command: str
    command_line: tuple[str, ...]
    written_utc: str
    title: str
    model_file: str | None
    state: str | None
    digest: str
    source_digest: str | None
    file_digest: str
    mdof_version: str
    degrees_of_freedom: int
    number_of_modes: int
    number_of_findings: int
    least_damping_ratio: float | None
    method: str
    loss_reference: str


@dataclass(frozen=True, kw_only=True, slots=True)
class Listing:
    """The runs of a folder, oldest first, and the files that are no sound runs, each with the reason."""

    runs: tuple[RunHeader, ...]
    damaged: tuple[DamagedArchiveError, ...]


@dataclass(frozen=True, kw_only=True, slots=True, eq=False)
class ArchivedMode:
    """One mode as it was archived; the names are those of :class:`mdof.modes.mode.Mode`."""

    number: int
    regime: str
    eigenvalues: tuple[complex, ...]
    natural_frequency: float | None
    damped_frequency: float | None
    damping_ratio: float | None
    decay_rate: float
    shape: NDArray[np.complex128]
    fast_shape: NDArray[np.complex128] | None
    undamped_frequency: float | None
    shortcut_damping_ratio: float | None
    damping_ratio_bound: float | None
    backward_error: float
    energy: EnergyShares

    @property
    def time_to_two_percent(self) -> float | None:
        """Time to fall to 2 % for good [s]; None where it does not decay or has no rest position."""
        return time_to_two_percent(Regime(self.regime), self.eigenvalues)


@dataclass(frozen=True, kw_only=True, slots=True, eq=False)
class ArchivedRun:
    """One run in full.

    Attributes
    ----------
    versions : what computed it, by name.
    source : text of the model file; None for a model built in code.
    resolved : the resolved SI model as plain data.
    bodies, directions : of every described coordinate.
    """

    header: RunHeader
    versions: dict[str, str]
    source: str | None
    resolved: dict[str, Any]
    bodies: tuple[str, ...]
    directions: tuple[str, ...]
    modes: tuple[ArchivedMode, ...]
    findings: tuple[Finding, ...]
    verification: dict[str, Any]


def list_runs(folder: str | os.PathLike[str]) -> Listing:
    """Every ``*.h5`` file of a folder, its digest verified.

    Raises
    ------
    UsageError
        If the folder cannot be read.
    """
    try:
        names = sorted(entry.name for entry in os.scandir(folder) if entry.name.endswith(".h5"))
    except OSError as error:
        raise UsageError(f"{os.fspath(folder)}: not a folder of runs: {error.strerror or error}") from error
    runs: list[RunHeader] = []
    damaged: list[DamagedArchiveError] = []
    for name in names:
        path = Path(folder) / name
        try:
            file_digest = check(path)
            with _open(path) as file:
                runs.append(_header(path, file, file_digest))
        except DamagedArchiveError as error:
            damaged.append(error)
        except (OSError, RuntimeError, KeyError, ValueError, TypeError) as error:
            damaged.append(_incomplete(path, error))
    runs.sort(key=lambda run: (run.written_utc, run.path.name))
    return Listing(runs=tuple(runs), damaged=tuple(damaged))


def read_run(path: str | os.PathLike[str]) -> ArchivedRun:
    """One run, its digest verified first.

    Raises
    ------
    UsageError
        If there is no such file.
    DamagedArchiveError
        If it is not a run, or not as its writer left it.
    """
    path = Path(path)
    if not path.exists():
        raise UsageError(f"{path}: no such run")
    if path.is_dir():
        raise UsageError(f"{path}: is a folder; `mdof archive list {path}` names the runs in it")
    file_digest = check(path)
    try:
        with _open(path) as file:
            _refuse_what_points_elsewhere(path, file)
            return _read(path, file, file_digest)
    except (OSError, RuntimeError, KeyError, ValueError, TypeError, IndexError) as error:
        raise _incomplete(path, error) from error


def _open(path: Path) -> h5py.File:
    return h5py.File(path, "r", locking=False)


def _incomplete(path: Path, error: Exception) -> DamagedArchiveError:
    reason = str(error).strip() or type(error).__name__
    return DamagedArchiveError(f"{path}: damaged: it cannot be read as a run ({reason})")


def _refuse_what_points_elsewhere(path: Path, file: h5py.File) -> None:
    size = path.stat().st_size
    waiting: list[h5py.Group] = [file]
    seen = 0
    while waiting:
        group = waiting.pop()
        for name in group:
            seen += 1
            place = f"{group.name.rstrip('/')}/{name}"
            if seen > _MOST_OBJECTS:
                raise DamagedArchiveError(f"{path}: refused: more than {_MOST_OBJECTS} objects")
            if not isinstance(group.get(name, getlink=True), h5py.HardLink):
                raise DamagedArchiveError(f"{path}: refused: {place} is a link to elsewhere")
            item = group[name]
            if isinstance(item, h5py.Group):
                waiting.append(item)
            elif not isinstance(item, h5py.Dataset):
                raise DamagedArchiveError(f"{path}: refused: {place} is neither a group nor a dataset")
            elif item.external or item.is_virtual:
                raise DamagedArchiveError(f"{path}: refused: the data of {place} are stored outside the file")
            elif h5py.check_ref_dtype(item.dtype) is not None:
                raise DamagedArchiveError(f"{path}: refused: {place} holds references")
            elif item.id.get_create_plist().get_nfilters():
                raise DamagedArchiveError(f"{path}: refused: {place} is compressed, which no run is")
            elif item.size * item.dtype.itemsize > size:
                raise DamagedArchiveError(f"{path}: refused: {place} claims to be larger than the file")


def _header(path: Path, file: h5py.File, file_digest: str) -> RunHeader:
    attributes = file.attrs
    if attributes["layout"] != "mdof run":
        raise ValueError("the layout attribute is wrong")
    least = float(attributes["least_damping_ratio"])
    return RunHeader(
        path=path,
        command=str(attributes["command"]),
        command_line=tuple(json.loads(attributes["command_line"])),
        written_utc=str(attributes["written_utc"]),
        title=str(attributes["title"]),
        model_file=str(attributes["model_file"]) or None,
        state=str(attributes["state"]) or None,
        digest=str(attributes["digest"]),
        source_digest=str(attributes["source_digest"]) or None,
        file_digest=file_digest,
        mdof_version=str(attributes["mdof_version"]),
        degrees_of_freedom=int(attributes["degrees_of_freedom"]),
        number_of_modes=int(attributes["number_of_modes"]),
        number_of_findings=int(attributes["number_of_findings"]),
        least_damping_ratio=None if math.isnan(least) else least,
        method=str(attributes["method"]),
        loss_reference=str(attributes["loss_reference"]),
    )


def _texts(dataset: h5py.Dataset) -> tuple[str, ...]:
    return tuple(str(value) for value in dataset.asstr()[...])


def _read(path: Path, file: h5py.File, file_digest: str) -> ArchivedRun:
    verdict = file["verification"]
    columns = {name: _texts(dataset) for name, dataset in file["findings"].items()}
    findings = tuple(
        Finding(
            code=columns["code"][row],
            severity=Severity(columns["severity"][row]),
            message=columns["message"][row],
            advice=columns["advice"][row],
            modes=tuple(json.loads(columns["modes"][row])),
            bodies=tuple(json.loads(columns["bodies"][row])),
            connections=tuple(json.loads(columns["connections"][row])),
        )
        for row in range(len(columns["code"]))
    )
    return ArchivedRun(
        header=_header(path, file, file_digest),
        versions={name: str(value) for name, value in file["versions"].attrs.items()},
        source=str(file["model/source"].asstr()[()]) if "source" in file["model"] else None,
        resolved=json.loads(file["model/resolved"].asstr()[()]),
        bodies=_texts(file["system/bodies"]),
        directions=_texts(file["system/directions"]),
        modes=_modes(file["modes"]),
        findings=findings,
        verification={
            "status": str(verdict["status"].asstr()[()]),
            "largest_scaled_residual": float(verdict["largest_scaled_residual"][()]),
            "eigenvalues_expected": int(verdict["eigenvalues_expected"][()]),
            "eigenvalues_found": int(verdict["eigenvalues_found"][()]),
        },
    )


def _modes(group: h5py.Group) -> tuple[ArchivedMode, ...]:
    eigenvalues = group["eigenvalues"][...]
    regimes = _texts(group["regimes"])
    shapes = group["shapes"][...]
    fast = group["fast_shapes"][...] if "fast_shapes" in group else None
    kinetic = group["kinetic_shares"][...]
    connections = _texts(group["connections"])
    dissipated = group["dissipated_shares"][...]

    def numbers(name: str) -> list[float | None]:
        return [None if math.isnan(value) else float(value) for value in group[name][...]]

    natural, ratios, decays = numbers("natural_frequencies"), numbers("damping_ratios"), group["decay_rates"][...]
    undamped, shortcut = numbers("undamped_frequencies"), numbers("shortcut_damping_ratios")
    bounds, errors = numbers("damping_ratio_bounds"), group["backward_errors"][...]
    modes = []
    for row, regime in enumerate(regimes):
        pair = tuple(complex(value) for value in eigenvalues[row] if not np.isnan(value))
        oscillates = len(pair) == 2 and pair[0].imag != 0
        shares = {name: float(dissipated[i, row]) for i, name in enumerate(connections) if dissipated[i, row] != 0}
        modes.append(
            ArchivedMode(
                number=row + 1,
                regime=regime,
                eigenvalues=pair,
                natural_frequency=natural[row],
                damped_frequency=abs(pair[0].imag) if oscillates else None,
                damping_ratio=ratios[row],
                decay_rate=float(decays[row]),
                shape=shapes[:, row],
                fast_shape=None if fast is None or np.isnan(fast[:, row]).all() else fast[:, row],
                undamped_frequency=undamped[row],
                shortcut_damping_ratio=shortcut[row],
                damping_ratio_bound=bounds[row],
                backward_error=float(errors[row]),
                energy=EnergyShares(kinetic=kinetic[:, row], dissipated=shares),
            )
        )
    return tuple(modes)
