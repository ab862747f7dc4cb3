"""Quadratic eigenproblems of theory against published values."""

from __future__ import annotations

import networkx as nx
import numpy as np
import pytest
from published import chain, only, read, solve

import mdof

CASES = read("quadratic_theory.yaml")


def test_every_case_is_used() -> None:
    assert {f"test_{name}" for name in CASES} <= set(globals())


def roots(modes: mdof.DampedModes) -> np.ndarray:
    """Every eigenvalue of a result."""
    values = modes.eigenvalues.ravel()
    return values[~np.isnan(values)]


def test_infinite_eigenvalue() -> None:
    """Singular leading matrix, unsymmetric rest. Row 2 is taken from row 1 first: that makes M symmetric."""
    case = CASES["infinite_eigenvalue"]
    rows = np.array([[1, -1, 0], [0, 1, 0], [0, 0, 1]])
    M, C, K = (rows @ np.array(case.inputs[key]) for key in ("A2", "A1", "A0"))
    found = roots(solve(M, C, K))
    real = np.sort(found[np.abs(found.imag) < 1e-9].real)
    case.check(
        rel=1e-10,
        finite_real=real,
        imag=np.sort(found.imag[found.imag > 1e-9]),
        n_infinite=2 * len(M) - len(found),
    )


def test_overdamped_chain_of_fifty() -> None:
    case = CASES["overdamped_chain_of_fifty"]
    n = case.inputs["n"]
    T = 3 * np.eye(n) - np.eye(n, k=1) - np.eye(n, k=-1)
    modes = solve(np.eye(n), case.inputs["tau"] * T, case.inputs["kappa"] * T)
    assert set(modes.regimes) == {mdof.Regime.OVERDAMPED}
    slow, fast = modes.eigenvalues.T
    case.check(
        all_real=int(np.all(modes.eigenvalues.imag == 0)),
        fast_min=fast.real.min(),
        fast_max=fast.real.max(),
        slow_min=slow.real.min(),
        slow_max=slow.real.max(),
    )


def test_critical_damping_matrix() -> None:
    """C = 2 K^(1/2) is critical; a little more in every direction is over-, a little less underdamped."""
    case = CASES["critical_damping_matrix"]
    K, C = np.array(case.inputs["K"], float), np.array(case.inputs["C_critical"], float)
    modes = solve(np.eye(2), C, K)
    assert set(modes.regimes) == {mdof.Regime.CRITICALLY_DAMPED}
    more, less = (solve(np.eye(2), C + change * np.eye(2), K) for change in (0.1, -0.1))
    computed = np.sort(roots(modes).real)
    means = [sum(mode.eigenvalues).real / 2 for mode in modes]
    case.check(
        rel=1e-12,
        eig=np.sort(np.repeat(means, 2)),
        over_all_real=int(np.all(roots(more).imag == 0)),
        under_all_complex=int(np.all(roots(less).imag != 0)),
    )
    # One by one they may split by the root of the unit roundoff, but no more.
    np.testing.assert_allclose(computed, case.published["eig"], rtol=0, atol=case.tolerance["eig"]["abs"])
    assert np.abs(roots(modes).imag).max() < 1e-6


def test_bicycle() -> None:
    case = CASES["bicycle"]
    data = {key: np.array(case.inputs[key]) for key in ("M", "K0", "K2", "C1")}
    g, v = case.inputs["g"], case.inputs["v"]
    modes = solve(data["M"], v * data["C1"], g * data["K0"] + v**2 * data["K2"])
    found = roots(modes)
    weave = only(found[found.imag > 0])
    castering, capsize = np.sort(found[found.imag == 0].real)
    at_rest = solve(data["M"], np.zeros((2, 2)), g * data["K0"])
    growing = roots(at_rest)
    case.check(
        rel=1e-11,
        weave_re=weave.real,
        weave_im=weave.imag,
        capsize=capsize,
        castering=castering,
        v0_roots=np.sort(growing[growing.real > 0].real),
    )
    assert mdof.Regime.UNDERDAMPED in modes.regimes
    assert set(at_rest.regimes) == {mdof.Regime.DIVERGENT}


@pytest.mark.parametrize(("speed", "stable"), [(4.28, False), (4.30, True), (6.02, True), (6.03, False)])
def test_bicycle_is_self_stable_between_its_two_speeds(speed: float, stable: bool) -> None:
    """4.29238 < v < 6.02426 m/s, from the same paper: weave is unstable below, capsize above."""
    data = {key: np.array(CASES["bicycle"].inputs[key]) for key in ("M", "K0", "K2", "C1")}
    modes = solve(data["M"], speed * data["C1"], 9.81 * data["K0"] + speed**2 * data["K2"])
    assert (roots(modes).real.max() < 0) == stable
    if speed < 4.29:
        assert mdof.Regime.UNSTABLE in modes.regimes


def test_travelling_string() -> None:
    case = CASES["travelling_string"]
    n, v = case.inputs["n"], case.inputs["v"]
    j = np.arange(1, n + 1)
    odd = (j[:, None] + j[None, :]) % 2 == 1
    below = np.where(odd, j[:, None] ** 2 - j[None, :] ** 2, 1)
    G = np.where(odd, 4.0 * v * np.outer(j, j) / below, 0.0)
    modes = solve(np.eye(n) / 2, G, np.diag(j**2 * np.pi**2 * (1 - v**2) / 2))
    w = modes.natural_frequencies
    assert set(modes.regimes) == {mdof.Regime.UNDAMPED}
    case.check(
        rel=1e-12,
        atol=1e-12,
        max_real=np.abs(roots(modes).real).max(),
        first_over_pi=w[0] / np.pi,
        all_over_pi=w / np.pi,
    )


def test_asymmetric_rotor() -> None:
    case = CASES["asymmetric_rotor"]
    k1, k2 = case.inputs["k1"], case.inputs["k2"]
    stable, growth = [], []
    for speed in case.inputs["speeds"]:
        modes = solve(np.eye(2), [[0, -2 * speed], [2 * speed, 0]], np.diag([k1 - speed**2, k2 - speed**2]))
        growth.append(roots(modes).real.max())
        stable.append(int(growth[-1] < 1e-9))
        if stable[-1]:
            assert set(modes.regimes) == {mdof.Regime.UNDAMPED}
        else:
            assert {mdof.Regime.UNSTABLE, mdof.Regime.DIVERGENT} & set(modes.regimes)
    case.check(stable=stable, growth_at_1p5=growth[1])


def test_disc_whirl() -> None:
    """Forward and backward whirl of a disc that may only tilt, told apart by the sense of the shape."""
    case = CASES["disc_whirl"]
    Ip, It, k, speed = (case.inputs[key] for key in ("Ip", "It", "k", "Omega"))
    graph = nx.MultiGraph(title="disc", directions=("rx", "ry"), damping={})
    graph.add_node("ground", kind="ground", centre=np.zeros(3))
    spin = {"axis": np.array([0.0, 0.0, 1.0]), "speed": speed, "polar_inertia": Ip}
    graph.add_node("disc", mass=5.0, inertia=np.diag([It, It, Ip]), spin=spin)
    graph.add_edge("disc", "ground", key="shaft", between=("disc", "ground"), stiffness={"rx": k, "ry": k})
    signed = [
        mode.damped_frequency * np.sign(-(mode.shape[1] / mode.shape[0]).imag)
        for mode in mdof.solve(mdof.assemble(graph))
    ]
    case.check(forward=max(signed), backward=min(signed))


def test_classical_modes_criterion() -> None:
    """Where K M^-1 C is symmetric the shortcut is exact in every mode; where it is not, it misses somewhere."""
    case = CASES["classical_modes_criterion"]
    chains, few = read("chains.yaml"), read("few_masses.yaml")

    def between_walls(name: str) -> tuple[np.ndarray, np.ndarray]:
        inputs = chains[name].inputs
        bare = chain([inputs["m"]] * inputs["N"], [inputs["k"]] * (inputs["N"] + 1))
        return bare.M.toarray(), bare.K.toarray()

    systems = {}
    M, K = between_walls("two_ratios_first_and_last")
    fit = chains["two_ratios_first_and_last"].recomputed
    systems["chains/two_ratios_first_and_last"] = (M, fit["beta_M"] * M + fit["beta_K"] * K, K)
    M, K = between_walls("caughey_three_powers")
    A = np.linalg.solve(M, K)
    C = M @ sum(
        b * np.linalg.matrix_power(A, p)
        for b, p in zip(chains["caughey_three_powers"].recomputed["beta"], (-1, 0, 1), strict=True)
    )
    systems["chains/caughey_three_powers"] = (M, (C + C.T) / 2, K)
    inputs = few["two_masses_damping_not_proportional"].inputs
    unequal = chain(inputs["m"], inputs["k"], inputs["c"])
    systems["few_masses/two_masses_damping_not_proportional"] = tuple(
        part.toarray() for part in (unequal.M, unequal.C, unequal.K)
    )
    inputs = few["two_equal_masses_proportional"].inputs
    systems["few_masses/two_equal_masses_proportional"] = tuple(np.array(inputs[key], float) for key in "MCK")
    classical = []
    for name in case.inputs["cases"]:
        modes = solve(*systems[name])
        exact = np.allclose(modes.damping_ratios, modes.shortcut_damping_ratios, rtol=1e-10, atol=0)
        classical.append(int(exact))
        if exact:
            assert "non-proportional-damping" not in {finding.code for finding in modes.findings}
    case.check(classical=classical)


def test_mounts_in_the_plane_of_the_centre() -> None:
    """Four equal mounts level with the centre of gravity: every mode is one pure motion; lowered mounts couple them."""
    case = CASES["mounts_in_the_plane_of_the_centre"]

    def purest(height: float) -> np.ndarray:
        graph = nx.MultiGraph(title="machine", directions=("x", "y", "z", "rx", "ry", "rz"), damping={})
        graph.add_node("ground", kind="ground", centre=np.zeros(3))
        graph.add_node("machine", mass=300.0, centre=np.zeros(3), inertia=np.diag([20.0, 45.0, 50.0]))
        for x in (-0.6, 0.6):
            for y in (-0.3, 0.3):
                stiffness = {"x": 2e5, "y": 2.5e5, "z": 4e5}
                at = np.array([x, y, height])
                graph.add_edge(
                    "machine", "ground", key=f"mount {x} {y}", between=("machine", "ground"), at=at, stiffness=stiffness
                )
        shapes = np.abs(mdof.solve(mdof.assemble(graph)).shapes)
        return np.sort(shapes, axis=0)[-2]

    case.check(decoupled=int(np.all(purest(case.inputs["az"]) < 1e-12)))
    assert np.sum(purest(-0.25) > 0.05) == 4
