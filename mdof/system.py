"""The frozen System: mass, stiffness and damping kept as factors, not only as matrices.

A direction at a point is one column b of an incidence matrix B, so every spring set is ``K = B diag(k) Bᵀ`` and every
damper set is ``C = B diag(c) Bᵀ``. Matrices are made on demand.
"""

from __future__ import annotations

import dataclasses
from dataclasses import dataclass, field
from functools import cached_property
from itertools import pairwise
from typing import TYPE_CHECKING, Any

import numpy as np

from mdof.errors import UsageError

if TYPE_CHECKING:
    from collections.abc import Sequence

    from numpy.typing import ArrayLike, NDArray

__all__ = ["System"]

#: Coordinates of a small system.
_SMALL = 200


def _sparse(matrix: Any, name: str, shape: tuple[int, int] | None = None) -> Any:
    """``matrix`` as a csc_array of float64; refuses complex, non-finite and wrongly shaped input."""
    from scipy.sparse import csc_array, issparse

    if not issparse(matrix):
        matrix = np.atleast_2d(np.asarray(matrix))
    if matrix.dtype.kind not in "fiub":
        raise UsageError(f"{name} must hold real numbers, not {matrix.dtype}")
    result = csc_array(matrix, dtype=np.float64)
    if result.ndim != 2 or (shape is not None and result.shape != shape):
        raise UsageError(f"{name} must have shape {shape}, not {result.shape}")
    if not np.all(np.isfinite(result.data)):
        raise UsageError(f"{name} holds NaN or infinite entries")
    return result


def _vector(values: ArrayLike, length: int) -> NDArray[np.float64]:
    result = np.array(values, dtype=np.float64).reshape(length)
    result.flags.writeable = False
    return result


@dataclass(frozen=True, kw_only=True, eq=False)
class System:
    """A linear second-order system ``M ẍ + (C + G) ẋ + K x = 0`` in n reduced coordinates, in factors.

    Attributes
    ----------
    mass : csc_array, shape (n, n) [kg, kg m, kg m²]
        Symmetric positive semidefinite; rows of zeros are massless coordinates.
    spring_columns : csc_array, shape (n, n_springs)
    stiffness : ndarray, shape (n_springs,) [N/m, N m/rad]
    loss_factor : ndarray, shape (n_springs,)
    loss_reference : ndarray, shape (n_springs,) [rad/s]
        Angular frequency at which the loss factor is matched by a dashpot; NaN where none is stated.
    spring_names, damper_names : tuple of str
        The connection each column belongs to.
    damper_columns : csc_array, shape (n, n_dampers)
    damping : ndarray, shape (n_dampers,) [N s/m, N m s/rad]
    damper_spring : ndarray of int, shape (n_dampers,)
        Index of the spring column with the very same direction, or -1.
    damper_grounded, spring_grounded : ndarray of bool
        True where the column ties a body to a ground.
    mass_proportional [1/s], stiffness_proportional [s] : float
        Proportional damping ``mass_proportional * M + stiffness_proportional * K``.
    two_ratios : ((f1, ζ1), (f2, ζ2)) with f in rad/s, or None
        The targets the proportional terms were fitted to.
    extra_stiffness, extra_damping : csc_array, shape (n, n), or None
        General real matrices added to the factors (imported, or from :meth:`from_matrices`).
    gyroscopic : csc_array, shape (n, n), or None
        Skew-symmetric velocity-proportional part.
    first_order_states : int
        Internal coordinates of series branches; they stand last among the reduced coordinates.
    recovery : csc_array, shape (n_described, n)
        Described coordinates (every direction of every body) from reduced ones; rigid links are in here.
    coordinate_bodies, coordinate_directions : tuple of str, length n_described
    bodies : mapping of body name to mass [kg], in file order
    """

    mass: Any
    spring_columns: Any
    stiffness: NDArray[np.float64]
    damper_columns: Any
    damping: NDArray[np.float64]
    loss_factor: NDArray[np.float64]
    loss_reference: NDArray[np.float64]
    spring_names: tuple[str, ...]
    damper_names: tuple[str, ...]
    damper_spring: NDArray[np.int64]
    spring_grounded: NDArray[np.bool_]
    damper_grounded: NDArray[np.bool_]
    coordinate_bodies: tuple[str, ...]
    coordinate_directions: tuple[str, ...]
    recovery: Any
    mass_proportional: float = 0.0
    stiffness_proportional: float = 0.0
    two_ratios: tuple[tuple[float, float], tuple[float, float]] | None = None
    extra_stiffness: Any = None
    extra_damping: Any = None
    gyroscopic: Any = None
    first_order_states: int = 0
    bodies: dict[str, float] = field(default_factory=dict)

    @property
    def size(self) -> int:
        """Number of reduced coordinates, inner coordinates of series branches included."""
        return int(self.mass.shape[0])

    @property
    def degrees_of_freedom(self) -> int:
        """Number of independent coordinates of the bodies."""
        return self.size - self.first_order_states

    @property
    def labels(self) -> tuple[str, ...]:
        """Described coordinates as ``body.direction``."""
        pairs = zip(self.coordinate_bodies, self.coordinate_directions, strict=True)
        return tuple(f"{body}.{direction}" for body, direction in pairs)

    @cached_property
    def own_coordinates(self) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
        """For every reduced coordinate of a body: the described coordinate that it is, and its own index."""
        entries = self.recovery.tocoo()
        single = np.bincount(entries.row, minlength=entries.shape[0]) == 1
        exact = single[entries.row] & (entries.data == 1.0)
        column, first = np.unique(entries.col[exact], return_index=True)
        return entries.row[exact][first].astype(np.int64), column.astype(np.int64)

    @property
    def is_small(self) -> bool:
        """True where dense products beat sparse ones."""
        return self.size <= _SMALL

    def handy(self, name: str) -> Any:
        """A stored matrix as a dense array where that multiplies faster than a sparse one; made once."""
        matrix = getattr(self, name)
        if matrix is None or not self.is_small:
            return matrix
        if name not in self._dense:
            self._dense[name] = matrix.toarray()
        return self._dense[name]

    @cached_property
    def _dense(self) -> dict[str, NDArray[np.float64]]:
        return {}

    @cached_property
    def M(self) -> Any:
        """Mass matrix, csc_array, shape (n, n)."""
        return self.mass

    @cached_property
    def K(self) -> Any:
        """Stiffness matrix, csc_array, shape (n, n) [N/m, N, N m]."""
        matrix = _weighted_gram(self.spring_columns, self.stiffness)
        return matrix if self.extra_stiffness is None else (matrix + self.extra_stiffness).tocsc()

    @cached_property
    def C(self) -> Any:
        """Viscous damping matrix without loss factors, csc_array, shape (n, n) [N s/m, N s, N m s].

        Dampers, proportional terms, general terms and the gyroscopic part are included.
        """
        return self.damping_matrix()

    def damping_matrix(self, reference: float | None = None) -> Any:
        """Viscous damping matrix with loss factors as dashpots matched at a reference frequency.

        Parameters
        ----------
        reference : float [rad/s], optional
            Used for loss factors without a stated reference; without it those are left out.
        """
        matrix = _weighted_gram(self.damper_columns, self.damping)
        matrix = matrix + _weighted_gram(self.spring_columns, self.loss_damping(reference))
        if self.mass_proportional:
            matrix = matrix + self.mass_proportional * self.mass
        if self.stiffness_proportional:
            matrix = matrix + self.stiffness_proportional * self.K
        for part in (self.extra_damping, self.gyroscopic):
            if part is not None:
                matrix = matrix + part
        return matrix.tocsc()

    def loss_damping(self, reference: float | None = None) -> NDArray[np.float64]:
        """Equivalent viscous coefficient ``η k / ω`` of each spring column, shape (n_springs,) [N s/m]."""
        frequency = np.where(
            np.isnan(self.loss_reference), np.nan if reference is None else reference, self.loss_reference
        )
        with np.errstate(invalid="ignore"):
            values = self.loss_factor * self.stiffness / frequency
        return np.where((self.loss_factor != 0) & np.isfinite(frequency), values, 0.0)

    @property
    def has_floating_loss_factors(self) -> bool:
        """True where a loss factor states no reference frequency and must use the mode's own."""
        return bool(np.any((self.loss_factor != 0) & np.isnan(self.loss_reference)))

    @property
    def is_symmetric(self) -> bool:
        """True where M, C and K are symmetric, so that left vectors are the conjugates of right ones."""
        return self.gyroscopic is None and all(
            part is None or abs(part - part.T).max() == 0 for part in (self.extra_stiffness, self.extra_damping)
        )

    def with_values(self, **changes: Any) -> System:
        """A new system with changed values (``stiffness``, ``damping``, ``mass``, ...) and the same columns."""
        unknown = set(changes) - {entry.name for entry in dataclasses.fields(self)}
        if unknown:
            raise UsageError(f"a System has no {', '.join(sorted(unknown))}")
        return dataclasses.replace(self, **changes)

    def __post_init__(self) -> None:
        from scipy.sparse import csc_array

        put = object.__setattr__
        put(self, "mass", _sparse(self.mass, "mass"))
        n = self.size
        if self.mass.shape != (n, n):
            raise UsageError(f"the mass matrix must be square, not of shape {self.mass.shape}")
        for columns, names in (
            ("spring_columns", ("stiffness", "loss_factor", "loss_reference")),
            ("damper_columns", ("damping",)),
        ):
            matrix = _sparse(getattr(self, columns), columns)
            if matrix.shape[0] != n:
                raise UsageError(f"{columns} must have {n} rows, not {matrix.shape[0]}")
            put(self, columns, matrix)
            for name in names:
                values = _vector(getattr(self, name), matrix.shape[1])
                if name != "loss_reference" and not np.all(np.isfinite(values)):
                    raise UsageError(f"{name} holds NaN or infinite entries")
                put(self, name, values)
        for name in ("extra_stiffness", "extra_damping", "gyroscopic"):
            part = getattr(self, name)
            if part is not None:
                part = _sparse(part, name, (n, n))
                put(self, name, part if part.nnz else None)
        put(self, "recovery", csc_array(self.recovery))

    @classmethod
    def from_matrices(cls, M: Any, C: Any, K: Any, labels: Sequence[str] | None = None) -> System:
        """A system from square real matrices, dense or sparse; C and K may be unsymmetric.

        Parameters
        ----------
        M, C, K : array or sparse array, shape (n, n) [SI]
            M symmetric positive semidefinite.
        labels : sequence of str, optional
            One name a coordinate; ``body.direction`` is split at the last dot. Default ``x1`` to ``xn``.

        Raises
        ------
        UsageError
            If shapes differ, entries are not real and finite, or M is not symmetric.
        """
        from scipy.sparse import csc_array, eye_array

        mass = _sparse(M, "M")
        n = mass.shape[0]
        damping, stiffness = _sparse(C, "C", (n, n)), _sparse(K, "K", (n, n))
        if mass.shape != (n, n) or n == 0:
            raise UsageError(f"M must be square and not empty, not of shape {mass.shape}")
        if abs(mass - mass.T).max() > 4 * np.finfo(float).eps * abs(mass).max():
            raise UsageError("M must be symmetric")
        names = tuple(labels) if labels is not None else tuple(f"x{index + 1}" for index in range(n))
        if len(names) != n or len(set(names)) != n:
            raise UsageError(f"labels must be {n} different names")
        split = [name.rsplit(".", 1) if "." in name else [name, "x"] for name in names]
        empty, none = csc_array((n, 0)), np.zeros(0)
        return cls(
            mass=mass,
            spring_columns=empty,
            stiffness=none,
            loss_factor=none,
            loss_reference=none,
            damper_columns=empty,
            damping=none,
            spring_names=(),
            damper_names=(),
            damper_spring=np.zeros(0, dtype=np.int64),
            spring_grounded=np.zeros(0, dtype=bool),
            damper_grounded=np.zeros(0, dtype=bool),
            extra_stiffness=stiffness,
            extra_damping=damping,
            coordinate_bodies=tuple(body for body, _ in split),
            coordinate_directions=tuple(direction for _, direction in split),
            recovery=eye_array(n, format="csc"),
        )

    @classmethod
    def from_factors(
        cls,
        M: Any,
        spring_columns: Any,
        stiffness: ArrayLike,
        damper_columns: Any = None,
        damping: ArrayLike = (),
        labels: Sequence[str] | None = None,
    ) -> System:
        """A system from directions and values, ``K = B diag(k) Bᵀ`` and ``C = D diag(c) Dᵀ``.

        Stiff springs beside soft ones lose nothing this way; summed into a matrix they would.

        Parameters
        ----------
        M : array or sparse array, shape (n, n) [SI]
            Symmetric positive semidefinite.
        spring_columns, damper_columns : array or sparse array, shapes (n, n_springs) and (n, n_dampers)
        stiffness, damping : array, shapes (n_springs,) and (n_dampers,)
        labels : sequence of str, optional
            As in :meth:`from_matrices`.

        Raises
        ------
        UsageError
            If shapes differ, entries are not real and finite, or M is not symmetric.
        """
        from scipy.sparse import csc_array

        mass = _sparse(M, "M")
        n = mass.shape[0]
        empty = csc_array((n, n))
        springs = _sparse(spring_columns, "spring_columns")
        dampers = csc_array((n, 0)) if damper_columns is None else _sparse(damper_columns, "damper_columns")
        k, c = np.atleast_1d(np.asarray(stiffness, float)), np.atleast_1d(np.asarray(damping, float))
        for columns, values, name, of in (
            (springs, k, "spring_columns", "stiffness"),
            (dampers, c, "damper_columns", "damping"),
        ):
            if columns.shape != (n, len(values)):
                raise UsageError(
                    f"{name} must have shape ({n}, {len(values)}) to go with M and {of}, not {columns.shape}"
                )
        known = {content: index for index, content in enumerate(_content(springs))}
        parallel = [known.get(content, -1) for content in _content(dampers)]
        return cls.from_matrices(mass, empty, empty, labels).with_values(
            spring_columns=springs,
            stiffness=k,
            loss_factor=np.zeros(len(k)),
            loss_reference=np.full(len(k), np.nan),
            spring_names=tuple(f"spring{index + 1}" for index in range(len(k))),
            spring_grounded=np.diff(springs.indptr) == 1,
            damper_columns=dampers,
            damping=c,
            damper_names=tuple(f"damper{index + 1}" for index in range(len(c))),
            damper_spring=np.array(parallel, dtype=np.int64),
            damper_grounded=np.diff(dampers.indptr) == 1,
        )

    def __repr__(self) -> str:
        return (
            f"System({self.degrees_of_freedom} degrees of freedom, {len(self.stiffness)} spring columns, "
            f"{len(self.damping)} damper columns, {self.first_order_states} first-order states)"
        )


def _content(columns: Any) -> list[tuple[bytes, bytes]]:
    """Rows and entries of every column, to tell equal ones."""
    columns = columns.sorted_indices()
    cuts = columns.indptr
    return [(columns.indices[i:j].astype(np.int64).tobytes(), columns.data[i:j].tobytes()) for i, j in pairwise(cuts)]


def _weighted_gram(columns: Any, weights: NDArray[np.float64]) -> Any:
    """``B diag(w) Bᵀ`` as a csc_array."""
    scaled = columns.copy()
    scaled.data = scaled.data * np.repeat(weights, np.diff(scaled.indptr))
    return (scaled @ columns.T).tocsc()
