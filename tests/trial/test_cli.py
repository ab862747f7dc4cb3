"""The command line as a user meets it: separate processes, statuses, streams, formats, widths, broken pipes."""

from __future__ import annotations

import csv
import gc
import io
import json
import os
import signal
import subprocess
import sys
import time
from pathlib import Path
from typing import Any

import jsonschema
import pytest

import mdof
from mdof.cli.session import Session

ROOT = Path(__file__).parents[2]
MODELS = ROOT / "models"
SCHEMAS = Path(mdof.__file__).parent / "schemas"
SKID, TWO, UNSTABLE = (str(MODELS / f"{name}.yaml") for name in ("firewater_skid", "two_mass", "one_unstable"))


def run(*words: str, cwd: Path | None = None, **variables: str) -> subprocess.CompletedProcess[bytes]:
    """One call of the program in a process of its own, its output going into pipes."""
    kept = {name: value for name, value in os.environ.items() if name not in ("COLUMNS", "NO_COLOR", "FORCE_COLOR")}
    command = [sys.executable, "-m", "mdof.cli", *words]
    return subprocess.run(command, capture_output=True, cwd=cwd, env={**kept, **variables}, timeout=120, check=False)


def text(stream: bytes) -> str:
    return stream.decode("utf-8")


def schema(name: str) -> Any:
    loaded = json.loads((SCHEMAS / f"{name}.json").read_text(encoding="utf-8"))
    jsonschema.Draft202012Validator.check_schema(loaded)
    return loaded


def objects(stream: bytes, name: str) -> list[Any]:
    """The lines of a JSON answer, each valid against its schema and free of NaN."""

    def refuse(word: str) -> None:
        raise AssertionError(f"{word} is no JSON")

    lines = [json.loads(line, parse_constant=refuse) for line in stream.splitlines()]
    for line in lines:
        jsonschema.validate(line, schema(name), cls=jsonschema.Draft202012Validator)
    return lines


def test_the_main_job_from_file_to_archive(tmp_path: Path) -> None:
    done = run("modes", SKID, "--archive", "runs", "--figure", "skid.svg", cwd=tmp_path)
    assert done.returncode == 0, text(done.stderr)
    table, remarks = text(done.stdout), text(done.stderr)
    assert table.startswith("Diesel fire-water pump skid")
    assert "matched at 12 Hz" in table
    assert "96 of 96 eigenvalues" in table
    assert len([line for line in table.splitlines() if "underdamped" in line or "overdamped" in line]) == 48
    assert "non-proportional-damping" in remarks
    assert "qualified engineer" in remarks
    (archived,) = (tmp_path / "runs").iterdir()
    assert f"archived {Path('runs') / archived.name}" in remarks
    assert sorted(path.name for path in tmp_path.iterdir()) == ["runs", "skid.svg"]

    shown = run("archive", "show", str(archived))
    assert shown.returncode == 0
    # The archived table is the printed one, line by line.
    assert text(shown.stdout).splitlines()[:55] == table.splitlines()[:55]
    assert "(verified)" in text(shown.stdout)
    source = run("archive", "show", str(archived), "--source")
    assert source.stdout == Path(SKID).read_bytes()
    (line,) = objects(run("archive", "show", str(archived), "--format", "json").stdout, "archive-show")
    assert line["results"]["command_line"][:2] == ["mdof", "modes"]
    (line,) = objects(run("archive", "list", str(archived.parent), "--format", "json").stdout, "archive-list")
    assert line["results"]["run"] == archived.name

    content = bytearray(archived.read_bytes())
    content[-1] ^= 1
    archived.write_bytes(content)
    for words in (("show", str(archived)), ("list", str(archived.parent))):
        spoilt = run("archive", *words)
        assert spoilt.returncode == 4
        assert "SHA-256" in text(spoilt.stderr)


@pytest.mark.parametrize("path", sorted(MODELS.glob("*.yaml")), ids=lambda path: path.stem)
def test_every_demo_model_in_every_state_as_json(path: Path) -> None:
    done = run("modes", str(path), "--state", "all", "--format", "json")
    assert done.returncode == 0, text(done.stderr)
    lines = objects(done.stdout, "modes")
    assert [line["state"] for line in lines] == [None, *mdof.load(path).state_names]
    for line in lines:
        found = line["verification"]
        assert found["eigenvalues_found"] == found["eigenvalues_expected"]
        assert sum(len(mode["eigenvalues"]) for mode in line["modes"]) == found["eigenvalues_found"]
    checked = run("check", str(path), "--state", "all", "--format", "json")
    assert checked.returncode == 0
    assert [line["results"]["degrees_of_freedom"] for line in objects(checked.stdout, "check")] == [
        line["degrees_of_freedom"] for line in lines
    ]


def test_csv_is_one_table_with_units() -> None:
    done = run("modes", TWO, SKID, "--format", "csv")
    content = done.stdout.decode("utf-8")
    assert content.count("\r\n") == content.count("\n")
    rows = list(csv.reader(io.StringIO(content, newline="")))
    assert all(heading.endswith("]") and "[" in heading for heading in rows[0])
    assert {len(row) for row in rows} == {len(rows[0])}
    assert len(rows) == 1 + 2 + 48
    (lines,) = ([line["modes"] for line in objects(run("modes", SKID, "--format", "json").stdout, "modes")],)
    for row, mode in zip(rows[3:], lines[0], strict=True):
        assert float(row[rows[0].index("natural frequency [Hz]")]) == mode["natural_frequency_hz"]
        assert float(row[rows[0].index("damping ratio [1]")]) == mode["damping_ratio"]


def test_a_failing_model_does_not_hide_the_others(tmp_path: Path) -> None:
    done = run("modes", "nosuch.yaml", TWO, str(tmp_path), UNSTABLE, "--format", "json")
    assert done.returncode == 2
    assert [line["model"]["file"] for line in objects(done.stdout, "modes")] == [TWO, UNSTABLE]
    assert "nosuch.yaml" in text(done.stderr)
    assert "Traceback" not in text(done.stderr)


def test_screening_statuses_and_lines() -> None:
    passed = run("screen", TWO, "--least-damping-ratio", "0.5%")
    assert passed.returncode == 0
    assert text(passed.stdout).startswith("pass ")
    failed = run("screen", TWO, UNSTABLE, "--least-damping-ratio", "0.05", "--below", "20 Hz")
    assert failed.returncode == 1
    first, second = text(failed.stdout).splitlines()
    assert first.startswith("pass ")  # the weakly damped mode lies above 20 Hz
    assert second.startswith("FAIL ")
    assert "mode 1 unstable" in second
    assert "unstable-mode" in text(failed.stderr)
    lines = objects(run("screen", SKID, "--state", "all", "--format", "json").stdout, "screen")
    assert len(lines) == 7
    assert lines[0]["results"]["below_hz"] == pytest.approx(30)  # from the criteria of the model
    assert [mode["number"] for mode in lines[0]["results"]["failing"]] == [6]


def test_a_model_without_limit_is_not_judged(tmp_path: Path) -> None:
    path = tmp_path / "free.yaml"
    path.write_text("units: SI\nbodies: {a: 1}\nconnections: {s: {between: [a, ground], stiffness: 9}}\n")
    done = run("screen", str(path))
    assert (done.returncode, done.stdout) == (2, b"")
    assert "--least-damping-ratio" in text(done.stderr)


@pytest.mark.parametrize(
    ("words", "advice"),
    [
        (["modees", TWO], "did you mean modes?"),
        (["modes", TWO, "--formt", "json"], "--format"),
        (["modes", TWO, "--format", "jsn"], "did you mean json?"),
        (["modes"], "MODEL"),
        (["check"], "MODEL"),
        (["modes", TWO, "--state", "stif_foot"], "stiff_foot"),
        (["screen", TWO, "--below", "60"], "60 Hz"),
        (["screen", TWO, "--below", "-3 Hz"], "not above zero"),
        (["screen", TWO, "--below", "3 kg"], "frequency"),
        (["screen", TWO, "--least-damping-ratio", "5"], "5%"),
        (["screen", TWO, "--least-damping-ratio", "nan"], "0.05"),
        (["modes", TWO, "--figure", "x.jpg"], ".png"),
        (["modes", TWO, SKID, "--figure", "x.png"], ".pdf"),
        (["modes", TWO, "--figure", "nowhere/x.png"], "no folder"),
        (["modes", TWO, "--archive", os.devnull], "cannot be written"),
        (["modes", TWO, "--archive", f"{TWO}/runs"], "not a folder"),
        (["archive", "show", "nosuch"], "no such run"),
        (["archive", "list", "nosuch"], "not a folder"),
        (["archive", "lst"], "list"),
        (["manual", "modez"], "did you mean modes?"),
    ],
    ids=" ".join,
)
def test_wrong_usage_gives_advice_and_writes_nothing(tmp_path: Path, words: list[str], advice: str) -> None:
    done = run(*words, cwd=tmp_path)
    assert done.returncode == 2
    assert advice in text(done.stderr)
    assert "Traceback" not in text(done.stderr)
    assert done.stdout == b""
    assert list(tmp_path.iterdir()) == []


def test_pipes_get_plain_text_of_any_width_and_terminals_their_own() -> None:
    plain = text(run("modes", SKID).stdout)
    assert "\x1b" not in plain
    assert "…" not in plain
    for columns in (160, 80, 50):
        shown = run("modes", SKID, "--state", "tie_rods_tight", COLUMNS=str(columns))
        assert max(map(len, text(shown.stdout).splitlines())) <= columns
        assert max(map(len, text(shown.stderr).splitlines())) <= columns


@pytest.mark.skipif(sys.platform == "win32", reason="pseudo-terminals are a POSIX matter")
@pytest.mark.parametrize(("variables", "coloured"), [({}, True), ({"NO_COLOR": "1"}, False), ({"TERM": "dumb"}, False)])
def test_a_terminal_gets_colours_unless_told_not_to(variables: dict[str, str], coloured: bool) -> None:
    import pty

    leader, follower = pty.openpty()
    kept = {name: value for name, value in os.environ.items() if name not in ("NO_COLOR", "FORCE_COLOR", "COLUMNS")}
    process = subprocess.Popen(
        [sys.executable, "-m", "mdof.cli", "modes", TWO],
        stdout=follower,
        stderr=subprocess.DEVNULL,
        env={**kept, "TERM": "xterm-256color", **variables},
    )
    os.close(follower)
    shown = b""
    while True:
        try:
            part = os.read(leader, 65536)
        except OSError:  # the terminal's other end is closed
            break
        if not part:
            break
        shown += part
    os.close(leader)
    assert process.wait(timeout=60) == 0
    assert (b"\x1b[" in shown) == coloured
    assert b"Pump on a base frame" in shown


def test_a_terminal_without_unicode_is_served_too() -> None:
    done = run("modes", str(MODELS / "one_rigid_body.yaml"), PYTHONIOENCODING="ascii", PYTHONUTF8="0")
    assert done.returncode == 0
    assert done.stdout.decode("ascii").count(" - ") >= 1
    assert "Traceback" not in text(done.stderr)


@pytest.mark.skipif(sys.platform == "win32", reason="the shell of this test is POSIX")
def test_a_reader_that_leaves_early_changes_nothing(tmp_path: Path) -> None:
    script = f'{{ "{sys.executable}" -m mdof.cli modes "{SKID}" --archive runs; echo $? >status; }} | head -n 1'
    done = subprocess.run(["sh", "-c", script], capture_output=True, cwd=tmp_path, timeout=120, check=False)
    assert len(done.stdout.splitlines()) == 1
    assert (tmp_path / "status").read_text().strip() == "0"
    assert len(list((tmp_path / "runs").iterdir())) == 1
    for word in (b"Traceback", b"Broken", b"Exception"):
        assert word not in done.stderr


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="needs the full device of Linux")
def test_a_full_disk_behind_standard_output_is_an_error_without_traceback() -> None:
    with open("/dev/full", "wb") as full:
        done = subprocess.run(
            [sys.executable, "-m", "mdof.cli", "modes", TWO],
            stdout=full,
            stderr=subprocess.PIPE,
            timeout=60,
            check=False,
        )
    assert done.returncode == 2
    assert b"standard output cannot be written" in done.stderr
    assert b"Traceback" not in done.stderr


@pytest.mark.skipif(sys.platform == "win32", reason="interrupts are sent differently there")
def test_an_interrupt_ends_with_130_and_leaves_nothing(tmp_path: Path) -> None:
    command = [sys.executable, "-m", "mdof.cli", "modes", *[SKID] * 300, "--archive", "runs"]
    process = subprocess.Popen(
        command,
        cwd=tmp_path,
        stdout=subprocess.DEVNULL,
        stderr=subprocess.PIPE,
        # A job in the background is started with interrupts ignored.
        preexec_fn=lambda: signal.signal(signal.SIGINT, signal.SIG_DFL),
    )
    while process.poll() is None and not list(tmp_path.glob("runs/*.h5")):
        time.sleep(0.01)
    process.send_signal(signal.SIGINT)
    _, remarks = process.communicate(timeout=60)
    assert process.returncode == 130
    assert b"Traceback" not in remarks
    runs = tmp_path / "runs"
    assert not runs.exists() or all(path.suffix == ".h5" and path.name[0] != "." for path in runs.iterdir())


@pytest.mark.parametrize(
    ("content", "place"),
    [
        (b"", "empty.yaml"),
        (b"\x00\x01\x02\xff" * 100, "binary.yaml"),
        (b"{" * 5000, "deep.yaml"),
        (b"bodies: {m1: 10 kg}\nconnections: {s: {between: [m1, grund], stiffness: 1 kN/m}}\n", "typo.yaml:2:"),
    ],
)
def test_bad_files_are_placed_errors(tmp_path: Path, content: bytes, place: str) -> None:
    name = place.split(":")[0]
    (tmp_path / name).write_bytes(content)
    for command in ("check", "modes", "screen"):
        done = run(command, name, cwd=tmp_path)
        assert (done.returncode, done.stdout) == (2, b""), text(done.stderr)
        assert place in text(done.stderr)
        assert "Traceback" not in text(done.stderr)


def test_the_schema_of_model_files_is_printed_and_fits_the_demo() -> None:
    done = run("check", "--schema")
    assert done.returncode == 0
    jsonschema.validators.validator_for(json.loads(done.stdout)).check_schema(json.loads(done.stdout))
    assert run("check", "--schema", TWO).returncode == 2


def test_help_and_version_load_nothing_heavy() -> None:
    assert text(run("--version").stdout) == f"mdof {mdof.__version__}\n"
    code = (
        "import sys; from mdof.cli import main; status = main(['--help']); "
        "heavy = {'numpy', 'scipy', 'pydantic', 'rich', 'pint', 'yaml', 'h5py', 'networkx'} & set(sys.modules); "
        "sys.exit(f'loaded {heavy}' if heavy else status)"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, timeout=60, check=False)
    assert (done.returncode, done.stderr) == (0, b"")


def test_the_main_job_loads_no_more_than_it_needs(tmp_path: Path) -> None:
    code = (
        "import sys; from mdof.cli import main; "
        f"status = main(['modes', {SKID!r}, '--archive', {str(tmp_path)!r}]); "
        "extra = {'matplotlib', 'scipy.optimize', 'jinja2', 'dask'} & set(sys.modules); "
        "sys.exit(f'loaded {extra}' if extra else status)"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, timeout=60, check=False)
    assert done.returncode == 0, done.stderr[-300:]


def test_loading_leaves_the_collector_as_it_was(monkeypatch: pytest.MonkeyPatch) -> None:
    states: list[bool] = []
    monkeypatch.setattr("mdof.cli.session.import_module", lambda _: states.append(gc.isenabled()))
    assert gc.isenabled()
    Session(["mdof"]).load("one", "two")
    assert (states, gc.isenabled()) == ([False, False], True)
    gc.disable()
    try:
        Session(["mdof"]).load("one")
        assert not gc.isenabled()
    finally:
        gc.enable()


def test_archiving_is_quick(tmp_path: Path) -> None:
    from mdof.archive.run import write_run

    model = mdof.load(SKID)
    modes = mdof.solve(mdof.assemble(model))
    spent = []
    for _ in range(5):
        start = time.perf_counter()
        write_run(tmp_path, model, modes)
        spent.append(time.perf_counter() - start)
    assert min(spent) < 0.2  # a few hundredths of a second on any machine; the bound only catches a blunder


def test_the_example_script_screens_a_folder(tmp_path: Path) -> None:
    done = subprocess.run(
        [sys.executable, str(ROOT / "scripts" / "screen_folder.py"), str(MODELS), "0.01"],
        capture_output=True,
        cwd=tmp_path,
        timeout=120,
        check=False,
    )
    assert done.returncode == 1, text(done.stderr)
    lines = {line.split()[1]: line.split()[0] for line in text(done.stdout).splitlines()}
    assert lines["one_unstable.yaml"] == "FAIL"
    assert lines["firewater_skid.yaml"] == "pass"
    assert lines["one_rigid_body.yaml"] == "none"
    assert len(lines) == len(list(MODELS.glob("*.yaml")))
    assert len((ROOT / "scripts" / "screen_folder.py").read_text().splitlines()) < 30


def test_several_runs_are_shown_and_a_damaged_one_is_named(tmp_path: Path) -> None:
    assert run("modes", str(MODELS / "two_mass.yaml"), "--archive", ".", cwd=tmp_path).returncode == 0
    assert run("modes", str(MODELS / "one_undamped.yaml"), "--archive", ".", cwd=tmp_path).returncode == 0
    (tmp_path / "broken.h5").write_bytes(b"no run at all")
    names = sorted(path.name for path in tmp_path.iterdir())
    shown = text(run("archive", "show", *names, cwd=tmp_path).stdout)
    assert all(name in shown for name in names if name != "broken.h5")
    done = run("archive", "show", *names, "--format", "json", cwd=tmp_path)
    assert done.returncode == 4
    assert len(objects(done.stdout, "archive-show")) == 2
    assert "broken.h5" in text(done.stderr)


def test_the_json_tells_who_moves_and_who_dissipates_and_the_archive_repeats_it(tmp_path: Path) -> None:
    (line,) = objects(run("modes", SKID, "--format", "json", "--archive", "runs", cwd=tmp_path).stdout, "modes")
    bodies = set(mdof.load(SKID).bodies)
    for mode in line["modes"]:
        assert sum(mode["kinetic_energy"].values()) == pytest.approx(1, abs=1e-12)
        assert set(mode["kinetic_energy"]) <= bodies
        assert max(mode["kinetic_energy"].items(), key=lambda item: item[1])[0] == mode["moves_most"]["body"]
        assert sum(mode["dissipated_energy"].values()) == pytest.approx(1, abs=1e-12)
        assert mode["time_to_two_percent"] > 0
        assert mode["undamped_frequency_hz"] > 0
    bounce = min(line["modes"], key=lambda mode: abs(mode["natural_frequency_hz"] - 12.04))
    assert bounce["shortcut_damping_ratio"] == pytest.approx(0.323, abs=0.001)
    assert bounce["moves_most"] == {"body": "engine", "direction": "z"}
    (archived,) = (tmp_path / "runs").iterdir()
    (again,) = objects(run("archive", "show", str(archived), "--format", "json").stdout, "archive-show")
    told = [{key: value for key, value in mode.items() if key != "frequency_bound"} for mode in line["modes"]]
    assert again["results"]["modes"] == told


def test_shares_of_nothing_are_null() -> None:
    names = ("one_undamped", "one_rigid_body", "one_relaxation")
    files = [str(MODELS / f"{name}.yaml") for name in names]
    lines = objects(run("modes", *files, "--format", "json").stdout, "modes")
    undamped, free, relaxing = (line["modes"][-1] for line in lines)
    assert undamped["dissipated_energy"] is None
    assert undamped["kinetic_energy"] == {undamped["moves_most"]["body"]: 1.0}
    assert (free["damping_ratio"], free["shortcut_damping_ratio"], free["time_to_two_percent"]) == (None, None, None)
    assert relaxing["dissipated_energy"] is not None


def test_a_screen_that_judges_nothing_is_no_pass() -> None:
    words = ("screen", SKID, str(MODELS / "one_rigid_body.yaml"), "--below", "1Hz", "--least-damping-ratio", "5%")
    done = run(*words)
    assert done.returncode == 0
    skid, free = text(done.stdout).splitlines()
    assert skid == f"none  {SKID}  no mode judged: none below 1.000 Hz; the lowest is at 2.385 Hz"
    assert free.endswith("no mode judged: none vibrates")
    assert text(done.stderr).count("no mode was judged, which is no pass") == 2
    lines = objects(run(*words, "--format", "json").stdout, "screen")
    assert [(line["results"]["passed"], line["results"]["judged"]) for line in lines] == [(None, 0), (None, 0)]
    # One that fails is not excused by one that is not judged.
    assert run(*words[:2], UNSTABLE, *words[3:]).returncode == 1


def test_the_proof_of_the_json_keeps_its_schema() -> None:
    pytest.importorskip("flint", reason="python-flint is not installed: pip install python-flint")
    (line,) = objects(run("modes", SKID, "--certify", "--format", "json").stdout, "modes")
    assert line["proof"]["proven"] == 48
