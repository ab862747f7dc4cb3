"""What wrong input gets: status 2, the place, what is wrong and what to write; never a traceback, nothing written."""

from __future__ import annotations

import os
import re
import subprocess
import sys
from pathlib import Path

import pytest

GOOD = """\
title: Fan
bodies:
  fan: 100 kg
connections:
  mount: {between: [fan, ground], stiffness: 1 kN/mm, damping: 50 N*s/m}
"""


def modes(folder: Path, *words: str, status: int = 2) -> str:
    """What ``mdof modes`` says on standard error; it must say nothing on standard output unless it succeeds."""
    done = subprocess.run(
        [sys.executable, "-m", "mdof.cli", "modes", *words], cwd=folder, capture_output=True, check=False, timeout=120
    )
    said = done.stderr.decode()
    assert done.returncode == status, said
    assert "Traceback" not in said
    if status == 2:
        assert done.stdout == b""
    return said


def changed(old: str, new: str) -> str:
    assert old in GOOD
    return GOOD.replace(old, new)


@pytest.mark.parametrize(
    ("text", "place", "words"),
    [
        (changed("1 kN/mm", "1e5x N/m"), "5:46: connections.mount.stiffness:", "not a unit"),
        (changed("1 kN/mm", "1 kN*mm"), "5:46: connections.mount.stiffness:", "N/m"),
        (changed("1 kN/mm", "1 kN/mn"), "5:46: connections.mount.stiffness:", "not a unit"),
        (changed("1 kN/mm", ".nan"), "5:46: connections.mount.stiffness:", "finite"),
        (changed("1 kN/mm", ".inf"), "5:46: connections.mount.stiffness:", "finite"),
        (changed("1 kN/mm", "010"), "5:46: connections.mount.stiffness:", "octal"),
        (changed("1 kN/mm", "1:30"), "5:46: connections.mount.stiffness:", "base-60"),
        (changed("100 kg", "yes"), "3:8: bodies.fan", "yes"),
        (changed("100 kg", "100 lbf*s"), "3:8: bodies.fan", "kg"),
        (changed("100 kg", "-100 kg"), "3:8: bodies.fan", "negative mass"),
        (changed("[fan, ground]", "[fam, ground]"), "5:21: connections.mount.between.0:", "`fan`"),
        (changed("[fan, ground]", "[fan, fan]"), "5:", "itself"),
        (changed("stiffness:", "stifness:"), "5:35: connections.mount", "`stiffness`"),
        (changed("  fan: 100 kg", "  fan: 100 kg\n  fan: 90 kg"), "4:3: bodies.fan:", "twice"),
        (changed("  fan: 100 kg", "\tfan: 100 kg"), "3:1:", "tab"),
        (changed("100 kg", "&mass 100 kg"), "3:8:", "anchor"),
        (changed("100 kg", "*mass"), "3:8:", "alias"),
        (changed("100 kg", "!!int 100"), "3:8:", "tag"),
        (changed("  fan: 100 kg", "  <<: {fan: 100 kg}"), "3:3:", "merge"),
        (GOOD + "---\n" + GOOD, "6:1:", "document"),
        (GOOD + "reference_frequency: 12\n", "6:22: reference_frequency:", "Hz"),
        (GOOD + "criteria: {below: 60}\n", "6:19: criteria.below:", "Hz"),
        (changed("  fan: 100 kg", "  fan: {mass: 100 kg"), "", "{"),
        ("", "1:1:", "empty"),
        ("# nothing but a comment\n", "1:1:", "empty"),
        ("- 1\n- 2\n", "1:1:", "mapping"),
        ("a: " + "[" * 3000, "1:", "nested"),
        ("a: &a [1, 1]\nb: &b [*a, *a]\nc: &c [*b, *b]\nd: [*c, *c]\n", "1:4:", "anchor"),
        ("\x00\x01\x02PNG", "", "not a text file"),
        ("x" * 10_000_000, "", "MB"),
        ("\n".join(f"key{number}: [{number}, " for number in range(200_000)), "", ""),
    ],
    ids=lambda value: repr(value[:24]) if isinstance(value, str) else None,
)
def test_a_wrong_file_is_told_with_its_place(tmp_path: Path, text: str, place: str, words: str) -> None:
    (tmp_path / "fan.yaml").write_bytes(text.encode())
    said = modes(tmp_path, "fan.yaml", "--archive", "runs")
    assert re.match(r"(error: )?fan\.yaml", said), said
    assert f"fan.yaml:{place}" in said, said
    assert words in said, said
    assert len(said) < 60_000
    assert sorted(path.name for path in tmp_path.iterdir()) == ["fan.yaml"]


def test_all_faults_of_a_file_come_at_once(tmp_path: Path) -> None:
    (tmp_path / "fan.yaml").write_text(changed("1 kN/mm", "1 kN/kg").replace("50 N*s/m", "50 N").replace("100 kg", "x"))
    said = modes(tmp_path, "fan.yaml")
    for path in ("bodies.fan.mass:", "connections.mount.stiffness:", "connections.mount.damping:"):
        assert path in said
    # The offending line is shown.
    assert "mount: {between: [fan, ground], stiffness: 1 kN/kg" in said


@pytest.mark.parametrize(("name", "words"), [("folder.yaml", "folder"), ("fam.yaml", "fan.yaml")])
def test_what_is_no_file(tmp_path: Path, name: str, words: str) -> None:
    (tmp_path / "folder.yaml").mkdir()
    (tmp_path / "fan.yaml").write_text(GOOD)
    said = modes(tmp_path, name)
    assert name in said
    assert words in said


@pytest.mark.parametrize("place", ["taken", "taken/below", "locked/runs"])
def test_an_archive_folder_that_cannot_be_written(tmp_path: Path, place: str) -> None:
    (tmp_path / "fan.yaml").write_text(GOOD)
    (tmp_path / "taken").write_text("a file")
    (tmp_path / "locked").mkdir(mode=0o500)
    if place.startswith("locked") and os.access(tmp_path / "locked", os.W_OK):
        place = "/proc/runs" if Path("/proc").exists() else "taken"  # nobody locks root out of a folder of its own
    said = modes(tmp_path, "fan.yaml", "--archive", place)
    assert place.split("/")[0] in said or place in said
    assert sorted(path.name for path in tmp_path.iterdir()) == ["fan.yaml", "locked", "taken"]
    assert (tmp_path / "taken").read_text() == "a file"


def test_an_indefinite_stiffness_is_an_answer_and_not_an_error(tmp_path: Path) -> None:
    (tmp_path / "fan.yaml").write_text(changed("1 kN/mm", "-1 kN/mm"))
    assert "divergent-mode" in modes(tmp_path, "fan.yaml", status=0)


def test_numbers_that_cannot_be_verified_end_with_status_3(tmp_path: Path) -> None:
    """Two springs that cancel to the last digit: what is left of them is rounding, and no frequency can be quoted."""
    (tmp_path / "fan.yaml").write_text(
        GOOD.replace("100 kg", "100 kg\n  rotor: 10 kg")
        + "  pull: {between: [fan, rotor], stiffness: -999.9999999999 kN/mm}\n"
        + "  push: {between: [fan, rotor], stiffness: 1000 kN/mm}\n"
    )
    said = modes(tmp_path, "fan.yaml", "--archive", "runs", status=3)
    assert "rounding" in said
    assert not (tmp_path / "runs").exists()
