"""However a table is written down, reading and cleaning make the same ticks and the same ledgers of it."""

from __future__ import annotations

import random
import tempfile
from collections.abc import Sequence
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from log_reading_factory import make_export, read

from auditor.cleaning import CleaningSettings, clean
from auditor.records.period import Grid, Period
from auditor.records.plant import LongLayout
from auditor.records.ticks import TickTable

START = np.datetime64("2026-07-01T00:00", "s")
PERIOD_US = tuple(int(at.astype(np.int64)) * 1_000_000 for at in (START, START + np.timedelta64(12, "h")))
GRID = Grid(
    Period("half a day", *PERIOD_US, "UTC"), 60, 900, np.arange(*PERIOD_US, 60_000_000), np.array(PERIOD_US)
)
Row = tuple[int, str, str]
"""Seconds after the start, and two cells with a decimal point."""
NUMBERS = st.floats(-500, 1500, allow_nan=False).map(lambda value: f"{value:.6g}")
CELLS = st.one_of(NUMBERS, NUMBERS, NUMBERS, st.sampled_from(["", "Störung", "-9999", "12.5 kW"]))
TABLES = st.lists(
    st.tuples(st.integers(-2000, 45_000), CELLS, CELLS),
    min_size=2,
    max_size=60,
    unique_by=lambda row: row[0],
).map(sorted)
COUNTER = {"between": "counter", "si_unit": "J", "full_scale": 2000.0, "at_most": 1.0}
RULES = st.sampled_from(
    [
        {"between": "line"},
        {"between": "step", "believable": (-100.0, 1000.0)},
        {"between": "mean", "stamp_marks": "end"},
        {"between": "amount", "stamp_marks": "start", "si_unit": "J"},
        COUNTER,
    ]
)
SETTINGS = settings(suppress_health_check=list(HealthCheck))


@dataclass(frozen=True)
class Way:
    """A way of writing a table down."""

    delimiter: str = ";"
    decimal: str = "."
    encoding: str = "utf-8"
    end: str = "\n"
    stamp: str = "%Y-%m-%d %H:%M:%S"
    order: str = "year first"
    quoted: bool = False
    long: bool = False
    hours: int = 0
    """How far the clock of the logger is ahead of UTC."""


PLAIN = Way()
WAYS = st.builds(
    Way,
    delimiter=st.sampled_from(";\t,"),
    decimal=st.sampled_from(".,"),
    encoding=st.sampled_from(["utf-8", "utf-8-sig", "utf-16", "cp1252"]),
    end=st.sampled_from(["\n", "\r\n", "\r"]),
    quoted=st.booleans(),
    long=st.booleans(),
    hours=st.integers(-3, 12),
).filter(lambda way: way.quoted or (way.delimiter, way.decimal) != (",", ","))
STAMPS = st.sampled_from(
    [
        ("%Y-%m-%d %H:%M:%S", "year first"),
        ("%Y-%m-%dT%H:%M:%S", "year first"),
        ("%d.%m.%Y %H:%M:%S", "day first"),
        ("%m/%d/%Y %H:%M:%S", "month first"),
    ]
)


def written(rows: Sequence[Row], way: Way) -> bytes:
    """Write a table down."""

    def line(*cells: str) -> str:
        return way.delimiter.join(f'"{cell}"' if way.quoted else cell for cell in cells)

    lines = [line("time", "point", "reading") if way.long else line("time", "a", "b")]
    for second, *texts in rows:
        moment = START + np.timedelta64(second + 3600 * way.hours, "s")
        stamp = moment.astype(object).strftime(way.stamp)
        cells = [cell.replace(".", way.decimal) for cell in texts]
        if way.long:
            lines += [line(stamp, name, cell) for name, cell in zip("ab", cells, strict=True)]
        else:
            lines.append(line(stamp, *cells))
    return way.end.join([*lines, ""]).encode(way.encoding)


def ticks(files: Sequence[Sequence[Row]], way: Way, rule: dict[str, object]) -> TickTable:
    """Write tables to files, read and clean them."""
    export, tags = make_export(
        {"a": "a", "b": "b"},
        decimal=way.decimal,
        date_order=way.order,
        clock=f"{way.hours:+03}:00",
        layout=LongLayout("time", "point", "reading") if way.long else None,
        sentinels=(-9999.0,),
    )
    tags = {"a": replace(tags["a"], hold_s=1800.0, **rule), "b": tags["b"]}
    with tempfile.TemporaryDirectory() as folder:
        contents = {f"{place}.csv": written(rows, way) for place, rows in enumerate(files)}
        got = read(Path(folder), contents, (export, tags))
    return clean({"x": iter(got.blocks)}, CleaningSettings({"x": export}, tags, (), {}, {}), GRID)[0]


def hold_same(table: TickTable, other: TickTable) -> None:
    """Hold that two tables agree in every tick, cell and microsecond."""
    np.testing.assert_array_equal(table.seconds.microseconds, other.seconds.microseconds)
    np.testing.assert_array_equal(table.cells.counts, other.cells.counts)
    np.testing.assert_array_equal(table.samples, other.samples)
    np.testing.assert_allclose(table.covered_s, other.covered_s, rtol=0, atol=1e-9)
    np.testing.assert_allclose(table.mean, other.mean, rtol=1e-9, atol=1e-9)
    assert [(bridge.tag, bridge.start_us, bridge.end_us) for bridge in table.bridges] == [
        (bridge.tag, bridge.start_us, bridge.end_us) for bridge in other.bridges
    ]
    np.testing.assert_allclose(
        [bridge.amount for bridge in table.bridges], [bridge.amount for bridge in other.bridges], rtol=1e-9
    )


@SETTINGS
@given(TABLES, WAYS, STAMPS, RULES)
def test_how_a_table_is_written_changes_no_total(
    rows: list[Row], way: Way, stamp: tuple[str, str], rule: dict[str, object]
) -> None:
    """Delimiter, decimal mark, encoding, line ends, quotes, stamps, clock and layout."""
    other = replace(way, stamp=stamp[0], order=stamp[1])
    hold_same(ticks([rows], PLAIN, rule), ticks([rows], other, rule))


@SETTINGS
@given(TABLES, st.integers(0, 60), RULES, st.booleans())
def test_splitting_a_file_changes_no_total(
    rows: list[Row], cut: int, rule: dict[str, object], later_first: bool
) -> None:
    """Two files in place of one, in either order of their names."""
    parts = [part for part in (rows[:cut], rows[cut:]) if part]
    hold_same(ticks([rows], PLAIN, rule), ticks(parts[::-1] if later_first else parts, PLAIN, rule))


@SETTINGS
@given(TABLES, st.integers(0, 2**32), st.integers(1, 3), RULES, st.booleans())
def test_the_order_of_rows_changes_no_total(
    rows: list[Row], seed: int, files: int, rule: dict[str, object], is_long: bool
) -> None:
    """Rows shuffled, and dealt out to up to three files: the clock is UTC and every stamp distinct."""
    shuffled = list(rows)
    random.Random(seed).shuffle(shuffled)
    parts = [part for part in (shuffled[place::files] for place in range(files)) if part]
    way = replace(PLAIN, long=is_long)
    hold_same(ticks([rows], way, rule), ticks(parts, way, rule))
