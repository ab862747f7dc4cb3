"""mdof.modes.proportionality: what the shortcut misstates, and who is to blame."""

from __future__ import annotations

import numpy as np
import pytest

import mdof
from mdof.eigen.reduce import normalise
from mdof.modes.proportionality import shortcut


def pair(damping: float, between: list[str]) -> mdof.DampedModes:
    """Two close oscillators on a base; one damper."""
    model = mdof.Model(
        bodies={"left": "1 kg", "right": "1 kg"},
        connections={
            "a": {"between": ["left", "ground"], "stiffness": "100 N/m"},
            "b": {"between": ["right", "ground"], "stiffness": "104 N/m"},
            "tie": {"between": ["left", "right"], "stiffness": "1 N/m"},
            "pot": {"between": between, "damping": f"{damping} N*s/m"},
        },
    )
    return mdof.solve(mdof.assemble(model))


def test_one_local_damper_on_close_modes_is_reported_with_its_name() -> None:
    modes = pair(1.0, ["left", "ground"])
    (finding,) = [entry for entry in modes.findings if entry.code == "non-proportional-damping"]
    assert finding.modes == (2,)
    assert finding.connections == ("pot",)
    # The message quotes both sides of the worst mode.
    assert "shortcut says" in finding.message


def test_light_damping_is_no_alarm() -> None:
    assert not [entry for entry in pair(0.001, ["left", "ground"]).findings if entry.code == "non-proportional-damping"]


def test_the_commutator_vanishes_for_proportional_damping_only() -> None:
    rng = np.random.default_rng(0)
    A = rng.normal(size=(4, 4))
    K = A @ A.T + np.eye(4)
    M = np.diag(rng.uniform(1, 2, 4))
    proportional = shortcut(normalise(mdof.System.from_matrices(M, 0.3 * M + 0.01 * K, K)))
    assert proportional.commutator < 1e-13
    C = np.diag([1.0, 0, 0, 0])
    local = shortcut(normalise(mdof.System.from_matrices(M, C, K)))
    # Caughey & O'Kelly's difference in mass-normalised coordinates, formed independently.
    root = np.diag(1 / np.sqrt(np.diag(M)))
    c, k = root @ C @ root, root @ K @ root
    assert local.commutator == pytest.approx(np.linalg.norm(c @ k - k @ c) / np.linalg.norm(k @ c), rel=1e-10)


def test_the_shortcut_ratio_is_the_diagonal_of_modal_damping() -> None:
    modes = pair(1.0, ["left", "ground"])
    K, C = modes.system.K.toarray(), modes.system.C.toarray()
    squares, shapes = np.linalg.eigh(K)
    wanted = np.einsum("ij,ik,kj->j", shapes, C, shapes) / (2 * np.sqrt(squares))
    assert np.sort(modes.shortcut_damping_ratios) == pytest.approx(np.sort(wanted), rel=1e-10)
