"""Rigid links and rigid gears: motions of all bodies from the coordinates that remain."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from mdof.description.incidence import DIRECTIONS, ColumnSet
from mdof.errors import ModelError, Problem

if TYPE_CHECKING:
    from collections.abc import Mapping

    from numpy.typing import NDArray

__all__ = ["Layout", "follow_rigid_links", "tie_rigid_gears"]

_CODE = {name: index for index, name in enumerate(DIRECTIONS)}


@dataclass(frozen=True, kw_only=True, slots=True, eq=False)
class Layout:
    """Who may move how.

    Attributes
    ----------
    names : list, length n_bodies; directions : list of tuple of str, likewise
    index_or_ground : mapping from node to body index, -1 for grounds
    centres : ndarray, shape (n_bodies, 3) [m]
    """

    names: list[Any]
    directions: list[tuple[str, ...]]
    index_or_ground: Mapping[Any, int]
    centres: NDArray[np.float64]


def follow_rigid_links(layout: Layout, links: Iterable[tuple[str, Any, Any]]) -> Any:
    """Motions of all bodies from the coordinates of those that are not riders: csc, shape (6 n_bodies, n)."""
    from scipy.sparse import coo_array

    host_of: dict[int, int] = {}
    for name, host_name, rider_name in links:
        a, b = layout.index_or_ground[host_name], layout.index_or_ground[rider_name]
        if a < 0 or b < 0:
            raise _error(
                f"connections.{name}", "a rigid link joins two bodies", "hold a body by leaving out its directions"
            )
        if b in host_of:
            raise _error(
                f"connections.{name}",
                f"{rider_name} already rides on {layout.names[host_of[b]]}",
                "give each rider one host",
            )
        host_of[b] = a
    number, count = _coordinates(layout, set(host_of))
    bodies, motions = np.nonzero(number >= 0)
    rows = [6 * bodies + motions]
    columns = [number[bodies, motions]]
    values = [np.ones(len(bodies))]
    for rider in host_of:
        carried = np.eye(6)
        body, seen = rider, {rider}
        while body in host_of:
            host = host_of[body]
            if host in seen:
                raise _error(
                    "connections", f"rigid links run in a circle through {layout.names[host]}", "break the circle"
                )
            seen.add(host)
            carried = carried @ _carry(layout.centres[body] - layout.centres[host])
            body = host
        lacking = set(layout.directions[rider]) - set(layout.directions[body])
        if lacking:
            raise _error(
                f"bodies.{layout.names[rider]}.directions",
                f"rides on {layout.names[body]}, which does not move in {', '.join(sorted(lacking))}",
                f"give {layout.names[body]} these directions or take them from {layout.names[rider]}",
            )
        kept = np.nonzero(number[body] >= 0)[0]
        local, motion = np.nonzero(carried[:, kept])
        rows.append(6 * rider + local)
        columns.append(number[body, kept[motion]])
        values.append(carried[local, kept[motion]])
    entries = (np.concatenate(values), (np.concatenate(rows), np.concatenate(columns)))
    return coo_array(entries, shape=(6 * len(layout.names), count)).tocsc()


def tie_rigid_gears(found: ColumnSet, columns: Any, transform: Any) -> Any:
    """Eliminate the driven angle of every gear without mesh stiffness."""
    from scipy.sparse import csc_array, eye_array

    for name, column in found.rigid_gears:
        row = (columns[:, [column]].T @ transform).toarray().ravel()
        if not np.any(np.abs(row) > 1e-12 * np.abs(columns[:, [column]].toarray()).max(initial=0.0)):
            raise _error(
                f"connections.{name}",
                "the gear has no angle left to tie",
                "remove it, or give the bodies a rotation",
            )
        driven = [leg[1] for leg in found.columns.legs if leg[0] == column][-1]
        wanted = np.zeros(len(row))
        wanted[transform[6 * driven : 6 * driven + 6].tocoo().col] = 1.0
        pivot = int(np.argmax(np.abs(row) * (wanted if np.any(row * wanted) else 1.0)))
        solved = -row / row[pivot]
        keep = np.delete(np.arange(len(row)), pivot)
        elimination = eye_array(len(row), format="lil")
        elimination[pivot, :] = solved.reshape(1, -1)
        transform = (transform @ csc_array(elimination)[:, keep]).tocsc()
    return transform


def _coordinates(layout: Layout, riders: set[int]) -> tuple[NDArray[np.int64], int]:
    """Coordinate number of every motion, shape (n_bodies, 6), -1 where there is none."""
    number = np.full((len(layout.names), 6), -1, dtype=np.int64)
    count = 0
    for body, directions in enumerate(layout.directions):
        if body not in riders:
            for direction in directions:
                number[body, _CODE[direction]] = count
                count += 1
    return number, count


def _carry(offset: NDArray[np.float64]) -> NDArray[np.float64]:
    """Motions of a rider whose centre lies ``offset`` from its host's centre: u + θ × offset, θ; shape (6, 6)."""
    x, y, z = offset
    result = np.eye(6)
    result[:3, 3:] = [[0, z, -y], [-z, 0, x], [y, -x, 0]]
    return result


def _error(path: str, message: str, expected: str) -> ModelError:
    return ModelError([Problem(path=path, message=message, expected=expected)])
