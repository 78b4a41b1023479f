"""The key ``column`` of a tag: one heading, several, or several with dates."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from datetime import date
from types import MappingProxyType
from typing import Annotated, Any, TypeAlias

from auditor.plant_file.clocks import instant_us
from auditor.plant_file.faults import FaultBook, UnusableError, choices
from auditor.plant_file.key_lines import KeyPath
from auditor.plant_file.leaves import Leaf, moment, one_line
from auditor.plant_file.written import shown
from auditor.records.plant import Heading

_KEYS = ("name", "from", "until")
_EXAMPLE = 'column = [ { name = "PT101", until = 2026-07-10 }, { name = "PT-101A", from = 2026-07-10 } ]'


@dataclass(frozen=True)
class WrittenHeading:
    """One heading as the plant file writes it."""

    name: str
    from_: date | None = None
    until: date | None = None


def read_headings(value: object) -> tuple[WrittenHeading, ...]:
    """Accept a heading, or a list of headings, each a text or a table with ``name``, ``from``, ``until``."""
    items = value if isinstance(value, list) else [value]
    if not items:
        raise UnusableError("the list of headings is empty", f"write one heading, or {_EXAMPLE}")
    headings = tuple(_heading(item) for item in items)
    names = [heading.name for heading in headings]
    twice = next((name for name in names if names.count(name) > 1), None)
    if twice is not None:
        raise UnusableError(f"the heading {shown(twice)} is written twice", "write each heading once")
    return headings


def _heading(item: Any) -> WrittenHeading:
    if not isinstance(item, dict):
        return WrittenHeading(one_line(item))
    unknown = next((key for key in item if key not in _KEYS), None)
    if unknown is not None:
        raise UnusableError(
            f"the key {shown(unknown)} is not known here", f"correct or remove it; {choices(unknown, _KEYS)}"
        )
    if "name" not in item:
        raise UnusableError('the key "name" is missing', f"write the heading: {_EXAMPLE}")
    dates = {key: moment(item[key]) for key in ("from", "until") if key in item}
    return WrittenHeading(one_line(item["name"]), dates.get("from"), dates.get("until"))


def resolve_headings(
    written: tuple[WrittenHeading, ...], zone: str | None, path: KeyPath, book: FaultBook
) -> tuple[Heading, ...]:
    """Headings with their instants; none where there is a single one that always holds."""
    if zone is None or (len(written) == 1 and written[0].from_ is None and written[0].until is None):
        return ()
    headings = []
    for heading in written:
        from_us = None if heading.from_ is None else instant_us(heading.from_, zone)
        until_us = None if heading.until is None else instant_us(heading.until, zone)
        if from_us is not None and until_us is not None and until_us <= from_us:
            book.add(
                (*path, "column"),
                f"the heading {shown(heading.name)} ends before it begins",
                "write until as the moment from which the heading no longer belongs to the tag",
            )
        headings.append(Heading(heading.name, from_us, until_us))
    return tuple(headings)


_TEXT: Mapping[str, Any] = MappingProxyType({"type": "string"})
_DATED: Mapping[str, Any] = MappingProxyType(
    {
        "type": "object",
        "properties": {
            "name": {"type": "string", "description": "the heading"},
            "from": {"type": "string", "description": "from when on it is the tag's"},
            "until": {"type": "string", "description": "from when on it no longer is"},
        },
        "required": ["name"],
        "additionalProperties": False,
    }
)
_SCHEMA: Mapping[str, Any] = MappingProxyType(
    {
        "oneOf": [
            dict(_TEXT),
            {"type": "array", "items": {"oneOf": [dict(_TEXT), dict(_DATED)]}, "minItems": 1},
        ]
    }
)

ColumnHeadings: TypeAlias = Annotated[tuple[WrittenHeading, ...], Leaf(read_headings, _SCHEMA)]
