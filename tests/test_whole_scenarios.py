"""Known traps of the trade, from export files to the published statement, with numbers worked by hand."""

from __future__ import annotations

import math
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from site_factory import (
    GAS_ENGINE,
    HEAT_ENGINE,
    POWER_TAG,
    TWO_EXPORTS,
    Layout,
    audited,
    changed,
    digests,
    export,
    figures,
    findings,
    instants,
    intervals,
    one_day,
    run,
    site,
    statement,
)

DAY = "2025-06-03"
WHOLE_DAY = instants(DAY, "2025-06-04")
FULL_LOAD = {"G": 250.0, "P": 1000.0, "F": 16.25, "S": 90.0, "R": 70.0}
"""2500 kW of fuel (lower), 1000 kW of power, 16.25 kg/s x 4 kJ/(kg K) x 20 K = 1300 kW of heat."""


def only(values: np.ndarray) -> Any:
    """The one value that all intervals have."""
    assert (values == values[0]).all(), values
    return values[0]


# --- heating value: the two bases of one fuel


@pytest.mark.parametrize(
    ("basis", "fuel_kWh", "gross", "total"),
    [("lower", 60_000.0, 40.0, 92.0), ("higher", 66_360.0, 36.2, 83.2)],
)
def test_heating_value_basis(tmp_path: Path, basis: str, fuel_kWh: float, gross: float, total: float) -> None:
    """Own working: 250 m3/h x 10.00 = 2500 kW, x 11.06 = 2765 kW; 1000 and 2300 kW over these.

    Uncertainty by hand: sqrt(1 %**2 + 0.4 %**2 + 0.5 %**2) = 1.187 %, k = 2.
    """
    plant = changed(GAS_ENGINE, ('heating_value = "lower"', f'heating_value = "{basis}"'))
    out = audited(tmp_path, plant, {"plant/a.csv": export(WHOLE_DAY, FULL_LOAD)}, *one_day(DAY))
    found = figures(out)
    assert found["fuel_in_kWh"]["value"] == pytest.approx(fuel_kWh, rel=1e-9)
    assert found["fuel_in_higher_kWh"]["value"] == pytest.approx(66_360.0, rel=1e-9)
    assert found["gross_pct"]["value"] == pytest.approx(gross, abs=0.05)
    assert found["total_pct"]["value"] == pytest.approx(total, abs=0.05)
    assert found["gross_pct"]["basis"] == f"{basis} heating value"
    relative = math.sqrt(0.01**2 + 0.004**2 + 0.005**2)
    assert found["gross_pct"]["U"] == pytest.approx(2.0 * relative * found["gross_pct"]["value"], rel=1e-3)
    assert found["gross_pct"]["status"] == "firm" and found["gross_pct"]["coverage_pct"] == 100.0
    assert only(intervals(out)["verdict"]) == "credible"


def test_without_a_basis_nothing_is_published(tmp_path: Path) -> None:
    """Exit 2, the key is named, and no output appears."""
    plant = changed(GAS_ENGINE, ('heating_value = "lower"\n', ""))
    place = site(tmp_path / "site", plant, {"plant/a.csv": export(WHOLE_DAY, FULL_LOAD)})
    done = run("audit", place, *one_day(DAY))
    assert done.code == 2 and "heating_value" in done.err and done.out == ""
    assert not list(place.rglob("*.html")) and not list(place.rglob("*.json"))


# --- gas volume: gauge or absolute, altitude, reference state

SEA_LEVEL = 'altitude = "0 m"\nair_pressure = { from = "altitude", standard = "0.9 kPa" }'
GAS_STATE = """\
tags.pressure = { column = "PG", unit = "bar", pressure = "gauge", between = "step", hold = "1 min", standard = 0.002 }
tags.warmth = { column = "TG", unit = "degC", between = "step", hold = "1 min", standard = "0.3 K" }
"""  # noqa: E501
BOILER = changed(
    GAS_ENGINE,
    ('zone = "UTC"', f'zone = "UTC"\n{SEA_LEVEL}'),
    (POWER_TAG, GAS_STATE),
    (
        'reads = "already at the fuel\'s state"',
        'reads = "operating volume"\npressure = "pressure"\ntemperature = "warmth"\n'
        "compressibility_ratio = { value = 1.0, standard = 0.001 }",
    ),
    ('kind = "gas engine"', 'kind = "boiler"'),
    ('headline = "gross"\nrated_power = "1000 kW"\nminimum_load = "30 %"\n', ""),
    ('ceiling = { kind = "fuel exergy" }\n', ""),
    (
        'streams.power = { role = "work out", by = "power", tag = "power", '
        'measured_at = "generator terminals" }\n',
        "",
    ),
)
BURNING = {"G": 100.0, "F": 14.375, "S": 90.0, "R": 70.0, "PG": 0.35, "TG": 15.0}
"""100 m3/h at the meter; 14.375 x 4 x 20 = 1150 kW of heat."""


@pytest.mark.parametrize(
    ("edits", "volume_m3_per_h", "relative", "verdict", "code"),
    [
        ((), 127.54, 5e-5, "no ceiling", 0),
        ((('pressure = "gauge"', 'pressure = "absolute"'),), 32.74, 2e-4, "impossible", 4),
        ((('altitude = "0 m"', 'altitude = "500 m"'),), 122.00, 1e-3, "no ceiling", 0),
        ((('"0 degC, 101', '"15 degC, 101'),), 127.54 * 1.0549, 1e-4, "no ceiling", 0),
    ],
    ids=["gauge", "taken for absolute", "at 500 m", "15 degC reference"],
)  # fmt: skip
def test_gas_pressure_and_reference_state(
    tmp_path: Path, edits: Any, volume_m3_per_h: float, relative: float, verdict: str, code: int
) -> None:
    """Own working, ideal gas: 100 x (1.36325/1.01325) x (273.15/288.15) = 127.54 m3/h.

    Read as absolute 32.74 (3.895 times less): 1150 kW of heat from 362 kW of fuel cannot be. At 500 m the
    air has 0.954 bar (ISO 2533): 122.00. A 15 degC reference mistaken for 0 degC: 288.15/273.15 = +5.49 %.
    """
    files = {"plant/a.csv": export(WHOLE_DAY, BURNING)}
    out = audited(tmp_path, changed(BOILER, *edits), files, *one_day(DAY), expect=code)
    found = figures(out)
    assert found["fuel_in_kWh"]["value"] == pytest.approx(volume_m3_per_h * 10.0 * 24.0, rel=relative)
    assert found["heat_pct"]["value"] == pytest.approx(100 * 1150 / (10 * volume_m3_per_h), rel=relative)
    table = intervals(out)
    assert only(table["verdict"]) == verdict
    assert ("more energy out than in" in only(table["reasons"])) is (verdict == "impossible")


# --- clock change


def local_day(first: str, last: str) -> bytes:
    """Minutes of a logger on local clock."""
    zone = "Europe/Copenhagen"
    return export(instants(first, last, clock=zone), FULL_LOAD, Layout(clock=zone))


CHANGING = changed(
    GAS_ENGINE,
    ('zone = "UTC"', 'zone = "Europe/Copenhagen"'),
    ('clock = "UTC"', 'clock = "Europe/Copenhagen"'),
)


@pytest.mark.parametrize(
    ("day", "first", "last", "hours"),
    [
        ("2025-10-26", "2025-10-25T23:50", "2025-10-27T00:10", 25),
        ("2025-03-30", "2025-03-29T23:50", "2025-03-31T00:10", 23),
    ],
)
def test_days_of_a_clock_change(tmp_path: Path, day: str, first: str, last: str, hours: int) -> None:
    """Constant 1000 and 2500 kW: 25 h give 25 000 and 62 500 kWh, 23 h give 23 000 and 57 500 kWh.

    Dropping the repeated stamps would give 24 000 kWh; taking the missing hour for a gap 95.8 % coverage.
    """
    out = audited(tmp_path, CHANGING, {"plant/a.csv": local_day(first, last)}, *one_day(day))
    found, table = figures(out), intervals(out)
    assert statement(out)["period"]["hours"] == hours
    assert found["work_gross_kWh"]["value"] == pytest.approx(hours * 1000.0, rel=1e-9)
    assert found["fuel_in_kWh"]["value"] == pytest.approx(hours * 2500.0, rel=1e-9)
    assert found["gross_pct"]["coverage_pct"] == 100.0
    assert table["start"].size == 4 * hours and (table["coverage_pct"] == 100.0).all()
    assert only(table["verdict"]) == "credible"
    assert findings(out) == []
    told = "repeated hour: both passes told apart" in (out / "report.html").read_text(encoding="utf-8")
    assert told is (hours == 25)


def test_months_of_a_clock_change_have_743_and_745_hours(tmp_path: Path) -> None:
    """31 days less or plus one hour; one logged day carries no month, which is then provisional.

    The hour logged in November says that October is over.
    """
    files = {
        "plant/march.csv": local_day("2025-03-29T23:50", "2025-03-31T00:10"),
        "plant/october.csv": local_day("2025-10-25T23:50", "2025-10-27T00:10"),
        "plant/november.csv": local_day("2025-11-02T00:00", "2025-11-02T01:00"),
    }
    place = site(tmp_path / "site", CHANGING, files)
    for month, hours in (("2025-03", 743.0), ("2025-10", 745.0)):
        assert run("audit", place, "--month", month, "--out", tmp_path / month, "--quiet").code == 6
        assert statement(tmp_path / month)["period"]["hours"] == hours
        gross = figures(tmp_path / month)["gross_pct"]
        assert gross["status"] == "withheld" and gross["value"] is None


# --- storage by exception


@pytest.mark.parametrize(
    ("between", "first_hour_kW", "energy_kWh"),
    [
        ("step", 54_000 / 60, 900.0 + 0.0 + 22 * 1000.0),
        ("line", 48_200 / 60, 48_200 / 60 + 250.0 + 22 * 1000.0),
    ],
)
def test_exception_storage(tmp_path: Path, between: str, first_hour_kW: float, energy_kWh: float) -> None:
    """Stored 1000 at 00:00, then 800/600/400/200/0 at 00:50/52/54/56/58, 0 until 01:30, 1000 from 02:00.

    Step: (1000x50 + 800x2 + 600x2 + 400x2 + 200x2)/60 = 900.0 kW. Line: (900x50 + 700x2 + 500x2 + 300x2 +
    100x2)/60 = 803.3 kW, and 0 to 1000 in the last half of the second hour. The mean of the rows, 500 kW,
    appears nowhere.
    """
    seconds = instants(DAY, "2025-06-04T00:01")
    power = np.full(seconds.size, np.nan)
    stored = {0: 1000.0, 50: 800.0, 52: 600.0, 54: 400.0, 56: 200.0, 58: 0.0, 60: 0.0, 90: 0.0}
    stored |= {minute: 1000.0 for minute in range(120, 1441, 30)}
    power[list(stored)] = list(stored.values())
    plant = changed(
        GAS_ENGINE,
        ('column = "P", unit = "kW", between = "step", hold = "1 min"',
         f'column = "P", unit = "kW", between = "{between}", hold = "60 min", deadband = "150 kW"'),
        ('interval = "15 min"', 'interval = "1 h"'),
    )  # fmt: skip
    files = {"plant/a.csv": export(seconds, FULL_LOAD | {"P": power})}
    out = audited(tmp_path, plant, files, *one_day(DAY))
    table = intervals(out)
    assert table["work_gross_kW"].size == 24
    assert table["work_gross_kW"][0] == pytest.approx(first_hour_kW, rel=1e-9)
    assert not np.isclose(table["work_gross_kW"], 500.0).any()
    assert figures(out)["work_gross_kWh"]["value"] == pytest.approx(energy_kWh, rel=1e-9)
    assert table["verdict"][1] == "low load"


# --- low load


def test_low_load_keeps_its_energy(tmp_path: Path) -> None:
    """20 h at 1000/2500 kW and 4 h at 200/800 kW: 20 800/53 200 = 39.10 %, not the mean of hours 37.5 %.

    The 4 h are not judged (3.8 % of the output); above minimum load the efficiency is 40.0 %.
    """
    late = np.arange(WHOLE_DAY.size) >= 20 * 60
    gas = np.where(late, 80.0, 250.0)
    load = {"G": gas, "P": np.where(late, 200.0, 1000.0), "F": 0.065 * gas, "S": 90.0, "R": 70.0}
    out = audited(tmp_path, GAS_ENGINE, {"plant/a.csv": export(WHOLE_DAY, load)}, *one_day(DAY))
    found, table = figures(out), intervals(out)
    assert found["work_gross_kWh"]["value"] == pytest.approx(20_800.0, rel=1e-9)
    assert found["fuel_in_kWh"]["value"] == pytest.approx(53_200.0, rel=1e-9)
    assert found["gross_pct"]["value"] == pytest.approx(39.10, abs=0.005)
    hours = statement(out)["machines"]["engine"]["hours_by_verdict"]
    assert hours["low load"] == 4.0 and hours["credible"] == 20.0
    low = table["verdict"] == "low load"
    assert table["gross_pct"][~low] == pytest.approx(40.0, rel=1e-9)
    assert table["gross_pct"][low] == pytest.approx(25.0, rel=1e-9)
    assert table["work_gross_kW"][low].sum() / table["work_gross_kW"].sum() == pytest.approx(0.038, abs=5e-4)


# --- finite source, kelvin, uncertainty

AIR = {"M": 1000.0 / 180.0, "T1": 300.0, "T2": 120.0, "P": 420.0, "A": 29_000.0, "A1": 24.99, "A2": 25.01}
"""1000 kW from air cooled from 300 to 120 degC, 420 kW of work, 580 kW to a sink that stays at 25 degC."""
RESERVOIRS = ('kind = "finite source and sink"', 'kind = "two reservoirs"')


@pytest.mark.parametrize(
    ("kind", "ceiling", "verdict", "code"),
    [("two reservoirs", 47.98, "credible", 0), ("finite source and sink", 37.56, "impossible", 4)],
)
def test_finite_source_in_kelvin(tmp_path: Path, kind: str, ceiling: float, verdict: str, code: int) -> None:
    """Own working: 1 - 298.15/573.15 = 47.98 %; 180/ln(573.15/393.15) = 477.5 K gives 37.56 %.

    42 % with U = 1 % (0.5 % of power, 1.0804 % of flow, k = 2) passes the first and breaks the second.
    Temperatures in degC would have given 1 - 25/300 = 91.7 %.
    """
    edits = [('"1 %"', '"1.0804 %"')]
    if kind == "two reservoirs":
        edits.append(RESERVOIRS)
    plant, files = changed(HEAT_ENGINE, *edits), {"plant/a.csv": export(WHOLE_DAY, AIR)}
    out = audited(tmp_path, plant, files, *one_day(DAY), expect=code)
    table, found = intervals(out), figures(out)
    assert only(table["ceiling_kind"]) == kind
    assert found["gross_pct"]["value"] == pytest.approx(42.0, rel=1e-9)
    assert found["gross_pct"]["U"] == pytest.approx(1.0, abs=0.002)
    assert found["ceiling_pct"]["value"] == pytest.approx(ceiling, abs=0.006)
    assert table["margin_pct"] == pytest.approx(42.0 - ceiling, abs=0.006)
    assert table["margin_U_pct"] == pytest.approx(1.0, abs=0.002)
    assert only(table["verdict"]) == verdict
    assert ("over ceiling beyond U" in only(table["reasons"])) is (verdict == "impossible")


@pytest.mark.parametrize(
    ("heat_kW", "gross", "U", "verdict", "code"),
    [(2400.0, 41.67, 2.53, "over ceiling, unproven", 0), (2200.0, 45.45, 2.76, "impossible", 4)],
)
def test_a_ceiling_is_broken_only_beyond_uncertainty(
    tmp_path: Path, heat_kW: float, gross: float, U: float, verdict: str, code: int
) -> None:
    """Oil 275 to 185 degC, air 15 to 32 degC: 1 - 296.57/501.8 = 40.9 %.

    1000 kW +- 1 % over 2400 kW +- 6 %: 41.67 +- sqrt(1 + 36) % = 2.53 points; 39.13 is below 40.9. Over
    2200 kW 45.45 +- 2.76, and 42.69 is above.
    """
    plant = changed(
        HEAT_ENGINE,
        ('hold = "1 min", standard = "1 %"', 'hold = "1 min", standard = "3 %"'),
    )
    columns = {"M": heat_kW / 90.0, "T1": 275.0, "T2": 185.0, "P": 1000.0}
    columns |= {"A": (heat_kW - 1000.0) / 17.0, "A1": 15.0, "A2": 32.0}
    out = audited(tmp_path, plant, {"plant/a.csv": export(WHOLE_DAY, columns)}, *one_day(DAY), expect=code)
    found, table = figures(out), intervals(out)
    assert found["ceiling_pct"]["value"] == pytest.approx(40.9, abs=0.01)
    assert found["gross_pct"]["value"] == pytest.approx(gross, abs=0.005)
    assert found["gross_pct"]["U"] == pytest.approx(U, abs=0.01)
    assert table["margin_U_pct"] == pytest.approx(U, abs=0.01)
    assert only(table["verdict"]) == verdict
    assert statement(out)["machines"]["engine"]["impossible_period"] is (verdict == "impossible")


def test_a_thermometer_of_both_efficiency_and_ceiling_counts_once_in_the_margin(tmp_path: Path) -> None:
    """A source of 275 +- 1 K: were it hotter, the efficiency would be lower and the ceiling higher.

    By hand: ceiling 1 - 288.15/548.15 = 47.43 %, efficiency 48.61 %, so 1.18 points above. The efficiency
    moves by 48.61/90 = 0.540 points per kelvin, the ceiling by 288.15/548.15**2 = 0.096: U of the efficiency
    1.080, of the margin 2 x (0.540 + 0.096) = 1.272 points. Over the ceiling, but not beyond U.
    """
    exact = ("0.5 %", "0.0001 %")
    plant = changed(
        HEAT_ENGINE, RESERVOIRS, exact, ('"1 %"', '"0.0001 %"'),
        ('700], standard = "0.000001 K" }\ntags.cold', '700], standard = "1 K" }\ntags.cold'),
    )  # fmt: skip
    efficiency = 1.0 - 288.15 / 548.15 + 0.0118
    columns = {"M": 1000.0 / 90.0, "T1": 275.0, "T2": 185.0, "P": 1000.0 * efficiency}
    columns |= {"A": 1000.0 * (1.0 - efficiency) / 17.0, "A1": 15.0, "A2": 32.0}
    out = audited(tmp_path, plant, {"plant/a.csv": export(WHOLE_DAY, columns)}, *one_day(DAY))
    table = intervals(out)
    assert table["margin_pct"] == pytest.approx(1.18, abs=1e-6)
    assert table["gross_U_pct"] == pytest.approx(1.080, abs=0.001)
    assert table["margin_U_pct"] == pytest.approx(1.272, abs=0.001)
    assert only(table["verdict"]) == "over ceiling, unproven"


# --- counters


@pytest.mark.parametrize(
    ("full_scale", "readings", "energy_kWh", "noon_kW"),
    [
        ('full_scale = "100000 kWh", ', (99_990.0, 12.0, 262.0), 48 * 250 + 22 + 47 * 250, (88.0, 1000.0)),
        ('full_scale = "100000 kWh", ', (45_231.0, 3.0, 253.0), 95 * 250, (math.nan, 1000.0)),
        ("", (45_231.0, 3.0, 253.0), 95 * 250, (math.nan, 1000.0)),
        ("", (45_231.0, 4_523.0, 45_481.0), 95 * 250, (500.0, 500.0)),
    ],
    ids=["rolls over", "reset", "reset, no full scale", "one bad reading"],
)
def test_counters(
    tmp_path: Path,
    full_scale: str,
    readings: tuple[float, float, float],
    energy_kWh: float,
    noon_kW: tuple[float, float],
) -> None:
    """Quarter-hours of 250 kWh but for noon; rated 1200 kW, so no step may exceed 1.1 x 300 kWh.

    99 990 to 12 is 22 kWh. 45 231 to 3 would be 54 772 kWh, 219 MW: a reset, that quarter-hour is missing,
    neither -45 228 nor 54 772. 45 231, 4 523, 45 481: 250 kWh over two quarter-hours, the middle is wrong.
    """
    seconds = instants(DAY, "2025-06-04T00:01")
    index = np.full(seconds.size, np.nan)
    index[:735:15] = readings[0] + 250.0 * np.arange(-48, 1)
    index[735] = readings[1]
    index[750::15] = readings[2] + 250.0 * np.arange(47)
    plant = changed(
        GAS_ENGINE,
        ('column = "P", unit = "kW", between = "step", hold = "1 min"',
         f'column = "P", unit = "kWh", between = "counter", {full_scale}at_most = "1200 kW", '
         'hold = "30 min"'),
        ('minimum_load = "30 %"\n', ""),
    )  # fmt: skip
    place = site(tmp_path / "site", plant, {"plant/a.csv": export(seconds, FULL_LOAD | {"P": index})})
    assert run("audit", place, "--out", tmp_path / "out", "--quiet", *one_day(DAY)).code == 0
    table = intervals(tmp_path / "out")
    assert table["work_gross_kW"][48:50] == pytest.approx(noon_kW, rel=1e-9, nan_ok=True)
    assert figures(tmp_path / "out")["work_gross_kWh"]["value"] == pytest.approx(energy_kWh, rel=1e-9)
    missing = math.isnan(noon_kW[0])
    assert (table["verdict"][48] == "not assessed") is missing
    codes = {each["code"] for each in findings(tmp_path / "out")}
    assert ("counter reset" in codes) is missing


# --- ceilings that do not fit


def test_jacket_is_no_source_of_a_gas_engine(tmp_path: Path) -> None:
    """A source of 90 degC over 25 degC would allow 17.9 % and condemn every gas engine: refused, exit 2."""
    plant = changed(
        GAS_ENGINE,
        (
            'ceiling = { kind = "fuel exergy" }',
            'ceiling = { kind = "two reservoirs", source = "heat", sink = "heat" }',
        ),
    )
    place = site(tmp_path / "site", plant, {"plant/a.csv": export(WHOLE_DAY, FULL_LOAD)})
    done = run("audit", place, *one_day(DAY))
    assert done.code == 2 and "machines.engine.ceiling.kind" in done.err and "fuel exergy" in done.err
    assert not list(place.rglob("*.html"))


def test_a_gas_engine_of_42_percent_is_credible(tmp_path: Path) -> None:
    """1000 kW from 238.1 m3/h x 10 kWh/m3: 42 %, far below the fuel's exergy of 104 %; nothing impossible."""
    columns = FULL_LOAD | {"G": 100.0 / 0.42, "F": 12.0}
    out = audited(tmp_path, GAS_ENGINE, {"plant/a.csv": export(WHOLE_DAY, columns)}, *one_day(DAY))
    assert figures(out)["gross_pct"]["value"] == pytest.approx(42.0, rel=1e-9)
    assert figures(out)["ceiling_pct"]["value"] == pytest.approx(104.0, rel=1e-9)
    assert only(intervals(out)["verdict"]) == "credible"
    assert statement(out)["machines"]["engine"]["hours_by_verdict"]["impossible"] == 0.0


@pytest.mark.parametrize("kind", ["two reservoirs", "finite source and sink"])
def test_no_ceiling_between_equal_temperatures(tmp_path: Path, kind: str) -> None:
    """Source and sink at the same temperature: no ceiling, no division by zero, nothing invented.

    Two reservoirs: both inlets at 25 degC. Finite: 30 to 20 degC against 20 to 30 degC, the same mean. The
    10 kW of 1000 kW are within the 2 % that the heat is uncertain by.
    """
    columns = {"M": 1000.0, "T1": 25.0, "T2": 24.0, "P": 10.0, "A": 990.0, "A1": 25.0, "A2": 26.0}
    if kind == "finite source and sink":
        columns |= {"M": 100.0, "T1": 30.0, "T2": 20.0, "A": 99.0, "A1": 20.0, "A2": 30.0}
    plant = HEAT_ENGINE if kind == "finite source and sink" else changed(HEAT_ENGINE, RESERVOIRS)
    place = site(tmp_path / "site", plant, {"plant/a.csv": export(WHOLE_DAY, columns)})
    done = run("audit", place, "--out", tmp_path / "out", "--quiet", *one_day(DAY))
    assert done.code in (0, 6), done.err
    table, found = intervals(tmp_path / "out"), figures(tmp_path / "out")
    assert only(table["verdict"]) == "no ceiling"
    assert np.isnan(table["ceiling_pct"]).all() and np.isnan(table["margin_pct"]).all()
    assert found["ceiling_pct"]["value"] is None and found["ceiling_pct"]["status"] == "withheld"
    assert found["gross_pct"]["value"] == pytest.approx(1.0, rel=1e-9)


# --- missing is not zero, and a late file


def test_missing_power_is_not_zero_and_a_late_file_completes_it(tmp_path: Path) -> None:
    """Power missing from 10:00 to 14:00: 20 000/50 000 = 40.0 % at 83.3 % coverage, never 20 000/60 000.

    All 60 000 kWh of fuel are still published. With the late file 24 000/60 000 = 40.0 %, firm; a second
    run changes no byte.
    """
    boiler_house = {name: value for name, value in FULL_LOAD.items() if name != "P"}
    noon = (WHOLE_DAY >= WHOLE_DAY[0] + 10 * 3600) & (WHOLE_DAY < WHOLE_DAY[0] + 14 * 3600)
    files = {
        "plant/a.csv": export(WHOLE_DAY, boiler_house),
        "power/morning.csv": export(WHOLE_DAY[:600], {"P": 1000.0}),
        "power/afternoon.csv": export(WHOLE_DAY[840:], {"P": 1000.0}),
    }
    place = site(tmp_path / "site", TWO_EXPORTS, files)
    out = place / "audit" / f"{DAY}_{DAY}"
    assert run("audit", place, *one_day(DAY)).code == 6
    found, table = figures(out), intervals(out)
    assert found["gross_pct"]["value"] == pytest.approx(40.0, rel=1e-9)
    assert found["gross_pct"]["status"] == "provisional"
    assert found["gross_pct"]["coverage_pct"] == pytest.approx(83.3, abs=0.05)
    assert found["fuel_in_kWh"]["value"] == pytest.approx(60_000.0, rel=1e-9)
    assert found["fuel_in_kWh"]["status"] == "firm"
    assert found["work_gross_kWh"]["value"] == pytest.approx(20_000.0, rel=1e-9)
    missing = table["verdict"] == "not assessed"
    assert missing.sum() == 16 and np.isnan(table["work_gross_kW"][missing]).all()
    assert {finding["tag"] for finding in findings(out) if finding["code"] == "gap"} == {"power"}

    (place / "logs/power/late.csv").write_bytes(export(WHOLE_DAY[noon], {"P": 1000.0}))
    assert run("audit", place, *one_day(DAY)).code == 0
    found = figures(out)
    assert found["work_gross_kWh"]["value"] == pytest.approx(24_000.0, rel=1e-9)
    assert found["gross_pct"]["value"] == pytest.approx(40.0, rel=1e-9)
    assert found["gross_pct"]["status"] == "firm" and found["gross_pct"]["coverage_pct"] == 100.0
    before = digests(out)
    assert run("audit", place, *one_day(DAY)).code == 0
    assert digests(out) == before
