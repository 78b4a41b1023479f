"""Familiar ratios seeded into made-up months are named with the right cause; clean months raise nothing."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np
import pytest
import site_factory as sites

from auditor.audit_run import audit, open_site
from auditor.judging.familiar import OF_FLOW, OF_POWER, Familiar, candidates, named
from auditor.judging.recogniser import Meters, meter_questions
from auditor.metering import MeteringSettings, meter
from auditor.records.findings import Finding, FindingCode
from auditor.records.result import AuditResult
from auditor.report.wording.findings import finding_sentences

MINUTES = 15
SECOND = (
    'tags.panel  = { column = "Q", unit = "kW", between = "step", hold = "1 min", standard = "0.5 %", '
    'same_quantity_as = "power" }\n'
    'tags.index  = { column = "E", unit = "kWh", between = "counter", at_most = "90 MW", '
    'standard = "0.5 %", same_quantity_as = "power" }\n'
)
PLANT = sites.changed(sites.GAS_ENGINE, (sites.POWER_TAG, sites.POWER_TAG + SECOND)).replace(
    'hold = "1 min"', f'hold = "{MINUTES} min"'
)
SECONDS = sites.instants("2026-03-01T00:00", "2026-04-01T00:00", MINUTES * 60)
AT = 15 * 96 + 40
"""16 March 10:00: from here on a seeded fault holds."""
AT_US = int(SECONDS[AT]) * 1_000_000

Columns = dict[str, np.ndarray]


def month(seed: int) -> Columns:
    """A month of a gas engine of 1000 kW and 40 %: load by hour and day of the week, noise of its meters."""
    rng = np.random.default_rng(seed)
    count = SECONDS.size

    def noisy(values: np.ndarray | float, share: float) -> np.ndarray:
        return values * (1.0 + share * rng.standard_normal(count))

    hour, day = np.arange(count) % 96 / 4.0, np.arange(count) // 96
    load = 0.85 + 0.1 * np.sin(2.0 * np.pi * hour / 24.0)
    load = np.where(day % 7 >= 5, 0.7 * load, load) * (1.0 + 0.02 * rng.standard_normal(day.max() + 1))[day]
    true_power = 1000.0 * np.minimum(load, 1.0)
    efficiency = 0.40 - 0.02 * (1.0 - true_power / 1000.0)
    power, panel = noisy(true_power, 0.003), noisy(true_power, 0.003)
    gas = noisy(true_power / efficiency / 10.0, 0.006)
    flow = noisy(20.0, 0.005)
    back = 70.0 + 0.2 * rng.standard_normal(count)
    supply = 70.0 + 1.3 * true_power / 80.0 + 0.2 * rng.standard_normal(count)
    energy = np.round(np.concatenate(([0.0], np.cumsum(noisy(true_power, 0.003))[:-1])) * MINUTES / 60.0)
    return {"G": gas, "P": power, "Q": panel, "E": energy, "F": flow, "S": supply, "R": back}


@pytest.fixture(scope="module")
def base(tmp_path_factory: pytest.TempPathFactory) -> AuditResult:
    """A clean month, audited once; further months are put in the place of its readings."""
    return audited(tmp_path_factory.mktemp("units"), PLANT, month(0))


def audited(folder: Path, plant: str, columns: Columns) -> AuditResult:
    """Lay out a site with one export and audit it."""
    site = sites.site(folder / "site", plant, {"plant/march.csv": sites.export(SECONDS, columns)})
    return audit(site, month="2026-03")


TAGS = {"G": "gas", "P": "power", "Q": "panel", "E": "index", "F": "flow", "S": "supply", "R": "back"}


def asked(base: AuditResult, columns: Columns) -> list[Finding]:
    """Questions about a month whose readings are put into the tick table of an audited one."""
    mean = base.ticks.mean.copy()
    for column, values in columns.items():
        tag = base.plant.tags[TAGS[column]]
        ticks = np.repeat(values, MINUTES)
        if tag.between == "counter":
            ticks = np.repeat(np.diff(values, append=np.nan), MINUTES) / (MINUTES * 60.0)
        mean[:, base.ticks.column(tag.name)] = tag.scale * ticks + tag.offset
    ticks = replace(base.ticks, mean=mean)
    powers, _ = meter(ticks, MeteringSettings.from_plant(base.plant))
    return meter_questions(Meters.from_plant(base.plant), ticks, powers, base.balances)


@dataclass(frozen=True)
class Fault:
    """One seeded fault."""

    column: str
    change: Callable[[np.ndarray], np.ndarray]
    cause: str
    ratio: float
    evidence: str = "own past"


def times(factor: float) -> Callable[[np.ndarray], np.ndarray]:
    """Multiply from the seeded moment on."""
    return lambda values: np.where(np.arange(values.size) >= AT, factor * values, values)


FAULTS = [
    Fault("G", times(288.15 / 273.15), "normal or 15 degC", 1.0549),
    Fault("G", times(273.15 / 288.15), "normal or 15 degC", 1.0549),
    Fault("G", times(293.15 / 273.15), "normal or 20 degC", 1.0732),
    Fault("G", times(1.106), "heating value basis", 1.106),  # declared: 11.06 over 10.00
    Fault("G", times(1.0 / 1.106), "heating value basis", 1.106),
    Fault("G", times(3.6), "factor 3.6", 3.6),
    Fault("G", times(10.0), "decimal place", 10.0),
    Fault("P", times(1.5), "transformer ratio", 1.5),
    Fault("P", times(1.2), "transformer ratio", 1.2),
    Fault("P", times(2.0), "transformer ratio", 2.0),
    Fault("P", times(1.0 / math.sqrt(3.0)), "phase or line voltage", 1.7321),
    Fault("P", times(0.25), "quarter-hour energy", 4.0),
    Fault("P", times(1e-3), "decimal place", 1000.0),
    Fault("F", times(3.6), "factor 3.6", 3.6),
    Fault("F", times(100.0), "decimal place", 100.0),
    Fault("Q", times(1.5), "transformer ratio", 1.5, "second meter"),
    Fault("Q", lambda values: 4.0 * values, "quarter-hour energy", 4.0, "second meter"),
    Fault("E", lambda values: 10.0 * values, "decimal place", 10.0, "second meter"),
    Fault("E", lambda values: values / 3.6, "factor 3.6", 3.6, "second meter"),
]


@pytest.mark.parametrize("fault", FAULTS, ids=lambda fault: f"{fault.column}-{fault.cause}-{fault.ratio}")
@pytest.mark.parametrize("seed", [1, 2])
def test_a_seeded_ratio_is_named_first_and_its_meter_suspected(
    base: AuditResult, fault: Fault, seed: int
) -> None:
    """Every familiar ratio, in a meter's own past or against its second meter, is asked about as itself."""
    columns = month(seed)
    columns[fault.column] = fault.change(columns[fault.column])
    found = asked(base, columns)
    suspected = [each for each in found if each.tag == TAGS[fault.column]]
    finding = next(each for each in suspected if each.words["evidence"] == fault.evidence)
    first = finding.words["candidates"].partition("; ")[0]
    cause, _, ratio = first.partition("=")
    assert cause == fault.cause
    assert float(ratio) == pytest.approx(fault.ratio, rel=1e-4)
    assert finding.suspects[0] == TAGS[fault.column]
    if fault.change(np.ones(SECONDS.size))[0] == 1.0:
        assert finding.start_us is not None
        assert abs(finding.start_us - AT_US) <= 3_600_000_000


@pytest.mark.parametrize("seed", range(20))
def test_clean_months_raise_nothing(base: AuditResult, seed: int) -> None:
    """Noise, days, nights and week-ends at part load are no reason for a question."""
    assert asked(base, month(seed)) == []


@pytest.mark.parametrize("factor", [1.08, 1.15, 0.88])
def test_an_unfamiliar_step_of_a_flow_is_no_question_about_its_unit(base: AuditResult, factor: float) -> None:
    """A flow meter that suddenly reads 8 % high has no familiar ratio: nothing is said about units."""
    columns = month(3)
    columns["F"] = times(factor)(columns["F"])
    assert asked(base, columns) == []


def test_a_real_change_of_load_is_no_question(base: AuditResult) -> None:
    """Half the load from one hour on moves all meters together."""
    columns, half = month(4), times(0.5)
    columns |= {column: half(columns[column]) for column in "GPQ"}
    columns["S"] = columns["R"] + half(columns["S"] - columns["R"])
    columns["E"] = np.concatenate(([0.0], np.cumsum(half(np.diff(columns["E"])))))
    assert asked(base, columns) == []


def test_a_second_meter_that_steps_is_told_even_without_a_familiar_ratio(base: AuditResult) -> None:
    """Two meters of one thing have no reason to part by 7 % at one moment."""
    columns = month(5)
    columns["Q"] = times(0.93)(columns["Q"])
    (finding,) = asked(base, columns)
    assert finding.tag == "panel" and finding.words["candidates"] == ""
    assert finding.numbers["ratio"] == pytest.approx(0.93, abs=0.003)
    assert abs(finding.numbers["ratio"] - 0.93) <= finding.numbers["ratio_U"]
    assert "no familiar ratio" in finding_sentences(finding, base.plant).sentence


@pytest.mark.parametrize(
    ("change", "unit", "odd_after"),
    [
        (times(1.0), None, True),
        (lambda values: np.where(np.arange(values.size) >= AT, 1.8 * values + 32.0, values), "degF", True),
        (lambda values: np.where(np.arange(values.size) < AT, 1.8 * values + 32.0, values), "degF", False),
        (lambda values: np.where(np.arange(values.size) >= AT, values + 273.15, values), "K", True),
    ],
)
def test_a_temperature_whose_level_steps_as_a_change_of_unit_would(
    base: AuditResult, change: Callable[[np.ndarray], np.ndarray], unit: str | None, odd_after: bool
) -> None:
    """1.8 x + 32 and 273.15 (both exact, ISO 80000-5) are recognised inside the believable range too."""
    columns = month(6)
    columns["R"] = change(columns["R"])
    found = [each for each in asked(base, columns) if each.words["evidence"] == "temperature step"]
    if unit is None:
        assert found == []
        return
    (finding,) = found
    assert (finding.tag, finding.words["unit"]) == ("back", unit)
    edge_us = finding.start_us if odd_after else finding.end_us
    assert edge_us is not None
    assert abs(edge_us - AT_US) <= 3_600_000_000


def test_both_temperatures_of_an_exchanger_that_rise_together_are_no_question(base: AuditResult) -> None:
    """Water that leaves and comes back hotter from one hour on is a set point, not a unit."""
    columns = month(7)
    for column in "SR":
        columns[column] = columns[column] + np.where(np.arange(SECONDS.size) >= AT, 20.0, 0.0)
    assert asked(base, columns) == []


@pytest.mark.parametrize("factor", [10.0, 4.0, 1.5])
def test_power_beyond_the_nameplate_all_month(tmp_path: Path, factor: float) -> None:
    """More than the overload of the machine in its best hours is a ratio of the meter's settings."""
    columns = month(8)
    columns["P"] = factor * columns["P"]
    found = questions(audited(tmp_path, PLANT, columns), "nameplate")
    assert [each.tag for each in found] == ["power"]
    assert found[0].numbers["familiar"] == pytest.approx(factor)


def test_power_that_never_reaches_its_least_load(tmp_path: Path) -> None:
    """Energy of a quarter-hour logged as power: a quarter of the load, and of the efficiency too."""
    columns = month(9)
    columns["P"] = 0.25 * columns["P"]
    (finding,) = questions(audited(tmp_path, PLANT, columns), "nameplate")
    assert finding.words["candidates"].startswith("quarter-hour energy=4")


def test_a_machine_that_truly_idles_is_not_asked_about(tmp_path: Path) -> None:
    """At a quarter of its load with a believable efficiency it is the machine, not its meter."""
    columns = month(10)
    for column in "PGQ":
        columns[column] = 0.25 * columns[column]
    assert questions(audited(tmp_path, PLANT, columns), "nameplate") == []


@pytest.mark.parametrize(
    ("factor", "cause"), [(0.1, "decimal place=10"), (10.0, "decimal place=10"), (1 / 3.6, "factor 3.6=3.6")]
)
def test_fuel_that_is_wrong_all_month(tmp_path: Path, factor: float, cause: str) -> None:
    """No gas engine has 4 % or 400 %: the fuel meter's weight or unit, or the power meter's."""
    columns = month(15)
    columns["G"] = factor * columns["G"]
    (finding,) = questions(audited(tmp_path, PLANT.replace("5 m3/h", "1 m3/h"), columns), "level")
    assert cause in finding.words["candidates"].split("; ")
    assert finding.suspects == ("gas", "power")


@pytest.mark.parametrize(
    ("from_day", "factor", "cause"),
    [(20, 1000.0, "decimal place"), (0, 1000.0, "decimal place"), (20, 3.6, "factor 3.6")],
)
def test_readings_out_of_range_that_a_ratio_makes_usual(
    tmp_path: Path, from_day: int, factor: float, cause: str
) -> None:
    """Watts in a column of kilowatts leave the range; so says the question, and they stay rejected."""
    plant = PLANT.replace('column = "Q", unit = "kW",', 'column = "Q", unit = "kW", range = [0, 1300],')
    columns = month(13)
    odd = np.arange(SECONDS.size) // 96 >= from_day
    columns["Q"] = np.where(odd, factor * columns["Q"], columns["Q"])
    (finding,) = questions(audited(tmp_path, plant, columns), "range")
    assert finding.tag == "panel" and finding.numbers["count"] == np.count_nonzero(
        odd & (columns["Q"] > 1300)
    )
    assert cause in finding.words["candidates"]


def test_spikes_and_saturation_out_of_range_are_no_units(tmp_path: Path) -> None:
    """Scattered readings ten times too high are spikes; the same number all day is a meter at its end."""
    plant = PLANT.replace('column = "Q", unit = "kW",', 'column = "Q", unit = "kW", range = [0, 1300],')
    spiky, stuck = month(14), month(14)
    spiky["Q"] = np.where(np.arange(SECONDS.size) % 97 == 5, 10.0 * spiky["Q"], spiky["Q"])
    stuck["Q"] = np.where(np.arange(SECONDS.size) // 96 == 20, 9999.0, stuck["Q"])
    for name, columns in (("spiky", spiky), ("stuck", stuck)):
        (tmp_path / name).mkdir()
        assert questions(audited(tmp_path / name, plant, columns), "range") == []


def questions(result: AuditResult, evidence: str) -> list[Finding]:
    """Questions of an audit that came from one comparison."""
    return [
        finding
        for finding in result.findings
        if finding.code is FindingCode.UNIT_SUSPECTED and finding.words.get("evidence") == evidence
    ]


@pytest.mark.parametrize(
    ("written", "gauge_bar", "cause"),
    [
        ("absolute", 0.35, "gauge pressure read as absolute"),
        ("gauge", 1.36325, "absolute pressure read as gauge"),
        ("gauge", 0.35, None),
        ("absolute", 1.36325, None),
    ],
)
def test_the_kind_of_a_gas_meters_pressure(
    tmp_path: Path, written: str, gauge_bar: float, cause: str | None
) -> None:
    """0.35 bar over standard air is 1.36325 bar absolute: one taken for the other is asked about.

    By hand: 1.36325/0.35 = 3.895 and (1.36325 + 1.01325)/1.36325 = 1.743.
    """
    tags = (
        f'tags.p = {{ column = "GP", unit = "bar", pressure = "{written}", between = "step", '
        'hold = "15 min", standard = "0.002 bar" }\n'
        'tags.t = { column = "GT", unit = "degC", between = "step", hold = "15 min", standard = "0.3 K" }\n'
    )
    plant = sites.changed(
        PLANT,
        ("tags.gas ", tags + "tags.gas "),
        (
            'reads = "already at the fuel\'s state"',
            'reads = "operating volume"\npressure = "p"\ntemperature = "t"\n'
            "compressibility_ratio = { value = 1.0, standard = 0.001 }",
        ),
        (
            'zone = "UTC"',
            'zone = "UTC"\naltitude = "0 m"\nair_pressure = { from = "altitude", standard = "0.9 kPa" }',
        ),
    )
    columns = month(11)
    count = SECONDS.size
    columns["GP"], columns["GT"] = np.full(count, gauge_bar), np.full(count, 15.0)
    columns["G"] = columns["G"] / (1.36325 / 1.01325 * 273.15 / 288.15)
    found = questions(audited(tmp_path, plant, columns), "pressure kind")
    assert [each.words["candidates"].partition("=")[0] for each in found] == ([cause] if cause else [])
    if cause:
        assert found[0].numbers["ratio"] == pytest.approx({0.35: 3.895, 1.36325: 1.7433}[gauge_bar], rel=1e-3)


def test_the_other_heating_value_from_one_day_on(tmp_path: Path) -> None:
    """A new entry gives 11.06 kWh/m3 as the lower value, where 10.00 stood and 11.06 is the higher one.

    By hand: 1000 kW of 2500 kW are 40.0 %, of 2765 kW 36.2 %; the ratio is 1.106.
    """
    plant = sites.changed(
        PLANT,
        (
            '{ from = 2025-01-01, lower = 10.0, higher = 11.06, source = "sheet" },',
            '{ from = 2025-01-01, lower = 10.0, higher = 11.06, source = "sheet" },\n'
            '  { from = 2026-03-16, lower = 11.06, source = "invoice" },',
        ),
    )
    (finding,) = questions(audited(tmp_path, plant, month(12)), "own past")
    assert finding.words["candidates"] == "heating value basis=1.106"
    assert finding.suspects == ("gas",)


def test_a_ratio_is_named_only_where_its_uncertainty_allows() -> None:
    """Close to two familiar ratios both are named; known too badly, or next to none, nothing is."""
    states = (Familiar("a", 1.0549, 1.0549), Familiar("b", 1.0732, 1.0732))
    assert [each.cause for each in candidates(1.0545, 0.003, states)] == ["a"]
    assert [each.cause for each in candidates(1.0645, 0.012, states)] == ["b", "a"]
    assert candidates(1.0640, 0.003, states) == ()
    assert candidates(1.0549, 0.02, states) == ()
    assert candidates(1.0, 0.1, states) == ()
    assert candidates(float("nan"), 0.1, states) == ()
    assert [each.cause for each in candidates(1.0 / 3.6, 0.002, OF_FLOW)] == ["factor 3.6"]
    assert named(candidates(1.5, 0.01, OF_POWER)) == "transformer ratio=1.5"


def test_a_second_meter_must_exist_and_measure_the_same(tmp_path: Path) -> None:
    """The plant file says which tag is compared with which: a slip there is told with its line."""
    for slip, said in (
        ("nobody", "there is no tag"),
        ("supply", "measures temperature"),
        ("panel", "its own"),
    ):
        plant = PLANT.replace(
            'standard = "0.5 %", same_quantity_as = "power" }\ntags.index',
            f'standard = "0.5 %", same_quantity_as = "{slip}" }}\ntags.index',
        )
        site = sites.site(tmp_path / slip, plant, {"plant/a.csv": b"time,G\n"})
        with pytest.raises(Exception, match="same_quantity_as") as raised:
            open_site(site)
        assert said in str(raised.value)
