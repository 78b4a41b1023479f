"""Numbers as exports write them: grouped digits, units behind them, censored values, lost digits."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest
from log_reading_factory import Reading, make_export, read

from auditor.records.errors import PlantFileError
from auditor.records.findings import FindingCode
from auditor.records.plant import LongLayout, PairsLayout


def read_cells(folder: Path, cells: list[str], unit: str = "", **changes: object) -> Reading:
    """Read one column of cells, one a minute."""
    rows = "".join(f"2026-07-01 00:{at:02};{cell}\n" for at, cell in enumerate(cells))
    return read(folder, {"log.csv": "t;a\n" + rows}, make_export({"a": "a"}, units={"a": unit}, **changes))


@pytest.mark.parametrize(
    ("mark", "decimal", "cells", "values"),
    [
        pytest.param("space", ",", ["1 234,5", "12", "1 234 567"], [1234.5, 12, 1234567], id="blank"),
        pytest.param(
            "space", ".", ["1\u00a0234.5", "-2\u202f000", "3\u2009000"], [1234.5, -2000, 3000], id="no-break"
        ),
        pytest.param("'", ".", ["1'234.5", "2\u2019000", "7"], [1234.5, 2000, 7], id="apostrophe"),
        pytest.param(".", ",", ["1.234", "1.234,5", "999,25"], [1234, 1234.5, 999.25], id="point"),
        pytest.param(",", ".", ["1,234", "1,234.5", "+12,345,678"], [1234, 1234.5, 12345678], id="comma"),
    ],
)
def test_declared_groups(
    tmp_path: Path, mark: str, decimal: str, cells: list[str], values: list[float]
) -> None:
    """Thousands marks: digits grouped by threes with the declared mark are one number."""
    got = read_cells(tmp_path, cells, thousands=mark, decimal=decimal)
    assert got.values == [(float(value),) for value in values]


@pytest.mark.parametrize("cell", ["12,5", "1,2,3", "1,23", "1234,567", ",123", "1,234,56", "1.234,5"])
def test_groups_that_are_no_threes(tmp_path: Path, cell: str) -> None:
    """Thousands marks: anything but groups of three is no number, however a lenient reader would take it."""
    got = read_cells(tmp_path, ["1.5", cell], thousands=",", decimal=".")
    assert got.values == [(1.5,), (None,)]
    assert got.rejects == [("a", "unparseable", 3, cell)]


@pytest.mark.parametrize(
    ("cell", "decimal", "remedy"),
    [
        pytest.param("1.234", ",", 'exports.x.thousands = "."; if it is the decimal mark', id="point"),
        pytest.param("1,234", ".", 'exports.x.thousands = ","; if it is the decimal mark', id="comma"),
        pytest.param("1 234,5", ",", 'exports.x.thousands = "space"', id="blank"),
        pytest.param("1'234", ".", 'exports.x.thousands = "\'"', id="apostrophe"),
    ],
)
def test_undeclared_groups_are_undecidable(tmp_path: Path, cell: str, decimal: str, remedy: str) -> None:
    """Thousands marks: a number that may be grouped is never guessed at, whatever else the file proves."""
    with pytest.raises(PlantFileError) as caught:
        read_cells(tmp_path, [f"1{decimal}5", cell], decimal=decimal)
    assert f'logs/log.csv:3, column a: "{cell}" cannot be decided' in str(caught.value)
    assert remedy in str(caught.value)


def test_undeclared_groups_in_a_total_do_not_matter(tmp_path: Path) -> None:
    """Thousands marks: a line that is no data proves nothing."""
    got = read_cells(tmp_path, ["1,5"], decimal=",")
    text = (tmp_path / "log.csv").read_text() + "Sum 07-2026;1.234\n2026-07-01 00:09;2,5\n"
    got = read(tmp_path, {"log.csv": text}, make_export({"a": "a"}, decimal=","))
    assert got.values == [(1.5,), (2.5,)]


@pytest.mark.parametrize(
    ("unit", "cell", "value"),
    [
        ("kW", "12.3 kW", 12.3),
        ("kW", "12.3kW", 12.3),
        ("degC", "-4.5 °C", -4.5),
        ("%", "55 %", 55.0),
        ("kW", "12.3 MW", None),
        ("kW", "12.3 kWh", None),
        ("kW", "kW", None),
        ("", "12.3 kW", None),
    ],
)
def test_unit_behind_a_number(tmp_path: Path, unit: str, cell: str, value: float | None) -> None:
    """A unit behind a number is taken off if it is the declared one, and never converted."""
    assert read_cells(tmp_path, ["1.5", cell], unit=unit).values == [(1.5,), (value,)]


@pytest.mark.parametrize("cell", ["<0.5", ">100", "< 0.5", "<0.5 kW", "over range", "?"])
def test_censored_values(tmp_path: Path, cell: str) -> None:
    """A value beyond a limit is kept word for word, and is no value."""
    got = read_cells(tmp_path, ["1.5", cell], unit="kW")
    assert got.values == [(1.5,), (None,)]
    assert [reject[3] for reject in got.rejects] == [cell]


@pytest.mark.parametrize(
    ("cells", "resolution", "values"),
    [
        pytest.param(["1.23457E+06", "1234570"], None, [None, 1234570.0], id="tens unwritten"),
        pytest.param(["1.234567E+06", "1.2e3"], None, [1234567.0, None], id="enough digits"),
        pytest.param(["1.23457E+06", "1E+02"], 10.0, [1234570.0, None], id="coarse counter"),
        pytest.param(["1.234567E+06", "5"], 0.1, [None, 5.0], id="fine counter"),
    ],
)
@pytest.mark.parametrize("layout", ["wide", "long", "pairs"])
def test_counters_with_lost_digits(
    tmp_path: Path, layout: str, cells: list[str], resolution: float | None, values: list[float | None]
) -> None:
    """Scientific notation with lost digits: such readings of a counter are no numbers, others' are."""
    forms = {"wide": None, "long": LongLayout("t", "point", "a"), "pairs": PairsLayout()}
    export, tags = make_export({"a": "a", "b": "b"}, layout=forms[layout])
    tags["a"] = replace(tags["a"], between="counter", resolution=resolution)
    first, second = ("2026-07-01 00:00", "2026-07-01 00:01")
    text = {
        "wide": "t;a;b\n{0};{2};1.5E+06\n{1};{3};2\n",
        "long": "t;point;a\n{0};a;{2}\n{0};b;1.5E+06\n{1};a;{3}\n{1};b;2\n",
        "pairs": "t;a;t;b\n{0};{2};{0};1.5E+06\n{1};{3};{1};2\n",
    }[layout].format(first, second, *cells)
    got = read(tmp_path, {"log.csv": text}, (export, tags))
    assert got.values == list(zip(values, [1.5e6, 2.0], strict=True))
    (finding,) = got.note.findings
    lost = [cell for cell, value in zip(cells, values, strict=True) if value is None]
    assert (finding.code, finding.tag, finding.numbers["count"]) == (FindingCode.LOST_DIGITS, "a", 1)
    assert finding.words["first"] == lost[0]
    line = next(at for at, row in enumerate(text.splitlines(), start=1) if lost[0] in row)
    assert finding.line == line
    assert got.rejected("a") == {"unparseable": 1}
