"""What is proposed for small exports of every shape, and what is left blank and why."""

from __future__ import annotations

import gzip
import io
import tomllib
import zipfile
from collections.abc import Mapping
from pathlib import Path
from tempfile import TemporaryDirectory

import pytest
from hypothesis import given
from hypothesis import strategies as st

from auditor.drafting import Draft, draft_plant, draft_text
from auditor.drafting.proposals import ExportProposal
from auditor.records.errors import NoDataError


def lay(folder: Path, files: Mapping[str, str | bytes]) -> Path:
    """Write files below a folder."""
    for name, text in files.items():
        path = folder / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_bytes(text if isinstance(text, bytes) else text.encode("utf-8"))
    return folder


def drafted(folder: Path, files: Mapping[str, str | bytes]) -> Draft:
    """Draft some files; the text of every draft is valid TOML."""
    draft = draft_plant(lay(folder, files))
    tomllib.loads(draft_text(draft))
    return draft


def one(folder: Path, text: str | bytes, name: str = "a.csv") -> ExportProposal:
    """Draft one file, which is one export."""
    (export,) = drafted(folder, {name: text}).exports
    return export


def table(head: str, cells: list[str], start: str = "2026-07-{:02d} {:02d}:00", separator: str = ";") -> str:
    """Hourly rows under a heading row."""
    rows = [start.format(13 + at // 24, at % 24) + separator + cell for at, cell in enumerate(cells)]
    return "\n".join([head, *rows]) + "\n"


def numbers(count: int = 48) -> list[str]:
    """Numbers that rise and fall."""
    return [f"{20 + (at * 7) % 11}.5" for at in range(count)]


@pytest.mark.parametrize(
    ("heading", "unit"),
    [
        ("T1 [°C]", "degC"),
        ("T1 [ ï¿½C]", "degC"),
        ("Flow (m³/h)", "m3/h"),
        ("P (kW)", "kW"),
        ("O2 [%]", "%"),
        ("p feed [bar(g)]", "bar"),
        ("Gas [Nm³/h]", "m3/h"),
        ("Speed [1/min]", "1/min"),
        ("Fuel [gal]", ""),
        ("Heat [MBtu/h]", ""),
        ("Phase (C)", ""),
        ("Pump [1]", ""),
        ("Level [somewhat]", ""),
        ("T1", ""),
    ],
)
def test_units_in_brackets(tmp_path: Path, heading: str, unit: str) -> None:
    """A unit in brackets is proposed where it has one meaning; what it says of gauge or state is not."""
    (tag,) = one(tmp_path, table(f"t;{heading}", numbers())).tags
    assert tag.column == heading and tag.unit.unit == unit
    text = draft_text(draft_plant(tmp_path))
    assert "\npressure =" not in text and ("\n#? pressure =" in text) == (unit == "bar")
    assert ("\nunit = " in text) == bool(unit) and ("\n#? unit =" in text) != bool(unit)


@pytest.mark.parametrize("order", ["below", "above"])
def test_unit_row(tmp_path: Path, order: str) -> None:
    """A unit row below or above the headings gives units; its unknown texts stay blank."""
    rows = ["Tid;T;P;X", "dd.mm.yyyy hh:mm;°C;kW;foo"]
    head = "\n".join(["Plant: boiler house", "", *(rows if order == "below" else reversed(rows))])
    export = one(tmp_path, table(head, [f"{cell};{cell};{cell}" for cell in numbers()]))
    assert {tag.column: tag.unit.unit for tag in export.tags} == {"T": "degC", "P": "kW", "X": ""}


@pytest.mark.parametrize(
    ("stamps", "order", "said"),
    [
        ("{:02d}.07.2026 {:02d}:00", "day first", '"13.07.2026 00:00" can only be read so'),
        ("07/{:02d}/2026 {:02d}:00", "month first", '"07/13/2026 00:00" can only be read so'),
        ("2026-07-{:02d}T{:02d}:00:00", "year first", "can only be read so"),
        (
            "05.0{0:.1s}.2026 {1:02d}:00",
            None,
            "may be 5 January 2026 (day first) or 1 May 2026 (month first)",
        ),
    ],
)
def test_order_of_the_date(tmp_path: Path, stamps: str, order: str | None, said: str) -> None:
    """Only a day above 12 proves it; else it is a blank with both readings of the first stamp."""
    cells = numbers(24)
    if order is None:
        text = "t;a\n" + "".join(f"05.01.2026 {hour:02d}:00;{cell}\n" for hour, cell in enumerate(cells))
    else:
        text = table("t;a", cells, stamps)
    export = one(tmp_path, text)
    assert export.stamps.order == order and said in export.stamps.because
    assert ("\n#? date_order =" in draft_text(draft_plant(tmp_path))) == (order is None)


def test_one_file_proves_the_order_for_all_files_of_its_export(tmp_path: Path) -> None:
    """The evidence is pooled: a file of the first days alone would prove nothing."""
    files = {
        f"e/log_{day:02d}.csv": "t;a\n"
        + "".join(f"{day:02d}.07.2026 {hour:02d}:00;1,5\n" for hour in range(9))
        for day in (1, 2, 13)
    }
    (export,) = drafted(tmp_path, files).exports
    assert export.stamps.order == "day first" and export.files == ("e/*.csv",)


@pytest.mark.parametrize(
    ("cells", "separator", "decimal"),
    [
        (["1,5", "2"], ";", ","),
        (["1.5", "2"], ";", "."),
        (["1.234", "2.345"], ";", None),
        (["1,234", "2,345"], ";", None),
        (["0.123", "0.345"], ";", "."),
        (["1.234", "2.345"], ",", "."),
        (["12", "13"], ";", None),
        (["1,5", "2.5"], ";", None),
    ],
)
def test_decimal_mark(tmp_path: Path, cells: list[str], separator: str, decimal: str | None) -> None:
    """Three digits behind a mark may be thousands, whole numbers show none: then it is a blank."""
    export = one(tmp_path, table(f"t{separator}a", cells * 20, separator=separator))
    assert export.decimal == decimal


@pytest.mark.parametrize(
    ("cells", "looks"),
    [
        ([str(1000 + 3 * at) for at in range(48)], "a counter"),
        ([str(90_000 + 300 * at if at < 30 else at - 29) for at in range(48)], "a counter"),
        ([str(1000 + 3 * at - (40 if at == 30 else 0)) for at in range(48)], "a level or a rate"),
        (numbers(), "a level or a rate"),
        (["0", "1", "1", "0"] * 12, "a state"),
        (["auto", "hand"] * 24, "a state"),
        (["7.5"] * 48, "a constant"),
        (["7.5"] * 120 + ["3.1"], "a constant"),
    ],
)
def test_what_a_column_looks_like(tmp_path: Path, cells: list[str], looks: str) -> None:
    """Counters fall only to near zero, states have few texts; `between` is a blank for all of them."""
    (tag, _) = one(tmp_path, table("t;a;b", [f"{cell};1.5" for cell in cells])).tags
    assert tag.appearance.value == looks
    assert "\nbetween" not in draft_text(draft_plant(tmp_path))


def test_sentinels_and_words_are_told(tmp_path: Path) -> None:
    """A number that comes again far from all others, and words among numbers, are shown to the user."""
    cells = numbers()
    cells[5] = cells[9] = cells[30] = "-9999"
    cells[7] = "Bad"
    (tag,) = one(tmp_path, table("t;a", cells)).tags
    assert "-9999 (3 times) far from all others: a sentinel?" in tag.because
    assert '"Bad" (1)' in tag.because and "from 20.5 to 30.5" in tag.because


def test_columns_that_become_no_tags(tmp_path: Path) -> None:
    """Empty, doubled and stamp columns and remarks are left out, each with a word."""
    rows = [f"1.5;;2026-07-13;{at};{at};word {at}" for at in range(40)]
    export = one(tmp_path, table("t;a;gap;day;twice;twice;remark", rows))
    assert [tag.column for tag in export.tags] == ["a"]
    said = " ".join(export.remarks)
    assert all(f'"{name}"' in said for name in ("gap", "day", "twice", "remark"))


def test_long_layout(tmp_path: Path) -> None:
    """One stamp under several names makes a long export; a column of units gives units."""
    text = "time,point,reading,unit\n" + "".join(
        f"2026-07-13 {hour:02d}:00,T1,{20 + hour % 3}.5,degC\n2026-07-13 {hour:02d}:00,E1,{1000 + hour},kWh\n"
        for hour in range(24)
    )
    export = one(tmp_path, text)
    assert export.layout == ("time", "point", "reading")
    units = {tag.column: (tag.unit.unit, tag.appearance.value) for tag in export.tags}
    assert units == {"T1": ("degC", "a level or a rate"), "E1": ("kWh", "a counter")}


def test_wide_export_with_a_mode_is_not_long(tmp_path: Path) -> None:
    """A column of words beside a number does not make an export long."""
    export = one(tmp_path, table("t;mode;a", [f"{'on' if at % 3 else 'off'};{at % 7}.5" for at in range(48)]))
    assert export.layout is None and [tag.column for tag in export.tags] == ["mode", "a"]


def test_date_and_time_apart_and_stamp_not_first(tmp_path: Path) -> None:
    """The headings of the stamp are declared where it is not the first column alone."""
    rows = "".join(f"{at};13.07.2026;{at:02d}:00;{at % 5},5\n" for at in range(24))
    export = one(tmp_path, "no;Date;Time;a\n" + rows)
    assert export.stamp == ("Date", "Time") and export.stamps.step_s == 3600.0
    assert 'stamp = ["Date", "Time"]' in draft_text(draft_plant(tmp_path))


@pytest.mark.parametrize(
    ("first", "order"), [(1_783_900_800, "epoch seconds"), (1_783_900_800_000, "epoch milliseconds")]
)
def test_epoch_stamps(tmp_path: Path, first: int, order: str) -> None:
    """Seconds and milliseconds since 1970 are told apart by their size."""
    step = 60 if order == "epoch seconds" else 60_000
    text = "ts,a\n" + "".join(f"{first + step * at},{at % 7}.5\n" for at in range(48))
    export = one(tmp_path, text)
    assert export.stamps.order == order and export.stamps.step_s == 60.0


def test_skipped_hour_is_evidence(tmp_path: Path) -> None:
    """A leap from 02:00 to 03:00 on a Sunday of spring is shown; the clock stays a blank."""
    rows = [
        f"29.03.2026 {hour:02d}:{minute:02d};1,5\n" for hour in (0, 1, 3, 4) for minute in range(0, 60, 10)
    ]
    export = one(tmp_path, "t;a\n" + "".join(rows))
    assert 'the clock leaps an hour from "29.03.2026 01:50" to "29.03.2026 03:00"' in export.stamps.clock
    assert "\nclock" not in draft_text(draft_plant(tmp_path))


def test_files_are_grouped_by_folder_and_headings(tmp_path: Path) -> None:
    """Other headings in the same folder make another export, with patterns that do not overlap."""
    a, b = table("t;a;b", [f"{x};1.5" for x in numbers()]), table("t;c", numbers())
    files: dict[str, str | bytes] = {
        "x/boiler_2026-07-01.csv": a,
        "x/boiler_2026-07-02.csv": table("t;b;a", [f"1.5;{x}" for x in numbers()]),
        "x/pump_2026-07-01.csv": b,
        "x/pump_2026-07-02.csv": b,
        "x/readme.csv": "nothing,of,interest\n",
    }
    exports = drafted(tmp_path, files).exports
    assert {export.files: export.count for export in exports} == {
        ("x/boiler_*.csv",): 2,
        ("x/pump_*.csv",): 2,
    }
    assert {export.name for export in exports} == {"boiler", "pump"}


def test_two_machines_with_the_same_headings_stay_apart(tmp_path: Path) -> None:
    """Equal headings prove nothing: other numbers at the same stamps are another machine."""
    files = {
        "engine1/a.csv": table("t;P", numbers()),
        "engine2/a.csv": table("t;P", [str(100 + at % 9) + ".5" for at in range(48)]),
    }
    exports = drafted(tmp_path, files).exports
    assert [export.name for export in exports] == ["engine1", "engine2"]
    names = [tag.name for export in exports for tag in export.tags]
    assert len(set(names)) == 2


def test_folders_that_are_dates_are_one_export(tmp_path: Path) -> None:
    """A folder a day is one export; a folder a machine is not."""
    files = {
        f"{unit}/2026/07/{day:02d}/log.csv": "t;P\n"
        + "".join(f"2026-07-{day:02d} {hour:02d}:00;{shift + hour % 7}.5\n" for hour in range(24))
        for unit, shift in (("engine1", 10), ("engine2", 50))
        for day in range(1, 15)
    }
    exports = drafted(tmp_path, files).exports
    assert [(export.files, export.count) for export in exports] == [
        (("engine1/*/*/*/*.csv",), 14),
        (("engine2/*/*/*/*.csv",), 14),
    ]
    assert [export.name for export in exports] == ["engine1", "engine2"]


@pytest.mark.parametrize(
    ("day", "said"),
    [("25.10.2026", "25 October 2026 ran through, though clocks change then in Europe"), ("18.10.2026", "")],
)
def test_night_without_a_clock_change_is_evidence(tmp_path: Path, day: str, said: str) -> None:
    """Where Europe repeats an hour and the log does not, the reader is told; other Sundays say nothing."""
    rows = [f"{day} {hour:02d}:{minute:02d};1,5\n" for hour in range(6) for minute in range(0, 60, 10)]
    clock = " ".join(one(tmp_path, "t;a\n" + "".join(rows)).stamps.clock)
    assert "no repeated and no skipped hour" in clock
    assert (said in clock) if said else ("ran through" not in clock)


@given(
    st.binary(max_size=300), st.sampled_from(["t;a [kW]\n2026-07-13 00:00;1,5\n2026-07-13 00:01;2,5\n", ""])
)
def test_no_bytes_stop_a_draft(tail: bytes, start: str) -> None:
    """Whatever a file holds, it is drafted or skipped with a reason, and the draft is valid TOML."""
    with TemporaryDirectory() as folder:
        files = {"a.csv": start.encode() + tail, "b/c.csv": table("t;b", numbers(24))}
        draft = drafted(Path(folder), files)
        assert sum(export.count for export in draft.exports) + len(draft.skipped) == 2


def test_packed_files(tmp_path: Path) -> None:
    """Exports are read in .gz and .zip, and patterns name what is on the disk."""
    text = table("t;a", numbers())
    packed = io.BytesIO()
    with zipfile.ZipFile(packed, "w") as archive:
        archive.writestr("july.csv", text)
    other = table("t;b", numbers())
    exports = drafted(
        tmp_path, {"gas/w1.zip": packed.getvalue(), "power/w1.csv.gz": gzip.compress(other.encode())}
    ).exports
    assert [export.files for export in exports] == [("gas/*.zip",), ("power/*.csv.gz",)]


def test_noise_is_skipped_with_a_reason(tmp_path: Path) -> None:
    """Files without a table of stamps and numbers are named, with what is missing."""
    files: dict[str, str | bytes] = {
        "good.csv": table("t;a", numbers()),
        "notes.txt": "engine down overnight\nburner work\n",
        "times.csv": "time;a\n" + "".join(f"10:{minute:02d}:00;1,5\n" for minute in range(30)),
        "headless.csv": "".join(f"2026-07-13 {hour:02d}:00;1,5\n" for hour in range(20)),
        "diary.csv": "day;what\n2026-07-13;pump exchanged\n2026-07-14;filter cleaned\n",
        "empty.csv": b"",
        "broken.zip": b"PK no archive",
        "picture.png": bytes(range(256)) * 20,
    }
    draft = drafted(tmp_path, files)
    assert [export.files for export in draft.exports] == [("good.csv",)]
    reasons = dict(draft.skipped)
    assert set(reasons) == set(files) - {"good.csv"}
    assert reasons["times.csv"] == "its first column holds times of day without a date"
    assert reasons["headless.csv"] == "no heading row stands above its data"
    assert reasons["diary.csv"] == "beside its dates it holds no columns of numbers"
    assert reasons["empty.csv"] == "empty file"


def test_files_that_are_set_aside_anyway_do_not_narrow_a_pattern(tmp_path: Path) -> None:
    """Tomorrow's file is empty today, and a copy is under way: the pattern is still the plain one."""
    files: dict[str, str | bytes] = {"e/a_1.csv": table("t;a", numbers()), "e/a_2.csv": b"", "e/.x.csv": "x"}
    assert [export.files for export in drafted(tmp_path, files).exports] == [("e/*.csv",)]


def test_large_numbers_are_no_stamps(tmp_path: Path) -> None:
    """Serial numbers could be seconds since 1970, but time does not run back and forth."""
    rows = "".join(f"{1_000_000_000 + (at * 7_919_777) % 50_000_000};{at % 7},5\n" for at in range(48))
    with pytest.raises(NoDataError, match="no column of it holds time stamps"):
        draft_plant(lay(tmp_path, {"a.csv": "serial;a\n" + rows}))


def test_nothing_but_noise(tmp_path: Path) -> None:
    """Without any export there is nothing to draft."""
    with pytest.raises(NoDataError, match="no file below this folder holds a table with time stamps"):
        draft_plant(lay(tmp_path, {"notes.txt": "nothing"}))


@pytest.mark.parametrize(
    "heading", ['a "b" c', "tab\\slash", "naïve é", "=cmd()", "reference", "<script>", "#?"]
)
def test_any_heading_gives_a_valid_file(tmp_path: Path, heading: str) -> None:
    """Whatever a heading holds, the draft is valid TOML and binds it as it stands."""
    export = one(tmp_path, table(f"t;{heading}", numbers()))
    parsed = tomllib.loads(draft_text(draft_plant(tmp_path)))
    (tags,) = [entry["tags"] for entry in parsed["exports"].values()]
    (tag,) = tags.values()
    assert tag["column"] == export.tags[0].column
    assert all("=" not in name and name != "reference" for name in tags)


def test_same_folder_same_bytes(tmp_path: Path) -> None:
    """The draft depends on the exports alone."""
    files = {f"f/log_{day}.csv": table("t;a;b", [f"{x};1.5" for x in numbers()]) for day in range(12)}
    one_text = draft_text(draft_plant(lay(tmp_path / "one", files)))
    two_text = draft_text(draft_plant(lay(tmp_path / "two", dict(reversed(files.items())))))
    assert one_text == two_text and str(tmp_path) not in one_text


def test_large_files_are_sampled(tmp_path: Path) -> None:
    """A stamp that proves the order stands at the end of a large file only, and is found there."""
    early = "".join(
        f"05.07.2026 {at % 24:02d}:{at // 24 % 60:02d};1,5;{at % 97},25\n" for at in range(80_000)
    )
    text = "t;a;b\n" + early + "".join(f"31.07.2026 {hour:02d}:00;1,5;2,5\n" for hour in range(24))
    assert len(text) > 1 << 20
    export = one(tmp_path, text)
    assert export.stamps.order == "day first" and export.stamps.last == "31.07.2026 23:00"
