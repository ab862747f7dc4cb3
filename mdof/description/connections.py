"""Schema of connections and property sets, and what each comes to once sets and named points are written out."""

# Annotations are evaluated as they are written: pydantic needs them all at once, and evaluating their text is slower.

from collections.abc import Mapping
from typing import Annotated, Any, ClassVar

from pydantic import Field

from mdof.description.fields import Reads, Section, context_of
from mdof.description.quantities import MOST_UNKNOWN, Quantity, Refused, Trouble, read_quantity, refuse
from mdof.description.readers import (
    POINT,
    POINT_WORDS,
    TEXT,
    TRUTH,
    VECTOR,
    by_direction,
    each,
    name_fault,
    named_list,
    of,
    read_point,
)

__all__ = ["Axes", "Beam", "Branch", "Connection", "Gear", "Limits", "PropertySet", "Values"]

Values = Quantity | dict[str, Quantity]
Point = tuple[Quantity, ...]
Vector = tuple[float, float, float]

_WRITE_STIFFNESS = "write {x: .., y: .., z: ..}"
STIFFNESS = by_direction("stiffness", "rotational_stiffness", _WRITE_STIFFNESS)
DAMPING = by_direction("damping", "rotational_damping", _WRITE_STIFFNESS)
INERTANCE = by_direction("mass", "inertia", _WRITE_STIFFNESS)
LOSS = by_direction("number", "number", "write {x: 0.1, y: 0.1, z: 0.05}")


def _at(raw: Any, info: Any) -> Point | dict[str, Point]:
    context = context_of(info)
    if not isinstance(raw, Mapping):
        return read_point(raw, context)
    if not raw:
        raise refuse("an empty mapping", f"write {POINT_WORDS}, or {{name: {POINT_WORDS}}}")
    points: dict[str, Point] = {}
    entries: list[Trouble] = []
    for name, entry in raw.items():
        if len(entries) >= MOST_UNKNOWN:
            break
        fault = name_fault(name)
        if fault:
            entries.append(Trouble((name,), fault, "a point's name follows the rules of names", True))
            continue
        try:
            points[name] = read_point(entry, context)
        except Refused as refused:
            entries.extend(trouble.below((name,)) for trouble in refused.entries)
    if entries:
        raise Refused(*entries)
    return points


_point_schema = POINT.schema
AT = Reads(
    _at, {"anyOf": [_point_schema, {"type": "object", "additionalProperties": _point_schema, "minProperties": 1}]}
)


def _ends(raw: Any, info: Any) -> tuple[Point, Point]:
    if not isinstance(raw, list | tuple) or len(raw) != 2:
        raise refuse(
            "two points belong here", "write [[x, y, z], [x, y, z]]: the point on the first body, then on the second"
        )
    context = context_of(info)
    first, second = each(raw, lambda entry: read_point(entry, context))
    if [value.value for value in first] == [value.value for value in second]:
        raise refuse("both ends are the same point", "give two different points, or `at` one point")
    return first, second


ENDS = Reads(_ends, {"type": "array", "items": _point_schema, "minItems": 2, "maxItems": 2})


def _pair_of(dimension: str, words: str) -> Reads:
    def function(raw: Any, info: Any) -> tuple[Quantity, ...]:
        if not isinstance(raw, list | tuple) or len(raw) != 2:
            raise refuse("two values belong here", f"write {words}")
        context = context_of(info)
        values: tuple[Quantity, ...] = each(raw, lambda entry: read_quantity(entry, (dimension,), context))
        entries = [
            Trouble((index,), f"{value.text} must be greater than zero", f"write {words}")
            for index, value in enumerate(values)
            if value.value <= 0
        ]
        if entries:
            raise Refused(*entries)
        return values

    return Reads(function, {"type": "array", "items": {"x-quantity": [dimension]}, "minItems": 2, "maxItems": 2})


class Axes(Section):
    """Own axes of a connection; z follows by the right hand."""

    example: ClassVar[str] = "{x: [1, 0, 0], y: [0, 1, 0]}"

    x: Annotated[Vector, VECTOR] = Field(description="Direction of the connection's own x axis.")
    y: Annotated[Vector, VECTOR] = Field(description="Direction of its own y axis, square to x.")


class Branch(Section):
    """A spring and a damper in series, beside the connection's own spring."""

    example: ClassVar[str] = "{stiffness: 455 kN/m, damping: 5.2 kN*s/m}"

    stiffness: Annotated[Values, STIFFNESS] = Field(description="Stiffness of the spring in the branch.")
    damping: Annotated[Values, DAMPING] = Field(description="Damping of the damper in series with it.")


class Beam(Section):
    """A uniform massless beam between two points."""

    example: ClassVar[str] = (
        "{youngs_modulus: 210 GPa, shear_modulus: 81 GPa, area: .., second_moments: [.., ..], torsion_constant: "
        ".., towards: [0, 0, 1]}"
    )

    youngs_modulus: Annotated[Quantity, of("pressure", positive=True)] = Field(description="Young's modulus.")
    shear_modulus: Annotated[Quantity, of("pressure", positive=True)] = Field(description="Shear modulus.")
    area: Annotated[Quantity, of("area", positive=True)] = Field(description="Area of the cross-section.")
    second_moments: Annotated[
        tuple[Quantity, ...], _pair_of("second_moment", "[about y, about z], each such as 8.0e4 mm^4")
    ] = Field(description="Second moments of area about the beam's own y and z axes.")
    torsion_constant: Annotated[Quantity, of("second_moment", positive=True)] = Field(description="Torsion constant.")
    shear_areas: Annotated[
        tuple[Quantity, ...] | None, _pair_of("area", "[along y, along z], each such as 900 mm^2")
    ] = Field(None, description="Shear areas for bending along y and z; without them shear deformation is left out.")
    towards: Annotated[Vector, VECTOR] = Field(
        description="Direction that fixes the beam's own y axis, across the beam."
    )


class Gear(Section):
    """A gear pair: radii, or how many times faster the second shaft turns."""

    example: ClassVar[str] = "{radii: [336 mm, 105 mm]} or {ratio: 3.2}"

    radii: Annotated[tuple[Quantity, ...] | None, _pair_of("length", "[336 mm, 105 mm]")] = Field(
        None, description="Base radii of the first and the second wheel."
    )
    ratio: Annotated[Quantity | None, of("number", positive=True)] = Field(
        None, description="Speed of the second shaft over speed of the first."
    )


class Limits(Section):
    """What the connection can take."""

    example: ClassVar[str] = "{travel: 12 mm, load: 9 kN}"

    travel: Annotated[Quantity | None, of("length", positive=True)] = Field(None, description="Largest travel.")
    load: Annotated[Quantity | None, of("force", positive=True)] = Field(None, description="Largest load.")


_TEXTS = {
    "stiffness": "Stiffness, one value or by direction.",
    "damping": "Viscous damping, one value or by direction.",
    "inertance": "Force over relative acceleration, one value or by direction.",
    "loss_factor": "Loss factor of the stiffness, one value or by direction.",
    "reference_frequency": "Frequency at which the loss factor acts as a dashpot in modes, always with its unit.",
    "branches": "Springs and dampers in series, beside the main spring.",
    "limits": "Largest travel and load.",
    "after_levelling": "True where it is connected after levelling and carries no weight.",
    "stiffness_table": "Not read by this version: stiffness against frequency.",
    "loss_table": "Not read by this version: loss factor against frequency.",
}


class PropertySet(Section):
    """Values that several connections share; a connection `uses` one and may override single values."""

    example: ClassVar[str] = "{stiffness: {x: .., y: .., z: ..}, loss_factor: 0.1}"

    stiffness: Annotated[Values | None, STIFFNESS] = Field(None, description=_TEXTS["stiffness"])
    damping: Annotated[Values | None, DAMPING] = Field(None, description=_TEXTS["damping"])
    inertance: Annotated[Values | None, INERTANCE] = Field(None, description=_TEXTS["inertance"])
    loss_factor: Annotated[Values | None, LOSS] = Field(None, description=_TEXTS["loss_factor"])
    reference_frequency: Annotated[Quantity | None, of("frequency", positive=True)] = Field(
        None, description=_TEXTS["reference_frequency"]
    )
    branches: tuple[Branch, ...] | None = Field(None, max_length=20, description=_TEXTS["branches"])
    limits: Limits | None = Field(None, description=_TEXTS["limits"])
    after_levelling: Annotated[bool | None, TRUTH] = Field(None, description=_TEXTS["after_levelling"])
    stiffness_table: Annotated[str | None, TEXT] = Field(None, description=_TEXTS["stiffness_table"])
    loss_table: Annotated[str | None, TEXT] = Field(None, description=_TEXTS["loss_table"])


class Connection(Section):
    """What joins two bodies, or a body and a ground."""

    example: ClassVar[str] = "{between: [pump, ground], stiffness: {x: .., y: .., z: ..}}"

    # The geometry comes first: what one bare stiffness means depends on it.
    between: Annotated[tuple[str, ...] | None, named_list(2, "[pump, ground]")] = Field(
        None, description="The two ends; relative motion is the first minus the second."
    )
    rigid: Annotated[tuple[str, ...] | None, named_list(2, "[host, rider]")] = Field(
        None, description="A rigid link [host, rider] instead of `between`."
    )
    gear: Gear | None = Field(
        None, description="Makes the connection a gear pair; with `stiffness` and `damping` of the mesh, or rigid."
    )
    beam: Beam | None = Field(None, description="Makes the connection a beam between `ends`.")
    at: Annotated[Point | dict[str, Point] | None, AT] = Field(
        None,
        description="Point it acts at [x, y, z], or named points that make one connection each; the centre of "
        "the first body that is not a ground if not given.",
    )
    ends: Annotated[tuple[Point, Point] | None, ENDS] = Field(
        None, description="Two points it acts between, along the line from one to the other."
    )
    axis: Annotated[Vector | None, VECTOR] = Field(None, description="The one direction it acts along.")
    axes: Axes | None = Field(None, description="Own axes of its directions; global axes if not given.")
    uses: Annotated[str | None, TEXT] = Field(None, description="Property set whose values it takes.")
    stiffness: Annotated[Values | None, STIFFNESS] = Field(None, description=_TEXTS["stiffness"])
    damping: Annotated[Values | None, DAMPING] = Field(None, description=_TEXTS["damping"])
    inertance: Annotated[Values | None, INERTANCE] = Field(None, description=_TEXTS["inertance"])
    loss_factor: Annotated[Values | None, LOSS] = Field(None, description=_TEXTS["loss_factor"])
    reference_frequency: Annotated[Quantity | None, of("frequency", positive=True)] = Field(
        None, description=_TEXTS["reference_frequency"]
    )
    branches: tuple[Branch, ...] | None = Field(None, max_length=20, description=_TEXTS["branches"])
    limits: Limits | None = Field(None, description=_TEXTS["limits"])
    after_levelling: Annotated[bool | None, TRUTH] = Field(None, description=_TEXTS["after_levelling"])
    stiffness_table: Annotated[str | None, TEXT] = Field(None, description=_TEXTS["stiffness_table"])
    loss_table: Annotated[str | None, TEXT] = Field(None, description=_TEXTS["loss_table"])


#: Values a property set hands to a connection, merged direction by direction.
DIRECTIONAL = ("stiffness", "damping", "inertance", "loss_factor")
SHARED = (*DIRECTIONAL, "reference_frequency", "branches", "limits", "after_levelling")


def effective(connection: Connection, shared: PropertySet | None) -> dict[str, Any]:
    """Values of a connection with those of its property set behind them; absent ones are left out."""
    result: dict[str, Any] = {}
    for name in SHARED:
        own = getattr(connection, name)
        behind = getattr(shared, name) if shared is not None else None
        if own is None:
            own = behind
        elif name in DIRECTIONAL and isinstance(own, dict) and isinstance(behind, dict):
            own = {**behind, **own}
        if own is not None:
            result[name] = own
    return result
