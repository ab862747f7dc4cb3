"""What the exact roots of a mode say about its stated regime, numbers and bounds."""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass
from typing import TYPE_CHECKING

from flint import acb, arb, ctx

from mdof.certify.proof import Interval, ModeProof, Verdict
from mdof.modes.regime import Regime

if TYPE_CHECKING:
    from mdof.certify.enclosures import Root
    from mdof.modes.mode import Mode

__all__ = ["judge", "undecided"]

#: |ζ − 1| that is called critical whatever the bound; bounds count up to the second number.
_CRITICAL, _CRITICAL_BOUND = 1e-9, 1e-7
_DIGITS = 12


@dataclass(frozen=True, slots=True)
class _Claim:
    """A statement: True where it surely holds, False where it surely does not, None where the balls are too wide."""

    holds: bool | None
    otherwise: str


def judge(mode: Mode, roots: tuple[Root, ...], bits: int) -> ModeProof:
    """The verdict on one mode.

    Parameters
    ----------
    mode : Mode
    roots : tuple of Root
        One exact root for every eigenvalue that the mode states, in its order.
    bits : int
        Working precision.
    """
    with ctx.workprec(bits):
        balls = [root.ball for root in roots]
        if len(roots) == 2 and mode.eigenvalues[0].imag and roots[0].is_complex:
            # The roots of a real problem are closed under conjugation.
            balls[1] = balls[0].conjugate()
        frequency, ratio = _numbers(balls)
        claims = [_regime_claim(mode, roots, balls, ratio), *_number_claims(mode, balls, frequency, ratio)]
        failed = [claim.otherwise for claim in claims if claim.holds is False]
        open_ = [claim.otherwise for claim in claims if claim.holds is None]
        if failed:
            verdict, reason = Verdict.CONTRADICTED, "; ".join(failed)
        elif open_:
            verdict, reason = Verdict.UNDECIDED, f"undecided at {bits} bits: {'; '.join(open_)}"
        else:
            verdict, reason = Verdict.PROVEN, ""
        return ModeProof(
            number=mode.number,
            regime=str(mode.regime),
            verdict=verdict,
            reason=reason,
            bits=bits,
            eigenvalues=tuple((_interval(ball.real), _interval(ball.imag)) for ball in balls),
            natural_frequency=None if frequency is None else _interval(frequency),
            damping_ratio=None if ratio is None else _interval(ratio),
            frequency_digits=None if frequency is None else _digits(frequency / (2 * arb.pi())),
            ratio_digits=None if ratio is None else _digits(100 * ratio),
            multiplicity=max(root.count for root in roots),
            exact=_is_exact(mode.regime, roots),
        )


def undecided(mode: Mode, reason: str, bits: int) -> ModeProof:
    """The verdict on a mode that could not be judged at all."""
    return ModeProof(number=mode.number, regime=str(mode.regime), verdict=Verdict.UNDECIDED, reason=reason, bits=bits)


def _numbers(balls: list[acb]) -> tuple[arb | None, arb | None]:
    """Natural frequency and damping ratio of two roots; None where they are undefined."""
    if len(balls) != 2:
        return None, None
    first, second = balls
    if first.is_zero() or second.is_zero():
        return None, None
    if first.imag.is_zero() and second.imag.is_zero() and first.real * second.real < 0:
        return None, None
    frequency = (abs(first) * abs(second)).sqrt()
    return frequency, -(first.real + second.real) / (2 * frequency)


def _regime_claim(mode: Mode, roots: tuple[Root, ...], balls: list[acb], ratio: arb | None) -> _Claim:
    real = _all(root.is_real or (False if root.is_complex else None) for root in roots)
    turning = None if real is None else not real
    falling = _all(_less(ball.real, 0) for ball in balls)
    zero = any(root.is_zero for root in roots)
    shown = " and ".join(_shown(ball) for ball in balls)
    bound = mode.damping_ratio_bound or 0.0
    match mode.regime:
        case Regime.RIGID_BODY:
            rest = [ball for ball in balls if not ball.is_zero()]
            holds = _all([zero, *(ball.imag.is_zero() or None for ball in rest), *(_less(b.real, 0) for b in rest)])
            text = f"not free: exact roots {shown}"
            return _Claim(holds, text)
        case Regime.UNDAMPED:
            holds = None if ratio is None else _less(abs(ratio), bound, equal=True)
        case Regime.UNDERDAMPED:
            holds = _all([turning, falling])
        case Regime.CRITICALLY_DAMPED:
            limit = max(_CRITICAL, min(bound, _CRITICAL_BOUND)) + bound
            holds = None if ratio is None else _less(abs(ratio - 1), limit, equal=True)
        case Regime.OVERDAMPED | Regime.RELAXATION:
            holds = _all([real, falling])
        case Regime.UNSTABLE:
            holds = _all([turning, *(_less(0, ball.real) for ball in balls)])
        case Regime.DIVERGENT:
            growing = [_less(0, ball.real) for ball in balls]
            holds = _all([real, True if True in growing else (False if set(growing) == {False} else None)])
    return _Claim(holds, f"not {mode.regime}: exact roots {shown}" if holds is False else f"regime, roots {shown}")


def _number_claims(mode: Mode, balls: list[acb], frequency: arb | None, ratio: arb | None) -> list[_Claim]:
    """Every stated number is as near to the exact one as its stated bound says."""
    claims = []
    share = mode.frequency_bound
    if share is not None:
        if mode.natural_frequency is not None:
            claims.append(_within("natural frequency", mode.natural_frequency, frequency, share, frequency))
        for value, ball in zip(mode.eigenvalues, balls, strict=True):
            claims.append(_within("eigenvalue", value, ball, share, ball))
        slow = next((ball for ball in balls if not ball.is_zero()), balls[0])
        claims.append(_within("decay rate", mode.decay_rate, -slow.real, arb(share) * abs(slow)))
    if mode.damping_ratio is not None and mode.damping_ratio_bound is not None:
        claims.append(_within("damping ratio", mode.damping_ratio, ratio, mode.damping_ratio_bound))
    return claims


def _within(
    name: str, stated: complex, exact: acb | arb | None, bound: arb | float, share_of: acb | arb | None = None
) -> _Claim:
    """|stated − exact| is at most the bound, which is a share of |share_of| where that is given."""
    if exact is None:
        return _Claim(False, f"{name} {stated!r} stated where there is none")
    limit = arb(bound) if share_of is None else arb(bound) * abs(share_of)
    error = abs(acb(stated) - exact)
    text = f"{name} {stated!r} is {error.str(3, radius=False)} off, where {limit.str(3, radius=False)} is stated"
    return _Claim(_less(error, limit, equal=True), text)


def _less(small: arb | float, large: arb | float, *, equal: bool = False) -> bool | None:
    small, large = arb(small), arb(large)
    if (small <= large) if equal else (small < large):
        return True
    if (small > large) if equal else (small >= large):
        return False
    return None


def _all(parts: Iterable[bool | None]) -> bool | None:
    """Three-valued ``all``."""
    seen = list(parts)
    return False if False in seen else None if None in seen else True


def _is_exact(regime: Regime, roots: tuple[Root, ...]) -> bool:
    if regime is Regime.RIGID_BODY:
        return any(root.is_zero for root in roots)
    if regime is Regime.UNDAMPED:
        return all(bool(root.ball.real.is_zero()) for root in roots)
    return any(root.exact for root in roots)


def _shown(ball: acb) -> str:
    return str(ball.str(6, radius=False))


def _digits(value: arb) -> str:
    """As many digits as the ball has, twelve at most; what may be zero is said to be below a power of ten."""
    text = str(value.str(_DIGITS, radius=False))
    return f"below {text[1:].replace('e', '1e')}" if text.startswith("0e") else text


def _interval(value: arb) -> Interval:
    if not value.is_finite():
        return -math.inf, math.inf
    low, high = value.lower(), value.upper()
    down, up = float(low), float(high)
    return (
        down if arb(down) <= low else math.nextafter(down, -math.inf),
        up if arb(up) >= high else math.nextafter(up, math.inf),
    )
