"""Clocks of exports held against each other: offsets, time rules and drift are found, and nothing else is.

The signals are made by hand with a known lag; a lag of an hour is what a wrong time rule makes, some minutes
in a month are the drift of a free-running clock (common practice, no source).
"""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from cleaning_factory import Setting, make_tag
from scipy.stats import theilslopes

from auditor.cleaning import CleaningSettings, compare_clocks
from auditor.cleaning.clock_lag import theil_sen
from auditor.records.findings import Finding, FindingCode
from auditor.records.machines import Running
from auditor.records.ticks import TickTable

MONTH = Setting((), hours=31 * 24)
MINUTES = np.arange(31 * 1440)


def load(seed: int, minutes: np.ndarray = MINUTES) -> np.ndarray:
    """Load of a machine [1]: levels held for half an hour to three hours, ramps of four minutes."""
    rng = np.random.default_rng(seed)
    edges = np.cumsum(rng.integers(30, 180, 3000))
    levels = rng.uniform(0.5, 1.0, edges.size)
    level = levels[np.searchsorted(edges, np.arange(-300, MINUTES.size + 300))]
    ramp = np.convolve(level, np.full(4, 0.25), "same")
    return np.interp(minutes, np.arange(-300, MINUTES.size + 300), ramp)


def noisy(values: np.ndarray, seed: int, share: float = 0.01) -> np.ndarray:
    """Values with white noise of a share of full scale."""
    return values + share * np.random.default_rng(seed).standard_normal(values.size)


def compare(exports: dict[str, dict[str, np.ndarray]], **edits: Any) -> list[Finding]:
    """Compare the clocks of exports, each given by its signals; edits by name of tag or export."""
    quantity, clock, native = (edits.get(name, {}) for name in ("quantity", "clock", "native_step_s"))
    tags = {
        tag: make_tag(tag, "step", export=export, quantity=quantity.get(tag, "power"))
        for export, signals in exports.items()
        for tag in signals
    }
    declared = MONTH.settings.exports["logger"]
    settings = CleaningSettings(
        exports={
            name: replace(declared, name=name, tags=tuple(signals), clock=clock.get(name, "UTC"))
            for name, signals in exports.items()
        },
        tags=tags,
        distrust=(),
        running={"engine": Running(next(iter(tags)), 0.1, None)},
        users=dict.fromkeys(tags, ("engine",)),
    )
    mean = np.array([values for signals in exports.values() for values in signals.values()]).T
    table: Any = {name: None for name in ("noise", "noise_lag1", "cells", "seconds", "bridges", "carry")}
    ticks = TickTable(
        grid=MONTH.grid,
        columns=tuple(tags),
        mean=mean,
        covered_s=np.full(mean.shape, 60.0),
        samples=np.ones(mean.shape, np.int32),
        native_step_s=np.array([native.get(tag, 60.0) for tag in tags]),
        tags=tuple(tags),
        **table,
    )
    found = list(compare_clocks(ticks, settings))
    assert {finding.code for finding in found} <= {FindingCode.CLOCK_OFFSET}
    return found


def days_of(finding: Finding) -> tuple[float, float]:
    """First and last day of a finding, from 0; the end is left out."""
    start_us = MONTH.grid.period.start_us
    assert finding.start_us is not None and finding.end_us is not None
    return (finding.start_us - start_us) / 86.4e9, (finding.end_us - start_us) / 86.4e9


@pytest.mark.parametrize("seed", range(8))
def test_clean_months_give_no_finding(seed: int) -> None:
    """Three exports on one time, noise of 1 to 3 %, two days missing, heat that arrives 8 min late."""
    true = load(seed)
    late = load(seed, MINUTES - 8)
    gas = noisy(2.5 * true, seed + 100, 0.03)
    gas[20_000:22_880] = np.nan
    found = compare(
        {
            "engine": {"power": noisy(true, seed + 200)},
            "gas": {"gas": gas},
            "heat": {"flow": noisy(0.8 * true, seed + 300, 0.02), "supply": noisy(late, seed + 400, 0.02)},
        },
        quantity={"supply": "temperature", "gas": "volume", "flow": "volume flow"},
    )
    assert found == []


@pytest.mark.parametrize("seed", range(4))
def test_signals_that_have_nothing_in_common_give_no_finding(seed: int) -> None:
    """Two loads that move by themselves, and a load against noise alone."""
    noise = noisy(np.zeros(MINUTES.size), seed + 20, 1.0)
    assert compare({"a": {"power": load(seed)}, "b": {"other": load(seed + 50), "noise": noise}}) == []


def test_events_that_come_back_every_half_hour_tell_no_lag() -> None:
    """A furnace that reverses every 20 min shows the same lag every 20 min: no peak is clear."""
    wave = np.sign(np.sin(2.0 * np.pi * MINUTES / 20.0))
    shifted = np.roll(wave, 7)
    assert compare({"a": {"power": noisy(wave, 1)}, "b": {"other": noisy(shifted, 2)}}) == []


@pytest.mark.parametrize(
    ("lag_min", "kind"), [(7, "offset"), (-7, "offset"), (60, "time rule"), (-120, "time rule")]
)
def test_a_constant_offset_is_found_with_its_sign(lag_min: int, kind: str) -> None:
    """Stamps that are late (plus) or early (minus) by a constant, over the whole month."""
    exports = {
        "engine": {"power": noisy(load(3), 1)},
        "gas": {"gas": noisy(2.5 * load(3, MINUTES - lag_min), 2, 0.05)},
    }
    (finding,) = compare(exports)
    assert (finding.export, finding.words["others"], finding.words["kind"]) == ("gas", "engine", kind)
    offset, spread = finding.numbers["offset_s"], finding.numbers["spread_s"]
    assert abs(offset - 60.0 * lag_min) <= spread <= 60.0
    assert days_of(finding) == (0.0, 31.0)


def test_a_clock_that_is_set_shows_as_a_stretch() -> None:
    """Seven minutes ahead until the 22nd, right from then on: the stretch ends there."""
    lag = np.where(MINUTES < 21 * 1440, 7, 0)
    (finding,) = compare(
        {"oil": {"flow": noisy(load(4), 1)}, "power": {"power": noisy(load(4, MINUTES - lag), 2)}}
    )
    assert finding.numbers["offset_s"] == pytest.approx(420.0, abs=30.0)
    assert days_of(finding) == (0.0, 21.0)


def test_of_two_exports_the_one_that_keeps_summer_time_is_asked_first() -> None:
    """One hour apart from the 26th on; a zone with summer time against UTC."""
    lag = np.where(MINUTES < 26 * 1440, 0, -60)
    (finding,) = compare(
        {"boiler": {"flow": noisy(load(5, MINUTES - lag), 1)}, "power": {"power": noisy(load(5), 2)}},
        clock={"boiler": "Europe/Copenhagen"},
    )
    assert (finding.export, finding.words["kind"]) == ("boiler", "time rule")
    assert finding.numbers["offset_s"] == pytest.approx(-3600.0, abs=30.0)
    assert days_of(finding) == (26.0, 31.0)


def test_of_three_exports_the_odd_one_is_named_once() -> None:
    """One export is twelve minutes late against two that agree."""
    (finding,) = compare(
        {
            "late": {"power": noisy(load(6, MINUTES - 12), 1)},
            "gas": {"gas": noisy(load(6), 2)},
            "heat": {"flow": noisy(load(6), 3)},
        }
    )
    assert (finding.export, finding.words["others"]) == ("late", "gas, heat")
    assert finding.numbers["offset_s"] == pytest.approx(720.0, abs=30.0)


@pytest.mark.parametrize("minutes_per_month", [3.0, -5.0, 10.0])
def test_drift_is_estimated(minutes_per_month: float) -> None:
    """A free-running clock that gains or loses 3 to 10 min in 30 days, from zero."""
    lag = minutes_per_month / 30.0 * MINUTES / 1440.0
    found = compare({"a": {"power": noisy(load(7), 1)}, "b": {"other": noisy(load(7, MINUTES - lag), 2)}})
    (finding,) = found
    assert finding.words["kind"] == "drift"
    assert finding.numbers["drift_s_per_day"] == pytest.approx(2.0 * minutes_per_month, rel=0.1)
    assert abs(finding.numbers["first_s"]) <= 45.0
    assert finding.numbers["last_s"] == pytest.approx(62.0 * minutes_per_month, abs=45.0)


def test_a_lag_of_the_plant_is_no_lag_of_the_clock() -> None:
    """Ash that follows the load by 25 min, while the power of the same export follows at once: withdrawn."""
    assert (
        compare(
            {
                "a": {"fuel": noisy(load(8), 1)},
                "b": {"ash": noisy(load(8, MINUTES - 25), 2), "power": noisy(load(8), 3)},
            }
        )
        == []
    )


def test_signals_logged_once_an_hour_tell_no_minutes() -> None:
    """A meter that is read once an hour is not compared."""
    exports = {"a": {"power": load(9)}, "b": {"meter": load(9, MINUTES - 30)}}
    assert len(compare(exports)) == 1
    assert compare(exports, native_step_s={"meter": 3600.0}) == []


def test_theil_sen_agrees_with_a_library() -> None:
    """Slope and interval against scipy.stats.theilslopes, some points wild."""
    rng = np.random.default_rng(1)
    x = np.sort(rng.choice(60, 25, replace=False))
    y = 3.0 * x + rng.standard_normal(x.size)
    y[[3, 17]] += 200.0
    slope, low, high = theil_sen(x, y)
    expected = theilslopes(y, x, 0.95)
    assert slope == pytest.approx(expected[0], rel=1e-12)
    assert (low, high) == pytest.approx((expected[2], expected[3]), rel=1e-12)
