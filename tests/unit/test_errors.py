"""mdof.errors: the one error tree."""

from __future__ import annotations

import inspect
import pickle

import pytest

from mdof import errors
from mdof.errors import (
    DamagedArchiveError,
    InputError,
    MdofError,
    ModelError,
    OutputError,
    Problem,
    UnverifiedError,
    UsageError,
)


def test_every_error_is_in_the_tree_drawn_in_the_docstring() -> None:
    kinds = [kind for _, kind in inspect.getmembers(errors, inspect.isclass) if issubclass(kind, Exception)]
    assert all(issubclass(kind, MdofError) for kind in kinds)
    assert all(kind.__name__ in (errors.__doc__ or "") for kind in kinds)


@pytest.mark.parametrize(("kind", "status"), [(InputError, 2), (UnverifiedError, 3), (DamagedArchiveError, 4)])
def test_exit_statuses(kind: type[MdofError], status: int) -> None:
    assert kind.exit_status == status


def test_a_problem_shows_place_path_advice_and_line() -> None:
    problem = Problem(
        path="bodies.fan",
        message="wrong",
        expected="write right",
        file="m.yaml",
        line=3,
        column=5,
        source_line="  fan: x",
    )
    assert str(problem).splitlines() == ["m.yaml:3:5: bodies.fan: wrong; write right", "      fan: x", "        ^"]


def test_a_very_long_line_is_cut_around_the_place() -> None:
    text = str(Problem(path="a", message="m", line=1, column=5000, source_line="x" * 9000))
    assert max(map(len, text.splitlines())) <= 170
    assert text.splitlines()[2].index("^") < 80


def test_problems_and_reasons_are_kept_as_data() -> None:
    error = ModelError([Problem(path="a", message="one"), Problem(path="b", message="two")])
    assert [problem.path for problem in error.problems] == ["a", "b"]
    doubt = UnverifiedError("too rough", "look again")
    assert (doubt.reason, doubt.advice, str(doubt)) == ("too rough", "look again", "too rough; look again")


def test_errors_cross_into_other_processes_whole() -> None:
    again = pickle.loads(pickle.dumps(ModelError([Problem(path="a", message="one", line=3)])))
    assert again.problems == (Problem(path="a", message="one", line=3),)
    doubt = pickle.loads(pickle.dumps(UnverifiedError("too rough", "look again")))
    assert (doubt.reason, doubt.advice) == ("too rough", "look again")


@pytest.mark.parametrize("kind", [ModelError, UsageError, OutputError])
def test_wrong_input_of_every_kind_ends_with_status_two(kind: type[MdofError]) -> None:
    assert issubclass(kind, InputError)
    assert kind.exit_status == 2


@pytest.mark.parametrize(
    ("place", "head"),
    [
        ({}, "bodies.fan: wrong"),
        ({"file": "m.yaml"}, "m.yaml: bodies.fan: wrong"),
        ({"file": "m.yaml", "line": 3}, "m.yaml:3: bodies.fan: wrong"),
        ({"line": 3, "column": 5}, "3:5: bodies.fan: wrong"),
        ({"file": "m.yaml", "path": ""}, "m.yaml: wrong"),
        ({"expected": "write right"}, "bodies.fan: wrong; write right"),
    ],
)
def test_a_place_is_told_as_far_as_it_is_known(place: dict[str, object], head: str) -> None:
    assert str(Problem(**{"path": "bodies.fan", "message": "wrong"} | place)) == head


@pytest.mark.parametrize("column", [1, 5, 90, 91, 200])
def test_the_caret_stands_under_the_column_whatever_the_line(column: int) -> None:
    """Tabs count one, so that the caret keeps its place; a long line is cut in front of it."""
    line = "".join(chr(ord("a") + index % 26) for index in range(300))
    line = line[: column - 1] + "#" + line[column:]
    line = "\t" + line[1:] if column > 1 else line
    _, shown, caret = str(Problem(path="a", message="m", line=1, column=column, source_line=line)).splitlines()
    assert shown[caret.index("^")] == "#"
    assert "\t" not in shown
    assert len(shown) <= 164


def test_an_empty_line_is_not_shown_and_a_line_without_column_has_no_caret() -> None:
    assert "\n" not in str(Problem(path="a", message="m", line=1, source_line="   "))
    assert str(Problem(path="a", message="m", line=1, source_line="fan: x")).splitlines()[1:] == ["    fan: x"]


def test_a_model_error_tells_every_problem_in_order() -> None:
    error = ModelError(Problem(path=name, message="wrong") for name in "ba")
    assert str(error) == "b: wrong\na: wrong"
