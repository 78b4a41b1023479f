"""Awkward exports by number, 1 to 16: shape and text of the files, and cells that are no plain numbers.

What arrives is common practice of loggers and spreadsheets, no source; expected values are worked by hand.
"""

from __future__ import annotations

import gzip
import io
import zipfile
from pathlib import Path

from catalogue import Case, every, hold, minutes

from auditor.records.findings import FindingCode
from auditor.records.plant import LongLayout

HEAD = "t;a;b\n"
ONE, TWO, THREE = "2026-07-01 00:00;1;2\n", "2026-07-01 00:01;3;4\n", "2026-07-01 00:02;5;6\n"
PLAIN = HEAD + ONE + TWO + THREE
AT = ("2026-07-01T00:00:00", "2026-07-01T00:01:00", "2026-07-01T00:02:00")
READ = [(AT[0], 1.0, 2.0), (AT[1], 3.0, 4.0), (AT[2], 5.0, 6.0)]
THREE_USED = {"a": {"used": 3}, "b": {"used": 3}}
TWO_USED = {"a": {"used": 2}, "b": {"used": 2}}
LONG = {"layout": LongLayout("t", "p", "v")}
LONG_ROWS = "".join(
    f"2026-07-01 00:0{at},{name},{1 + 2 * at + place}\n" for at in range(3) for place, name in enumerate("ab")
)
REMARK = '2026-07-01 00:00;"late; ""again""";1;2\n'
BROKEN_REMARK = '2026-07-01 00:01;3;4;"stopped\nby hand"\n'
WARM = {"a": "Wärme °C", "b": "b"}
WARM_TEXT = PLAIN.replace("t;a;", "t;Wärme °C;")


def zipped(**members: str) -> bytes:
    """An archive of text files."""
    packed = io.BytesIO()
    with zipfile.ZipFile(packed, "w") as archive:
        for name, text in members.items():
            archive.writestr(f"{name}.csv", text)
    return packed.getvalue()


TABLES = [
    Case(1, "wide", {"1.csv": PLAIN}, samples=READ, lines=(4, 3, 1, 0), cells=THREE_USED),
    Case(
        2,
        "long",
        {"1.csv": "t,p,v\n" + LONG_ROWS},
        export=LONG,
        samples=READ,
        lines=(7, 6, 1, 0),
        cells=THREE_USED,
    ),
    Case(
        2,
        "long with a quality column and a point that nobody names",
        {"1.csv": "t,p,v,q\n" + LONG_ROWS.replace("\n", ",192\n") + "2026-07-01 00:02,z,9,192\n"},
        export=LONG,
        samples=READ,
        lines=(8, 7, 1, 0),
        cells=THREE_USED,
        found=[FindingCode.UNCLAIMED_COLUMN],
        said=["q"],
    ),
    Case(
        5,
        "preamble, heading and unit row, blank rows",
        {
            "1.csv": "Logger 7; serial 4711\nbegin;2026-07-01\n\n"
            + HEAD
            + ";[kW];(°C)\n\n"
            + ONE
            + "\n"
            + TWO
            + THREE
        },
        export={"units": {"a": "kW", "b": "degC"}},
        samples=READ,
        lines=(10, 3, 7, 0),
        cells=THREE_USED,
        said=["units of 2 columns agree with the plant file (line 5)"],
    ),
    Case(
        5,
        "heading again where files were joined",
        {"1.csv": HEAD + ONE + HEAD + TWO + HEAD + THREE},
        samples=READ,
        lines=(6, 3, 3, 0),
        cells=THREE_USED,
    ),
    Case(
        6,
        "footer with totals",
        {"1.csv": PLAIN + "\nTotal;9;12\nrows: 3\n"},
        samples=READ,
        lines=(7, 3, 4, 0),
        cells=THREE_USED,
        said=["Total;9;12"],
    ),
    Case(
        12,
        "separator at the end of every data line",
        {"1.csv": HEAD + (ONE + TWO + THREE).replace("\n", ";\n")},
        samples=READ,
        lines=(4, 3, 1, 0),
        cells=THREE_USED,
    ),
    Case(
        12,
        "remarks column with quoted separators and doubled quotes",
        {"1.csv": "t;remark;a;b\n" + REMARK + "2026-07-01 00:01;;3;4\n2026-07-01 00:02;x;5;6\n"},
        samples=READ,
        lines=(4, 3, 1, 0),
        cells=THREE_USED,
        found=[FindingCode.UNCLAIMED_COLUMN],
        said=["remark"],
    ),
    Case(
        12,
        "line break within a quoted remark",
        {"1.csv": "t;a;b;remark\n2026-07-01 00:00;1;2;ok\n" + BROKEN_REMARK + "2026-07-01 00:02;5;6;\n"},
        samples=[READ[0], READ[1], READ[2]],
        lines=(5, 3, 1, 1),
        cells=THREE_USED,
        found=[FindingCode.REJECTED_LINES, FindingCode.UNCLAIMED_COLUMN],
        said=["by hand"],
    ),
    Case(
        12,
        "open quote swallows no line",
        {"1.csv": HEAD + ONE + '2026-07-01 00:01;"3;4\n' + THREE},
        samples=READ,
        lines=(4, 3, 1, 0),
        cells=THREE_USED,
    ),
    Case(
        12,
        "short and long lines",
        {"1.csv": HEAD + ONE + "2026-07-01 00:01;3\n" + "2026-07-01 00:01;3;4;5;6\n" + THREE},
        samples=[READ[0], READ[2]],
        lines=(5, 2, 1, 2),
        cells=TWO_USED,
        found=[FindingCode.REJECTED_LINES],
        said=["2026-07-01 00:01;3"],
    ),
    Case(
        16,
        "columns in another order, another column between",
        {
            "1.csv": HEAD + ONE,
            "2.csv": "t;b;z;a\n2026-07-01 00:01;4;9;3\n",
            "3.csv": "t;b;a\n2026-07-01 00:02;6;5\n",
        },
        samples=READ,
        lines=(6, 3, 3, 0),
        cells=THREE_USED,
        found=[FindingCode.UNCLAIMED_COLUMN],
    ),
    Case(
        16,
        "a bound heading twice",
        {"1.csv": "t;a;b;a\n2026-07-01 00:00;1;2;3\n"},
        refused=True,
        said=["logs/1.csv:1", 'the heading "a" stands in columns 2 and 4'],
    ),
]

TEXTS = [
    Case(
        7,
        f"{name} between the columns",
        {"1.csv": PLAIN.replace(";", mark)},
        samples=READ,
        lines=(4, 3, 1, 0),
        cells=THREE_USED,
    )
    for name, mark in (("semicolon", ";"), ("comma", ","), ("tab", "\t"))
] + [
    Case(
        7,
        "decimal comma",
        {"1.csv": HEAD + "2026-07-01 00:00;1,25;-2,5\n2026-07-01 00:01;1.25,5;3\n"},
        export={"decimal": ","},
        samples=[(AT[0], 1.25, -2.5), (AT[1], None, 3.0)],
        cells={"a": {"used": 1, "unparseable": 1}, "b": {"used": 2}},
    ),
    Case(
        7,
        "groups of three that no declaration explains",
        {"1.csv": HEAD + "2026-07-01 00:00;1,25;-2,5\n2026-07-01 00:01;1.250,5;3\n"},
        export={"decimal": ","},
        refused=True,
        said=["logs/1.csv:3", '"1.250,5"', "thousands"],
    ),
    Case(
        7,
        "decimal comma where a point is declared",
        {"1.csv": HEAD + "2026-07-01 00:00;1,25;2\n"},
        refused=True,
        said=["logs/1.csv:2, column a", '"1,25"', 'set exports.x.decimal = ","'],
    ),
    *(
        Case(
            8,
            f"text in {encoding}",
            {"1.csv": WARM_TEXT.encode(encoding)},
            columns=WARM,
            samples=READ,
            lines=(4, 3, 1, 0),
            cells=THREE_USED,
            said=[shown],
        )
        for encoding, shown in (
            ("utf-8-sig", "UTF-8"),
            ("utf-16", "UTF-16"),
            ("latin-1", "Windows-1252"),
            ("utf-8", "UTF-8"),
        )
    ),
    *(
        Case(8, f"lines end in {name}", {"1.csv": text}, samples=READ, lines=(4, 3, 1, 0), cells=THREE_USED)
        for name, text in (
            ("carriage return", PLAIN.replace("\n", "\r")),
            ("both", PLAIN.replace("\n", "\r\n")),
            ("a mixture", HEAD.replace("\n", "\r\n") + ONE.replace("\n", "\r") + TWO + THREE),
        )
    ),
    Case(
        8,
        "zero bytes at the end of the file",
        {"1.csv": HEAD + ONE + TWO + "\0" * 300},
        samples=READ[:2],
        lines=(4, 2, 1, 1),
        cells=TWO_USED,
        found=[FindingCode.INCOMPLETE_LINE],
    ),
    Case(
        9,
        "last line broken off in a value",
        {"1.csv": HEAD + ONE + TWO + "2026-07-01 00:02;5"},
        samples=READ[:2],
        lines=(4, 2, 1, 1),
        cells=TWO_USED,
        found=[FindingCode.INCOMPLETE_LINE],
    ),
    Case(
        9,
        "last line broken off in its stamp",
        {"1.csv": HEAD + ONE + TWO + "2026-07-0"},
        samples=READ[:2],
        lines=(4, 2, 1, 1),
        cells=TWO_USED,
        found=[FindingCode.INCOMPLETE_LINE],
    ),
    Case(
        10,
        "empty file beside a whole one",
        {"1.csv": PLAIN, "2.csv": ""},
        samples=READ,
        cells=THREE_USED,
        found=[FindingCode.UNREADABLE_FILE],
        said=["empty file"],
    ),
    Case(
        10,
        "copy in progress",
        {"1.csv": PLAIN, "2.csv.part": PLAIN},
        samples=READ,
        cells=THREE_USED,
        found=[FindingCode.UNREADABLE_FILE],
        said=["unfinished copy"],
    ),
    Case(
        10,
        "archives",
        {"1.zip": zipped(one=HEAD + ONE, two=HEAD + TWO), "2.csv.gz": gzip.compress((HEAD + THREE).encode())},
        samples=READ,
        lines=(6, 3, 3, 0),
        cells=THREE_USED,
    ),
    Case(
        10,
        "archive broken off",
        {"1.csv": PLAIN, "2.csv.gz": gzip.compress(PLAIN.encode())[:-20]},
        samples=READ,
        cells=THREE_USED,
        found=[FindingCode.UNREADABLE_FILE],
    ),
    Case(
        10,
        "archive without files",
        {"1.csv": PLAIN, "2.zip": zipped()},
        samples=READ,
        cells=THREE_USED,
        found=[FindingCode.UNREADABLE_FILE],
        said=["could not be read: archive without files"],
    ),
    Case(
        11,
        "stamps turned into day numbers by a spreadsheet",
        {"1.csv": HEAD + "46204;1;2\n46204.000694;3;4\n"},
        refused=True,
        said=['"46204"', "exports.x.date_order"],
    ),
    Case(
        11,
        "day and month the other way round after the twelfth",
        {"1.csv": HEAD + "12/07/2026 00:00;1;2\n13/07/2026 00:00;3;4\n"},
        export={"date_order": "month first"},
        refused=True,
        said=["logs/1.csv:3, column t", '"13/07/2026 00:00"', '"day first"'],
    ),
    Case(
        11,
        "a day that is not in the calendar",
        {"1.csv": HEAD + ONE + "2026-02-31 00:01;3;4\n" + THREE},
        samples=[READ[0], READ[2]],
        lines=(4, 2, 1, 1),
        cells={"a": {"used": 2, "bad stamp": 1}, "b": {"used": 2, "bad stamp": 1}},
        found=[FindingCode.REJECTED_LINES],
        said=["2026-02-31 00:01"],
    ),
]

WORDS = ["Bad", "---", "?", "no comm", "N/A", "<0.5", ">100", "12.3 kW", "TRUE", ""]
CELLS = [
    Case(
        13,
        "texts in a column of numbers",
        {"1.csv": minutes("t;a;b", "1", *WORDS)},
        cells={
            "a": {"used": 1, "status word": 6, "unparseable": 3, "empty": 1},
            "b": {"used": 11},
        },
        lines=(12, 11, 1, 0),
        found=[FindingCode.STATUS_WORDS],
        said=["Bad", "---", "no comm", "TRUE"],
    ),
    Case(
        13,
        "words that stand for numbers and states by declaration",
        {"1.csv": HEAD + "2026-07-01 00:00;off;ON\n2026-07-01 00:01;2;OFF\n2026-07-01 00:02;OFF;??\n"},
        export={"status_words": {"off": 0.0}, "states": {"b": {"ON": "on", "OFF": "off"}}},
        samples=[(AT[0], 0.0, 0.0), (AT[1], 2.0, 1.0), (AT[2], None, None)],
        cells={"a": {"used": 2, "status word": 1}, "b": {"used": 2, "status word": 1}},
        found=[FindingCode.STATUS_WORDS] * 2,
        said=["OFF", "??"],
    ),
    Case(
        14,
        "sentinels, and a broken thermocouple out of range",
        {"1.csv": minutes("t;a;b", 20, -9999, "1e30", -200, 850, 3276.7, 21)},
        export={"sentinels": (-9999.0, 1e30, 3276.7)},
        tags={"a": {"believable": (-50.0, 400.0)}},
        cells={"a": {"used": 2, "sentinel": 3, "out of range": 2}, "b": {"used": 7}},
        found=[FindingCode.OUT_OF_RANGE],
        said=["-200", "850"],
    ),
]


@every(TABLES)
def test_shape_of_the_table(tmp_path: Path, case: Case) -> None:
    """Whatever its shape, an export gives the same samples, and no line is lost."""
    hold(tmp_path, case)


@every(TEXTS)
def test_text_of_the_file(tmp_path: Path, case: Case) -> None:
    """Delimiter, encoding, line ends, broken ends and spreadsheets change no sample unseen."""
    hold(tmp_path, case)


@every(CELLS)
def test_cells_that_are_no_plain_numbers(tmp_path: Path, case: Case) -> None:
    """Every cell is used or kept word for word under one disposition."""
    hold(tmp_path, case)
