"""Roots with loss factors that state no reference: each mode is a problem of its own, matched at its own |λ|.

At a fixed reference ω the pair (λ, x) solves ``(λ²M + λ(C + H/ω) + K)x = 0`` with one component of x held at 1.
Krawczyk's operator (Computing 4, 1969; Rump, Acta Numerica 19, 2010) in ball arithmetic proves one solution in a box,
for all ω of an interval at once. Where |λ| of the box lies inside that interval, Brouwer's theorem gives an ω with
|λ| = ω, and the box holds that root.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from flint import acb, acb_mat, arb, ctx, fmpq_mat

from mdof.certify.enclosures import Root
from mdof.certify.verdicts import judge, undecided

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from mdof.certify.exact_factors import ExactMatrices
    from mdof.certify.proof import ModeProof
    from mdof.modes.mode import DampedModes, Mode

__all__ = ["OwnFrequencyProofs"]

_NEWTON_STEPS = 200
#: Share of its size within which a root counts as the stated one, right or wrong.
_NEAR = 1e-3
_MATCHED = "with loss factors matched at the mode's own frequency"
_INFLATIONS = 6
#: Half widths, as powers of two, of the interval of references that is tried.
_WIDTHS = range(-64, -19, 4)


@dataclass(slots=True)
class _Pair:
    """An approximate root and its vector, whose component ``held`` is 1."""

    vector: list[acb]
    value: acb
    held: int


class OwnFrequencyProofs:
    """Proofs of the modes of a system with floating loss factors.

    Parameters
    ----------
    modes : DampedModes
    exact : ExactMatrices
    bits : int
        Working precision.
    """

    def __init__(self, modes: DampedModes, exact: ExactMatrices, bits: int) -> None:
        self.bits = bits
        parts = (exact.mass, exact.damping, exact.stiffness, exact.loss)
        with ctx.workprec(bits):
            self.M, self.C, self.K, self.H = (acb_mat(part) for part in parts)
            self.plain = [_rounded(part) for part in parts]
        self.turning = [mode for mode in modes if mode.eigenvalues[0].imag]
        zeros = [(mode.number, place) for mode in modes for place, value in enumerate(mode.eigenvalues) if value == 0]
        self.zeros = set(zeros[: _free_roots(exact)])

    def proof(self, mode: Mode) -> ModeProof:
        """The verdict on one mode."""
        roots: list[Root] = []
        with ctx.workprec(self.bits):
            for position, value in enumerate(mode.eigenvalues):
                root = self._root(mode, position, value, roots)
                if root is None:
                    reason = f"undecided at {self.bits} bits: no root enclosed at {value:.6g}, {_MATCHED}"
                    return undecided(mode, reason, self.bits)
                roots.append(root)
        return judge(mode, tuple(roots), self.bits)

    def _root(self, mode: Mode, position: int, value: complex, before: list[Root]) -> Root | None:
        """The exact root next to a stated one, or None: one far away says nothing about the stated one."""
        if value == 0:
            return Root(ball=acb(0), exact=True) if (mode.number, position) in self.zeros else None
        if value.imag < 0:
            return Root(ball=before[0].ball.conjugate())
        if value.imag > 0:
            found, reach = [self._own(value)], _NEAR
        else:
            references = self._references(mode, position)
            found = [self._at(value, arb(reference)) for reference in references]
            # Where the reference is not stated, some reference that fits is all that can be asked for.
            reach = _NEAR if len(references) == 1 else mode.frequency_bound or 0.0
        near = [root for root in found if root is not None and abs(root.ball - value) <= arb(reach) * abs(value)]
        return min(near, key=lambda root: float(abs(root.ball - value).mid()), default=None)

    def _references(self, mode: Mode, position: int) -> list[float]:
        """Where a real root may be matched: the slow one as its mode states, others at a mode that oscillates."""
        own = mode.damping_reference
        if own is not None and (mode.eigenvalues[0] != 0 and position == 0):
            return [own]
        others = {other.damping_reference for other in self.turning} | {own}
        return [reference for reference in others if reference is not None] or [abs(mode.eigenvalues[position])]

    def _at(self, value: complex, reference: arb) -> Root | None:
        """The real root at a fixed reference; its box is its own mirror image, so that the one root in it is real."""
        pair = self._start(value, float(reference))
        if pair is None or not self._newton(pair, reference, own=False):
            return None
        ball = self._box(pair, reference)
        return None if ball is None else Root(ball=acb(ball.real))

    def _own(self, value: complex) -> Root | None:
        """The root whose own |λ| is the reference."""
        pair = self._start(value, abs(value))
        if pair is None or not self._newton(pair, arb(abs(value)), own=True):
            return None
        reference = abs(pair.value).mid()
        for width in _WIDTHS:
            interval = arb(reference, reference * arb(2) ** width)
            ball = self._box(pair, interval)
            if ball is not None and interval.contains(abs(ball)):
                return Root(ball=ball)
        return None

    def _start(self, value: complex, reference: float) -> _Pair | None:
        """The null vector in binary64."""
        mass, damping, stiffness, loss = self.plain
        root = value.real if value.imag == 0 else value
        quadratic = root**2 * mass + root * (damping + loss / reference) + stiffness
        scale = 1 / np.sqrt(np.maximum(np.abs(quadratic).max(axis=1), np.finfo(float).tiny))
        scaled = quadratic * np.outer(scale, scale)
        if not np.all(np.isfinite(scaled)):
            return None
        vector = np.linalg.svd(scaled)[2][-1].conj()
        held = int(np.argmax(np.abs(vector)))
        vector = scale * vector
        column = [acb(complex(part)) for part in vector / vector[held]]
        column[held] = acb(1)
        return _Pair(column, acb(complex(root)), held)

    def _terms(self, vector: list[acb], value: acb, reference: arb) -> tuple[acb_mat, acb_mat, acb_mat]:
        """Q(λ), Q(λ)x and its derivative by λ."""
        n = len(vector)
        damping = self.C + self.H * acb(1 / reference)
        x = acb_mat(n, 1, vector)
        quadratic = self.M * (value * value) + damping * value + self.K
        return quadratic, quadratic * x, (self.M * (2 * value) + damping) * x

    def _jacobian(self, quadratic: acb_mat, slope: acb_mat, held: int) -> acb_mat:
        """Derivatives of Q(λ)x by all components of x but the held one, whose column is that by λ."""
        n = quadratic.nrows()
        return acb_mat(n, n, [slope[i, 0] if j == held else quadratic[i, j] for i in range(n) for j in range(n)])

    def _newton(self, pair: _Pair, reference: arb, own: bool) -> bool:
        """Newton's method on midpoints, in place; the reference follows |λ| where it is the root's own."""
        goal = arb(2) ** (-ctx.prec + 24)
        for _ in range(_NEWTON_STEPS):
            held = pair.held
            quadratic, rest, slope = self._terms(pair.vector, pair.value, reference)
            try:
                step = self._jacobian(quadratic, slope, held).mid().solve(rest.mid(), algorithm="approx")
            except ZeroDivisionError:
                return False
            change = step[held, 0].mid()
            for i in range(len(pair.vector)):
                if i != held:
                    pair.vector[i] = (pair.vector[i] - step[i, 0]).mid()
            pair.value = (pair.value - change).mid()
            if own:
                reference = abs(pair.value).mid()
            if abs(change) <= goal * abs(pair.value):
                break
        return bool(pair.value.is_finite())

    def _box(self, pair: _Pair, reference: arb) -> acb | None:
        """Ball around λ that surely holds one root for every reference of the interval, or None."""
        n, held = len(pair.vector), pair.held
        quadratic, rest, slope = self._terms(pair.vector, pair.value, reference.mid())
        try:
            Y = self._jacobian(quadratic, slope, held).mid().inv().mid()
        except ZeroDivisionError:
            return None
        # The spread of the reference comes last, so that it is not counted once for every equation.
        spread = acb(1 / reference - 1 / reference.mid()) * pair.value
        base = (Y * rest + Y * (self.H * acb_mat(n, 1, pair.vector)) * spread) * acb(-1)
        tiny = arb(2) ** (16 - ctx.prec)
        middle = [pair.value if i == held else pair.vector[i] for i in range(n)]
        # No side of the box may be empty, also where a component is 0.
        least = [(abs(part) + 1) * tiny for part in middle]
        radius = [abs(base[i, 0]).upper() * 2 + least[i] for i in range(n)]
        for _ in range(_INFLATIONS):
            change = [acb(arb(0, r.upper()), arb(0, r.upper())) for r in radius]
            vector = [acb(1) if i == held else middle[i] + change[i] for i in range(n)]
            wide, _, steep = self._terms(vector, middle[held] + change[held], reference)
            off = acb_mat(fmpq_mat(n, n, [int(i == j) for i in range(n) for j in range(n)]))
            image = base + (off - Y * self._jacobian(wide, steep, held)) * acb_mat(n, 1, change)
            if all(change[i].contains_interior(image[i, 0]) for i in range(n)):
                return pair.value + image[held, 0]
            radius = [abs(image[i, 0]).upper() * 2 + least[i] for i in range(n)]
        return None


def _rounded(matrix: fmpq_mat) -> NDArray[np.float64]:
    entries = [float(arb(value)) for value in matrix.entries()]
    return np.array(entries, dtype=np.float64).reshape(matrix.nrows(), matrix.ncols())


def _free_roots(exact: ExactMatrices) -> int:
    """Multiplicity of the root 0: dim null K + dim (null K ∩ null C), as in every passive symmetric problem."""
    n = exact.size
    both = fmpq_mat(2 * n, n, [*exact.stiffness.entries(), *exact.damping.entries()])
    return (n - exact.stiffness.rank()) + (n - both.rank())
