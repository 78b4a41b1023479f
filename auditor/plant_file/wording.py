"""What a wrong value is called, in the words of the plant: never in those of the validating library."""

from __future__ import annotations

from datetime import date
from typing import Any, Literal, get_args, get_origin

from pydantic.fields import FieldInfo
from pydantic_core import ErrorDetails

from auditor.plant_file.faults import UnusableError, choices
from auditor.plant_file.parts import form_of
from auditor.plant_file.written import shown, toml_text

_KINDS_OF_TYPE = {
    "string_type": "is no text",
    "float_type": "is no plain number",
    "int_type": "is no whole number",
    "finite_number": "is not finite",
    "list_type": "is no list",
    "dict_type": "is no table",
    "too_short": "has too few entries",
    "too_long": "has too many entries",
}


def complaint(detail: ErrorDetails, example: str, field: FieldInfo) -> tuple[str, str]:
    """Say what was found and what to write, for one validation error of a single value."""
    cause = detail.get("ctx", {}).get("error")
    if isinstance(cause, UnusableError):
        return cause.found, cause.fix
    found = shown(detail["input"])
    if detail["type"] == "literal_error":
        return f"{found} is not known here", choices(
            str(detail["input"]), map(str, _literal_words(field.annotation))
        )
    return (
        f"{found} {_KINDS_OF_TYPE.get(detail['type'], 'cannot be used here')}",
        f"write for example {example}",
    )


def assignment(key: str, field: FieldInfo) -> str:
    """Write a line that could be pasted: ``hold = "5 min"``, and a date without quotes."""
    example = (field.examples or [""])[0]
    is_date = date in get_args(form_of(field.annotation)[0])
    return f"{key} = {example if is_date else toml_text(example)}"


def addition(key: str, field: FieldInfo) -> str:
    """Say what to add for a missing key: every word it may be, or else an example."""
    options = _literal_words(field.annotation)
    if options:
        return "add " + " or ".join(f"{key} = {toml_text(option)}" for option in options)
    return f"add for example {assignment(key, field)}"


def _literal_words(annotation: Any) -> list[Any]:
    literal, _ = form_of(annotation)
    return list(get_args(literal)) if get_origin(literal) is Literal else []
