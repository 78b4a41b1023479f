"""A draft of the demo sites' exports becomes their plant files once its blanks are filled."""

from __future__ import annotations

import json
import re
import tomllib
from dataclasses import replace
from functools import cache
from pathlib import Path
from typing import Any

import pytest

from auditor.drafting import Draft, draft_plant, draft_text
from auditor.log_reading import recognise
from auditor.plant_file import read_plant
from auditor.records.errors import PlantFileError

SAMPLES = Path(__file__).resolve().parents[1] / "sample_logs"
SITES = ("emberlund", "quillmere")
NEVER_PROPOSED = re.compile(
    r"(clock|between|stamp_marks|hold|standard|limit|pressure|basis|reads|volume_state|heating_value|headline"
    r"|at_most|full_scale|zone|altitude)\s*="
)


@cache
def draft_of(name: str) -> Draft:
    """Draft the exports of a demo site once."""
    return draft_plant(SAMPLES / name / "logs")


@pytest.fixture(scope="module", params=SITES)
def drafted(request: pytest.FixtureRequest) -> tuple[str, str]:
    """Name of a demo site, and the draft of its exports."""
    return request.param, draft_text(draft_of(request.param))


def toml(value: Any) -> str:
    """Write a value as TOML on one line."""
    if isinstance(value, dict):
        return "{ " + ", ".join(f"{json.dumps(key)} = {toml(item)}" for key, item in value.items()) + " }"
    if isinstance(value, list):
        return "[" + ", ".join(toml(item) for item in value) + "]"
    return json.dumps(value) if isinstance(value, str) else repr(value)


def sections(text: str) -> list[tuple[str, list[str]]]:
    """Tables of a draft: the header and the lines below it."""
    found: list[tuple[str, list[str]]] = [("", [])]
    for line in text.splitlines():
        if line.startswith("["):
            found.append((line.strip("[]"), []))
        else:
            found[-1][1].append(line)
    return found


def filled(lines: list[str], answers: dict[str, Any]) -> list[str]:
    """Fill the blanks of one table, delete those that do not apply, add what is optional."""
    out, left = [], dict(answers)
    for line in lines:
        blank = re.match(r"#\? (\w+)\b", line)
        key = re.match(r"(\w+) = (.*?)\s*(#.*)?$", line)
        if blank is not None:
            if blank[1] in left:
                out.append(f"{blank[1]} = {toml(left.pop(blank[1]))}")
        elif key is not None and key[1] != "delimiter":
            assert tomllib.loads(line)[key[1]] == left.pop(key[1]), line
            out.append(line)
        else:
            out.append(line)
    return out + [f"{key} = {toml(value)}" for key, value in left.items()]


def fill(draft: str, answers: dict[str, Any], rest: str) -> str:
    """Fill a whole draft with the answers of a plant file, under the names that this file uses."""
    names: dict[str, str] = {}
    out: list[str] = []
    for header, lines in sections(draft):
        if header == "":
            out += lines
        elif header == "site":
            out += ["[site]", *filled(lines, answers["site"])]
        elif ".tags." not in header:
            files = tomllib.loads("\n".join(lines))["files"]
            own = next(name for name, export in answers["exports"].items() if export["files"] == files)
            names[header] = own
            export = {key: value for key, value in answers["exports"][own].items() if key != "tags"}
            out += [f"[exports.{own}]", *filled(lines, export)]
        else:
            home = names[header.partition(".tags.")[0]]
            column = tomllib.loads("\n".join(lines))["column"]
            tags = answers["exports"][home]["tags"]
            tag = next((name for name, each in tags.items() if each["column"] == column), None)
            if tag is not None:
                out += [f"[exports.{home}.tags.{tag}]", *filled(lines, tags[tag])]
    return "\n".join([*out, rest])


def test_filled_draft_is_the_demo_plant_file(drafted: tuple[str, str], tmp_path: Path) -> None:
    """Files, layout, decimal mark, date order, columns and units agree; filled, it reads and recognises."""
    name, draft = drafted
    text = (SAMPLES / name / "plant.toml").read_text(encoding="utf-8")
    rest = re.search(r"^\[(?:fluids|fuels)\..*", text, re.DOTALL | re.MULTILINE)
    assert rest is not None
    path = tmp_path / "plant.toml"
    path.write_text(fill(draft, tomllib.loads(text), rest[0]), encoding="utf-8")
    mine, shipped = read_plant(tmp_path), read_plant(SAMPLES / name)
    bare = [{tag.name: replace(tag, line=0) for tag in plant.tags.values()} for plant in (mine, shipped)]
    assert bare[0] == bare[1]
    for export in mine.exports.values():
        theirs = shipped.exports[export.name]
        assert export == replace(theirs, delimiter=export.delimiter, tags=export.tags)
        assert set(export.tags) == set(theirs.tags)
    found = recognise(SAMPLES / name / "logs", mine.exports, mine.tags)
    assert all(found.files[export] for export in mine.exports)


def test_units_of_the_unit_row_are_proposed() -> None:
    """The furnace logger has a unit row; no other export of the two sites names a unit."""
    for name in SITES:
        for export in draft_of(name).exports:
            units = {tag.column: tag.unit.unit for tag in export.tags if tag.unit.unit}
            expected = {"WX-T1": "degC", "WX-T2": "degC", "WX-M": "kg/s"} if export.name == "furnace" else {}
            assert units == expected


def test_what_no_export_proves_is_never_proposed(drafted: tuple[str, str]) -> None:
    """Clock, between, stamp marks, hold, uncertainty, gauge, basis and reference states stay blank."""
    lines = [line for line in drafted[1].splitlines() if not line.startswith("#")]
    assert not [line for line in lines if NEVER_PROPOSED.match(line)]
    parsed = tomllib.loads(drafted[1])
    assert set(parsed) == {"schema", "site", "exports"} and parsed["site"] == {}


def test_check_names_every_blank_with_its_line(drafted: tuple[str, str], tmp_path: Path) -> None:
    """Unfilled: site, clocks, machines and every `between`; with it: unit, hold and uncertainty too."""
    path = tmp_path / "plant.toml"
    path.write_text(drafted[1], encoding="utf-8")
    with pytest.raises(PlantFileError) as caught:
        read_plant(tmp_path)
    places = {fault.where for fault in caught.value.faults}
    keys = {place.partition(", ")[2] for place in places}
    tables = [header for header, _ in sections(drafted[1])]
    tags = [header for header in tables if ".tags." in header]
    exports = [header for header in tables if header.startswith("exports.") and header not in tags]
    expected = {"site.name", "site.zone", "machines", *(f"{export}.clock" for export in exports)}
    assert keys == expected | {f"{tag}.between" for tag in tags}
    lines = drafted[1].splitlines()
    for place in places:
        where = re.fullmatch(r"plant\.toml:(\d+), (.*)\.\w+", place)
        assert where is None or lines[int(where[1]) - 1] == f"[{where[2]}]"

    path.write_text(re.sub(r"#\? between =", 'between = "line"', drafted[1]), encoding="utf-8")
    with pytest.raises(PlantFileError) as caught:
        read_plant(tmp_path)
    keys = {fault.where.partition(", ")[2] for fault in caught.value.faults}
    for tag, entries in sections(drafted[1]):
        if ".tags." in tag:
            blanks = {found[1] for line in entries if (found := re.match(r"#\? (\w+)", line))}
            assert {f"{tag}.{key}" for key in blanks & {"unit", "hold", "standard"}} <= keys


def test_shapes_seen_in_the_demo_exports() -> None:
    """Indexes look like counters over a meter exchange, a breaker like a state; notes are skipped."""
    draft = draft_of("quillmere")
    looks = {tag.column: tag.appearance.value for export in draft.exports for tag in export.tags}
    assert {looks[name] for name in ("GN-01", "GN-02", "GM-01")} == {"a counter"}
    assert looks["BKR"] == "a state"
    assert {looks[name] for name in ("EX-1", "HT-F", "GM-02", "GM-03", "AMB-T")} == {"a level or a rate"}
    assert [path for path, _ in draft.skipped] == ["notes.txt"]


def test_clock_evidence_of_the_demo_exports() -> None:
    """The boiler house repeats an hour of autumn, the engine names UTC, the gas meter shows neither."""
    draft = draft_of("quillmere")
    said = {export.name: " ".join(export.stamps.clock) for export in draft.exports}
    assert 'falls back by an hour from "26-10-2025 02:58" to "26-10-2025 02:00"' in said["heat"]
    assert "an offset of its own: UTC" in said["engine"]
    assert "the night to Sunday 26 October 2025 ran through" in said["gas"]


def test_two_pulls_of_one_logger_are_one_export() -> None:
    """The monthly and the daily files of the skid hold the same rows, though their columns differ."""
    draft = draft_of("emberlund")
    files = [export.files for export in draft.exports]
    assert ("month/*.csv.gz", "day/*.csv") in files and len(files) == 3
