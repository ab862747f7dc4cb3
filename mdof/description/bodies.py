"""Schema of bodies and supports, and the mass properties that follow from what was written."""

# Annotations are evaluated as they are written: pydantic needs them all at once, and evaluating their text is slower.

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Annotated, Any, ClassVar, Self

import numpy as np
from numpy.typing import NDArray
from pydantic import Field

from mdof.description.fields import Reads, Section, context_of
from mdof.description.quantities import Quantity, Refused, Trouble, read_quantity, refuse
from mdof.description.readers import DIRECTION_LIST, POINT, TEXT, TRUTH, VECTOR, of, three_of

__all__ = ["Body", "BodyPart", "Contents", "MassProperties", "Spin", "Support", "mass_properties"]

#: Standard gravity, exact by definition (3rd CGPM, 1901) [m/s²].
STANDARD_GRAVITY = 9.80665
_ENTRIES = ("xx", "yy", "zz", "xy", "yz", "xz")

Inertia = Quantity | dict[str, Quantity]
Point = tuple[Quantity, ...]


def _inertia(raw: Any, info: Any) -> Inertia:
    """One number (torsional), three, or ``{xx, yy, zz, xy, yz, xz}``; kept as written by name."""
    context = context_of(info)
    if hasattr(raw, "tolist"):
        raw = raw.tolist()
    if isinstance(raw, list | tuple):
        if len(raw) != 3:
            raise refuse(
                f"{len(raw)} values where three, xx, yy and zz, belong",
                "write [xx, yy, zz], or {xx: .., yy: .., zz: .., xz: ..}, each with its unit",
            )
        return dict(zip(_ENTRIES, three_of(raw, "inertia", context), strict=False))
    if not isinstance(raw, Mapping) or "value" in raw:
        return read_quantity(raw, ("inertia",), context)
    found, entries = {}, []
    for key, entry in raw.items():
        if key not in _ENTRIES:
            entries.append(
                Trouble((str(key),), f"unknown key `{str(key)[:40]}`", f"the keys here are {', '.join(_ENTRIES)}", True)
            )
            continue
        try:
            found[str(key)] = read_quantity(entry, ("inertia",), context)
        except Refused as refused:
            entries.extend(trouble.below((str(key),)) for trouble in refused.entries)
    if entries:
        raise Refused(*entries)
    if not found:
        raise refuse("an empty mapping", "write {xx: .., yy: .., zz: ..}")
    return {key: found[key] for key in _ENTRIES if key in found}


_SAYS = {1: "Moment of inertia", 2: "Product of inertia"}
_one = {"x-quantity": ["inertia"]}
INERTIA = Reads(
    _inertia,
    {
        "anyOf": [
            _one,
            {"type": "array", "items": _one, "minItems": 3, "maxItems": 3},
            {
                "type": "object",
                "properties": {name: {"description": f"{_SAYS[len(set(name))]} {name}.", **_one} for name in _ENTRIES},
                "additionalProperties": False,
                "minProperties": 1,
            },
        ]
    },
)


class Contents(Section):
    """What fills a part, as volume, density and filling."""

    example: ClassVar[str] = "{volume: 0.36 m^3, density: 840 kg/m^3, fill: 10 %}"

    volume: Annotated[Quantity, of("volume", positive=True)] = Field(description="Volume when full.")
    density: Annotated[Quantity, of("density", positive=True)] = Field(description="Density of what fills it.")
    fill: Annotated[Quantity | None, of("number", at_least_zero=True)] = Field(
        None, description="Share that is filled, 0 to 100 %; full if not given."
    )


class BodyPart(Section):
    """One part of a body that is made of several; a part without inertia counts as a point."""

    example: ClassVar[str] = "{mass: 10 kg, centre: [0, 0, 0.3]}"

    name: Annotated[str | None, TEXT] = Field(None, description="What the part is, for the reader.")
    mass: Annotated[Quantity | None, of("mass", positive=True)] = Field(None, description="Mass of the part.")
    weight: Annotated[Quantity | None, of("force", positive=True)] = Field(
        None, description="Weight of the part, a force; divided by standard gravity."
    )
    contents: Contents | None = Field(None, description="What fills the part, instead of its mass.")
    centre: Annotated[Point, POINT] = Field(description="Centre of gravity of the part [x, y, z].")
    inertia: Annotated[Inertia | None, INERTIA] = Field(
        None, description="Inertia of the part about its own centre, or about `inertia_about`."
    )
    inertia_about: Annotated[Point | None, POINT] = Field(
        None, description="Point that `inertia` is about, if not the part's own centre."
    )


class Spin(Section):
    """Steady rotation of a rotor inside the body; it adds the gyroscopic moment."""

    example: ClassVar[str] = "{axis: [1, 0, 0], speed: 1480 rpm, polar_inertia: 2.1 kg*m^2}"

    axis: Annotated[tuple[float, float, float], VECTOR] = Field(description="Axis of rotation, by the right hand.")
    speed: Annotated[Quantity, of("frequency")] = Field(description="Speed of rotation, always with its unit.")
    polar_inertia: Annotated[Quantity, of("inertia", positive=True)] = Field(
        description="Moment of inertia of what spins, about its axis."
    )


class Body(Section):
    """A rigid body. A bare mass is short for ``{mass: ..}``."""

    example: ClassVar[str] = "a mass such as 10 kg, or {mass: 10 kg, centre: [0, 0, 0], inertia: [..]}"

    mass: Annotated[Quantity | None, of("mass")] = Field(None, description="Mass.")
    weight: Annotated[Quantity | None, of("force")] = Field(
        None, description="Weight, a force, instead of mass; divided by standard gravity."
    )
    centre: Annotated[Point | None, POINT] = Field(
        None, description="Centre of gravity [x, y, z]; the origin if not given."
    )
    inertia: Annotated[Inertia | None, INERTIA] = Field(
        None,
        description="Moments of inertia about the body's own centre: one number where it has one rotation, [xx, "
        "yy, zz], or a mapping "
        "with the products xy, yz, xz (xy is the integral of x y dm; the tensor holds it with a minus sign).",
    )
    directions: Annotated[tuple[str, ...] | None, DIRECTION_LIST] = Field(
        None, description="Directions this body may move in; the model's if not given."
    )
    massless: Annotated[bool, TRUTH] = Field(False, description="True for a joint without mass.")
    made_of: tuple[BodyPart, ...] | None = Field(
        None, max_length=500, description="Parts to merge into one body by the parallel-axis rule."
    )
    spin: Spin | None = Field(None, description="A rotor spinning inside the body.")

    @classmethod
    def shorthand(cls, raw: Any) -> Any:
        if isinstance(raw, Mapping):
            # {value: .., tolerance: ..} is a mass with what is known about it.
            return {"mass": raw} if "value" in raw else raw
        return raw if raw is None or isinstance(raw, list | tuple | bool) else {"mass": raw}


class Support(Section):
    """A named ground, which loads may move; rotations are about its centre."""

    example: ClassVar[str] = "{centre: [0, 0, 0]}"

    centre: Annotated[Point | None, POINT] = Field(
        None, description="Point its rotations are about [x, y, z]; the origin if not given."
    )


@dataclass(frozen=True, kw_only=True, slots=True, eq=False)
class MassProperties:
    """What a body's description comes to.

    Attributes
    ----------
    mass : float [kg]; 0 for a massless joint, or in a torsional train.
    centre : tuple of three floats [m]
    inertia : ndarray, shape (3, 3) [kg m²] about the centre, or None.
    """

    mass: float
    centre: tuple[float, float, float]
    inertia: NDArray[np.float64] | None

    @classmethod
    def of_parts(cls, parts: tuple[BodyPart, ...]) -> Self:
        """Parts merged by the parallel-axis rule: J = Σ (J_i + m_i (d·d 1 − d dᵀ))."""
        masses = np.array([part_mass(part) for part in parts])
        centres = np.array([[float(value) for value in part.centre] for part in parts])
        total = float(masses.sum())
        centre = masses @ centres / total
        inertia = np.zeros((3, 3))
        for part, mass, at in zip(parts, masses, centres, strict=True):
            inertia += _shift(mass, at - centre)
            if part.inertia is not None:
                own = tensor(part.inertia)
                if part.inertia_about is not None:
                    own = own - _shift(mass, at - np.array([float(value) for value in part.inertia_about]))
                inertia += own
        return cls(mass=total, centre=(float(centre[0]), float(centre[1]), float(centre[2])), inertia=inertia)


def part_mass(part: BodyPart) -> float:
    """Mass of a part [kg], from mass, weight or contents."""
    if part.mass is not None:
        return part.mass.value
    if part.weight is not None:
        return part.weight.value / STANDARD_GRAVITY
    if part.contents is not None:
        full = part.contents.volume.value * part.contents.density.value
        return full * (1.0 if part.contents.fill is None else part.contents.fill.value)
    return 0.0


def _shift(mass: float, offset: NDArray[np.float64]) -> NDArray[np.float64]:
    return np.asarray(mass * (float(offset @ offset) * np.eye(3) - np.outer(offset, offset)))


def tensor(inertia: Inertia) -> NDArray[np.float64]:
    """Inertia tensor, shape (3, 3), minus the products off its diagonal; moments not given are the largest given."""
    if isinstance(inertia, Quantity):
        return np.asarray(np.eye(3) * inertia.value)
    values = {key: float(value) for key, value in inertia.items()}
    fill = max((values[key] for key in _ENTRIES[:3] if key in values), default=0.0)
    xx, yy, zz = (values.get(key, fill) for key in _ENTRIES[:3])
    xy, yz, xz = (values.get(key, 0.0) for key in _ENTRIES[3:])
    return np.array([[xx, -xy, -xz], [-xy, yy, -yz], [-xz, -yz, zz]])


def mass_properties(body: Body) -> MassProperties:
    """Mass, centre and inertia of a body that passed the checks."""
    if body.made_of is not None:
        return MassProperties.of_parts(body.made_of)
    mass = 0.0
    if body.mass is not None:
        mass = body.mass.value
    elif body.weight is not None:
        mass = body.weight.value / STANDARD_GRAVITY
    centre = (0.0, 0.0, 0.0)
    if body.centre is not None:
        centre = (body.centre[0].value, body.centre[1].value, body.centre[2].value)
    return MassProperties(mass=mass, centre=centre, inertia=None if body.inertia is None else tensor(body.inertia))
