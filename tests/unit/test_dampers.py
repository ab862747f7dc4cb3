"""mdof.eigen.dampers: damper factors in undamped modes."""

from __future__ import annotations

import networkx as nx
import numpy as np
import pytest

import mdof
from mdof.eigen.reduce import normalise


def chain(stiffness: list[float], damping: list[float], **more: object) -> mdof.System:
    graph = nx.MultiGraph(
        directions=("x",), damping={}, **{k: v for k, v in more.items() if k == "reference_frequency"}
    )
    graph.add_node("ground", kind="ground")
    last: object = "ground"
    for index, (k, c) in enumerate(zip(stiffness, damping, strict=True)):
        graph.add_node(index, mass=1.0 + index)
        graph.add_edge(index, last, key=f"s{index}", between=(index, last), stiffness=k, damping=c)
        last = index
    return mdof.assemble(graph)


def test_the_factors_give_the_damping_matrix_in_modes() -> None:
    system = chain([3.0, 5.0, 2.0], [0.1, 0.7, 0.2])
    problem = normalise(system)
    wanted = problem.recover.T @ system.C.toarray() @ problem.recover
    assert problem.damping == pytest.approx(wanted, rel=1e-12, abs=1e-14)
    rows = problem.damper_rows
    assert (rows.T * problem.damper_signs) @ rows == pytest.approx(problem.damping, rel=1e-12)


def test_the_stretch_of_a_very_stiff_spring_keeps_its_digits() -> None:
    """In the low mode both masses move alike; a dashpot beside the stiff spring sees k1/k2 of it."""
    soft, stiff, c = 2.0, 1e12, 4.0
    problem = normalise(chain([soft, stiff], [0.0, c]))
    low = int(np.argmin(problem.sigma))
    # Static share: the force soft·x is split by mass, m2/(m1+m2) of it passes the stiff spring; M = 1 + 2.
    shape = 1 / np.sqrt(3.0)
    stretch = soft * shape * (2.0 / 3.0) / stiff
    assert np.abs(problem.damper_rows[-1, low]) == pytest.approx(np.sqrt(c) * stretch, rel=1e-9)


def test_a_loss_factor_with_a_reference_is_a_dashpot_there() -> None:
    system = chain([8.0], [0.0]).with_values(loss_factor=np.array([0.1]), loss_reference=np.array([4.0]))
    assert normalise(system).damping[0, 0] == pytest.approx(0.1 * 8.0 / 4.0)


def test_a_loss_factor_without_reference_waits_for_the_mode() -> None:
    system = chain([8.0], [0.0]).with_values(loss_factor=np.array([0.1]))
    problem = normalise(system)
    assert problem.damping[0, 0] == 0
    assert problem.loss_rows.T @ problem.loss_rows == pytest.approx(np.array([[0.8]]))


def test_a_negative_damper_keeps_its_sign() -> None:
    assert normalise(chain([8.0], [-0.5])).damping[0, 0] == pytest.approx(-0.5)
