"""The reader of parts: every fault of a table at once.

Validating a whole table yields nothing when one key is wrong, and so hides what is wrong elsewhere.
Here every key is validated by itself: a part is always built, and a key at fault holds None in it, so
that the rest can still be checked.
"""

from __future__ import annotations

import functools
from collections.abc import Mapping
from typing import Annotated, Any, get_args, get_origin

from pydantic import ConfigDict, TypeAdapter, ValidationError

from auditor.plant_file.faults import FaultBook, choices
from auditor.plant_file.key_lines import KeyPath
from auditor.plant_file.leaves import Leaf, check_name
from auditor.plant_file.parts import AnyPart, Choice, Part, form_of, keys_of, written_default
from auditor.plant_file.wording import addition, assignment, complaint
from auditor.plant_file.written import shown

_LEAF_RULES = ConfigDict(strict=True, allow_inf_nan=False)


def read_part(model: type[AnyPart], raw: object, path: KeyPath, book: FaultBook) -> AnyPart:
    """Read one table and the tables in it; note unknown, missing and wrong keys.

    Parameters
    ----------
    model : type of Part
        Form of the table.
    raw : object
        Value as the TOML parser gave it.
    path : tuple
        Where it stands.
    book : FaultBook
        Takes the faults.

    Returns
    -------
    Part
        Keys at fault, and required keys that are missing, hold None.
    """
    keys = keys_of(model)
    values: dict[str, Any] = {name: None for name, field in keys.values() if field.is_required()}
    if not isinstance(raw, dict):
        book.add(
            path,
            f"{shown(raw)} stands where a table belongs",
            f"write a table with the keys {', '.join(keys)}",
        )
        return model.model_construct(**values)
    for key, value in raw.items():
        if key in keys:
            values[keys[key][0]] = _read_value(model, key, value, (*path, key), book)
        elif key not in model.also_known:
            _note_unknown(model, key, (*path, key), book)
    for key, (name, field) in keys.items():
        if key not in raw and written_default(field) is not None:
            values[name] = _read_value(model, key, written_default(field), (*path, key), book)
    _note_missing(model, raw, path, book)
    return model.model_construct(**values)


def _read_value(model: type[Part], key: str, raw: object, path: KeyPath, book: FaultBook) -> Any:
    name, field = keys_of(model)[key]
    annotation, choice = form_of(field.annotation, field.metadata)
    if choice is not None:
        return _read_choice(choice, raw, path, book)
    if isinstance(annotation, type) and issubclass(annotation, Part):
        return read_part(annotation, raw, path, book)
    if get_origin(annotation) in (dict, list):
        element, element_choice = form_of(get_args(annotation)[-1])
        if element_choice is None and isinstance(element, type) and issubclass(element, Part):
            element_choice = Choice(lambda _: element)
        if element_choice is not None and raw in ({}, []) and not field.is_required():
            return raw
        if element_choice is not None:
            several = _read_named if get_origin(annotation) is dict else _read_listed
            return several(element_choice, raw, path, book)
    return _read_leaf(model, name, raw, path, book)


def _read_named(choice: Choice, raw: object, path: KeyPath, book: FaultBook) -> dict[str, Any] | None:
    if not isinstance(raw, dict) or not raw:
        book.add(
            path,
            f"{shown(raw)} stands where named tables belong",
            f"write a table [{path[-1]}.NAME] for each",
        )
        return None
    for name in raw:
        book.attempt((*path, name), check_name, name)
    return {name: _read_choice(choice, item, (*path, name), book) for name, item in raw.items()}


def _read_listed(choice: Choice, raw: object, path: KeyPath, book: FaultBook) -> list[Any] | None:
    if not isinstance(raw, list) or not raw:
        book.add(path, f"{shown(raw)} stands where a list of tables belongs", "write [ { ... }, { ... } ]")
        return None
    return [_read_choice(choice, item, (*path, index), book) for index, item in enumerate(raw)]


def _read_choice(choice: Choice, raw: object, path: KeyPath, book: FaultBook) -> Any:
    if choice.words and isinstance(raw, str):
        if raw in choice.words:
            return raw
        book.add(path, f"{shown(raw)} is not known here", choices(raw, choice.words))
        return None
    return read_part(choice.pick(raw if isinstance(raw, dict) else {}), raw, path, book)


@functools.cache
def _leaf_validator(model: type[Part], name: str) -> TypeAdapter[Any]:
    field = model.model_fields[name]
    annotation: Any = field.annotation
    for item in field.metadata:
        annotation = Annotated[annotation, item]
    reads_itself = any(isinstance(item, Leaf) for item in field.metadata)
    return TypeAdapter(annotation, config=None if reads_itself else _LEAF_RULES)


def _read_leaf(model: type[Part], name: str, raw: object, path: KeyPath, book: FaultBook) -> Any:
    field = model.model_fields[name]
    try:
        return _leaf_validator(model, name).validate_python(raw)
    except ValidationError as error:
        for detail in error.errors(include_url=False):
            inside = tuple(part for part in detail["loc"] if _holds(raw, part))
            book.add((*path, *inside), *complaint(detail, assignment(str(path[-1]), field), field))
        return None


def _holds(raw: object, part: int | str) -> bool:
    return isinstance(raw, list) if isinstance(part, int) else isinstance(raw, dict) and part in raw


def _note_unknown(model: type[Part], key: str, path: KeyPath, book: FaultBook) -> None:
    reason = model.refused.get(key)
    if reason is not None:
        book.add(path, f'the key "{key}" does not belong here', reason)
        return
    keys = [*keys_of(model), *sorted(model.also_known)]
    book.add(path, f"the key {shown(key)} is not known here", f"correct or remove it; {choices(key, keys)}")


def _note_missing(model: type[Part], raw: Mapping[str, Any], path: KeyPath, book: FaultBook) -> None:
    keys = keys_of(model)
    for key, (_, field) in keys.items():
        if field.is_required() and key not in raw:
            book.add(
                (*path, key),
                f'the key "{key}" is missing',
                f"{addition(key, field)} ({field.description})",
            )
    for one, other in model.either:
        if one in raw and other in raw:
            book.add((*path, other), f'both "{one}" and "{other}" are written', "keep one of them")
        elif one not in raw and other not in raw:
            either = " or ".join(assignment(key, keys[key][1]) for key in (one, other))
            book.add(
                (*path, one), f'one of the keys "{one}" and "{other}" is missing', f"add for example {either}"
            )
