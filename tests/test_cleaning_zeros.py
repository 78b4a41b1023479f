"""Value tests against other evidence: zeros while running, ends of ranges, long stands, coarse counters."""

from __future__ import annotations

import numpy as np
import pytest
from cleaning_factory import Cell, Row, Setting, cells, integral, make_tag, of_code, run, seconds
from hypothesis import given
from hypothesis import strategies as st

from auditor.records.findings import FindingCode
from auditor.records.machines import Running
from auditor.records.samples import Disposition

HOLD_S = 240
CLOSED = Running("breaker", None, "closed")
FAST = Running("speed", 1400.0, None)


def setting_of(between: str = "line", hours: float = 4.0, **fields: object) -> Setting:
    """A power whose zeros are not believed while a breaker is closed."""
    marks = {"stamp_marks": "end"} if between in ("mean", "amount") else {}
    tags = [
        make_tag("power", between, **{"hold_s": float(HOLD_S), "not_zero_while": CLOSED} | marks | fields),
        make_tag("breaker", "state", hold_s=float(HOLD_S), states={"0": "open", "1": "closed"}),
        make_tag("speed", "step", hold_s=float(HOLD_S)),
    ]
    return Setting(tags, hours=hours)


def rows_of(zeros: range, opened: range = range(0), step_s: int = 60, offset_s: int = 0) -> list[Row]:
    """Samples of power, breaker and speed over four hours."""
    rows = []
    for place in range(0, 4 * 3600 // step_s + 1):
        off = place in opened
        power = 0.0 if place in zeros or off else 1000.0
        row = {"power": power, "breaker": 0.0 if off else 1.0, "speed": 0.0 if off else 1500.0}
        rows.append(Row(float(offset_s + step_s * place), row))
    return rows


@pytest.mark.parametrize("rule", [CLOSED, FAST], ids=["state", "number"])
@pytest.mark.parametrize(
    ("between", "ticks"),
    [("line", range(59, 120)), ("step", range(60, 120)), ("mean", range(59, 119))],
)
def test_zeros_of_an_hour_count_as_missing(rule: Running, between: str, ticks: range) -> None:
    """Zero from minute 60 to 119 while the breaker is closed: what is left has the mean 1000 throughout."""
    table, findings = run(setting_of(between, not_zero_while=rule), rows_of(range(60, 120)))
    gone = np.flatnonzero(np.isnan(table.mean[:, 0]))
    assert gone.tolist() == list(ticks)
    left = table.mean[:, 0][np.isfinite(table.mean[:, 0])]
    assert left == pytest.approx(1000.0)
    assert seconds(table, "power")["rejected"] == 60.0 * len(ticks)
    assert cells(table, "power")["zero while running"] >= 60
    (finding,) = of_code(findings, FindingCode.ZERO_WHILE_RUNNING)
    assert (finding.line, finding.numbers["zero_s"]) == (62, 60.0 * len(ticks))
    assert finding.words["evidence"] == rule.tag


def test_a_zero_of_a_machine_at_rest_is_true() -> None:
    """Breaker open from minute 60 to 119: every minute counts, those of the stop and the start too."""
    table, findings = run(setting_of(), rows_of(range(0), opened=range(60, 120)))
    assert np.isfinite(table.mean[:, 0]).all()
    assert integral(table, "power") == pytest.approx((240 - 61) * 60_000.0 + 60_000.0)
    assert not of_code(findings, FindingCode.ZERO_WHILE_RUNNING)


def test_next_to_a_start_or_a_stop_a_zero_may_be_true() -> None:
    """The breaker closes a minute before the first power, and opens a minute after the last."""
    table, findings = run(setting_of("step"), rows_of(range(59, 121), opened=range(60, 120)))
    assert np.isfinite(table.mean[:, 0]).all()
    assert integral(table, "power") == pytest.approx((240 - 62) * 60_000.0)
    assert not of_code(findings, FindingCode.ZERO_WHILE_RUNNING)


def test_a_logged_zero_is_looked_for_not_a_zero_of_its_kelvin() -> None:
    """0 degC is 273.15 K; it is the zero in the file that a logger writes when it loses a signal."""
    fields = {"offset": 273.15, "not_zero_while": CLOSED}
    table, _ = run(setting_of("step", **fields), rows_of(range(60, 120)))
    assert cells(table, "power")["zero while running"] == 60


@pytest.mark.parametrize("between", ["line", "step", "mean", "amount"])
@given(
    powers=st.lists(st.sampled_from([0.0, 0.0, 5.0, 7.0, "Bad", ""]), min_size=40, max_size=40),
    breakers=st.lists(st.sampled_from([0.0, 1.0, 1.0, 1.0, 1.0, 1.0]), min_size=8, max_size=8),
    gaps=st.lists(st.sampled_from([20, 45, 60, 90, 300]), min_size=40, max_size=40),
    where=st.lists(st.integers(1, 39), max_size=5),
)
def test_ledgers_stay_exact_with_zeros_and_ends_in_any_blocks(
    between: str, powers: list[Cell], breakers: list[float], gaps: list[int], where: list[int]
) -> None:
    """Whole ticks move; both ledgers add up; no cut changes anything."""
    setting = setting_of(between, hours=0.5, saturates_at=(None, 7.0))
    seconds_of = np.cumsum([-200, *gaps[:-1]]).tolist()
    rows = [
        Row(float(second), {"power": power, "breaker": breakers[place // 5], "speed": 0.0})
        for place, (second, power) in enumerate(zip(seconds_of, powers, strict=True))
    ]
    whole, found = run(setting, rows)
    parts, found_in_parts = run(setting, rows, where)
    assert sum(cells(whole, "power").values()) == len(rows)
    assert (whole.seconds.microseconds.sum(axis=1) == 1_800_000_000).all()
    assert (whole.seconds.microseconds >= 0).all()
    assert whole.samples[:, 0].sum() == whole.cells.counts[0, Disposition.USED]
    assert (whole.cells.counts == parts.cells.counts).all()
    assert (whole.covered_s == parts.covered_s).all()
    told = [
        [each for each in some if each.code in (FindingCode.ZERO_WHILE_RUNNING, FindingCode.AT_RANGE_END)]
        for some in (found, found_in_parts)
    ]
    assert [(each.start_us, each.end_us, each.line) for each in told[0]] == [
        (each.start_us, each.end_us, each.line) for each in told[1]
    ]


@pytest.mark.parametrize("between", ["step", "mean"])
def test_readings_at_the_end_of_the_range_are_used_and_told_of(between: str) -> None:
    """A quarter of the time at 1200, the end: the sum is a lower bound, and its share is stated.

    By hand: 60 of 240 minutes; 60 x 1200 of 60 x 1200 + 180 x 1000 = 28.6 %.
    """
    rows = [
        Row(60.0 * place, {"power": 1200.0 if 60 < place <= 120 else 1000.0, "breaker": 1.0, "speed": 0.0})
        for place in range(241)
    ]
    table, findings = run(setting_of(between, si_unit="W", saturates_at=(None, 1200.0)), rows)
    assert "rejected" not in cells(table, "power")
    assert integral(table, "power") == pytest.approx(60 * 60 * 1200.0 + 180 * 60 * 1000.0)
    (finding,) = of_code(findings, FindingCode.AT_RANGE_END)
    assert finding.numbers["count"] == 60
    assert finding.numbers["at_end_s"] == 3600.0
    assert finding.numbers["share_of_time"] == pytest.approx(0.25)
    assert finding.numbers["share_of_amount"] == pytest.approx(72.0 / 252.0)
    assert finding.energy_J == pytest.approx(3600.0 * 1200.0)
    lower, _ = run(setting_of(between, saturates_at=(1000.0, None)), rows)
    assert integral(lower, "power") == integral(table, "power")


def test_below_the_end_nothing_is_told() -> None:
    """1199 of 1200."""
    rows = [Row(60.0 * place, {"power": 1199.0, "breaker": 1.0, "speed": 0.0}) for place in range(241)]
    assert not run(setting_of("step", saturates_at=(0.0, 1200.0)), rows)[1]


def standing(days: int, still: range, quantum: float = 0.0, **fields: object) -> list[object]:
    """Findings on a warmth that moves every minute but for some, while a power runs."""
    rng = np.random.default_rng(3)
    rows = []
    for minute in range(days * 1440):
        warmth = 80.0 + float(rng.normal())
        if quantum:
            warmth = round(warmth / quantum) * quantum
        warmth = 72.0 if minute in still else warmth
        rows.append(Row(60.0 * minute, {"warmth": warmth, "power": 1000.0 + minute % 2}))
    tags = [
        make_tag("warmth", "line", **({"hold_s": 300.0} | fields)),
        make_tag("power", "line", hold_s=300.0),
    ]
    uses = {"warmth": ("engine",), "power": ("engine",)}
    setting = Setting(tags, hours=24.0 * days, running={"engine": Running("power", 20.0, None)}, users=uses)
    return list(of_code(run(setting, rows)[1], FindingCode.STOOD_LONG))


def test_a_tag_without_frozen_after_that_stood_out_of_its_habit_is_asked_about() -> None:
    """Three hours still, where it moves every minute on all other days: a question, nothing rejected."""
    (finding,) = standing(5, range(3000, 3180))
    assert finding.numbers["value_SI"] == pytest.approx(72.0)
    assert finding.numbers["stood_s"] == pytest.approx(179 * 60.0)
    assert finding.numbers["usual_s"] <= 180.0


def test_what_is_usual_raises_no_question() -> None:
    """Less than an hour; a coarse sensor; one that is tested anyway; days too few to know a habit."""
    assert not standing(5, range(3000, 3055))
    assert not standing(5, range(3000, 3180), quantum=20.0)
    assert not standing(5, range(3000, 3180), frozen_after_s=86_400.0)
    assert not standing(2, range(2000, 2180))


@pytest.mark.parametrize(("tick_s", "told"), [(60, True), (900, False)])
def test_a_counter_too_coarse_for_the_interval_names_an_honest_one(tick_s: int, told: bool) -> None:
    """1 kWh read every minute is 60 kW: of 600 kW 10 %; over 15 min 0.67 %. 5 % needs 2 min."""
    kwh = 3.6e6
    tag = make_tag("meter", "counter", scale=kwh, si_unit="J", at_most=1.2e6, hold_s=1800.0, resolution=kwh)
    uses = {"meter": ("engine",)}
    setting = Setting(
        [tag], hours=4.0, tick_s=tick_s, running={"engine": Running("meter", 1e4, None)}, users=uses
    )
    rows = [Row(60.0 * minute, {"meter": 10.0 * minute}) for minute in range(241)]
    found = of_code(run(setting, rows)[1], FindingCode.COARSE_STEPS)
    assert bool(found) is told
    if told:
        assert found[0].numbers["share"] == pytest.approx(0.1)
        assert found[0].numbers["share"] * found[0].numbers["rate_SI"] == pytest.approx(60_000.0)
        assert found[0].numbers["smallest_interval_s"] == pytest.approx(120.0)
