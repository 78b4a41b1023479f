"""Recognition: what is held against the plant file, what is told, and what stands in its way."""

from __future__ import annotations

import gzip
import hashlib
import io
import zipfile
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest
from log_reading_factory import make_export, make_tag, read

from auditor.log_reading import hash_files, recognise, recognition_notes
from auditor.records.errors import PlantFileError
from auditor.records.findings import FindingCode

GOOD = "t;a;b\n2026-07-01 00:00;1,5;2\n2026-07-13 00:00;3;4\n"


def faults_of(folder: Path, files: dict[str, str], columns: dict[str, str], **changes: Any) -> list[str]:
    """Read, and return the faults as the user sees them."""
    with pytest.raises(PlantFileError) as caught:
        read(folder, files, make_export(columns, **changes))
    return [str(fault) for fault in caught.value.faults]


def test_misspelt_headings_are_shown_with_the_nearest(tmp_path: Path) -> None:
    """A heading that is in none of the files is a fault, never adopted; all are told at once."""
    text = "t;Power net;Power gross\n2026-07-01 00:00;1;2\n"
    faults = faults_of(tmp_path, {"a.csv": text}, {"p": "Power nett", "q": "Power gross", "r": "Frost"})
    assert len(faults) == 2
    assert 'exports.x.tags.p.column: "Power nett" is in none of the 1 files' in faults[0]
    assert 'nearest: "Power net"' in faults[0]
    assert '"Frost"' in faults[1]


def test_no_heading_at_all(tmp_path: Path) -> None:
    """The nearest heading is shown even where no heading is right."""
    (fault,) = faults_of(tmp_path, {"a.csv": "t;Power net\n2026-07-01 00:00;1\n"}, {"p": "Power nett"})
    assert 'nearest: "Power net"' in fault


def test_heading_in_one_of_many_files_is_enough(tmp_path: Path) -> None:
    """Columns may come and go from file to file; the note says which are missing."""
    files = {"1.csv": "t;a\n2026-07-01 00:00;1\n", "2.csv": "b;t;a\n5;2026-07-02 00:00;2\n"}
    got = read(tmp_path, files, make_export({"a": "a", "b": "b"}, stamp_columns=("t",)))
    assert got.values == [(1.0, None), (2.0, 5.0)]
    assert got.rejected("b") == {}
    assert "it has no column for b" in got.notes[0].evidence


def test_bound_heading_twice(tmp_path: Path) -> None:
    """A bound heading that stands twice is refused with both places; another one may."""
    (fault,) = faults_of(tmp_path, {"a.csv": "t;a;z;z;a\n2026-07-01 00:00;1;2;3;4\n"}, {"a": "a"})
    assert 'the heading "a" stands in columns 2 and 5' in fault


@pytest.mark.parametrize(
    ("found", "declared", "is_fault"),
    [
        ("MW", "kW", True),
        ("[kW]", "kW", False),
        ("°F", "degC", True),
        ("°C", "degC", False),
        ("Nm3/h", "m3/h", False),
    ],
)
def test_unit_row_is_held_against_the_plant_file(
    tmp_path: Path, found: str, declared: str, is_fault: bool
) -> None:
    """A unit row that differs is a fault that names file, line, tag and both units."""
    text = f"t;a\n;{found}\n2026-07-01 00:00;1\n"
    if not is_fault:
        got = read(tmp_path, {"a.csv": text}, make_export({"a": "a"}, units={"a": declared}))
        assert got.note.unit_line == 2
        return
    (fault,) = faults_of(tmp_path, {"a.csv": text}, {"a": "a"}, units={"a": declared})
    assert fault.startswith("logs/a.csv:2, column a: ")
    assert f'the unit row says "{found}", the plant file says "{declared}" for tag a' in fault


@pytest.mark.parametrize(("pressure", "is_fault"), [("gauge", False), ("absolute", True)])
def test_gauge_in_the_unit_row(tmp_path: Path, pressure: str, is_fault: bool) -> None:
    """A unit row that says gauge agrees with a tag declared so, and only with that."""
    (tmp_path / "a.csv").write_text("t;p\n;bar(g)\n2026-07-01 00:00;1\n")
    export, tags = make_export({"p": "p"}, units={"p": "bar"})
    tags = {"p": replace(tags["p"], pressure=pressure)}
    if is_fault:
        with pytest.raises(PlantFileError, match="bar"):
            recognise(tmp_path, {"x": export}, tags)
    else:
        assert recognise(tmp_path, {"x": export}, tags).files["x"][0].dialect.unit_line == 2


def test_decimal_mark_contradicted(tmp_path: Path) -> None:
    """Numbers that only the other decimal mark reads are a fault, with line, text and key."""
    (fault,) = faults_of(tmp_path, {"a.csv": GOOD}, {"a": "a"}, decimal=".")
    assert fault.startswith("logs/a.csv:2, column a: ")
    assert '"1,5"' in fault
    assert 'set exports.x.decimal = ","' in fault


def test_date_order_contradicted(tmp_path: Path) -> None:
    """Stamps that only another order reads are a fault; a stamp that proves the declared one clears it."""
    stamps = ["01/07/2026 00:00", "12/07/2026 00:00", "13/07/2026 00:00"]
    text = "t;a\n" + "".join(f"{stamp};1\n" for stamp in stamps)
    (fault,) = faults_of(tmp_path, {"a.csv": text}, {"a": "a"}, date_order="month first")
    assert fault.startswith("logs/a.csv:4, column t: ")
    assert 'set exports.x.date_order = "day first"' in fault
    got = read(
        tmp_path, {"b.csv": "t;a\n07/14/2026 00:00;1\n"}, make_export({"a": "a"}, date_order="month first")
    )
    assert got.rejected("a") == {"bad stamp": 1}


def test_stamps_that_nothing_reads(tmp_path: Path) -> None:
    """An export without any readable stamp is a fault that shows the first one."""
    (fault,) = faults_of(
        tmp_path, {"a.csv": "t;a\n7/1/2026 at three;1\n"}, {"a": "a"}, date_order="month first"
    )
    assert 'the first is "7/1/2026 at three"' in fault


def test_file_claimed_twice(tmp_path: Path) -> None:
    """A file belongs to one export."""
    (tmp_path / "a.csv").write_text("t;a\n2026-07-01 00:00;1\n")
    export, tags = make_export({"a": "a"})
    other = replace(export, name="y", tags=("c",))
    with pytest.raises(PlantFileError, match=r"exports.x.files and exports.y.files: both claim logs/a.csv"):
        recognise(
            tmp_path,
            {"x": export, "y": other},
            tags | {"c": replace(make_tag("c", "a", "", None), export="y")},
        )


@pytest.mark.parametrize(
    ("pattern", "path", "is_claimed"),
    [
        ("gas/*.csv", "gas/a.csv", True),
        ("gas/*.csv", "gas/in/a.csv", False),
        ("gas/**/*.csv", "gas/in/deep/a.csv", True),
        ("gas/**/*.csv", "gas/a.csv", True),
        ("**", "gas/in/a.csv", True),
        ("gas/2026-0[67]?.csv", "gas/2026-07a.csv", True),
        ("gas/[!b]*.csv", "gas/b.csv", False),
        ("gas/(1)+.csv", "gas/(1)+.csv", True),
    ],
)
def test_patterns(tmp_path: Path, pattern: str, path: str, is_claimed: bool) -> None:
    """A pattern is matched folder by folder; two stars cross folders."""
    got = read(tmp_path, {path: "t;a\n2026-07-01 00:00;1\n"}, make_export({"a": "a"}, files=(pattern,)))
    assert bool(got.blocks) is is_claimed


def test_what_nobody_claims_is_told(tmp_path: Path) -> None:
    """Unclaimed files and columns, passed-over files and missing exports are told, and all have notes."""
    files = {
        "x/a.csv": "t;a;extra;<b>\n2026-07-01 00:00;1;2;3\n",
        "x/.a.csv": "x",
        "x/~$a.csv": "x",
        "x/b.tmp": "x",
    }
    files |= {"x/empty.csv": "", "notes.txt": "hello"} | {f"old/{place}.csv": "x" for place in range(9)}
    got = read(tmp_path, files, make_export({"a": "a"}, files=("x/*",)))
    assert sorted(got.found()) == [
        FindingCode.UNCLAIMED_COLUMN,
        FindingCode.UNCLAIMED_FILE,
        FindingCode.UNCLAIMED_FILE,
        FindingCode.UNREADABLE_FILE,
        FindingCode.UNREADABLE_FILE,
    ]
    by_code = {code: [one for one in got.recognition.findings if one.code is code] for code in FindingCode}
    (columns,), (notes_txt, old) = by_code[FindingCode.UNCLAIMED_COLUMN], by_code[FindingCode.UNCLAIMED_FILE]
    waiting = {one.file: one.words["reason"] for one in by_code[FindingCode.UNREADABLE_FILE]}
    assert waiting == {"x/b.tmp": "unfinished copy", "x/empty.csv": "empty file"}
    assert columns.words["columns"] == "extra, <b>"
    assert (notes_txt.file, old.file, old.numbers["count"]) == ("notes.txt", "old/", 9)
    notes = [*got.notes, *recognition_notes(got.recognition)]
    assert sorted(note.file for note in notes) == sorted(files)
    said = {note.file: note.evidence[0] for note in notes}
    assert said["x/.a.csv"] == "passed over: hidden file"
    assert "empty file" in said["x/empty.csv"]
    assert said["notes.txt"] == "no export of the plant file claims it"


def test_export_without_files(tmp_path: Path) -> None:
    """An export without any file is missing, not a fault."""
    got = read(tmp_path, {}, make_export({"a": "a"}))
    assert (got.found(), got.blocks) == ([FindingCode.MISSING_EXPORT], [])


def encrypted() -> bytes:
    """Build an archive that says that its member is encrypted (bit 0 of the flags of its headers)."""
    packed = io.BytesIO()
    with zipfile.ZipFile(packed, "w") as archive:
        archive.writestr("a.csv", GOOD)
    content = bytearray(packed.getvalue())
    content[content.index(b"PK\x03\x04") + 6] |= 1
    content[content.index(b"PK\x01\x02") + 8] |= 1
    return bytes(content)


def test_noise_among_the_exports(tmp_path: Path) -> None:
    """Noise, damaged archives and encrypted ones are told; the rest is read."""
    noise = bytes((place * 7919) % 256 for place in range(5000))
    packed = gzip.compress(GOOD.replace(",", ".").encode() * 2000)
    files = {"a.csv": GOOD.replace(",", "."), "b.csv": noise, "c.csv.gz": b"\x1f\x8b" + noise, "d.zip": noise}
    files["f.zip"] = encrypted()
    got = read(tmp_path, {**files, "e.csv.gz": packed[: len(packed) // 2]}, make_export({"a": "a"}))
    assert got.values == [(1.5,), (3.0,)]
    unreadable = [
        finding.file for finding in got.recognition.findings if finding.code is FindingCode.UNREADABLE_FILE
    ]
    assert sorted(map(str, unreadable)) == ["b.csv", "c.csv.gz", "d.zip", "e.csv.gz", "f.zip!a.csv"]
    notes = [*got.notes, *recognition_notes(got.recognition)]
    assert sorted(note.file for note in notes) == [
        "a.csv",
        "b.csv",
        "c.csv.gz",
        "d.zip",
        "e.csv.gz",
        "f.zip!a.csv",
    ]


def test_file_that_vanishes_before_it_is_read(tmp_path: Path) -> None:
    """A file that cannot be opened any more is told, and has its note."""
    (tmp_path / "a.csv").write_text("t;a\n2026-07-01 00:00;1\n")
    export, tags = make_export({"a": "a"})
    recognition = recognise(tmp_path, {"x": export}, tags)
    (tmp_path / "a.csv").unlink()
    from auditor.log_reading import read_export

    (note,) = read_export(recognition, "x", (0, 2**60))
    assert [finding.code for finding in note.findings] == [FindingCode.UNREADABLE_FILE]
    assert note.lines == 0


def test_digests(tmp_path: Path) -> None:
    """Digests are of the bytes as stored; of a member, of its archive."""
    packed = io.BytesIO()
    with zipfile.ZipFile(packed, "w") as archive:
        archive.writestr("a.csv", "t;a\n2026-07-01 00:00;1\n")
    plain = "t;a\n2026-07-02 00:00;1\n"
    got = read(tmp_path, {"b.zip": packed.getvalue(), "c.csv": plain}, make_export({"a": "a"}))
    expected = {
        "b.zip": hashlib.sha256(packed.getvalue()).hexdigest(),
        "c.csv": hashlib.sha256(plain.encode()).hexdigest(),
    }
    assert {note.file.partition("!")[0]: note.sha256 for note in got.notes} == expected
    assert hash_files(tmp_path) == expected
