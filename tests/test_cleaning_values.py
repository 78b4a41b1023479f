"""Value tests against neighbours: spikes and fast changes, by hand, by a slow reading, and in any blocks."""

from __future__ import annotations

import statistics

import numpy as np
import pytest
from cleaning_factory import Cell, Row, Setting, cells, make_tag, of_code, run, seconds, series
from hypothesis import example, given
from hypothesis import strategies as st

from auditor.cleaning.rates import slow_enough
from auditor.cleaning.spikes import far_from_neighbours
from auditor.records.findings import FindingCode
from auditor.records.plant import ChangeRule, SpikeRule
from auditor.records.samples import Disposition

HOLD_S = 240
PERIOD_S = 1800
SPIKE = SpikeRule(5.0, None)
SCATTER = SpikeRule(None, 6.0)
CHANGE = ChangeRule(5.0, 60.0)

stamps = st.integers(-400, PERIOD_S + 400)
numbers = st.one_of(st.integers(-10, 60), st.integers(20, 24)).map(float)
raw_cells = st.one_of(numbers, numbers, numbers, st.sampled_from(["Bad", "", None]))
tables = st.lists(st.tuples(stamps, raw_cells, st.integers(0, 1)), max_size=60).map(
    lambda rows: sorted(rows, key=lambda row: (row[0], row[2]))
)
cuts = st.lists(st.integers(0, 60), max_size=6)


def minutes(values: list[float]) -> np.ndarray:
    """Instants of so many values, one a minute."""
    return np.arange(len(values), dtype=np.int64) * 60_000_000


@pytest.mark.parametrize(
    ("values", "spikes"),
    [
        ([70, 70, 70, 99, 70, 70, 70], [3]),
        ([70, 70, 70, 99, 98, 70, 70, 70], [3, 4]),
        ([70, 70, 70, 99, 10, 70, 70, 70], [3, 4]),
        ([70, 70, 70, 99, 98, 97, 70, 70, 70], []),
        ([0, 0, 0, 90, 90, 90, 90], []),
        ([0, 0, 0, 30, 60, 90, 90, 90], []),
        ([70, 70, 70, 75, 70, 70, 70], []),
        ([70, 70, 70, 75.001, 70, 70, 70], [3]),
        ([99, 70, 70, 70, 70, 70, 99], []),
    ],
    ids=["one", "two", "up and down", "three agree", "step", "ramp", "at the limit", "beyond", "at the ends"],
)
def test_one_or_two_samples_off_are_spikes_and_a_step_is_none(values: list[float], spikes: list[int]) -> None:
    """By hand: the median of five, a limit of 5."""
    found = far_from_neighbours(np.array(values, float), minutes(values), SPIKE, 120_000_000, None)
    assert np.flatnonzero(found).tolist() == spikes


def test_over_a_gap_there_are_no_neighbours() -> None:
    """A sample whose neighbour is farther than a hold is not tested."""
    instants = minutes([0.0] * 7)
    instants[5:] += 600_000_000
    values = np.array([70.0, 70.0, 70.0, 99.0, 70.0, 70.0, 70.0])
    assert not far_from_neighbours(values, instants, SPIKE, 120_000_000, None).any()


def test_scatter_is_that_of_the_tag_itself() -> None:
    """Normal noise of standard deviation 1: of 20 000 samples few pass 6 scatters, those 15 away nearly all.

    The median absolute deviation of 31 samples scatters by about 20 %, so 15 standard deviations lie beyond
    6 times its largest values and 6 standard deviations of noise (1 in 500 million) are never met.
    """
    rng = np.random.default_rng(7)
    values = rng.normal(80.0, 1.0, 20_000)
    struck = np.arange(100, 19_900, 50)
    values[struck] += rng.choice([-15.0, 15.0], struck.size)
    found = far_from_neighbours(values, np.arange(20_000) * 1_000_000, SCATTER, 5_000_000, 0.01)
    assert found[struck].mean() > 0.99
    found[struck] = False
    assert found.mean() < 2e-3


def test_the_last_digit_of_a_resting_tag_is_no_spike() -> None:
    """Scatter zero, but never less than the declared resolution: 6 x 0.1 = 0.6."""
    values = np.full(60, 50.0)
    values[[35, 45]] = (50.1, 50.7)
    found = far_from_neighbours(values, np.arange(60) * 1_000_000, SCATTER, 5_000_000, 0.1)
    assert np.flatnonzero(found).tolist() == [45]


@given(
    values=st.lists(st.integers(0, 60).map(float), max_size=80),
    steps=st.lists(st.sampled_from([30, 60, 300]), min_size=80, max_size=80),
    rule=st.sampled_from([SPIKE, SpikeRule(None, 3.0)]),
)
def test_spikes_agree_with_a_slow_reading(values: list[float], steps: list[int], rule: SpikeRule) -> None:
    """The screen before the true test loses nothing: sample by sample with plain medians."""
    instants = np.cumsum([0, *steps])[: len(values)].astype(np.int64) * 1_000_000
    found = far_from_neighbours(np.array(values), instants, rule, HOLD_S * 1_000_000, 1.0)
    for place, value in enumerate(values):
        spike = False
        around = range(place - 2, place + 3)
        if around[0] >= 0 and around[-1] < len(values):
            near = all(instants[at + 1] - instants[at] <= HOLD_S * 1_000_000 for at in around[:-1])
            limit = rule.size
            if limit is None and place >= 28:
                window = values[place - 28 : place + 3]
                level = statistics.median(window)
                scatter = 1.4826 * statistics.median(abs(other - level) for other in window)
                limit = 3.0 * max(scatter, 1.0)
            if near and limit is not None:
                spike = abs(value - statistics.median(values[at] for at in around)) > limit
        assert found[place] == spike


@pytest.mark.parametrize(
    ("values", "believed"),
    [
        ([70, 74, 78, 82], [1, 1, 1, 1]),
        ([70, 76, 71, 72], [1, 0, 1, 1]),
        ([70, 90, 90, 90, 90, 90], [1, 0, 0, 0, 1, 1]),
        ([70, 200, 200, 200, 200, 200, 200], [1, 0, 0, 0, 0, 1, 1]),
    ],
    ids=["5 a minute", "one off", "a real step of 20", "after a hold"],
)
def test_a_change_is_believed_when_there_was_time_for_it(values: list[float], believed: list[int]) -> None:
    """By hand: 5 within a minute, 20 within four; after a hold of 4 minutes anything."""
    found = slow_enough(np.array(values, float), minutes(values), CHANGE, HOLD_S * 1_000_000)
    assert found.tolist() == [bool(one) for one in believed]


def test_scatter_within_the_named_time_is_no_fast_change() -> None:
    """5 K/min read every second: two seconds apart 4 K are within what a minute allows."""
    values = np.tile([70.0, 74.0], 50)
    assert slow_enough(values, np.arange(100) * 1_000_000, CHANGE, 60_000_000).all()


@given(
    values=st.lists(st.integers(0, 40).map(float), max_size=150),
    steps=st.lists(st.sampled_from([10, 60, 300]), min_size=150, max_size=150),
)
def test_changes_agree_with_a_slow_reading(values: list[float], steps: list[int]) -> None:
    """Sample by sample, always against the last believed one."""
    instants = np.cumsum([0, *steps])[: len(values)].astype(np.int64) * 1_000_000
    found = slow_enough(np.array(values), instants, CHANGE, HOLD_S * 1_000_000)
    last: tuple[int, float] | None = None
    for second, value, believed in zip((instants // 1_000_000).tolist(), values, found, strict=True):
        expected = last is None or second - last[0] > HOLD_S
        expected = expected or abs(value - last[1]) <= 5.0 * max((second - last[0]) / 60.0, 1.0)
        assert believed == expected
        last = (second, value) if expected else last


@pytest.mark.parametrize("between", ["step", "line", "mean"])
@pytest.mark.parametrize(
    "rules",
    [{"spike": SPIKE}, {"spike": SCATTER, "resolution": 1.0}, {"change_at_most": CHANGE},
     {"spike": SPIKE, "change_at_most": CHANGE}],
    ids=["spike", "scatter", "change", "both"],
)  # fmt: skip
@given(
    rows=tables, where=cuts, repeat=st.sampled_from(["keep first", "keep later", "reject both"]),
    distrust=st.booleans(),
)  # fmt: skip
@example(
    rows=[(60 * place, 90.0 if place == 5 else 20.0, 0) for place in range(12)],
    where=[5, 6, 7],
    repeat="keep first",
    distrust=False,
)
def test_ledgers_stay_exact_and_no_cut_changes_what_is_believed(
    between: str,
    rules: dict[str, object],
    rows: list[tuple[int, Cell, int]],
    where: list[int],
    repeat: str,
    distrust: bool,
) -> None:
    """Cells and microseconds add up, and the table is the same in one block or in many."""
    tag = make_tag(
        "x", between, hold_s=float(HOLD_S), believable=(0.0, 50.0),
        stamp_marks="end" if between == "mean" else None, **rules,
    )  # fmt: skip
    windows = [("x", 700.0, 930.0)] if distrust else []
    setting = Setting([tag], hours=PERIOD_S / 3600, repeat=repeat, distrust=windows)
    given_rows = [Row(stamp, {"x": cell}, pattern) for stamp, cell, pattern in rows]
    whole, _ = run(setting, given_rows)
    parts, _ = run(setting, given_rows, [cut for cut in where if cut < len(rows)])
    for table in (whole, parts):
        assert sum(cells(table, "x").values()) == sum(cell is not None for _, cell, _ in rows)
        assert table.seconds.microseconds.sum() == PERIOD_S * 1_000_000
        assert (table.seconds.microseconds >= 0).all()
        assert table.samples.sum() == table.cells.counts[0, Disposition.USED]
    assert (whole.cells.counts == parts.cells.counts).all()
    assert (whole.cells.first, whole.cells.last) == (parts.cells.first, parts.cells.last)
    assert (whole.covered_s == parts.covered_s).all()
    assert whole.mean == pytest.approx(parts.mean, rel=1e-12, abs=1e-12, nan_ok=True)


def test_rejected_samples_are_told_of_and_cover_nothing() -> None:
    """A spike of 30 K in a line of minutes takes the minute before and after it out."""
    values = {60.0 * place: 70.0 + place % 2 for place in range(61)}
    values |= {1200.0: 101.0, 2400.0: 40.0, 2460.0: 41.0}
    tag = make_tag("warmth", "line", hold_s=120.0, spike=SPIKE)
    table, findings = run(Setting([tag]), series("warmth", values))
    assert cells(table, "warmth") == {"used": 57, "spike": 3, "carried in": 1}
    assert seconds(table, "warmth")["rejected"] == 120.0 + 180.0
    (finding,) = of_code(findings, FindingCode.SPIKES)
    assert (finding.line, finding.numbers["count"], finding.words["first"]) == (22, 3, "101")


def test_nothing_is_tested_that_is_not_declared() -> None:
    """Without a declared rule nothing is tested: the same values all count."""
    values = {60.0 * place: 70.0 for place in range(61)} | {1200.0: 101.0}
    table, findings = run(Setting([make_tag("warmth", "line", hold_s=120.0)]), series("warmth", values))
    assert cells(table, "warmth") == {"used": 60, "carried in": 1}
    assert not findings


@pytest.mark.parametrize("step", [1, 7, 13, 40])
def test_scatter_remembers_across_blocks(step: int) -> None:
    """Spikes at many places of a noisy tag: blocks of any length find the very same ones."""
    values = np.random.default_rng(5).normal(70.0, 1.0, 400).round(1)
    values[40::9] += 12.0
    rows = [Row(float(4 * place), {"x": float(value)}) for place, value in enumerate(values)]
    tag = make_tag("x", "line", hold_s=60.0, spike=SCATTER, resolution=0.1)
    setting = Setting([tag], hours=0.45)
    whole, _ = run(setting, rows)
    parts, _ = run(setting, rows, range(step, len(rows), step))
    assert cells(whole, "x")["spike"] > 25
    assert (whole.cells.counts == parts.cells.counts).all()
    assert (whole.covered_s == parts.covered_s).all()
