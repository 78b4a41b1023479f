"""Counters: differences, roll-over, reset, glitch, long gaps."""

from __future__ import annotations

import numpy as np
import pytest
from cleaning_factory import Cell, Setting, cells, integral, make_tag, of_code, run, seconds, series

from auditor.records.findings import FindingCode

KWH = 3.6e6
# A meter of a unit of 1200 kW read every quarter of an hour, five digits: rolls over at 100 000 kWh.
# Common practice, no source (a fall is a roll-over only if the rate it implies is believable).
METER = {"scale": KWH, "si_unit": "J", "at_most": 1.2e6, "full_scale": 100_000 * KWH, "hold_s": 900.0}


def quarter_hours(*readings: Cell) -> dict[float, Cell]:
    """Readings from the start, one every quarter of an hour."""
    return {900.0 * place: reading for place, reading in enumerate(readings)}


def test_a_roll_over_counts_through_zero() -> None:
    """99 990 -> 12 kWh: (100 000 - 99 990) + 12 = 22 kWh."""
    setting = Setting([make_tag("meter", "counter", **METER)], hours=0.25)
    table, findings = run(setting, series("meter", quarter_hours(99_990.0, 12.0)))
    assert integral(table, "meter") / KWH == pytest.approx(22.0, rel=1e-9)
    assert not of_code(findings, FindingCode.COUNTER_RESET)


def test_a_reset_is_missing_not_negative_and_not_a_roll_over() -> None:
    """45 231 -> 3 kWh: a roll-over would be 54 772 kWh in a quarter of an hour, 219 MW: missing."""
    setting = Setting([make_tag("meter", "counter", **METER)])
    table, findings = run(setting, series("meter", quarter_hours(45_000.0, 45_231.0, 3.0, 103.0, 203.0)))
    assert integral(table, "meter") / KWH == pytest.approx(231.0 + 200.0, rel=1e-12)
    assert seconds(table, "meter") == {
        "covered": 2700.0,
        "stale": 0.0,
        "rejected": 900.0,
        "never logged": 0.0,
    }
    (reset,) = of_code(findings, FindingCode.COUNTER_RESET)
    assert reset.numbers["missing_s"] == 900.0
    assert reset.words["kind"] == "fell"
    assert (reset.file, reset.line) == ("a/one.csv", 4)
    assert np.isnan(table.mean[15:30, 0]).all()


@pytest.mark.parametrize("reading", [12.0, 3.0])
def test_without_a_declared_full_scale_every_fall_is_a_reset(reading: float) -> None:
    """99 990 -> 12 kWh may be a roll-over, but who knows: missing, neither 22 nor -99 978 kWh."""
    meter = METER | {"full_scale": None}
    readings = quarter_hours(99_790.0, 99_990.0, reading, reading + 100.0, reading + 200.0)
    table, findings = run(Setting([make_tag("meter", "counter", **meter)]), series("meter", readings))
    assert integral(table, "meter") / KWH == pytest.approx(200.0 + 200.0, rel=1e-12)
    assert np.isnan(table.mean[15:30, 0]).all()
    assert [each.code for each in findings] == [FindingCode.COUNTER_RESET]


@pytest.mark.parametrize("cut", range(6))
@pytest.mark.parametrize("glitch", [4_523.0, 0.0, 99_000.0])
def test_a_single_glitch_is_dropped_and_the_sum_kept(glitch: float, cut: int) -> None:
    """45 231, glitch, 45 481: 250 kWh over the two intervals, one reading rejected, wherever blocks end."""
    setting = Setting([make_tag("meter", "counter", **(METER | {"hold_s": 1800.0}))], hours=1.25)
    readings = quarter_hours(45_000.0, 45_231.0, glitch, 45_481.0, 45_700.0, 45_800.0)
    table, findings = run(setting, series("meter", readings), [cut])
    assert integral(table, "meter") / KWH == pytest.approx(800.0, rel=1e-12)
    assert table.mean[15:45, 0] == pytest.approx(250.0 * KWH / 1800.0)
    assert cells(table, "meter") == {"used": 4, "spike": 1, "carried in": 1}
    assert table.cells.first["meter", 5].raw == f"{glitch:.0f}"
    assert [(each.code, each.line, each.numbers["count"]) for each in findings] == [
        (FindingCode.SPIKES, 4, 1)
    ]


@pytest.mark.parametrize("cut", range(5))
def test_a_high_glitch_is_found_without_a_declared_rate(cut: int) -> None:
    """100, 900, 110, 120: the one reading too high is off, not the two after it."""
    tag = make_tag("meter", "counter", hold_s=1800.0)
    table, _ = run(Setting([tag]), series("meter", quarter_hours(100.0, 900.0, 110.0, 120.0, 130.0)), [cut])
    assert integral(table, "meter") == pytest.approx(30.0)
    assert cells(table, "meter") == {"used": 3, "spike": 1, "carried in": 1}


@pytest.mark.parametrize("cut", range(5))
def test_of_two_readings_that_disagree_the_later_one_is_off(cut: int) -> None:
    """100, 110, 105, 115: either 110 or 105 could be off; the sum is the same."""
    tag = make_tag("meter", "counter", hold_s=1800.0)
    table, _ = run(Setting([tag]), series("meter", quarter_hours(100.0, 110.0, 105.0, 115.0, 125.0)), [cut])
    assert integral(table, "meter") == pytest.approx(25.0)
    assert table.cells.first["meter", 5].raw == "105"


def test_a_bridge_over_an_edge_of_the_period_belongs_to_no_period() -> None:
    """How much of it lies inside is not known."""
    rows = {-850.0: 0.0, 1800.0: 100.0, 4450.0: 300.0}
    table, _ = run(Setting([make_tag("meter", "counter", **METER)]), series("meter", rows))
    assert not table.bridges
    assert seconds(table, "meter")["covered"] == 0.0


def test_an_impossible_rise_is_missing() -> None:
    """800 kWh in a quarter of an hour is 3200 kW of a 1200 kW unit: not believed, and the base is new."""
    setting = Setting([make_tag("meter", "counter", resolution=KWH, **METER)])
    table, findings = run(setting, series("meter", quarter_hours(0.0, 100.0, 900.0, 1000.0, 1100.0)))
    assert integral(table, "meter") / KWH == pytest.approx(300.0, rel=1e-12)
    (reset,) = of_code(findings, FindingCode.COUNTER_RESET)
    assert reset.words["kind"] == "rose too fast"
    assert seconds(table, "meter")["rejected"] == 900.0


def test_a_reading_taken_late_only_merges_two_steps() -> None:
    """100, 500, 600: too fast to 500, but believable to 600: the sum of 500 kWh is kept over both steps."""
    setting = Setting([make_tag("meter", "counter", resolution=KWH, **(METER | {"hold_s": 1800.0}))])
    table, findings = run(setting, series("meter", quarter_hours(0.0, 100.0, 500.0, 600.0, 700.0)))
    assert integral(table, "meter") / KWH == pytest.approx(700.0, rel=1e-12)
    assert cells(table, "meter") == {"used": 3, "spike": 1, "carried in": 1}
    assert [each.code for each in findings] == [FindingCode.SPIKES]


def test_whole_steps_of_a_fast_read_counter_are_no_impossible_rises() -> None:
    """1 kWh steps read every second would be 3600 kW; declared or not, one step is always believed."""
    rows = [(float(second), float(second * 900 // 3600)) for second in range(3601)]  # 900 kW
    for fields in ({"resolution": KWH}, {}):
        tag = make_tag("meter", "counter", scale=KWH, at_most=1.2e6, hold_s=60.0, **fields)
        table, findings = run(Setting([tag]), series("meter", rows))
        assert integral(table, "meter") / KWH == pytest.approx(900.0, rel=1e-12)
        assert not findings


def test_a_gap_longer_than_the_hold_is_bridged_in_sum_only() -> None:
    """The energy over the gap is known, its place in time is not."""
    setting = Setting([make_tag("meter", "counter", **METER)], hours=2.0)
    rows = {0.0: 0.0, 900.0: 100.0, 4500.0: 600.0, 5400.0: 700.0, 7200.0: "Bad"}
    table, findings = run(setting, series("meter", rows))
    assert integral(table, "meter") / KWH == pytest.approx(200.0, rel=1e-12)
    (bridge,) = table.bridges
    assert bridge.tag == "meter"
    assert (bridge.end_us - bridge.start_us) / 1e6 == 3600.0
    assert bridge.amount / KWH == pytest.approx(500.0, rel=1e-12)
    assert seconds(table, "meter") == {
        "covered": 1800.0,
        "stale": 5400.0,
        "rejected": 0.0,
        "never logged": 0.0,
    }
    assert [finding.numbers["gap_s"] for finding in of_code(findings, FindingCode.GAP)] == [3600.0, 1800.0]


def test_unusable_cells_between_readings_lose_nothing() -> None:
    """A counter's difference stands whatever was written in between, as long as it is within the hold."""
    setting = Setting([make_tag("meter", "counter", **(METER | {"hold_s": 1800.0}))])
    table, _ = run(setting, series("meter", quarter_hours(0.0, "Bad", 200.0, "Bad", 400.0)))
    assert integral(table, "meter") / KWH == pytest.approx(400.0, rel=1e-12)
    assert seconds(table, "meter")["covered"] == 3600.0
    assert cells(table, "meter") == {"used": 2, "carried in": 1, "status word": 2}


def test_unusable_cells_in_a_long_gap_are_rejected_time() -> None:
    """In a gap too long to be spread, the cells that were logged but unusable count as rejected."""
    setting = Setting([make_tag("meter", "counter", **METER)])
    table, _ = run(setting, series("meter", quarter_hours(0.0, "Bad", "Bad", 300.0, "Bad")))
    assert seconds(table, "meter") == {
        "covered": 0.0,
        "stale": 900.0 + 900.0,
        "rejected": 1800.0,
        "never logged": 0.0,
    }
    assert [bridge.amount / KWH for bridge in table.bridges] == pytest.approx([300.0])


def test_unusable_cells_before_the_first_reading_are_rejected_time() -> None:
    """No difference reaches over them."""
    setting = Setting([make_tag("meter", "counter", **METER)])
    table, _ = run(setting, series("meter", quarter_hours("Bad", 0.0, 100.0, 200.0, 300.0)))
    assert seconds(table, "meter") == {
        "covered": 2700.0,
        "stale": 0.0,
        "rejected": 900.0,
        "never logged": 0.0,
    }


def test_distrust_takes_the_counted_energy_out_too() -> None:
    """What a counter counted in a distrusted stretch is not believed either, not even as a bridge."""
    tag = make_tag("meter", "counter", **METER)
    setting = Setting([tag], distrust=[("meter", 1000.0, 1500.0)])
    table, _ = run(setting, series("meter", quarter_hours(0.0, 100.0, 200.0, 300.0, 400.0)))
    assert integral(table, "meter") / KWH == pytest.approx(300.0, rel=1e-12)
    assert seconds(table, "meter")["rejected"] == 900.0
    assert not table.bridges


def test_energy_of_a_counter_is_the_difference_of_its_ends_on_any_ticks() -> None:
    """Quantisation telescopes: however the readings fall into ticks, the sum is last less first."""
    rng = np.random.default_rng(7)
    stamps = np.sort(rng.choice(np.arange(1, 86_400), 900, replace=False)).astype(float)
    readings = np.floor(np.cumsum(rng.uniform(0.0, 3.0, 902)))
    rows = series("meter", list(zip([0.0, *stamps.tolist(), 86_400.0], readings.tolist(), strict=True)))
    tag = make_tag("meter", "counter", scale=KWH, hold_s=3600.0)
    for tick_s in (60, 300, 900):
        table, _ = run(Setting([tag], hours=24.0, tick_s=tick_s), rows)
        assert integral(table, "meter") == pytest.approx((readings[-1] - readings[0]) * KWH, rel=1e-12)


def test_only_the_part_of_a_step_inside_the_period_counts() -> None:
    """A step across either edge is spread over its whole length, and the period gets its part."""
    setting = Setting([make_tag("meter", "counter", **METER)])
    rows = {-450.0: 0.0, 450.0: 100.0, 1350.0: 200.0, 2250.0: 300.0, 3150.0: 400.0, 4050.0: 500.0}
    table, _ = run(setting, series("meter", rows))
    assert integral(table, "meter") / KWH == pytest.approx(400.0, rel=1e-12)
    assert cells(table, "meter") == {"used": 4, "carried in": 2}


def test_many_resets_are_told_of_in_few_findings() -> None:
    """A column wrongly declared as a counter does not flood the report."""
    rng = np.random.default_rng(3)
    rows = series("meter", [(float(second), cell) for second, cell in enumerate(rng.uniform(0.0, 1.0, 3600))])
    table, findings = run(Setting([make_tag("meter", "counter", hold_s=60.0)]), rows)
    resets = of_code(findings, FindingCode.COUNTER_RESET)
    assert len(resets) == 20
    assert resets[-1].words["kind"] == "many"
    assert table.cells.counts.sum() == 3600
