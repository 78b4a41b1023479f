"""Every shape of export gives the same samples: delimiter, decimal mark, encoding, layout, stamps."""

from __future__ import annotations

import gzip
import io
import itertools
import zipfile
from datetime import UTC, datetime, timedelta
from pathlib import Path

import pytest
from log_reading_factory import make_export, read

from auditor.records.plant import LongLayout

START = datetime(2026, 7, 13, 23, 58, tzinfo=UTC)
TABLE = [(START + timedelta(minutes=place), 20.5 + place, -0.25 * place) for place in range(5)]
STAMPS = {
    "year first": [
        "%Y-%m-%d %H:%M:%S",
        "%Y-%m-%dT%H:%M:%SZ",
        "%Y/%m/%d %H:%M",
        "%Y%m%d%H%M%S",
        "%y-%m-%d %H:%M",
    ],
    "day first": ["%d.%m.%Y %H:%M:%S", "%d/%m/%Y %H:%M", "%d-%m-%y %H:%M", "%d.%m.%Y, %H:%M:%S"],
    "month first": ["%m/%d/%Y %H:%M:%S", "%m-%d-%y %H:%M"],
}


def lines_of(delimiter: str, decimal: str, stamp: str, layout: str) -> list[str]:
    """Write the table; headings hold a letter beyond ASCII."""

    def number(value: float) -> str:
        return str(value).replace(".", decimal)

    rows = [(moment.strftime(stamp), number(a), number(b)) for moment, a, b in TABLE]
    if layout == "wide":
        return [delimiter.join(row) for row in [("time", "Kühler ein", "Kühler aus"), *rows]]
    pairs = [(at, name, cell) for at, a, b in rows for name, cell in (("Kühler ein", a), ("Kühler aus", b))]
    return [delimiter.join(row) for row in [("time", "point", "reading"), *pairs]]


def expected() -> list[tuple[str, tuple[float, float]]]:
    """The table as reading must give it."""
    return [(moment.strftime("%Y-%m-%dT%H:%M:%S"), (a, b)) for moment, a, b in TABLE]


@pytest.mark.parametrize(
    ("delimiter", "decimal", "encoding", "layout"),
    [
        case
        for case in itertools.product(
            ",;\t", ".,", ["utf-8", "utf-8-sig", "utf-16", "utf-16-be", "cp1252"], ["wide", "long"]
        )
        if case[:2] != (",", ",")
    ],
)
def test_same_samples_from_every_shape(
    tmp_path: Path, delimiter: str, decimal: str, encoding: str, layout: str
) -> None:
    """Delimiter, decimal mark, encoding and layout never change a sample."""
    text = "\r\n".join(lines_of(delimiter, decimal, "%Y-%m-%d %H:%M:%S", layout)) + "\r\n"
    columns = {"a": "Kühler ein", "b": "Kühler aus"}
    long = LongLayout("time", "point", "reading") if layout == "long" else None
    got = read(
        tmp_path, {"log.csv": text.encode(encoding)}, make_export(columns, decimal=decimal, layout=long)
    )
    assert [(stamp, values) for stamp, _, values in got.rows] == expected()
    assert got.note.delimiter == delimiter
    assert got.note.layout == layout
    assert got.counts()[2:] == (1, 0)


@pytest.mark.parametrize(("order", "stamp"), [(order, stamp) for order in STAMPS for stamp in STAMPS[order]])
def test_same_samples_from_every_stamp(tmp_path: Path, order: str, stamp: str) -> None:
    """However a stamp is written in its declared order, it means the same instant."""
    text = "\n".join(lines_of(";", ".", stamp, "wide")) + "\n"
    got = read(
        tmp_path, {"log.csv": text}, make_export({"a": "Kühler ein", "b": "Kühler aus"}, date_order=order)
    )
    assert [(stamp, values) for stamp, _, values in got.rows] == expected()


@pytest.mark.parametrize(("order", "scale"), [("epoch seconds", 1), ("epoch milliseconds", 1000)])
def test_epoch_stamps(tmp_path: Path, order: str, scale: int) -> None:
    """Seconds or milliseconds since 1970-01-01 UTC (POSIX) are instants whatever the clock."""
    rows = [f"{int(moment.timestamp()) * scale};{a}" for moment, a, _ in TABLE]
    got = read(
        tmp_path,
        {"log.csv": "\n".join(["t;a", *rows])},
        make_export({"a": "a"}, date_order=order, clock="+03:00"),
    )
    assert got.stamps == [stamp for stamp, _ in expected()]


def test_stamp_details(tmp_path: Path) -> None:
    """Fractions, an offset in the text, unpadded digits, blanks around and 24:00 (ISO 8601) are read."""
    text = (
        "t,a\n2026-07-01 00:00:00.5,1\n2026-07-01T02:00:01+02:00,2\n 2026-7-1 0:00:02 ,3\n"
        "2026-07-01T00:00:03,4\n2026-07-01 24:00,5\n"
    )
    got = read(tmp_path, {"log.csv": text}, make_export({"a": "a"}))
    assert got.stamps == [
        *("2026-07-01T00:00:00.50", "2026-07-01T00:00:01", "2026-07-01T00:00:02", "2026-07-01T00:00:03"),
        "2026-07-02T00:00:00",
    ]


def test_date_and_time_in_two_columns(tmp_path: Path) -> None:
    """A stamp may stand in two columns, and not in the first ones."""
    text = "no;day;clock;a\n1;01.07.2026;10:30:00;1\n2;01.07.2026;24:00:00;2\n"
    declared = make_export({"a": "a"}, date_order="day first", stamp_columns=("day", "clock"), clock="+01:00")
    got = read(tmp_path, {"log.csv": text}, declared)
    assert got.stamps == ["2026-07-01T09:30:00", "2026-07-01T23:00:00"]
    assert got.note.unclaimed_cells == {"no": 2}


def test_preamble_unit_row_and_odd_headings(tmp_path: Path) -> None:
    """The heading row is found below a preamble; headings are compared after trimming and composing."""
    preamble, headings = "Logger 7; serial 12\n\nbegin;2026-07-01\n", ' stamp ;"P\u00a0net";Ku\u0308hler\n'
    text = preamble + headings + ";[kW];(°C)\n2026-07-01 00:00;5;6\n"
    declared = make_export({"p": "P net", "t": "Kühler"}, units={"p": "kW", "t": "degC"})
    got = read(tmp_path, {"log.csv": text}, declared)
    assert got.values == [(5.0, 6.0)]
    assert (got.note.heading_line, got.note.unit_line) == (4, 5)
    assert got.counts() == (6, 1, 5, 0)
    assert "units of 2 columns agree with the plant file (line 5)" in got.note.evidence


def test_archives(tmp_path: Path) -> None:
    """Members of an archive and packed files are read, each with its own note and line numbers."""
    packed = io.BytesIO()
    with zipfile.ZipFile(packed, "w") as archive:
        archive.writestr("in/b.csv", "t,a\n2026-07-01 00:02,3\n")
        archive.writestr("a.csv", "t,a\n2026-07-01 00:01,2\n")
        archive.writestr("__MACOSX/._a.csv", b"\0\1")
    got = read(
        tmp_path,
        {"gas/july.zip": packed.getvalue(), "gas/june.csv.gz": gzip.compress(b"t,a\n2026-07-01 00:00,1\n")},
        make_export({"a": "a"}, files=("gas/*.zip", "gas/*.gz")),
    )
    assert got.values == [(1.0,), (2.0,), (3.0,)]
    assert [note.file for note in got.notes] == [
        "gas/june.csv.gz",
        "gas/july.zip!a.csv",
        "gas/july.zip!in/b.csv",
    ]
    assert [name for name, _, _ in got.recognition.ranges()] == ["gas/july.zip", "gas/june.csv.gz"]


@pytest.mark.parametrize("end", ["\n", "\r\n", "\r"])
def test_line_ends(tmp_path: Path, end: str) -> None:
    """Line feed, carriage return or both end a line; numbers of lines are the same."""
    text = end.join(["t,a", "2026-07-01 00:00,1", "", "2026-07-01 00:01,2", ""])
    got = read(tmp_path, {"log.csv": text}, make_export({"a": "a"}))
    assert [(line, values) for _, line, values in got.rows] == [(2, (1.0,)), (4, (2.0,))]
    assert got.counts() == (4, 2, 2, 0)


def test_mixed_line_ends(tmp_path: Path) -> None:
    """Line ends may change within a file."""
    got = read(
        tmp_path, {"log.csv": b"t,a\r\n2026-07-01 00:00,1\r2026-07-01 00:01,2\n"}, make_export({"a": "a"})
    )
    assert got.values == [(1.0,), (2.0,)]


def test_long_layout_rows(tmp_path: Path) -> None:
    """Neighbouring lines of a stamp share a row; a tag that comes twice opens another; others are counted."""
    text = (
        "when,point,reading,quality\n"
        "2026-07-01 00:00,A,1,192\n2026-07-01 00:00,B,2,192\n"
        "2026-07-01 00:00,A,3,192\n2026-07-01 00:00,Z,9,192\n"
        "2026-07-01 00:01,B,off,192\n2026-07-01 00:01,A,,192\n"
    )
    declared = make_export({"a": "A", "b": "B"}, layout=LongLayout("when", "point", "reading"))
    got = read(tmp_path, {"log.csv": text}, declared)
    assert [(line, values) for _, line, values in got.rows] == [
        (2, (1.0, 2.0)), (4, (3.0, None)), (6, (None, None))
    ]  # fmt: skip
    assert got.rejects == [("b", "status word", 6, "off"), ("a", "empty", 7, "")]
    assert got.note.unclaimed_cells == {"quality": 6, "Z": 1}
    assert got.counts() == (7, 6, 1, 0)
