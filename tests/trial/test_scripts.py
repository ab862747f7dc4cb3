"""The scripts a user starts with, in the environment that they made beside the code."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]
READY = (ROOT / ".venv" / "mdof-installed.json").exists()


@pytest.mark.skipif(not READY, reason="`python scripts/test.py` makes the environment this needs")
@pytest.mark.parametrize("words", [[], [str(ROOT / "models" / "two_mass.yaml"), "--format", "json"]])
def test_run_prints_modes_and_archives_them_without_installing_again(tmp_path: Path, words: list[str]) -> None:
    done = subprocess.run(
        [sys.executable, str(ROOT / "scripts" / "run.py"), *words],
        cwd=tmp_path,
        capture_output=True,
        check=False,
        timeout=120,
    )
    assert done.returncode == 0, done.stderr.decode()
    assert b"installing" not in done.stderr
    assert len(list((tmp_path / "runs").glob("*.h5"))) == 1
    assert b"underdamped" in done.stdout
    assert b"archived runs" in done.stderr


@pytest.mark.skipif(not READY, reason="`python scripts/test.py` makes the environment this needs")
def test_run_hands_on_the_exit_status(tmp_path: Path) -> None:
    (tmp_path / "bad.yaml").write_text("bodies: {fan: 3 m}\n")
    done = subprocess.run(
        [sys.executable, str(ROOT / "scripts" / "run.py"), "bad.yaml"], cwd=tmp_path, capture_output=True, check=False
    )
    assert done.returncode == 2
    assert b"bad.yaml:1:15: bodies.fan" in done.stderr
    assert not (tmp_path / "runs").exists()
