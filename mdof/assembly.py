"""From a network of bodies and connections to a System in factors."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from mdof.constraints import Layout, follow_rigid_links, tie_rigid_gears
from mdof.description.incidence import DIRECTIONS, collect
from mdof.errors import ModelError, Problem
from mdof.proportional import with_proportional_damping
from mdof.system import System

if TYPE_CHECKING:
    from collections.abc import Mapping


__all__ = ["assemble"]

_CODE = {name: index for index, name in enumerate(DIRECTIONS)}


def assemble(model: Any) -> System:
    """Assemble a :class:`~mdof.Model`, or a networkx graph with SI attributes made by hand.

    Returns
    -------
    System
        In reduced coordinates: riders of rigid links and driven ends of rigid gears are eliminated exactly, inner
        coordinates of series branches stand last.

    Raises
    ------
    ModelError
        If a value has no place to act, a rigid link or gear contradicts another one, or a massless joint is held by
        nothing in one of its directions.
    """
    if hasattr(model, "edges"):
        return _Assembly(model).system()
    from mdof.description.network import network

    try:
        return _Assembly(network(model)).system()
    except ModelError as error:
        raise ModelError(
            [
                problem if problem.line is not None else model.locate(problem.path, problem.message, problem.expected)
                for problem in error.problems
            ]
        ) from None


class _Assembly:
    """The steps of one assembly; motions are six a body, coordinates are what is kept of them."""

    def __init__(self, graph: Any) -> None:
        self.graph = graph
        nodes = graph.nodes(data=True)
        self.names = [name for name, data in nodes if not _is_ground(name, data)]
        self.bodies = [graph.nodes[name] for name in self.names]
        self.index = {name: number for number, name in enumerate(self.names)}
        self.index_or_ground = {name: self.index.get(name, -1) for name, _ in nodes} | {"ground": -1}
        if not self.names:
            raise ModelError([Problem(path="bodies", message="there is no body", expected="name at least one body")])
        default = tuple(graph.graph.get("directions", ("x",)))
        self.directions = [tuple(body.get("directions") or default) for body in self.bodies]
        self.centres = np.array([_centre(body) for body in self.bodies], dtype=np.float64)

    def system(self) -> System:
        from scipy.sparse import block_array, coo_array, csc_array

        found = collect(self.graph, self.index_or_ground, self.directions)
        layout = Layout(
            names=self.names,
            directions=self.directions,
            index_or_ground=self.index_or_ground,
            centres=self.centres,
        )
        transform = follow_rigid_links(layout, found.rigid)
        columns_full = found.columns.matrix(self.centres)
        transform = tie_rigid_gears(found, columns_full, transform)
        columns = (transform.T @ columns_full).tocsc()
        # Columns of zeros act where nothing may move; the network check names them.
        acts = np.diff(columns.indptr) > 0
        mass = (transform.T @ self._motion_mass() @ transform).tocsc()
        inertance = np.array(found.inertance, dtype=np.float64)
        if len(inertance):
            tied = columns[:, np.array(found.inertance_column)]
            mass = (mass + tied @ csc_array(np.diag(inertance)) @ tied.T).tocsc()
        springs = np.array(found.spring_column, dtype=np.int64)
        dampers = np.array(found.damper_column, dtype=np.int64)
        keep_spring, keep_damper = acts[springs], acts[dampers]
        branches = [branch for branch in found.branches if acts[branch[1]]]
        count, inner, own = columns.shape[0], len(branches), int(keep_spring.sum())
        spring_columns = columns[:, springs[keep_spring]]
        damper_columns = columns[:, dampers[keep_damper]]
        if inner:
            outer = columns[:, np.array([branch[1] for branch in branches])]
            one = coo_array((np.ones(inner), (np.arange(inner), np.arange(inner)))).tocsc()
            spring_columns = block_array([[spring_columns, outer], [csc_array((inner, own)), -one]], format="csc")
            damper_columns = block_array(
                [[damper_columns, csc_array((count, inner))], [csc_array((inner, damper_columns.shape[1])), one]],
                format="csc",
            )
            mass = block_array(
                [[mass, csc_array((count, inner))], [csc_array((inner, count)), csc_array((inner, inner))]]
            ).tocsc()
        grounded = np.minimum(np.array(found.columns.body_a, dtype=int), np.array(found.columns.body_b, dtype=int)) < 0
        if found.columns.legs:
            legs = np.bincount([leg[0] for leg in found.columns.legs], minlength=len(grounded))
            grounded = np.where(legs > 0, legs < 2, grounded)
        # One entry more, so that -1 (no spring in this direction) finds a place.
        new_index = np.append(np.where(keep_spring, np.cumsum(keep_spring) - 1, -1), -1)
        shared = np.array(found.damper_spring, dtype=np.int64)[keep_damper]
        branch_names = tuple(branch[0] for branch in branches)
        none = np.zeros(inner)
        proportional = dict(self.graph.graph.get("damping") or {})
        system = System(
            mass=mass,
            spring_columns=spring_columns,
            stiffness=np.concatenate([np.array(found.stiffness)[keep_spring], [branch[2] for branch in branches]]),
            loss_factor=np.concatenate([np.array(found.loss_factor)[keep_spring], none]),
            loss_reference=np.concatenate(
                [np.array(found.loss_reference, dtype=np.float64)[keep_spring], none + np.nan]
            ),
            damper_columns=damper_columns,
            damping=np.concatenate([np.array(found.damping)[keep_damper], [branch[3] for branch in branches]]),
            spring_names=tuple(np.array(found.spring_names, dtype=object)[keep_spring]) + branch_names,
            damper_names=tuple(np.array(found.damper_names, dtype=object)[keep_damper]) + branch_names,
            damper_spring=np.concatenate([new_index[shared], np.full(inner, -1)]).astype(np.int64),
            spring_grounded=np.concatenate(
                [grounded[springs[keep_spring]], grounded[np.array([branch[1] for branch in branches], dtype=int)]]
            ).astype(bool),
            # The damper of a branch ends at the branch's own inner coordinate.
            damper_grounded=np.concatenate([grounded[dampers[keep_damper]], np.zeros(inner, dtype=bool)]),
            coordinate_bodies=tuple(
                str(name) for name, dirs in zip(self.names, self.directions, strict=True) for _ in dirs
            ),
            coordinate_directions=tuple(direction for dirs in self.directions for direction in dirs),
            recovery=self._recovery(transform, inner),
            gyroscopic=self._gyroscopic(transform, inner),
            first_order_states=inner,
            bodies={
                str(name): float(body.get("mass") or 0.0) for name, body in zip(self.names, self.bodies, strict=True)
            },
        )
        self._check_massless(system)
        return with_proportional_damping(system, proportional)

    def _motion_mass(self) -> Any:
        """Mass matrix over the six motions of every body: csc, shape (6 n_bodies, 6 n_bodies)."""
        from scipy.sparse import coo_array

        count = len(self.names)
        mass = np.array([float(body.get("mass") or 0.0) for body in self.bodies])
        start = 6 * np.arange(count)
        rows = [start, start + 1, start + 2]
        values = [mass, mass, mass]
        columns = list(rows)
        turning = [number for number, body in enumerate(self.bodies) if body.get("inertia") is not None]
        if turning:
            inertia = np.array([np.asarray(self.bodies[number]["inertia"], dtype=np.float64) for number in turning])
            if inertia.shape != (len(turning), 3, 3):
                problem = Problem(
                    path="bodies",
                    message="inertia must be a 3 by 3 array about the body's centre",
                    expected="give the tensor in kg m²",
                )
                raise ModelError([problem])
            base = 6 * np.array(turning) + 3
            for i in range(3):
                for j in range(3):
                    rows.append(base + i)
                    columns.append(base + j)
                    values.append(inertia[:, i, j])
        entries = (np.concatenate(values), (np.concatenate(rows), np.concatenate(columns)))
        matrix = coo_array(entries, shape=(6 * count, 6 * count)).tocsc()
        matrix.eliminate_zeros()
        return matrix

    def _gyroscopic(self, transform: Any, inner: int) -> Any:
        """Gyroscopic matrix of spinning bodies: the angular momentum h turned by the body resists with θ̇ × h."""
        from scipy.sparse import block_diag, csc_array, lil_array

        spinning = [(number, body["spin"]) for number, body in enumerate(self.bodies) if body.get("spin")]
        if not spinning:
            return None
        full = lil_array((6 * len(self.names), 6 * len(self.names)))
        for number, spin in spinning:
            axis = np.asarray(spin["axis"], dtype=np.float64)
            h = spin["polar_inertia"] * spin["speed"] * axis / np.linalg.norm(axis)
            for i, j, sign, component in ((0, 1, 1, 2), (0, 2, -1, 1), (1, 2, 1, 0)):
                full[6 * number + 3 + i, 6 * number + 3 + j] = sign * h[component]
                full[6 * number + 3 + j, 6 * number + 3 + i] = -sign * h[component]
        reduced = (transform.T @ full.tocsc() @ transform).tocsc()
        return block_diag([reduced, csc_array((inner, inner))], format="csc") if inner else reduced

    def _recovery(self, transform: Any, inner: int) -> Any:
        from scipy.sparse import csc_array, hstack

        rows = [6 * body + _CODE[direction] for body, dirs in enumerate(self.directions) for direction in dirs]
        matrix = transform.tocsr()[rows].tocsc()
        return hstack([matrix, csc_array((len(rows), inner))], format="csc") if inner else matrix

    def _check_massless(self, system: System) -> None:
        """Refuse a massless joint that nothing holds in one of its directions."""
        from scipy.sparse import hstack

        empty = np.diff(system.mass.indptr)[: system.degrees_of_freedom] == 0
        if not empty.any():
            return
        recovery = system.recovery.tocsc()
        problems = []
        held = hstack([system.spring_columns, system.damper_columns], format="csr")
        by_body: dict[str, list[int]] = {}
        for coordinate in np.nonzero(empty)[0]:
            described = recovery.indices[recovery.indptr[coordinate] : recovery.indptr[coordinate + 1]]
            by_body.setdefault(system.coordinate_bodies[described[0]], []).append(int(coordinate))
        for body, coordinates in by_body.items():
            block = held[coordinates]
            block = block[:, np.unique(block.indices)].toarray()
            block = block / np.maximum(np.linalg.norm(block, axis=0), np.finfo(float).tiny)
            left, size, _ = np.linalg.svd(block, full_matrices=True)
            rank = int(np.sum(size > 1e-10 * max(size.max(initial=0.0), 1e-300)))
            if rank < len(coordinates):
                loose = np.abs(left[:, rank:]).max(axis=1) > 1e-6
                names = [
                    system.labels[recovery.indices[recovery.indptr[c]]]
                    for c, free in zip(coordinates, loose, strict=True)
                    if free
                ]
                problems.append(
                    Problem(
                        path=f"bodies.{body}",
                        message="a massless joint needs stiffness or damping in every direction; "
                        f"nothing holds {', '.join(names)}",
                        expected="add a connection there, give it a mass, or narrow its `directions`",
                    )
                )
        if problems:
            raise ModelError(problems)


def _is_ground(name: Any, data: Mapping[str, Any]) -> bool:
    return bool(data.get("kind", "ground" if name == "ground" else "body") == "ground")


def _centre(body: Mapping[str, Any]) -> Any:
    centre = body.get("centre")
    return (0.0, 0.0, 0.0) if centre is None else centre
