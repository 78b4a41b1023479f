"""Delimiter, heading row, unit row and the columns that the plant file binds, found in a file's head."""

from __future__ import annotations

import csv
import unicodedata
from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Literal

from auditor.log_reading.cells import read_number
from auditor.log_reading.stamps import read_stamps, style_of, texts_of
from auditor.records.errors import Fault
from auditor.records.plant import Export, FilePerTag, LongLayout, PairsLayout, Tag
from auditor.units import UnitError, same_unit, split_qualifier
from auditor.units.spellings import meanings

_DELIMITERS = (";", "\t", ",")
_NAMES = {";": "semicolons", "\t": "tabs", ",": "commas"}
_DECIMALS: tuple[Literal[".", ","], ...] = (".", ",")
_LONGEST_PREAMBLE = 200


@dataclass(frozen=True)
class Dialect:
    """How the lines of one file are to be cut and bound. Columns count from 0, lines from 1."""

    delimiter: str
    heading_line: int
    unit_line: int | None
    first_data_line: int
    headings: tuple[str, ...]
    fields: int
    """Fields of a data line; more than headings where every data line ends with a separator."""
    stamp: tuple[int, ...]
    columns: Mapping[str, int]
    """Wide: tag to column."""
    tag_column: int | None
    """Long: the column with the names of tags."""
    value_column: int | None
    quality_column: int | None
    """Long: the column that says whether the value is good, where one is declared."""
    pair_stamps: tuple[int, ...]
    """Pairs: for each bound column, in order of tags, the column of its own stamps."""
    known_lines: frozenset[str]
    """Preamble, heading and unit rows as they stand: where they come again, they are passed over."""
    evidence: tuple[str, ...]

    @property
    def is_long(self) -> bool:
        """One row per stamp, tag and value."""
        return self.tag_column is not None

    @property
    def layout(self) -> str:
        """How the lines are laid out, in a word."""
        return "long" if self.is_long else "pairs" if self.pair_stamps else "wide"

    @property
    def unclaimed(self) -> tuple[int, ...]:
        """Columns that neither a tag nor the stamp binds."""
        bound = {*self.stamp, *self.columns.values(), *self.pair_stamps}
        bound |= {
            place for place in (self.tag_column, self.value_column, self.quality_column) if place is not None
        }
        return tuple(place for place, name in enumerate(self.headings) if place not in bound and name)


def heading_key(text: str) -> str:
    """Bring a heading into the form that is compared: composed letters, single blanks, no quotes around.

    Examples
    --------
    >>> heading_key(' "Vorlauf  T1" ')
    'Vorlauf T1'
    """
    plain = unicodedata.normalize("NFC", text).replace("\ufeff", "").strip().strip('"')
    return " ".join(plain.split())


def split_fields(line: str, delimiter: str) -> list[str]:
    """Cut one line into its fields; quotes count only where they are closed."""
    if '"' in line:
        try:
            rows = list(csv.reader([line], delimiter=delimiter, strict=True))
            return rows[0] if rows else [""]
        except csv.Error:
            pass
    return line.split(delimiter)


def find_dialect(head: Sequence[str], export: Export, tags: Mapping[str, Tag]) -> Dialect | None:
    """Find the heading row that names the most bound columns; None where no line names any.

    Parameters
    ----------
    head : sequence of str
        The first lines of the file.
    export : Export
        Its declaration.
    tags : mapping
        Tags of this export by name.
    """
    wanted = wanted_headings(export, tags)
    best: tuple[int, str, int] = (0, "", 0)
    for number, line in enumerate(head[:_LONGEST_PREAMBLE]):
        if best[0] == len(wanted):
            break
        for delimiter in (export.delimiter,) if export.delimiter else _DELIMITERS:
            found = {heading_key(field) for field in split_fields(line, delimiter)} & wanted
            if isinstance(export.layout, LongLayout | FilePerTag) and len(found) < len(wanted):
                continue
            if len(found) > best[0]:
                best = (len(found), delimiter, number)
    hits, delimiter, row = best
    if hits == 0 or not _has_stamp(head[row], delimiter, export):
        return None
    return _bind(head, row, delimiter, export, tags)


def wanted_headings(export: Export, tags: Mapping[str, Tag]) -> set[str]:
    """Headings that the plant file names for an export, the stamp's left out in wide files."""
    if isinstance(export.layout, FilePerTag):
        return {heading_key(export.layout.value)}
    if isinstance(export.layout, LongLayout):
        return {heading_key(name) for name in long_headings(export.layout).values()}
    return {heading_key(tags[name].column) for name in export.tags}


def long_headings(layout: LongLayout) -> dict[str, str]:
    """Headings that a long export must have, by their key of the layout."""
    named = {"stamp": layout.stamp, "tag": layout.tag, "value": layout.value}
    return named if layout.quality is None else {**named, "quality.column": layout.quality.column}


def duplicate_headings(
    dialect: Dialect, export: Export, tags: Mapping[str, Tag]
) -> list[tuple[str, list[int]]]:
    """Bound headings that stand more than once in the heading row, with their places from 1."""
    wanted = wanted_headings(export, tags) | {heading_key(name) for name in export.stamp_columns}
    places: dict[str, list[int]] = {}
    for place, name in enumerate(dialect.headings, start=1):
        if name in wanted:
            places.setdefault(name, []).append(place)
    return [(name, found) for name, found in places.items() if len(found) > 1]


def unit_faults(
    dialect: Dialect, head: Sequence[str], file: str, tags: Mapping[str, Tag]
) -> tuple[list[Fault], list[str]]:
    """Compare the unit row with the plant file.

    Returns
    -------
    faults, evidence : list of Fault, list of str
        A unit that differs is a fault; what could not be compared is said in words.
    """
    if dialect.unit_line is None:
        return [], []
    cells = split_fields(head[dialect.unit_line - 1], dialect.delimiter)
    faults, evidence, same = [], [], 0
    for name, place in dialect.columns.items():
        tag, found = tags[name], cells[place].strip() if place < len(cells) else ""
        if not tag.unit or not found:
            continue
        verdict = _same(found, tag)
        if verdict is None:
            evidence.append(
                f'unit text "{found}" of column {dialect.headings[place]} is not known and was not compared'
            )
        elif verdict:
            same += 1
        else:
            where = f"logs/{file}:{dialect.unit_line}, column {dialect.headings[place]}"
            name = name.partition("=")[0]
            what = f'the unit row says "{found}", the plant file says "{tag.unit}" for tag {name}'
            faults.append(
                Fault(where, what, f"correct exports.{tag.export}.tags.{name}.unit, or the column it binds")
            )
    evidence.append(f"units of {same} columns agree with the plant file (line {dialect.unit_line})")
    return faults, evidence


def _has_stamp(line: str, delimiter: str, export: Export) -> bool:
    keys = {heading_key(field) for field in split_fields(line, delimiter)}
    return all(heading_key(name) in keys for name in export.stamp_columns)


def _bind(head: Sequence[str], row: int, delimiter: str, export: Export, tags: Mapping[str, Tag]) -> Dialect:
    headings = [heading_key(field) for field in split_fields(head[row], delimiter)]
    while len(headings) > 1 and not headings[-1]:
        headings.pop()
    layout = export.layout if isinstance(export.layout, LongLayout) else None
    stamp_names = (layout.stamp,) if layout else export.stamp_columns
    stamp = tuple(headings.index(heading_key(name)) for name in stamp_names) or (0,)
    columns: dict[str, int] = {}
    if isinstance(export.layout, FilePerTag):
        columns = dict.fromkeys(tags, headings.index(heading_key(export.layout.value)))
    elif layout is None:
        bound = ((name, heading_key(tags[name].column)) for name in export.tags)
        columns = {name: headings.index(key) for name, key in bound if key in headings}
    pair_stamps: tuple[int, ...] = ()
    if isinstance(export.layout, PairsLayout):
        # A tag in the first column has no stamp at its left.
        columns = {name: place for name, place in columns.items() if place > 0}
        pair_stamps = tuple(place - 1 for place in columns.values())
        stamp = pair_stamps[:1] or stamp
    is_stamp = _stamp_lines(head, delimiter, stamp, export)
    first = _first_data(head, row, delimiter, is_stamp, columns, export)
    unit_row = _unit_row(head, row, first, delimiter, columns, tags)
    fields, trailing = _fields(head[first:], delimiter, len(headings))
    evidence = [
        f"{_NAMES.get(delimiter, repr(delimiter))} separate the {len(headings)} headings of line {row + 1}"
        + (" (declared)" if export.delimiter else "")
    ]
    evidence += ["every data line ends with a separator of its own"] if trailing else []
    return Dialect(
        delimiter=delimiter,
        heading_line=row + 1,
        unit_line=None if unit_row is None else unit_row + 1,
        first_data_line=first + 1,
        headings=tuple(headings),
        fields=fields,
        stamp=stamp,
        columns=columns,
        tag_column=headings.index(heading_key(layout.tag)) if layout else None,
        value_column=headings.index(heading_key(layout.value)) if layout else None,
        quality_column=headings.index(heading_key(layout.quality.column))
        if layout and layout.quality
        else None,
        pair_stamps=pair_stamps,
        known_lines=frozenset(line.strip() for line in head[:first]) - {""},
        evidence=tuple(evidence),
    )


def _stamp_lines(head: Sequence[str], delimiter: str, stamp: tuple[int, ...], export: Export) -> list[bool]:
    rows = [split_fields(line, delimiter) for line in head]
    columns = [texts_of([row[place] if place < len(row) else "" for row in rows]) for place in stamp]
    return [bool(good) for good in read_stamps(columns, style_of(export)).good]


def _first_data(
    head: Sequence[str],
    row: int,
    delimiter: str,
    is_stamp: list[bool],
    columns: Mapping[str, int],
    export: Export,
) -> int:
    """First line below the heading that is data: it has a stamp, or numbers in bound columns."""
    for number in range(row + 1, len(head)):
        cells = split_fields(head[number], delimiter)
        numbers = [cells[at] for at in columns.values() if at < len(cells)]
        if is_stamp[number] or any(read_number(text.strip(), export.decimal) is not None for text in numbers):
            return number
    return min(row + 1, len(head))


def _unit_row(
    head: Sequence[str],
    row: int,
    first: int,
    delimiter: str,
    columns: Mapping[str, int],
    tags: Mapping[str, Tag],
) -> int | None:
    below = list(range(row + 1, first))
    for number in below + ([row - 1] if row else []):
        cells = split_fields(head[number], delimiter)
        texts = [(cells[at].strip(), tags[name]) for name, at in columns.items() if at < len(cells)]
        filled = [(text, tag) for text, tag in texts if text and tag.unit]
        known = [text for text, tag in filled if _same(text, tag) is not None]
        numbers = any(read_number(text, decimal) is not None for text, _ in filled for decimal in _DECIMALS)
        if filled and not numbers and 2 * len(known) >= len(filled):
            return number
    return None


def _same(found: str, tag: Tag) -> bool | None:
    """Whether a unit text is that of the tag; None when nobody knows the text."""
    if any(same_unit(found, then.unit) for _, _, then in tag.stretches):
        return True
    unit, qualifier = split_qualifier(found)
    try:
        meanings(unit)
    except UnitError:
        return None
    if qualifier in ("gauge", "absolute"):
        return same_unit(unit, tag.unit) and tag.pressure == qualifier
    # A gas volume "at the normal state" is a matter of the meter's declaration, not of the unit.
    return qualifier is not None and same_unit(unit, split_qualifier(tag.unit)[0])


def _fields(data: Sequence[str], delimiter: str, headings: int) -> tuple[int, bool]:
    """Fields of a data line, and whether it ends with separators that the heading lacks."""
    rows = [split_fields(line, delimiter) for line in data[:500] if line.strip()]
    counts = Counter(len(row) for row in rows)
    if not counts:
        return headings, False
    most = min(counts, key=lambda count: (-counts[count], count))
    # Surplus fields that hold anything could mean that the columns are shifted: such lines are ragged.
    surplus = most > headings and not any(any(row[headings:]) for row in rows if len(row) == most)
    return (most, True) if surplus else (headings, False)
