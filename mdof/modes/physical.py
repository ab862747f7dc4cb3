"""Residuals in the coordinates and units of the model, from the factors and not from rounded matrices."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from mdof.eigen.verify import lengths, real_times

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from mdof.system import System

__all__ = ["PhysicalResidual"]

_EPS = float(np.finfo(np.float64).eps)
_POLISHING_STEPS = 2
#: Rounding errors of a product with a sparse row, in units of the roundoff.
_ROW = 32


class PhysicalResidual:
    """Backward errors of eigenpairs of a System.

    Tisseur (Linear Algebra Appl. 309, 2000) with the longest columns for the 2-norms of M, C and K: those are never
    larger, so the error is never flattered.

    Parameters
    ----------
    system : System
    references : ndarray, shape (n_roots,), optional [rad/s]
        Where loss factors without a stated reference are matched, root by root.
    """

    def __init__(self, system: System, references: NDArray[np.float64] | None) -> None:
        self.system = system
        self.references = references
        self.springs, self.dampers, self.mass, self.extra_stiffness = (
            _ready(system.handy(name)) for name in ("spring_columns", "damper_columns", "mass", "extra_stiffness")
        )
        velocity = (system.handy(name) for name in ("extra_damping", "gyroscopic"))
        self.velocity = [_ready(part) for part in velocity if part is not None]
        self.loss = system.loss_damping()
        floating = np.isnan(system.loss_reference) & (system.loss_factor != 0)
        self.floating_loss = np.where(floating, system.loss_factor * system.stiffness, 0.0)
        middle = None if references is None else float(np.median(references))
        self.norms = tuple(_longest(part) for part in self._parts(middle))

    def _parts(self, reference: float | None) -> tuple[Any, Any, Any]:
        """M, C and K, dense for small systems, loss factors without a reference matched at ``reference``."""
        system = self.system
        if not system.is_small:
            return system.mass, system.damping_matrix(reference), system.K
        stiffness = (self.springs * system.stiffness) @ self.springs.T
        if self.extra_stiffness is not None:
            stiffness = stiffness + self.extra_stiffness
        damping = (self.dampers * system.damping) @ self.dampers.T
        damping = damping + (self.springs * system.loss_damping(reference)) @ self.springs.T
        damping = damping + system.mass_proportional * self.mass + system.stiffness_proportional * stiffness
        for part in self.velocity:
            damping = damping + part
        return self.mass, damping, stiffness

    def forces(self, vectors: NDArray[np.complex128], index: Any = slice(None)) -> tuple[Any, Any, Any]:
        """M x, C x and K x for every column."""
        system = self.system
        stretch = _times(self.springs.T, vectors)
        elastic = _times(self.springs, system.stiffness[:, None] * stretch)
        drag = (
            _times(self.springs, self.loss[:, None] * stretch)
            if self.loss.any()
            else np.zeros(vectors.shape, dtype=np.complex128)
        )
        if self.references is not None:
            drag = drag + (self.springs @ (self.floating_loss[:, None] * stretch)) / self.references[index]
        drag += _times(self.dampers, system.damping[:, None] * _times(self.dampers.T, vectors))
        inertia = _times(self.mass, vectors)
        if self.extra_stiffness is not None:
            elastic = elastic + _times(self.extra_stiffness, vectors)
        for part in self.velocity:
            drag = drag + _times(part, vectors)
        if system.mass_proportional or system.stiffness_proportional:
            drag = drag + system.mass_proportional * inertia + system.stiffness_proportional * elastic
        return inertia, drag, elastic

    def backward_errors(
        self, values: NDArray[np.complex128], vectors: NDArray[np.complex128], index: int | None = None
    ) -> NDArray[np.float64]:
        """Backward error of each pair; ``index`` is the root number where a single pair is given."""
        inertia, drag, elastic = self.forces(vectors, slice(None) if index is None else [index])
        # In place: these are the largest arrays of a solve.
        inertia *= values**2
        drag *= values
        inertia += drag
        inertia += elastic
        residual = lengths(inertia)
        size = np.abs(values)
        mass, damping, stiffness = self.norms
        scale = (size**2 * mass + size * damping + stiffness) * lengths(vectors)
        return np.asarray(np.divide(residual, scale, out=np.zeros(len(values)), where=scale > 0))

    def uncertainty(
        self,
        values: NDArray[np.complex128],
        vectors: NDArray[np.complex128],
        forces: tuple[Any, Any, Any] | None = None,
    ) -> tuple[NDArray[np.float64], NDArray[np.complex128], NDArray[np.complex128]]:
        """How uncertain xᵀQ(λ)x is, with its slope xᵀ(2λM + C)x and xᵀMx, for symmetric systems.

        The residual seen by the shape itself, and rounding of every mass, spring and damper times the largest numbers
        it meets on its way: a spring's stretch may be a small difference of large motions.

        Returns
        -------
        uncertain, slope, inertia : shape (n_roots,)
        """
        system = self.system
        inertia, drag, elastic = (_dots(vectors, force) for force in forces or self.forces(vectors))
        size, magnitude = np.abs(values), np.abs(vectors)
        own = np.abs(values**2 * inertia + values * drag + elastic)
        effort = size * (size + abs(system.mass_proportional)) * _dots(magnitude, abs(self.mass) @ magnitude)
        if self.springs.shape[1]:
            met = np.abs(_times(self.springs.T, vectors))
            met *= abs(self.springs).T @ magnitude
            effort += np.abs(system.stiffness) @ met * (1 + abs(system.stiffness_proportional) * size)
            effort += np.abs(self.loss) @ met * size
            if self.references is not None:
                effort += np.abs(self.floating_loss) @ met * (size / self.references)
        if self.dampers.shape[1]:
            met = np.abs(_times(self.dampers.T, vectors)) * (abs(self.dampers).T @ magnitude)
            effort += np.abs(system.damping) @ met * size
        if self.extra_stiffness is not None:
            effort += _dots(magnitude, abs(self.extra_stiffness) @ magnitude)
        for part in self.velocity:
            effort += size * _dots(magnitude, abs(part) @ magnitude)
        return own + _ROW * _EPS * effort, 2 * values * inertia + drag, inertia

    def polish(
        self,
        values: NDArray[np.complex128],
        vectors: NDArray[np.complex128],
        freedom: NDArray[np.float64],
    ) -> tuple[NDArray[np.complex128], NDArray[np.complex128], NDArray[np.float64]]:
        """Pairs that leave more than rounding here take steps of inverse iteration; only better ones are kept.

        Parameters
        ----------
        values : shape (n_roots,) [1/s]; vectors : shape (n, n_roots)
        freedom : shape (n_roots,) [1/s]
            How far a root may move: its forward bound. Beyond that the assembled matrices know it less well than the
            factors do.

        Returns
        -------
        values, vectors, backward errors
        """
        values, vectors = values.copy(), vectors.copy()
        errors = self.backward_errors(values, vectors)
        free = np.nonzero((errors > 0.5 * self.system.size * _EPS) & (values == 0))[0]
        if len(free):
            vectors[:, free] = self._unstretched(vectors[:, free])
            errors[free] = self.backward_errors(values[free], vectors[:, free])
        for index in np.nonzero((errors > 0.5 * self.system.size * _EPS) & (values != 0))[0]:
            start, vector = complex(values[index]), vectors[:, index]
            value = start
            for _ in range(_POLISHING_STEPS):
                value, vector = self._inverse_step(value, vector, int(index), float(freedom[index]))
                if abs(value - start) > freedom[index]:
                    break
                after = float(self.backward_errors(np.array([value]), vector[:, None], int(index))[0])
                if after < errors[index]:
                    errors[index], values[index], vectors[:, index] = after, value, vector
        return values, vectors, errors

    def _unstretched(self, vectors: NDArray[np.complex128]) -> NDArray[np.complex128]:
        """Free motions without the stretch of the springs that the rounding of light coordinates has left in them."""
        columns = self.springs if isinstance(self.springs, np.ndarray) else self.springs.toarray()
        columns = columns / np.maximum(np.linalg.norm(columns, axis=0), np.finfo(float).tiny)
        stretch = columns.T @ vectors
        return np.asarray(vectors - np.linalg.lstsq(columns.T, stretch, rcond=None)[0])

    def _inverse_step(
        self, value: complex, vector: NDArray[np.complex128], index: int, freedom: float
    ) -> tuple[complex, NDArray[np.complex128]]:
        """One step of inverse iteration with the assembled Q(λ), which also corrects λ (Ruhe, SIAM J. Numer. Anal. 10,
        1973); the pair itself where that breaks down."""
        reference = None if self.references is None else float(self.references[index])
        mass, damping, stiffness = (
            part if isinstance(part, np.ndarray) else part.toarray() for part in self._parts(reference)
        )
        quadratic = value**2 * mass + value * damping + stiffness
        scale = 1.0 / np.sqrt(np.maximum(np.abs(quadratic).max(axis=1), 1e-300))
        try:
            new = scale * np.linalg.solve(
                quadratic * np.outer(scale, scale), scale * ((2 * value * mass + damping) @ vector)
            )
        except np.linalg.LinAlgError:
            # Singular to the last digit: the root is exact in working precision, and its null vector is the shape.
            null = scale * np.linalg.svd(quadratic * np.outer(scale, scale))[2][-1].conj()
            return value, null / np.linalg.norm(null)
        length, overlap = np.linalg.norm(new), complex(np.vdot(vector, new))
        if not np.isfinite(length) or length == 0:
            return value, vector
        step = -(float(np.linalg.norm(vector)) ** 2) / overlap if overlap else 0.0
        if value.imag == 0:
            step = complex(step).real
        moved = value + step if abs(step) <= freedom else value
        return complex(moved), new / length


def _ready(matrix: Any) -> Any:
    """Dense where a matrix is hardly sparse."""
    if matrix is None or isinstance(matrix, np.ndarray) or matrix.nnz <= 0.1 * matrix.shape[0] * matrix.shape[1]:
        return matrix
    return matrix.toarray()


def _times(matrix: Any, vectors: NDArray[np.complex128]) -> NDArray[np.complex128]:
    """A real matrix, dense or sparse, times complex columns."""
    if isinstance(matrix, np.ndarray):
        return real_times(matrix, vectors)
    parts = np.ascontiguousarray(vectors, dtype=np.complex128).view(np.float64)
    return np.ascontiguousarray(matrix @ parts).view(np.complex128)


def _dots(first: Any, second: Any) -> Any:
    """Σ first · second of every column, unconjugated."""
    return np.einsum("ij,ij->j", first, second)


def _longest(matrix: Any) -> float:
    """Length of the longest column, which the 2-norm is never below."""
    if isinstance(matrix, np.ndarray):
        return float(np.sqrt(np.einsum("ij,ij->j", matrix, matrix).max(initial=0.0)))
    squares = np.zeros(matrix.shape[1])
    np.add.at(squares, np.repeat(np.arange(matrix.shape[1]), np.diff(matrix.indptr)), np.abs(matrix.data) ** 2)
    return float(np.sqrt(squares.max(initial=0.0)))
