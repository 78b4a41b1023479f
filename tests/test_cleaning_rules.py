"""What a value means between stamps: step, line, mean, amount, state, and how far a hold reaches."""

from __future__ import annotations

import numpy as np
import pytest
from cleaning_factory import Setting, cells, integral, make_tag, run, seconds, series

KW = 1000.0

# Common practice, no source: a power stored only when it changed, then falling to zero within the hour.
# By hand, step: (1000*50 + 800*2 + 600*2 + 400*2 + 200*2 + 0*2)/60 = 54 000/60 = 900 kW;
# straight lines: (900*50 + 700*2 + 500*2 + 300*2 + 100*2 + 0*2)/60 = 48 200/60 = 803.33 kW.
# The mean of the six rows, 500 kW, means nothing.
STORED_ON_CHANGE = {
    0: 1000 * KW,
    3000: 800 * KW,
    3120: 600 * KW,
    3240: 400 * KW,
    3360: 200 * KW,
    3480: 0.0,
    3600: 0.0,
}


@pytest.mark.parametrize(("between", "mean_kW"), [("step", 900.0), ("line", 48_200.0 / 60.0)])
@pytest.mark.parametrize("tick_s", [20, 60, 300, 3600])
def test_values_stored_on_change_are_weighted_by_time(between: str, mean_kW: float, tick_s: int) -> None:
    """The hour's mean is that of time, not of rows, on whatever ticks."""
    setting = Setting([make_tag("power", between)], tick_s=tick_s)
    table, _ = run(setting, series("power", STORED_ON_CHANGE))
    assert integral(table, "power") / 3600.0 / KW == pytest.approx(mean_kW, rel=1e-12)
    assert seconds(table, "power")["covered"] == 3600.0


def test_line_is_exact_within_each_tick() -> None:
    """A line from 0 at 0 s to 100 at 100 s: integral t^2/2 over each tick."""
    setting = Setting([make_tag("level", "line", hold_s=200.0)], hours=1 / 30, tick_s=30)
    table, _ = run(setting, series("level", {0: 0.0, 100: 100.0, 120: 100.0}))
    expected = [15.0, 45.0, 75.0, (100**2 / 2 - 90**2 / 2 + 20 * 100) / 30.0]
    assert table.mean[:, 0] == pytest.approx(expected, rel=1e-14)


def test_step_holds_no_longer_than_its_hold() -> None:
    """After the hold the second is stale until the next sample; after the last one it was never logged."""
    setting = Setting([make_tag("level", "step", hold_s=600.0)])
    table, _ = run(setting, series("level", {60: 5.0, 1800: 7.0}))
    assert seconds(table, "level") == {
        "covered": 1200.0,
        "stale": 1140.0,
        "rejected": 0.0,
        "never logged": 60.0 + 1200.0,
    }
    assert integral(table, "level") == pytest.approx(600.0 * 12.0)
    assert np.isnan(table.mean[0, 0])
    assert np.isnan(table.mean[15, 0])


def test_line_covers_nothing_between_samples_too_far_apart() -> None:
    """Two samples farther apart than the hold say nothing about the time between them."""
    setting = Setting([make_tag("level", "line", hold_s=600.0)])
    table, _ = run(setting, series("level", {0: 5.0, 600: 7.0, 1201: 9.0, 1800: 9.0}))
    assert seconds(table, "level") == {
        "covered": 600.0 + 599.0,
        "stale": 601.0 + 600.0,
        "rejected": 0.0,
        "never logged": 1200.0,
    }
    assert table.covered_s[10:21, 0] == pytest.approx([0.0] * 10 + [59.0])


@pytest.mark.parametrize("between", ["step", "line", "state"])
def test_an_unusable_cell_ends_the_value_before_it(between: str) -> None:
    """From the status word on the time is rejected, at most a hold; the old value does not go on."""
    states = {"off": "off", "on": "on"} if between == "state" else None
    tag = make_tag("level", between, hold_s=900.0, states=states)
    table, _ = run(
        Setting([tag]), series("level", {0: 1.0, 600: 1.0, 1200: "Bad", 1800: 1.0, 2400: 1.0, 3000: "Bad"})
    )
    found = seconds(table, "level")
    line = between == "line"
    assert found["covered"] == (600.0 + 600.0 if line else 1200.0 + 1200.0)
    assert found["rejected"] == (600.0 + 600.0 + 600.0 + 600.0 if line else 600.0 + 600.0)
    assert found["stale"] == 0.0
    assert cells(table, "level") == {"used": 4, "status word": 2}


def test_rejection_too_lasts_no_longer_than_the_hold() -> None:
    """A rejected cell says something about its hold, not about the rest of the gap."""
    setting = Setting([make_tag("level", "step", hold_s=600.0)])
    table, _ = run(setting, series("level", {0: 1.0, 600: "Bad", 3000: 1.0}))
    assert seconds(table, "level") == {
        "covered": 1200.0,
        "stale": 1800.0,
        "rejected": 600.0,
        "never logged": 0.0,
    }


def test_an_empty_cell_says_only_that_the_signal_was_not_due() -> None:
    """In a table of fast and slow signals the slow one's value holds over empty cells."""
    setting = Setting([make_tag("level", "step", hold_s=1800.0)])
    table, _ = run(setting, series("level", {0: 1.0, 600: "", 1200: "", 1800: 2.0}))
    assert seconds(table, "level")["covered"] == 3600.0
    assert integral(table, "level") == pytest.approx(1800.0 * 3.0)


@pytest.mark.parametrize(("marks", "shift_s"), [("end", 900), ("start", 0)])
@pytest.mark.parametrize("between", ["mean", "amount"])
def test_means_and_amounts_belong_to_the_stretch_beside_their_stamp(
    between: str, marks: str, shift_s: int
) -> None:
    """Four quarter-hours of 100, 200, 300 and 400 kW, or 25, 50, 75 and 100 kWh, stamped at either end."""
    scale = 1.0 if between == "mean" else 900.0
    tag = make_tag("power", between, stamp_marks=marks, hold_s=1000.0)
    rows = {quarter * 900 + shift_s: (quarter + 1) * 100.0 * scale for quarter in range(-1, 5)}
    table, _ = run(Setting([tag], tick_s=300), series("power", rows))
    assert table.mean[:, 0] == pytest.approx(np.repeat([100.0, 200.0, 300.0, 400.0], 3), rel=1e-14)
    assert seconds(table, "power")["covered"] == 3600.0
    assert cells(table, "power") == {"used": 4, "outside period": 2}
    ticks = [2, 5, 8, 11] if marks == "end" else [0, 3, 6, 9]
    assert np.flatnonzero(table.samples[:, 0]).tolist() == ticks


@pytest.mark.parametrize("marks", ["start", "end"])
def test_an_isolated_amount_lasts_one_native_step(marks: str) -> None:
    """After a gap longer than the hold an amount is spread over the usual step, so its rate stays right."""
    tag = make_tag("energy", "amount", stamp_marks=marks, hold_s=700.0)
    rows = {600: 60.0, 1200: 60.0, 1800: 60.0, 3000: 60.0}
    table, _ = run(Setting([tag]), series("energy", rows))
    assert integral(table, "energy") == pytest.approx(240.0, rel=1e-12)
    assert seconds(table, "energy")["covered"] == 2400.0
    known = table.mean[np.isfinite(table.mean[:, 0]), 0]
    assert known == pytest.approx(np.full(40, 0.1), rel=1e-12)


def test_a_rejected_mean_rejects_its_own_stretch() -> None:
    """The quarter-hour that ends at the status word is rejected, not the one after it."""
    tag = make_tag("power", "mean", stamp_marks="end", hold_s=900.0)
    table, _ = run(Setting([tag]), series("power", {0: 1.0, 900: 1.0, 1800: "Bad", 2700: 3.0, 3600: 4.0}))
    assert seconds(table, "power") == {
        "covered": 2700.0,
        "stale": 0.0,
        "rejected": 900.0,
        "never logged": 0.0,
    }
    assert np.isnan(table.mean[15:30, 0]).all()
    assert integral(table, "power") == pytest.approx(900.0 * 8.0)


def test_states_become_shares_of_covered_time() -> None:
    """Two raw texts may name one state; its column holds the share of covered time."""
    tag = make_tag("breaker", "state", hold_s=3600.0, states={"0": "open", "1": "closed", "ON": "closed"})
    table, _ = run(Setting([tag], tick_s=1200), series("breaker", {300: 1.0, 600: 2.0, 1500: 0.0, 3000: 1.0}))
    assert table.columns == ("breaker=open", "breaker=closed")
    assert table.tags == ("breaker", "breaker")
    assert table.mean[:, 1] == pytest.approx([1.0, 0.25, 0.5])
    assert table.mean.sum(axis=1) == pytest.approx([1.0, 1.0, 1.0])
    assert table.covered_s[:, 0] == pytest.approx([900.0, 1200.0, 1200.0])


def test_flows_below_the_cut_off_count_as_zero_but_are_tested_first() -> None:
    """The cut-off acts on the magnitude, after the believable range."""
    tag = make_tag("flow", "step", cut_off=0.5, believable=(-3.0, 20.0), hold_s=600.0)
    rows = {0: 0.4, 600: -0.4, 1200: -2.0, 1800: 0.5, 2400: 21.0, 3000: 7.0}
    table, _ = run(Setting([tag]), series("flow", rows))
    assert table.mean[::10, 0] == pytest.approx([0.0, 0.0, -2.0, 0.5, np.nan, 7.0], nan_ok=True)
    assert cells(table, "flow") == {"used": 5, "out of range": 1}
    tag = make_tag("flow", "step", cut_off=0.5, believable=(0.1, 20.0), hold_s=600.0)
    table, _ = run(Setting([tag]), series("flow", rows))
    assert cells(table, "flow") == {"used": 3, "out of range": 3}


def test_raw_numbers_become_si_by_scale_and_offset() -> None:
    """Degrees Celsius become kelvin, and the believable range is that of kelvin."""
    tag = make_tag("warmth", "step", offset=273.15, believable=(273.15, 373.15))
    table, _ = run(Setting([tag]), series("warmth", {0: 20.0, 1800: 120.0}))
    assert table.mean[0, 0] == pytest.approx(293.15)
    assert cells(table, "warmth") == {"used": 1, "out of range": 1}
    assert table.cells.last["warmth", 4].raw == "120"


@pytest.mark.parametrize("between", ["step", "line"])
def test_a_constant_power_over_the_days_of_clock_changes(between: str) -> None:
    """1000 kW over 25 h are 25 000 kWh, over 23 h 23 000 kWh, with every second covered.

    Common practice, no source; the length of the days: Directive 2000/84/EC.
    """
    for hours in (25.0, 23.0):
        setting = Setting([make_tag("power", between, hold_s=300.0)], hours=hours)
        rows = series("power", [(60.0 * minute, 1000 * KW) for minute in range(round(hours * 60) + 1)])
        table, _ = run(setting, rows)
        assert integral(table, "power") / 3.6e6 == pytest.approx(hours * 1000.0, rel=1e-12)
        assert seconds(table, "power")["covered"] == hours * 3600.0


def test_missing_is_never_zero() -> None:
    """A day at 1000 kW from 2500 kW of fuel, power missing from 10 to 14 h.

    20 000 kWh are known, 60 000 kWh of fuel, 50 000 of them at known times: 40 %, not 33.3 %. Common
    practice, no source.
    """
    setting = Setting([make_tag(name, "step", hold_s=60.0) for name in ("power", "fuel")], hours=24.0)
    rows = [
        *(row for row in series("power", [(60.0 * m, 1000 * KW) for m in range(1440) if not 600 <= m < 840])),
        *series("fuel", [(60.0 * m, 2500 * KW) for m in range(1440)]),
    ]
    rows.sort(key=lambda row: row.second)
    table, _ = run(setting, rows)
    assert integral(table, "power") / 3.6e6 == pytest.approx(20_000.0, rel=1e-12)
    assert integral(table, "fuel") / 3.6e6 == pytest.approx(60_000.0, rel=1e-12)
    both = np.isfinite(table.mean).all(axis=1)
    common = (table.mean * table.covered_s)[both].sum(axis=0)
    assert common[0] / common[1] == pytest.approx(0.40, rel=1e-12)
    assert both.mean() == pytest.approx(5 / 6)


def test_a_distrusted_stretch_is_rejected_from_its_first_to_its_last_second() -> None:
    """The value before it does not reach into it; the stretch is half-open."""
    setting = Setting([make_tag("level", "step", hold_s=3600.0)], distrust=[("level", 700.0, 1800.0)])
    table, findings = run(setting, series("level", {0: 1.0, 1200: 9.0, 1800: 2.0}))
    assert seconds(table, "level") == {
        "covered": 2500.0,
        "stale": 0.0,
        "rejected": 1100.0,
        "never logged": 0.0,
    }
    assert integral(table, "level") == pytest.approx(700.0 + 2.0 * 1800.0)
    assert cells(table, "level") == {"used": 2, "distrusted": 1}
    assert [finding.numbers["distrusted_s"] for finding in findings] == [1100.0]


@pytest.mark.parametrize(("between", "covered", "rejected"), [("step", 300.0, 300.0), ("line", 0.0, 600.0)])
def test_distrust_between_two_samples(between: str, covered: float, rejected: float) -> None:
    """A step ends where distrust begins, a line that runs into it is gone; what was stale stays so."""
    last_s = 1500.0 if between == "step" else 600.0
    setting = Setting(
        [make_tag("x", between, hold_s=600.0)], hours=last_s / 3600, distrust=[("x", 300.0, 400.0)]
    )
    table, _ = run(setting, series("x", {0.0: 1.0, last_s: 2.0}))
    found = seconds(table, "x")
    assert (found["covered"], found["rejected"], found["stale"]) == (covered, rejected, last_s - 600.0)


def test_samples_around_the_period_cover_its_edges_and_are_carried_in() -> None:
    """A step value from before covers the start; a line needs the sample after the end too."""
    rows = {-1200: 1.0, -600: 1.0, 0.5: 3.0, 3599.5: 3.0, 3600: 5.0, 4200: 5.0}
    for between, carried in (("step", 1), ("line", 2)):
        table, _ = run(Setting([make_tag("level", between)]), series("level", rows))
        assert seconds(table, "level")["covered"] == 3600.0
        assert cells(table, "level") == {"used": 2, "outside period": 4 - carried, "carried in": carried}
        assert table.cells.first["level", 13].raw == "1"


def test_samples_in_ticks_and_native_step() -> None:
    """Accepted samples are counted in the tick of their stamp; the native step is the median distance."""
    setting = Setting([make_tag("level", "line", hold_s=600.0)], hours=0.1)
    table, _ = run(
        setting, series("level", {0: 1.0, 20: 1.0, 40: 1.0, 60: "Bad", 80: 1.0, 100: 1.0, 300: 1.0})
    )
    assert table.samples[:, 0].tolist() == [3, 2, 0, 0, 0, 1]
    assert table.native_step_s[0] == 20.0
    table, _ = run(setting, series("level", {0: 1.0, 10: 1.0, 30: 1.0, 60: 1.0}))
    assert table.native_step_s[0] == 20.0


def test_a_tag_without_samples_is_never_logged() -> None:
    """No cell, no second, no number; and the ledger still adds up."""
    table, findings = run(
        Setting([make_tag("level", "line"), make_tag("other", "step")]), series("other", {0: 1.0})
    )
    assert seconds(table, "level") == {"covered": 0.0, "stale": 0.0, "rejected": 0.0, "never logged": 3600.0}
    assert np.isnan(table.mean[:, 0]).all()
    assert np.isnan(table.native_step_s).all()
    assert [finding.words["kind"] for finding in findings] == ["never logged"]
    assert "level" not in table.carry
