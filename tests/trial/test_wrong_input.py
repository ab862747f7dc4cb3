"""What wrong input gets: status 2, the place, what is wrong and what to write; never a traceback, nothing written."""

from __future__ import annotations

import os
import re
import subprocess
import sys
from pathlib import Path

import pytest

from mdof.cli import main

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


def changed(old: str, new: str, text: str = GOOD) -> str:
    assert old in text
    return text.replace(old, new)


#: A body with six directions on a foot off its centre, and a state.
SPATIAL = """\
directions: [x, y, z, rx, ry, rz]
bodies:
  fan: {mass: 100 kg, centre: [0 m, 0 m, 1 m], inertia: [4 kg*m^2, 5 kg*m^2, 6 kg*m^2]}
connections:
  mount: {between: [fan, ground], at: [0 m, 0 m, 0 m], stiffness: {x: 1 kN/mm, z: 2 kN/mm}}
states:
  full: {bodies: {fan: {mass: 140 kg}}}
"""


def spatial(old: str, new: str) -> str:
    return changed(old, new, SPATIAL)


@pytest.mark.parametrize("text", [GOOD, SPATIAL])
def test_the_models_that_faults_are_put_into_are_good(tmp_path: Path, text: str) -> None:
    (tmp_path / "fan.yaml").write_text(text)
    modes(tmp_path, "fan.yaml", status=0)


@pytest.mark.parametrize(
    ("text", "place", "words"),
    [
        (changed("1 kN/mm", "1e5x N/m"), "5:46: connections.mount.stiffness:", "not a unit"),
        (changed("1 kN/mm", "1 kN*mm"), "5:46: connections.mount.stiffness:", "N/m"),
        (changed("1 kN/mm", "1 kN/mn"), "5:46: connections.mount.stiffness:", "write mm for a length"),
        (changed("1 kN/mm", "1 kN s/m"), "5:46: connections.mount.stiffness:", "such as kN*s/m"),
        (changed("ground", "floor"), "5:", "what never moves is `ground`"),
        (
            changed("[fan, ground]", "[fan, fixed_base]"),
            "5:26: connections.mount.between.1:",
            "what never moves is `ground`",
        ),
        (changed("fan: 100 kg", "fan: {mass:100 kg}"), "3:", "put a blank after the colon: `mass: 100 kg`"),
        (
            changed("fan: 100 kg", "fan:\n    mass:100 kg"),
            "4:5: bodies.fan",
            "put a blank after the colon: `mass: 100 kg`",
        ),
        (
            changed("fan: 100 kg", "fan:\n    mass:100 kg\n    centre: [0 m, 0 m, 0 m]"),
            "4:5:",
            "put a blank after the colon: `mass: 100 kg`",
        ),
        (
            changed("1 kN/mm", "0,5 kN/mm"),
            "5:46: connections.mount.stiffness:",
            "write stiffness: 0.5 kN/mm, with a decimal",
        ),
        (changed("fan: 100 kg", "fan: 0,5 kg"), "3:8: bodies.fan", "write 0.5 kg, with a decimal point"),
        (
            spatial("inertia: [4 kg*m^2, 5 kg*m^2, 6 kg*m^2]", "inertia: [4, 5, 6]"),
            "3:57: bodies.fan.inertia:",
            "write [4 kg*m^2",
        ),
        (spatial(", 6 kg*m^2]", "]"), "3:57: bodies.fan.inertia:", "three, xx, yy and zz"),
        (
            spatial("[4 kg*m^2, 5 kg*m^2, 6 kg*m^2]", "{xx: 4 kg*m^2, zz: 6 kg*m^2}"),
            "3:57: bodies.fan.inertia:",
            "lacks yy",
        ),
        (GOOD + "criteria: {least_damping_ratio: 5}\n", "6:33: criteria.least_damping_ratio:", "write 0.05 or 5 %"),
        (changed("damping: 50 N*s/m", "damping_ratio: 5 %"), "5:", "`loss_factor`, twice the damping ratio"),
        (spatial("[0 m, 0 m, 1 m]", "[0 m, 0 m, 1,5 m]"), "3:", "decimal points and not commas"),
        (spatial("at: [0 m, 0 m, 0 m]", "at: [0, 0, 1 m]"), "5:", "write [0 m, 0 m, 1 m], or add `length: m`"),
        (
            spatial(", inertia: [4 kg*m^2, 5 kg*m^2, 6 kg*m^2]", ""),
            "3:",
            "`inertia: {xx: .., yy: .., zz: ..}`, each a mass moment",
        ),
        (changed("1 kN/mm", ".nan"), "5:46: connections.mount.stiffness:", "finite"),
        (changed("1 kN/mm", ".inf"), "5:46: connections.mount.stiffness:", "finite"),
        (changed("1 kN/mm", "010"), "5:46: connections.mount.stiffness:", "octal"),
        (changed("1 kN/mm", "1:30"), "5:46: connections.mount.stiffness:", "base-60"),
        (changed("1 kN/mm", "1e5"), "5:46: connections.mount.stiffness:", "1.0e+5"),
        (changed("1 kN/mm", "-.INF"), "5:46: connections.mount.stiffness:", "finite"),
        (changed("1 kN/mm", "0x10"), "5:46: connections.mount.stiffness:", "hexadecimal"),
        (changed("1 kN/mm", "1_000"), "5:46: connections.mount.stiffness:", "1000"),
        (changed("1 kN/mm", "12"), "5:46: connections.mount.stiffness:", "N/m"),
        (changed("1 kN/mm", "1 kg"), "5:46: connections.mount.stiffness:", "N/m"),
        (changed("1 kN/mm", "1 lb/in"), "5:46: connections.mount.stiffness:", "lbf/in"),
        (changed("1 kN/mm", "null"), "5:46: connections.mount.stiffness:", "no value"),
        (changed("1 kN/mm", "true"), "5:46: connections.mount.stiffness:", "a number belongs"),
        (changed("1 kN/mm", "[1 kN/mm]"), "5:46: connections.mount.stiffness:", "a list"),
        (changed("100 kg", "{massless: on}"), "3:19: bodies.fan.massless:", "true or false"),
        (changed("100 kg", "{massless: off}"), "3:19: bodies.fan.massless:", "true or false"),
        (changed("  fan:", "  no:"), "3:3: bodies.no:", "quotes"),
        (changed("100 kg", "240 lbf"), "3:8: bodies.fan", "weight"),
        (changed("100 kg", "0 kg"), "3:8: bodies.fan", "massless: true"),
        (changed("bodies:", "bodys:"), "2:1: bodys:", "`bodies`"),
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
        (spatial("at: [0 m, 0 m, 0 m]", "at: [0, 0 m, 0 m]"), "5:40: connections.mount.at.0:", "unit"),
        (spatial("inertia: [4", "inertia: [14"), "3:57: bodies.fan.inertia:", "no real body"),
        (spatial(", inertia: [4 kg*m^2, 5 kg*m^2, 6 kg*m^2]", ""), "3:3: bodies.fan:", "no inertia"),
        (
            spatial("stiffness: {x: 1 kN/mm, z: 2 kN/mm}", "axis: [0, 0, 0], stiffness: 1 kN/mm"),
            "5:62: connections.mount.axis:",
            "zero",
        ),
        (
            spatial("at: [0 m, 0 m, 0 m]", "ends: [[0 m, 0 m, 0 m], [0 m, 0 m, 0 m]]"),
            "5:41: connections.mount.ends:",
            "same point",
        ),
        (spatial("stiffness: {x: 1 kN/mm, z: 2 kN/mm}", "uses: rubber"), "5:62: connections.mount.uses:", "`rubber`"),
        (spatial("{x: 1", "{q: 1"), "5:68: connections.mount.stiffness.q:", "rx, ry, rz"),
        (spatial("{x: 1 kN/mm, z: 2 kN/mm}", "1 kN/mm"), "5:67: connections.mount.stiffness:", "{x: 1 kN/mm"),
        (spatial("z: 2 kN/mm", "rx: 2 kN/mm"), "5:84: connections.mount.stiffness.rx:", "N*m"),
        (spatial("rz]", "rw]"), "1:31: directions.5:", "rx, ry, rz"),
        (spatial("full: {bodies: {fan:", "full: {bodies: {fam:"), "7:19: states.full.bodies.fam:", "`fan`"),
        (spatial("full: {bodies", "full: {from: half, bodies"), "7:16: states.full.from:", "`half`"),
        (
            spatial("full: {bodies: {fan: {mass: 140 kg}}}", "full: {scale: {bodies.fan.mas: 2}}"),
            "7:18: states.full.scale.bodies.fan.mas:",
            "`bodies.fan.mass`",
        ),
        ("", "1:1:", "empty"),
        ("# nothing but a comment\n", "1:1:", "empty"),
        ("- 1\n- 2\n", "1:1:", "mapping"),
        ("a: " + "[" * 3000, "1:", "nested"),
        ("a: &a [1, 1]\nb: &b [*a, *a]\nc: &c [*b, *b]\nd: [*c, *c]\n", "1:4:", "anchor"),
        ("\x00\x01\x02PNG", "", "not a text file"),
        ("x" * 10_000_000, "", "MB"),
        ("\n".join(f"key{number}: [{number}, " for number in range(200_000)), "13:1:", "nested"),
        ("".join(f"{' ' * depth}a:\n" for depth in range(2000)), "", "nested"),
    ],
    ids=lambda value: repr(value[:24]) if isinstance(value, str) else None,
)
def test_a_wrong_file_is_told_with_its_place(
    tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
    capfd: pytest.CaptureFixture[str],
    text: str,
    place: str,
    words: str,
) -> None:
    (tmp_path / "fan.yaml").write_bytes(text.encode())
    monkeypatch.chdir(tmp_path)
    assert main(["modes", "fan.yaml", "--archive", "runs"]) == 2
    shown, said = capfd.readouterr()
    assert shown == ""
    assert f"fan.yaml:{place}" in said, said
    assert words in said, said
    # Everything said is placed, or shows the line that the place above is in.
    assert all(re.match(r"fan\.yaml:| {4}|and \d+ more", line) for line in said.splitlines()), said
    assert len(said) < 60_000
    assert sorted(path.name for path in tmp_path.iterdir()) == ["fan.yaml"]


def test_all_faults_of_a_file_come_at_once(tmp_path: Path) -> None:
    (tmp_path / "fan.yaml").write_text(changed("1 kN/mm", "1 kN/kg").replace("50 N*s/m", "50 N").replace("100 kg", "x"))
    said = modes(tmp_path, "fan.yaml")
    for path in ("bodies.fan.mass:", "connections.mount.stiffness:", "connections.mount.damping:"):
        assert path in said
    # The offending line is shown.
    assert "mount: {between: [fan, ground], stiffness: 1 kN/kg" in said


@pytest.mark.parametrize(
    ("text", "words"),
    [
        (changed("bodies", "bodys"), "did you mean `bodies`?"),
        (changed("connections", "conections"), "did you mean `connections`?"),
        ("unit: SI\n" + changed("100 kg", "100"), "did you mean `units`?"),
        (SPATIAL.replace("directions:", "direction:"), "did you mean `directions`?"),
        (changed("100 kg", "{massless: off}"), "write true or false"),
        (changed("1 kN/mm", "0,5 kN/mm"), "with a decimal point"),
        (changed("damping: 50 N*s/m", "loss_factor: 0,05"), "write loss_factor: 0.05, with a decimal point"),
        (spatial("at: [0 m, 0 m, 0 m]", "at: [0, 0, 1 m]"), "2 of three numbers have no unit"),
        (spatial("inertia: [4 kg*m^2, 5 kg*m^2, 6 kg*m^2]", "inertia: [4, 5, 6]"), "3 of three numbers have no unit"),
        (changed("[fan, ground]", "[fan, floor]"), "what never moves is `ground`"),
    ],
    ids=lambda value: repr(value[:30]),
)
def test_one_slip_is_one_complaint(tmp_path: Path, text: str, words: str) -> None:
    (tmp_path / "fan.yaml").write_text(text)
    said = modes(tmp_path, "fan.yaml")
    assert words in said
    assert said.count("fan.yaml:") == 1, said


@pytest.mark.parametrize("name", ["motor.yaml", "other.yml", "f.yaml"])
def test_a_file_with_another_name_is_not_suggested(tmp_path: Path, name: str) -> None:
    for other in ("fan_budget.yaml", "a.yaml", "fan.txt"):
        (tmp_path / other).write_text(GOOD)
    assert "did you mean" not in modes(tmp_path, name)


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
