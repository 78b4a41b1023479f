"""The two demo months: their bytes, their physics, and the headline figures worked by hand."""

from __future__ import annotations

import ast
import csv
import gzip
import importlib
import io
import itertools
import json
import math
import os
import subprocess
import sys
import tomllib
import zipfile
from collections import Counter
from pathlib import Path
from types import ModuleType, SimpleNamespace
from typing import Any

import numpy as np
import pytest

SAMPLES = Path(__file__).resolve().parents[1] / "sample_logs"
SITES = ("emberlund", "quillmere")
MEGABYTE = 1_000_000


@pytest.fixture(scope="module")
def code() -> SimpleNamespace:
    """The generators' modules, imported from their plain folders."""
    folders = [str(SAMPLES), *(str(SAMPLES / site) for site in SITES)]
    before = list(sys.path)
    sys.path[:0] = folders
    try:
        names = ("fluid_properties", "logger_tools", "waste_heat_plant", "waste_heat_logs")
        names += ("waste_heat_truth", "gas_engine_plant", "gas_engine_logs", "gas_engine_truth")
        return SimpleNamespace(**{name: importlib.import_module(name) for name in names})
    finally:
        sys.path[:] = before


@pytest.fixture(scope="module")
def waste_heat(code: SimpleNamespace) -> Any:
    """The true month of Emberlund."""
    return code.waste_heat_plant.simulate()


@pytest.fixture(scope="module")
def gas_engine(code: SimpleNamespace) -> Any:
    """The true month of Quillmere."""
    return code.gas_engine_plant.simulate()


def truth(site: str) -> dict[str, Any]:
    """The stored truth.json."""
    stored: dict[str, Any] = json.loads((SAMPLES / site / "truth.json").read_text(encoding="utf-8"))
    return stored


def unpacked(path: Path) -> bytes:
    """Content of a file, taken out of its gzip or zip."""
    if path.suffix == ".gz":
        return gzip.decompress(path.read_bytes())
    if path.suffix == ".zip":
        with zipfile.ZipFile(path) as archive:
            return b"".join(archive.read(name) for name in archive.namelist())
    return path.read_bytes()


def rows(content: bytes, delimiter: str = ",", encoding: str = "utf-8") -> list[list[str]]:
    """Cells of an export."""
    return list(csv.reader(io.StringIO(content.decode(encoding)), delimiter=delimiter))


def month_kWh(module: ModuleType, month: Any, power_kW: np.ndarray) -> float:
    """Energy over the month by the trapezoidal rule, kWh."""
    inside = (month.minutes >= module.MONTH_START) & (month.minutes <= module.MONTH_END)
    return float(np.trapezoid(power_kW[inside]) / 60.0)


@pytest.mark.parametrize("site", SITES)
def test_the_generator_writes_the_stored_files_again(site: str, tmp_path: Path) -> None:
    """From any folder and in another time zone; content, for another compressor may pack it otherwise."""
    command = [sys.executable, "-W", "error", str(SAMPLES / site / "generate.py"), "made"]
    surroundings = {**os.environ, "TZ": "Asia/Kolkata", "PYTHONDONTWRITEBYTECODE": "1"}
    subprocess.run(command, cwd=tmp_path, env=surroundings, check=True, timeout=120)
    made = tmp_path / "made"

    def files(folder: Path) -> list[str]:
        found = [folder / "truth.json", *(folder / "logs").rglob("*")]
        return sorted(path.relative_to(folder).as_posix() for path in found if path.is_file())

    assert files(made) == files(SAMPLES / site)
    for name in files(made):
        assert unpacked(made / name) == unpacked(SAMPLES / site / name), name


@pytest.mark.parametrize("site", SITES)
def test_archives_carry_no_time_and_no_name_of_the_machine_that_wrote_them(site: str) -> None:
    """A gzip header (RFC 1952, section 2.3) has flags, time and extra flags in bytes 3 to 8."""
    archives = sorted((SAMPLES / site / "logs").rglob("*.gz"))
    assert archives
    for path in archives:
        header = path.read_bytes()[:8]
        assert header[3] == 0 and header[4:8] == b"\0\0\0\0", path.name
    for path in (SAMPLES / site / "logs").rglob("*.zip"):
        with zipfile.ZipFile(path) as archive:
            assert all(entry.date_time[0] == 2025 for entry in archive.infolist())


@pytest.mark.parametrize("site", SITES)
def test_a_demo_month_is_small(site: str) -> None:
    """At most five megabytes of exports for each site."""
    stored = sum(path.stat().st_size for path in (SAMPLES / site / "logs").rglob("*") if path.is_file())
    assert 0.5 * MEGABYTE < stored <= 5 * MEGABYTE


def test_the_generators_use_nothing_of_the_program_they_test() -> None:
    """Standard library, numpy and their own modules only."""
    own = {path.stem for path in SAMPLES.rglob("*.py")}
    allowed = own | set(sys.stdlib_module_names) | {"numpy"}
    for path in SAMPLES.rglob("*.py"):
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
            names = [alias.name for alias in node.names] if isinstance(node, ast.Import) else []
            if isinstance(node, ast.ImportFrom):
                names = [node.module or ""]
            assert {name.split(".")[0] for name in names} <= allowed, path.name


@pytest.mark.parametrize("site", SITES)
def test_every_declared_tag_stands_in_an_export_and_something_stands_in_none(site: str) -> None:
    """Patterns match files, headings hold the tags; one file and some columns belong to nobody."""
    plant = tomllib.loads((SAMPLES / site / "plant.toml").read_text(encoding="utf-8"))
    logs = SAMPLES / site / "logs"
    claimed: set[Path] = set()
    for export in plant["exports"].values():
        matched = sorted({path for pattern in export["files"] for path in logs.glob(pattern)})
        assert matched
        claimed |= set(matched)
        head = unpacked(matched[-1])[:5000].decode("cp1252")
        words = set(head.replace(";", ",").replace("\r", "").replace("\n", ",").split(","))
        assert {tag["column"] for tag in export["tags"].values()} <= words
    assert {path for path in logs.rglob("*") if path.is_file()} - claimed


@pytest.mark.parametrize("site", SITES)
def test_calibration_errors_lie_well_inside_the_declared_uncertainty(site: str) -> None:
    """Within 0.6 of one standard uncertainty, as the plant file declares it."""
    plant = tomllib.loads((SAMPLES / site / "plant.toml").read_text(encoding="utf-8"))
    declared = {
        tag["column"]: tag["standard"]
        for export in plant["exports"].values()
        for tag in export["tags"].values()
        if "standard" in tag
    }
    instruments = truth(site)["instruments"]
    for tag, standard in declared.items():
        number, _, unit = str(standard).partition(" ")
        expected = float(number) / (100.0 if unit == "%" and tag != "EX-O2" else 1.0)
        assert instruments[tag]["declared_standard"] == pytest.approx(expected), tag
    for tag, instrument in instruments.items():
        assert abs(instrument["bias"]) <= 0.6 * instrument["declared_standard"], tag


def test_water_of_the_generator_is_water(code: SimpleNamespace) -> None:
    """Against IAPWS-IF97 as CoolProp implements it: density and enthalpy rise within 0.1 %."""
    coolprop = pytest.importorskip("CoolProp.CoolProp")
    water = code.fluid_properties
    for cold, hot in ((38.0, 42.0), (72.0, 90.1), (72.0, 83.9)):

        def of(name: str, celsius: float) -> float:
            return float(coolprop.PropsSI(name, "T", celsius + 273.15, "P", 4e5, "IF97::Water"))

        rise = (of("H", hot) - of("H", cold)) / 1000.0
        assert float(water.water_enthalpy(hot) - water.water_enthalpy(cold)) == pytest.approx(rise, rel=1e-3)
        assert float(water.water_density(hot)) == pytest.approx(of("D", hot), rel=1e-3)
        back = water.water_temperature(water.water_enthalpy(hot))
        assert float(back) == pytest.approx(hot, abs=1e-9)


def test_waste_heat_plant_obeys_both_laws_every_minute(code: SimpleNamespace, waste_heat: Any) -> None:
    """First law from flows, temperatures and enthalpies; entropy generated is never negative."""
    plant, m = code.waste_heat_plant, waste_heat
    oil = m.oil_flow * (plant.OIL.enthalpy(m.oil_hot_C) - plant.OIL.enthalpy(m.oil_cold_C))
    air = m.air_flow * (plant.AIR.enthalpy(m.air_out_C) - plant.AIR.enthalpy(m.outdoor_C))
    exhaust = m.exhaust_flow * (
        plant.EXHAUST.enthalpy(m.exhaust_in_C) - plant.EXHAUST.enthalpy(m.exhaust_out_C)
    )
    assert np.abs(exhaust - m.casing_kW - m.stored_kW - oil).max() < 1e-6
    assert np.abs(oil + m.feed_kW - m.gross_kW - m.drive_kW - air).max() < 1e-6
    for generated in (m.coil_entropy_kW_per_K(), m.engine_entropy_kW_per_K()):
        assert generated.min() > -1e-9
        assert generated[m.running].min() > 0.01
    inside = month_kWh(plant, m, m.stored_kW) / month_kWh(plant, m, m.exhaust_kW)
    assert abs(inside) < 1e-4  # the coil's store is full and warm at both ends of the month


def test_gas_engine_obeys_both_laws_every_minute(code: SimpleNamespace, gas_engine: Any) -> None:
    """First law from flows, temperatures and enthalpies; entropy generated is never negative."""
    plant, water, m = code.gas_engine_plant, code.fluid_properties, gas_engine
    hot = m.hot_flow * (water.water_enthalpy(m.hot_supply_C) - water.water_enthalpy(m.hot_return_C))
    low = m.low_flow * (water.water_enthalpy(m.low_supply_C) - water.water_enthalpy(m.low_return_C))
    gas = m.exhaust_flow * (plant.FLUE_GAS.enthalpy(m.exhaust_hot_C) - plant.FLUE_GAS.enthalpy(25.0))
    lost = m.casing_kW + m.warming_kW + m.generator_kW + m.unburnt_kW
    closure = m.fuel_kW + m.air_kW - m.power_kW - lost - hot - low - gas
    pumping = m.running | (m.hot_flow == 0.0)  # the after-run of the jacket pump moves no heat
    assert np.abs(closure[pumping]).max() < 1e-6
    assert np.abs(m.closure_kW()).max() < 1e-6
    assert m.low_kW[m.running].min() > 0.0
    assert m.entropy_kW_per_K().min() > -1e-9
    assert m.entropy_kW_per_K()[m.running].min() > 0.1


def test_waste_heat_plant_at_its_nominal_point(code: SimpleNamespace) -> None:
    """By hand: 18 kg/s x 1.12 x (450 - 205) = 4939 kW, less 1.5 % = 4865 kW of oil heat.

    1000/4865 = 20.55 % gross, 840/4865 = 17.27 % net; condenser 4865 + 50 - 1000 - 50 = 3865 kW;
    oil 275/185 degC: 90/ln(548.15/458.15) = 501.8 K, air 15/32 degC: 17/ln(305.15/288.15) = 296.6 K,
    ceiling 40.9 %.
    """
    plant = code.waste_heat_plant
    m = plant.simulate(plant.Scenario(faults=False, weather=False))
    oil, gross = month_kWh(plant, m, m.oil_kW), month_kWh(plant, m, m.gross_kW)
    assert month_kWh(plant, m, m.exhaust_kW) / 744 == pytest.approx(18 * 1.12 * 245, rel=1e-3)
    assert oil / 744 == pytest.approx(4865, rel=1e-3)
    assert 100 * gross / oil == pytest.approx(20.55, abs=0.03)
    assert 100 * (gross - month_kWh(plant, m, m.own_kW)) / oil == pytest.approx(17.27, abs=0.03)
    assert month_kWh(plant, m, m.air_kW) / 744 == pytest.approx(3865, rel=1e-3)
    ends = (m.oil_hot_C, m.oil_cold_C), (m.outdoor_C, m.air_out_C)
    ceiling = month_kWh(plant, m, code.waste_heat_truth.reversible_kW(m.oil_kW, *ends)) / oil
    by_hand = 1 - (17 / math.log(305.15 / 288.15)) / (90 / math.log(548.15 / 458.15))
    assert 100 * by_hand == pytest.approx(40.9, abs=0.05)
    assert 100 * ceiling == pytest.approx(40.9, abs=0.15)  # the oil's heat capacity rises with temperature


def test_fouled_coil_at_the_end_of_the_month(code: SimpleNamespace, waste_heat: Any) -> None:
    """By hand: 18 x 1.12 x (450 - 228) = 4476 kW given; oil 262 degC; power 120 kW down in equal weather."""
    plant, m = code.waste_heat_plant, waste_heat
    last_day = (m.minutes >= plant.MONTH_END - 1440) & (m.minutes < plant.MONTH_END)
    assert m.exhaust_kW[last_day].mean() == pytest.approx(4476, rel=0.01)
    assert m.exhaust_out_C[last_day].mean() == pytest.approx(228, abs=1.5)
    assert m.oil_hot_C[last_day].mean() == pytest.approx(262, abs=2.0)
    clean = plant.simulate(plant.Scenario(faults=False))
    assert (clean.gross_kW - m.gross_kW)[last_day].mean() == pytest.approx(120, abs=15)


def test_furnace_reversals_leave_most_running_quarter_hours_steady(
    code: SimpleNamespace, waste_heat: Any
) -> None:
    """Quarter-hour means within half an hour move by less than 5 % of 1000 kW in 60 % or more."""
    plant, m = code.waste_heat_plant, waste_heat
    start = plant.MARGIN_MINUTES
    means = m.gross_kW[start : start + 744 * 60].reshape(-1, 15).mean(axis=1)
    windows = np.lib.stride_tricks.sliding_window_view(means, 3)  # the quarter-hour and both neighbours
    running = windows[:, 1] > 300.0
    assert (np.ptp(windows, axis=1) < 50.0)[running].mean() >= 0.60
    assert np.ptp(m.exhaust_in_C[start : start + 1440]) > 28.0  # while the source swings by 30 K


def test_gas_engine_month_without_faults(code: SimpleNamespace) -> None:
    """By hand: 496 h x 1.2 + 184 h x 0.72 MW = 727.7 MWh; fuel 496 x 2.857 + 184 x 1.823 = 1752.5 MWh.

    Efficiency 41.52 %; heat 496 x 1.254 + 184 x 0.822 = 773.2 MWh; total 85.6 %.
    """
    plant = code.gas_engine_plant
    m = plant.simulate(plant.Scenario(faults=False))
    power, fuel = month_kWh(plant, m, m.power_kW), month_kWh(plant, m, m.fuel_kW)
    heat = month_kWh(plant, m, m.hot_kW + m.exhaust_kW)
    assert power == pytest.approx(727.7e3, rel=1e-3)
    assert fuel == pytest.approx(1752.5e3, rel=1e-3)
    assert 100 * power / fuel == pytest.approx(41.52, abs=0.05)
    assert heat == pytest.approx(773.2e3, rel=2e-3)
    assert 100 * (power + heat) / fuel == pytest.approx(85.6, abs=0.1)


def test_gas_engine_month_with_its_faults() -> None:
    """By hand, misfire: 441.6 (1/0.406 - 1/0.42) + 97.92 (1/0.382 - 1/0.395) = 44.7 MWh of fuel.

    Frozen return 82 kW x 31 h = 2.5 MWh; outage 5 h x 1.2 MW = 6.0 MWh; bypass 47.9 MWh with healthy
    exhaust of 420 degC, 22 K hotter after the misfire: x 322/300.
    """
    effects: dict[str, Any] = {}
    for fault in truth("quillmere")["faults"]:
        effects |= fault["effect"]
    extra = 441.6 * (1 / 0.406 - 1 / 0.42) + 97.92 * (1 / 0.382 - 1 / 0.395)
    assert effects["extra_fuel_kWh"] == pytest.approx(1e3 * extra, rel=5e-3)
    assert effects["heat_overstated_kWh"] == pytest.approx(82.0 * 31, rel=0.02)
    assert effects["power_kWh"] == pytest.approx(6000, rel=1e-3)
    assert effects["heat_not_recovered_kWh"] == pytest.approx(47.9e3 * 322 / 300, rel=0.02)
    gross = truth("quillmere")["machines"]["engine"]["figures"]["gross_pct"]
    assert gross["true"] == pytest.approx(40.5, abs=0.1)


def test_combustion_air_is_in_the_balance(gas_engine: Any) -> None:
    """By hand: 1.74 kg/s x 1.006 x (11 - 25) = -24 kW at full load and 11 degC, 0.9 % of the fuel."""
    near = (np.abs(gas_engine.outdoor_C - 11.0) < 0.2) & (gas_engine.power_kW > 1190.0)
    assert gas_engine.air_kW[near].mean() == pytest.approx(-24.5, abs=0.5)


def test_days_of_the_truth_add_up_to_its_month() -> None:
    """Local days, one of them of 25 hours, sum to the period."""
    for site, machine in (("emberlund", "orc"), ("quillmere", "engine")):
        stored = truth(site)
        hours = [day["hours"] for day in stored["days"]]
        assert sum(hours) == stored["period"]["hours"]
        assert max(hours) == (25 if site == "quillmere" else 24)
        total = sum(day["power_kWh"] for day in stored["days"])
        assert total == pytest.approx(
            stored["machines"][machine]["figures"]["work_gross_kWh"]["true"], abs=0.5
        )


def standard_of_engine_residual_kW() -> float:
    """Declared standards of Quillmere combined by hand at full load: 2857 kW fuel, 594 and 186 kW of gas."""
    parts = (
        0.006 * 2857, 0.004 * 2857, 9 / 1108 * 2857, 0.005 * 1200, 0.01 * 660, math.sqrt(2) * 0.25 * 36.3,
        0.02 * 780, 1.5 * 1.98, math.sqrt(2) * 0.25 * 17.3, 0.005 * 2857, 0.004 * 2857, 0.005 * 1200,
    )  # fmt: skip
    return math.sqrt(sum(part**2 for part in parts))


def standard_of_orc_residual_kW() -> float:
    """Declared standards of Emberlund combined by hand at the nominal point."""
    parts = (
        0.02 * 4865, 0.005 * 4865, math.sqrt(2) * 0.5 * 23 * 2.35, 0.005 * 1000, 0.01 * 1000, 0.03 * 160,
        0.03 * 3865, 0.002 * 3865, math.sqrt(2) * 0.5 * 226 * 1.006,
    )  # fmt: skip
    return math.sqrt(sum(part**2 for part in parts))


def test_clean_days_close_within_their_uncertainty_as_metered(
    code: SimpleNamespace, waste_heat: Any, gas_engine: Any
) -> None:
    """Mean residual of each clean day within 2 u of the instruments; the faulty days are seen."""
    powers, _ = code.waste_heat_truth.metered_powers(code.waste_heat_logs.read_instruments(waste_heat))
    orc = powers["oil"] + powers["feed"] - powers["power"] - powers["drive"] - powers["air"]
    gas = code.gas_engine_truth.metered_energies(code.gas_engine_logs.read_instruments(gas_engine))
    leaving = ("power", "hot_water", "exhaust", "casing", "generator", "unburnt", "stack", "low_water")
    engine = 60.0 * (gas["gas"] + gas["air"] - sum(gas[name] for name in leaving))
    cases = (
        ("emberlund", code.waste_heat_plant, waste_heat.minutes, orc, standard_of_orc_residual_kW()),
        (
            "quillmere",
            code.gas_engine_plant,
            gas_engine.minutes[:-1],
            engine,
            standard_of_engine_residual_kW(),
        ),
    )
    for site, plant, minutes, residual, standard in cases:
        dates = code.logger_tools.clock_minutes(minutes, plant.ZONE) // 1440
        for date in truth(site)["clean_days"]:
            day = dates == np.datetime64(date, "D").astype(int)
            assert abs(np.nanmean(residual[day])) < 2.0 * standard, (site, date)
    fast = waste_heat.minutes >= code.waste_heat_logs.OIL_FLOW_HIGH[0]
    assert np.nanmean(orc[fast]) - np.nanmean(orc[~fast]) > 250.0  # 8 % of the oil heat, less the sun


def test_seeded_faults_stand_in_the_exports_of_the_waste_heat_site() -> None:
    """Thirty hours in kelvin, seven repeated stamps, conflicts, sentinels, words, exception storage."""
    logs = SAMPLES / "emberlund" / "logs"
    heading, *skid = rows(unpacked(next((logs / "month").iterdir())))
    column = {name: heading.index(name) for name in heading}
    assert sum(float(row[column["TO-T1"]]) > 500.0 for row in skid) == 30 * 60
    assert sum(cell in ("-9999", "9999") for row in skid for cell in row) == 3 + 25 + 28 + 12 + 18
    assert {row[column["FAN3"]] for row in skid if row[0].startswith("2026-07-12")} == {"1"}
    by_stamp = {row[0]: row for row in skid}
    conflicts: Counter[str] = Counter()
    for path in sorted((logs / "day").iterdir()):
        names, *daily = rows(unpacked(path))
        for row in daily:
            for name, cell in zip(names[1:], row[1:], strict=True):
                conflicts[name] += cell != by_stamp[row[0]][column[name]]
    assert +conflicts == Counter({"TO-F": 20, "TO-T1": 5})
    stamps = Counter(
        row[0] for path in sorted((logs / "power").iterdir()) for row in rows(unpacked(path))[1:]
    )
    assert [stamp for stamp, times in stamps.items() if times == 2] == [
        f"2026-07-22 09:0{minute}:00" for minute in range(7)
    ]
    furnace = [
        row for path in sorted((logs / "furnace").iterdir()) for row in rows(unpacked(path), ";", "cp1252")
    ]
    assert [";°C;°C;kg/s".split(";")] == [row for row in furnace[:6] if "kg/s" in row]
    data = [row for row in furnace if len(row) == 4 and row[0][:1].isdigit()]
    kept = [float(row[1].replace(",", ".")) for row in data if row[1]]
    assert len(kept) < 0.6 * len(data)
    assert np.mean(np.abs(np.diff(kept)) >= 5.0) > 0.97  # the rest are heartbeats and file starts
    assert {row[3] for row in data if row[3][-1:].isalpha()} == {"spolning", "service"}


def test_seeded_faults_stand_in_the_exports_of_the_gas_engine() -> None:
    """Meter exchange, creep, frozen sensor, late file, the hour that comes twice, words."""
    logs = SAMPLES / "quillmere" / "logs"
    gas = [row for path in sorted((logs / "gas").iterdir()) for row in rows(unpacked(path))[1:]]
    index = [(stamp, float(value)) for stamp, tag, value in gas if tag == "GM-01"]
    drops = [(a[0], b[0]) for a, b in itertools.pairwise(index) if b[1] < a[1]]
    assert drops == [("2025-10-05 09:10:00", "2025-10-05 09:50:00")]  # winter time; 10:10 to 10:50 local
    at = dict(index)
    assert at["2025-10-12 03:00:00"] - at["2025-10-12 00:00:00"] == pytest.approx(1.2, abs=0.11)
    heat = [row for path in sorted((logs / "heat").iterdir()) for row in rows(unpacked(path), ";")[1:]]
    assert sum(count == 2 for count in Counter(row[0] for row in heat).values()) == 30
    frozen = [row[3] for row in heat if "13-10-2025 05:00" <= row[0] < "13-10-2025 24" or
              "14-10-2025 00" <= row[0] < "14-10-2025 12:00"]  # fmt: skip
    assert len(frozen) == 31 * 30 and set(frozen) == {"72,0"}
    assert {cell for row in heat for cell in row[1:] if cell.isalpha()} == {"off", "mangler", "service"}
    engine = {path.name: rows(unpacked(path))[1:] for path in sorted((logs / "engine").iterdir())}
    late = engine["engine_2025-10-20_late.csv.gz"]
    assert len(late) == 300 and late[0][0] == "2025-10-20T07:00:00Z"
    assert len(engine["engine_2025-10-20.csv.gz"]) == 1440 - 300
    assert float(late[-1][1]) - float(late[0][1]) == pytest.approx(5980, abs=35)
