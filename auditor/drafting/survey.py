"""From a folder of exports to proposals: look, group, gather, and say what each column shows."""

from __future__ import annotations

import re
from collections.abc import Mapping
from pathlib import Path

from auditor.drafting.columns import (
    decimal_mark,
    long_columns,
    long_layout,
    tag_name,
    unit_of,
    unit_rows,
)
from auditor.drafting.first_look import CALENDAR, Sighting, look_first
from auditor.drafting.gathering import Column
from auditor.drafting.grouping import Group, group_files
from auditor.drafting.looks_like import look_at_column
from auditor.drafting.proposals import Appearance, Draft, ExportProposal, TagProposal
from auditor.drafting.stamp_evidence import stamp_evidence
from auditor.log_reading.listing import every_file
from auditor.log_reading.stamps import StampStyle, read_stamps, texts_of
from auditor.records.errors import Fault, NoDataError

_RESERVED = "reference"
"""A name that the plant file keeps for itself."""


def draft_plant(logs: Path) -> Draft:
    """Look into every file below a folder and propose how to declare it.

    Parameters
    ----------
    logs : Path
        Folder of exports; only ever read.

    Raises
    ------
    NoDataError
        If no file below it holds a table with time stamps.
    """
    files, unreadable = every_file(logs)
    sightings: list[Sighting] = []
    skipped = list(unreadable)
    foreign: list[str] = []
    for stored in files:
        found = look_first(stored)
        if isinstance(found, str):
            skipped.append((stored.path, found))
            # Hidden, empty and unfinished files are set aside by themselves, whichever pattern claims them.
            foreign += [] if stored.set_aside else [stored.path]
        else:
            sightings.append(found)
    if not sightings:
        reasons = "; ".join(f"{path}: {reason}" for path, reason in skipped[:5])
        raise NoDataError(
            [
                Fault(
                    str(logs),
                    "no file below this folder holds a table with time stamps"
                    + (f" ({reasons})" if reasons else ""),
                    "name the folder that the logger's exports are in",
                )
            ]
        )
    groups = group_files(sightings, [*foreign, *(path for path, _ in unreadable)])
    used: set[str] = set()
    names: set[str] = {_RESERVED}
    exports = tuple(_export(group, used, names) for group in groups)
    return Draft(exports, tuple(sorted(skipped)))


def _export(group: Group, used: set[str], names: set[str]) -> ExportProposal:
    gathered = group.gathered
    table = group.files[0].table
    columns = gathered.columns()
    layout = long_layout(gathered, columns)
    units: Mapping[str, str] = {}
    stamp = tuple(table.headings[place] for place in table.stamp)
    remarks = list(group.remarks)
    if layout is None:
        doubled = {name for name in table.headings if name and table.headings.count(name) > 1}
        left_out = _left_out(columns, {*stamp, *doubled}, remarks)
        remarks += [f'the heading "{name}" stands twice: no tag can bind it' for name in sorted(doubled)]
        cells = {name: columns[name] for name in group.headings if name not in left_out}
    else:
        cells, units = long_columns(gathered, columns, layout)
    decimal, because = decimal_mark(
        (text for column in cells.values() for text in column.texts), table.delimiter
    )
    name = _unique(_export_name(group), used)
    tags = []
    for column, found in cells.items():
        look = look_at_column(found, decimal)
        if look is None:
            remarks.append(f'the column "{column}" is empty in all rows looked at: left out')
            continue
        if look.appearance is Appearance.WORDS:
            remarks.append(f'the column "{column}" holds {look.because}: left out')
            continue
        rows = [(units[column], "in the column of units")] if column in units else []
        rows += unit_rows((file.table for file in group.files), column)
        tags.append(
            TagProposal(
                name=_unique(tag_name(column), names, name),
                column=column,
                unit=unit_of(column, rows),
                appearance=look.appearance,
                because=look.because,
                texts=look.texts,
            )
        )
    return ExportProposal(
        name=name,
        files=group.patterns,
        count=len(group.files),
        delimiter=table.delimiter,
        decimal=decimal,
        decimal_because=because,
        layout=layout,
        stamp=stamp if layout is None and table.stamp != (0,) else (),
        stamps=stamp_evidence(gathered),
        tags=tuple(tags),
        remarks=tuple(remarks),
    )


def _left_out(columns: Mapping[str, Column], known: set[str], remarks: list[str]) -> set[str]:
    """Columns that are no tags: the stamp, doubled headings, and further columns of stamps."""
    more = set()
    for name, column in columns.items():
        filled = [text for text in column.texts if text]
        if name in known or not filled or not name:
            continue
        if not name.isprintable():
            more.add(name)
            remarks.append(f'the heading "{name}" holds a character that cannot be printed: left out')
            continue
        good = max(int(read_stamps([texts_of(filled)], StampStyle(order)).good.sum()) for order in CALENDAR)
        if good > 0.9 * len(filled):
            more.add(name)
            remarks.append(f'the column "{name}" holds dates or stamps too ("{filled[0]}"): left out')
    return known | more | {""}


def _export_name(group: Group) -> str:
    """Return the folder's name, or what the names of the files begin with."""
    *folders, file = group.patterns[0].partition("!")[0].split("/")
    named = [folder for folder in folders if folder != "*"]
    text = named[-1] if named and file.startswith("*") else re.split(r"[\d*.]", file)[0]
    plain = re.sub(r"[^\w-]+", "_", text).strip("-_")
    return tag_name(plain) if plain else "logger"


def _unique(name: str, used: set[str], prefix: str = "") -> str:
    candidates = [name, *([f"{prefix}_{name}"] if prefix else [])]
    number = 2
    while candidates[0] in used:
        candidates.pop(0)
        if not candidates:
            candidates = [f"{name}_{number}"]
            number += 1
    used.add(candidates[0])
    return candidates[0]
