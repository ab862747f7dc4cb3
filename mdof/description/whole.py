"""Schema of what concerns the whole model: damping, watched points, loads and criteria."""

# Annotations are evaluated as they are written: pydantic needs them all at once, and evaluating their text is slower.

from collections.abc import Mapping
from typing import Annotated, Any, ClassVar

from pydantic import Field

from mdof.description.fields import Reads, Section, context_of
from mdof.description.quantities import DIRECTIONS, MOST_UNKNOWN, Quantity, Refused, Trouble, read_quantity, refuse
from mdof.description.readers import POINT, TEXT, VECTOR, choice, each, of, plain, triple_of

__all__ = ["Criteria", "Damping", "Load", "Settle", "VelocityLimit", "Watch"]

Point = tuple[Quantity, ...]
Pairs = tuple[tuple[Quantity, Quantity], ...]


def pairs(dimension: str, fewest: int, most: int | None, example: str) -> Reads:
    """Reader of values by frequency, ``{4 Hz: 0.02, 30 Hz: 0.03}``, by rising frequency."""

    def function(raw: Any, info: Any) -> Pairs:
        if not isinstance(raw, Mapping) or len(raw) < fewest or (most is not None and len(raw) > most):
            count = "two" if most == fewest == 2 else f"at least {fewest}"
            raise refuse(f"{count} values by frequency belong here", f"write {example}")
        context = context_of(info)
        found: list[tuple[Quantity, Quantity]] = []
        entries: list[Trouble] = []
        seen: set[float] = set()
        for key, entry in raw.items():
            if len(entries) >= MOST_UNKNOWN:
                break
            value = frequency = None
            try:
                frequency = read_quantity(key, ("frequency",), context)
                if frequency.value <= 0:
                    entries.append(Trouble((key,), "a frequency must be greater than zero", f"write {example}", True))
            except Refused as refused:
                entries.extend(Trouble((key,), trouble.message, trouble.expected, True) for trouble in refused.entries)
            try:
                value = read_quantity(entry, (dimension,), context)
                if value.value < 0:
                    entries.append(Trouble((key,), f"{value.text} must not be negative", f"write {example}"))
            except Refused as refused:
                entries.extend(trouble.below((key,)) for trouble in refused.entries)
            if frequency is not None and value is not None:
                if frequency.value in seen:
                    entries.append(Trouble((key,), "the same frequency is written twice", "keep one", True))
                seen.add(frequency.value)
                found.append((frequency, value))
        if entries:
            raise Refused(*entries)
        return tuple(sorted(found, key=lambda pair: pair[0].value))

    return Reads(
        function, {"type": "object", "additionalProperties": {"x-quantity": [dimension]}, "minProperties": fewest}
    )


class Damping(Section):
    """Damping of the whole, in one of three forms."""

    example: ClassVar[str] = (
        "{mode_ratios: 0.02}, {two_ratios: {4 Hz: 0.02, 30 Hz: 0.03}} or {mass_proportional: 0.8 1/s, "
        "stiffness_proportional: 2.0e-5 s}"
    )

    mass_proportional: Annotated[Quantity | None, of("rate", at_least_zero=True)] = Field(
        None, description="Damping matrix over mass matrix."
    )
    stiffness_proportional: Annotated[Quantity | None, of("time", at_least_zero=True)] = Field(
        None, description="Damping matrix over stiffness matrix."
    )
    two_ratios: Annotated[Pairs | None, pairs("number", 2, 2, "{4 Hz: 0.02, 30 Hz: 0.03}")] = Field(
        None, description="Damping ratios at two frequencies, which fix both proportional terms."
    )
    mode_ratios: Annotated[Quantity | None, of("number", at_least_zero=True)] = Field(
        None, description="One damping ratio for the undamped modes of everything without damping of its own."
    )


class Watch(Section):
    """A point someone asks about."""

    example: ClassVar[str] = "{on: pump, at: [310, 0, 950]}"

    on: Annotated[str, TEXT] = Field(description="Body the point belongs to.")
    at: Annotated[Point | None, POINT] = Field(None, description="The point [x, y, z]; the body's centre if not given.")


def _speed(raw: Any, info: Any) -> Quantity | tuple[Quantity, Quantity]:
    context = context_of(info)
    if not isinstance(raw, Mapping) or "value" in raw:
        speed = read_quantity(raw, ("frequency",), context)
        if speed.value < 0:
            raise refuse("a speed must not be negative", "write 2980 rpm")
        return speed
    entries = [
        Trouble((str(key),), f"unknown key `{key}`", "write {from: 900 rpm, to: 2100 rpm}", True)
        for key in raw
        if key not in ("from", "to")
    ]
    found = []
    for key in ("from", "to"):
        if key not in raw:
            entries.append(Trouble((), f"`{key}` is missing", "write {from: 900 rpm, to: 2100 rpm}"))
            continue
        try:
            found.append(read_quantity(raw[key], ("frequency",), context))
        except Refused as refused:
            entries.extend(trouble.below((key,)) for trouble in refused.entries)
    if not entries and not 0 <= found[0].value < found[1].value:
        entries.append(Trouble((), "the range of speed does not rise", "write the lower speed under `from`"))
    if entries:
        raise Refused(*entries)
    return found[0], found[1]


_one_speed = {"x-quantity": ["frequency"]}
SPEED = Reads(
    _speed,
    {
        "anyOf": [
            _one_speed,
            {
                "type": "object",
                "properties": {
                    "from": {"description": "Lowest speed.", **_one_speed},
                    "to": {"description": "Highest speed.", **_one_speed},
                },
                "required": ["from", "to"],
                "additionalProperties": False,
            },
        ]
    },
)


def _orders(raw: Any, info: Any) -> tuple[float, ...]:
    if not isinstance(raw, list | tuple) or not raw:
        raise refuse("a list of orders belongs here", "write [1] or [0.5, 1, 3]")
    context = context_of(info)
    values = each(raw, lambda entry: read_quantity(entry, ("number",), context).value)
    entries = [
        Trouble((index,), "an order must be greater than zero", "write 0.5, 1, 2 ..")
        for index, value in enumerate(values)
        if value <= 0
    ]
    if entries:
        raise Refused(*entries)
    return values


ORDERS = Reads(_orders, {"type": "array", "items": {"type": "number", "exclusiveMinimum": 0}, "minItems": 1})


class Load(Section):
    """One load: an unbalance, a force, a moment, or motion of a base."""

    example: ClassVar[str] = "{unbalance: 12 g*m, on: pump, at: [120, 0, 950], axis: [1, 0, 0], speed: 2980 rpm}"

    unbalance: Annotated[Quantity | None, of("unbalance")] = Field(None, description="Unbalance, mass times radius.")
    force: Annotated[Point | None, triple_of("force", "[x, y, z], each such as 9 kN")] = Field(
        None, description="Force [x, y, z], amplitude."
    )
    moment: Annotated[Point | None, triple_of("moment", "[x, y, z], each such as 60 N*m")] = Field(
        None, description="Moment about [x, y, z], amplitude."
    )
    base: Annotated[str | None, TEXT] = Field(None, description="Support that moves.")
    on: Annotated[str | None, TEXT] = Field(None, description="Body the load acts on.")
    at: Annotated[Point | None, POINT] = Field(
        None, description="Point it acts at [x, y, z]; the body's centre if not given."
    )
    axis: Annotated[tuple[float, float, float] | None, VECTOR] = Field(
        None, description="Axis the unbalance turns about, by the right hand."
    )
    direction: Annotated[str | None, choice(DIRECTIONS)] = Field(None, description="Direction the base moves in.")
    acceleration_spectrum: Annotated[
        Pairs | None, pairs("acceleration_spectrum", 2, None, "{5 Hz: 0.01 g^2/Hz, 50 Hz: 0.001 g^2/Hz}")
    ] = Field(None, description="Acceleration spectrum of the base by frequency.")
    speed: Annotated[Quantity | tuple[Quantity, Quantity] | None, SPEED] = Field(
        None, description="Speed of rotation, or {from: .., to: ..}."
    )
    order: Annotated[float | None, plain("number", positive=True)] = Field(None, description="Order: times a turn.")
    orders: Annotated[tuple[float, ...] | None, ORDERS] = Field(None, description="Several orders.")


class Settle(Section):
    """How soon motion must die out."""

    example: ClassVar[str] = "{band: 2 %, within: 1.5 s, at: drive_end}"

    band: Annotated[float, plain("number", positive=True)] = Field(
        description="Share of the start that still counts as moving."
    )
    within: Annotated[float, plain("time", positive=True)] = Field(description="Time it may take.")
    at: Annotated[str | None, TEXT] = Field(None, description="Watched point; all if not given.")


class VelocityLimit(Section):
    """Vibration velocity that must not be passed."""

    example: ClassVar[str] = "{at: drive_end, rms: 4.5 mm/s}"

    at: Annotated[str, TEXT] = Field(description="Watched point.")
    rms: Annotated[float, plain("velocity", positive=True)] = Field(description="Largest root-mean-square velocity.")


class Criteria(Section):
    """Limits the user sets; SI numbers."""

    example: ClassVar[str] = "{least_damping_ratio: 0.05, below: 60 Hz}"

    least_damping_ratio: Annotated[float | None, plain("number", at_least_zero=True)] = Field(
        None, description="Damping ratio that every mode must reach."
    )
    below: Annotated[float | None, plain("frequency", positive=True)] = Field(
        None, description="Natural frequency below which modes are judged."
    )
    settle: Settle | None = Field(None, description="How soon motion must die out.")
    separation: Annotated[float | None, plain("number", positive=True)] = Field(
        None, description="Distance of natural frequencies from exciting ones, as a share."
    )
    velocity_limit: VelocityLimit | None = Field(None, description="Vibration velocity that must not be passed.")
