"""Values that lie, from export files to the published statement, with numbers worked by hand."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest
from site_factory import (
    GAS_ENGINE,
    HEAT_ENGINE,
    audited,
    changed,
    export,
    figures,
    findings,
    instants,
    intervals,
    one_day,
    run,
    site,
)

DAY = "2025-06-03"
WHOLE_DAY = instants(DAY, "2025-06-04")
FULL_LOAD = {"G": 250.0, "P": 1000.0, "F": 16.25, "S": 90.0, "R": 70.0}
"""2500 kW of fuel (lower), 1000 kW of power, 16.25 kg/s x 4 kJ/(kg K) x 20 K = 1300 kW of heat."""
POWER = 'column = "P", unit = "kW", between = "step", hold = "1 min"'
SUPPLY = 'column = "S", unit = "degC", between = "step", hold = "1 min"'


def codes(out: Path) -> set[str]:
    """Codes of all findings of a statement."""
    return {str(each["code"]) for each in findings(out)}


@pytest.mark.parametrize("declared", [True, False])
def test_zeros_of_a_logger_that_lost_the_signal_are_missing(tmp_path: Path, declared: bool) -> None:
    """Zero power from 10:00 to 14:00 while the fuel burns: 20 000/50 000 = 40.0 %, never 20 000/60 000.

    By hand; the 60 000 kWh of fuel are still published. Without the declaration the zeros are believed.
    """
    evidence = ', not_zero_while = { tag = "gas", above = "100 m3/h" }' if declared else ""
    power = np.full(WHOLE_DAY.size, 1000.0)
    power[600:840] = 0.0
    files = {"plant/a.csv": export(WHOLE_DAY, FULL_LOAD | {"P": power})}
    place = site(tmp_path / "site", changed(GAS_ENGINE, (POWER, POWER + evidence)), files)
    out = tmp_path / "out"
    assert run("audit", place, "--out", out, "--quiet", *one_day(DAY)).code == (6 if declared else 0)
    found = figures(out)
    assert found["fuel_in_kWh"]["value"] == pytest.approx(60_000.0, rel=1e-9)
    assert found["work_gross_kWh"]["value"] == pytest.approx(20_000.0, rel=1e-9)
    assert found["gross_pct"]["value"] == pytest.approx(40.0 if declared else 100.0 / 3.0, rel=1e-9)
    assert found["gross_pct"]["status"] == ("provisional" if declared else "firm")
    assert ("zero while running" in codes(out)) is declared
    if declared:
        assert found["gross_pct"]["coverage_pct"] == pytest.approx(83.3, abs=0.05)
        assert (intervals(out)["verdict"] == "not assessed").sum() == 16
        rows = (out / "dispositions.csv").read_text(encoding="utf-8-sig")
        assert "zero while running" in rows


def test_a_spike_and_a_jump_do_not_reach_the_statement(tmp_path: Path) -> None:
    """Two supply readings of 129 degC within the range would add 2 x 1 min x 2535 kW: they are left out.

    By hand: 1440 - 2 minutes of 1300 kW are 31 156.7 kWh.
    """
    supply = np.full(WHOLE_DAY.size, 90.0)
    supply[300] = supply[900] = 129.0
    files = {"plant/a.csv": export(WHOLE_DAY, FULL_LOAD | {"S": supply})}
    rules = (('spike = "5 K"', "spikes"), ('change_at_most = "5 K/min"', "changed too fast"))
    for rule, code in rules:
        plant = changed(GAS_ENGINE, (SUPPLY, f"{SUPPLY}, {rule}"))
        out = audited(tmp_path / code, plant, files, *one_day(DAY))
        assert figures(out)["useful_heat_kWh"]["value"] == pytest.approx(1438 / 60 * 1300.0, rel=1e-9)
        assert code in codes(out)


def test_a_meter_at_the_end_of_its_range_is_told_with_its_share(tmp_path: Path) -> None:
    """Six hours at 1000 kW, the end, of a day at 900: 6000 of 22 200 kWh are a lower bound (27.0 %)."""
    power = np.full(WHOLE_DAY.size, 900.0)
    power[:360] = 1000.0
    plant = changed(GAS_ENGINE, (POWER, f"{POWER}, saturates_at = [1000]"))
    out = audited(
        tmp_path, plant, {"plant/a.csv": export(WHOLE_DAY, FULL_LOAD | {"P": power})}, *one_day(DAY)
    )
    assert figures(out)["work_gross_kWh"]["value"] == pytest.approx(22_200.0, rel=1e-9)
    (told,) = (each for each in findings(out) if each["code"] == "at the end of its range")
    assert "25.0\u00a0% of its time, 27.0\u00a0% of its sum" in json.dumps(told, ensure_ascii=False)


@pytest.mark.parametrize(
    ("creep_m3_per_h", "volume_m3"), [(-0.8, -160.0), (3.0, 600.0)], ids=["backwards", "a leak"]
)
def test_creep_at_standstill_is_listed_apart_with_its_sign(
    tmp_path: Path, creep_m3_per_h: float, volume_m3: float
) -> None:
    """200 h of standstill in a month of 720 h: -160 m3 (-0.12 %) or +600 m3 (+0.46 %) of 130 000 m3.

    By hand: 520 h x 250 m3/h = 130 000 m3, 1 300 000 kWh lower; 520 000 kWh of power: 40.0 % either way.
    """
    month = instants("2025-06-01", "2025-07-01")
    still = np.arange(month.size) >= 520 * 60
    columns = {name: np.where(still, 0.0, value) for name, value in FULL_LOAD.items() if name not in "SR"}
    columns |= {"G": np.where(still, creep_m3_per_h, 250.0), "S": 90.0, "R": 70.0}
    out = audited(tmp_path, GAS_ENGINE, {"plant/a.csv": export(month, columns)}, "--month", "2025-06")
    (told,) = (each for each in findings(out) if each["code"] == "creep at standstill")
    said = json.dumps(told, ensure_ascii=False).replace("\u2212", "-")
    assert f"{volume_m3:.0f}\u00a0m³" in said
    assert figures(out)["gross_pct"]["value"] == pytest.approx(40.0, rel=1e-9)
    assert volume_m3 / 130_000.0 == pytest.approx(-0.0012 if volume_m3 < 0.0 else 0.0046, abs=5e-5)
    hours = abs(volume_m3 / creep_m3_per_h)
    assert hours == pytest.approx(200.0)


def test_a_swapped_pair_is_asked_about_and_never_swapped(tmp_path: Path) -> None:
    """Supply and return exchanged: -1300 kW of heat for the whole day, and the question which is which."""
    files = {"plant/a.csv": export(WHOLE_DAY, FULL_LOAD | {"S": 70.0, "R": 90.0})}
    place = site(tmp_path / "site", GAS_ENGINE, files)
    out = tmp_path / "out"
    assert run("audit", place, "--out", out, "--quiet", *one_day(DAY)).code in (0, 4, 6)
    (told,) = (each for each in findings(out) if each["code"] == "pair perhaps swapped")
    assert "swapped" in json.dumps(told)
    value = figures(out)["useful_heat_kWh"]["value"]
    assert value == pytest.approx(-31_200.0, rel=1e-9)


EXCHANGER = changed(
    HEAT_ENGINE,
    ('kind = "generic heat engine"\nheadline = "gross"\n', 'kind = "heat exchanger"\n'),
    ('running = { tag = "power", above = "1 kW" }\n', 'running = { tag = "flow", above = "1 kg/s" }\n'),
    ('ceiling = { kind = "finite source and sink", source = "heat", sink = "air" }\n', ""),
    ('streams.power = { role = "work out", by = "power", tag = "power", measured_at = "shaft" }\n', ""),
    ('role = "rejected heat"', 'role = "useful heat"'),
    (
        'column = "A2", unit = "degC", between = "step", hold = "1 min", range = [-50, 90]',
        'column = "A2", unit = "degC", between = "step", hold = "1 min", range = [-50, 700]',
    ),
)


def test_crossing_temperatures_of_an_exchanger_are_impossible(tmp_path: Path) -> None:
    """Hot 90 to 70, cold 60 to 95 degC: the cold side leaves 5 K hotter than the hot side came in.

    A cold side that leaves at 85, hotter than the hot side leaves, is the counterflow it should be. Heat
    balances by hand: 35 x 20 K = 20 x 35 K, 35 x 20 K = 28 x 25 K (kilowatts).
    """
    for cold_out, cold_flow, verdict in ((95.0, 20.0, "impossible"), (85.0, 28.0, "no ceiling")):
        columns = {"M": 35.0, "T1": 90.0, "T2": 70.0, "P": 0.0, "A": cold_flow, "A1": 60.0, "A2": cold_out}
        place = site(tmp_path / verdict, EXCHANGER, {"plant/a.csv": export(WHOLE_DAY, columns)})
        out = tmp_path / f"out of {verdict}"
        run("audit", place, "--out", out, "--quiet", *one_day(DAY))
        assert set(intervals(out)["verdict"]) == {verdict}
        assert "pair perhaps swapped" not in codes(out)
