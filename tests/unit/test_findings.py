"""mdof.findings: the one registry of codes, and whoever speaks through it."""

from __future__ import annotations

import ast
import re
from pathlib import Path

import pytest

import mdof
from mdof.findings import REGISTRY, Severity, finding

SOURCES = {
    path: ast.parse(path.read_text(encoding="utf-8"))
    for path in Path(mdof.__file__).parent.rglob("*.py")
    if path.name != "findings.py"
}


def calls(name: str) -> list[tuple[str, ast.Call, ast.FunctionDef]]:
    """Every call of a function in the package, with where it stands and the function around it."""
    found = []
    for path, tree in SOURCES.items():
        for function in (node for node in ast.walk(tree) if isinstance(node, ast.FunctionDef)):
            for node in ast.walk(function):
                if isinstance(node, ast.Call) and isinstance(node.func, ast.Name) and node.func.id == name:
                    found.append((f"{path.name}:{node.lineno}", node, function))
    return found


def codes(call: ast.Call, around: ast.FunctionDef) -> set[str]:
    """The codes a call may carry: written out in it, or in the function whose variable it passes."""
    place: ast.AST = around if isinstance(call.args[0], ast.Name) else call.args[0]
    texts = (part.value for part in ast.walk(place) if isinstance(part, ast.Constant) and isinstance(part.value, str))
    return {text for text in texts if re.fullmatch(r"[a-z]+(-[a-z]+)+", text)}


def test_every_call_names_registered_codes_only() -> None:
    for place, call, around in calls("finding"):
        assert codes(call, around), f"{place}: no code is written out"
        assert codes(call, around) <= set(REGISTRY), place


def test_no_registered_code_is_without_a_caller() -> None:
    assert set().union(*(codes(call, around) for _, call, around in calls("finding"))) == set(REGISTRY)


def test_only_the_archive_makes_findings_past_the_registry() -> None:
    """It reads back what an earlier version said; all others would bring a severity and an advice of their own."""
    assert {place.partition(":")[0] for place, _, _ in calls("Finding")} <= {"store.py"}


@pytest.mark.parametrize("code", REGISTRY)
def test_meaning_and_advice_are_sentences_of_their_own(code: str) -> None:
    kind = REGISTRY[code]
    for text in (kind.meaning, kind.advice):
        assert text[0].isupper(), text
        assert text.endswith("."), text
        assert len(text) > 20, text
    assert kind.meaning != kind.advice


def test_a_finding_takes_severity_and_advice_from_the_registry_unless_told_otherwise() -> None:
    plain = finding("free-motion", "seen", modes=(1, 2), bodies=("a",), connections=("s",))
    kind = REGISTRY["free-motion"]
    assert (plain.code, plain.message, plain.severity, plain.advice) == (
        "free-motion",
        "seen",
        kind.severity,
        kind.advice,
    )
    assert (plain.modes, plain.bodies, plain.connections) == ((1, 2), ("a",), ("s",))
    assert finding("free-motion", "seen", severity=Severity.NOTE).severity is Severity.NOTE
    with pytest.raises(KeyError):
        finding("free-motions", "seen")
