"""Eigenvalues of small quadratic problems in 50 digits, from the very numbers the solver was given."""

from __future__ import annotations

from typing import Any

import mpmath as mp
import numpy as np

DIGITS = 50


def weighted_gram(columns: Any, weights: Any) -> mp.matrix:
    """B diag(w) Bᵀ without a rounding error worth the name."""
    with mp.workdps(DIGITS):
        B = mp.matrix(np.asarray(columns, dtype=float).tolist())
        return B * mp.diag([mp.mpf(float(weight)) for weight in weights]) * B.T


def matrix(values: Any) -> mp.matrix:
    return mp.matrix(np.asarray(values, dtype=float).tolist())


def roots(M: mp.matrix, C: mp.matrix, K: mp.matrix) -> list[mp.mpc]:
    """All 2n eigenvalues of λ²M + λC + K for regular M; conjugates and real roots are cleaned of their last digits."""
    with mp.workdps(DIGITS):
        n = M.rows
        # Time is scaled so that the companion matrix is balanced.
        inverse = M**-1
        scale = mp.sqrt(mp.mnorm(inverse * K, 1)) or mp.mpf(1)
        companion = mp.zeros(2 * n)
        lower_left, lower_right = -(inverse * K) / scale**2, -(inverse * C) / scale
        for i in range(n):
            companion[i, n + i] = 1
            for j in range(n):
                companion[n + i, j] = lower_left[i, j]
                companion[n + i, n + j] = lower_right[i, j]
        values, _ = mp.eig(companion, left=False, right=True)
        largest = max(abs(value) for value in values)
        clean = []
        for value in values:
            tiny = abs(value.imag) < mp.mpf(10) ** (-DIGITS // 2) * abs(value)
            zero = abs(value) < mp.mpf(10) ** (-DIGITS // 2) * largest * mp.mpf(10) ** -12
            clean.append(mp.mpc(0) if zero else mp.mpc(value.real, 0 if tiny else value.imag) * scale)
        return clean
