"""Base of the parts of a plant file: tables with described keys, some of them in several forms."""

from __future__ import annotations

import types
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass
from typing import Annotated, Any, ClassVar, TypeVar, Union, get_args, get_origin

from pydantic import BaseModel, ConfigDict, Field, GetJsonSchemaHandler
from pydantic.fields import FieldInfo
from pydantic.json_schema import JsonSchemaValue
from pydantic_core import CoreSchema


class Part(BaseModel):
    """One table of the plant file.

    Every field has a description and an example, from which remedies and the JSON schema are written.
    In a part that was read with faults, the keys at fault hold None, whatever their type says.
    """

    model_config = ConfigDict(strict=True, extra="forbid", frozen=True, allow_inf_nan=False, defer_build=True)

    either: ClassVar[tuple[tuple[str, str], ...]] = ()
    """Pairs of keys of which exactly one is written."""
    also_known: ClassVar[frozenset[str]] = frozenset()
    """Keys that would be valid if the key that decides the form of the part were right."""
    refused: ClassVar[Mapping[str, str]] = types.MappingProxyType({})
    """Keys of another form of the part, with the reason why they do not belong here."""

    @classmethod
    def __get_pydantic_json_schema__(
        cls, core_schema: CoreSchema, handler: GetJsonSchemaHandler, /
    ) -> JsonSchemaValue:
        """Add the pairs of which exactly one is required."""
        schema = handler(core_schema)
        if cls.either:
            body = handler.resolve_ref_schema(schema)
            body["allOf"] = [{"oneOf": [{"required": [key]} for key in pair]} for pair in cls.either]
        return schema


AnyPart = TypeVar("AnyPart", bound=Part)


@dataclass(frozen=True)
class Choice:
    """Metadata of a field whose table has several forms: which form a raw table has."""

    pick: Callable[[Mapping[str, Any]], type[Part]]
    words: tuple[str, ...] = ()
    """Texts that may stand instead of a table."""


def required(description: str, example: object, *, alias: str | None = None) -> Any:
    """Field of a key that must be written."""
    return Field(alias=alias, description=description, examples=[example])


def optional(description: str, example: object, *, default: object = None, alias: str | None = None) -> Any:
    """Field of a key that may be left out; its default is written as the file would write it."""
    extra: Any = None if default is None else {"default": default}
    return Field(None, alias=alias, description=description, examples=[example], json_schema_extra=extra)


def keys_of(model: type[Part]) -> dict[str, tuple[str, FieldInfo]]:
    """Keys of a part as written in the file, each with its field's name and the field."""
    return {field.alias or name: (name, field) for name, field in model.model_fields.items()}


def required_keys(model: type[Part]) -> Iterator[tuple[str, ...]]:
    """List groups of keys of which one must be written; most groups hold a single key."""
    yield from ((key,) for key, (_, field) in keys_of(model).items() if field.is_required())
    yield from model.either


def written_default(field: FieldInfo) -> object:
    """Return the default of an optional key as the file would write it; None without one."""
    extra = field.json_schema_extra
    return extra.get("default") if isinstance(extra, dict) else None


def form_of(annotation: Any, metadata: list[Any] | None = None) -> tuple[Any, Choice | None]:
    """Take a field's type apart: the type without ``| None`` and ``Annotated``, and its choice of forms."""
    choice = next((item for item in metadata or [] if isinstance(item, Choice)), None)
    while True:
        if get_origin(annotation) is Annotated:
            annotation, *inner = get_args(annotation)
            choice = next((item for item in inner if isinstance(item, Choice)), choice)
        elif get_origin(annotation) in (Union, types.UnionType):
            rest = [item for item in get_args(annotation) if item is not type(None)]
            if len(rest) != 1:
                return annotation, choice
            annotation = rest[0]
        else:
            return annotation, choice
