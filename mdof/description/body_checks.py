"""What the schema cannot see about bodies: masses and inertias no real body has, and values that are missing."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from mdof.description.bodies import Body, BodyPart, mass_properties
from mdof.description.quantities import DIRECTIONS, Quantity, Trouble

__all__ = ["body_troubles"]

_EACH = "each a mass moment of inertia with its unit"
_TURNS = {"rx": "xx", "ry": "yy", "rz": "zz"}


def body_troubles(body: Body, directions: tuple[str, ...]) -> Iterator[Trouble]:
    """Complaints about one body that may move in ``directions``; paths start below the body."""
    turns = [direction for direction in directions if direction in _TURNS]
    moves = len(turns) < len(directions)
    if body.made_of is not None:
        yield from _made_of(body)
    elif body.massless:
        for name in ("mass", "weight", "inertia"):
            if getattr(body, name) is not None:
                yield Trouble((name,), f"a massless body has no {name}", f"remove `{name}` or `massless`", True)
    else:
        yield from _mass(body, moves)
        yield from _inertia(body, turns)
    if body.spin is not None:
        axis = np.array(body.spin.axis)
        across = [turn for turn in turns if abs(axis[DIRECTIONS.index(turn) - 3]) < 0.999 * np.linalg.norm(axis)]
        if len(across) < 2:
            yield Trouble(
                ("spin",),
                "the spin has no effect: the body does not turn across its axis",
                "keep two rotations across the axis in `directions`, or remove `spin`",
            )


def _mass(body: Body, moves: bool) -> Iterator[Trouble]:
    if body.mass is not None and body.weight is not None:
        yield Trouble(("weight",), "mass and weight are both given", "keep one", True)
    for name, value in (("mass", body.mass), ("weight", body.weight)):
        if value is not None and value.value <= 0:
            what = "zero" if value.value == 0 else "negative"
            yield Trouble((name,), f"a {what} {name}", "give what it weighs; a joint without mass is `massless: true`")
    if moves and body.mass is None and body.weight is None:
        yield Trouble(
            (),
            "the body has no mass",
            "give its `mass` with its unit, or its `weight` or `made_of: [..]`; a joint is `massless: true`",
            True,
        )


def _inertia(body: Body, turns: list[str]) -> Iterator[Trouble]:
    inertia = body.inertia
    if inertia is None:
        if turns:
            yield Trouble(
                (),
                f"the body turns ({', '.join(turns)}) but has no inertia",
                f"write `inertia: {_form(turns)}`, {_EACH}, or narrow its `directions`",
                True,
            )
        return
    if isinstance(inertia, Quantity):
        if len(turns) > 1:
            yield Trouble(("inertia",), f"one inertia for {len(turns)} rotations", f"write {_form(turns)}, {_EACH}")
        elif inertia.value <= 0:
            yield Trouble(("inertia",), f"an inertia of {inertia.text} is not possible", "it must be greater than zero")
        return
    missing = [_TURNS[turn] for turn in turns if _TURNS[turn] not in inertia]
    if missing:
        yield Trouble(
            ("inertia",),
            f"the body turns ({', '.join(turns)}) but its inertia lacks {', '.join(missing)}",
            f"write {_form(turns)}, {_EACH}",
        )
        return
    yield from _possible(body, ("inertia",))


def _form(turns: list[str]) -> str:
    """How the moments of inertia for these rotations are written."""
    return f"{{{', '.join(f'{_TURNS[turn]}: ..' for turn in turns)}}}"


def _made_of(body: Body) -> Iterator[Trouble]:
    for name in ("mass", "weight", "inertia", "centre"):
        if getattr(body, name) is not None:
            yield Trouble(
                (name,),
                f"`{name}` follows from `made_of`",
                f"remove `{name}`, or describe the body without parts",
                True,
            )
    if body.massless:
        yield Trouble(("massless",), "a body made of parts is not massless", "remove one", True)
    parts = body.made_of or ()
    if not parts:
        yield Trouble(("made_of",), "no part is given", f"write a list of parts such as {BodyPart.example}")
        return
    sound = True
    for index, part in enumerate(parts):
        given = [name for name in ("mass", "weight", "contents") if getattr(part, name) is not None]
        if len(given) != 1:
            sound = False
            what = "has no mass" if not given else f"has {' and '.join(given)}"
            yield Trouble(("made_of", index), f"the part {what}", "give one of mass, weight or contents")
        if part.contents is not None and part.contents.fill is not None and part.contents.fill.value > 1:
            yield Trouble(("made_of", index, "contents", "fill"), "filled beyond 100 %", "write a share such as 80 %")
        if part.inertia_about is not None and part.inertia is None:
            yield Trouble(
                ("made_of", index, "inertia_about"), "`inertia_about` without `inertia`", "give the inertia", True
            )
        if isinstance(part.inertia, Quantity):
            sound = False
            yield Trouble(("made_of", index, "inertia"), "one inertia for a part in space", "write three, [xx, yy, zz]")
        elif part.inertia is not None and not {"xx", "yy", "zz"} <= set(part.inertia):
            sound = False
            yield Trouble(("made_of", index, "inertia"), "the inertia is not complete", "write xx, yy and zz")
    if sound:
        if mass_properties(body).mass <= 0:
            yield Trouble(("made_of",), "the parts together have no mass", "give at least one part a mass")
        elif any(part.inertia is not None for part in parts) or len(parts) > 2:
            yield from _possible(body, ("made_of",))


def _possible(body: Body, path: tuple[str, ...]) -> Iterator[Trouble]:
    """Positive definite, and no principal moment above the sum of the others: Σ m (y² + z²) etc. can give no other."""
    tensor = mass_properties(body).inertia
    if tensor is None:
        return
    complete = isinstance(body.inertia, dict) and {"xx", "yy", "zz"} <= set(body.inertia)
    if isinstance(body.inertia, dict):
        for name in ("xx", "yy", "zz"):
            value = body.inertia.get(name)
            if value is not None and value.value <= 0:
                yield Trouble(
                    path,
                    f"{name} is {value.text}, which no real body has",
                    "moments of inertia must be greater than zero",
                )
                return
    principal = np.linalg.eigvalsh(tensor)
    shown = ", ".join(f"{value:.6g}" for value in principal)
    if principal[0] <= 0:
        yield Trouble(
            path,
            f"no real body has this inertia: its principal moments are {shown} kg*m^2",
            "check the products of inertia and the units",
        )
    elif (complete or body.made_of is not None) and principal[2] > (principal[0] + principal[1]) * (1 + 1e-6):
        plain = isinstance(body.inertia, dict) and not {"xy", "yz", "xz"} & set(body.inertia)
        worst = ("xx", "yy", "zz")[int(np.argmax(np.diag(tensor)))]
        what = f"its {worst} is" if plain else f"of its principal moments {shown} kg*m^2 the largest is"
        yield Trouble(
            path,
            f"no real body has this inertia: {what} above the sum of the other two",
            "check the numbers and the units; moments about another point belong in `made_of` with `inertia_about`",
        )
