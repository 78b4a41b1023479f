"""No line is lost: every line of a file is data, skipped or rejected, whatever stands in it."""

from __future__ import annotations

from pathlib import Path

import pytest
from log_reading_factory import make_export, read

from auditor.records.findings import FindingCode

HEAD = "t;a;b\n"
ONE, TWO, THREE = "2026-07-01 00:00;1;2\n", "2026-07-01 00:01;3;4\n", "2026-07-01 00:02;5;6\n"
GOOD = [(1.0, 2.0), (3.0, 4.0), (5.0, 6.0)]
REJECTED, TORN = FindingCode.REJECTED_LINES, FindingCode.INCOMPLETE_LINE
Row = tuple[float | None, float | None]
CASES: dict[str, tuple[str, list[Row], tuple[int, int, int, int], list[FindingCode]]] = {
    # Content, rows that are read, (lines, data, skipped, rejected), findings.
    "plain": (HEAD + ONE + TWO + THREE, GOOD, (4, 3, 1, 0), []),
    "short line": (HEAD + ONE + "2026-07-01 00:01;3\n" + THREE, [GOOD[0], GOOD[2]], (4, 2, 1, 1), [REJECTED]),
    "glued lines": (HEAD + ONE + TWO.strip() + THREE + THREE, [GOOD[0], GOOD[2]], (4, 2, 1, 1), [REJECTED]),
    "blank and idle lines": (HEAD + ONE + "\n  \n;;\n" + TWO + "\n", GOOD[:2], (7, 2, 5, 0), []),
    "heading again": (HEAD + ONE + HEAD + TWO, GOOD[:2], (4, 2, 2, 0), []),
    "footer": (HEAD + ONE + TWO + "\nTotal;4;6\nrows: 2\n", GOOD[:2], (6, 2, 4, 0), []),
    "footer without end of line": (HEAD + ONE + TWO + "end", GOOD[:2], (4, 2, 2, 0), []),
    "impossible date": (
        HEAD + ONE + "2026-02-31 00:01;3;4\n" + THREE,
        [GOOD[0], GOOD[2]],
        (4, 2, 1, 1),
        [REJECTED],
    ),
    "lost battery": (
        HEAD + ONE + "1970-01-01 00:01;3;4\n" + THREE,
        [GOOD[0], GOOD[2]],
        (4, 2, 1, 1),
        [FindingCode.CLOCK_STEP],
    ),
    "separator at the end of data": (
        HEAD + ONE.replace("\n", ";\n") + TWO.replace("\n", ";\n"),
        GOOD[:2],
        (3, 2, 1, 0),
        [],
    ),
    "separator at the end of one line": (
        HEAD + ONE + TWO.replace("\n", ";\n") + THREE,
        GOOD,
        (4, 3, 1, 0),
        [],
    ),
    "separator missing on one line": (
        HEAD + "".join(line.replace("\n", ";\n") for line in (ONE, TWO)) + THREE,
        GOOD,
        (4, 3, 1, 0),
        [],
    ),
    "separator at the end of the heading": ("t;a;b;\n" + ONE + TWO, GOOD[:2], (3, 2, 1, 0), []),
    "more values than headings": ("t;a;b\n" + ONE.replace("\n", ";7\n"), [], (2, 0, 1, 1), [REJECTED]),
    "open quote": (
        HEAD + ONE + '2026-07-01 00:01;"3;4\n' + THREE,
        [GOOD[0], (3.0, 4.0), GOOD[2]],
        (4, 3, 1, 0),
        [],
    ),
    "quote in a cell": (
        HEAD + ONE + '2026-07-01 00:01;3";"4\n' + THREE,
        [GOOD[0], (3.0, 4.0), GOOD[2]],
        (4, 3, 1, 0),
        [],
    ),
    "quoted": (HEAD + ONE + '"2026-07-01 00:01";"3";"4"\n' + THREE, GOOD, (4, 3, 1, 0), []),
    "zeros in a line": (
        HEAD + ONE + "2026-07-01 00:01;3;\0\0\n\0\0\0\n" + THREE,
        [GOOD[0], (3.0, None), GOOD[2]],
        (5, 3, 1, 1),
        [REJECTED],
    ),
    "zeros at the end": (HEAD + ONE + TWO + "\0" * 300, GOOD[:2], (4, 2, 1, 1), [TORN]),
    "torn in the stamp": (HEAD + ONE + TWO + "2026-07-0", GOOD[:2], (4, 2, 1, 1), [TORN]),
    "torn in a value": (HEAD + ONE + TWO + "2026-07-01 00:02;5", GOOD[:2], (4, 2, 1, 1), [TORN]),
    "whole, but for its end of line": (HEAD + ONE + TWO + THREE.strip(), GOOD, (4, 3, 1, 0), []),
    "nothing but a heading": (HEAD, [], (1, 0, 1, 0), []),
    "another heading": (
        HEAD + ONE + "t;b;a\n" + TWO,
        GOOD[:1],
        (4, 1, 1, 2),
        [FindingCode.UNREADABLE_FILE, REJECTED],
    ),
}


@pytest.mark.parametrize("name", CASES)
def test_every_line_is_accounted_for(tmp_path: Path, name: str) -> None:
    """Odd lines are counted where they belong, and the others are read as if they were not there."""
    content, rows, counts, findings = CASES[name]
    got = read(tmp_path, {"log.csv": content}, make_export({"a": "a", "b": "b"}))
    assert got.values == rows
    assert got.counts() == counts
    assert got.found() == findings


def test_rejects_name_line_and_text(tmp_path: Path) -> None:
    """A bad stamp rejects every cell of its line, with the line and the stamp as it stands."""
    got = read(
        tmp_path, {"log.csv": HEAD + ONE + "2026-13-01 00:01;3;\n" + THREE}, make_export({"a": "a", "b": "b"})
    )
    assert got.rejects == [
        ("a", "bad stamp", 3, "2026-13-01 00:01"),
        ("b", "bad stamp", 3, "2026-13-01 00:01"),
    ]
    assert [line for _, line, _ in got.rows] == [2, 4]


def test_long_line_of_rubbish(tmp_path: Path) -> None:
    """A line longer than the parser's block is rejected like any other ragged line."""
    rubbish = "x" * 3_000_000 + "\n"
    got = read(tmp_path, {"log.csv": HEAD + ONE + rubbish + TWO}, make_export({"a": "a", "b": "b"}))
    assert got.values == GOOD[:2]
    assert got.counts() == (4, 2, 1, 1)


def test_many_chunks(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Lines keep their numbers across chunks, and words learnt in one chunk are found in the next."""
    monkeypatch.setattr("auditor.log_reading.chunks.CHUNK", 1 << 21)
    seconds = ((s, f"2026-07-01 {s // 3600:02}:{s // 60 % 60:02}:{s % 60:02}") for s in range(60_000))
    lines = [f"{stamp};{s};{'x' * 40}" for s, stamp in seconds]
    lines[20_000] = lines[20_000].replace(";20000;", ";Bad;")
    lines[50_000] = lines[50_000].replace(";50000;", ";Bad;")
    lines[30_000] = "2026-07-01 08:20:00;30000"
    got = read(tmp_path, {"log.csv": "t;a;note\n" + "\n".join(lines) + "\n"}, make_export({"a": "a"}))
    assert len(got.blocks) > 1
    assert got.rejects == [("a", "status word", 20_002, "Bad"), ("a", "status word", 50_002, "Bad")]
    assert got.counts() == (60_001, 59_999, 1, 1)
    assert all(values[0] in (None, line - 2) for _, line, values in got.rows)


def test_letters_of_another_encoding(tmp_path: Path) -> None:
    """A letter that the file's encoding does not know is kept as Windows-1252, and the note says so."""
    content = "t;Wärme;Kühler\n2026-07-01 00:00;1;2\n".encode() + b"2026-07-01 00:01;gest\xf6rt;3\n"
    got = read(tmp_path, {"log.csv": content}, make_export({"a": "Wärme"}))
    assert got.rejects == [("a", "status word", 3, "gestört")]
    assert "1 bytes that UTF-8 does not know were read as Windows-1252" in got.note.evidence
