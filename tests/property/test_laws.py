"""Laws that hold for every machine: energy balance, unit twins, naming, order, conjugates, scaling."""

from __future__ import annotations

from typing import Any

import networkx as nx
import numpy as np
import pytest
from hypothesis import assume, example, given, reject, settings
from hypothesis import strategies as st
from machines import SIX, random_machine

import mdof
from mdof import Regime

ROUNDOFF = 2.0**-52
seeds = st.integers(0, 10**6)


def supported_machine(seed: int) -> nx.MultiGraph:
    """A random machine in space whose every body stands on its own mount, so that it has no free motion."""
    graph = random_machine(seed, kinds=("point", "frame", "ends", "axis", "branch"))
    rng = np.random.default_rng(seed + 1)
    graph.graph["reference_frequency"] = 70.0
    for body in [name for name in graph if name != "ground"]:
        graph.nodes[body].pop("directions", None)
        graph.nodes[body].pop("spin", None)
        stiffness = {way: float(10 ** rng.uniform(5, 6)) for way in SIX}
        graph.add_edge(
            body,
            "ground",
            key=f"mount of {body}",
            between=(body, "ground"),
            stiffness=stiffness,
            damping={"z": 800.0},
            loss_factor=0.1,
        )
    return graph


def dense(system: mdof.System) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    return system.M.toarray(), system.C.toarray(), system.K.toarray()


def reduced_vectors(system: mdof.System, root: complex) -> np.ndarray:
    """Right null vector of λ²M + λC + K over the reduced coordinates, independent of how the solver found the root."""
    M, C, K = dense(system)
    _, _, vectors = np.linalg.svd(root**2 * M + root * C + K)
    return vectors[-1].conj()


@given(seed=seeds)
@settings(max_examples=40, deadline=None)
def test_energy_lost_is_energy_dissipated(seed: int) -> None:
    """In every mode -2 Re λ times the stored energy is the power lost, and each connection takes its share."""
    graph = supported_machine(seed)
    system = mdof.assemble(graph)
    M, C, K = dense(system)
    for mode in mdof.solve(system):
        root = mode.eigenvalues[0]
        x = reduced_vectors(system, root)
        stored = abs(root) ** 2 * (x.conj() @ M @ x).real + (x.conj() @ K @ x).real
        lost = 2 * abs(root) ** 2 * (x.conj() @ C @ x).real
        assert -2 * root.real * stored == pytest.approx(lost, rel=1e-6)
        # The computed shape is this very vector, up to a factor.
        overlap = abs(np.vdot(x, mode.reduced_shape)) / np.linalg.norm(mode.reduced_shape)
        assert overlap == pytest.approx(1, abs=1e-6)
        shares = mode.energy
        assert np.sum(shares.kinetic) == pytest.approx(1, abs=1e-9)
        expected = losses_by_connection(system, x)
        assert set(shares.dissipated) <= set(expected)
        assert {name: shares.dissipated.get(name, 0.0) for name in expected} == pytest.approx(expected, abs=1e-6)
        if mode.regime is not Regime.RELAXATION and not any("inertance" in data for *_, data in graph.edges(data=True)):
            seen = system.recovery @ x
            total = (x.conj() @ M @ x).real
            for body in system.bodies:
                own = [i for i, name in enumerate(system.coordinate_bodies) if name == body]
                moving = 0.0
                if own:
                    data = graph.nodes[body]
                    slide, turn = seen[own[:3]], seen[own[3:]]
                    moving = data["mass"] * np.vdot(slide, slide).real + (turn.conj() @ data["inertia"] @ turn).real
                assert np.sum(shares.kinetic[own]) == pytest.approx(moving / total, abs=1e-6)


def losses_by_connection(system: mdof.System, x: np.ndarray) -> dict[str, float]:
    """Share of the dissipation at a shape, from the factors: dampers, loss factors, proportional terms."""
    power: dict[str, float] = {}
    for name, value in zip(system.damper_names, system.damping * np.abs(system.damper_columns.T @ x) ** 2, strict=True):
        power[name] = power.get(name, 0.0) + value
    for name, value in zip(
        system.spring_names, system.loss_damping() * np.abs(system.spring_columns.T @ x) ** 2, strict=True
    ):
        power[name] = power.get(name, 0.0) + value
    M, _, K = dense(system)
    for name, factor, part in (
        ("damping.mass_proportional", system.mass_proportional, M),
        ("damping.stiffness_proportional", system.stiffness_proportional, K),
    ):
        if factor:
            power[name] = factor * (x.conj() @ part @ x).real
    total = sum(power.values())
    return {name: value / total for name, value in power.items()}


@given(seed=seeds, frequency=st.floats(1.0, 500.0))
@settings(max_examples=60, deadline=None)
def test_input_power_is_dissipated_power(seed: int, frequency: float) -> None:
    """A harmonic force on M, C, K: mean input power equals mean power in the dampers, column by column."""
    system = mdof.assemble(supported_machine(seed))
    M, C, K = dense(system)
    force = system.recovery.T @ np.random.default_rng(seed).normal(size=len(system.labels))
    x = np.linalg.solve(K + 1j * frequency * C - frequency**2 * M, force.astype(complex))
    velocity = 1j * frequency * x
    power_in = 0.5 * np.vdot(velocity, force).real
    dashpots = 0.5 * system.damping @ np.abs(system.damper_columns.T @ velocity) ** 2
    losses = 0.5 * system.loss_damping() @ np.abs(system.spring_columns.T @ velocity) ** 2
    whole = (
        0.5 * system.mass_proportional * np.vdot(velocity, M @ velocity).real
        + 0.5 * system.stiffness_proportional * np.vdot(velocity, K @ velocity).real
    )
    scale = 0.5 * np.linalg.norm(velocity) * np.linalg.norm(force)
    assert abs(power_in - (dashpots + losses + whole)) <= 1e-12 * scale


def sizes(modes: mdof.DampedModes) -> np.ndarray:
    """What modes are ordered by: sqrt|λs λf| of a pair, |λ| of a single root."""
    first, second = modes.eigenvalues.T
    return np.sqrt(np.abs(first * np.where(np.isnan(second), first, second)))


def scaled(graph: nx.MultiGraph, *, length: float, mass: float, time: float) -> nx.MultiGraph:
    """The same machine in units that are ``length`` metres, ``mass`` kilograms and ``time`` seconds large."""
    twin = graph.copy()
    force = mass * length / time**2

    def by_way(values: Any, linear: float, angular: float) -> Any:
        if isinstance(values, dict):
            return {way: value / (angular if way.startswith("r") else linear) for way, value in values.items()}
        return values / linear

    for _, data in twin.nodes(data=True):
        for key, unit in (("mass", mass), ("centre", length), ("inertia", mass * length**2)):
            if key in data:
                data[key] = np.asarray(data[key]) / unit if key != "mass" else data[key] / unit
    for _, _, data in twin.edges(data=True):
        for key, unit in (("at", length), ("reference_frequency", 1 / time)):
            if key in data:
                data[key] = data[key] / unit
        if "ends" in data:
            data["ends"] = tuple(end / length for end in data["ends"])
        rates = {
            "stiffness": (force / length, force * length),
            "damping": (force * time / length, force * length * time),
            "inertance": (mass, mass * length**2),
        }
        for key, units in rates.items():
            if key in data:
                data[key] = by_way(data[key], *units)
        if "branches" in data:
            data["branches"] = [
                {key: by_way(values, *rates[key]) for key, values in branch.items()} for branch in data["branches"]
            ]
    settings_of = dict(twin.graph.get("damping", {}))
    if "mass_proportional" in settings_of:
        settings_of = {
            "mass_proportional": settings_of["mass_proportional"] * time,
            "stiffness_proportional": settings_of["stiffness_proportional"] / time,
        }
    twin.graph["damping"] = settings_of
    if "reference_frequency" in twin.graph:
        twin.graph["reference_frequency"] = twin.graph["reference_frequency"] * time
    return twin


def condition(modes: mdof.DampedModes) -> np.ndarray:
    """κ of each mode: how much a relative change of M, C, K moves its eigenvalue (Tisseur 2000), worst of its roots."""
    system = modes.system
    M, C, K = dense(system)
    norms = [np.linalg.norm(part, 2) for part in (M, C, K)]
    result = []
    for mode in modes:
        worst = 1.0
        for root in mode.eigenvalues:
            if root == 0:
                continue
            u, _, vh = np.linalg.svd(root**2 * M + root * C + K)
            x, y = vh[-1].conj(), u[:, -1]
            alpha = abs(root) ** 2 * norms[0] + abs(root) * norms[1] + norms[2]
            worst = max(worst, alpha / (abs(root) * max(abs(y.conj() @ (2 * root * M + C) @ x), 1e-300)))
        result.append(worst)
    return np.array(result)


@given(seed=seeds)
@settings(max_examples=40, deadline=None)
def test_unit_twins_agree(seed: int) -> None:
    """Millimetres, tonnes and milliseconds by exact factors: same frequencies and ratios to 100 κ 2⁻⁵²."""
    graph = supported_machine(seed)
    ours = mdof.solve(mdof.assemble(graph))
    time = 1e-3
    twin = mdof.solve(mdof.assemble(scaled(graph, length=1e-3, mass=1e3, time=time)))
    assert len(ours) == len(twin)
    allowed = 100 * condition(ours) * ROUNDOFF
    assume(np.all(allowed < 1e-3))
    assert np.all(np.abs(sizes(twin) / time / sizes(ours) - 1) <= allowed)
    both = ~np.isnan(ours.damping_ratios)
    assert np.array_equal(both, ~np.isnan(twin.damping_ratios))
    assert np.all(
        np.abs(twin.damping_ratios - ours.damping_ratios)[both]
        <= allowed[both] * np.maximum(1, ours.damping_ratios[both])
    )
    assert ours.regimes == twin.regimes


@given(seed=seeds, exponents=st.tuples(*[st.integers(-20, 20)] * 2))
@example(seed=50, exponents=(9, -14))  # residual near the gate
@settings(max_examples=40, deadline=None)
def test_scaling_laws(seed: int, exponents: tuple[int, int]) -> None:
    """M, C, K all times a: nothing changes. K times b², C times b: every root times b. Both exact."""
    rng = np.random.default_rng(seed)
    n = 6
    M, C, K = ((lambda f: f @ f.T + 0.1 * np.eye(n))(rng.normal(size=(n, n))) for _ in range(3))
    M, C, K = ((part + part.T) / 2 for part in (M, 0.05 * C, K))
    a, b = 2.0 ** exponents[0], 2.0 ** exponents[1]
    ours = mdof.solve(mdof.System.from_matrices(M, C, K))
    other = mdof.solve(mdof.System.from_matrices(a * M, a * b * C, a * b * b * K))
    assert ours.regimes == other.regimes
    np.testing.assert_allclose(other.eigenvalues / b, ours.eigenvalues, rtol=1e-10)
    np.testing.assert_allclose(other.damping_ratios, ours.damping_ratios, rtol=1e-10)


def renamed_and_shuffled(graph: nx.MultiGraph, rng: np.random.Generator) -> tuple[nx.MultiGraph, dict[str, str]]:
    names = [name for name in graph if name != "ground"]
    new = dict(zip(names, [f"Körper {index}" for index in rng.permutation(len(names))], strict=True))
    twin = nx.MultiGraph(**graph.graph)
    for name in ["ground", *[names[i] for i in rng.permutation(len(names))]]:
        twin.add_node(new.get(name, name), **graph.nodes[name])
    edges = list(graph.edges(keys=True, data=True))
    for place in rng.permutation(len(edges)):
        _, _, key, data = edges[place]
        a, b = (new.get(name, name) for name in data["between"])
        twin.add_edge(b, a, key=f"renamed {key}", **{**data, "between": (a, b)})
    return twin, new


@given(seed=seeds)
@settings(max_examples=40, deadline=None)
def test_names_and_order_do_not_matter(seed: int) -> None:
    """Bodies and connections renamed and listed in another order: same modes, same shapes at the same places."""
    graph = supported_machine(seed)
    twin, new = renamed_and_shuffled(graph, np.random.default_rng(seed))
    ours, theirs = mdof.solve(mdof.assemble(graph)), mdof.solve(mdof.assemble(twin))
    allowed = 100 * condition(ours) * ROUNDOFF
    assume(np.all(allowed < 1e-3))
    assert ours.regimes == theirs.regimes
    assert np.all(np.abs(sizes(theirs) / sizes(ours) - 1) <= allowed)
    labels = [
        f"{new[body]}.{way}"
        for body, way in zip(ours.system.coordinate_bodies, ours.system.coordinate_directions, strict=True)
    ]
    place = [theirs.system.labels.index(label) for label in labels]
    w = sizes(ours)
    for index, (a, b) in enumerate(zip(ours, theirs, strict=True)):
        gap = np.min(np.abs(np.delete(w, index) / w[index] - 1))
        if gap < 1e-3:
            continue  # close modes may share a subspace
        overlap = abs(np.vdot(a.shape, b.shape[place])) ** 2 / (
            np.vdot(a.shape, a.shape).real * np.vdot(b.shape, b.shape).real
        )
        assert overlap == pytest.approx(1, abs=1e-8)
        # The larger end of a loss list must not depend on names either.
        ours_lost = {f"renamed {key}": value for key, value in a.energy.dissipated.items()}
        assert b.energy.dissipated.get("damping.mode_ratios") is None
        for key, value in ours_lost.items():
            assert b.energy.dissipated.get(key, value) == pytest.approx(value, abs=1e-6)


@given(seed=seeds)
@settings(max_examples=20, deadline=None)
def test_floating_loss_factors_are_consistent(seed: int) -> None:
    """Without a reference every mode solves the problem whose dashpots are matched at its own |λ|."""
    graph = supported_machine(seed)
    graph.graph["reference_frequency"] = None
    for *_, data in graph.edges(data=True):
        data.pop("reference_frequency", None)
    system = mdof.assemble(graph)
    assume(system.has_floating_loss_factors)
    try:
        modes = mdof.solve(system)
    except mdof.UnverifiedError as refusal:
        # Under heavy damping the iteration may have no single answer; then it must say what to state instead.
        if "reference" not in refusal.advice:
            raise
        reject()
    M, K = system.M.toarray(), system.K.toarray()
    for mode in modes:
        root = mode.eigenvalues[0]
        if mode.regime is Regime.UNDERDAMPED:
            assert mode.damping_reference == pytest.approx(abs(root), rel=1e-8)
        C = system.damping_matrix(mode.damping_reference).toarray()
        singular = np.linalg.svd(root**2 * M + root * C + K, compute_uv=False)
        assert singular[-1] < 1e-11 * singular[0]
    assert "own frequency" in modes.loss_reference
    assert sum(len(mode.eigenvalues) for mode in modes) == 2 * system.degrees_of_freedom + system.first_order_states


@given(seed=seeds)
@settings(max_examples=40, deadline=None)
def test_roots_come_in_conjugate_pairs_and_in_order(seed: int) -> None:
    modes = mdof.solve(mdof.assemble(supported_machine(seed)))
    for mode in modes:
        if len(mode.eigenvalues) == 2:
            first, second = mode.eigenvalues
            if first.imag != 0:
                assert second == first.conjugate()
                assert first.imag > 0
            else:
                assert second.imag == 0
                assert first.real >= second.real
        else:
            assert mode.eigenvalues[0].imag == 0
        assert mode.regime in {Regime.UNDERDAMPED, Regime.OVERDAMPED, Regime.RELAXATION, Regime.CRITICALLY_DAMPED}
        biggest = np.abs(mode.shape).max()
        assert biggest == pytest.approx(1, abs=1e-12) or mode.regime is Regime.RELAXATION
    size = sizes(modes)
    assert np.all(np.diff(size) >= -1e-8 * size[1:])
    assert [mode.number for mode in modes] == list(range(1, len(modes) + 1))


@given(seed=seeds)
@settings(max_examples=40, deadline=None)
def test_solving_leaves_the_system_alone(seed: int) -> None:
    """Solving twice gives the same bits, and the arrays handed out cannot be written to."""
    system = mdof.assemble(supported_machine(seed))
    before = [part.copy() for part in dense(system)]
    first, second = mdof.solve(system), mdof.solve(system)
    assert np.array_equal(first.eigenvalues, second.eigenvalues, equal_nan=True)
    assert np.array_equal(first.shapes, second.shapes, equal_nan=True)
    for old, new in zip(before, dense(system), strict=True):
        assert np.array_equal(old, new)
    for array in (first.eigenvalues, first.shapes, first.damping_ratios, system.stiffness):
        with pytest.raises(ValueError, match="read-only"):
            array[0] = 0
