"""The two ledgers and the energies against a slow reading of the rules, second by second."""

from __future__ import annotations

from dataclasses import replace
from fractions import Fraction

import numpy as np
import pytest
from cleaning_factory import Cell, Row, Setting, cells, longer, make_tag, run, seconds, series
from hypothesis import example, given
from hypothesis import strategies as st

from auditor.records.plant import Tag
from auditor.records.samples import Disposition
from auditor.records.ticks import TickTable

HOLD_S, PERIOD_S = 240, 1800
RANGE = (0.0, 50.0)
DISTRUST = (700.0, 930.0)
RULES = ["step", "line", "mean end", "mean start", "amount end", "counter"]

stamps = st.integers(-400, PERIOD_S + 400)
numbers = st.integers(-10, 60).map(float)
raw_cells = st.one_of(numbers, numbers, numbers, st.sampled_from(["Bad", "", None]))
tables = st.lists(st.tuples(stamps, raw_cells), max_size=40).map(
    lambda rows: sorted(rows, key=lambda row: row[0])
)
cuts = st.lists(st.integers(0, 40), max_size=4)


def tag_of(rule: str) -> Tag:
    """A tag by the name of its rule."""
    between, _, marks = rule.partition(" ")
    counter = between == "counter"
    return make_tag(
        "x", between, stamp_marks=marks or None, hold_s=float(HOLD_S), believable=None if counter else RANGE
    )


def slow_events(rows: list[tuple[int, Cell]], shift: int, distrust: bool) -> list[tuple[int, float | None]]:
    """Events in order: stamp and number, None for a rejected cell; of equal stamps the first good one."""
    events: dict[int, float | None] = {}
    for stamp, cell in rows:
        if cell is None or cell == "":
            continue
        number: float | None = None
        if not isinstance(cell, str) and RANGE[0] <= cell <= RANGE[1]:
            number = cell
        if distrust and DISTRUST[0] <= stamp - shift < DISTRUST[1]:
            number = None
        if events.get(stamp) is None:
            events[stamp] = number
    return sorted(events.items())


def slow_reading(
    rule: str, rows: list[tuple[int, Cell]], distrust: bool
) -> tuple[list[Fraction | None], int]:
    """Value in the middle of each second of the period (None: not covered), and the seconds rejected.

    Written from the rules alone, with exact fractions: all stamps of the test are whole seconds, so that
    every second belongs to one stretch and a line's mean over it is its value in the middle.
    """
    between, _, marks = rule.partition(" ")
    events = slow_events(rows, 1 if marks == "end" else 0, distrust)
    values: list[Fraction | None] = []
    rejected = 0
    for second in range(PERIOD_S):
        before = [event for event in events if event[0] <= second]
        after = [event for event in events if event[0] > second]
        left, right = (before[-1] if before else None), (after[0] if after else None)
        value, is_rejected = slow_second(between, marks, second, left, right)
        if distrust and value is not None and left and left[0] < DISTRUST[0]:
            through = between == "line" and right is not None and right[0] > DISTRUST[0]
            if through or (between == "step" and second >= DISTRUST[0]):
                value, is_rejected = None, True
        values.append(value)
        rejected += is_rejected
    return values, rejected


def slow_second(
    between: str,
    marks: str,
    second: int,
    left: tuple[int, float | None] | None,
    right: tuple[int, float | None] | None,
) -> tuple[Fraction | None, bool]:
    """One second between two events."""
    near = left is not None and right is not None and right[0] - left[0] <= HOLD_S
    if between in ("mean", "amount"):
        owner = right if marks == "end" else left
        if not near or owner is None or left is None or right is None:
            return None, False
        if owner[1] is None:
            return None, True
        length = right[0] - left[0] if between == "amount" else 1
        return Fraction(owner[1]) / length, False
    if left is None:
        return None, False
    held = second < left[0] + HOLD_S
    if between == "step":
        return (Fraction(left[1]) if held and left[1] is not None else None), held and left[1] is None
    if left[1] is None:
        return None, held
    if not near or right is None:
        return None, False
    if right[1] is None:
        return None, True
    share = Fraction(2 * (second - left[0]) + 1, 2 * (right[0] - left[0]))
    return Fraction(left[1]) + share * (Fraction(right[1]) - Fraction(left[1])), False


@pytest.mark.parametrize("rule", ["step", "line", "mean end", "mean start", "amount end"])
@given(rows=tables, where=cuts, distrust=st.booleans())
def test_means_and_seconds_agree_with_a_slow_reading(
    rule: str, rows: list[tuple[int, Cell]], where: list[int], distrust: bool
) -> None:
    """Every tick's mean, cover and rejected time follow from the rules, however the blocks are cut."""
    windows = [("x", *DISTRUST)] if distrust else []
    setting = Setting([tag_of(rule)], hours=PERIOD_S / 3600, distrust=windows)
    table, _ = run(setting, series("x", rows), [cut for cut in where if cut < len(rows)])
    values, rejected = slow_reading(rule, rows, distrust)
    for tick in range(PERIOD_S // 60):
        part = [value for value in values[tick * 60 : tick * 60 + 60] if value is not None]
        if rule.partition(" ")[2]:  # an isolated mean may cover more: its length is known to the room only
            assert table.covered_s[tick, 0] >= len(part)
        else:
            assert table.covered_s[tick, 0] == len(part)
        if len(part) == table.covered_s[tick, 0]:
            mean = float(sum(part) / len(part)) if part else np.nan
            assert table.mean[tick, 0] == pytest.approx(mean, rel=1e-12, abs=1e-12, nan_ok=True)
    assert seconds(table, "x")["rejected"] >= rejected
    if not rule.partition(" ")[2]:
        assert seconds(table, "x")["rejected"] == rejected


@pytest.mark.parametrize("rule", RULES)
@given(
    rows=st.lists(st.tuples(stamps, raw_cells, st.integers(0, 1)), max_size=40),
    where=cuts,
    repeat=st.sampled_from(["keep first", "keep later", "reject both"]),
    distrust=st.booleans(),
)
@example(  # a spike of a counter just before a cut once changed the smallest rise that was met after it
    rows=[(0, 1.0, 0), (1, 0.0, 0), (2, 2.0, 0), (241, 1.0, 0), (242, 0.0, 0), (243, 0.0, 0)],
    where=[4],
    repeat="keep first",
    distrust=False,
)
def test_ledgers_add_up_and_no_cut_changes_a_total(
    rule: str, rows: list[tuple[int, Cell, int]], where: list[int], repeat: str, distrust: bool
) -> None:
    """Cells and microseconds add up exactly; one block or several give the same table."""
    rows = sorted(rows, key=lambda row: (row[0], row[2]))
    windows = [("x", *DISTRUST)] if distrust else []
    setting = Setting([tag_of(rule)], hours=PERIOD_S / 3600, repeat=repeat, distrust=windows)
    given_rows = [Row(stamp, {"x": cell}, pattern) for stamp, cell, pattern in rows]
    whole, _ = run(setting, given_rows)
    parts, _ = run(setting, given_rows, [cut for cut in where if cut < len(rows)])
    for table in (whole, parts):
        assert sum(cells(table, "x").values()) == sum(cell is not None for _, cell, _ in rows)
        assert (table.cells.counts.sum(axis=1) == table.cells.raw_cells).all()
        assert table.seconds.microseconds.sum() == PERIOD_S * 1_000_000
        assert (table.seconds.microseconds >= 0).all()
        assert table.covered_s.sum() * 1e6 == table.seconds.microseconds[0, 0]
        used = table.cells.counts[0, Disposition.USED]
        assert table.samples.sum() == used
    same_tables(whole, parts)


def same_tables(one: TickTable, other: TickTable) -> None:
    """Everything of two tables is the same; sums of floats to 1e-12."""
    assert one.mean == pytest.approx(other.mean, rel=1e-12, abs=1e-12, nan_ok=True)
    assert (one.covered_s == other.covered_s).all()
    assert (one.samples == other.samples).all()
    assert (one.cells.counts == other.cells.counts).all()
    assert (one.cells.first, one.cells.last, one.cells.words) == (
        other.cells.first,
        other.cells.last,
        other.cells.words,
    )
    assert (one.seconds.microseconds == other.seconds.microseconds).all()
    assert (one.bridges, one.carry) == (other.bridges, other.carry)
    assert one.native_step_s == pytest.approx(other.native_step_s, nan_ok=True)


def test_a_bad_cell_of_one_tag_leaves_the_others_covered() -> None:
    """In a regular table all tags share their stretches, but not what is rejected of them."""
    tags = [
        make_tag(name, between, hold_s=60.0)
        for name, between in (("a", "step"), ("b", "step"), ("c", "line"))
    ]
    rows = [Row(20.0 * place, {"a": "Bad" if place == 7 else 1.0, "b": 1.0, "c": 1.0}) for place in range(91)]
    table, _ = run(Setting(tags, hours=0.5), rows)
    assert table.covered_s.sum(axis=0).tolist() == [1780.0, 1800.0, 1800.0]
    assert table.covered_s[2].tolist() == [40.0, 60.0, 60.0]


@given(
    rows=st.lists(st.tuples(stamps, st.lists(raw_cells, min_size=4, max_size=4)), max_size=30),
    where=cuts,
    step_s=st.sampled_from([1, 60]),
)
def test_tags_of_one_export_do_not_disturb_each_other(
    rows: list[tuple[int, list[Cell]]], where: list[int], step_s: int
) -> None:
    """What tags share is worked out once, but each gets what it would get alone."""
    names = ["a", "b", "c", "d"]
    rules = ["step", "line", "step", "counter"]
    tags = [replace(tag_of(rule), name=name) for name, rule in zip(names, rules, strict=True)]
    # A regular table besides the random rows, so that the shared way is taken too.
    regular = [(second, [1.0, 2.0, 3.0, float(second)]) for second in range(0, 600, step_s)]
    table = sorted([*regular, *rows], key=lambda row: row[0])
    cuts_inside = [cut * 15 for cut in where if cut * 15 < len(table)]
    given_rows = [Row(second, dict(zip(names, given, strict=True))) for second, given in table]
    together, _ = run(Setting(tags, hours=PERIOD_S / 3600), given_rows, cuts_inside)
    for at, (tag, name) in enumerate(zip(tags, names, strict=True)):
        alone, _ = run(
            Setting([tag], hours=PERIOD_S / 3600),
            [Row(row.second, {name: row.cells[name]}) for row in given_rows],
        )
        assert together.mean[:, at] == pytest.approx(alone.mean[:, 0], rel=1e-12, abs=1e-12, nan_ok=True)
        assert (together.covered_s[:, at] == alone.covered_s[:, 0]).all()
        assert (together.samples[:, at] == alone.samples[:, 0]).all()
        assert (together.cells.counts[at] == alone.cells.counts[0]).all()
        assert (together.seconds.microseconds[at] == alone.seconds.microseconds[0]).all()


def assert_halves_make_the_whole(setting: Setting, rows: list[tuple[int, Cell]]) -> None:
    """Each half reads one hold beyond its edges; the second may take over what the first hands on."""
    whole, _ = run(setting, series("x", rows))
    half = setting.hours * 1800.0
    first_rows = [row for row in rows if row[0] <= half + HOLD_S]
    second_rows = [row for row in rows if row[0] >= half - HOLD_S]
    first, _ = run(longer(setting, hours=half / 3600), series("x", first_rows))
    later = longer(setting, hours=half / 3600, start_s=half)
    for handed_on in (first.carry, {}):
        second, _ = run(later, series("x", second_rows), carry=handed_on)
        for name in ("mean", "covered_s"):
            joined = np.concatenate((getattr(first, name), getattr(second, name)))
            assert joined == pytest.approx(getattr(whole, name), rel=1e-9, abs=1e-9, nan_ok=True)
        assert first.samples.sum() + second.samples.sum() == whole.samples.sum()
        assert second.carry == whole.carry or not handed_on


@pytest.mark.parametrize("rule", ["step", "line", "counter"])
@given(rows=tables)
def test_two_halves_make_the_whole(rule: str, rows: list[tuple[int, Cell]]) -> None:
    """Wherever the samples lie, nothing is lost or counted twice at the edge between two periods."""
    if rule == "counter":  # rises only: which of two readings is off may need readings beyond any window
        rising = sorted(cell for _, cell in rows if isinstance(cell, float))
        rows = [(stamp, rising.pop(0) if isinstance(cell, float) else cell) for stamp, cell in rows]
    assert_halves_make_the_whole(Setting([tag_of(rule)], hours=PERIOD_S / 3600), rows)


@pytest.mark.parametrize("rule", ["mean end", "mean start", "amount end", "amount start"])
@pytest.mark.parametrize("offset", [0, 45, 90])
def test_two_halves_make_the_whole_of_means(rule: str, offset: int) -> None:
    """Also where a mean or amount reaches over the edge, and with one of them unusable."""
    rows: list[tuple[int, Cell]] = [(offset + 180 * place, float(place % 7)) for place in range(-3, 14)]
    rows[10] = (rows[10][0], "Bad")
    assert_halves_make_the_whole(Setting([tag_of(rule)], hours=PERIOD_S / 3600), rows)


@given(
    rows=st.lists(
        st.tuples(st.integers(0, PERIOD_S), st.integers(0, 50).map(float)), min_size=2, max_size=30
    ),
    rule=st.sampled_from(RULES),
)
def test_energies_are_the_same_on_one_and_five_minute_ticks(rows: list[tuple[int, float]], rule: str) -> None:
    """The grid only sorts the integral, it never changes it."""
    table = series("x", sorted(rows))
    sums = []
    for tick_s in (60, 300):
        result, _ = run(Setting([tag_of(rule)], hours=PERIOD_S / 3600, tick_s=tick_s), table)
        sums.append((np.nansum(result.mean * result.covered_s), result.covered_s.sum()))
    assert sums[0] == pytest.approx(sums[1], rel=1e-12, abs=1e-9)
