"""Files that arrive late, are replaced, or come in any order: the month is restated, and ends the same."""

from __future__ import annotations

import json
import shutil
import sqlite3
from contextlib import closing
from pathlib import Path

import numpy as np
import pytest
from site_factory import ROOT, TWO_EXPORTS, changed, digests, export, figures, instants, run, site

FUEL_AND_HEAT = {"G": 250.0, "F": 16.25, "S": 90.0, "R": 70.0}
DATES = ("2025-06-01", "2025-06-02", "2025-06-03")
PLANT = changed(
    TWO_EXPORTS, ('interval = "15 min"', 'interval = "1 h"'), ('tick = "1 min"', 'tick = "5 min"')
)


def power(date: str, power_kW: float = 1000.0, first_h: int = 0, last_h: int = 24) -> bytes:
    """Power of some hours of one day, one row a minute."""
    seconds = instants(date, f"{date}T23:59:30")[first_h * 60 : last_h * 60]
    return export(seconds, {"P": power_kW})


@pytest.fixture
def place(tmp_path: Path) -> Path:
    """Three days of fuel and heat; of power the first day only; the fourth day has begun."""
    seconds = instants(DATES[0], "2025-06-04T00:30")
    files = {"plant/all.csv": export(seconds, FUEL_AND_HEAT), f"power/{DATES[0]}.csv": power(DATES[0])}
    return site(tmp_path / "works", PLANT, files)


def outputs(place: Path) -> dict[str, str]:
    """Digests of what is published: the month's folder and the page of all months."""
    found = digests(place / "audit")
    return {name: digest for name, digest in found.items() if name.startswith("2") or name == "index.html"}


def log_of(place: Path) -> list[str]:
    """Lines of the run log without the time of the run."""
    lines = (place / "audit/run.log").read_text(encoding="utf-8").splitlines()
    return [line.partition(" ")[2] for line in lines]


def restatements(place: Path) -> list[tuple]:
    """Rows of the register: month, reasons, figure, old, new, both statuses."""
    with closing(sqlite3.connect(place / "audit/history.sqlite")) as connection:
        names = [row[0] for row in connection.execute("SELECT name FROM sqlite_master")]
        if "restatements" not in names:
            return []
        rows = connection.execute(
            "SELECT month, reasons, figure, old, new, old_status, new_status FROM restatements ORDER BY rowid"
        ).fetchall()
    return [(row[0], json.loads(row[1]), *row[2:]) for row in rows]


def test_a_late_file_restates_its_month_with_old_and_new_figures(place: Path) -> None:
    """By hand: 58 of 72 hours of 1000 kW, provisional; with the other 14, 72 000 kWh."""
    (place / "logs/power" / f"{DATES[1]}.csv").write_bytes(power(DATES[1]))
    (place / "logs/power" / f"{DATES[2]}.csv").write_bytes(power(DATES[2], last_h=10))
    run("nightly", place, "--quiet")
    assert not any("again" in line for line in log_of(place)) and restatements(place) == []
    (place / "logs/power/late.csv").write_bytes(power(DATES[2], first_h=10))
    done = run("nightly", place)
    assert "works 2025-06 published again: power/late.csv is new" in done.err
    log = log_of(place)
    assert "2025-06 published again: power/late.csv is new" in log
    work = "engine work_gross_kWh: 58000 kWh provisional -> 72000 kWh firm (+14000 kWh)"
    assert f"2025-06 {work}" in log and f"works 2025-06 {work}" in done.err
    rows = {row[2]: row for row in restatements(place)}
    month, reasons, _, old, new, *status = rows["work_gross_kWh"]
    assert (month, reasons, status) == ("2025-06", ["power/late.csv is new"], ["provisional", "firm"])
    assert (old, new) == pytest.approx((58_000.0, 72_000.0), rel=1e-9)
    assert figures(place / "audit/2025-06")["gross_pct"]["value"] == pytest.approx(40.0, rel=1e-9)
    before = outputs(place), restatements(place), len(log)
    run("nightly", place, "--quiet")
    assert (outputs(place), restatements(place)) == before[:2]
    assert not any("again" in line for line in log_of(place)[before[2] :])


def test_a_file_replaced_under_its_name_and_one_that_vanished_are_named(place: Path) -> None:
    """The same name with other content has changed; a file that is gone is gone; a new limit is no file."""
    (place / "logs/power" / f"{DATES[1]}.csv").write_bytes(power(DATES[1]))
    run("nightly", place, "--quiet")
    (place / "logs/power" / f"{DATES[0]}.csv").write_bytes(power(DATES[0], 990.0))
    run("nightly", place, "--quiet")
    assert log_of(place).count("2025-06 published again: power/2025-06-01.csv has changed") == 1
    (place / "logs/power" / f"{DATES[1]}.csv").unlink()
    (place / "plant.toml").write_text(PLANT.replace('"30 %"', '"35 %"'), encoding="utf-8")
    run("nightly", place, "--quiet")
    expected = "2025-06 published again: power/2025-06-02.csv is gone; the plant file has changed"
    assert log_of(place).count(expected) == 1


def test_a_month_audited_by_hand_is_restated_too(place: Path) -> None:
    """The same line in the run log, whoever ran the audit."""
    run("audit", place, "--month", "2025-06", "--quiet")
    (place / "logs/power" / f"{DATES[2]}.csv").write_bytes(power(DATES[2]))
    run("audit", place, "--month", "2025-06", "--quiet")
    assert "2025-06 published again: power/2025-06-03.csv is new" in log_of(place)


@pytest.mark.parametrize("seed", [1, 2])
def test_files_in_any_order_of_arrival_end_in_the_same_bytes(tmp_path: Path, place: Path, seed: int) -> None:
    """Halves of days, a daily file that overlaps them, one file replaced twice: as one clean run."""
    final = {
        f"power/{date}{part}.csv": power(date, first_h=first, last_h=last)
        for date in DATES[1:]
        for part, first, last in (("a", 0, 12), ("b", 12, 24))
    }
    final["power/whole.csv"] = power(DATES[1])
    final["power/2025-06-03c.csv"] = power(DATES[2], 995.0, 10, 14)
    rng = np.random.default_rng(seed)
    arrivals = [*final.items(), ("power/2025-06-03a.csv", power(DATES[2], 700.0, 0, 12))]
    order = [arrivals[index] for index in rng.permutation(len(arrivals))]
    for name, content in order:
        (place / "logs" / name).write_bytes(content)
        run("nightly", place, "--quiet")
    (place / "logs/power/2025-06-03a.csv").write_bytes(final["power/2025-06-03a.csv"])
    run("nightly", place, "--quiet")
    clean = tmp_path / "clean" / "works"
    shutil.copytree(place / "logs", clean / "logs")
    shutil.copyfile(place / "plant.toml", clean / "plant.toml")
    run("nightly", clean, "--quiet")
    assert len(outputs(clean)) >= 7
    assert outputs(place) == outputs(clean)


def test_the_late_file_of_the_dairy_ends_in_the_bytes_of_one_run(tmp_path: Path) -> None:
    """October without the file of the 20th that came late, then with it: as if it had been there at once."""
    places = [tmp_path / name / "quillmere" for name in ("late", "clean")]
    for copy in places:
        shutil.copytree(ROOT / "sample_logs/quillmere/logs", copy / "logs")
        shutil.copyfile(ROOT / "sample_logs/quillmere/plant.toml", copy / "plant.toml")
    late = places[0] / "logs/engine/engine_2025-10-20_late.csv.gz"
    content = late.read_bytes()
    late.unlink()
    run("nightly", places[0], "--quiet")
    late.write_bytes(content)
    run("nightly", places[0], "--quiet")
    run("nightly", places[1], "--quiet")
    assert outputs(places[0]) == outputs(places[1]) and len(outputs(places[0])) >= 7
    assert "2025-10 published again: engine/engine_2025-10-20_late.csv.gz is new" in log_of(places[0])
    assert {row[0] for row in restatements(places[0])} == {"2025-10"}
    assert restatements(places[1]) == []
