"""A tag whose column goes by several headings is one signal, bound by name, with every cell accounted for."""

from __future__ import annotations

from dataclasses import replace
from datetime import UTC, datetime
from pathlib import Path

import pytest
from log_reading_factory import Reading, make_export, read

from auditor.records.errors import PlantFileError
from auditor.records.findings import Finding, FindingCode
from auditor.records.plant import Export, Heading, LongLayout, Tag, TagChange


def declared(*headings: Heading | str, **changes: object) -> tuple[Export, dict[str, Tag]]:
    """One pressure under several headings, and a flow beside it."""
    names = tuple(Heading(each) if isinstance(each, str) else each for each in headings)
    export, tags = make_export({"p": names[0].name, "f": "F"}, **changes)
    return export, tags | {"p": replace(tags["p"], headings=names)}


def at(minute: int) -> int:
    """Instant of a minute of the test's hour [us]."""
    return round(datetime(2026, 7, 10, 8, minute, tzinfo=UTC).timestamp() * 1e6)


def joins(reading: Reading) -> list[Finding]:
    """Findings of a change of headings."""
    found = [finding for note in reading.notes for finding in note.findings]
    return [finding for finding in found if finding.code is FindingCode.RENAMED_COLUMN]


def lines(heading: str, *rows: str) -> str:
    """One export; stamps are minutes of one hour."""
    return "\n".join([heading, *(f"2026-07-10 08:{row}" for row in rows)]) + "\n"


def test_each_file_has_its_heading_in_its_own_place(tmp_path: Path) -> None:
    """Renamed and moved to another column from one file to the next: one signal; the step is reported."""
    files = {
        "a.csv": lines("t,PT101,F", "00,1.0,5", "01,1.1,6"),
        "b.csv": lines("t,F,PT-101A", "02,7,1.5", "03,8,1.6"),
    }
    got = read(tmp_path, files, declared("PT101", "PT-101A"))
    assert got.values == [(1.0, 5.0), (1.1, 6.0), (1.5, 7.0), (1.6, 8.0)]
    (join,) = joins(got)
    assert join.words == {"old": "PT101", "new": "PT-101A"}
    assert (join.tag, join.start_us, join.end_us) == ("p", at(1), at(2))
    assert join.numbers == pytest.approx({"before": 1.1, "after": 1.5, "gap_s": 60.0})
    assert got.found() == [FindingCode.RENAMED_COLUMN]


@pytest.mark.parametrize("order", [("PT101", "PT-101A"), ("PT-101A", "PT101")])
def test_both_headings_in_one_file_are_compared_row_by_row(tmp_path: Path, order: tuple[str, str]) -> None:
    """Where both hold a number for a stamp, the first written stands first and the other behind it."""
    text = lines("t,PT101,PT-101A,F", "00,1.0,,5", "01,1.1,1.1,6", "02,1.2,1.3,7", "03,,1.4,8")
    got = read(tmp_path, {"a.csv": text}, declared(*order))
    last = (1.2, 1.3) if order[0] == "PT101" else (1.3, 1.2)
    assert got.values == [
        (1.0, 5.0), (1.1, 6.0), (1.1, None), (last[0], 7.0), (last[1], None), (1.4, 8.0),
    ]  # fmt: skip
    assert [line for _, line, _ in got.rows] == [2, 3, 3, 4, 4, 5]
    assert got.rejected("p") == {"empty": 2}  # 6 numbers and 2 empty cells are the 8 cells of two columns
    assert not joins(got)  # they overlap


def test_dates_decide_which_heading_is_the_tags(tmp_path: Path) -> None:
    """Outside its dates a heading is bound to nothing: its cells are those of an unclaimed column."""
    text = lines("t,PT101,PT-101A,F", "00,1.0,9.9,5", "01,1.1,9.9,6", "02,8.8,1.3,7", "03,Fault,1.4,8")
    names = (Heading("PT101", until_us=at(2)), Heading("PT-101A", from_us=at(2)))
    got = read(tmp_path, {"a.csv": text}, declared(*names))
    assert got.values == [(1.0, 5.0), (1.1, 6.0), (1.3, 7.0), (1.4, 8.0)]
    assert got.rejected("p") == {} and got.rejects == []
    assert got.note.unclaimed_cells == {"PT101": 2, "PT-101A": 2}
    (join,) = joins(got)
    assert join.numbers == pytest.approx({"before": 1.1, "after": 1.3, "gap_s": 60.0})


def test_a_new_unit_at_the_join_is_no_step(tmp_path: Path) -> None:
    """The size of the step is in SI, each side by what the tag was then."""
    export, tags = declared("T1", "T1K")
    celsius = replace(tags["p"], offset=273.15)
    kelvin = replace(celsius, offset=0.0, headings=())
    tags["p"] = replace(celsius, changes=(TagChange(at(2), "then", kelvin, False),))
    files = {"a.csv": lines("t,T1,F", "01,20.0,6"), "b.csv": lines("t,T1K,F", "02,293.15,7")}
    (join,) = joins(read(tmp_path, files, (export, tags)))
    assert join.numbers["before"] == pytest.approx(293.15) == join.numbers["after"]


def test_names_in_the_tag_column_of_a_long_export(tmp_path: Path) -> None:
    """A point that was renamed in a long export goes on as the same tag."""
    layout = LongLayout("t", "point", "value")
    text = lines("t,point,value", "00,PT101,1.0", "00,F,5", "01,PT-101A,1.1", "01,F,6")
    got = read(tmp_path, {"a.csv": text}, declared("PT101", "PT-101A", layout=layout))
    assert got.values == [(1.0, 5.0), (1.1, 6.0)]
    assert len(joins(got)) == 1


def test_one_heading_found_is_enough_none_is_a_fault(tmp_path: Path) -> None:
    """An old heading may have left the folder; a tag without any of its headings is told by its first."""
    text = lines("t,PT-101A,F", "00,1.0,5")
    assert read(tmp_path / "one", {"a.csv": text}, declared("PT101", "PT-101A")).values == [(1.0, 5.0)]
    with pytest.raises(PlantFileError) as caught:
        read(tmp_path / "none", {"a.csv": text}, declared("PT102", "PT103"))
    (fault,) = caught.value.faults
    assert '"PT102" is in none' in fault.found


def test_a_heading_that_is_doubled_is_refused_with_both_places(tmp_path: Path) -> None:
    """Also where it is the second name of a tag, and only in a file in the middle of the set."""
    files = {
        "a.csv": lines("t,PT101,F", "00,1.0,5"),
        "b.csv": lines("t,PT-101A,F,PT-101A", "01,1.0,5,2.0"),
        "c.csv": lines("t,F,PT-101A", "02,5,1.0"),
    }
    with pytest.raises(PlantFileError) as caught:
        read(tmp_path, files, declared("PT101", "PT-101A"))
    (fault,) = caught.value.faults
    assert fault.where == "logs/b.csv:1"
    assert '"PT-101A" stands in columns 2 and 4' in fault.found
