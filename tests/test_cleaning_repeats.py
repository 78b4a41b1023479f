"""Several values for one stamp: duplicates, conflicts, precedence of files, and what they are worth."""

from __future__ import annotations

import pytest
from cleaning_factory import Row, Setting, cells, integral, make_tag, of_code, run

from auditor.records.findings import FindingCode
from auditor.records.samples import Disposition

KW = 1000.0


def rows_of(*cells_at_600: tuple[float, int]) -> list[Row]:
    """A power of 1 at 0 and 1200 s, and values with the pattern of their file at 600 s."""
    between = [Row(600.0, {"power": value}, pattern) for value, pattern in cells_at_600]
    return [Row(0.0, {"power": 1.0}), *between, Row(1200.0, {"power": 1.0}), Row(3600.0, {"power": 1.0})]


@pytest.mark.parametrize(
    ("repeat", "at_600", "kept", "ledger"),
    [
        ("keep first", [(5.0, 0), (5.0, 0)], 5.0, {"duplicate": 1}),
        ("reject both", [(5.0, 0), (5.0, 0)], 5.0, {"duplicate": 1}),
        ("keep first", [(5.0, 0), (7.0, 0)], 5.0, {"conflict lost": 1}),
        ("keep later", [(5.0, 0), (7.0, 0)], 7.0, {"conflict lost": 1}),
        ("reject both", [(5.0, 0), (7.0, 0)], None, {"conflict lost": 2}),
        ("keep later", [(5.0, 0), (7.0, 1)], 5.0, {"conflict lost": 1}),
        ("reject both", [(5.0, 0), (7.0, 1)], 5.0, {"conflict lost": 1}),
        ("keep later", [(5.0, 0), (6.0, 0), (7.0, 1), (6.0, 1)], 6.0, {"conflict lost": 2, "duplicate": 1}),
        ("reject both", [(5.0, 0), (6.0, 0), (5.0, 1)], None, {"conflict lost": 3}),
    ],
)
def test_which_value_of_a_stamp_is_kept(
    repeat: str, at_600: list[tuple[float, int]], kept: float | None, ledger: dict[str, int]
) -> None:
    """The earlier pattern wins; within one pattern the export's rule decides; equal values are duplicates."""
    table, _ = run(Setting([make_tag("power", "step")], repeat=repeat), rows_of(*at_600))
    found = cells(table, "power")
    assert {name: found.get(name, 0) for name in ledger} == ledger
    assert sum(found.values()) == 3 + len(at_600)
    if kept is None:
        assert integral(table, "power") == pytest.approx(600.0 + 2400.0)
        assert table.covered_s[10:20, 0].sum() == 0.0
    else:
        assert integral(table, "power") == pytest.approx(600.0 + 600.0 * kept + 2400.0)


def test_a_good_value_beats_an_unusable_one_of_the_same_stamp() -> None:
    """A status word, or a value out of range, in one file is no conflict with a good value in another."""
    tag = make_tag("power", "step", believable=(0.0, 10.0))
    for bad in ("Bad", 99.0):
        rows = [Row(0.0, {"power": 1.0}), Row(600.0, {"power": bad}, 0), Row(600.0, {"power": 5.0}, 1)]
        table, findings = run(Setting([tag]), rows)
        assert integral(table, "power") == pytest.approx(600.0 + 3000.0 * 5.0)
        assert not of_code(findings, FindingCode.CONFLICT)


@pytest.mark.parametrize("cut", range(1, 5))
def test_a_stamp_torn_between_two_blocks_is_seen_whole(cut: int) -> None:
    """The rows of a stamp may come in different blocks."""
    setting = Setting([make_tag("power", "step")], repeat="keep later")
    table, _ = run(setting, rows_of((5.0, 0), (7.0, 0), (7.0, 1)), [cut])
    assert cells(table, "power") == {"used": 3, "duplicate": 1, "conflict lost": 1, "outside period": 1}
    assert integral(table, "power") == pytest.approx(600.0 + 600.0 * 7.0 + 2400.0)


def test_an_hour_of_conflict_is_one_finding_with_its_energy() -> None:
    """990 kW against 1000 kW for an hour: the choice is worth 10 kWh. Common practice, no source."""
    setting = Setting([make_tag("power", "step", scale=KW, si_unit="W", hold_s=120.0)], hours=3.0)
    rows = []
    for minute in range(181):
        rows.append(Row(60.0 * minute, {"power": 1000.0}, 0))
        if 60 <= minute < 120:
            rows.append(Row(60.0 * minute, {"power": 990.0}, 1))
    table, findings = run(setting, rows)
    (finding,) = of_code(findings, FindingCode.CONFLICT)
    assert finding.numbers["count"] == 60
    assert finding.numbers["effect_SI_s"] / 3.6e6 == pytest.approx(10.0, rel=1e-12)
    assert finding.energy_J == pytest.approx(36e6)
    assert (finding.file, finding.words["kept"]) == ("b/two.csv", "a/one.csv")
    assert integral(table, "power") / 3.6e6 == pytest.approx(3000.0)
    assert table.cells.first["power", Disposition.CONFLICT_LOST].raw == "990"


def test_conflicts_apart_in_time_are_separate_findings() -> None:
    """Conflicts farther apart than the hold are two stretches."""
    setting = Setting([make_tag("level", "step", hold_s=300.0)])
    rows = []
    for minute in range(60):
        rows.append(Row(60.0 * minute, {"level": 1.0}, 0))
        if minute in (5, 6, 40):
            rows.append(Row(60.0 * minute, {"level": 3.0}, 1))
    _, findings = run(setting, rows)
    found = of_code(findings, FindingCode.CONFLICT)
    assert [finding.numbers["count"] for finding in found] == [2, 1]
    assert [finding.numbers["effect_SI_s"] for finding in found] == pytest.approx([-240.0, -120.0])
    assert [finding.energy_J for finding in found] == [None, None]
