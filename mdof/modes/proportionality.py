"""Is the proportional-damping shortcut safe? First level: exact against shortcut, mode by mode.

The shortcut gives each undamped mode its own ratio d_jj/(2ω_j) and forgets the off-diagonal terms of D = ΦᵀCΦ.
Caughey & O'Kelly (J. Appl. Mech. 32, 1965): it is exact if and only if C M⁻¹ K is symmetric, that is if every
d_jk (ω_k² − ω_j²) vanishes. No whole-matrix index decides alone, so modes are judged one by one.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from mdof.findings import Finding, finding

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from mdof.eigen.reduce import NormalisedProblem
    from mdof.system import System

__all__ = ["Shortcut", "proportionality_findings", "shortcut"]

#: A mode is misstated when its ratio is off by more than this share of itself and by more than the absolute value ...
RATIO_SHARE, RATIO_LEAST = 0.10, 0.002
#: ... or its frequency by more than this share.
FREQUENCY_SHARE = 0.03


@dataclass(frozen=True, kw_only=True, slots=True, eq=False)
class Shortcut:
    """Undamped modes with the damping the shortcut gives them.

    Attributes
    ----------
    shapes : ndarray, shape (m, n_undamped)
        In the normalised problem's coordinates, unit mass.
    frequencies : ndarray, shape (n_undamped,) [rad/s]
    damping : ndarray, shape (n_undamped, n_undamped)
        D = ΦᵀCΦ, loss factors without a reference left out.
    loss : ndarray, shape (n_undamped, n_undamped)
        ΦᵀHΦ of those, to be divided by a reference.
    commutator : float
        ‖CM⁻¹K − KM⁻¹C‖ over ‖KM⁻¹C‖, Frobenius, in mass-normalised coordinates.
    own_coordinates : bool
        The undamped modes are the problem's coordinates, so that ``shapes`` is the identity.
    """

    shapes: NDArray[np.float64]
    frequencies: NDArray[np.float64]
    damping: NDArray[np.float64]
    loss: NDArray[np.float64]
    commutator: float
    own_coordinates: bool

    def ratios(self) -> NDArray[np.float64]:
        """Shortcut damping ratio of every undamped mode; NaN for free motions."""
        with np.errstate(divide="ignore", invalid="ignore"):
            own = np.diag(self.damping) + np.where(self.frequencies > 0, np.diag(self.loss) / self.frequencies, 0.0)
            return np.where(self.frequencies > 0, own / (2 * self.frequencies), np.nan)

    def nearest(self, vectors: NDArray[np.complex128], heavy: int) -> NDArray[np.int64]:
        """Index of the undamped mode nearest in shape to each root vector."""
        like = np.abs(vectors) if self.own_coordinates else np.abs(self.shapes[:heavy].T @ vectors[:heavy])
        return np.asarray(np.argmax(like, axis=0), dtype=np.int64)


def shortcut(problem: NormalisedProblem) -> Shortcut:
    """Undamped modes and the shortcut's damping; massless coordinates follow their springs."""
    heavy, size = problem.heavy, problem.recover.shape[1]
    if problem.modal:
        shapes = np.eye(size)
        squares = np.concatenate([problem.sigma**2 * problem.sign, np.zeros(problem.N.shape[1])])
    else:
        stiffness = (problem.W * (problem.sigma**2 * problem.sign)) @ problem.W.T
        follow = -np.linalg.pinv(stiffness[heavy:, heavy:], hermitian=True) @ stiffness[heavy:, :heavy]
        condensed = stiffness[:heavy, :heavy] + stiffness[:heavy, heavy:] @ follow
        squares, modes = np.linalg.eigh(0.5 * (condensed + condensed.T))
        squares[np.abs(squares) <= size * 1e-15 * np.abs(squares).max(initial=0.0)] = 0.0
        shapes = np.vstack([modes, follow @ modes])
    symmetric = 0.5 * (problem.damping + problem.damping.T)
    damping = symmetric if problem.modal else shapes.T @ symmetric @ shapes
    rows = problem.loss_rows if problem.modal else problem.loss_rows @ shapes
    gap = damping * (squares[:, None] - squares[None, :])
    weight = float(np.linalg.norm(damping * squares[:, None]))
    return Shortcut(
        shapes=shapes,
        frequencies=np.sqrt(np.maximum(squares, 0.0)),
        damping=damping,
        loss=rows.T @ rows,
        own_coordinates=problem.modal,
        commutator=float(np.linalg.norm(gap)) / weight if weight > 0 else 0.0,
    )


def proportionality_findings(
    system: System,
    problem: NormalisedProblem,
    plain: Shortcut,
    nearest: NDArray[np.int64],
    exact_ratios: NDArray[np.float64],
    exact_frequencies: NDArray[np.float64],
) -> list[Finding]:
    """Name the modes the shortcut misstates and the connections that couple them.

    Parameters
    ----------
    nearest : ndarray of int, shape (n_modes,); -1 for modes without a ratio
    exact_ratios, exact_frequencies : ndarray, shape (n_modes,) [-, rad/s]
    """
    told = (nearest >= 0) & ~np.isnan(exact_ratios)
    easy = np.append(plain.ratios(), np.nan)[nearest]
    undamped = np.append(plain.frequencies, np.nan)[nearest]
    size = np.abs(exact_ratios)
    with np.errstate(divide="ignore", invalid="ignore"):
        shift, drift = np.abs(easy - exact_ratios), np.abs(undamped / exact_frequencies - 1)
        wrong = told & (((shift > RATIO_SHARE * size) & (shift > RATIO_LEAST)) | (drift > FREQUENCY_SHARE))
        measure = np.where(wrong, np.fmax(shift / np.maximum(size, RATIO_LEAST), drift), 0.0)
    if not wrong.any():
        return []
    misled = [int(index) + 1 for index in np.nonzero(wrong)[0]]
    worst = int(np.argmax(measure))
    worst_text = (
        f"mode {worst + 1} at {exact_frequencies[worst] / (2 * np.pi):.4g} Hz has {100 * exact_ratios[worst]:.3g} %, "
        f"the shortcut says {100 * easy[worst]:.3g} % at {undamped[worst] / (2 * np.pi):.4g} Hz"
    )
    names = _couplers(system, problem, plain, nearest[np.array(misled) - 1])
    message = (
        f"the proportional-damping shortcut misstates {len(misled)} of {len(nearest)} modes; worst: {worst_text}; "
        f"commutator ratio {plain.commutator:.2g}"
    )
    if names:
        message += f"; coupled most by {_grouped(names)}"
    return [finding("non-proportional-damping", message, modes=tuple(misled), connections=names)]


def _grouped(names: tuple[str, ...]) -> str:
    """Names of one family, as ``mount/left`` and ``mount/right``, written together."""
    families: dict[str, list[str]] = {}
    for name in names:
        stem, _, member = name.partition("/")
        families.setdefault(stem, []).append(member)
    return ", ".join(f"{stem} ({', '.join(members)})" if members[0] else stem for stem, members in families.items())


def _couplers(
    system: System, problem: NormalisedProblem, plain: Shortcut, undamped: NDArray[np.int64]
) -> tuple[str, ...]:
    """At most four connections with the largest share in the off-diagonal terms that matter to these modes."""
    lossy = system.loss_factor != 0
    stated = np.nonzero(lossy & np.isfinite(system.loss_reference))[0]
    floating = np.nonzero(lossy & ~np.isfinite(system.loss_reference))[0]
    names = [*system.damper_names, *(system.spring_names[index] for index in stated)]
    names += ["matrix C"] * problem.general_rows
    rows = problem.damper_rows if plain.own_coordinates else problem.damper_rows @ plain.shapes
    loss = problem.loss_rows if plain.own_coordinates else problem.loss_rows @ plain.shapes
    signs = problem.damper_signs
    names += [system.spring_names[index] for index in floating]
    typical = float(np.median(plain.frequencies[plain.frequencies > 0])) if np.any(plain.frequencies > 0) else 1.0
    rows = np.vstack([rows, loss / np.sqrt(typical)])
    signs = np.concatenate([signs, np.ones(len(floating))])
    chosen = np.unique(undamped)
    squares = plain.frequencies**2
    # A term d_jk moves mode j by about λ d_jk² λ / (ω_k² − ω_j² + ...); half its own band keeps close modes finite.
    own = np.abs(np.diag(plain.damping))
    distance = np.abs(squares[None, :] - squares[chosen, None]) + plain.frequencies[chosen, None] * (
        own[None, :] + own[chosen, None]
    )
    total = rows.T @ (rows * signs[:, None])
    weight = np.abs(total[chosen]) / np.maximum(distance, 1e-300)
    weight[np.arange(len(chosen)), chosen] = 0.0
    share: dict[str, float] = {}
    terms = np.einsum("ij,ij->i", rows[:, chosen] @ (weight * np.sign(total[chosen])), rows) * signs
    for name, value in zip(names, terms, strict=True):
        share[name] = share.get(name, 0.0) + float(value)
    ranked = sorted(share.items(), key=lambda item: -item[1])
    most = ranked[0][1] if ranked else 0.0
    return tuple(name for name, value in ranked[:4] if value > 0.05 * most)
