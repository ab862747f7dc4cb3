"""The tour of the README, followed to the letter: its model, its commands and what it says they print."""

from __future__ import annotations

import os
import re
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]
TEXT = (ROOT / "README.md").read_text(encoding="utf-8")
BLOCKS = re.findall(r"^```(\w+)\n(.*?)^```$", TEXT, re.MULTILINE | re.DOTALL)
RESIDUAL = re.compile(r"residual 0(\.\d+)?(?= )")
SHOWN = [text for language, text in BLOCKS if language == "console"]


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """Where a reader stands: the model of the tour typed in, the demo models beside it."""
    (model,) = (text for language, text in BLOCKS if language == "yaml")
    (tmp_path / "pump.yaml").write_text(model, encoding="utf-8")
    shutil.copytree(ROOT / "models", tmp_path / "models")
    return tmp_path


def call(words: list[str], folder: Path) -> str:
    """What a command of the tour shows on a terminal of 100 columns without colour."""
    kept = {name: value for name, value in os.environ.items() if name != "FORCE_COLOR"}
    done = subprocess.run(
        [sys.executable, "-m", "mdof.cli", *words],
        cwd=folder,
        env={**kept, "COLUMNS": "100", "NO_COLOR": "1"},
        capture_output=True,
        check=False,
        timeout=60,
    )
    assert done.returncode in (0, 1), done.stderr.decode()
    return (done.stdout + done.stderr).decode()


@pytest.mark.parametrize("block", SHOWN, ids=lambda block: block.splitlines()[0][2:])
def test_commands_print_what_the_readme_shows(block: str, folder: Path) -> None:
    command, *lines = block.splitlines()
    assert command.startswith("$ mdof ")
    printed = [line.rstrip() for line in call(command.split()[2:], folder).splitlines()]
    # How small a residual comes out depends on the BLAS at hand.
    lines, printed = ([RESIDUAL.sub("residual tiny", line) for line in side] for side in (lines, printed))
    # "..." stands for lines left out.
    for part in "\n".join(lines).split("...\n" if "...\n" in "\n".join(lines) else "\n..."):
        wanted = part.strip("\n")
        assert wanted in "\n".join(printed), f"the README shows\n{wanted}\nbut the command prints\n" + "\n".join(
            printed
        )


def test_the_other_commands_of_the_tour_run(folder: Path) -> None:
    (listed,) = (text for language, text in BLOCKS if language == "sh" and text.startswith("mdof "))
    for line in listed.splitlines():
        words = line.partition("#")[0].split()
        assert words[0] == "mdof"
        found = [str(path) for word in words[1:] for path in (sorted(folder.glob(word)) if "*" in word else [word])]
        assert call(found, folder) or "--archive" in words


def test_the_python_of_the_tour_runs(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    (code,) = (text for language, text in BLOCKS if language == "python")
    back = Path.cwd()
    os.chdir(folder)
    try:
        exec(compile(code, "README.md", "exec"), {})
    finally:
        os.chdir(back)
    assert capsys.readouterr().out.splitlines()[0].startswith("1 51.8")
