"""What a page is made of, before markup: tables and figures with their captions."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from auditor.report.drawings.geometry import Drawing


@dataclass(frozen=True)
class Table:
    """A table in words. The first cell of each row names the row."""

    caption: str
    columns: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    numeric: tuple[int, ...] = ()
    """Indices of columns that hold numbers, set flush right."""
    total: tuple[str, ...] | None = None
    """A last row that sums up."""
    note: str = ""
    code: tuple[int, ...] = ()
    """Indices of columns with verbatim text: tags, digests, raw cells."""
    whole: tuple[int, ...] = ()
    """Indices of columns whose cells are never broken into lines: stamps, file names."""

    def __post_init__(self) -> None:
        """Every row is as wide as the heading: a wrong one would shift columns silently."""
        for row in (*self.rows, *([self.total] if self.total else [])):
            if len(row) != len(self.columns):
                raise ValueError(f"table {self.caption!r}: row {row!r} does not fit {self.columns!r}")


@dataclass(frozen=True)
class Figure:
    """A picture with its caption and its table. Exactly one of ``drawing`` and ``chart`` is there."""

    id: str
    title: str
    caption: str
    tables: tuple[Table, ...] = ()
    drawing: Drawing | None = None
    chart: Mapping[str, object] | None = None
    """``{"data": [...], "layout": {...}}`` for the script of the page."""
    height: int = 420
    """Height of a chart in CSS pixels."""
