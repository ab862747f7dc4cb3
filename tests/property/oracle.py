"""An independent account of a machine's energies, to check assembly against. Shares no code with mdof.

Bodies are really rotated (Rodrigues' formula, no small-angle step), points are carried along, and every connection is
asked for its elongation. The energies that follow are differentiated twice by central differences with one Richardson
step. Nothing here knows of incidence columns.

Coordinates: every direction of every body in the order of the graph, riders of rigid links and gears included, then one
for the inner point of each direction of each series branch.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Any

import numpy as np

DIRECTIONS = ("x", "y", "z", "rx", "ry", "rz")
Array = np.ndarray


def carried(rotation: Array, arm: Array) -> Array:
    """Displacement of the tip of ``arm`` (3,) when it is turned by the rotation vectors ``rotation`` (batch, 3)."""
    angle = np.linalg.norm(rotation, axis=1, keepdims=True)
    once = np.cross(rotation, arm)
    twice = np.cross(rotation, once)
    return np.sinc(angle / np.pi) * once + 0.5 * np.sinc(angle / (2 * np.pi)) ** 2 * twice


def hessian(energy: Callable[[Array], Array], size: int, step: float = 2e-4) -> Array:
    """Second derivatives at rest of ``energy`` (batch, size) -> (batch,), from values alone."""
    first, second = np.triu_indices(size)
    one = np.eye(size)

    def plain(h: float) -> Array:
        signs = ((1, 1), (1, -1), (-1, 1), (-1, -1))
        values = [energy(h * (p * one[first] + q * one[second])) for p, q in signs]
        result = np.zeros((size, size))
        result[first, second] = (values[0] - values[1] - values[2] + values[3]) / (4 * h * h)
        result[second, first] = result[first, second]
        return result

    return (4 * plain(step / 2) - plain(step)) / 3


def timoshenko_stiffness(properties: dict[str, Any], length: float) -> Array:
    """12 x 12 stiffness of a straight prismatic beam, both ends' (x, y, z, rx, ry, rz) in its own axes.

    Przemieniecki J.S., Theory of Matrix Structural Analysis, 1968, section 5.6: shear terms through
    12 E I / (G A_s L^2), zero where no shear area is given.
    """
    E, G = properties["youngs_modulus"], properties["shear_modulus"]
    Iy, Iz = properties["second_moments"]
    shear = properties.get("shear_areas")
    L = length
    K = np.zeros((12, 12))

    def put(i: int, j: int, value: float) -> None:
        K[i, j] = K[j, i] = value

    for i, value in ((0, E * properties["area"] / L), (3, G * properties["torsion_constant"] / L)):
        put(i, i, value)
        put(i + 6, i + 6, value)
        put(i, i + 6, -value)
    # Bending in the x-y plane uses (y, rz) with one sign of the coupling, in the x-z plane (z, ry) with the other.
    for deflection, turn, sign, inertia, area in (
        (1, 5, 1.0, Iz, None if shear is None else shear[0]),
        (2, 4, -1.0, Iy, None if shear is None else shear[1]),
    ):
        phi = 0.0 if area is None else 12 * E * inertia / (G * area * L**2)
        base = E * inertia / ((1 + phi) * L**3)
        v1, t1, v2, t2 = deflection, turn, deflection + 6, turn + 6
        put(v1, v1, 12 * base)
        put(v2, v2, 12 * base)
        put(v1, v2, -12 * base)
        for t in (t1, t2):
            put(v1, t, sign * 6 * L * base)
            put(v2, t, -sign * 6 * L * base)
            put(t, t, (4 + phi) * L**2 * base)
        put(t1, t2, (2 - phi) * L**2 * base)
    return K


def by_direction(values: Any) -> dict[str, float]:
    """A stiffness or the like as the graph holds it: one number, or one a direction."""
    return dict(values) if isinstance(values, dict) else {"only": float(values)}


@dataclass
class Oracle:
    """Energies of the machine a graph describes.

    ``stiffness``, ``damping`` and ``mass`` hold second derivatives over bodies' coordinates and inner points;
    ``gyroscopic`` the spin terms.
    """

    graph: Any
    coordinates: list[tuple[str, str]] = field(default_factory=list)
    inner: list[tuple[Any, str, int]] = field(default_factory=list)

    def __post_init__(self) -> None:
        default = self.graph.graph.get("directions", ("x",))
        self.bodies = {n: d for n, d in self.graph.nodes(data=True) if d.get("kind", "body") == "body"}
        self.coordinates = [(n, way) for n, d in self.bodies.items() for way in d.get("directions", default)]
        self.edges = {key: data for _, _, key, data in self.graph.edges(keys=True, data=True)}
        self.inner = [
            (key, way, index)
            for key, data in self.edges.items()
            for index, branch in enumerate(data.get("branches", ()))
            for way in by_direction(branch["stiffness"])
        ]
        self.size = len(self.coordinates)
        total = self.size + len(self.inner)
        self.stiffness = hessian(self.strain_energy, total)
        self.damping = hessian(self.dissipation, total)
        self.mass = hessian(self.kinetic_energy, total)
        settings = self.graph.graph.get("damping", {})
        self.damping = (
            self.damping
            + settings.get("mass_proportional", 0.0) * self.mass
            + settings.get("stiffness_proportional", 0.0) * self.stiffness
        )
        self.gyroscopic = self.spin_terms()

    # Motion of points -------------------------------------------------------------------------------------------

    def centre(self, name: str) -> Array:
        return np.asarray(self.graph.nodes[name].get("centre", (0.0, 0.0, 0.0)), dtype=float)

    def pose(self, q: Array, name: str) -> tuple[Array, Array]:
        """Translation and rotation vector of a body, each (batch, 3); a ground stays."""
        motion = np.zeros((len(q), 6))
        for column, (body, way) in enumerate(self.coordinates):
            if body == name:
                motion[:, DIRECTIONS.index(way)] = q[:, column]
        return motion[:, :3], motion[:, 3:]

    def moved(self, q: Array, name: str, point: Array) -> Array:
        """Displacement of a material point of a body."""
        translation, rotation = self.pose(q, name)
        return translation + carried(rotation, np.asarray(point, dtype=float) - self.centre(name))

    def elongations(self, q: Array, edge: dict[str, Any]) -> dict[str, Array]:
        """Relative motion of a connection in each of its own directions, (batch,) each."""
        a, b = edge["between"]
        if "ends" in edge:
            p, r = (np.asarray(end, dtype=float) for end in edge["ends"])
            line = r - p
            change = self.moved(q, b, r) - self.moved(q, a, p)
            # |line + change| - |line| without cancellation
            stretch = np.einsum("ij,ij->i", 2 * line + change, change) / (
                np.linalg.norm(line + change, axis=1) + np.linalg.norm(line)
            )
            return {"only": stretch}
        if "at" in edge:
            point = np.asarray(edge["at"], dtype=float)
        else:
            point = self.centre(next(n for n in (a, b) if n in self.bodies))
        slide = self.moved(q, a, point) - self.moved(q, b, point)
        turn = self.pose(q, a)[1] - self.pose(q, b)[1]
        if "axis" in edge:
            unit = np.asarray(edge["axis"], dtype=float) / np.linalg.norm(edge["axis"])
            return {"only": slide @ unit, "x": slide @ unit, "rx": turn @ unit}
        rows = np.asarray(edge.get("axes", np.eye(3)), dtype=float)
        result = dict(zip(DIRECTIONS, [*(slide @ rows.T).T, *(turn @ rows.T).T], strict=True))
        ways = {way for body, way in self.coordinates if body in (a, b)}
        if len(ways) == 1:
            result["only"] = result[next(iter(ways))]
        return result

    # Energies ---------------------------------------------------------------------------------------------------

    def _plain(self, q: Array, edge: dict[str, Any], coefficient: dict[str, float]) -> Array:
        moves = self.elongations(q, edge)
        return sum((0.5 * value * moves[way] ** 2 for way, value in coefficient.items()), np.zeros(len(q)))

    def _inner(self, q: Array, key: Any, way: str, index: int) -> Array:
        return q[:, self.size + self.inner.index((key, way, index))]

    def strain_energy(self, q: Array) -> Array:
        total = np.zeros(len(q))
        for key, edge in self.edges.items():
            kind = edge.get("kind", "spring")
            if kind == "gear":
                total += 0.5 * edge.get("stiffness", 0.0) * self._mesh(q, edge) ** 2
            elif kind == "beam":
                total += self._beam(q, edge)
            elif kind == "spring":
                total += self._plain(q, edge, by_direction(edge.get("stiffness", {})))
                for index, branch in enumerate(edge.get("branches", ())):
                    moves = self.elongations(q, edge)
                    for way, k in by_direction(branch["stiffness"]).items():
                        total += 0.5 * k * (moves[way] - self._inner(q, key, way, index)) ** 2
        return total

    def dissipation(self, q: Array) -> Array:
        """Half the power lost at the velocities ``q``."""
        total = np.zeros(len(q))
        reference = self.graph.graph.get("reference_frequency")
        for key, edge in self.edges.items():
            kind = edge.get("kind", "spring")
            if kind == "gear":
                total += 0.5 * edge.get("damping", 0.0) * self._mesh(q, edge) ** 2
            elif kind == "spring":
                total += self._plain(q, edge, by_direction(edge.get("damping", {})))
                matched = edge.get("reference_frequency", reference)
                if "loss_factor" in edge and matched is not None:
                    k = by_direction(edge["stiffness"])
                    loss = edge["loss_factor"]
                    eta = loss if isinstance(loss, dict) else dict.fromkeys(k, loss)
                    total += self._plain(q, edge, {way: eta.get(way, 0.0) * k[way] / matched for way in k})
                for index, branch in enumerate(edge.get("branches", ())):
                    for way, c in by_direction(branch["damping"]).items():
                        total += 0.5 * c * self._inner(q, key, way, index) ** 2
        return total

    def kinetic_energy(self, q: Array) -> Array:
        """Of every body as six point masses with its mass, centre and inertia; of every inertance directly."""
        total = np.zeros(len(q))
        for name, data in self.bodies.items():
            mass = data.get("mass", 0.0)
            inertia = np.asarray(data["inertia"], dtype=float) if "inertia" in data else np.zeros((3, 3))
            translation, rotation = self.pose(q, name)
            if mass > 0:
                second = 0.5 * np.trace(inertia) * np.eye(3) - inertia
                spread, principal = np.linalg.eigh(second)
                for value, axis in zip(spread, principal.T, strict=True):
                    arm = np.sqrt(max(3 * value / mass, 0.0)) * axis
                    for side in (arm, -arm):
                        velocity = translation + carried(rotation, side)
                        total += 0.5 * (mass / 6) * np.einsum("ij,ij->i", velocity, velocity)
            else:
                total += 0.5 * np.einsum("ij,jk,ik->i", rotation, inertia, rotation)
        for edge in self.edges.values():
            if "inertance" in edge:
                total += self._plain(q, edge, by_direction(edge["inertance"]))
        return total

    def _mesh(self, q: Array, edge: dict[str, Any]) -> Array:
        """Approach of the teeth along the line of action."""
        radii = edge["gear"]["radii"] if "radii" in edge["gear"] else (edge["gear"]["ratio"], 1.0)
        angles = []
        for name in edge["between"]:
            way = next(way for body, way in self.coordinates if body == name and way.startswith("r"))
            angles.append(self.pose(q, name)[1][:, DIRECTIONS.index(way) - 3])
        return radii[0] * angles[0] - radii[1] * angles[1]

    def _beam(self, q: Array, edge: dict[str, Any]) -> Array:
        p, r = (np.asarray(end, dtype=float) for end in edge["ends"])
        length = float(np.linalg.norm(r - p))
        x = (r - p) / length
        y = np.asarray(edge["beam"]["towards"], dtype=float)
        y = y - (y @ x) * x
        y = y / np.linalg.norm(y)
        frame = np.array([x, y, np.cross(x, y)])
        a, b = edge["between"]
        parts = [self.moved(q, a, p), self.pose(q, a)[1], self.moved(q, b, r), self.pose(q, b)[1]]
        ends = np.hstack([part @ frame.T for part in parts])
        return 0.5 * np.einsum("ij,jk,ik->i", ends, timoshenko_stiffness(edge["beam"], length), ends)

    def spin_terms(self) -> Array:
        """Rate of change of the spin's angular momentum: I W (w x axis) for a body turning at w."""
        total = self.size + len(self.inner)
        result = np.zeros((total, total))
        for name, data in self.bodies.items():
            if "spin" not in data:
                continue
            axis = np.asarray(data["spin"]["axis"], dtype=float)
            momentum = data["spin"]["polar_inertia"] * data["spin"]["speed"] * axis / np.linalg.norm(axis)
            places = [(i, DIRECTIONS.index(way) - 3) for i, (body, way) in enumerate(self.coordinates) if body == name]
            for column, turning in places:
                if turning < 0:
                    continue
                torque = np.cross(np.eye(3)[turning], momentum)
                for row, about in places:
                    if about >= 0:
                        result[row, column] = torque[about]
        return result

    # Constraints ------------------------------------------------------------------------------------------------

    def constraint_violation(self, transformation: Array) -> float:
        """Largest breach of a rigid link or rigid gear by described motions, one a column of (n_described, n)."""
        worst = 0.0
        small = 1e-4
        for edge in self.edges.values():
            kind = edge.get("kind", "spring")
            if kind == "rigid":
                host, rider = edge["between"]
                ways = [DIRECTIONS.index(way) for body, way in self.coordinates if body == rider]

                def gap(sign: float, host: str = host, rider: str = rider) -> Array:
                    q = sign * small * transformation.T
                    slide = self.pose(q, rider)[0] - self.moved(q, host, self.centre(rider))
                    return np.hstack([slide, self.pose(q, rider)[1] - self.pose(q, host)[1]])

                odd = (gap(1.0) - gap(-1.0)) / (2 * small)  # the part of second order cancels
                worst = max(worst, float(np.abs(odd[:, ways]).max()))
            elif kind == "gear" and "stiffness" not in edge:
                worst = max(worst, float(np.abs(self._mesh(transformation.T, edge)).max()))
        return worst

    def dynamic_stiffness(self, s: complex, transformation: Array) -> Array:
        """s²M + sC + K over the reduced coordinates of ``transformation``, inner points eliminated."""
        full = s * s * self.mass + s * (self.damping + self.gyroscopic) + self.stiffness
        n = self.size
        condensed = full[:n, :n]
        if len(self.inner):
            condensed = condensed - full[:n, n:] @ np.linalg.solve(full[n:, n:], full[n:, :n])
        return transformation.T @ condensed @ transformation
