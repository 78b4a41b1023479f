"""What becomes of a cell that is no plain number."""

from __future__ import annotations

from pathlib import Path

import pyarrow as pa
import pyarrow.csv as pacsv
import pytest
from log_reading_factory import make_export, read


@pytest.mark.parametrize(
    ("text", "decimal", "value", "disposition"),
    [
        ("12.5", ".", 12.5, None),
        ("12,5", ",", 12.5, None),
        (" +1e3 ", ".", 1000.0, None),
        ("1,5E-2", ",", 0.015, None),
        (".5", ".", 0.5, None),
        ("5,", ",", 5.0, None),
        ("", ".", None, "empty"),
        ("   ", ".", None, "empty"),
        ("Sensorfehler", ".", None, "status word"),
        (" no comm ", ".", None, "status word"),
        ("NaN", ".", None, "status word"),
        ("-inf", ".", None, "status word"),
        ("---", ".", None, "status word"),
        ("null", ".", None, "status word"),
        ("it's 'off'", ".", None, "status word"),
        ("12.3 kW", ".", None, "unparseable"),
        ("<0.5", ".", None, "unparseable"),
        ("1.2.3", ".", None, "unparseable"),
        ("1_000", ".", None, "unparseable"),
        ("0x1F", ".", None, "unparseable"),
        ("1e400", ".", None, "unparseable"),
        ("1d5", ".", None, "unparseable"),
        ("\u22125", ".", None, "unparseable"),
        ("1,234,5", ",", None, "unparseable"),
        ("1 23", ".", None, "unparseable"),
        ("5-", ".", None, "unparseable"),
        ("a\0b", ".", None, "status word"),
        ("=1+1", ".", None, "unparseable"),
    ],
)
def test_one_cell(
    tmp_path: Path, text: str, decimal: str, value: float | None, disposition: str | None
) -> None:
    """A cell is a number of the declared form, or is kept word for word under one disposition."""
    rows = f"t;a;b\n2026-07-01 00:00;{text};1\n2026-07-01 00:01;7;2\n"
    got = read(tmp_path, {"log.csv": rows}, make_export({"a": "a", "b": "b"}, decimal=decimal))
    assert got.values == [(value, 1.0), (7.0, 2.0)]
    assert got.rejects == ([] if disposition is None else [("a", disposition, 2, text)])


def test_words_are_verbatim_and_counted_in_any_encoding(tmp_path: Path) -> None:
    """Words with letters beyond ASCII come out as they stand, with their lines."""
    cells = ["1,5", "Störung", "2,5", "Störung", "gelöscht", "3"]
    rows = "\n".join(f"01.07.2026 00:0{place};{cell};{place}" for place, cell in enumerate(cells))
    content = f"Zeit;Leistung;n\n{rows}\n".encode("cp1252")
    declared = make_export({"p": "Leistung", "n": "n"}, date_order="day first", decimal=",")
    got = read(tmp_path, {"log.csv": content}, declared)
    assert got.rejects == [
        ("p", "status word", 3, "Störung"),
        ("p", "status word", 5, "Störung"),
        ("p", "status word", 6, "gelöscht"),
    ]
    assert [values[0] for values in got.values] == [1.5, None, 2.5, None, None, 3.0]


def test_column_with_a_new_word_in_every_cell(tmp_path: Path) -> None:
    """A column that writes its unit into every cell is counted cell by cell, the others are numbers."""
    rows = "\n".join(f"2026-07-01 00:{place:02},{place}.5 kW,{place}" for place in range(60))
    got = read(tmp_path, {"log.csv": f"t,a,b\n{rows}\n"}, make_export({"a": "a", "b": "b"}))
    assert got.rejected("a") == {"unparseable": 60}
    assert [values[1] for values in got.values] == [float(place) for place in range(60)]
    assert got.rejects[7] == ("a", "unparseable", 9, "7.5 kW")


def test_sentinels_and_words_for_numbers(tmp_path: Path) -> None:
    """Declared sentinels stand for no value, declared words for a number."""
    text = "t;a;b\n2026-07-01 00:00;-9999;off\n2026-07-01 00:01;888,8;OFF\n2026-07-01 00:02;-9999,0;2\n"
    declared = make_export(
        {"a": "a", "b": "b"}, decimal=",", sentinels=(-9999.0, 888.8), status_words={"off": 0.0}
    )
    got = read(tmp_path, {"log.csv": text}, declared)
    assert got.values == [(None, 0.0), (None, None), (None, 2.0)]
    assert got.rejected("a") == {"sentinel": 3}
    assert got.rejects[2] == ("b", "status word", 3, "OFF")


def test_states(tmp_path: Path) -> None:
    """A state is the index of its raw text in the order of the plant file; 1 and 1.0 are the same text."""
    text = "t,s\n" + "".join(
        f"2026-07-01 00:0{at},{cell}\n" for at, cell in enumerate(["1.0", "open", "0", "2", "??", ""])
    )
    declared = make_export({"s": "s"}, states={"s": {"0": "open", "1": "closed", "open": "open"}})
    got = read(tmp_path, {"log.csv": text}, declared)
    assert got.values == [(1.0,), (2.0,), (0.0,), (None,), (None,), (None,)]
    assert got.rejects == [("s", "status word", 5, "2"), ("s", "status word", 6, "??"), ("s", "empty", 7, "")]


def test_two_tags_may_bind_one_column(tmp_path: Path) -> None:
    """Two tags of one column hold the same numbers."""
    got = read(tmp_path, {"log.csv": "t,a\n2026-07-01 00:00,1\n"}, make_export({"a": "a", "b": "a"}))
    assert got.values == [(1.0, 1.0)]


def test_wording_that_learning_relies_on() -> None:
    """Words are taken from the parser's error text: this is the text of the installed parser."""
    options = pacsv.ConvertOptions(column_types={"c2": pa.float64()}, include_columns=["c2"])
    names = pacsv.ReadOptions(use_threads=False, column_names=["c0", "c1", "c2"])
    with pytest.raises(pa.ArrowInvalid) as caught:
        pacsv.read_csv(pa.BufferReader("x,y,it's 'St\u00f6rung'\n".encode()), names, convert_options=options)
    assert str(caught.value) == (
        "In CSV column #2: Row #1: CSV conversion error to double: invalid value 'it's 'St\u00f6rung''"
    )
