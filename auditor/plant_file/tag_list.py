"""A tag list kept as a table in a CSV file: one row per tag, the same keys as columns.

The rows become tables of the plant file before it is checked, so that every check is the same; the book of
faults is told where they come from. A further row of a tag, with a date in the column ``from``, says what
changes from then on.
"""

from __future__ import annotations

import csv
import io
import math
import re
from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import date, datetime
from pathlib import Path
from typing import Any, get_args

from auditor.plant_file.export_parts import tag_form
from auditor.plant_file.faults import FaultBook, UnusableError, choices
from auditor.plant_file.key_lines import KeyPath
from auditor.plant_file.leaves import tag_list_file
from auditor.plant_file.parts import keys_of
from auditor.plant_file.quantities import Amount
from auditor.plant_file.written import shown
from auditor.records.errors import Fault, PlantFileError

_DELIMITERS = (";", "\t", ",")
_RANGE = ("low", "high")
_NOT_IN_A_CELL = frozenset({"changes", "range"})
_DECIMAL_COMMA = re.compile(r"(?<=\d),(?=\d)")


@dataclass
class _List:
    """One tag list while it is being read."""

    export: str
    file: str
    book: FaultBook
    tags: dict[str, Any]
    """Raw tables of the export's tags; those of the plant file are there already."""
    decimal_comma: bool = False
    own: dict[str, int] = field(default_factory=dict)
    """Tags of this list, with their lines."""

    def path(self, name: str) -> KeyPath:
        return ("exports", self.export, "tags", name)

    def fault(self, line: int, column: str, found: str, fix: str) -> None:
        where = f"{self.file}:{line}" + (f", column {column}" if column else "")
        self.book.add_at((self.file, line), Fault(where, found, fix))


def insert_tag_lists(raw: dict[str, Any], folder: Path, book: FaultBook) -> tuple[tuple[str, str], ...]:
    """Read the tag list of every export that names one, and put its rows among the export's tags.

    Returns
    -------
    tuple of (file, text)
        The lists as read.

    Raises
    ------
    PlantFileError
        If a list cannot be read, or has no rows.
    """
    exports = raw.get("exports")
    found: dict[str, str] = {}
    for name, export in exports.items() if isinstance(exports, dict) else ():
        file = export.get("tag_list") if isinstance(export, dict) else None
        if not isinstance(file, str) or not isinstance(export.setdefault("tags", {}), dict):
            continue
        path = ("exports", name, "tag_list")
        try:
            found[file] = _text(folder / tag_list_file(file), file)
        except UnusableError as unusable:
            # Without its tags nothing else of the plant makes sense.
            book.add(path, unusable.found, unusable.fix)
            book.close()
        _insert(found[file], _List(name, file, book, export["tags"]))
    return tuple(found.items())


def _text(path: Path, file: str) -> str:
    try:
        return path.read_bytes().decode("utf-8-sig")
    except OSError as error:
        raise UnusableError(
            f"the tag list {file} cannot be read: {error.strerror}",
            "put it into the site folder, beside plant.toml",
        ) from error
    except UnicodeDecodeError as error:
        line = error.object.count(b"\n", 0, error.start) + 1
        raise UnusableError(
            f"a character in line {line} of {file} is not written in UTF-8", "save the file again as UTF-8"
        ) from error


def _insert(text: str, into: _List) -> None:
    first = text.partition("\n")[0]
    delimiter = max(_DELIMITERS, key=first.count)
    into.decimal_comma = delimiter != ","
    reader = csv.reader(io.StringIO(text, newline=""), delimiter=delimiter)
    headings = [heading.strip() for heading in next(reader, [])]
    known = _check_headings(headings, into)
    last, rows = reader.line_num, 0
    for row in reader:
        line, last = last + 1, reader.line_num
        cells = [cell.strip() for cell in row]
        if not any(cells):
            continue
        rows += 1
        if len(cells) > len(headings) and any(cells[len(headings) :]):
            into.fault(
                line,
                "",
                f"the row has {len(cells)} cells, the heading row {len(headings)}",
                f'put cells that hold a "{delimiter}" in double quotes',
            )
        written = {key: cell for key, cell in zip(headings, cells, strict=False) if cell and key in known}
        _insert_row(written, line, into)
    if not rows:
        fix = "write a row for each tag, below a row with the keys"
        raise PlantFileError([Fault(into.file, "the tag list has no rows", fix)])


def _check_headings(headings: list[str], into: _List) -> set[str]:
    forms = (tag_form({"between": word}) for word in ("step", "line", "mean", "amount", "counter", "state"))
    keys = dict.fromkeys(key for form in forms for key in keys_of(form) if key not in _NOT_IN_A_CELL)
    valid = ["name", *keys, *_RANGE, "from"]
    for heading in dict.fromkeys(headings):
        places = [place for place, other in enumerate(headings, start=1) if other == heading]
        if heading and heading not in valid:
            into.fault(1, heading, f"the key {shown(heading)} is not known here", choices(heading, valid))
        elif heading and len(places) > 1:
            into.fault(
                1,
                heading,
                f"the heading stands in columns {' and '.join(map(str, places))}",
                "keep one of them",
            )
    if "name" not in headings:
        into.fault(1, "name", 'there is no column "name"', "add it: it holds the tag's name in this site")
    return {heading for heading in headings if heading in valid}


def _insert_row(written: Mapping[str, str], line: int, into: _List) -> None:
    cells = dict(written)
    name = cells.pop("name", "")
    since = cells.pop("from", "")
    if not name:
        into.fault(line, "name", "the row has no name", "write the tag's name")
        return
    if since:
        _insert_change(name, since, cells, line, into)
        return
    if name in into.tags:
        where = f"line {into.own[name]}" if name in into.own else "plant.toml"
        into.fault(
            line,
            "name",
            f'the tag "{name}" is declared already ({where})',
            'give each tag its own name; a row that says what changes has a date in the column "from"',
        )
        return
    into.own[name] = line
    into.book.comes_from(into.path(name), into.file, line)
    into.tags[name] = _values(cells, cells.get("between", ""), line, into)


def _insert_change(name: str, since: str, cells: dict[str, str], line: int, into: _List) -> None:
    """Take a row with a date: another heading, other properties, from then on."""
    tag = into.tags.get(name)
    if name not in into.own or not isinstance(tag, dict):
        into.fault(
            line,
            "name",
            f'there is no row of the tag "{name}" above',
            "write first what holds from the start",
        )
        return
    try:
        moment = _moment(since)
    except ValueError:
        into.fault(
            line, "from", f"{shown(since)} is no date", "write it as 2026-07-28 or 2026-07-28T09:00:00"
        )
        return
    heading = cells.pop("column", "")
    if heading:
        before = tag.get("column", "")
        names = before if isinstance(before, list) else [{"name": before}]
        tag["column"] = [*names[:-1], {**names[-1], "until": moment}, {"name": heading, "from": moment}]
    if cells or not heading:
        changes = tag.setdefault("changes", [])
        into.book.comes_from((*into.path(name), "changes", len(changes)), into.file, line)
        changes.append({"from": moment} | _values(cells, str(tag.get("between", "")), line, into))


def _moment(text: str) -> date:
    return date.fromisoformat(text) if len(text) <= len("2026-07-28") else datetime.fromisoformat(text)


def _values(cells: Mapping[str, str], between: str, line: int, into: _List) -> dict[str, Any]:
    """Turn cells into the values that the plant file would hold."""
    fields = keys_of(tag_form({"between": between}))
    values: dict[str, Any] = {}
    for key, cell in cells.items():
        if key in _RANGE:
            continue
        types = _types(fields[key][1].annotation) if key in fields else set()
        if key == "states":
            values[key] = dict(_pair(item) for item in cell.split(";") if item.strip())
        elif float in types:
            values[key] = _number_or_text(cell, into.decimal_comma)
        else:
            values[key] = _with_point(cell, into.decimal_comma) if Amount in types else cell
    limits = [_number_or_text(cells[key], into.decimal_comma) for key in _RANGE if key in cells]
    if len(limits) == 1:
        missing = next(key for key in _RANGE if key not in cells)
        into.fault(line, missing, "a range has two ends", f"fill the column {missing} too, or neither")
    elif limits:
        values["range"] = limits
    return values


def _pair(text: str) -> tuple[str, str]:
    raw, _, name = text.partition("=")
    return raw.strip(), name.strip()


def _with_point(cell: str, decimal_comma: bool) -> str:
    return _DECIMAL_COMMA.sub(".", cell) if decimal_comma else cell


def _number_or_text(cell: str, decimal_comma: bool) -> float | str:
    text = _with_point(cell, decimal_comma)
    try:
        number = float(text)
    except ValueError:
        return text
    return number if math.isfinite(number) else text


def _types(annotation: Any) -> set[Any]:
    """Every plain type that an annotation is made of."""
    inner = get_args(annotation)
    return set().union(*(_types(item) for item in inner)) if inner else {annotation}
