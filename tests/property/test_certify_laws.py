"""Laws of proofs: enclosures hold what is known to be there, scale, and do not depend on names or order."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest
from flint import acb, arb, ctx, fmpq, fmpq_mat
from hypothesis import given, settings
from hypothesis import strategies as st
from machines import random_machine

import mdof
from mdof import System
from mdof.certify import Verdict, certify
from mdof.certify.enclosures import enclose
from mdof.certify.exact_pencils import Pencil
from mdof.certify.verdicts import _interval

seeds = st.integers(0, 10**6)


def unimodular(rng: np.random.Generator, n: int) -> tuple[fmpq_mat, fmpq_mat]:
    """An integer matrix of determinant 1, and its inverse."""
    lower = fmpq_mat(n, n, [int(i == j) or int(j < i) * int(rng.integers(-1, 2)) for i in range(n) for j in range(n)])
    return lower, lower.inv()


def with_roots(blocks: list[tuple[int, int]], seed: int) -> Pencil:
    """A pencil with Jordan blocks (root, size), hidden by an integer similarity."""
    n = sum(size for _, size in blocks)
    jordan = fmpq_mat(n, n)
    place = 0
    for root, size in blocks:
        for k in range(size):
            jordan[place + k, place + k] = fmpq(root)
            if k:
                jordan[place + k - 1, place + k] = fmpq(1)
        place += size
    turn, back = unimodular(np.random.default_rng(seed), n)
    one = fmpq_mat(n, n, [int(i == j) for i in range(n) for j in range(n)])
    return Pencil(E=one, F=turn * jordan * back, zeros=0, squared=False, real=False)


@pytest.mark.parametrize("size", [1, 2, 3])
@pytest.mark.parametrize("count", [3, 14])
def test_multiple_roots_are_held_with_their_number(size: int, count: int) -> None:
    """Defective roots −1, −2, ...: by the characteristic polynomial where few, by discs of their own where many."""
    pencil = with_roots([(-k, size) for k in range(1, count + 1)], seed=count)
    roots = enclose(pencil, 512)
    assert roots is not None
    assert len(roots) == count * size
    for k in range(1, count + 1):
        own = [root for root in roots if root.ball.contains(-k)]
        assert [root.count for root in own] == [size] * size
        assert all(float(root.ball.rad()) < 1e-16 for root in own)


@given(seed=seeds)
@settings(max_examples=20)
def test_the_balls_of_a_pencil_hold_the_roots_of_its_polynomial(seed: int) -> None:
    """Coefficients from the product of balls: sums and products of all roots against trace and determinant."""
    rng = np.random.default_rng(seed)
    n = int(rng.integers(2, 12))
    F = fmpq_mat(n, n, [fmpq(int(rng.integers(-9, 10)), int(rng.integers(1, 5))) for _ in range(n * n)])
    if F.rank() < n:
        return
    one = fmpq_mat(n, n, [int(i == j) for i in range(n) for j in range(n)])
    roots = enclose(Pencil(E=one, F=F, zeros=0, squared=False, real=False), 256)
    assert roots is not None
    polynomial = F.charpoly()
    with ctx.workprec(256):
        total, product = acb(0), acb(1)
        for root in roots:
            total, product = total + root.ball, product * root.ball
        assert total.contains(acb(polynomial[n - 1] * -1))
        assert product.contains(acb(polynomial[0] * (-1) ** n))


@given(seed=seeds)
@settings(max_examples=10)
def test_machines_in_space_are_proven(seed: int) -> None:
    try:
        modes = mdof.solve(mdof.assemble(random_machine(seed)))
    except mdof.UnverifiedError:
        return
    certificate = certify(modes)
    assert not certificate.contradicted, [proof.reason for proof in certificate.modes if proof.reason]
    if not modes.system.has_floating_loss_factors:
        assert certificate.number(Verdict.PROVEN) == len(modes)


@given(seed=seeds)
@settings(max_examples=20)
def test_powers_of_two_and_order_change_no_verdict(seed: int) -> None:
    """Time in units of 1/8 s, mass of 4 kg and coordinates in another order: the same ratios, eight times the rates."""
    rng = np.random.default_rng(seed)
    n = int(rng.integers(1, 5))
    mass, k, c = rng.uniform(1, 3, n), rng.uniform(1, 9, n), rng.uniform(0, 3, n)
    springs = np.eye(n) - np.eye(n, k=1)
    order = rng.permutation(n)
    first = certify(mdof.solve(System.from_factors(np.diag(mass), springs, k, springs, c)))
    turned = System.from_factors(np.diag(4 * mass[order]), springs[order], 256 * k, springs[order], 32 * c)
    second = certify(mdof.solve(turned))
    for one, other in zip(first.modes, second.modes, strict=True):
        assert (one.verdict, one.regime) == (other.verdict, other.regime)
        if one.natural_frequency is not None:
            low, high = one.natural_frequency
            assert other.natural_frequency == (8 * low, 8 * high)
            assert other.damping_ratio == one.damping_ratio


@given(
    value=st.floats(-1e300, 1e300).filter(lambda x: abs(x) > 1e-280),
    nudge=st.integers(-120, -40),
    width=st.integers(-130, -30),
)
def test_intervals_are_rounded_outwards(value: float, nudge: int, width: int) -> None:
    with ctx.workprec(200):
        middle = arb(value) * (1 + arb(2) ** nudge)
        ball = arb(middle, abs(middle) * arb(2) ** width)
        low, high = _interval(ball)
        assert Fraction(low) < Fraction(high)
        assert arb(low) <= ball.lower()
        assert arb(high) >= ball.upper()
        assert high - low <= abs(value) * (2.0 ** (width + 2) + 2.0**-50)
