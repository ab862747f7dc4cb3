"""The manual, the help texts and the commands agree."""

from __future__ import annotations

import json
import math
import re
from importlib import import_module
from pathlib import Path
from typing import Any

import click
import pytest

import mdof
from mdof.cli import main
from mdof.cli.app import COMMANDS
from mdof.findings import REGISTRY
from mdof.modes.regime import Regime

PAGES = sorted((Path(mdof.__file__).parent / "manual").glob("*.md"))
ALL = "\n".join(page.read_text(encoding="utf-8") for page in PAGES)


def command(name: str) -> click.Command:
    found = getattr(import_module(COMMANDS[name][0]), name)
    assert isinstance(found, click.Command)
    return found


def leaves() -> dict[str, click.Command]:
    """Every command that does something, by its full name."""
    found: dict[str, click.Command] = {}
    for name in COMMANDS:
        item = command(name)
        if isinstance(item, click.Group):
            found |= {f"{name} {sub}": child for sub, child in item.commands.items()}
        else:
            found[name] = item
    return found


@pytest.mark.parametrize("name", COMMANDS)
def test_the_line_in_the_help_is_the_command_s_own(name: str) -> None:
    assert command(name).short_help == COMMANDS[name][1]


@pytest.mark.parametrize("name", leaves())
def test_every_option_has_a_help_text(name: str) -> None:
    for parameter in leaves()[name].params:
        if isinstance(parameter, click.Option):
            assert parameter.help, parameter.name


def test_every_command_is_in_the_manual() -> None:
    for name in leaves():
        assert f"mdof {name}" in ALL, name


def test_every_call_in_the_manual_exists() -> None:
    """Calls are indented lines; their options must be options of the command."""
    calls = re.findall(r"^    mdof ((?:archive )?[a-z]+)(.*)$", ALL, flags=re.MULTILINE)
    assert len(calls) >= 6
    for name, rest in calls:
        known = {word for parameter in leaves()[name].params for word in parameter.opts}
        for option in re.findall(r"--[a-z-]+", rest):
            assert option in known, f"mdof {name} {option}"


def test_every_option_of_an_analysis_is_explained() -> None:
    for name in ("check", "modes", "screen"):
        for parameter in command(name).params:
            if isinstance(parameter, click.Option):
                assert any(option in ALL for option in parameter.opts), f"{name} {parameter.opts}"


@pytest.mark.parametrize("page", PAGES, ids=lambda page: page.stem)
def test_a_page_is_printed_as_it_is(page: Path, capfdbinary: pytest.CaptureFixture[bytes]) -> None:
    assert main(["manual", page.stem]) == 0
    assert capfdbinary.readouterr().out == page.read_bytes()


def test_the_list_names_every_page(capfd: pytest.CaptureFixture[str]) -> None:
    assert main(["manual"]) == 0
    shown = capfd.readouterr().out
    assert all(page.stem in shown for page in PAGES)


def test_pages_named_in_texts_exist() -> None:
    readme = (Path(__file__).parents[2] / "README.md").read_text(encoding="utf-8")
    named = set(re.findall(r"mdof manual\s+([a-z-]+)", ALL + readme)) - {"lists"}
    assert named
    assert named <= {page.stem for page in PAGES}


def test_every_regime_is_explained() -> None:
    page = (Path(mdof.__file__).parent / "manual" / "modes.md").read_text(encoding="utf-8")
    assert all(f"**{regime}**" in page for regime in Regime)


def test_every_finding_is_explained_in_the_words_of_the_registry() -> None:
    page = (Path(mdof.__file__).parent / "manual" / "findings.md").read_text(encoding="utf-8")
    told = {
        code: " ".join(text.split())
        for code, text in re.findall(r"^- `([a-z-]+)`: ((?:.+\n)(?:  .+\n)*)", page, flags=re.MULTILINE)
    }
    assert told == {code: f"{kind.meaning} {kind.advice}" for code, kind in REGISTRY.items()}
    places = [page.index(f"## {heading}") for heading in ("Serious", "Warnings", "Notes")]
    for code, kind in REGISTRY.items():
        at = sum(page.index(f"`{code}`:") > place for place in places) - 1
        assert ("serious", "warning", "note")[at] == kind.severity, code


def test_the_example_object_has_the_keys_of_the_schema() -> None:
    folder = Path(mdof.__file__).parent
    page = (folder / "manual" / "json.md").read_text(encoding="utf-8")
    example = json.loads(re.findall(r"```json\n(.*?)```", page, flags=re.DOTALL)[0])
    schema = json.loads((folder / "schemas" / "modes.json").read_text(encoding="utf-8"))
    assert list(example) == schema["required"]
    assert list(example["modes"][0]) == schema["$defs"]["mode"]["required"]
    assert set(example["findings"][0]) == set(schema["$defs"]["findings"]["items"]["required"])
    for path in folder.glob("schemas/*.json"):
        assert path.name in page


def test_the_archive_page_names_every_header_attribute() -> None:
    import inspect

    from mdof.archive import run

    page = (Path(mdof.__file__).parent / "manual" / "archive.md").read_text(encoding="utf-8")
    names = re.findall(r'^        "([a-z_]+)":', inspect.getsource(run), flags=re.MULTILINE)
    assert len(names) > 10
    assert all(f"`{name}`" in page for name in names)


def test_the_model_of_the_manual_can_be_read(tmp_path: Path) -> None:
    page = (Path(mdof.__file__).parent / "manual" / "model-file.md").read_text(encoding="utf-8")
    path = tmp_path / "example.yaml"
    path.write_text(re.findall(r"```yaml\n(.*?)```", page, flags=re.DOTALL)[0], encoding="utf-8")
    assert main(["check", str(path)]) == 0


def test_what_the_model_page_says_of_defaults_and_references_is_so() -> None:
    page = (Path(mdof.__file__).parent / "manual" / "model-file.md").read_text(encoding="utf-8")
    for words in ("the origin `[0, 0, 0]` is taken", "centre of the first body that is not a ground", "[xx, yy, zz]"):
        assert words in page

    def frame(inertia: Any) -> dict[str, Any]:
        return {"mass": 10, "inertia": inertia}

    spring = {"between": ["a", "b"], "stiffness": {"x": 1e4}, "loss_factor": 0.1}
    description: dict[str, Any] = {
        "units": "SI",
        "directions": ["x", "y", "z", "rx", "ry", "rz"],
        "property_sets": {"soft": {"stiffness": {"x": 1e4}, "loss_factor": 0.1, "reference_frequency": "20 Hz"}},
        "bodies": {"a": frame([1, 2, 2]), "b": frame({"xx": 1, "yy": 2, "zz": 2, "xy": 0.5})},
        "connections": {
            "bare": spring,
            "own": {**spring, "reference_frequency": "30 Hz"},
            "set": {"between": ["a", "ground"], "uses": "soft"},
        },
    }
    graph = mdof.network(mdof.Model(**description))
    assert graph.nodes["a"]["centre"].tolist() == [0, 0, 0]
    assert graph.nodes["a"]["inertia"].tolist() == [[1, 0, 0], [0, 2, 0], [0, 0, 2]]
    assert graph.nodes["b"]["inertia"].tolist() == [[1, -0.5, 0], [-0.5, 2, 0], [0, 0, 2]]
    for whole, first in ((None, math.nan), ("12 Hz", 12.0)):
        given = {} if whole is None else {"reference_frequency": whole}
        references = mdof.assemble(mdof.Model(**description, **given)).loss_reference / (2 * math.pi)
        assert references == pytest.approx([first, 30.0, 20.0], rel=1e-12, nan_ok=True)


def test_the_python_page_runs(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(Path(__file__).parents[2])
    page = (Path(mdof.__file__).parent / "manual" / "python.md").read_text(encoding="utf-8")
    snippets = re.findall(r"```python\n(.*?)```", page, flags=re.DOTALL)
    assert len(snippets) == 6
    space: dict[str, Any] = {}
    for snippet in snippets:
        exec(compile(snippet, "python.md", "exec"), space)
    assert space["given"].size == 2
    assert len(space["lowest"]) == 6
    assert space["study"].damping_ratios.shape[0] == 4


def test_the_beginning_of_a_name_finds_its_page(capfd: pytest.CaptureFixture[str]) -> None:
    assert main(["manual", "pyth"]) == 0
    assert "Python: models" in capfd.readouterr().out
