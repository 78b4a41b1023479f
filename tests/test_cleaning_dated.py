"""What changes of a tag at a date: each sample by what holds at its stamp."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from cleaning_factory import Setting, cells, integral, make_tag, of_code, run, seconds, series, us

from auditor.records.findings import FindingCode
from auditor.records.plant import Tag, TagChange


def changed(tag: Tag, second: float, *, new_calibration: bool = False, **fields: object) -> Tag:
    """The tag with a change at a second."""
    last = tag.changes[-1].tag if tag.changes else tag
    then = replace(last, changes=(), **fields)  # type: ignore[arg-type]
    change = TagChange(us(second), f"second {second}", then, new_calibration)
    return replace(tag, changes=(*tag.changes, change))


@pytest.mark.parametrize("cuts", [(), (3,), (4, 5, 6)])
def test_kelvins_for_a_while(cuts: tuple[int, ...]) -> None:
    """20 degC, then 293.15 K, then 20 degC again are one steady temperature, believable all the time."""
    tag = make_tag("t", "line", offset=273.15, believable=(263.15, 323.15), hold_s=600.0)
    tag = changed(changed(tag, 1200.0, offset=0.0), 2400.0, offset=273.15)
    rows = series("t", [(at, 293.15 if 1200 <= at < 2400 else 20.0) for at in range(0, 3601, 300)])
    table, findings = run(Setting([tag]), rows, cuts)
    assert table.mean[:, 0] == pytest.approx(np.full(60, 293.15), abs=1e-9)
    assert cells(table, "t") == {"used": 12, "carried in": 1} and not findings
    undeclared, _ = run(Setting([replace(tag, changes=())]), rows, cuts)
    assert cells(undeclared, "t")["out of range"] == 4


def test_range_and_cut_off_are_those_of_the_stamp() -> None:
    """A value that is believable before the date is not after it; the cut-off holds from its date on."""
    tag = changed(make_tag("f", "step", believable=(0.0, 100.0)), 1800.0, believable=(0.0, 50.0), cut_off=2.0)
    rows = series("f", [(0, 1.0), (600, 80.0), (1200, 1.0), (1800, 1.0), (2400, 80.0), (3000, 10.0)])
    table, findings = run(Setting([tag]), rows)
    assert cells(table, "f") == {"used": 5, "out of range": 1}
    assert integral(table, "f") == pytest.approx(600 * (1.0 + 80.0 + 1.0 + 0.0 + 10.0))
    assert len(of_code(findings, FindingCode.OUT_OF_RANGE)) == 1


def test_a_stamp_at_the_end_of_its_stretch_belongs_to_what_was_before() -> None:
    """The mean stamped at the moment of the change is of the time before it."""
    tag = make_tag("m", "mean", stamp_marks="end", hold_s=900.0)
    tag = changed(tag, 1800.0, scale=10.0)
    table, _ = run(Setting([tag]), series("m", [(900, 1.0), (1800, 1.0), (2700, 1.0), (3600, 1.0)]))
    assert table.mean[:, 0] == pytest.approx(np.repeat([1.0, 10.0], 30))


def test_noise_follows_the_resolution_of_the_day() -> None:
    """Resolution q gives q/sqrt(12), before and after the date with the q of then."""
    tag = make_tag("t", "line", resolution=0.1, hold_s=600.0)
    tag = changed(tag, 1800.0, resolution=1.0)
    table, _ = run(Setting([tag]), series("t", [(at, 5.0) for at in range(0, 3601, 60)]))
    expected = np.repeat([0.1, 1.0], 30) / np.sqrt(12.0)
    assert table.noise[:, 0] == pytest.approx(expected)


def test_an_exchanged_counter_counts_nothing_across_the_exchange() -> None:
    """The new meter begins a little above the old one: the difference is no energy, and no fault either."""
    tag = make_tag("c", "counter", at_most=1.0, hold_s=900.0)
    rows = series("c", [(0, 100.0), (900, 200.0), (1800, 300.0), (2700, 500.0), (3600, 600.0)])
    exchanged = changed(tag, 2000.0, new_calibration=True)
    table, findings = run(Setting([exchanged]), rows)
    assert integral(table, "c") == pytest.approx(300.0)
    assert seconds(table, "c")["rejected"] == 900.0
    assert not of_code(findings, FindingCode.COUNTER_RESET)
    plain, _ = run(Setting([tag]), rows)
    assert integral(plain, "c") == pytest.approx(500.0)


def test_a_counter_goes_on_in_another_unit() -> None:
    """From kWh to MWh in mid-count: the same index, and no step."""
    tag = changed(make_tag("c", "counter", scale=1.0, at_most=1.0, hold_s=900.0), 1500.0, scale=1000.0)
    rows = series("c", [(0, 100_000.0), (900, 100_100.0), (1800, 100.2), (2700, 100.3), (3600, 100.4)])
    table, findings = run(Setting([tag]), rows)
    assert integral(table, "c") == pytest.approx(400.0) and not findings
