"""Units of logs and plant files: factors of NIST, spellings of loggers, amounts and uncertainties."""

from __future__ import annotations

import csv
import math
import pickle
from decimal import Decimal
from pathlib import Path

import numpy as np
import pytest

from auditor.records.uncertain import Uncertainty
from auditor.units import (
    DISPLAY,
    SI_UNITS,
    UnitError,
    conversion,
    parse_quantity,
    parse_uncertainty,
    same_unit,
    split_qualifier,
    to_display,
    units_of,
)
from auditor.units.table import REFUSED, ROWS

DATA = Path(__file__).parent / "data" / "unit_check_values.csv"
CHECKS = list(csv.DictReader(DATA.read_text(encoding="utf-8").splitlines()))


@pytest.mark.parametrize("row", CHECKS, ids=lambda r: f"{r['raw']} {r['unit']} ({r['quantity']})")
def test_factors_are_those_of_the_standards(row: dict[str, str]) -> None:
    """Factors that are exact by definition agree to 1e-12, others to half their last printed digit."""
    si = conversion(row["unit"], quantity=row["quantity"]).to_si(float(row["raw"]))

    printed, exponent = float(row["printed"]), Decimal(row["printed"]).as_tuple().exponent
    assert isinstance(exponent, int)
    exact = row["how_known"] == "exact by definition"
    tolerance = 1e-12 * abs(printed) if exact else 0.5 * 10.0**exponent
    assert abs(si / float(row["to_si"]) - printed) <= tolerance


@pytest.mark.parametrize(("quantity", "expression", "words"), ROWS, ids=lambda w: str(w)[:30])
def test_every_spelling_is_understood_and_measures_what_it_says(
    quantity: str, expression: str, words: str
) -> None:
    """Each row of the table converts under its own kind of quantity, whichever spelling is used."""
    factors = {conversion(w.replace("_", " "), quantity=quantity) for w in words.split()}

    assert len(factors) == 1
    (factor,) = factors
    assert factor.si_unit == SI_UNITS[quantity] and factor.quantity == quantity
    assert math.isfinite(factor.scale) and factor.scale > 0.0
    assert factor.offset == 0.0 or quantity == "temperature"


@pytest.mark.parametrize(
    ("written", "plain"),
    [
        ("°C", "degC"), ("deg C", "degC"), ("℃", "degC"), ("º C", "degC"), ("C", "degC"),
        ("Â°C", "degC"), ("\ufffdC", "degC"), ("?C", "degC"), ("[°C]", "degC"), ("DEGC", "degC"),
        ("℉", "degF"), ("F", "degF"),
        ("m³/h", "m3/h"), ("m^3/hr", "m3/h"), ("mÂ³/h", "m3/h"), ("m3 h-1", "m3/h"), ("M3/H", "m3/h"),
        ("T/h", "t/h"), ("KW", "kW"), ("kw", "kW"), ("kWh\u00a0", "kWh"), ("KWH", "kWh"), ("(kW)", "kW"),
        ("kJ/kg·K", "kJ/(kg K)"), ("kJ/(kg*K)", "kJ/(kg K)"), ("kg/hr", "kg/h"), ("min⁻¹", "rpm"),
        ("kgf/cm²", "kgf/cm2"), ("MMBTU", "MMBtu"), ("% vol", "%"),
    ],
)  # fmt: skip
def test_spellings_of_loggers(written: str, plain: str) -> None:
    """What loggers and wrong encodings make of a unit is still that unit."""
    assert conversion(written) == conversion(plain)
    assert same_unit(written, plain)


@pytest.mark.parametrize(
    ("one", "other"),
    [
        ("Nm3/h", "m3/h"), ("Sm3/h", "Nm3/h"), ("bar(g)", "bar"), ("bara", "barg"), ("kW", "kWh"),
        ("MW", "mW"), ("degC", "degF"), ("kW", "MW"), ("m3", "m3/h"), ("furlong", "kW"),
        ("hPa", "kPa"), ("degC", "K"), ("K", "degF"), ("fathom", "furlong"), ("%", "1"),
    ],
)  # fmt: skip
def test_different_units_are_not_the_same(one: str, other: str) -> None:
    """A reference state, a gauge, a prefix or an hour more is another unit."""
    assert not same_unit(one, other)
    assert not same_unit(other, one)


def test_units_that_nobody_knows_are_compared_as_text() -> None:
    """Two unknown texts are the same but for case, blanks and brackets."""
    assert same_unit("[Furlong]", "furlong")
    assert same_unit("mbar", "hPa") and same_unit("bar(g)", "bar g") and same_unit("Nm³", "m3(n)")


@pytest.mark.parametrize(
    ("written", "unit", "qualifier"),
    [
        ("barg", "bar", "gauge"), ("bar(g)", "bar", "gauge"), ("kPa.g", "kPa", "gauge"),
        ("psig", "psi", "gauge"), ("barü", "bar", "gauge"), ("mbar abs", "mbar", "absolute"),
        ("psia", "psi", "absolute"), ("Nm³/h", "m3/h", "normal state"), ("NM3/H", "m3/h", "normal state"),
        ("m3(n)/h", "m3/h", "normal state"), ("m_n³", "m3", "normal state"),
        ("Nl/min", "l/min", "normal state"),
        ("kWh/Nm3", "kWh/m3", "normal state"), ("Sm3", "m3", "standard state"),
        ("scfm", "cfm", "standard state"), ("bar", "bar", None), ("N m", "Nm", None),
    ],
)  # fmt: skip
def test_what_a_unit_text_says_beyond_its_unit(written: str, unit: str, qualifier: str | None) -> None:
    """Gauge, absolute and reference states are split off, newton metres are left alone."""
    assert split_qualifier(written) == (unit, qualifier)
    if qualifier:
        with pytest.raises(UnitError, match=qualifier) as refusal:
            conversion(written)
        assert same_unit(refusal.value.suggestions[0], unit)


def test_gauge_is_told_where_to_go() -> None:
    """The message for a gauge unit is the line to write."""
    with pytest.raises(UnitError) as refusal:
        conversion("bar(g)", quantity="pressure")

    assert 'pressure = "gauge"' in str(refusal.value) and refusal.value.suggestions == ("bar",)


@pytest.mark.parametrize(
    ("text", "suggested"),
    [
        ("MBtu", "MMBtu"), ("MBTU", "kBtu"), ("mW", "MW"), ("mw", "MW"), ("mwh", "MWh"), ("hp", "PS"),
        ("gpm", "US gpm"), ("ton", "t"), ("therm", "therm (EC)"), ("mpa", "MPa"), ("MBAR", "mbar"),
        ("kilowat", "kW"), ("m\ufffd/h", "m3/h"), ("c", "degC"), ("kWhh", "kWh"), ("", "1"), ("  ", "1"),
    ],
)  # fmt: skip
def test_unknown_or_ambiguous_units_name_what_to_write(text: str, suggested: str) -> None:
    """Nothing is guessed: the refusal shows the nearest spelling and does not use it."""
    with pytest.raises(UnitError) as refusal:
        conversion(text)

    assert suggested in refusal.value.suggestions
    assert refusal.value.text == text and f'"{suggested}"' in str(refusal.value)


def test_every_refusal_leads_to_something_that_is_understood() -> None:
    """The units that a refusal suggests are themselves accepted."""
    for text, (_, suggestions) in REFUSED.items():
        with pytest.raises(UnitError):
            conversion(text)
        for suggestion in suggestions:
            conversion(suggestion)


def test_a_unit_of_another_quantity_is_refused_with_units_of_the_right_one() -> None:
    """Bars are no power, and the message names units of power."""
    with pytest.raises(UnitError, match="is a unit of pressure, but one of power is needed") as refusal:
        conversion("bar", quantity="power")

    assert set(refusal.value.suggestions) <= set(units_of("power"))
    with pytest.raises(ValueError, match="no such kind of quantity"):
        conversion("bar", quantity="presure")


def test_temperatures_and_their_differences_are_two_quantities() -> None:
    """9 degF and 5 degC as differences are 5 K each; as temperatures they are not."""
    fahrenheit, celsius = conversion("degF"), conversion("degC")

    assert fahrenheit.to_si(14.0) == pytest.approx(263.15, rel=1e-14)
    assert fahrenheit.difference_to_si(9.0) == pytest.approx(5.0, rel=1e-14)
    assert conversion("degF", quantity="temperature difference").to_si(9.0) == pytest.approx(5.0)
    assert celsius.difference_to_si(5.0) == 5.0
    assert conversion("K").to_si(5.0) == 5.0
    readings = celsius.to_si([0.0, np.nan, 100.0])
    np.testing.assert_array_equal(readings, [273.15, np.nan, 373.15])
    # The spread of readings in degF is the spread in kelvin over 1.8, whatever the offset.
    spread = np.std(fahrenheit.to_si([50.0, 59.0, 68.0]))
    assert spread == pytest.approx(np.std([50.0, 59.0, 68.0]) / 1.8)


@pytest.mark.parametrize(
    ("text", "quantity", "expected"),
    [
        ("5 K", "temperature difference", 5.0), ("5 degC", "temperature difference", 5.0),
        ("25 degC", "temperature", 298.15), ("-40 °F", "temperature", 233.15), ("85m", "length", 85.0),
        ("-40 m", "length", -40.0), ("30 min", "time", 1800.0), ("60 min", "time", 3600.0),
        ("2 h", "time", 7200.0), ("1200 kW", "power", 1.2e6), ("2 % of 1200 kW", "power", 24e3),
        ("5% of 1000 kW", "power", 50e3), ("10.10 kWh/m3", "heating value by volume", 36.36e6),
        ("9.6 m3/m3", "volume ratio", 9.6), ("0.78 kg/m3", "density", 0.78), ("30 %", "fraction", 0.3),
        ("1.10 kJ/(kg K)", "heat capacity", 1100.0), ("1e-3 1/K", "volume expansion", 1e-3),
        ("101.325 kPa", "pressure", 101_325.0), ("9999999 kWh", "energy", 9999999 * 3.6e6),
        ("400 m3/h", "volume flow", 400 / 3600), ("0.5 m3/h", None, 0.5 / 3600), (".5 kg/s", None, 0.5),
        ("2 % of 20 degC", "temperature", 0.4), ("0.02 bar", None, 2000.0),
    ],
)  # fmt: skip
def test_amounts_with_their_unit(text: str, quantity: str | None, expected: float) -> None:
    """A number with a unit is read into SI."""
    parsed = parse_quantity(text, quantity=quantity)

    assert parsed.value_si == pytest.approx(expected, rel=1e-13)


@pytest.mark.parametrize(
    ("text", "quantity", "message"),
    [
        ("10,5 kW", "power", "decimal comma"), ("1,200 kW", "power", "decimal comma"),
        ("1 200 kW", "power", "more than one number"), ("85", "length", 'no unit; write "85 m"'),
        ("kW", "power", "does not begin with a number"), ("", "power", "does not begin"),
        ("nan kW", "power", "does not begin"), ("inf kW", "power", "does not begin"),
        ("5 K", "power", "a unit of temperature"), ("0.10 bar(g)", "pressure", "gauge"),
        ("2 % of kW", "power", "does not begin"), ("5 furlong", "length", "not a known unit"),
        (5, "length", "needs a unit and therefore quotes"), ("5 5 kW", "power", "more than one number"),
        ("2 % of 1200 kWh", "power", "a unit of energy"), ("--5 kW", "power", "does not begin"),
        ("1e999 kW", "power", "too large"),
    ],
)  # fmt: skip
def test_amounts_that_are_not_understood(text: str, quantity: str, message: str) -> None:
    """Commas, blanks, bare numbers, missing numbers and foreign units are refused, each by its name."""
    with pytest.raises(UnitError) as refusal:
        parse_quantity(text, quantity=quantity)

    assert message in str(refusal.value)


@pytest.mark.parametrize(
    ("amount", "unit", "quantity", "absolute", "relative"),
    [
        (0.2, "%", "fraction", 0.002, 0.0),
        (0.5, "degC", "temperature", 0.5, 0.0),
        ("0.9 degF", "degC", "temperature", 0.5, 0.0),
        (9, "degF", "temperature", 5.0, 0.0),
        ("3 K", "degC", "temperature", 3.0, 0.0),
        ("0.5", "degC", "temperature", 0.5, 0.0),
        ("0.5 % of 200 degC", "degC", "temperature", 1.0, 0.0),
        ("3 %", "kg/s", "mass flow", 0.0, 0.03),
        ("3 % of reading", "kg/s", "mass flow", 0.0, 0.03),
        ("1 % of reading", "%", "fraction", 0.0, 0.01),
        ("2 % of 1200 kW", "kW", "power", 24e3, 0.0),
        ("0.002 bar", "bar", "pressure", 200.0, 0.0),
        (["0.5 %", "1 % of 300 kW", 4], "kW", "power", 5e3, 0.005),
        (["3 %", "4 %"], "kW", "power", 0.0, 0.05),
        (0, "kW", "power", 0.0, 0.0),
    ],
)  # fmt: skip
def test_uncertainties(amount: object, unit: str, quantity: str, absolute: float, relative: float) -> None:
    """Bare numbers in the value's unit, units, shares of reading and span, lists in quadrature."""
    read = {
        kind: parse_uncertainty(amount, kind=kind, unit_text=unit, quantity=quantity)
        for kind in ("standard", "limit")
    }

    assert read["standard"].absolute == pytest.approx(absolute, rel=1e-12)
    assert read["standard"].relative == pytest.approx(relative, rel=1e-12)
    assert read["limit"].absolute == pytest.approx(absolute / math.sqrt(3.0), rel=1e-12)
    assert read["limit"].relative == pytest.approx(relative / math.sqrt(3.0), rel=1e-12)


def test_declared_words_of_an_uncertainty_are_kept() -> None:
    """The report can say what the plant file said."""
    read = parse_uncertainty(["0.5 %", 4], kind="limit", unit_text="kW", quantity="power")

    assert isinstance(read, Uncertainty)
    assert read.declared == "limit 0.5 % and 4 kW"


@pytest.mark.parametrize(
    ("amount", "unit", "quantity", "message"),
    [
        (-1, "kW", "power", "cannot be an uncertainty"), ("-1 %", "kW", "power", "cannot be"),
        (math.nan, "kW", "power", "cannot be"), (math.inf, "kW", "power", "cannot be"),
        ("2 %", "degC", "temperature", "depends on its scale"),
        ("2 %", "%", "fraction", "may be points or a share of the reading"),
        ("1 bar", "kW", "power", "a unit of pressure"), ([], "kW", "power", "empty list"),
        (True, "kW", "power", "neither a number nor a text"), ("0,5 %", "kW", "power", "decimal comma"),
        ("2 % of 5 bar", "kW", "power", "a unit of pressure"), ("two", "kW", "power", "begin with a number"),
    ],
)  # fmt: skip
def test_uncertainties_that_are_refused(amount: object, unit: str, quantity: str, message: str) -> None:
    """Negative, endless, ambiguous or foreign amounts are refused by name."""
    with pytest.raises(UnitError) as refusal:
        parse_uncertainty(amount, kind="standard", unit_text=unit, quantity=quantity)

    assert message in str(refusal.value)


def test_a_unit_error_survives_pickling() -> None:
    """Processes hand it on with its fields."""
    error = UnitError("kilowat", "is not a known unit", ("kW",))

    again = pickle.loads(pickle.dumps(error))

    assert (again.text, again.reason, again.suggestions) == (error.text, error.reason, ("kW",))
    assert str(again) == '"kilowat" is not a known unit; write "kW"'


@pytest.mark.parametrize("quantity", SI_UNITS)
def test_report_units_are_the_units_that_are_read(quantity: str) -> None:
    """What the report shows under a label reads back, by the same label, as the same SI value."""
    unit = DISPLAY[quantity]
    si = np.array([0.25, 1234.5, np.nan])

    back = conversion(unit.label, quantity=quantity).to_si(to_display(si, quantity))

    np.testing.assert_allclose(back, si, rtol=1e-12)
