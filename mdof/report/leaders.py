"""Who leads in a mode: the body that moves most, and the connection that dissipates most."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from mdof.report.tables import ModeLike

__all__ = ["Mover", "Taker", "dissipates_most", "kinetic_by_body", "moves_most"]


@dataclass(frozen=True, kw_only=True, slots=True)
class Taker:
    """The connection that dissipates most of a mode's energy, and its share."""

    name: str
    share: float

    def __str__(self) -> str:
        return f"{100 * self.share:.0f} % {self.name}"


@dataclass(frozen=True, kw_only=True, slots=True)
class Mover:
    """The body that moves most in a mode, by kinetic energy; by the shape where no mass moves.

    Attributes
    ----------
    body, direction : which moves most, and the direction that has most of it.
    share : of the kinetic energy; None where no mass moves.
    several : the machine has more than one direction, so that naming it tells something.
    """

    body: str
    direction: str
    share: float | None
    several: bool

    @property
    def name(self) -> str:
        """Body and direction as a reader needs them."""
        return f"{self.body} {self.direction}" if self.several else self.body

    def __str__(self) -> str:
        return self.name if self.share is None else f"{100 * self.share:.0f} % {self.name}"


def moves_most(mode: ModeLike, bodies: Sequence[str], directions: Sequence[str], energy: Any = None) -> Mover:
    """The body with most of the kinetic energy and its main direction.

    Parameters
    ----------
    bodies, directions : of every described coordinate, as in ``System.coordinate_bodies``.
    energy : the mode's energy shares, where the caller has them already.
    """
    kinetic = (energy or mode.energy).kinetic
    moving = bool(kinetic.sum() > 0)
    weights = kinetic if moving else abs(mode.shape) ** 2
    by_body = _summed(weights, bodies)
    leader = max(by_body, key=lambda name: by_body[name])
    own = [index for index, body in enumerate(bodies) if body == leader]
    return Mover(
        body=leader,
        direction=directions[max(own, key=lambda index: float(weights[index]))],
        share=by_body[leader] if moving else None,
        several=len(set(directions)) > 1,
    )


def kinetic_by_body(mode: ModeLike, bodies: Sequence[str], energy: Any = None) -> dict[str, float] | None:
    """Share of the kinetic energy by body, in file order and without those of 0; None where no mass moves."""
    shares = _summed((energy or mode.energy).kinetic, bodies)
    return {body: share for body, share in shares.items() if share} or None


def _summed(weights: Any, bodies: Sequence[str]) -> dict[str, float]:
    result: dict[str, float] = {}
    for body, weight in zip(bodies, weights, strict=True):
        result[body] = result.get(body, 0.0) + float(weight)
    return result


def dissipates_most(mode: ModeLike, energy: Any = None) -> Taker | None:
    """The connection that dissipates most; the points of one connection (``pot/a``, ``pot/b``) count together."""
    shares = (energy or mode.energy).dissipated
    families: dict[str, list[str]] = {}
    for name in shares:
        families.setdefault(name.split("/")[0], []).append(name)
    if not families:
        return None
    totals = {family: sum(shares[name] for name in names) for family, names in families.items()}
    leader = max(totals, key=lambda family: totals[family])
    members = families[leader]
    return Taker(name=f"{leader} ×{len(members)}" if len(members) > 1 else members[0], share=totals[leader])
