"""Sensors that stand still while their machine runs, and those that may."""

from __future__ import annotations

import numpy as np
import pytest
from cleaning_factory import Row, Setting, cells, make_tag, of_code, run, seconds

from auditor.records.findings import FindingCode
from auditor.records.machines import Running
from auditor.records.samples import Disposition
from auditor.records.ticks import CarryOver

HOURS = 12
RUNS = {"engine": Running("power", 20.0, None)}
USES = {"warmth": ("engine",), "power": ("engine",)}


def rows_of(frozen: range, stopped: range = range(0), step: int = 1, hours: int = HOURS) -> list[Row]:
    """Minute values of a moving warmth that stands still in some minutes, and a power that falls to zero."""
    rng = np.random.default_rng(11)
    rows = []
    for minute in range(0, hours * 60 + 1, step):
        warmth = 72.0 if minute in frozen else 80.0 + float(rng.normal())
        power = 0.0 if minute in stopped else 1000.0 + float(rng.normal())
        rows.append(Row(60.0 * minute, {"warmth": warmth, "power": power}))
    return rows


def setting_of(
    between: str = "line", users: dict[str, tuple[str, ...]] | None = None, **fields: object
) -> Setting:
    """Two tags, one of them tested for standing still for two hours."""
    tags = [
        make_tag("warmth", between, **{"hold_s": 300.0, "frozen_after_s": 7200.0} | fields),
        make_tag("power", "line", hold_s=300.0),
    ]
    return Setting(tags, hours=float(HOURS), running=RUNS, users=USES if users is None else users)


@pytest.mark.parametrize("between", ["line", "step"])
@pytest.mark.parametrize("cuts", [[], [200], [195, 200, 250, 333], list(range(1, 720, 7))])
def test_a_frozen_sensor_is_rejected_from_the_beginning_of_its_run(between: str, cuts: list[int]) -> None:
    """Whole ticks and their cells move, and both ledgers still add up, across any blocks."""
    table, findings = run(setting_of(between), rows_of(range(180, 361)), cuts)
    assert cells(table, "warmth") == {"used": 720 - 181, "frozen": 181} | (
        {"carried in": 1} if between == "line" else {"outside period": 1}
    )
    assert seconds(table, "warmth") == {
        "covered": (720 - 181) * 60.0,
        "stale": 0.0,
        "rejected": 181 * 60.0,
        "never logged": 0.0,
    }
    assert np.isnan(table.mean[180:361, 0]).all()
    assert np.isfinite(np.delete(table.mean[:, 0], range(180, 361))).all()
    assert (table.samples[180:361, 0] == 0).all()
    (finding,) = of_code(findings, FindingCode.FROZEN)
    assert (finding.tag, finding.machine, finding.line) == ("warmth", "engine", 182)
    assert (finding.numbers["frozen_s"], finding.numbers["value_SI"]) == (181 * 60.0, 72.0)
    assert table.cells.first["warmth", Disposition.FROZEN].line == 182
    assert table.cells.last["warmth", Disposition.FROZEN].line == 362


def test_just_too_short_a_run_is_left_alone() -> None:
    """One minute less than two hours is not frozen."""
    table, findings = run(setting_of(), rows_of(range(180, 299)))
    assert not of_code(findings, FindingCode.FROZEN)
    assert seconds(table, "warmth")["rejected"] == 0.0


def test_a_plant_at_rest_is_not_tested() -> None:
    """A value may stay equal while no machine that uses it runs."""
    _, findings = run(setting_of(), rows_of(range(180, 540), stopped=range(170, 550)))
    assert not of_code(findings, FindingCode.FROZEN)


def test_only_running_time_counts_and_only_from_the_first_running_tick() -> None:
    """Four hours at rest, then three while running: rejected from where the machine starts."""
    table, findings = run(setting_of(), rows_of(range(100, 520), stopped=range(90, 340)))
    (finding,) = of_code(findings, FindingCode.FROZEN)
    assert np.isnan(table.mean[340:520, 0]).all()
    assert np.isfinite(table.mean[100:339, 0]).all()
    assert finding.numbers["frozen_s"] == pytest.approx(180 * 60.0, abs=60.0)


@pytest.mark.parametrize(
    ("between", "fields", "users"),
    [
        ("step", {"deadband": 5.0}, USES),  # stored only when it changes
        ("line", {"frozen_after_s": None}, USES),  # not asked for
        ("line", {}, {"power": ("engine",)}),  # no machine uses it
    ],
)
def test_what_may_stand_still(
    between: str, fields: dict[str, object], users: dict[str, tuple[str, ...]]
) -> None:
    """Values stored on change, tags without a limit, tags no machine uses."""
    _, findings = run(setting_of(between, users, **fields), rows_of(range(180, 480)))
    assert not of_code(findings, FindingCode.FROZEN)


def test_a_gap_between_equal_values_is_no_proof() -> None:
    """Equal before and after four hours without data: only covered time counts."""
    rows = [row for row in rows_of(range(180, 440)) if not 200 * 60 <= row.second < 420 * 60]
    _, findings = run(setting_of(), rows)
    assert not of_code(findings, FindingCode.FROZEN)


def test_a_run_carried_over_from_the_period_before_counts() -> None:
    """Equal for 90 minutes before the period and 60 in it, while the machine runs: frozen."""
    rows = rows_of(range(0, 60))
    carry = {"warmth": CarryOver(1_782_856_740_000_000, 72.0, 1_782_856_800_000_000 - 90 * 60_000_000)}
    table, findings = run(setting_of(), rows, carry=carry)
    assert of_code(findings, FindingCode.FROZEN)[0].numbers["count"] == 60
    assert not of_code(run(setting_of(), rows)[1], FindingCode.FROZEN)
    assert table.carry["warmth"].equal_since_us == table.carry["warmth"].instant_us


def test_a_state_decides_whether_a_machine_runs() -> None:
    """The running rule may name a state; the test looks at its share of time."""
    tags = [
        make_tag("warmth", "line", hold_s=300.0, frozen_after_s=7200.0),
        make_tag("breaker", "state", hold_s=300.0, states={"0": "open", "1": "closed"}),
    ]
    running = {"engine": Running("breaker", None, "closed")}
    setting = Setting(tags, hours=float(HOURS), running=running, users={"warmth": ("engine",)})
    for closed, found in ((1.0, 1), (0.0, 0)):
        rows = [
            Row(row.second, {"warmth": row.cells["warmth"], "breaker": closed})
            for row in rows_of(range(180, 361))
        ]
        _, findings = run(setting, rows)
        assert len(of_code(findings, FindingCode.FROZEN)) == found
