"""Reading the data files of published values, and asserting all of their digits."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Any

import networkx as nx
import numpy as np
import yaml

import mdof

BIBLIOGRAPHY = ("author", "title", "edition", "example", "provenance")


@dataclass(frozen=True)
class Case:
    """One published example. ``inputs`` are its data."""

    name: str
    inputs: dict[str, Any]
    published: dict[str, Any]
    tolerance: dict[str, dict[str, float]]
    recomputed: dict[str, Any]
    disagrees: tuple[str, ...]

    def check(self, *, rel: float = 1e-12, atol: float = 0.0, **values: Any) -> None:
        """Assert every published digit within its stated tolerance, and the recomputed values within ``rel``.

        ``values`` must hold every key of both. A published value known to be wrong must really be refuted.
        """
        missing = (set(self.published) | set(self.recomputed)) - set(values)
        assert not missing, f"{self.name}: nothing asserts {missing}"
        unknown = set(values) - set(self.published) - set(self.recomputed)
        assert not unknown, f"{self.name}: no such value {unknown}"
        for key, value in values.items():
            ours = np.asarray(value, dtype=float)
            if key in self.published:
                theirs = np.asarray(self.published[key], dtype=float)
                allowed = self.tolerance[key].get("abs", 0.0) + self.tolerance[key].get("rel", 0.0) * np.abs(theirs)
                near = bool(np.all(np.abs(ours - theirs) <= allowed))
                assert near != (key in self.disagrees), f"{self.name}.{key}: {ours} against published {theirs}"
            if key in self.recomputed:
                np.testing.assert_allclose(
                    ours, self.recomputed[key], rtol=rel, atol=atol, err_msg=f"{self.name}.{key}"
                )


def read(file: str) -> dict[str, Case]:
    """All cases of a data file beside this module; each must name its source."""
    text = (Path(__file__).parent / file).read_text(encoding="utf-8")
    result = {}
    for name, entry in yaml.safe_load(text).items():
        assert all(entry[key] for key in BIBLIOGRAPHY), f"{name} does not name its source"
        assert set(entry["tolerance"]) == set(entry["published"]), f"{name}: a published value without tolerance"
        result[name] = Case(
            name=name,
            inputs=entry["inputs"],
            published=entry["published"],
            tolerance=entry["tolerance"],
            recomputed=entry["recomputed"],
            disagrees=tuple(entry.get("disagrees", ())),
        )
    return result


def solve(M: Any, C: Any, K: Any) -> mdof.DampedModes:
    """Modes of three matrices."""
    return mdof.solve(mdof.System.from_matrices(np.array(M, float), np.array(C, float), np.array(K, float)))


def undamped(M: Any, K: Any) -> mdof.DampedModes:
    return solve(M, np.zeros_like(np.array(M, float)), K)


def oscillator(mass: float, damping: float, stiffness: float) -> mdof.Mode:
    """The one mode of one mass on a spring and a damper, all in one consistent system of units."""
    modes = solve([[mass]], [[damping]], [[stiffness]])
    assert len(modes) == 1
    return modes[0]


def chain(
    masses: list[float],
    springs: list[float],
    dampers: list[float] | None = None,
    damping: dict[str, Any] | None = None,
) -> mdof.System:
    """Masses in a row: ``springs[0]`` to the left wall, between neighbours, and last to the right wall if given."""
    graph = nx.MultiGraph(title="chain", directions=("x",), damping=damping or {})
    graph.add_node("ground", kind="ground", centre=np.zeros(3))
    names = [f"m{index + 1}" for index in range(len(masses))]
    for name, mass in zip(names, masses, strict=True):
        graph.add_node(name, mass=mass)
    stops = ["ground", *names, "ground"]
    for index, stiffness in enumerate(springs):
        between = (stops[index + 1], stops[index])
        data = {"stiffness": stiffness} if stiffness else {}
        if dampers and dampers[index]:
            data["damping"] = dampers[index]
        if data:
            graph.add_edge(*between, key=f"s{index + 1}", between=between, **data)
    return mdof.assemble(graph)


def component_ratios(mode: mdof.Mode) -> np.ndarray:
    """Shape of an undamped mode as real numbers, first component 1."""
    ratios = mode.shape / mode.shape[0]
    assert np.abs(ratios.imag).max() < 1e-12
    return ratios.real


def only(values: Any) -> Any:
    """The single element of a sequence."""
    items = list(values)
    assert len(items) == 1
    return items[0]
