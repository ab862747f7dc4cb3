"""Reading runs back: sound ones in full, damaged and hostile ones refused with a reason."""

from __future__ import annotations

import os
import shutil
from collections.abc import Callable
from pathlib import Path

import h5py
import pytest

import mdof
from mdof.archive.envelope import seal
from mdof.archive.run import write_run
from mdof.archive.store import list_runs, read_run
from mdof.errors import DamagedArchiveError, UsageError
from mdof.modes.mode import DampedModes


@pytest.fixture(scope="module")
def solved() -> tuple[mdof.Model, DampedModes]:
    model = mdof.Model(
        title="block",
        units="SI",
        bodies={"a": 3.0, "b": 2.0},
        connections={
            "spring": {"between": ["a", "ground"], "stiffness": 300.0, "damping": 200.0},
            "link": {"between": ["b", "a"], "stiffness": 500.0, "damping": -0.5},
        },
    )
    return model, mdof.solve(mdof.assemble(model))


@pytest.fixture
def run(solved: tuple[mdof.Model, DampedModes], tmp_path: Path) -> Path:
    return write_run(tmp_path, *solved, command_line=["mdof", "modes", "x y"], now=0.0)


def test_a_run_comes_back_as_it_was(solved: tuple[mdof.Model, DampedModes], run: Path) -> None:
    model, modes = solved
    found = read_run(run)
    assert found.header.title == model.title
    assert found.header.model_file is None
    assert found.header.command_line == ("mdof", "modes", "x y")
    assert found.source is None
    assert found.resolved == model.to_si()
    assert found.findings == modes.findings
    assert len(found.modes) == len(modes)
    for mode, original in zip(found.modes, modes, strict=True):
        for name in ("number", "eigenvalues", "natural_frequency", "damped_frequency", "damping_ratio", "decay_rate"):
            assert getattr(mode, name) == getattr(original, name), name
        assert mode.regime == original.regime
        assert mode.time_to_two_percent == original.time_to_two_percent
        assert mode.energy.dissipated == pytest.approx(original.energy.dissipated)


def test_a_list_is_by_time_and_counts_what_is_in_it(solved: tuple[mdof.Model, DampedModes], tmp_path: Path) -> None:
    late = write_run(tmp_path, *solved, now=2e9)
    early = write_run(tmp_path, *solved, now=1e9)
    (tmp_path / "notes.txt").write_text("not a run")
    listing = list_runs(tmp_path)
    assert [header.path for header in listing.runs] == [early, late]
    assert listing.damaged == ()


def _flip(path: Path, at: int) -> None:
    content = bytearray(path.read_bytes())
    content[at] ^= 1
    path.write_bytes(content)


@pytest.mark.parametrize("share", [0.05, 0.3, 0.6, 0.999])
def test_one_flipped_bit_anywhere_is_seen(run: Path, share: float) -> None:
    _flip(run, 512 + int(share * (run.stat().st_size - 512)))
    with pytest.raises(DamagedArchiveError, match="SHA-256"):
        read_run(run)
    assert len(list_runs(run.parent).damaged) == 1


@pytest.mark.parametrize(
    ("spoil", "reason"),
    [
        (lambda path: path.write_bytes(b""), "an empty file"),
        (lambda path: path.write_bytes(b"\x00" * 4000), "not a run"),
        (lambda path: path.write_bytes(path.read_bytes()[:-1]), "cut short"),
        (lambda path: path.write_bytes(path.read_bytes()[:100]), "damaged"),
        (lambda path: path.write_bytes(path.read_bytes() + b"x"), "lengthened"),
        (lambda path: path.write_bytes(path.read_bytes().replace(b"layout 1", b"layout 9", 1)), "update mdof"),
        (lambda path: _flip(path, 30), "SHA-256"),
        (lambda path: path.write_bytes(path.read_bytes()[512:]), "no mdof user block"),
    ],
)
def test_damage_is_named(run: Path, spoil: Callable[[Path], object], reason: str) -> None:
    spoil(run)
    with pytest.raises(DamagedArchiveError, match=reason):
        read_run(run)
    listing = list_runs(run.parent)
    assert listing.runs == ()
    assert reason in str(listing.damaged[0])


def _soft(file: h5py.File, _folder: Path) -> None:
    file["modes/soft"] = h5py.SoftLink("/model/resolved")


def _external(file: h5py.File, folder: Path) -> None:
    file["modes/out"] = h5py.ExternalLink(str(folder / "other.h5"), "/x")


def _stored_outside(file: h5py.File, folder: Path) -> None:
    file.create_dataset("modes/raw", (3,), "f8", external=[(str(folder / "raw.bin"), 0, 24)])


def _reference(file: h5py.File, _folder: Path) -> None:
    file.create_dataset("modes/pointer", data=file["model"].ref, dtype=h5py.ref_dtype)


def _bomb(file: h5py.File, _folder: Path) -> None:
    file.create_dataset("modes/bomb", (10**12,), "f8", chunks=(10**6,), compression="gzip")


def _huge(file: h5py.File, _folder: Path) -> None:
    file.create_dataset("modes/huge", (10**12,), "f8")


def _missing(file: h5py.File, _folder: Path) -> None:
    del file["modes/regimes"]


@pytest.mark.parametrize(
    ("change", "reason"),
    [
        (_soft, "link to elsewhere"),
        (_external, "link to elsewhere"),
        (_stored_outside, "stored outside"),
        (_reference, "references"),
        (_bomb, "compressed"),
        (_huge, "larger than the file"),
        (_missing, "cannot be read as a run"),
    ],
)
def test_a_sealed_file_that_points_elsewhere_or_lies_is_refused(
    run: Path, tmp_path: Path, change: Callable[[h5py.File, Path], None], reason: str
) -> None:
    """The digest is right, so only the content can give it away."""
    copy = tmp_path / "copy.h5"
    shutil.copy(run, copy)
    with h5py.File(copy, "r+") as file:
        change(file, tmp_path)
    seal(copy)
    with pytest.raises(DamagedArchiveError, match=reason):
        read_run(copy)


def test_a_missing_run_or_folder_is_wrong_usage(tmp_path: Path) -> None:
    for call in (read_run, list_runs):
        with pytest.raises(UsageError):
            call(tmp_path / "nothing")
    with pytest.raises(UsageError, match="archive list"):
        read_run(tmp_path)
    with pytest.raises(UsageError):
        list_runs(Path(os.devnull))
