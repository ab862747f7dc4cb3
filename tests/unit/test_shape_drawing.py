"""How bodies in space are drawn: outlines and motions."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

import mdof
from mdof.report import shape_drawing

MODELS = Path(__file__).parents[2] / "models"


def test_the_outline_of_points_in_a_plane_is_convex_and_holds_all() -> None:
    rng = np.random.default_rng(7)
    points = np.vstack([rng.uniform(-1, 1, (40, 2)), [[2, 2], [2, -2], [-2, -2], [-2, 2]]])
    assert sorted(shape_drawing._outline(points)) == [40, 41, 42, 43]


@pytest.mark.parametrize(
    ("points", "corners"),
    [([[1, 1]], {0}), ([[0, 0], [1, 0]], {0, 1}), ([[0, 0], [2, 2], [1, 1]], {0, 1}), ([[1, 1], [1, 1]], {0, 1})],
)
def test_an_outline_may_be_a_line_or_a_point(points: list[list[float]], corners: set[int]) -> None:
    found = shape_drawing._outline(np.array(points, float))
    assert {tuple(points[index]) for index in found} == {tuple(points[index]) for index in corners}


def test_points_of_a_body_move_as_a_rigid_body_does() -> None:
    centre = np.array([1.0, 2.0, 3.0])
    # A turn about y carries a point ahead of the centre down: -z.
    moved = shape_drawing._moved(
        centre + np.array([[1.0, 0, 0], [0, 0, 1.0]]), centre, np.array([0, 0.5, 0, 0, 0.1, 0])
    )
    assert np.allclose(moved, [[0, 0.5, -0.1], [0.1, 0.5, 0]])


def test_a_body_reaches_to_all_its_connections() -> None:
    model = mdof.load(MODELS / "firewater_skid.yaml")
    skeleton = shape_drawing._skeleton(model, ["panel", "engine"])
    assert set(skeleton.arms) == {"panel", "engine"}
    assert len(skeleton.arms["panel"]) == 4
    assert not skeleton.flat


def test_a_chain_has_no_places() -> None:
    assert shape_drawing._skeleton(mdof.load(MODELS / "ten_mass_chain.yaml"), ["m1", "m2"]).flat
