"""The secular form of a few dampers: r-by-r matrices that hold the whole quadratic.

``G(λ) = I + λ Vᵀ diag(1/q) V`` with ``q_k = λ² + δ_k λ + ω_k²``. Sums over modes are matrix products of the reciprocals
1/q with the products v_ki v_kj, made in real arithmetic and in pieces that stay in cache.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import NDArray

    Complex = NDArray[np.complex128]
    Real = NDArray[np.float64]
    Index = NDArray[np.int64]

__all__ = ["Secular"]

#: Reciprocals handled at a time; with their squares they fill about a megabyte.
_PIECE = 1 << 15


class Secular:
    """Modes ω², own damping δ and damper columns V of ``λ² + λ (diag(δ) + V Vᵀ) + diag(ω²)``.

    Parameters
    ----------
    squares, own : ndarray, shape (n,) [1/s², 1/s]
    columns : ndarray, shape (n, r) [1/√s]
    """

    def __init__(self, squares: Real, own: Real, columns: Real) -> None:
        self.squares, self.own, self.columns = squares, own, columns
        self.size, self.rank = columns.shape
        upper = np.triu_indices(self.rank)
        self._products = columns[:, upper[0]] * columns[:, upper[1]]
        self._place = np.zeros((self.rank, self.rank), dtype=np.int64)
        self._place[upper] = np.arange(len(upper[0]))
        self._place = np.maximum(self._place, self._place.T)

    def _pieces(self, count: int) -> Iterator[slice]:
        step = max(1, _PIECE // max(self.size, 1))
        for start in range(0, count, step):
            yield slice(start, min(start + step, count))

    def _reciprocals(self, values: Complex) -> tuple[Real, Real]:
        """Real and imaginary parts of 1/q, shape (m, n)."""
        a, b = values.real[:, None], values.imag[:, None]
        real = self.squares + (a * a - b * b)
        imaginary: Real
        if self.own.any():
            real += a * self.own
            imaginary = b * (2 * a + self.own)
        else:
            imaginary = np.broadcast_to(2 * a * b, real.shape)
        scale = 1.0 / (real * real + imaginary * imaginary)
        return real * scale, -imaginary * scale

    def sums(self, values: Complex, skip: Index | None = None, *, slopes: bool = True) -> tuple[Complex, Complex]:
        """G and dG/dλ, each of shape (m, r, r), for m values; ``skip`` leaves one mode out of each."""
        count = len(values)
        plain = np.empty((count, self._products.shape[1]), dtype=np.complex128)
        steep = np.zeros_like(plain)
        twice = self._products * self.own[:, None] if self.own.any() else None
        for piece in self._pieces(count):
            real, imaginary = self._reciprocals(values[piece])
            if skip is not None:
                rows = np.arange(len(real))
                real[rows, skip[piece]] = 0.0
                imaginary[rows, skip[piece]] = 0.0
            plain[piece] = real @ self._products + 1j * (imaginary @ self._products)
            if slopes:
                square, cross = real * real - imaginary * imaginary, 2 * real * imaginary
                value = values[piece][:, None]
                steep[piece] = 2 * value * (square @ self._products + 1j * (cross @ self._products))
                if twice is not None:
                    steep[piece] += square @ twice + 1j * (cross @ twice)
        value = values[:, None]
        eye = np.eye(self.rank)
        return (
            eye + (value * plain)[:, self._place],
            (plain - value * steep)[:, self._place],
        )

    def negative(self, rates: Real) -> Index:
        """How many eigenvalues of Q(−s) are negative, for every rate s > 0; it changes by one at a simple real root.

        Haynsworth's inertia additivity (Linear Algebra Appl. 1, 1968) on the bordered matrix of Q(−s).
        """
        result = np.empty(len(rates), dtype=np.int64)
        for piece in self._pieces(len(rates)):
            s = rates[piece][:, None]
            own = s * s - s * self.own + self.squares
            small = np.eye(self.rank) - (s * ((1.0 / own) @ self._products))[:, self._place]
            result[piece] = np.sum(own < 0, axis=1) + np.sum(np.linalg.eigvalsh(small) < 0, axis=1)
        return result

    def log_slope(self, values: Complex) -> Complex:
        """p'/p of the characteristic polynomial at m values."""
        whole, slope = self.sums(values)
        result = np.trace(np.linalg.solve(whole, slope), axis1=1, axis2=2)
        q_slope = 2 * values[:, None] + self.own
        for piece in self._pieces(len(values)):
            real, imaginary = self._reciprocals(values[piece])
            result[piece] += np.einsum("ij,ij->i", q_slope[piece], real + 1j * imaginary)
        return np.asarray(result, dtype=np.complex128)

    def vectors(self, values: Complex, forces: Complex, lead: Index | None = None) -> Complex:
        """Columns z of shape (n, m) with ``z_i = −λ (v_i · g) / q_i``; the leading component, where given, is 1."""
        result = np.empty((self.size, len(values)), dtype=np.complex128)
        for piece in self._pieces(len(values)):
            real, imaginary = self._reciprocals(values[piece])
            reached = (self.columns @ (-values[piece] * forces[piece].T)).T
            part = (real + 1j * imaginary) * reached
            if lead is not None:
                part[np.arange(len(part)), lead[piece]] = 1.0
            result[:, piece] = part.T
        return result
