"""The base of every schema class, and how a reader of single values becomes one of its fields.

A reader turns what the file says into an SI value or complains; several complaints of one value are kept together,
each with the key path below that value. Pydantic carries them upwards and nests the paths.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from itertools import islice
from typing import Any, ClassVar

from pydantic import BaseModel, ConfigDict, ValidationError, model_validator
from pydantic_core import InitErrorDetails, PydanticCustomError, core_schema

from mdof.description.quantities import MOST_UNKNOWN, Context, Refused, Trouble, kind_of, unknown_key

__all__ = ["Reads", "Section", "as_validation_error", "context_of", "troubles"]


def _details(entry: Trouble, value: Any = None) -> InitErrorDetails:
    context = {"message": entry.message, "expected": entry.expected, "on_key": entry.on_key}
    return InitErrorDetails(type=PydanticCustomError("mdof", "{message}", context), loc=entry.path, input=value)


def as_validation_error(entries: Iterable[Trouble]) -> ValidationError:
    """Complaints in the form that pydantic nests into its own."""
    return ValidationError.from_exception_data("model", [_details(entry) for entry in entries])


class Reads:
    """Annotation that reads a field by a function of the raw value and the validation info."""

    def __init__(self, function: Callable[[Any, Any], Any], schema: Mapping[str, Any]) -> None:
        self.function = function
        self.schema = schema

    def __get_pydantic_core_schema__(self, source: Any, handler: Any) -> core_schema.CoreSchema:
        return core_schema.with_info_plain_validator_function(self._read)

    def __get_pydantic_json_schema__(self, schema: Any, handler: Any) -> dict[str, Any]:
        return dict(self.schema)

    def _read(self, value: Any, info: Any) -> Any:
        try:
            return self.function(value, info)
        except Refused as refused:
            raise as_validation_error(refused.entries) from None


def context_of(info: Any) -> Context:
    """The reading context of a validation; without one no bare number has a unit."""
    return info.context if isinstance(info.context, Context) else Context()


class Section(BaseModel):
    """A mapping of the model file: frozen, no unknown keys, every complaint kept."""

    model_config = ConfigDict(frozen=True, extra="forbid", arbitrary_types_allowed=True, defer_build=True)

    #: What a reader of the file would write here, for the message when something else stands there.
    example: ClassVar[str] = "a mapping of keys"

    @classmethod
    def shorthand(cls, raw: Any) -> Any:
        """A chance to accept a shorter form; returns a mapping, or the value unchanged."""
        return raw

    @model_validator(mode="wrap")
    @classmethod
    def _strict(cls, raw: Any, handler: Any) -> Any:
        if isinstance(raw, cls):
            return raw
        raw = cls.shorthand(raw)
        if not isinstance(raw, Mapping):
            raise as_validation_error([Trouble((), f"{kind_of(raw)} where a mapping belongs", f"write {cls.example}")])
        fields = cls.model_fields
        entries = [unknown_key(key, fields) for key in islice((key for key in raw if key not in fields), MOST_UNKNOWN)]
        entries += [
            Trouble((key,), "no value is given", f"write one, or remove the key `{key}`")
            for key in raw
            if key in fields and raw[key] is None
        ]
        known = {key: value for key, value in raw.items() if key in fields and value is not None}
        try:
            made = handler(known)
        except ValidationError as error:
            missing = [key for key in raw if key in fields and raw[key] is None]
            entries += [entry for entry in troubles(error, cls) if not (entry.path and entry.path[0] in missing)]
        if entries:
            raise as_validation_error(entries)
        return made


def troubles(error: ValidationError, owner: type[BaseModel] | None = None) -> list[Trouble]:
    """The complaints inside a pydantic error, in mdof's words."""
    result = []
    for entry in error.errors(include_url=False, include_input=True):
        path = tuple(entry["loc"])
        context = entry.get("ctx", {})
        kind = entry["type"]
        if kind == "mdof":
            result.append(Trouble(path, context["message"], context["expected"], context["on_key"]))
        elif kind == "missing":
            name = str(path[-1])
            known = owner.model_fields.get(name) if owner is not None and len(path) == 1 else None
            result.append(
                Trouble(
                    path,
                    f"`{name}` is missing",
                    f"add it: {known.description}" if known and known.description else "add it",
                )
            )
        else:
            what = {
                "tuple_type": "a list belongs here",
                "list_type": "a list belongs here",
                "dict_type": "a mapping belongs here",
                "too_short": "too few entries",
                "too_long": "too many entries",
            }.get(kind, entry["msg"])
            result.append(Trouble(path, what, ""))
    return result
