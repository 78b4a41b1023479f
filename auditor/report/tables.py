"""Tables for other programs: intervals.csv, intervals.parquet and dispositions.csv.

Numbers are written with ten significant digits, stamps in ISO 8601 with the offset of the site's clock,
and no text cell can start a formula in a spreadsheet.
"""

from __future__ import annotations

import csv
import io
from collections.abc import Iterable, Iterator, Sequence
from datetime import UTC, datetime
from typing import TYPE_CHECKING
from zoneinfo import ZoneInfo

import numpy as np

from auditor.records.samples import Disposition
from auditor.records.ticks import SecondKind
from auditor.records.verdicts import Verdict

if TYPE_CHECKING:
    import pyarrow as pa
    from numpy.typing import NDArray

    from auditor.records.result import AuditResult
    from auditor.records.ticks import Example

_POWERS = (
    ("fuel_in", "fuel_in_W"),
    ("heat_in", "heat_in_W"),
    ("power_in", "power_in_W"),
    ("work_gross", "work_gross_W"),
    ("work_net", "work_net_W"),
    ("useful_heat", "useful_heat_W"),
    ("rejected", "rejected_W"),
    ("rejected_measured", "rejected_measured_W"),
    ("loss", "loss_W"),
)
_EFFICIENCIES = ("gross", "net", "heat", "total")

INTERVAL_COLUMNS: tuple[str, ...] = (
    "machine",
    "start",
    "end",
    "coverage_pct",
    *(f"{name}_kW" for name, _ in _POWERS),
    "residual_kW",
    "residual_U_kW",
    *(f"{name}{part}_pct" for name in _EFFICIENCIES for part in ("", "_U")),
    "ceiling_pct",
    "margin_pct",
    "margin_U_pct",
    "ceiling_kind",
    "ceiling_share_pct",
    "entropy_generation_kW_per_K",
    "verdict",
    "reasons",
    *(f"{name}_U_kW" for name, _ in _POWERS),
    "ceiling_U_pct",
    "entropy_generation_U_kW_per_K",
)
"""Columns of intervals.csv and intervals.parquet, in order."""

_FORMULA_STARTS = ("=", "+", "-", "@", "\t", "\r", "\n")


def defused(text: str) -> str:
    """Return a text cell that no spreadsheet takes for a formula (an apostrophe goes before it)."""
    return f"'{text}" if text.startswith(_FORMULA_STARTS) else text


def local_iso(instants_us: Iterable[int], zone: str) -> list[str]:
    """ISO 8601 stamps with offset in a zone, to the second (or to the microsecond where there is one)."""
    clock = ZoneInfo(zone)
    return [
        datetime.fromtimestamp(int(us) // 1_000_000, UTC)
        .replace(microsecond=int(us) % 1_000_000)
        .astimezone(clock)
        .isoformat()
        for us in instants_us
    ]


def interval_columns(result: AuditResult) -> dict[str, list[str] | NDArray[np.float64]]:
    """All intervals of all machines as columns: texts as lists, numbers as arrays (NaN = not known)."""
    texts = ("machine", "start", "end", "ceiling_kind", "verdict", "reasons")
    parts: dict[str, list[object]] = {name: [] for name in INTERVAL_COLUMNS}
    for name in result.balances:
        for column, piece in _machine_columns(result, name).items():
            parts[column].append(piece)
    columns: dict[str, list[str] | NDArray[np.float64]] = {}
    for name, pieces in parts.items():
        if name in texts:
            columns[name] = [text for piece in pieces for text in piece]  # type: ignore[attr-defined]
        else:
            columns[name] = np.concatenate(pieces) if pieces else np.zeros(0)  # type: ignore[arg-type]
    return columns


def _machine_columns(result: AuditResult, name: str) -> dict[str, object]:
    balance, judgement = result.balances[name], result.judgements[name]
    machine, figures = result.plant.machines[name], balance.interval
    unknown = np.full(figures.start_us.shape, np.nan)

    def value(key: str, scale: float) -> NDArray[np.float64]:
        return figures.values.get(key, unknown) * scale

    def U(key: str, scale: float) -> NDArray[np.float64]:
        return balance.interval_U.get(key, unknown) * scale

    count = figures.start_us.shape[0]
    columns: dict[str, object] = {
        "machine": [name] * count,
        "start": local_iso(figures.start_us, result.period.zone),
        "end": local_iso(figures.end_us, result.period.zone),
        "coverage_pct": figures.coverage * 100.0,
        "residual_kW": value("residual_W", 1e-3),
        "residual_U_kW": U("residual_W", 1e-3),
        "ceiling_pct": value("ceiling", 100.0),
        "ceiling_U_pct": U("ceiling", 100.0),
        "margin_pct": value("margin", 100.0),
        "margin_U_pct": U("margin", 100.0),
        "ceiling_kind": [machine.ceiling.kind.value if machine.ceiling else "none"] * count,
        "ceiling_share_pct": value("ceiling_share", 100.0),
        "entropy_generation_kW_per_K": value("entropy_generation_W_per_K", 1e-3),
        "entropy_generation_U_kW_per_K": U("entropy_generation_W_per_K", 1e-3),
        "verdict": [Verdict(word).word for word in judgement.verdict],
        "reasons": ["; ".join(reasons) for reasons in judgement.reasons],
    }
    for column, key in _POWERS:
        columns[f"{column}_kW"] = value(key, 1e-3)
        columns[f"{column}_U_kW"] = U(key, 1e-3)
    for key in _EFFICIENCIES:
        columns[f"{key}_pct"] = value(key, 100.0)
        columns[f"{key}_U_pct"] = U(key, 100.0)
    return columns


def number_text(number: float) -> str:
    """Ten significant digits, shortest form; empty for a number that is not known."""
    return f"{number:.10g}" if np.isfinite(number) else ""


def _csv_text(header: Sequence[str], rows: Iterable[Sequence[str]]) -> str:
    buffer = io.StringIO()
    writer = csv.writer(buffer, lineterminator="\n")
    writer.writerow(header)
    writer.writerows(rows)
    return buffer.getvalue()


def intervals_csv(result: AuditResult) -> bytes:
    """Write intervals.csv: one row per machine and interval, UTF-8."""
    columns = interval_columns(result)
    texts = [
        [number_text(item) for item in column.tolist()]
        if isinstance(column, np.ndarray)
        else [defused(item) for item in column]
        for column in columns.values()
    ]
    return _csv_text(INTERVAL_COLUMNS, zip(*texts, strict=True)).encode()


def intervals_parquet(result: AuditResult) -> bytes:
    """Write the same table as Parquet, numbers unrounded."""
    import pyarrow as pa
    import pyarrow.parquet as pq

    columns = interval_columns(result)
    table = pa.table({name: _arrow(column) for name, column in columns.items()})
    sink = pa.BufferOutputStream()
    pq.write_table(table, sink, compression="zstd")
    return bytes(sink.getvalue())


def _arrow(column: list[str] | NDArray[np.float64]) -> pa.Array:
    """Give a column to Arrow by its buffers: the usual way would import pandas only to look at the type."""
    import pyarrow as pa

    if isinstance(column, np.ndarray):
        numbers = np.ascontiguousarray(column, dtype=np.float64)
        return pa.Array.from_buffers(pa.float64(), numbers.size, [None, pa.py_buffer(numbers)])
    texts = [text.encode() for text in column]
    ends = np.cumsum([0, *map(len, texts)], dtype=np.int32)
    return pa.StringArray.from_buffers(len(texts), pa.py_buffer(ends), pa.py_buffer(b"".join(texts)))


DISPOSITION_COLUMNS = (
    "ledger",
    "tag",
    "kind",
    "amount",
    "unit",
    "first_file",
    "first_line",
    "first_text",
    "last_file",
    "last_line",
    "last_text",
)


def dispositions_csv(result: AuditResult) -> bytes:
    """Write both ledgers: raw cells by disposition, seconds of the period by kind, per tag."""
    return _csv_text(DISPOSITION_COLUMNS, [*_cell_rows(result), *_second_rows(result)]).encode()


def _cell_rows(result: AuditResult) -> Iterator[tuple[str, ...]]:
    ledger = result.ticks.cells
    for row, tag in enumerate(ledger.tags):
        for disposition in Disposition:
            count = int(ledger.counts[row, disposition])
            if count:
                first = _example_cells(ledger.first.get((tag, disposition)))
                last = _example_cells(ledger.last.get((tag, disposition)))
                yield ("cells", defused(tag), disposition.word, str(count), "cells", *first, *last)
        yield ("cells", defused(tag), "all raw cells", str(int(ledger.raw_cells[row])), "cells", *[""] * 6)


def _example_cells(example: Example | None) -> tuple[str, str, str]:
    if example is None:
        return ("", "", "")
    return (defused(example.file), str(example.line), defused(example.raw))


def _second_rows(result: AuditResult) -> Iterator[tuple[str, ...]]:
    ledger = result.ticks.seconds
    for row, tag in enumerate(ledger.tags):
        for kind in SecondKind:
            seconds = ledger.microseconds[row, kind] / 1e6
            yield ("seconds", defused(tag), kind.word, number_text(seconds), "s", *[""] * 6)
