"""What the whole of a file says against the declarations of its export: found while it is read."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from auditor.log_reading.cells import read_number
from auditor.log_reading.decide import Cells
from auditor.log_reading.numbers_text import grouped_by
from auditor.log_reading.stamps import Stamps, Texts, read_stamps, style_of
from auditor.records.errors import Fault, PlantFileError
from auditor.records.plant import DateOrder, Export, Tag
from auditor.records.samples import Disposition

_SWAPPED: dict[DateOrder, DateOrder] = {"day first": "month first", "month first": "day first"}
_MOST_FLIPS = 1
"""So many stamps in the other order may be damaged lines, where the declared order is proven."""


@dataclass(frozen=True)
class Contradiction:
    """A cell that the declaration of its export cannot read, while another one can."""

    line: int
    text: str
    column: str
    reads_as: str
    """The declaration that would read it."""


@dataclass(frozen=True)
class Proof:
    """What pieces of the files of an export have proven before they are read."""

    dates: bool
    """A stamp can be read with the declared order only."""
    decimal: bool
    """A number needs the declared decimal mark."""


def contradicted(path: str, found: Contradiction, key: str, declared: str) -> Fault:
    """Fault of a cell that speaks against a declaration which nothing else speaks for."""
    return Fault(
        f"logs/{path}:{found.line}, column {found.column}",
        f'"{found.text}" cannot be read with {key} = "{declared}", and nothing in this export needs it;'
        f' it can be read with "{found.reads_as}"',
        f'set {key} = "{found.reads_as}", if that is how this logger writes',
    )


def grouped(path: str, found: Contradiction, export: Export) -> Fault:
    """Fault of a number with a mark between groups of three that is not declared."""
    key = f"exports.{export.name}"
    fix = f'if it groups the digits, add {key}.thousands = "{found.reads_as}"'
    if found.reads_as in (".", ","):
        fix += f'; if it is the decimal mark, set {key}.decimal = "{found.reads_as}"'
    return Fault(
        f"logs/{path}:{found.line}, column {found.column}",
        f'"{found.text}" cannot be decided: {key}.decimal = "{export.decimal}", and no mark between groups'
        " of three digits is declared",
        fix,
    )


def mixed_dates(path: str, found: Contradiction, export: Export) -> Fault:
    """Fault of a file in which day and month change places."""
    return Fault(
        f"logs/{path}:{found.line}, column {found.column}",
        f'"{found.text}" can only be read {found.reads_as}, other stamps of this export only'
        f" {export.date_order}, as declared: of days up to the 12th nobody can tell which is meant",
        "export the file again with one order of the date, without opening it in a spreadsheet first",
    )


def number_in_doubt(
    text: str, export: Export, is_proven: bool
) -> tuple[Literal["grouped", "decimal"], str] | None:
    """Say which declaration a text speaks against that gave no number.

    Parameters
    ----------
    text : str
        Without blanks around.
    export : Export
        Its declarations.
    is_proven : bool
        Whether a number of the export needs the declared decimal mark.

    Returns
    -------
    tuple or None
        What is in doubt, and the declaration that would read the text.
    """
    mark = grouped_by(text, export.decimal)
    if mark is not None and export.thousands is None:
        return "grouped", mark
    other: Literal[".", ","] = "," if export.decimal == "." else "."
    may_be_other = not is_proven and other != export.thousands and other in text
    if may_be_other and read_number(text, other) is not None:
        return "decimal", other
    return None


class Doubts:
    """Holds what one file says, as it is read, against the declarations of its export."""

    def __init__(self, path: str, export: Export, tags: Sequence[Tag], proof: Proof) -> None:
        self._path, self._export, self._tags = path, export, tags
        self._dates_proven, self._decimal_proven = proof.dates, proof.decimal
        self._first_flip: Contradiction | None = None
        self._flips = 0

    def about_numbers(self, cells: Cells, line: NDArray[np.int64], dated: NDArray[np.bool_]) -> None:
        """Look at the texts that gave no number, on lines that are data.

        Raises
        ------
        PlantFileError
            If one of them could only be read with another decimal mark, which nothing so far speaks
            against, or with a mark between groups of digits that is not declared.
        """
        hit = np.flatnonzero((cells.disposition == Disposition.UNPARSEABLE) & dated[cells.row])
        if not hit.size:
            return
        if not self._decimal_proven:
            finite = cells.values[np.isfinite(cells.values)]
            self._decimal_proven = bool((finite != np.floor(finite)).any())
        words, first = np.unique(cells.word[hit], return_index=True)
        for word, at in zip(words.tolist(), hit[first].tolist(), strict=True):
            doubt = number_in_doubt(cells.words[word].strip(), self._export, self._decimal_proven)
            if doubt is None:
                continue
            kind, reads_as = doubt
            text, column = cells.words[word].strip(), self._tags[int(cells.tag[at])].column
            found = Contradiction(int(line[cells.row[at]]), text, column, reads_as)
            key = f"exports.{self._export.name}.decimal"
            if kind == "grouped":
                raise PlantFileError([grouped(self._path, found, self._export)])
            raise PlantFileError([contradicted(self._path, found, key, self._export.decimal)])

    def about_dates(
        self, stamps: Stamps, texts: list[Texts], line: NDArray[np.int64], bad: NDArray[np.int64]
    ) -> None:
        """Look at the rows whose stamps cannot be read.

        Raises
        ------
        PlantFileError
            If they can be read with day and month the other way round. A single one is taken for a
            damaged line where other stamps prove the declared order.
        """
        found = flips(bad, texts, self._export)
        if not found.size:
            return
        good = np.flatnonzero(stamps.good)
        self._dates_proven |= flips(good, texts, self._export).size < good.size
        self._flips += found.size
        if self._first_flip is None:
            text = " ".join(column.at(int(found[0])).strip() for column in texts)
            column = ", ".join(self._export.stamp_columns) or "of the stamp"
            order = swapped(self._export.date_order)
            self._first_flip = Contradiction(int(line[found[0]]), text, column, order)
        if not self._dates_proven:
            key = f"exports.{self._export.name}.date_order"
            raise PlantFileError([contradicted(self._path, self._first_flip, key, self._export.date_order)])
        if self._flips > _MOST_FLIPS:
            raise PlantFileError([mixed_dates(self._path, self._first_flip, self._export)])


def flips(rows: NDArray[np.int64], texts: list[Texts], export: Export) -> NDArray[np.int64]:
    """Return those of some rows whose stamps can be read with day and month the other way round."""
    if export.date_order not in _SWAPPED or not rows.size:
        return rows[:0]
    style = style_of(export, swapped(export.date_order))
    return rows[read_stamps([column.take(rows) for column in texts], style).good]


def swapped(order: DateOrder) -> DateOrder:
    """Return the order with day and month the other way round; any other order as it is."""
    return _SWAPPED.get(order, order)
