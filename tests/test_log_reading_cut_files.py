"""Files that were sorted or shuffled, and files that are read in pieces."""

from __future__ import annotations

from pathlib import Path

import pytest
from log_reading_factory import make_export, read

from auditor.records.findings import FindingCode

HEAD = "time;a\n"
ROWS = [f"2026-07-01 00:{at:02};{at}\n" for at in range(20)]


def test_rows_above_the_heading_are_rejected_not_passed_over(tmp_path: Path) -> None:
    """In a file that was sorted as text the heading stands last: no row of data vanishes unseen."""
    content = "".join(["Logger 7\n", "2026-07-01;printed\n", *ROWS[:12], HEAD, *ROWS[12:]])
    got = read(tmp_path, {"log.csv": content}, make_export({"a": "a"}))
    assert got.values == [(float(at),) for at in range(12, 20)]
    assert got.counts() == (23, 8, 3, 12)
    (finding,) = got.note.findings
    assert (finding.code, finding.line) == (FindingCode.REJECTED_LINES, 3)
    assert finding.numbers["count"] == 12 and finding.words["first"] == ROWS[0].strip()


@pytest.mark.parametrize("size", [40, 100, 250, 1 << 20])
def test_a_long_preamble_is_passed_over_wherever_the_file_is_cut(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, size: int
) -> None:
    """The heading may stand in another piece of the file than its first line."""
    content = "".join([*(f"# remark {at};\n" for at in range(30)), HEAD, *ROWS])
    monkeypatch.setattr("auditor.log_reading.chunks.CHUNK", size)
    got = read(tmp_path, {"log.csv": content}, make_export({"a": "a"}))
    assert got.values == [(float(at),) for at in range(20)]
    assert got.counts() == (51, 20, 31, 0)


@pytest.mark.parametrize("size", [50, 100, 200, 1 << 20])
def test_of_equal_stamps_the_upper_line_comes_first_wherever_the_file_is_cut(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, size: int
) -> None:
    """A last stamp that stood at the top already: its first line keeps its precedence."""
    lines = ["2026-07-01 00:59;700\n" * 3, *ROWS, "2026-07-01 00:59;800\n"]
    monkeypatch.setattr("auditor.log_reading.chunks.CHUNK", size)
    got = read(tmp_path, {"log.csv": HEAD + "".join(lines)}, make_export({"a": "a"}))
    assert [(line, value) for _, line, (value,) in got.rows[-4:]] == [
        (2, 700.0), (3, 700.0), (4, 700.0), (25, 800.0)
    ]  # fmt: skip
