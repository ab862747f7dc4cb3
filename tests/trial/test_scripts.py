"""The scripts a user starts with, in a clone of their own."""

from __future__ import annotations

import os
import shutil
import site
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]
TWO = Path("models") / "two_mass.yaml"
STAMP = "import json, environment as e; e._STAMP.write_text(json.dumps({'key': e._key(), 'extras': []}))"


@pytest.fixture(scope="module")
def clone(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A clone as git would make it, without an environment."""
    folder = tmp_path_factory.mktemp("clone")
    for name in ("mdof", "scripts", "models"):
        shutil.copytree(ROOT / name, folder / name, ignore=shutil.ignore_patterns("__pycache__"))
    for name in ("pyproject.toml", "README.md", "LICENSE"):
        shutil.copy(ROOT / name, folder / name)
    return folder


@pytest.fixture(scope="module")
def ready(clone: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The same after the first call; its environment is lent the packages of this one, which saves the download."""
    folder = tmp_path_factory.mktemp("ready") / "clone"
    shutil.copytree(clone, folder)
    subprocess.run([sys.executable, "-m", "venv", "--without-pip", str(folder / ".venv")], check=True, timeout=60)
    (packages,) = [*folder.glob(".venv/lib/python*/site-packages"), *folder.glob(".venv/Lib/site-packages")]
    lent = [str(folder), *site.getsitepackages()]
    (packages / "lent.pth").write_text("".join(f"{path}\n" for path in lent))
    subprocess.run([sys.executable, "-c", STAMP], cwd=folder / "scripts", check=True, timeout=60)
    return folder


def run(folder: Path, *words: str, cwd: Path, **variables: str) -> subprocess.CompletedProcess[str]:
    kept = {name: value for name, value in os.environ.items() if name not in ("PYTHONPATH", "COLUMNS", "FORCE_COLOR")}
    command = [sys.executable, str(folder / "scripts" / "run.py"), *words]
    return subprocess.run(
        command, cwd=cwd, env={**kept, **variables}, capture_output=True, encoding="utf-8", timeout=120, check=False
    )


def test_the_demo_runs_in_the_environment_that_is_there(ready: Path) -> None:
    done = run(ready, cwd=ready)
    assert done.returncode == 0, done.stderr
    assert done.stdout.startswith("Diesel fire-water pump skid")
    assert f"{Path('models') / 'firewater_skid.yaml'} · as written" in done.stdout
    assert "96 of 96 eigenvalues" in done.stdout
    assert "installing" not in done.stderr
    (archived,) = (ready / "runs").glob("*.h5")
    assert f"archived {Path('runs') / archived.name}" in done.stderr


def test_words_are_handed_on_from_any_folder(ready: Path, tmp_path: Path) -> None:
    done = run(ready, str(ready / TWO), "--state", "no_damper", "--format", "csv", cwd=tmp_path)
    assert done.returncode == 0, done.stderr
    assert done.stdout.startswith("model [text],state [text],")
    assert len(list((tmp_path / "runs").glob("*-no-damper-*.h5"))) == 1


def test_an_archive_of_one_s_own_and_options_without_a_model(ready: Path, tmp_path: Path) -> None:
    done = run(ready, "--archive", "mine", "--format", "json", cwd=tmp_path)
    assert done.returncode == 0, done.stderr
    assert done.stdout.startswith('{"command": "modes", "model": {"title": "Diesel fire-water pump skid')
    assert [path.name for path in tmp_path.iterdir()] == ["mine"]


def test_the_exit_status_is_handed_on(ready: Path, tmp_path: Path) -> None:
    (tmp_path / "bad.yaml").write_text("bodies: {fan: 3 m}\n")
    done = run(ready, "bad.yaml", cwd=tmp_path)
    assert done.returncode == 2
    assert "bad.yaml:1:15: bodies.fan" in done.stderr
    assert not (tmp_path / "runs").exists()


@pytest.mark.slow
def test_a_first_call_without_network_says_so_and_is_not_taken_for_done(clone: Path, tmp_path: Path) -> None:
    done = run(clone, str(clone / TWO), cwd=tmp_path, PIP_NO_INDEX="1", PIP_NO_CACHE_DIR="1")
    assert done.returncode == 2, done.stderr
    assert "installing mdof into .venv" in done.stderr
    assert "network" in done.stderr.splitlines()[-1]
    assert "Traceback" not in done.stderr
    assert done.stdout == ""
    assert (clone / ".venv" / "pyvenv.cfg").exists()
    assert not (clone / ".venv" / "mdof-installed.json").exists()
    assert list(tmp_path.iterdir()) == []
