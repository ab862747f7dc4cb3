"""The same machine written in SI and in US customary units: converted exactly, read, assembled and solved alike."""

from __future__ import annotations

from fractions import Fraction
from typing import Any

import numpy as np
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from machines import SIX, random_inertia

import mdof

ROUNDOFF = 2.0**-52
INCH, POUND, GRAVITY = Fraction("0.0254"), Fraction("0.45359237"), Fraction("9.80665")
POUND_FORCE = POUND * GRAVITY
#: Unit as written in the twin, and its exact size in SI.
US = {
    "m": ("in", INCH),
    "kg": ("lb", POUND),
    "N": ("lbf", POUND_FORCE),
    "kg*m^2": ("lbf*in*s^2", POUND_FORCE * INCH),
    "N/m": ("lbf/in", POUND_FORCE / INCH),
    "N*m/rad": ("lbf*in/rad", POUND_FORCE * INCH),
    "N*s/m": ("lbf*s/in", POUND_FORCE / INCH),
    "N*m*s/rad": ("lbf*in*s/rad", POUND_FORCE * INCH),
    "Hz": ("rpm", Fraction(1, 60)),
}


def written(value: float, unit: str, us: bool) -> str:
    """A quantity as text: in SI, or converted without rounding and then written as the nearest double."""
    if not us:
        return f"{float(value)!r} {unit}"
    name, size = US[unit]
    return f"{float(Fraction(float(value)) / size)!r} {name}"


def machine(seed: int, us: bool) -> mdof.Model:
    rng = np.random.default_rng(seed)

    def point() -> list[str]:
        return [written(value, "m", us) for value in rng.uniform(-1, 1, 3)]

    def by_way(linear: str, angular: str, scale: float) -> dict[str, str]:
        return {
            way: written(scale * 10 ** rng.uniform(-0.5, 0.5), angular if way[0] == "r" else linear, us) for way in SIX
        }

    bodies: dict[str, Any] = {}
    for name in ("frame", "machine"):
        mass = float(rng.uniform(50, 500))
        J = random_inertia(rng, mass)
        places = {"xx": (0, 0), "yy": (1, 1), "zz": (2, 2), "xy": (0, 1), "yz": (1, 2), "xz": (0, 2)}
        inertia = {key: written(J[i, j] if i == j else -J[i, j], "kg*m^2", us) for key, (i, j) in places.items()}
        heavy = {"mass": written(mass, "kg", us)}
        if name == "machine":
            heavy = {"weight": written(mass * 9.80665, "N", us)}
        bodies[name] = {**heavy, "centre": point(), "inertia": inertia}
    connections = {
        "mount": {
            "between": ["frame", "ground"],
            "at": {"a": point(), "b": point()},
            "stiffness": by_way("N/m", "N*m/rad", 1e6),
            "damping": by_way("N*s/m", "N*m*s/rad", 1e3),
        },
        "foot": {
            "between": ["machine", "frame"],
            "at": point(),
            "stiffness": by_way("N/m", "N*m/rad", 1e7),
            "loss_factor": 0.1,
            "reference_frequency": written(15.0, "Hz", us),
            "branches": [{"stiffness": {"z": written(3e5, "N/m", us)}, "damping": {"z": written(900.0, "N*s/m", us)}}],
        },
        "stay": {"between": ["machine", "ground"], "ends": [point(), point()], "stiffness": written(2e5, "N/m", us)},
    }
    return mdof.Model(title="twin", directions=list(SIX), bodies=bodies, connections=connections)


def condition(modes: mdof.DampedModes) -> float:
    """Largest condition number of a root in the units of the solved system (Tisseur 2000)."""
    M, C, K = (part.toarray() for part in (modes.system.M, modes.system.C, modes.system.K))
    worst = 1.0
    for root in modes.eigenvalues[~np.isnan(modes.eigenvalues)]:
        u, _, vh = np.linalg.svd(root**2 * M + root * C + K)
        weight = sum(abs(root) ** power * np.linalg.norm(part, 2) for power, part in ((2, M), (1, C), (0, K)))
        worst = max(worst, weight / (abs(root) * abs(u[:, -1].conj() @ (2 * root * M + C) @ vh[-1].conj())))
    return worst


@given(seed=st.integers(0, 10**6))
@settings(max_examples=25, deadline=None)
def test_si_and_us_customary_twins_agree(seed: int) -> None:
    """To 100 κ 2⁻⁵²: reading and converting adds nothing beyond rounding of the inputs."""
    ours, twin = (mdof.solve(mdof.assemble(machine(seed, us))) for us in (False, True))
    allowed = 100 * condition(ours) * ROUNDOFF
    assume(allowed < 1e-4)
    assert ours.regimes == twin.regimes
    np.testing.assert_allclose(twin.eigenvalues, ours.eigenvalues, rtol=allowed, atol=0)
    np.testing.assert_allclose(twin.damping_ratios, ours.damping_ratios, rtol=allowed, atol=allowed)
    np.testing.assert_allclose(twin.system.M.toarray(), ours.system.M.toarray(), rtol=1e-12, atol=1e-13)
