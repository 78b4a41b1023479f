"""Pairs of columns, one file per tag, footers and quality codes: other shapes of the same samples."""

from __future__ import annotations

import tempfile
from pathlib import Path

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from log_reading_factory import Reading, make_export, read

from auditor.records.errors import PlantFileError
from auditor.records.findings import FindingCode
from auditor.records.plant import FilePerTag, LongLayout, PairsLayout, Quality

PAIRS = PairsLayout()


def read_pairs(text: str | bytes, **changes: object) -> Reading:
    """Read one file of two pairs, ``A`` and ``B``."""
    with tempfile.TemporaryDirectory() as folder:
        return read(
            Path(folder), {"log.csv": text}, make_export({"a": "A", "b": "B"}, layout=PAIRS, **changes)
        )


def test_pairs_of_unequal_length() -> None:
    """Pairs of columns: each value belongs to the stamp at its left; a pair that has ended has no cells."""
    got = read_pairs(
        "Time;A;Time;B\n"
        "2026-07-01 00:00;1;2026-07-01 00:00;10\n"
        "2026-07-01 00:01;2;2026-07-01 00:15;20\n"
        "2026-07-01 00:02;Bad;;\n"
        "2026-07-01 00:03;4;;\n"
    )
    assert [(stamp[11:], values) for stamp, _, values in got.rows] == [
        ("00:00:00", (1.0, 10.0)),
        ("00:01:00", (2.0, None)),
        ("00:02:00", (None, None)),
        ("00:03:00", (4.0, None)),
        ("00:15:00", (None, 20.0)),
    ]
    assert got.rejects == [("a", "status word", 4, "Bad")]
    assert got.counts() == (5, 4, 1, 0)
    assert got.note.layout == "pairs"
    assert "cells of each pair of columns: A 4, B 2" in got.note.evidence


@pytest.mark.parametrize(
    ("line", "rejects", "counts"),
    [
        pytest.param(
            "x;5;2026-07-01 00:01;6", [("a", "bad stamp", 3, "x")], (3, 2, 1, 0), id="one bad stamp"
        ),
        pytest.param(
            ";5;y;6", [("a", "bad stamp", 3, ""), ("b", "bad stamp", 3, "y")], (3, 1, 1, 1), id="none"
        ),
        pytest.param("2026-07-01 00:01;;;", [("a", "empty", 3, "")], (3, 2, 1, 0), id="stamp without value"),
        pytest.param(";;;", [], (3, 1, 2, 0), id="blank line"),
        pytest.param("2026-07-01 00:01;7", [], (3, 2, 1, 0), id="line ends behind a pair"),
        pytest.param("2026-07-01 00:01;7;8", [], (3, 1, 1, 1), id="line ends inside a pair"),
        pytest.param("Time;A;Time;B", [], (3, 1, 2, 0), id="heading again"),
        pytest.param("rows: 44640;;;", [], (3, 1, 2, 0), id="footer"),
    ],
)
def test_lines_of_pairs(line: str, rejects: list[tuple[str, str, int, str]], counts: tuple[int, ...]) -> None:
    """Pairs of columns: a line is data, passed over or rejected; every cell is accounted for."""
    got = read_pairs(f"Time;A;Time;B\n2026-07-01 00:00;1;2026-07-01 00:00;2\n{line}\n")
    assert got.rejects == rejects
    assert got.counts() == counts


def test_pairs_between_other_columns() -> None:
    """Pairs of columns: a pair that no tag binds is counted, wherever it stands."""
    got = read_pairs("t;Z;t;B;t;A\n;;2026-07-01 00:00;2;2026-07-01 00:00;1\n2026-07-01 00:01;9;;;;\n")
    assert got.values == [(1.0, 2.0)]
    assert got.counts() == (3, 1, 2, 0)
    assert "Z" in got.note.unclaimed_cells


MINUTES = st.lists(st.integers(0, 2000), max_size=25)


@settings(suppress_health_check=list(HealthCheck), max_examples=30, deadline=None)
@given(MINUTES, MINUTES, st.sampled_from([300, 1 << 20]))
def test_pairs_equal_single_columns(first: list[int], second: list[int], size: int) -> None:
    """Pairs of columns: every sample of either pair is read once, however long and in whatever order."""

    def cell(minutes: list[int], row: int) -> str:
        if row >= len(minutes):
            return ";"
        return (
            f"2026-07-0{1 + minutes[row] // 1440} {minutes[row] // 60 % 24:02}:{minutes[row] % 60:02};{row}"
        )

    longest = max(len(first), len(second), 1)
    lines = [f"{cell(first, row)};{cell(second, row)}" for row in range(longest)]
    with pytest.MonkeyPatch.context() as patched:
        patched.setattr("auditor.log_reading.chunks.CHUNK", size)
        try:
            got = read_pairs("\n".join(["t;A;t;B", *lines, ""]))
        except PlantFileError:
            assert not first and not second
            return
    for place, minutes in enumerate((first, second)):
        samples = [values[place] for values in got.values if values[place] is not None]
        assert samples == [float(row) for row in np.argsort(minutes, kind="stable")]
        assert not any(block.rejected[place].any() for block in got.blocks)


def test_one_file_per_tag_by_name(tmp_path: Path) -> None:
    """One file per tag: the tag is named by the file; a file of another tag is set aside and told."""
    export = make_export(
        {"p": "PT-101", "t": "TT_7"},
        layout=FilePerTag("value", "trend_{tag}_*.csv", None),
        files=("**",),
    )
    files = {
        "trend_PT-101_07.csv": "time;value\n2026-07-01 00:00;1\n2026-07-01 00:01;2\n",
        "trend_PT-101_08.csv": "time;value\n2026-08-01 00:00;3\n",
        "july/trend_TT_7_07.csv": "time;value\n2026-07-01 00:00;20\n",
        "trend_XX_07.csv": "time;value\n2026-07-01 00:00;99\n",
    }
    got = read(tmp_path, files, export)
    assert got.values == [(None, 20.0), (1.0, None), (2.0, None), (3.0, None)]
    assert {note.layout for note in got.notes} == {"one file per tag"}
    assert any('it holds the tag "TT_7"' in line for note in got.notes for line in note.evidence)
    assert [file.reason for file in got.recognition.unopened] == [
        'it holds "XX", which no tag of the plant file binds'
    ]
    assert got.found() == [FindingCode.UNCLAIMED_COLUMN]


def test_one_file_per_tag_by_preamble(tmp_path: Path) -> None:
    """One file per tag: the tag is named by a line above the headings; its unit row is compared."""
    export = make_export(
        {"p": "PT-101", "t": "TT-7"}, units={"p": "kW"}, layout=FilePerTag("value", None, "Point: {tag}")
    )
    head = "Logger 4\n{};;\n\ntime;value\n;kW\n"
    got = read(
        tmp_path,
        {
            "1.csv": head.format("Point: PT-101") + "2026-07-01 00:00;1\n",
            "2.csv": head.format('"Point: TT-7"') + "2026-07-01 00:00;2\n",
            "3.csv": head.format("Other: TT-7") + "2026-07-01 00:00;3\n",
        },
        export,
    )
    assert got.values == [(1.0, None), (None, 2.0)]
    assert [note.lines_skipped for note in got.notes] == [5, 5]
    assert [file.reason for file in got.recognition.unopened] == [
        'nothing in it fits "Point: {tag}", which would name its tag'
    ]
    assert FindingCode.UNREADABLE_FILE in got.found()


def test_one_file_per_tag_without_its_file(tmp_path: Path) -> None:
    """One file per tag: a tag that no file names is a fault that shows the nearest name."""
    export = make_export({"p": "PT-102"}, layout=FilePerTag("value", "{tag}.csv", None))
    with pytest.raises(PlantFileError) as caught:
        read(tmp_path, {"PT-101.csv": "time;value\n2026-07-01 00:00;1\n"}, export)
    assert '"PT-102" is in none of the 1 files of export x; nearest: "PT-101"' in str(caught.value)


@pytest.mark.parametrize(
    "footer", ["end", "rows: 44640", "Total;12345", "Sum;3;", "*** end of report ***", "end\nrows: 2\n\n"]
)
def test_footers(tmp_path: Path, footer: str) -> None:
    """Footers and totals are shown, never read as data."""
    got = read(tmp_path, {"log.csv": f"t;a\n2026-07-01 00:00;1\n{footer}\n"}, make_export({"a": "a"}))
    assert got.values == [(1.0,)]
    assert got.note.lines_rejected == 0
    assert any(footer.splitlines()[0] in line for line in got.note.evidence)


def test_totals_that_look_dated_are_rejected(tmp_path: Path) -> None:
    """A totals row with a date in it is no footer for certain: it is rejected, with its text."""
    got = read(
        tmp_path,
        {"log.csv": "t;a\n2026-07-01 00:00;1\nTotal 2026-07;55\n2026-07-01 00:01;2\n"},
        make_export({"a": "a"}),
    )
    assert got.values == [(1.0,), (2.0,)]
    assert got.counts() == (4, 2, 1, 1)
    assert got.note.findings[0].words["first"] == "Total 2026-07"


def test_quality_codes(tmp_path: Path) -> None:
    """Quality codes: only declared good ones pass; every other is counted under its own code."""
    layout = LongLayout("when", "point", "reading", Quality("quality", ("192", "good")))
    text = (
        "when,point,quality,reading\n"
        "2026-07-01 00:00,A,192,1\n2026-07-01 00:01,A,0,2\n2026-07-01 00:02,A,good,3\n"
        "2026-07-01 00:03,A,,4\n2026-07-01 00:04,A,0,Bad\n2026-07-01 00:05,A, 192 ,6\n"
        "2026-07-01 00:06,Z,0,7\n"
    )
    got = read(tmp_path, {"log.csv": text}, make_export({"a": "A"}, layout=layout))
    assert got.values == [(1.0,), (None,), (3.0,), (None,), (None,), (6.0,)]
    assert got.rejects == [
        ("a", "status word", 3, "quality 0"),
        ("a", "status word", 5, "quality without a code"),
        ("a", "status word", 6, "Bad"),
    ]
    assert got.note.unclaimed_columns == ("Z",)
    assert got.counts() == (8, 7, 1, 0)


def test_quality_column_that_is_missing(tmp_path: Path) -> None:
    """A declared quality column that stands in no file is a fault."""
    layout = LongLayout("when", "point", "reading", Quality("state", ("192",)))
    with pytest.raises(PlantFileError, match=r"exports\.x\.layout\.quality\.column"):
        read(
            tmp_path,
            {"log.csv": "when,point,quality,reading\n2026-07-01 00:00,A,192,1\n"},
            make_export({"a": "A"}, layout=layout),
        )
