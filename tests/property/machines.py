"""Machines to test laws on: graphs built by hand to the contract of ``mdof.assemble``, from a random generator."""

from __future__ import annotations

from typing import Any

import networkx as nx
import numpy as np

Array = np.ndarray
SIX = ("x", "y", "z", "rx", "ry", "rz")


def random_inertia(rng: np.random.Generator, mass: float) -> Array:
    """Inertia tensor of a cloud of point masses about its centre: always one a real body can have."""
    points = rng.normal(scale=0.4, size=(8, 3))
    points -= points.mean(axis=0)
    return mass / 8 * (np.sum(points**2) * np.eye(3) - points.T @ points)


def random_frame(rng: np.random.Generator) -> Array:
    """Rows are three right-handed directions, oblique to the global ones."""
    q, r = np.linalg.qr(rng.normal(size=(3, 3)))
    q = q * np.sign(np.diag(r))
    if np.linalg.det(q) < 0:
        q[:, 0] = -q[:, 0]
    return q.T


def rates(rng: np.random.Generator, ways: tuple[str, ...], scale: float) -> dict[str, float]:
    return {way: float(scale * 10 ** rng.uniform(-1, 1)) for way in ways}


def empty_graph(**settings: Any) -> nx.MultiGraph:
    graph = nx.MultiGraph(title="test machine", **settings)
    graph.add_node("ground", kind="ground", centre=np.zeros(3))
    return graph


def add(graph: nx.MultiGraph, name: str, a: str, b: str, **data: Any) -> None:
    graph.add_edge(a, b, key=name, between=(a, b), **data)


def random_machine(
    seed: int, *, kinds: tuple[str, ...] = ("point", "frame", "ends", "branch", "beam"), grounded: bool = True
) -> nx.MultiGraph:
    """Two to four bodies in space, joined at random; ``kinds`` says by what."""
    rng = np.random.default_rng(seed)
    graph = empty_graph(directions=SIX, damping={})
    if rng.random() < 0.3:
        graph.graph["damping"] = {"mass_proportional": 0.7, "stiffness_proportional": 2e-5}
    if rng.random() < 0.5:
        graph.graph["reference_frequency"] = float(rng.uniform(20, 200))
    names = [f"body {index}" for index in range(int(rng.integers(2, 5)))]
    for name in names:
        mass = float(10 ** rng.uniform(1, 3))
        data: dict[str, Any] = {"mass": mass, "centre": rng.uniform(-1.5, 1.5, 3), "inertia": random_inertia(rng, mass)}
        if rng.random() < 0.2:
            chosen = [way for way in SIX if rng.random() < 0.7] or ["z"]
            data["directions"] = tuple(chosen)
        if rng.random() < 0.2 and set(data.get("directions", SIX)) >= {"rx", "ry", "rz"}:
            data["spin"] = {"axis": random_frame(rng)[0], "speed": 150.0, "polar_inertia": 0.3}
        graph.add_node(name, **data)
    everyone = [*names, *(["ground"] if grounded else [])]
    for index in range(int(rng.integers(3, 7))):
        a, b = rng.choice(len(everyone), size=2, replace=False)
        a, b = everyone[a], everyone[b]
        connect(graph, rng, f"link {index}", a, b, kinds[int(rng.integers(len(kinds)))])
    return graph


def connect(graph: nx.MultiGraph, rng: np.random.Generator, name: str, a: str, b: str, kind: str) -> None:
    """One random connection of a kind between two bodies."""
    point = rng.uniform(-1.5, 1.5, 3)
    if kind == "point":
        data: dict[str, Any] = {
            "stiffness": rates(rng, SIX, 1e6),
            "damping": rates(rng, ("x", "y", "rz"), 1e3),
            "loss_factor": 0.08,
        }
        if rng.random() < 0.5:
            data["at"] = point
        if rng.random() < 0.5:
            data["reference_frequency"] = 75.0
        if rng.random() < 0.3:
            data["inertance"] = {"z": 12.0}
    elif kind == "frame":
        data = {
            "at": point,
            "axes": random_frame(rng),
            "stiffness": rates(rng, ("x", "z", "ry"), 1e6),
            "damping": rates(rng, ("y",), 1e3),
        }
    elif kind == "ends":
        data = {
            "ends": (point, point + rng.uniform(0.2, 2.0) * random_frame(rng)[0]),
            "stiffness": 3e5,
            "damping": 900.0,
        }
    elif kind == "axis":
        data = {"at": point, "axis": random_frame(rng)[0], "stiffness": 3e5, "damping": 900.0, "inertance": 8.0}
    elif kind == "branch":
        data = {
            "at": point,
            "axes": random_frame(rng),
            "stiffness": {"z": 4e5},
            "branches": [{"stiffness": {"z": 2e5, "x": 1e5}, "damping": {"z": 3e3, "x": 1e3}}],
        }
        if rng.random() < 0.4:
            data["branches"].append({"stiffness": {"ry": 2e4}, "damping": {"ry": 50.0}})
    elif kind == "beam":
        data = {
            "kind": "beam",
            "ends": (point, point + rng.uniform(0.2, 2.0) * random_frame(rng)[0]),
            "beam": {
                "youngs_modulus": 2.0e11,
                "shear_modulus": 7.7e10,
                "area": 1.2e-3,
                "second_moments": (4e-7, 1.5e-6),
                "torsion_constant": 6e-7,
                "towards": rng.normal(size=3),
            },
        }
        if rng.random() < 0.5:
            data["beam"]["shear_areas"] = (6e-4, 4e-4)
    else:
        raise ValueError(f"no connection kind {kind!r}")
    add(graph, name, a, b, **data)
