"""One run file: whole, sealed, readable by plain h5py, never overwritten."""

from __future__ import annotations

import hashlib
import json
import os
from pathlib import Path

import h5py
import numpy as np
import pytest
import scipy.sparse

import mdof
from mdof.archive.run import write_run
from mdof.errors import OutputError
from mdof.modes.mode import DampedModes

TEXT = """\
title: Fan {äß} "1"
units: SI
bodies: {fan: 12, frame: 30}
connections:
  feet: {between: [frame, ground], stiffness: 900000, damping: 400}
  mount: {between: [fan, frame], stiffness: 200000, loss_factor: 0.1, reference_frequency: 20 Hz}
"""


@pytest.fixture(scope="module")
def solved(tmp_path_factory: pytest.TempPathFactory) -> tuple[mdof.Model, DampedModes]:
    path = tmp_path_factory.mktemp("models") / "Größe 3.yaml"
    path.write_text(TEXT, encoding="utf-8")
    model = mdof.load(path)
    return model, mdof.solve(mdof.assemble(model))


def test_the_digest_covers_every_byte_after_the_block(solved: tuple[mdof.Model, DampedModes], tmp_path: Path) -> None:
    path = write_run(tmp_path / "new" / "runs", *solved, command_line=["mdof", "modes"], now=0.0)
    content = path.read_bytes()
    lines = content[:512].rstrip(b"\0").decode("ascii").splitlines()
    assert lines == [
        "mdof run, layout 1",
        f"sha256:{hashlib.sha256(content[512:]).hexdigest()}",
        f"bytes:{len(content) - 512}",
    ]


def test_the_name_says_when_what_and_which(solved: tuple[mdof.Model, DampedModes], tmp_path: Path) -> None:
    digest = solved[0].digest.removeprefix("sha256:")[:8]
    paths = [write_run(tmp_path, *solved, now=86400.0) for _ in range(3)]
    assert [path.name for path in paths] == [
        f"19700102T000000Z-groe-3-{digest}.h5",
        f"19700102T000000Z-groe-3-{digest}-2.h5",
        f"19700102T000000Z-groe-3-{digest}-3.h5",
    ]
    assert sorted(os.listdir(tmp_path)) == sorted(path.name for path in paths)


def test_plain_h5py_reads_numbers_units_and_meaning(solved: tuple[mdof.Model, DampedModes], tmp_path: Path) -> None:
    model, modes = solved
    with h5py.File(write_run(tmp_path, model, modes)) as run:
        assert run.attrs["title"] == model.title
        assert run.attrs["digest"] == model.digest
        assert run["model/source"].asstr()[()] == TEXT
        assert json.loads(run["model/resolved"].asstr()[()]) == model.to_si()
        for name, matrix in (("M", modes.system.M), ("C", modes.system.C), ("K", modes.system.K)):
            part = run[f"system/{name}"]
            made = scipy.sparse.csc_array((part["data"][:], part["indices"][:], part["indptr"][:]), part.attrs["shape"])
            np.testing.assert_array_equal(made.toarray(), matrix.toarray())
        np.testing.assert_array_equal(run["modes/eigenvalues"][:], modes.eigenvalues)
        np.testing.assert_array_equal(run["modes/shapes"][:], modes.shapes)
        np.testing.assert_array_equal(run["modes/damping_ratios"][:], modes.damping_ratios)
        np.testing.assert_allclose(run["modes/dissipated_shares"][:].sum(axis=0), 1.0, rtol=1e-12)
        assert [text.decode() for text in run["modes/regimes"][:]] == [str(regime) for regime in modes.regimes]
        assert run["versions"].attrs["numpy"] == np.__version__

        def every(name: str, item: h5py.Group | h5py.Dataset) -> None:
            if isinstance(item, h5py.Dataset):
                assert item.attrs["unit"], name
                assert item.attrs["description"], name
                assert all(dimension.label for dimension in item.dims), name

        run.visititems(every)


def test_the_archived_matrices_and_shapes_satisfy_the_equations(
    solved: tuple[mdof.Model, DampedModes], tmp_path: Path
) -> None:
    """Nothing but the file: M, C, K and the pairs in it belong together."""
    with h5py.File(write_run(tmp_path, *solved)) as run:

        def matrix(name: str) -> np.ndarray:
            part = run[f"system/{name}"]
            parts = (part["data"][:], part["indices"][:], part["indptr"][:])
            return scipy.sparse.csc_array(parts, part.attrs["shape"]).toarray()

        mass, damping, stiffness = matrix("M"), matrix("C"), matrix("K")
        for value, shape in zip(run["modes/eigenvalues"][:, 0], run["modes/reduced_shapes"][:].T, strict=True):
            residual = (value**2 * mass + value * damping + stiffness) @ shape
            assert np.linalg.norm(residual) < 1e-12 * np.linalg.norm(stiffness) * np.linalg.norm(shape)


@pytest.mark.parametrize("place", ["a file", "under a file", "under a device"])
def test_a_folder_that_cannot_be_is_refused_and_nothing_left(
    solved: tuple[mdof.Model, DampedModes], tmp_path: Path, place: str
) -> None:
    taken = tmp_path / "taken"
    taken.write_text("mine")
    folder = {"a file": taken, "under a file": taken / "runs", "under a device": Path(os.devnull) / "runs"}[place]
    with pytest.raises(OutputError, match="cannot be written"):
        write_run(folder, *solved)
    assert taken.read_text() == "mine"
    assert os.listdir(tmp_path) == ["taken"]


def test_a_failure_while_writing_leaves_no_file(
    solved: tuple[mdof.Model, DampedModes], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def full(_handle: int) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr("mdof.archive.envelope.os.fsync", full)
    with pytest.raises(OutputError, match="No space left"):
        write_run(tmp_path, *solved)
    assert os.listdir(tmp_path) == []


def test_without_hard_links_nothing_is_overwritten_either(
    solved: tuple[mdof.Model, DampedModes], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def refuse(_source: object, _target: object) -> None:
        raise OSError(1, "Operation not permitted")

    monkeypatch.setattr("mdof.archive.envelope.os.link", refuse)
    first, second = (write_run(tmp_path, *solved, now=0.0) for _ in range(2))
    assert first != second
    assert sorted(os.listdir(tmp_path)) == sorted([first.name, second.name])
