"""Clocks, repeated and skipped hours, disorder, overlapping files, and the stretch that is asked for."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta
from pathlib import Path
from zoneinfo import ZoneInfo

import numpy as np
import pytest
from log_reading_factory import make_export, read

from auditor.log_reading.clocks import clock_of
from auditor.records.findings import FindingCode
from auditor.records.plant import LongLayout


def us(text: str) -> int:
    """Microseconds of an ISO stamp in UTC."""
    return int(datetime.fromisoformat(text).replace(tzinfo=UTC).timestamp()) * 1_000_000


def wall_clock(day: str, zone: str, step_min: int) -> list[str]:
    """Stamps that a logger with this clock writes over one local day, in order."""
    start = datetime.fromisoformat(day).replace(tzinfo=ZoneInfo(zone))
    end = (datetime.fromisoformat(day) + timedelta(days=1)).replace(tzinfo=ZoneInfo(zone))
    moment, out = start.astimezone(UTC), []
    while moment < end.astimezone(UTC):
        out.append(moment.astimezone(ZoneInfo(zone)).strftime("%Y-%m-%d %H:%M"))
        moment += timedelta(minutes=step_min)
    return out


def as_file(stamps: list[str]) -> str:
    """One column of numbers, the place of the line."""
    return "t;a\n" + "".join(f"{stamp};{place}\n" for place, stamp in enumerate(stamps))


@pytest.mark.parametrize("step_min", [1, 10, 15, 30, 60])
def test_autumn_day_has_25_hours(tmp_path: Path, step_min: int) -> None:
    """The repeated hour is told apart by the order of the lines (zone database: 2025-10-26, 01:00 UTC)."""
    stamps = wall_clock("2025-10-26", "Europe/Copenhagen", step_min)
    got = read(tmp_path, {"log.csv": as_file(stamps)}, make_export({"a": "a"}, clock="Europe/Copenhagen"))
    instants = np.concatenate([block.instants_us for block in got.blocks])
    assert instants.size == 25 * 60 // step_min
    assert (np.diff(instants) == step_min * 60_000_000).all()
    assert instants[0] == us("2025-10-25T22:00:00")
    assert got.found() == []
    assert got.note.backward_steps == 0


def test_spring_day_has_23_hours(tmp_path: Path) -> None:
    """The hour that spring skips is no gap (zone database: 2026-03-29, 01:00 UTC)."""
    stamps = wall_clock("2026-03-29", "Europe/Copenhagen", 1)
    got = read(tmp_path, {"log.csv": as_file(stamps)}, make_export({"a": "a"}, clock="Europe/Copenhagen"))
    instants = np.concatenate([block.instants_us for block in got.blocks])
    assert instants.size == 23 * 60
    assert (np.diff(instants) == 60_000_000).all()


def test_stamps_in_the_skipped_hour(tmp_path: Path) -> None:
    """A logger that writes into the skipped hour does not follow summer time: rejected, and told."""
    text = as_file(["2026-03-29 01:30", "2026-03-29 02:30", "2026-03-29 03:30"])
    got = read(tmp_path, {"log.csv": text}, make_export({"a": "a"}, clock="Europe/Copenhagen"))
    assert got.stamps == ["2026-03-29T00:30:00", "2026-03-29T01:30:00"]
    assert got.rejects == [("a", "bad stamp", 3, "2026-03-29 02:30")]
    assert got.found() == [FindingCode.CLOCK_OFFSET]


def test_repeated_hour_that_order_cannot_tell(tmp_path: Path) -> None:
    """With one pass only, nothing says which it is: the hour is dropped and counted."""
    stamps = list(dict.fromkeys(wall_clock("2025-10-26", "Europe/Copenhagen", 15)))
    got = read(tmp_path, {"log.csv": as_file(stamps)}, make_export({"a": "a"}, clock="Europe/Copenhagen"))
    assert got.rejected("a") == {"bad stamp": 4}
    assert got.counts() == (97, 92, 1, 4)
    finding = got.note.findings[0]
    assert finding.code is FindingCode.REPEATED_HOUR
    assert (finding.start_us, finding.numbers["count"]) == (us("2025-10-26T00:00:00"), 4)


def test_repeated_hour_dropped_by_declaration(tmp_path: Path) -> None:
    """Both passes are dropped where the plant file says so."""
    stamps = wall_clock("2025-10-26", "Europe/Copenhagen", 15)
    declared = make_export({"a": "a"}, clock="Europe/Copenhagen", repeated_hour="drop")
    got = read(tmp_path, {"log.csv": as_file(stamps)}, declared)
    assert got.rejected("a") == {"bad stamp": 8}


@pytest.mark.parametrize("by_tag", [False, True])
def test_repeated_hour_of_a_long_export(tmp_path: Path, by_tag: bool) -> None:
    """A long export is told apart tag by tag, whether its lines run by stamp or by tag."""
    stamps = wall_clock("2025-10-26", "Europe/Copenhagen", 15)
    pairs = [(stamp, tag) for stamp in stamps for tag in "AB"]
    pairs = sorted(pairs, key=lambda pair: pair[1]) if by_tag else pairs
    text = "t,p,v\n" + "".join(f"{stamp},{tag},1\n" for stamp, tag in pairs)
    declared = make_export({"a": "A", "b": "B"}, clock="Europe/Copenhagen", layout=LongLayout("t", "p", "v"))
    got = read(tmp_path, {"log.csv": text}, declared)
    for row in (0, 1):
        at = np.concatenate([block.instants_us[np.isfinite(block.values[row])] for block in got.blocks])
        assert at.size == 100
        assert (np.diff(at) == 900_000_000).all()
    assert got.found() == []


def test_repeated_hour_across_chunks(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """A chunk that ends within the repeated hour does not tear its passes apart."""
    stamps = wall_clock("2025-10-26", "Europe/Copenhagen", 1)
    monkeypatch.setattr("auditor.log_reading.chunks.CHUNK", 700)
    got = read(tmp_path, {"log.csv": as_file(stamps)}, make_export({"a": "a"}, clock="Europe/Copenhagen"))
    assert len(got.blocks) > 20
    instants = np.concatenate([block.instants_us for block in got.blocks])
    assert instants.size == 1500
    assert (np.diff(instants) == 60_000_000).all()
    assert [line for _, line, _ in got.rows] == list(range(2, 1502))


@pytest.mark.parametrize(
    ("clock", "instant"),
    [
        ("UTC", "2026-07-01T12:00:00"),
        ("+05:30", "2026-07-01T06:30:00"),
        ("America/New_York", "2026-07-01T16:00:00"),
    ],
)
def test_clocks(tmp_path: Path, clock: str, instant: str) -> None:
    """A stamp is read by the clock of its export."""
    got = read(tmp_path, {"log.csv": as_file(["2026-07-01 12:00"])}, make_export({"a": "a"}, clock=clock))
    assert got.stamps == [instant]


@pytest.mark.parametrize(
    "zone", ["Europe/Stockholm", "Australia/Lord_Howe", "America/St_Johns", "Africa/Casablanca"]
)
def test_conversion_against_the_zone_database(zone: str) -> None:
    """Wall readings of every hour of two years come back to their instants, also with odd offsets."""
    hours = np.arange(us("2025-01-01T00:00:00"), us("2027-01-01T00:00:00"), 1_800_000_000)
    offsets = np.array(
        [
            datetime.fromtimestamp(at / 1e6, ZoneInfo(zone)).utcoffset().total_seconds()
            for at in hours.tolist()
        ]
    )
    utc_us, second_us, skipped = clock_of(zone).to_utc(hours + (offsets * 1e6).astype(np.int64))
    assert not skipped.any()
    assert ((utc_us == hours) | (utc_us + second_us == hours)).all()
    assert (utc_us == hours)[second_us == 0].all()


def test_backward_step(tmp_path: Path) -> None:
    """Rows after a step back of the clock are put in order; the step is told with line and size.

    Rows come every 6 min: after 10:06 the clock should have shown 10:12, it showed 10:02.
    """
    stamps = ["2026-07-01 10:00", "2026-07-01 10:06", "2026-07-01 10:02", "2026-07-01 10:08"]
    got = read(tmp_path, {"log.csv": as_file(stamps)}, make_export({"a": "a"}))
    assert [line for _, line, _ in got.rows] == [2, 4, 3, 5]
    assert got.note.backward_steps == 1
    finding = got.note.findings[0]
    assert (finding.code, finding.line, finding.numbers["step_s"]) == (FindingCode.CLOCK_STEP, 4, -600.0)


def test_newest_first(tmp_path: Path) -> None:
    """A file from new to old is turned round, repeated hour included."""
    stamps = wall_clock("2025-10-26", "Europe/Copenhagen", 15)[::-1]
    got = read(tmp_path, {"log.csv": as_file(stamps)}, make_export({"a": "a"}, clock="Europe/Copenhagen"))
    instants = np.concatenate([block.instants_us for block in got.blocks])
    assert instants.size == 100
    assert (np.diff(instants) == 900_000_000).all()
    assert got.found() == []
    assert "its rows run from new to old" in got.note.evidence


def test_overlapping_files_are_merged(tmp_path: Path) -> None:
    """Where files overlap, their rows stand in order of time, of equal stamps the earlier pattern first."""
    minutes = [f"2026-07-01 {at // 60:02}:{at % 60:02}" for at in range(180)]
    files = {
        "month/all.csv": as_file(minutes),
        "day/2.csv": as_file(minutes[60:120]),
        "day/1.csv": as_file(minutes[:60]),
    }
    got = read(tmp_path, files, make_export({"a": "a"}, files=("month/*", "day/*")))
    at = [
        (block.instants_us[row], block.pattern[block.source[row]])
        for block in got.blocks
        for row in range(block.line.size)
    ]
    assert len(at) == 300
    assert at == sorted(at)
    assert [note.file for note in sorted(got.notes, key=lambda note: note.file)] == sorted(files)


def test_files_in_turn_are_handed_on_one_by_one(tmp_path: Path) -> None:
    """Files that follow each other come out as they are, whatever their names."""
    minutes = [f"2026-07-01 {at // 60:02}:{at % 60:02}" for at in range(120)]
    got = read(
        tmp_path, {"b.csv": as_file(minutes[:60]), "a.csv": as_file(minutes[60:])}, make_export({"a": "a"})
    )
    assert [block.files for block in got.blocks] == [("b.csv",), ("a.csv",)]


def test_only_the_stretch_that_is_asked_for(tmp_path: Path) -> None:
    """Rows outside are counted, files outside are not opened; each file still has its note."""
    files = {
        "a.csv": as_file(["2026-06-01 00:00", "2026-06-02 00:00"]),
        "b.csv": as_file(["2026-06-30 00:00", "2026-07-01 00:00", "2026-07-02 00:00"]),
    }
    window = (us("2026-07-01T00:00:00"), us("2026-07-02T00:00:00"))
    got = read(tmp_path, files, make_export({"a": "a"}), window)
    assert got.stamps == ["2026-07-01T00:00:00"]
    assert got.rejected("a") == {"outside period": 2}
    assert [(note.file, note.lines, note.lines_data) for note in got.notes] == [
        ("a.csv", 0, 0),
        ("b.csv", 4, 3),
    ]


def test_rows_that_come_too_late_in_a_large_file(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """In a large file a stray row that falls back by days is rejected and counted, not lost."""
    monkeypatch.setattr("auditor.log_reading.samples.WHOLE", 1 << 10)
    monkeypatch.setattr("auditor.log_reading.samples._HEAD", 1 << 10)
    monkeypatch.setattr("auditor.log_reading.samples._TAIL", 1 << 10)
    monkeypatch.setattr("auditor.log_reading.chunks.CHUNK", 1 << 13)
    stamps = [f"2026-07-{1 + at // 1440:02} {at // 60 % 24:02}:{at % 60:02}" for at in range(6 * 1440)]
    stamps[4000] = "2026-07-01 00:00"
    got = read(tmp_path, {"log.csv": as_file(stamps)}, make_export({"a": "a"}))
    assert len(got.rows) == len(stamps) - 1
    assert got.rejected("a") == {"bad stamp": 1}
    assert got.counts() == (len(stamps) + 1, len(stamps) - 1, 1, 1)
    assert FindingCode.CLOCK_STEP in got.found()
