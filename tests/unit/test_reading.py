"""Strict reading: every trap of YAML is an error with its place, and every value keeps its span."""

from __future__ import annotations

from pathlib import Path

import pytest
import yaml

import mdof
from mdof.description.reading import LARGEST_FILE, load, read_document
from mdof.description.scalars import resolve
from mdof.description.strict_yaml import parse
from mdof.errors import ModelError

MODELS = sorted((Path(__file__).parents[2] / "models").glob("*.yaml"))
GOOD = "units: SI\nbodies: {m: 10}\nconnections: {s: {between: [m, ground], stiffness: 1000}}\n"


def problems_of(tmp_path: Path, content: str | bytes, name: str = "wrong.yaml") -> list[str]:
    """Text of every problem of a file with this content, the file's folder cut away; the first line of each."""
    path = tmp_path / name
    path.write_bytes(content.encode() if isinstance(content, str) else content)
    with pytest.raises(ModelError) as caught:
        load(path)
    assert all(problem.file == str(path) for problem in caught.value.problems)
    return [str(problem).replace(str(path), "f").split("\n")[0] for problem in caught.value.problems]


@pytest.mark.parametrize(
    ("content", "expected"),
    [
        # (text, one entry an expected problem: start of the line, words it must hold)
        ("bodies: {m: {mass: 1e5}}\nunits: SI\n", [("f:1:20: bodies.m.mass:", "write 1.0e+5")]),
        ("bodies: {m: {mass: 9.0e7}}\nunits: SI\n", [("f:1:20: bodies.m.mass:", "write 9.0e+7")]),
        ("bodies: {m: {mass: 1e-5}}\nunits: SI\n", [("f:1:20: bodies.m.mass:", "write 1.0e-5")]),
        ("bodies: {m: {mass: 010}}\nunits: SI\n", [("f:1:20: bodies.m.mass:", "octal")]),
        ("bodies: {m: {mass: 0o10}}\nunits: SI\n", [("f:1:20: bodies.m.mass:", "octal")]),
        ("bodies: {m: {mass: 0x1F}}\nunits: SI\n", [("f:1:20: bodies.m.mass:", "hexadecimal")]),
        ("bodies: {m: {mass: 1:30}}\nunits: SI\n", [("f:1:20: bodies.m.mass:", "base-60")]),
        ("bodies: {m: {mass: 1_000}}\nunits: SI\n", [("f:1:20: bodies.m.mass:", "write 1000")]),
        ("bodies: {m: {mass: .nan}}\nunits: SI\n", [("f:1:20: bodies.m.mass:", "finite")]),
        ("bodies: {m: {mass: -.inf}}\nunits: SI\n", [("f:1:20: bodies.m.mass:", "finite")]),
        ("bodies: {m: {mass: 1.0e+999}}\nunits: SI\n", [("f:1:20: bodies.m.mass:", "range of numbers")]),
        ('bodies: {m: {mass: "10"}}\nunits: SI\n', [("f:1:20: bodies.m.mass:", "write 10 kg")]),
        ("bodies: {m: {massless: yes}}\n", [("f:1:24: bodies.m.massless:", "true or false")]),
        ("bodies: {m: {mass: 1 kg, massless: off}}\n", [("f:1:36: bodies.m.massless:", "true or false")]),
        ("bodies: {no: 1 kg}\n", [("f:1:10: bodies.no:", '"no" in quotes')]),
        ("bodies: {1: 1 kg}\n", [("f:1:10: bodies.1:", '"1" in quotes')]),
        ("bodies: {m: 1 kg, m: 2 kg}\n", [("f:1:19: bodies.m:", "written twice")]),
        ("bodies: {m: 1 kg}\nbodies: {m: 1 kg}\n", [("f:2:1: bodies:", "the first is on line 1")]),
        ("bodies: {m: &a 1 kg, n: *a}\n", [("f:1:13: bodies.m:", "anchors"), ("f:1:25: bodies.n:", "aliases")]),
        (
            "bodies:\n  m: {mass: 1 kg}\n  n:\n    <<: {mass: 2 kg}\n",
            [("f:4:5: bodies.n.<<:", "merge keys")],
        ),
        ("bodies: {m: !!float 1}\n", [("f:1:13: bodies.m:", "tags")]),
        ("bodies: {m: 1 kg}\n---\nbodies: {m: 1 kg}\n", [("f:2:1:", "second document")]),
        ("bodies: {m: 1 kg}\n? [a, b]\n: 3\n", [("f:2:3:", "cannot be a key")]),
        ("bodies:\n\tm: 1 kg\n", [("f:2:1:", "tab")]),
        ("bodies: {m: 1 kg\nconnections: {}\n", [("f:2:", "not closed")]),
        ("bodies: {m: 'kg}\n", [("f:1:", "quote is opened and never closed")]),
        ("title: a: b\nbodies: {m: 1 kg}\n", [("f:1:9:", "second `key: value`")]),
        ("bodies:\n  m: 1 kg\n n: 2 kg\n", [("f:3:2:", "line up")]),
        ("title: @home\n", [("f:1:8:", "in quotes")]),
        ("- m\n", [("f:1:1:", "holds a list")]),
        ("pump\n", [("f:1:1:", "holds one value")]),
        ("", [("f:1:1:", "empty")]),
        ("# only a comment\n", [("f:1:1:", "empty")]),
        ("a: " + "[" * 100, [("f:1:", "nested too deeply")]),
        ("a: " + "{a: " * 100, [("f:1:", "nested too deeply")]),
        (b"bodies: {m: 1 kg}\xff\n", [("f:1:18:", "0xff is not UTF-8")]),
        (b"\x7fELF\x02\x01\x00\x00\x00" + bytes(range(256)), [("f:", "not a text file")]),
        ("bodies: {m: 1 kg}\n".encode("utf-16"), [("f:1:1:", "UTF-16")]),
        ("title: a\x07b\n", [("f:1:9:", "U+0007")]),
        ('title: "a\\x1b[31mb"\nbodies: {m: 1 kg}\n', [("f:1:8: title:", "U+001B")]),
        ('bodies: {"m\\u202e": 1 kg}\n', [("f:1:10: bodies:", "U+202E")]),
        ("x" * (LARGEST_FILE + 1), [("f:", "4 MB")]),
    ],
)
def test_each_trap_is_an_error_with_its_place(
    tmp_path: Path, content: str | bytes, expected: list[tuple[str, str]]
) -> None:
    """Breaks if a trap is read in silence, placed elsewhere, or told more than once."""
    found = problems_of(tmp_path, content)
    assert len(found) == len(expected), found
    for line, (start, words) in zip(found, expected, strict=True):
        assert line.startswith(start), line
        assert words in line, line


def test_an_alias_bomb_is_refused_at_once(tmp_path: Path) -> None:
    """Breaks if aliases are expanded: nine levels of nine would be 387 million values."""
    levels = "\n".join(
        f"{name}: &{name} [{', '.join([f'*{before}'] * 9)}]"
        for before, name in zip("abcdefghi", "bcdefghij", strict=True)
    )
    found = problems_of(tmp_path, f"a: &a [x]\n{levels}\n")
    assert sum("aliases" in line for line in found) >= 81


def test_all_errors_of_a_file_come_at_once_and_in_file_order(tmp_path: Path) -> None:
    """Breaks if reading, schema and cross-checks stop at each other's first error."""
    content = (
        "titel: x\n"
        "units: SI\n"
        "bodies:\n"
        "  pump: {mass: 1e3}\n"
        "  frame: {mass: 5 lbf}\n"
        "connections:\n"
        "  spring: {between: [pmp, ground], stiffness: 3}\n"
        "  other: {between: [pump, pump], stiffness: 3}\n"
        "states: {cold: {bodies: {pump: {mass: 3 N}}}}\n"
    )
    found = problems_of(tmp_path, content)
    assert [line.split(":")[1] for line in found] == ["1", "4", "5", "7", "8", "9"]
    assert "did you mean `title`?" in found[0]
    assert "did you mean `pump`?" in found[3]


def test_the_message_shows_the_line_and_points_at_the_place(tmp_path: Path) -> None:
    """Breaks if the offending line or its marker goes missing."""
    path = tmp_path / "m.yaml"
    path.write_text("bodies:\n  pump: {mass: 240 lbf}\n")
    with pytest.raises(ModelError) as caught:
        load(path)
    text = str(caught.value).split("\n")
    assert text[1] == "      pump: {mass: 240 lbf}"
    assert text[2].index("^") == text[1].index("240")


@pytest.mark.parametrize(
    ("name", "words"), [("missing.yaml", "no such file"), ("", "folder"), ("a\0b", "cannot be read")]
)
def test_what_is_not_a_file(tmp_path: Path, name: str, words: str) -> None:
    """Breaks if an operating system error escapes as a traceback."""
    with pytest.raises(ModelError, match=words):
        load(f"{tmp_path}/{name}")


def test_a_missing_file_names_its_neighbour(tmp_path: Path) -> None:
    """Breaks if a mistyped file name gets no help."""
    (tmp_path / "pump.yaml").write_text(GOOD)
    with pytest.raises(ModelError, match=r"did you mean `pump\.yaml`"):
        load(tmp_path / "pmup.yaml")


@pytest.mark.parametrize(
    "content",
    [
        GOOD.encode(),
        b"\xef\xbb\xbf" + GOOD.encode(),
        GOOD.replace("\n", "\r\n").encode(),
        GOOD.replace("\n", "\r").encode(),
    ],
)
def test_byte_order_mark_and_line_ends_change_nothing(tmp_path: Path, content: bytes) -> None:
    """Breaks if a file from another system reads differently."""
    path = tmp_path / "m.yaml"
    path.write_bytes(content)
    assert (
        load(path).digest
        == mdof.Model(
            title="m", units="SI", bodies={"m": 10}, connections={"s": {"between": ["m", "ground"], "stiffness": 1000}}
        ).digest
    )


@pytest.mark.parametrize(
    ("text", "value"),
    [
        ("1", 1),
        ("-0", 0),
        ("+5", 5),
        (".5", 0.5),
        ("5.", 5.0),
        ("1.5e-3", 1.5e-3),
        ("1.0E+5", 1e5),
        ("true", True),
        ("False", False),
        ("~", None),
        ("", None),
        ("12 Hz", "12 Hz"),
        ("2026-05-01", "2026-05-01"),
        ("y", "y"),
        ("e5", "e5"),
        ("-", "-"),
        ("1e5 N/m", "1e5 N/m"),
        ("e", "e"),
        (".", "."),
        ("+", "+"),
    ],
)
def test_what_both_yaml_versions_read_alike_is_accepted(text: str, value: object) -> None:
    """Breaks if a harmless scalar is refused or changes its kind."""
    read, complaint, _ = resolve(text)
    assert (read, type(read), complaint) == (value, type(value), "")


def test_every_value_and_key_keeps_its_span() -> None:
    """Breaks if a tool that writes one number back would hit the wrong characters."""
    text = "# head\nbodies:\n  pump: {mass: 890 kg, centre: [120, -30.5, 780]} # tail\n"
    text += "connections:\n  s:\n    stiffness: {value: 'µ', tolerance: 8 %}\n"
    document = parse(text, "m.yaml")
    assert not document.problems
    lines = text.split("\n")
    wanted = {
        ("bodies", "pump", "mass"): "890 kg",
        ("bodies", "pump", "centre", 1): "-30.5",
        ("connections", "s", "stiffness", "value"): "'µ'",
        ("connections", "s", "stiffness", "tolerance"): "8 %",
        ("bodies", "pump", "centre"): "[120, -30.5, 780]",
    }
    for path, shown in wanted.items():
        span = document.values[path]
        assert span.line == span.end_line
        assert lines[span.line - 1][span.column - 1 : span.end_column - 1] == shown
    for path, span in document.keys.items():
        assert lines[span.line - 1][span.column - 1 : span.end_column - 1] == path[-1]
    assert set(document.keys) | {("bodies", "pump", "centre", i) for i in range(3)} | {()} == set(document.values)


def test_a_key_written_twice_leaves_the_first_value_and_its_span_alone() -> None:
    """Breaks if what is thrown away still moves the end of the value that is kept."""
    document = parse("bodies:\n  pump: {mass: 1 kg}\nbodies:\n  pump: {mass: 2 kg, centre: [0, 0, 0]}\n")
    assert document.data == {"bodies": {"pump": {"mass": "1 kg"}}}
    assert document.values["bodies", "pump"] == (2, 9, 2, 21)
    assert [(problem.line, problem.path) for problem in document.problems] == [(3, "bodies")]


@pytest.mark.parametrize("path", MODELS, ids=lambda path: path.stem)
def test_without_libyaml_a_model_reads_the_same(path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Breaks if values or places come out otherwise where PyYAML was built without its C parser."""
    fast = read_document(path)
    monkeypatch.delattr(yaml, "CSafeLoader", raising=False)
    slow = read_document(path)
    assert not slow.problems
    assert slow.data == fast.data
    assert slow.values == fast.values
    assert slow.keys == fast.keys


@pytest.mark.parametrize(
    ("text", "line", "words"),
    [
        ("bodies: {m: 10\nunits: SI\n", 2, "not closed here"),
        ("directions: [x\nunits: SI\n", 2, "not closed here"),
        ("bodies:\n  m: 10\n p: 5\n", 3, "does not line up"),
        ("title: a: b\n", 1, "second `key: value` on this line"),
    ],
)
def test_without_libyaml_a_broken_file_is_told_in_the_same_words(
    text: str, line: int, words: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Breaks if the errors of PyYAML's own parser escape, or reach the user untranslated."""
    (fast,) = parse(text, "m.yaml").problems
    monkeypatch.delattr(yaml, "CSafeLoader", raising=False)
    (slow,) = parse(text, "m.yaml").problems
    assert (slow.line, fast.line) == (line, line)
    assert words in slow.message
    assert words in fast.message


def test_on_is_a_key_and_means_the_text_on() -> None:
    """Breaks if the key `on` becomes True, as in YAML 1.1."""
    assert parse("watch: {p: {on: pump}}").data == {"watch": {"p": {"on": "pump"}}}


def test_the_source_is_kept(tmp_path: Path) -> None:
    """Breaks if the archive could not hold the model as written."""
    path = tmp_path / "m.yaml"
    path.write_text(GOOD)
    model = load(path)
    assert (model.file, model.source_text, model.title) == (str(path), GOOD, "m")
    assert read_document(path).text == GOOD


@pytest.mark.parametrize(
    "content",
    [
        "".join(f"k{index}: x\n" for index in range(3000)),
        "bodies:\n" + "".join(f"  k{index}: x\n" for index in range(3000)),
        "a: &a x\n" + "".join(f"k{index}: *a\n" for index in range(3000)),
    ],
)
def test_a_file_of_nonsense_gets_a_bounded_answer(tmp_path: Path, content: str) -> None:
    """Breaks if a wrong file fills the terminal, or each of its lines is compared with everything."""
    assert 100 <= len(problems_of(tmp_path, content)) <= 201
