"""Clocks through the whole program: time rules, lags, midnight as 24:00, resets, overlaps with conflicts."""

from __future__ import annotations

from datetime import UTC, datetime
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from site_factory import (
    GAS_ENGINE,
    TWO_EXPORTS,
    Layout,
    audited,
    changed,
    export,
    figures,
    findings,
    instants,
    intervals,
    one_day,
)

DAY = "2025-06-03"
WHOLE_DAY = instants(DAY, "2025-06-04")
FULL_LOAD: dict[str, Any] = {"G": 250.0, "P": 1000.0, "F": 16.25, "S": 90.0, "R": 70.0}
ZONE = "Europe/Copenhagen"


def of_code(out: Path, code: str) -> list[dict[str, Any]]:
    """Findings of one kind."""
    return [finding for finding in findings(out) if finding["code"] == code]


def levels(seconds: np.ndarray, step_s: int, seed: int = 5) -> np.ndarray:
    """Load [1] in levels of irregular length, a function of the moment alone."""
    rng = np.random.default_rng(seed)
    lengths = rng.integers(6, 36, 4000) * 300
    edges = seconds[0] // 86_400 * 86_400 - 86_400 + np.cumsum(lengths)
    return rng.uniform(0.6, 1.0, edges.size)[np.searchsorted(edges, seconds // step_s * step_s, side="right")]


# --- time rules


BOTH_LOCAL = changed(
    TWO_EXPORTS,
    ('zone = "UTC"', f'zone = "{ZONE}"'),
    ('interval = "15 min"', 'interval = "1 h"'),
    ('files = ["power/*.csv"]\nclock = "UTC"', f'files = ["power/*.csv"]\nclock = "{ZONE}"'),
)


@pytest.mark.parametrize(
    ("first", "last", "start", "end"),
    [
        ("2025-03-26", "2025-04-03", "2025-03-30", "2025-04-03"),
        ("2025-10-22", "2025-10-30", "2025-10-22", "2025-10-26"),
    ],
)
def test_a_source_left_on_winter_time_is_named(
    tmp_path: Path, first: str, last: str, start: str, end: str
) -> None:
    """Declared as local, in truth on +01:00 all year: 60 min early in summer, so after March, before October.

    Nothing is shifted: every hour of power is where its stamps, read as declared, put it.
    """
    seconds = instants(f"{first}T00:00", f"{last}T01:00", clock=ZONE)
    load = levels(seconds, 60)
    winter = seconds + 3600  # what a clock on +01:00 shows, written as if it were UTC
    files = {
        "plant/a.csv": export(seconds, {"G": 250.0 * load, "F": 16.25 * load, "S": 90.0, "R": 70.0}),
        "power/a.csv": export(winter, {"P": 1000.0 * load}),
    }
    last_day = datetime.fromtimestamp(int(seconds[-1]) - 86_400, UTC).strftime("%Y-%m-%d")
    out = audited(tmp_path, BOTH_LOCAL, files, "--from", first, "--to", last_day)
    (finding,) = [each for each in of_code(out, "clock offset") if "others" in each["words"]]
    assert (finding["export"], finding["words"]["kind"]) == ("power", "time rule")
    assert finding["numbers"]["offset_s"] == pytest.approx(-3600.0, abs=30.0)
    assert finding["title"] == "The export power looks 60\u00a0min off (time rule?)"
    assert "exports.power" in finding["check"] and "No stamp was shifted" in finding["text"]
    assert finding["from"].startswith(start)
    in_skipped_hour = [each for each in of_code(out, "clock offset") if "sign" in each["words"]]
    assert [each["numbers"]["count"] for each in in_skipped_hour] == ([60] if first < "2025-06" else [])
    # The day of the change shows both rules; which it counts to depends on its events.
    assert abs((datetime.fromisoformat(finding["until"][:10]) - datetime.fromisoformat(end)).days) <= 1


# --- lag of a fuel meter

FIVE_MINUTES = changed(
    TWO_EXPORTS,
    ('tick = "1 min"', 'tick = "5 min"'),
    ('interval = "15 min"', 'interval = "5 min"'),
    (
        'running = { tag = "gas", above = "5 m3/h" }',
        'running = { tag = "gas", above = "5 m3/h" }\n'
        'steady = { tag = "power", change_below = "5 % of 1000 kW", within = "10 min" }',
    ),
).replace('hold = "1 min"', 'hold = "5 min"')


def test_a_fuel_meter_that_is_late_is_found_and_no_interval_is_impossible(tmp_path: Path) -> None:
    """Power 500, 1000, 500 kW, four intervals of 5 min each; the fuel of 2.5 times that is logged one later.

    By hand: 1000/1250 = 80 % in the fifth interval, 500/2500 = 20 % in the ninth, 40 % in the others; the
    hour holds 8000/20 000 = 40.0 %. Both are transients, none is impossible, the lag is told, not removed.
    """
    seconds = instants("2025-06-01", "2025-06-07T00:30", 300)
    power = np.round(1000.0 * levels(seconds, 300), 1)
    noon = int(np.flatnonzero(seconds == instants("2025-06-03T12:00", "2025-06-03T12:01")[0])[0])
    power[noon - 6 : noon + 18] = 500.0
    power[noon + 4 : noon + 8] = 1000.0
    fuel = np.roll(2.5 * power, 1)
    files = {
        "plant/a.csv": export(seconds, {"G": fuel / 10.0, "F": 1.25, "S": 90.0, "R": 70.0}),
        "power/a.csv": export(seconds, {"P": power}),
    }
    out = audited(tmp_path, FIVE_MINUTES, files, "--from", "2025-06-01", "--to", "2025-06-06")
    (finding,) = of_code(out, "clock offset")
    sign = 1.0 if finding["export"] == "plant" else -1.0
    assert sign * finding["numbers"]["offset_s"] == pytest.approx(300.0, abs=60.0)
    assert "5.0\u00a0min" in finding["text"] and "No stamp was shifted" in finding["text"]
    table = intervals(out)
    hour = slice(noon, noon + 12)
    assert table["start"][noon].startswith("2025-06-03T12:00")
    expected = [40.0] * 4 + [80.0] + [40.0] * 3 + [20.0] + [40.0] * 3
    assert table["gross_pct"][hour] == pytest.approx(expected, rel=1e-9)
    assert table["work_gross_kW"][hour].sum() / table["fuel_in_kW"][hour].sum() == pytest.approx(
        0.4, rel=1e-9
    )
    assert table["verdict"][noon + 4] == table["verdict"][noon + 8] == "transient"
    assert "impossible" not in table["verdict"]


# --- stamps of the day's end, and clocks that were reset

QUARTERS = GAS_ENGINE.replace('between = "step", hold = "1 min"', 'between = "mean", stamp_marks = "end"')


@pytest.mark.parametrize("midnight", ["24:00", "next day"])
def test_a_day_that_ends_at_24_is_whole(tmp_path: Path, midnight: str) -> None:
    """Means of 15 min stamped at their end, the last 24:00: 96 of them, 24 000 and 60 000 kWh, no gap."""
    ends = instants(DAY, "2025-06-04", 900) + 900
    text = export(ends, FULL_LOAD).decode()
    if midnight == "24:00":
        text = text.replace("2025-06-04 00:00:00", f"{DAY} 24:00:00")
        assert "24:00:00" in text
    out = audited(tmp_path, QUARTERS, {"plant/a.csv": text.encode()}, *one_day(DAY))
    assert figures(out)["work_gross_kWh"]["value"] == pytest.approx(24_000.0, rel=1e-9)
    assert figures(out)["fuel_in_kWh"]["value"] == pytest.approx(60_000.0, rel=1e-9)
    assert figures(out)["gross_pct"]["coverage_pct"] == 100.0
    assert findings(out) == []


@pytest.mark.parametrize("year", [1970, 2000])
def test_hours_of_a_reset_clock_are_missing_and_told(tmp_path: Path, year: int) -> None:
    """Two of 24 hours dated by a clock without battery: 22 000 kWh logged, a gap of 2 h, the reset named."""
    lost = (WHOLE_DAY >= WHOLE_DAY[600]) & (WHOLE_DAY < WHOLE_DAY[720])
    start = int(datetime(year, 1, 1, tzinfo=UTC).timestamp())
    stamps = np.where(lost, start + WHOLE_DAY - WHOLE_DAY[600], WHOLE_DAY)
    out = audited(tmp_path, GAS_ENGINE, {"plant/a.csv": export(stamps, FULL_LOAD)}, *one_day(DAY))
    (reset,) = of_code(out, "clock step")
    assert reset["title"] == f"The clock of the export plant was reset to {year}"
    assert reset["numbers"]["reset"] == 120 and reset["line"] == 602
    assert f"{2025.42 - year:.1f}\u00a0years off" in reset["text"]
    (gap,) = of_code(out, "gap")
    assert gap["numbers"]["gap_s"] == pytest.approx(7200.0, abs=60.0)
    assert figures(out)["work_gross_kWh"]["logged"] == pytest.approx(22_000.0, rel=1e-9)
    assert figures(out)["gross_pct"]["coverage_pct"] == pytest.approx(100.0 * 22 / 24, abs=0.05)


# --- overlap with a conflict


def test_an_overlap_with_other_values_is_decided_by_declared_precedence(tmp_path: Path) -> None:
    """Monthly export 1000 kW, daily export 990 kW for one hour: the choice is worth 10 kWh."""
    month_first = changed(
        TWO_EXPORTS, ('files = ["power/*.csv"]', 'files = ["power/month*.csv", "power/day*.csv"]')
    )
    fuel = {name: value for name, value in FULL_LOAD.items() if name != "P"}
    other = np.full(240, 1000.0)
    other[60:120] = 990.0
    files = {
        "plant/a.csv": export(WHOLE_DAY, fuel),
        "power/month.csv": export(WHOLE_DAY, {"P": 1000.0}),
        "power/day3.csv": export(WHOLE_DAY[480:720], {"P": other}),
    }
    day_first = month_first.replace(
        '"power/month*.csv", "power/day*.csv"', '"power/day*.csv", "power/month*.csv"'
    )
    for name, plant, energy_kWh, kept in (
        ("month", month_first, 24_000.0, "power/month.csv"),
        ("day", day_first, 23_990.0, "power/day3.csv"),
    ):
        out = audited(tmp_path / name, plant, files, *one_day(DAY))
        assert figures(out)["work_gross_kWh"]["value"] == pytest.approx(energy_kWh, rel=1e-9)
        (conflict,) = of_code(out, "conflicting values")
        assert conflict["energy_kWh"] == pytest.approx(10.0, rel=1e-9)
        assert conflict["numbers"]["count"] == 60 and conflict["words"]["kept"] == kept
        assert "The choice moves the energy by 10.0\u00a0kWh" in conflict["text"]
        assert "10.0\u00a0kWh" in (out / "report.html").read_text(encoding="utf-8")


def test_a_conflict_of_a_volume_is_told_in_energy_and_volume(tmp_path: Path) -> None:
    """250 m3/h against 244 m3/h of gas for one hour: the choice is worth 6 m3 of 10 kWh, 60 kWh."""
    other = FULL_LOAD | {"G": 244.0}
    plant = changed(GAS_ENGINE, ('files = ["plant/*.csv"]', 'files = ["plant/a.csv", "plant/b.csv"]'))
    files = {"plant/a.csv": export(WHOLE_DAY, FULL_LOAD), "plant/b.csv": export(WHOLE_DAY[60:120], other)}
    out = audited(tmp_path, plant, files, *one_day(DAY))
    (conflict,) = of_code(out, "conflicting values")
    assert conflict["energy_kWh"] == pytest.approx(60.0, rel=1e-9)
    assert "The choice moves the energy by 60.0\u00a0kWh (6.00\u00a0m³)" in conflict["text"]


def test_a_conflict_of_a_temperature_claims_no_effect(tmp_path: Path) -> None:
    """90 against 88 degC: what the choice moves hangs on the other inputs; only what passed is told."""
    other = FULL_LOAD | {"S": 88.0}
    plant = changed(GAS_ENGINE, ('files = ["plant/*.csv"]', 'files = ["plant/a.csv", "plant/b.csv"]'))
    files = {"plant/a.csv": export(WHOLE_DAY, FULL_LOAD), "plant/b.csv": export(WHOLE_DAY[60:120], other)}
    out = audited(tmp_path, plant, files, *one_day(DAY))
    (conflict,) = of_code(out, "conflicting values")
    assert "The choice moves" not in conflict["text"] and "passed in that time" in conflict["text"]


@pytest.mark.parametrize("rule", ["by order", "drop"])
def test_the_hour_that_autumn_repeats_by_declared_rule(tmp_path: Path, rule: str) -> None:
    """25 h of 1000 kW: all by the order of lines, or 23 h and two hours missing where the hour is dropped."""
    plant = changed(
        GAS_ENGINE,
        ('zone = "UTC"', f'zone = "{ZONE}"'),
        ('clock = "UTC"', f'clock = "{ZONE}"\nrepeated_hour = "{rule}"'),
    )
    seconds = instants("2025-10-25T23:50", "2025-10-27T00:10", clock=ZONE)
    files = {"plant/a.csv": export(seconds, FULL_LOAD, Layout(clock=ZONE))}
    code, hours = (0, 25.0) if rule == "by order" else (0, 23.0)
    out = audited(tmp_path, plant, files, *one_day("2025-10-26"), expect=code)
    assert figures(out)["work_gross_kWh"]["logged"] == pytest.approx(hours * 1000.0, abs=20.0)
    assert figures(out)["gross_pct"]["coverage_pct"] == pytest.approx(100.0 * hours / 25.0, abs=0.1)
    assert len(of_code(out, "repeated hour")) == (rule == "drop")
