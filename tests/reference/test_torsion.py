"""Torsional trains against closed forms."""

from __future__ import annotations

import networkx as nx
import numpy as np
import pytest
from published import read

import mdof

CASES = read("torsion.yaml")


def test_every_case_is_used() -> None:
    assert {f"test_{name}" for name in CASES} <= set(globals())


def train(inertias: list[float], shafts: dict[tuple[int, int], float]) -> mdof.System:
    """Discs 1, 2, ... on shafts; 0 is the wall."""
    graph = nx.MultiGraph(title="train", directions=("rx",), damping={})
    graph.add_node("ground", kind="ground", centre=np.zeros(3))
    names = ["ground", *(f"disc {number}" for number in range(1, len(inertias) + 1))]
    for name, inertia in zip(names[1:], inertias, strict=True):
        graph.add_node(name, inertia=inertia * np.eye(3))
    for (a, b), stiffness in shafts.items():
        graph.add_edge(names[a], names[b], key=f"shaft {a}{b}", between=(names[a], names[b]), stiffness=stiffness)
    return mdof.assemble(graph)


def test_two_discs_two_walls() -> None:
    case = CASES["two_discs_two_walls"]
    (J1, J2), (k1, k2, k3) = case.inputs["J"], case.inputs["kt"]
    modes = mdof.solve(train([J1, J2], {(1, 0): k1, (1, 2): k2, (2, 0): k3}))
    mean = ((k1 + k2) / J1 + (k2 + k3) / J2) / 2
    spread = np.sqrt(mean**2 - (k1 * k2 + k2 * k3 + k3 * k1) / (J1 * J2))
    formula = np.sqrt([mean - spread, mean + spread])
    matches = np.allclose(modes.natural_frequencies, formula, rtol=1e-13, atol=0)
    case.check(formula_matches_eig=int(matches), w=modes.natural_frequencies)


def test_free_two_disc_rotor() -> None:
    case = CASES["free_two_disc_rotor"]
    modes = mdof.solve(train(case.inputs["I"], {(1, 2): case.inputs["k"]}))
    assert modes.regimes == (mdof.Regime.RIGID_BODY, mdof.Regime.UNDAMPED)
    first, second = modes[1].shape.real
    case.check(w=modes[1].natural_frequency, node_from_1=case.inputs["length"] * first / (first - second))
    assert modes[0].shape == pytest.approx(np.ones(2))
