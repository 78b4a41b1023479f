"""A tag list in a CSV file says the same as the plant file, with the same checks and its own lines."""

from __future__ import annotations

import dataclasses
import re
from pathlib import Path

import numpy as np
import pytest
from site_factory import (
    GAS_ENGINE,
    audited,
    changed,
    digests,
    export,
    figures,
    instants,
    run,
    site,
    statement,
)

from auditor.plant_file import read_plant
from auditor.plant_file.schema import plant_schema
from auditor.records.errors import Exit, Fault, PlantFileError
from auditor.records.plant import Plant, Tag

WITHOUT = re.sub(r"^tags\..*\n", "", GAS_ENGINE, flags=re.MULTILINE)
PLANT = changed(WITHOUT, ("[fluids.brine]", 'tag_list = "tags.csv"\n\n[fluids.brine]'))
HEAD = "name,column,unit,between,hold,low,high,standard"
ROWS = (
    "gas,G,m3/h,step,1 min,,,1 %",
    "power,P,kW,step,1 min,,,0.5 %",
    "flow,F,kg/s,step,1 min,,,1 %",
    "supply,S,degC,step,1 min,0,130,0.1 K",
    "back,R,degC,step,1 min,0,130,0.1 K",
)
LIST = "\n".join((HEAD, *ROWS)) + "\n"
DAY = {
    "plant/a.csv": export(
        instants("2025-06-03", "2025-06-04"), {"G": 250.0, "P": 1000.0, "F": 16.25, "S": 90.0, "R": 70.0}
    )
}


def plant(folder: Path, tags: str | bytes, text: str = PLANT) -> Plant:
    """The small works with a tag list."""
    (folder / "plant.toml").write_text(text, encoding="utf-8")
    (folder / "tags.csv").write_bytes(tags if isinstance(tags, bytes) else tags.encode())
    return read_plant(folder)


def faults(folder: Path, tags: str | bytes, text: str = PLANT) -> tuple[Fault, ...]:
    """The faults of a site with this tag list."""
    with pytest.raises(PlantFileError) as caught:
        plant(folder, tags, text)
    assert caught.value.exit_code == Exit.USAGE
    return caught.value.faults


def placeless(tags: dict[str, Tag]) -> dict[str, Tag]:
    """Tags without the places of their declaration."""
    return {name: dataclasses.replace(tag, line=0, declared_in="") for name, tag in tags.items()}


def plain(read: Plant) -> dict[str, Tag]:
    """Tags of a plant, to be compared."""
    return placeless(dict(read.tags))


def test_the_same_tags_as_in_the_plant_file(tmp_path: Path) -> None:
    """Row for row the records are those of the plant file; each knows its own line."""
    (tmp_path / "plant.toml").write_text(GAS_ENGINE, encoding="utf-8")
    expected = plain(read_plant(tmp_path))
    got = plant(tmp_path, LIST)
    assert plain(got) == expected
    assert [(tag.declared_in, tag.line) for tag in got.tags.values()] == [
        ("tags.csv", at) for at in range(2, 7)
    ]


def test_as_a_spreadsheet_writes_it(tmp_path: Path) -> None:
    """Semicolons, decimal commas, a byte order mark, blank rows and columns, quotes: the same tags."""
    rows = [line.replace(",", ";").replace("0.", "0,").replace("1 min", "1,0 min") for line in (HEAD, *ROWS)]
    text = "\r\n".join([f"{rows[0]};;", "", *(f"{row};;" for row in rows[1:]), ";;;"]) + "\r\n"
    got = plant(tmp_path, b"\xef\xbb\xbf" + text.replace(";P;", ';"P";').encode())
    assert plain(got) == plain(plant(tmp_path, LIST))


def test_all_kinds_of_tags(tmp_path: Path) -> None:
    """Counters, states, means, pressures: any key of a tag may be a column."""
    head = "name,column,unit,between,stamp_marks,hold,at_most,states,standard,pressure,resolution"
    more = (
        "index,I,kWh,counter,,,1300 kW,,1 %,,0.1",
        "breaker,B,,state,,5 min,,0 = open; 1 = closed,,,",
        "inlet,X,bar,mean,end,,,,0.5 %,gauge,",
    )
    base = [",".join((*(row.split(",")[:4]), "", "1 min", "", "", row.split(",")[7], "", "")) for row in ROWS]
    got = plant(tmp_path, "\n".join((head, *base, *more)) + "\n").tags
    assert got["index"].at_most == pytest.approx(1.3e6) and got["index"].resolution == pytest.approx(3.6e5)
    assert got["breaker"].states == {"0": "open", "1": "closed"}
    assert (got["inlet"].stamp_marks, got["inlet"].pressure) == ("end", "gauge")


def test_rows_with_a_date_say_what_changes(tmp_path: Path) -> None:
    """A further row of a tag is a change, and a new heading from its date on: as in the plant file."""
    rows = "power,PT-101A,MW,,,,,0.3 %,2026-07-10T08:00:00\nsupply,,K,,,,,,2026-07-20\n"
    text = "\n".join([f"{HEAD},from", *(f"{row}," for row in ROWS)]) + "\n" + rows
    since = "from = 2026-07-10T08:00:00"
    written = changed(
        GAS_ENGINE,
        (
            'column = "P", unit = "kW"',
            f'column = [{{ name = "P", until = {since[7:]} }}, {{ name = "PT-101A", {since} }}], '
            'unit = "kW", '
            f'changes = [{{ {since}, unit = "MW", standard = "0.3 %" }}]',
        ),
        ('column = "S"', 'column = "S", changes = [{ from = 2026-07-20, unit = "K" }]'),
    )
    got = plain(plant(tmp_path, text))
    (tmp_path / "plant.toml").write_text(written, encoding="utf-8")
    expected = plain(read_plant(tmp_path))
    for name, tag in got.items():
        assert [placeless({"": each.tag}) for each in tag.changes] == [
            placeless({"": each.tag}) for each in expected[name].changes
        ]
        assert dataclasses.replace(tag, changes=()) == dataclasses.replace(expected[name], changes=())
    assert [change.new_calibration for change in got["power"].changes] == [True]


SLIPS = [
    ("power,P,kW", "power,P,kWatt", "tags.csv:3, column unit", "not a known unit"),
    ("power,P,kW,step", "power,P,kW,stepp", "tags.csv:3, column between", '"stepp"'),
    ("power,P,kW,step,1 min", "power,P,kW,step,1", "tags.csv:3, column hold", '"1"'),
    ("power,P,kW,step,1 min", "power,P,kW,step,", "tags.csv:3, column hold", '"hold" is missing'),
    ("power,P,", "power,,", "tags.csv:3, column column", '"column" is missing'),
    ("power,P,", "power,F,", "tags.csv:4, column column", 'bound to the tag "power"'),
    ("flow,F,", "power,F,", "tags.csv:4, column name", "declared already (line 3)"),
    ("flow,F,", ",F,", "tags.csv:4, column name", "no name"),
    ("0,130,0.1 K\nback", "0,,0.1 K\nback", "tags.csv:5, column high", "two ends"),
    ("0,130,0.1 K\nback", "130,0,0.1 K\nback", "tags.csv:5, column low and high", "no range"),
    ("1 min,,,0.5 %", "1 min,,,", "tags.csv:3, column standard", "is missing"),
    (",hold,low", ",holds,low", "tags.csv:1, column holds", "not known here"),
    (",low,high", ",low,low", "tags.csv:1, column low", "stands in columns 6 and 7"),
    ("1 min,,,0.5 %", "1 min,,,0.5 %,x", "tags.csv:3", "the row has 9 cells"),
]


@pytest.mark.parametrize(("old", "new", "where", "words"), SLIPS)
def test_each_slip_is_told_at_its_row_and_column(
    tmp_path: Path, old: str, new: str, where: str, words: str
) -> None:
    """File, line and column heading, in the words of the plant file's own checks."""
    told = faults(tmp_path, changed(LIST, (old, new)))
    assert any(fault.where == where and words in fault.found and fault.fix for fault in told), told


def test_faults_of_both_files_come_together(tmp_path: Path) -> None:
    """The plant file's first, then the list's, each with its own line."""
    text = changed(PLANT, ('clock = "UTC"\n', ""))
    tags = changed(LIST, ("power,P,kW", "power,P,kWatt"), ("flow,F,kg/s,step,1 min", "flow,F,kg/s,step,5"))
    told = faults(tmp_path, tags, text)
    assert [fault.where.partition(",")[0] for fault in told] == ["plant.toml:9", "tags.csv:3", "tags.csv:4"]


def test_a_tag_in_both_files_is_told(tmp_path: Path) -> None:
    """The plant file may hold further tags, but not the same one."""
    extra = (
        'tag_list = "tags.csv"\n'
        'tags.{} = {{ column = "X", unit = "kW", between = "line", hold = "1 min", limit = 5 }}'
    )
    both = changed(PLANT, ('tag_list = "tags.csv"', extra.format("extra")))
    assert set(plant(tmp_path, LIST, both).tags) == {"gas", "power", "flow", "supply", "back", "extra"}
    told = faults(tmp_path, LIST, changed(PLANT, ('tag_list = "tags.csv"', extra.format("flow"))))
    assert any(fault.where == "tags.csv:4, column name" and "(plant.toml)" in fault.found for fault in told)


@pytest.mark.parametrize(
    ("tags", "words"),
    [(b"", "no rows"), (HEAD.encode() + b"\n", "no rows"), (LIST.encode("utf-16"), "UTF-8")],
)
def test_a_list_that_cannot_be_read(tmp_path: Path, tags: bytes, words: str) -> None:
    """Empty, or in another encoding: told with the file's name."""
    told = faults(tmp_path, tags)
    assert any(words in f"{fault.found} {fault.fix}" and "tags.csv" in str(fault) for fault in told)


@pytest.mark.parametrize("name", ["../tags.csv", "*.csv", "tags.xlsx", "missing.csv"])
def test_a_list_that_is_not_there(tmp_path: Path, name: str) -> None:
    """Outside the site folder, a pattern, another format, or missing."""
    told = faults(tmp_path, LIST, changed(PLANT, ('"tags.csv"', f'"{name}"')))
    assert [fault.where for fault in told] == ["plant.toml:15, exports.plant.tag_list"]


def test_a_heading_that_is_in_no_file_names_the_row(tmp_path: Path) -> None:
    """What only the exports can tell points at the row of the list too."""
    place = site(tmp_path / "site", PLANT, DAY)
    (place / "tags.csv").write_text(changed(LIST, ("power,P,", "power,PX,")), encoding="utf-8")
    done = run("check", place)
    assert done.code == Exit.USAGE
    assert "tags.csv:3, column column" in done.err and '"PX" is in none' in done.err


def test_the_audit_is_the_same_and_the_list_is_content(tmp_path: Path) -> None:
    """Same figures; another digest; a night run audits again when a row changes, not for a blank one."""
    day = ("--from", "2025-06-03", "--to", "2025-06-03")
    expected = audited(tmp_path / "toml", GAS_ENGINE, DAY, *day)
    place = site(tmp_path / "site", PLANT, DAY)
    (place / "tags.csv").write_text(LIST, encoding="utf-8")
    assert run("audit", place, "--out", tmp_path / "out", "--quiet", *day).code == 0
    assert figures(tmp_path / "out") == figures(expected)
    first = statement(tmp_path / "out")["plant_file_sha256"]
    assert "supply,S,degC,step,1 min,0,130,0.1 K" in (tmp_path / "out" / "report.html").read_text("utf-8")
    month = {"plant/a.csv": export(instants("2025-06-01", "2025-07-01"), {
        "G": 250.0, "P": 1000.0, "F": 16.25, "S": 90.0, "R": 70.0})}  # fmt: skip
    night = site(tmp_path / "night", PLANT, month)
    seen = []
    for tags in (LIST, LIST + "\n", changed(LIST, ("step,1 min,,,0.5 %", "step,1 min,,,0.6 %"))):
        (night / "tags.csv").write_text(tags, encoding="utf-8")
        assert run("nightly", night).code == 0
        seen.append(digests(night / "audit" / "2025-06"))
    assert seen[0] == seen[1] != seen[2]
    (place / "tags.csv").write_text(LIST + "\n", encoding="utf-8")
    assert run("audit", place, "--out", tmp_path / "again", "--quiet", *day).code == 0
    assert statement(tmp_path / "again")["plant_file_sha256"] != first
    assert np.isfinite(figures(tmp_path / "again")["gross_pct"]["value"])


def test_the_schema_lets_a_list_stand_for_the_tags() -> None:
    """An editor asks for tags or a tag list."""
    part = plant_schema()["$defs"]["ExportPart"]
    assert "tags" not in part["required"]
    assert part["anyOf"] == [{"required": ["tags"]}, {"required": ["tag_list"]}]
