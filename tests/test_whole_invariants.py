"""What must not change a published figure: ticks, units, layouts, surroundings; and what must."""

from __future__ import annotations

import math
import shutil
from pathlib import Path

import numpy as np
import pytest
from site_factory import (
    GAS_ENGINE,
    HEAT_ENGINE,
    Column,
    Layout,
    audited,
    changed,
    digests,
    export,
    figures,
    headlines,
    instants,
    intervals,
    one_day,
    printed,
    run,
    run_apart,
    site,
    statement,
)

DAY = "2025-06-03"
MARGIN = instants("2025-06-02T23:50", "2025-06-04T00:11")
LINE = [
    (
        f'column = "{name}", unit = "{unit}", between = "step", hold = "1 min"',
        f'column = "{name}", unit = "{unit}", between = "line", hold = "5 min"',
    )
    for name, unit in (("G", "m3/h"), ("P", "kW"), ("F", "kg/s"), ("S", "degC"), ("R", "degC"))
]
ON_LINES = changed(GAS_ENGINE, *LINE)
"""The gas engine with values that run on straight lines between their stamps."""


def lively(seconds: np.ndarray) -> dict[str, Column]:
    """A day of a gas engine that moves: slow swings of load, noise of a fixed seed."""
    draw = np.random.default_rng(7).standard_normal((5, seconds.size))
    load = 0.85 + 0.1 * np.sin(seconds / 7000.0)
    return {
        "G": 250.0 * load * (1.0 + 0.003 * draw[0]),
        "P": 1000.0 * load * (1.0 + 0.003 * draw[1]),
        "F": 16.25 * load * (1.0 + 0.005 * draw[2]),
        "S": 90.0 + 0.2 * draw[3],
        "R": 70.0 + 0.2 * draw[4],
    }


def energies(out: Path, column: str = "logged") -> dict[str, float]:
    """Energies of the period, kWh."""
    return {
        key: figure[column]
        for key, figure in figures(out).items()
        if figure["unit"] == "kWh" and figure.get(column) is not None
    }


def test_halves_add_up(tmp_path: Path) -> None:
    """Two days together are the first and the second, to 1e-9, for every energy."""
    seconds = instants("2025-06-02T23:50", "2025-06-05T00:11")
    place = site(tmp_path / "site", ON_LINES, {"plant/a.csv": export(seconds, lively(seconds))})
    spans = {"both": (DAY, "2025-06-04"), "first": (DAY, DAY), "second": ("2025-06-04", "2025-06-04")}
    for name, (first, last) in spans.items():
        assert run("audit", place, "--from", first, "--to", last, "--out", tmp_path / name).code == 0
    whole, first_half, second_half = (energies(tmp_path / name) for name in spans)
    assert len(whole) >= 8
    for key, energy in whole.items():
        assert first_half[key] + second_half[key] == pytest.approx(energy, rel=1e-9), key


def test_length_of_ticks_does_not_change_energies(tmp_path: Path) -> None:
    """1 and 5 minutes: a mean over time does not depend on how time is cut.

    Exact (1e-9) for every stream that is linear in its signals: power, fuel at its state, and heat while
    the flow is constant. Edges fall on ticks of both lengths, so nothing is covered by halves.
    """
    columns = lively(MARGIN) | {"F": 16.25}
    for tick in ("1 min", "5 min"):
        plant = changed(ON_LINES, ('tick = "1 min"', f'tick = "{tick}"'))
        files = {"plant/a.csv": export(MARGIN, columns)}
        audited(tmp_path / tick[0], plant, files, *one_day(DAY))
    fine, coarse = energies(tmp_path / "1/out"), energies(tmp_path / "5/out")
    assert fine.keys() == coarse.keys() and len(fine) >= 8
    for key, energy in fine.items():
        assert coarse[key] == pytest.approx(energy, rel=1e-9), key
    rows, same = intervals(tmp_path / "1/out"), intervals(tmp_path / "5/out")
    assert (rows["verdict"] == same["verdict"]).all()
    assert rows["work_gross_kW"] == pytest.approx(same["work_gross_kW"], rel=1e-9)


def test_a_counter_gives_the_same_energy_on_any_ticks(tmp_path: Path) -> None:
    """A reading every 7 minutes on ticks of 1 and 5 minutes: no edge of a tick falls on a reading.

    By hand: 1000 kW from the day before to the day after are 24 000 kWh, whatever cuts the differences.
    """
    plant = changed(
        GAS_ENGINE,
        (
            'column = "P", unit = "kW", between = "step", hold = "1 min"',
            'column = "P", unit = "kWh", between = "counter", at_most = "1300 kW"',
        ),
    )
    reading = np.full(MARGIN.size, np.nan)
    reading[::7] = np.round(5e5 + 1000.0 / 60.0 * np.arange(MARGIN.size)[::7], 6)
    base = {"G": 250.0, "F": 16.25, "S": 90.0, "R": 70.0, "P": reading}
    for tick in ("1 min", "5 min"):
        edited = changed(plant, ('tick = "1 min"', f'tick = "{tick}"'))
        audited(tmp_path / tick[0], edited, {"plant/a.csv": export(MARGIN, base)}, *one_day(DAY))
        found = figures(tmp_path / tick[0] / "out")
        assert found["work_gross_kWh"]["value"] == pytest.approx(24_000.0, rel=1e-9)
        assert found["fuel_in_kWh"]["value"] == pytest.approx(60_000.0, rel=1e-9)


UNITS = {"degC": (1.0, 0.0), "K": (1.0, 273.15), "degF": (1.8, 32.0)}
"""Scale and offset from degC; exact by definition."""


def test_unit_of_the_log_does_not_change_figures(tmp_path: Path) -> None:
    """The same engine logged in degC, K and degF: same verdicts, figures and U to 1e-9."""
    rng = np.random.default_rng(3)
    swing = 20.0 * np.sin(MARGIN / 5000.0) + 0.3 * rng.standard_normal(MARGIN.size)
    columns: dict[str, Column] = {"M": 24.0, "T1": 275.0 + swing, "T2": 185.0 + swing, "P": 600.0 + swing}
    columns |= {"A": 90.0, "A1": 15.0 + 0.1 * swing, "A2": 32.0 + 0.1 * swing}
    tables, found = {}, {}
    for unit, (scale, offset) in UNITS.items():
        logged = {
            name: values * scale + offset if name in ("T1", "T2", "A1", "A2") else values
            for name, values in columns.items()
        }
        plant = HEAT_ENGINE.replace('standard = "0.000001 K"', 'standard = "0.5 K"')
        plant = plant.replace('unit = "degC"', f'unit = "{unit}"')
        for low, high in ((-50, 700), (-50, 90)):
            limits = [low * scale + offset, high * scale + offset]
            plant = plant.replace(f"range = [{low}, {high}]", f"range = {limits}")
        units = tuple(unit if name in ("T1", "T2", "A1", "A2") else "" for name in logged)
        content = export(MARGIN, logged, Layout(units=units))
        done = site(tmp_path / unit, plant, {"plant/a.csv": content})
        code = run("audit", done, *one_day(DAY), "--out", tmp_path / f"{unit}_out", "--quiet").code
        assert code in (0, 4)
        tables[unit], found[unit] = intervals(tmp_path / f"{unit}_out"), figures(tmp_path / f"{unit}_out")
    for unit in ("K", "degF"):
        for key in ("verdict", "reasons"):
            assert (tables[unit][key] == tables["degC"][key]).all()
        for key, column in tables["degC"].items():
            if column.dtype.kind == "f":
                assert tables[unit][key] == pytest.approx(column, rel=1e-8, abs=1e-7, nan_ok=True), key
        for key, figure in found["degC"].items():
            for part in ("value", "U"):
                assert found[unit][key][part] == pytest.approx(figure[part], rel=1e-9, abs=1e-9), key


LAYOUTS = {
    "plain": (Layout(), ()),
    "semicolon and comma": (Layout(delimiter=";", decimal=","), (('decimal = "."', 'decimal = ","'),)),
    "tab": (Layout(delimiter="\t"), ()),
    "day first": (
        Layout(stamp="%d.%m.%Y %H:%M", delimiter=";"),
        (('date_order = "year first"', 'date_order = "day first"'),),
    ),
    "preamble and units": (
        Layout(preamble=("Logger 7", "Serial 4711", ""), units=("m3/h", "kW", "kg/s", "degC", "degC")),
        (),
    ),
    "utf-16": (Layout(encoding="utf-16", delimiter="\t"), ()),
    "utf-8 with mark, windows line ends": (Layout(encoding="utf-8-sig", line_end="\r\n"), ()),
    "winter time": (Layout(clock="Etc/GMT-1"), (('clock = "UTC"', 'clock = "+01:00"'),)),
    "long": (
        Layout(long=True),
        (('decimal = "."', 'decimal = "."\nlayout = { stamp = "time", tag = "point", value = "reading" }'),),
    ),
}


def test_layout_of_the_export_does_not_change_figures(tmp_path: Path) -> None:
    """One day in nine layouts: every figure of the statement the same."""
    columns, first = lively(MARGIN), None
    for number, (layout, edits) in enumerate(LAYOUTS.values()):
        files = {"plant/a.csv": export(MARGIN, columns, layout)}
        out = audited(tmp_path / str(number), changed(ON_LINES, *edits), files, *one_day(DAY))
        machines = statement(out)["machines"]
        first = machines if first is None else first
        assert machines == first, list(LAYOUTS)[number]


def test_page_one_is_the_statement_is_the_sum_of_the_intervals(tmp_path: Path) -> None:
    """A day of 96 whole quarter-hours: mean power x 0.25 h adds up to the period's energy."""
    files = {"plant/a.csv": export(MARGIN, lively(MARGIN))}
    out = audited(tmp_path, ON_LINES, files, *one_day(DAY))
    found, table = figures(out), intervals(out)
    for stem in ("fuel_in", "work_gross", "useful_heat"):
        energy = table[f"{stem}_kW"].sum() * 0.25
        assert energy == pytest.approx(found[f"{stem}_kWh"]["value"], rel=1e-8), stem
    gross = 100.0 * table["work_gross_kW"].sum() / table["fuel_in_kW"].sum()
    assert gross == pytest.approx(found["gross_pct"]["value"], rel=1e-8)
    (page,) = headlines(out)
    shown = printed(page["Gross electrical efficiency"])
    assert shown.agrees(found["gross_pct"]["value"], found["gross_pct"]["U"]) and shown.unit == "%"
    total = printed(page["Total efficiency"])
    assert total.agrees(found["total_pct"]["value"], found["total_pct"]["U"])


SURROUNDINGS = {
    "time zone": {"TZ": "Pacific/Chatham"},
    "locale": {"LC_ALL": "C", "LANG": "C", "PYTHONUTF8": "0"},
    "hash seed": {"PYTHONHASHSEED": "4711"},
    "threads": {"OMP_NUM_THREADS": "1", "ARROW_NUM_THREADS": "7"},
}


@pytest.fixture(scope="module")
def reference(tmp_path_factory: pytest.TempPathFactory) -> tuple[Path, dict[str, str]]:
    """A lively day with a gap and a word, audited in a process of its own."""
    columns = lively(MARGIN)
    power = [repr(float(value)) for value in np.asarray(columns["P"])]
    power[600:640] = ["Bürde"] * 40
    folder = tmp_path_factory.mktemp("reference")
    place = site(folder / "site", ON_LINES, {"plant/a.csv": export(MARGIN, columns | {"P": power})})
    done = run_apart("audit", place, *one_day(DAY), "--out", folder / "out", PYTHONHASHSEED="0", TZ="UTC")
    assert done.code == 0, done.err
    found = digests(folder / "out")
    found.pop(".lock", None)
    assert len(found) == 6
    return place, found


@pytest.mark.parametrize("name", SURROUNDINGS)
def test_surroundings_do_not_change_a_byte(
    reference: tuple[Path, dict[str, str]], tmp_path: Path, name: str
) -> None:
    """Other time zone, locale, hash seed, threads, and each time another folder and working folder."""
    place, expected = reference
    copy = shutil.copytree(place, tmp_path / "another place" / "site é")
    done = run_apart(
        "audit", copy, *one_day(DAY), "--out", tmp_path / "out", cwd=tmp_path, **SURROUNDINGS[name]
    )
    assert done.code == 0, done.err
    found = digests(tmp_path / "out")
    assert {key: found[key] for key in expected} == expected


@pytest.mark.skipif(shutil.which("taskset") is None, reason="no taskset on this system")
def test_number_of_cores_does_not_change_a_byte(
    reference: tuple[Path, dict[str, str]], tmp_path: Path
) -> None:
    """On one core as on all of them."""
    place, expected = reference
    done = run_apart("audit", place, *one_day(DAY), "--out", tmp_path, prefix=("taskset", "-c", "0"))
    assert done.code == 0, done.err
    found = digests(tmp_path)
    assert {key: found[key] for key in expected} == expected


EXCHANGER = """\
schema = 1
[site]
name = "Small Works"
zone = "UTC"
[exports.plant]
files = ["plant/*.csv"]
clock = "UTC"
date_order = "year first"
decimal = "."
tags.flow  = { column = "M", unit = "kg/s", between = "step", hold = "1 min", standard = "4 %" }
tags.other = { column = "N", unit = "kg/s", between = "step", hold = "1 min", standard = "1 %" }
tags.a = { column = "TA", unit = "degC", between = "step", hold = "1 min", standard = "0.3 K" }
tags.b = { column = "TB", unit = "degC", between = "step", hold = "1 min", standard = "5 K" }
tags.c = { column = "TC", unit = "degC", between = "step", hold = "1 min", standard = "0.4 K" }
tags.d = { column = "TD", unit = "degC", between = "step", hold = "1 min", standard = "0.5 K" }
tags.e = { column = "TE", unit = "degC", between = "step", hold = "1 min", standard = "0.1 K" }
[fluids.carrier]
heat_capacity = { constant = "1 kJ/(kg K)", standard = "0.000001 %" }
[machines.engine]
kind = "heat exchanger"
running = { tag = "flow", above = "1 kg/s" }
"""


def flowing(name: str, role: str, flow: str, inlet: str, outlet: str) -> str:
    """A stream of the exchanger."""
    return (
        f'streams.{name} = {{ role = "{role}", by = "flow and temperatures", flow = "{flow}", '
        f'inlet = "{inlet}", outlet = "{outlet}", fluid = "carrier" }}\n'
    )


READINGS = {"M": 10.0, "N": 20.0, "TA": 180.0, "TB": 130.0, "TC": 80.0, "TD": 20.0, "TE": 65.0}


def test_a_flow_meter_shared_by_two_streams_cancels_in_their_ratio(tmp_path: Path) -> None:
    """One meter (4 %) for heat in, m (180 - 80), and useful heat, m (65 - 20) of 1 kJ/(kg K).

    By hand: 45/100 = 45 % whatever the flow. Temperatures 0.3 and 0.4 K of 100 K, 0.5 and 0.1 K of 45 K:
    u/45 % = sqrt(0.25/100**2 + 0.26/45**2) = 1.238 %, U = 1.114 points; were the meters two, 5.2 points.
    Each heat by itself carries the full 4 %: U(1000 kW) = 2 x sqrt(40**2 + 5**2) = 80.6 kW.
    """
    plant = EXCHANGER + flowing("hot", "heat in", "flow", "a", "c") + flowing(
        "cold", "useful heat", "flow", "d", "e"
    )  # fmt: skip
    files = {"plant/a.csv": export(instants(DAY, "2025-06-04"), READINGS)}
    place = site(tmp_path / "site", plant, files)
    assert run("audit", place, *one_day(DAY), "--out", tmp_path / "out").code in (0, 4)
    found = figures(tmp_path / "out")
    assert found["heat_pct"]["value"] == pytest.approx(45.0, rel=1e-9)
    by_hand = 2.0 * 45.0 * math.sqrt(0.25 / 100.0**2 + 0.26 / 45.0**2)
    assert found["heat_pct"]["U"] == pytest.approx(by_hand, rel=2e-3)
    assert found["heat_in_kWh"]["U"] == pytest.approx(
        24.0 * 2.0 * math.sqrt(40.0**2 + 5.0**2 * 1.0), rel=2e-3
    )
    ranked = statement(tmp_path / "out")["machines"]["engine"]["largest_influences"]["heat_pct"]
    assert "calibration:flow" not in {each["source"] for each in ranked}


def test_a_thermometer_between_two_streams_cancels_in_their_sum(tmp_path: Path) -> None:
    """Two coils in a row, m (180 - 130) and m (130 - 80): the middle one (5 K) cancels, being out and in.

    By hand: heat in 10 (180 - 80) = 1000 kW, u = sqrt(40**2 + (10 x 0.3)**2 + (10 x 0.4)**2) = 40.3 kW.
    Not cancelled, the middle thermometer alone would bring sqrt(2) x 50 kW.
    """
    plant = (
        EXCHANGER
        + flowing("upper", "heat in", "flow", "a", "b")
        + flowing("lower", "heat in", "flow", "b", "c")
        + flowing("cold", "useful heat", "other", "d", "e")
    )
    files = {"plant/a.csv": export(instants(DAY, "2025-06-04"), READINGS)}
    place = site(tmp_path / "site", plant, files)
    assert run("audit", place, *one_day(DAY), "--out", tmp_path / "out").code in (0, 4)
    found = figures(tmp_path / "out")
    assert found["heat_in_kWh"]["value"] == pytest.approx(24_000.0, rel=1e-9)
    by_hand = 24.0 * 2.0 * math.sqrt(40.0**2 + 3.0**2 + 4.0**2)
    assert found["heat_in_kWh"]["U"] == pytest.approx(by_hand, rel=1e-3)


def test_random_parts_average_out_and_calibration_does_not(tmp_path: Path) -> None:
    """Declared random part of 30 kW per sample, calibration 0.5 % of 1000 kW, one reading a minute.

    By hand, over n minutes: random change of the energy 30 kW x sqrt(n)/60 h, relative 3 %/sqrt(n);
    calibration 0.5 % of the energy for one day as for nine.
    """
    plant = changed(
        GAS_ENGINE,
        ('between = "step", hold = "1 min", standard = "0.5 %"',
         'between = "step", hold = "1 min", standard = "0.5 %", random = "30 kW"'),
    )  # fmt: skip
    seconds = instants(DAY, "2025-06-12")
    columns = {"G": 250.0, "P": 1000.0, "F": 16.25, "S": 90.0, "R": 70.0}
    place = site(tmp_path / "site", plant, {"plant/a.csv": export(seconds, columns)})
    for days, last in ((1, DAY), (9, "2025-06-11")):
        out = tmp_path / str(days)
        assert run("audit", place, "--from", DAY, "--to", last, "--out", out).code == 0
        energy = figures(out)["work_gross_kWh"]
        random_kWh = 30.0 * math.sqrt(1440.0 * days) / 60.0
        calibration_kWh = 0.005 * 24_000.0 * days
        assert energy["U"] == pytest.approx(2.0 * math.hypot(random_kWh, calibration_kWh), rel=0.01)
        parts = statement(out)["machines"]["engine"]["largest_influences"]["work_gross_kWh"]
        changes = {each["source"]: abs(each["change"]) for each in parts}
        assert changes["random:power"] == pytest.approx(random_kWh, rel=0.03)
        assert changes["calibration:power"] == pytest.approx(calibration_kWh, rel=1e-9)
