"""mdof.proportional: damping of the whole, added to a System."""

from __future__ import annotations

import networkx as nx
import numpy as np
import pytest

import mdof
from mdof.proportional import with_proportional_damping


def undamped(*edges: tuple[str, str, float], masses: dict[str, float | None], **more: object) -> mdof.System:
    """Bodies on a line; an edge is (a, b, stiffness); a mass of None is a massless joint."""
    graph = nx.MultiGraph(directions=("x",), damping={})
    graph.add_node("ground", kind="ground")
    for name, mass in masses.items():
        graph.add_node(name, mass=mass or 0.0, **({"massless": True} if mass is None else {}))
    for index, (a, b, stiffness) in enumerate(edges):
        own = {"damping": 0.7} if more.get("damper") == index else {}
        own |= {"loss_factor": 0.2, "reference_frequency": 5.0} if more.get("lossy") == index else {}
        graph.add_edge(a, b, key=f"s{index}", between=(a, b), stiffness=stiffness, **own)
    return mdof.assemble(graph)


PAIR = (("a", "ground", 50.0), ("b", "a", 70.0))
MASSES: dict[str, float | None] = {"a": 2.0, "b": 3.0}


@pytest.mark.parametrize("targets", [[(3.0, 0.02), (40.0, 0.05)], [(40.0, 0.05), (3.0, 0.02)]])
def test_rayleigh_coefficients_are_those_of_the_closed_form_in_any_order(targets: list[tuple[float, float]]) -> None:
    """α = 2ω₁ω₂(ζ₁ω₂ − ζ₂ω₁)/(ω₂² − ω₁²), β = 2(ζ₂ω₂ − ζ₁ω₁)/(ω₂² − ω₁²)."""
    system = with_proportional_damping(undamped(*PAIR, masses=MASSES), {"two_ratios": targets})
    (w1, z1), (w2, z2) = (3.0, 0.02), (40.0, 0.05)
    spread = w2**2 - w1**2
    assert system.mass_proportional == pytest.approx(2 * w1 * w2 * (z1 * w2 - z2 * w1) / spread, rel=1e-12)
    assert system.stiffness_proportional == pytest.approx(2 * (z2 * w2 - z1 * w1) / spread, rel=1e-12)
    assert system.two_ratios == ((w1, z1), (w2, z2))


def test_given_coefficients_are_taken_as_they_are_and_missing_ones_are_zero() -> None:
    system = with_proportional_damping(undamped(*PAIR, masses=MASSES), {"mass_proportional": 0.3})
    assert (system.mass_proportional, system.stiffness_proportional, system.two_ratios) == (0.3, 0.0, None)
    system = with_proportional_damping(system, {"mass_proportional": None, "stiffness_proportional": 2e-3})
    assert (system.mass_proportional, system.stiffness_proportional) == (0.0, 2e-3)


def test_one_ratio_adds_the_sum_over_modes_to_the_damping_matrix() -> None:
    """C = Σ (Mφ) 2ζω (Mφ)ᵀ equals 2ζ M sqrtm(M⁻¹K)."""
    from scipy.linalg import sqrtm

    plain = undamped(*PAIR, masses=MASSES)
    system = with_proportional_damping(plain, {"mode_ratios": 0.04})
    M, K = plain.M.toarray(), plain.K.toarray()
    assert system.C.toarray() == pytest.approx(2 * 0.04 * M @ np.real(sqrtm(np.linalg.solve(M, K))), rel=1e-12)
    assert set(system.damper_names) == {"damping.mode_ratios"}
    assert system.damper_spring.tolist() == [-1, -1]
    assert system.damper_grounded.all()


@pytest.mark.parametrize("kind", ["damper", "lossy"])
def test_a_connection_with_damping_of_its_own_is_left_out_of_the_one_ratio(kind: str) -> None:
    """Without the spring between them, a is alone on its ground spring: 2ζ sqrt(k m) there, nothing on b."""
    plain = undamped(*PAIR, masses=MASSES, **{kind: 1})
    system = with_proportional_damping(plain, {"mode_ratios": 0.04})
    wanted = plain.C.toarray() + np.diag([2 * 0.04 * np.sqrt(50.0 * 2.0), 0.0])
    assert system.C.toarray() == pytest.approx(wanted, rel=1e-12)


def test_one_ratio_holds_for_every_mode_beside_a_massless_joint() -> None:
    """Two masses and the ground meet in a joint; the modes are those on the condensed star."""
    springs = (("a", "joint", 30.0), ("b", "joint", 50.0), ("joint", "ground", 90.0))
    plain = undamped(*springs, masses={"a": 2.0, "joint": None, "b": 3.0})
    modes = mdof.solve(with_proportional_damping(plain, {"mode_ratios": 0.04}))
    star = np.diag([30.0, 50.0]) - np.outer([30.0, 50.0], [30.0, 50.0]) / 170.0
    scale = 1 / np.sqrt([2.0, 3.0])
    wanted = np.sqrt(np.linalg.eigvalsh(star * np.outer(scale, scale)))
    assert modes.natural_frequencies == pytest.approx(wanted, rel=1e-12)
    assert modes.damping_ratios == pytest.approx([0.04, 0.04], rel=1e-12)


def test_a_free_motion_gets_no_damping_from_the_one_ratio() -> None:
    plain = undamped(("b", "a", 70.0), masses={"a": 2.0, "b": 3.0})
    system = with_proportional_damping(plain, {"mode_ratios": 0.04})
    assert len(system.damping) == 1
    assert system.C.toarray() @ np.ones(2) == pytest.approx([0.0, 0.0], abs=1e-14)
    rigid, elastic = mdof.solve(system)
    assert (rigid.regime, rigid.decay_rate) == ("rigid body", 0.0)
    assert elastic.damping_ratio == pytest.approx(0.04, rel=1e-12)


@pytest.mark.parametrize("soft", [1e5, 1e3, 10.0, 1.0])
def test_one_ratio_for_every_mode_reaches_soft_modes_beside_stiff_springs(soft: float) -> None:
    graph = nx.MultiGraph(directions=("x",), damping={"mode_ratios": 0.03})
    graph.add_node("ground", kind="ground")
    graph.add_node("a", mass=1.0)
    graph.add_node("b", mass=2.0)
    graph.add_edge("a", "ground", key="s", between=("a", "ground"), stiffness=soft)
    graph.add_edge("b", "a", key="t", between=("b", "a"), stiffness=4e9)
    assert mdof.solve(mdof.assemble(graph)).damping_ratios == pytest.approx([0.03, 0.03], rel=1e-9)
