"""The nightly job: what changed is audited again, and nothing else is touched."""

from __future__ import annotations

import hashlib
import json
import os
import re
from collections.abc import Iterable
from pathlib import Path

import pytest
from site_factory import GAS_ENGINE, changed, digests, export, figures, instants, run, site, statement

COLUMNS = {"G": 250.0, "P": 1000.0, "F": 16.25, "S": 90.0, "R": 70.0}
PLANT = changed(GAS_ENGINE, ('interval = "15 min"', 'interval = "1 h"'), ('tick = "1 min"', 'tick = "5 min"'))
DAYS = ("2025-05-29", "2025-05-30", "2025-06-01", "2025-06-02", "2025-07-01")
"""Two days at the end of May, two at the beginning of June, one hour of July: June is over."""


def day(date: str, power_kW: float = 1000.0) -> bytes:
    """One day of minutes (of the last date, one hour)."""
    end = f"{date}T01:00" if date == DAYS[-1] else f"{date}T23:59:30"
    return export(instants(date, end), COLUMNS | {"P": power_kW})


@pytest.fixture
def place(tmp_path: Path) -> Path:
    """A site of five files."""
    return site(tmp_path / "works", PLANT, {f"plant/{date}.csv": day(date) for date in DAYS})


def outputs(place: Path) -> dict[str, tuple[str, int]]:
    """Digest and time of change of every output but the run log and the lock."""
    found = {}
    for path in sorted((place / "audit").rglob("*")):
        if path.is_file() and path.name not in ("run.log", ".lock"):
            found[path.relative_to(place / "audit").as_posix()] = (
                hashlib.sha256(path.read_bytes()).hexdigest(),
                path.stat().st_mtime_ns,
            )
    return found


def rewritten(before: dict[str, tuple[str, int]], after: dict[str, tuple[str, int]]) -> set[str]:
    """Folders (and single files) of the audit folder in which a file was written or vanished."""
    names = {name for name in before.keys() | after.keys() if before.get(name) != after.get(name)}
    return {name.partition("/")[0] for name in names}


def nightly(*places: Path) -> tuple[int, dict[str, dict[str, str]]]:
    """Run the job; exit code, and what it did by site and month."""
    done = run("nightly", *places, "--json", "--quiet")
    entries = json.loads(done.out)
    return done.code, {
        entry["site"]: {month["month"]: month["action"] for month in entry["months"]} for entry in entries
    }


def all_are(action: str, months: Iterable[str] = ("2025-05", "2025-06")) -> dict[str, str]:
    """One action for several months."""
    return dict.fromkeys(months, action)


def did(place: Path) -> dict[str, str]:
    """Actions of May and June of one site."""
    months = nightly(place)[1][place.name]
    return {month: action for month, action in months.items() if month != "2025-07"}


def test_first_night_publishes_and_second_writes_nothing(place: Path) -> None:
    """All months the first time, provisional for want of days; then not a byte, not a time of change."""
    code, actions = nightly(place)
    assert code == 6
    assert {month: actions["works"][month] for month in ("2025-05", "2025-06")} == all_are("published")
    first = outputs(place)
    assert {"2025-05/report.html", "2025-06/report.html", "index.html", "history.sqlite"} <= first.keys()
    log = (place / "audit/run.log").read_text(encoding="utf-8")
    code, actions = nightly(place)
    assert code == 6
    assert {month: actions["works"][month] for month in ("2025-05", "2025-06")} == all_are("unchanged")
    assert outputs(place) == first
    longer = (place / "audit/run.log").read_text(encoding="utf-8")
    assert longer.startswith(log) and "2025-06 unchanged, exit 6" in longer[len(log) :]
    assert all(re.match(r"\d{4}-\d\d-\d\dT\d\d:\d\d:\d\dZ ", line) for line in longer.splitlines())


def test_only_content_counts(place: Path) -> None:
    """A touched file changes nothing; one changed reading rewrites its own month and the index only."""
    nightly(place)
    before = outputs(place)
    for path in (place / "logs/plant").iterdir():
        os.utime(path, (2_000_000_000, 2_000_000_000))
    assert did(place) == all_are("unchanged")
    assert outputs(place) == before
    (place / "logs/plant/2025-05-29.csv").write_bytes(day("2025-05-29", power_kW=990.0))
    assert did(place) == {"2025-05": "published", "2025-06": "unchanged"}
    assert rewritten(before, outputs(place)) <= {"2025-05", "index.html", "history.sqlite"}
    assert figures(place / "audit/2025-05")["work_gross_kWh"]["logged"] == pytest.approx(
        24.0 * (990.0 + 1000.0), rel=1e-9
    )
    assert did(place) == all_are("unchanged")


def test_a_late_file_rewrites_its_month(place: Path) -> None:
    """A file that arrives days later: only the month it lies in is audited again."""
    nightly(place)
    before = outputs(place)
    (place / "logs/plant/2025-06-03.csv").write_bytes(day("2025-06-03"))
    assert did(place) == {"2025-05": "unchanged", "2025-06": "published"}
    assert rewritten(before, outputs(place)) <= {"2025-06", "index.html", "history.sqlite"}
    assert figures(place / "audit/2025-06")["work_gross_kWh"]["logged"] == pytest.approx(72_000.0, rel=1e-9)


def test_only_what_bears_on_a_month_counts_of_the_plant_file(place: Path) -> None:
    """A comment: nothing. A heating value from 1 June: May stays as it is. A new limit: both months."""
    nightly(place)
    before = outputs(place)
    commented = PLANT.replace("[site]", "# checked by the day shift\n\n[site]")
    (place / "plant.toml").write_text(commented, encoding="utf-8")
    assert did(place) == all_are("unchanged")
    assert outputs(place) == before
    entry = '{ from = 2025-01-01, lower = 10.0, higher = 11.06, source = "sheet" },'
    later = '{ from = 2025-06-01, lower = 10.2, higher = 11.28, source = "new sheet" },'
    (place / "plant.toml").write_text(changed(PLANT, (entry, f"{entry}\n  {later}")), encoding="utf-8")
    assert did(place) == {"2025-05": "unchanged", "2025-06": "published"}
    assert rewritten(before, outputs(place)) <= {"2025-06", "index.html", "history.sqlite"}
    assert figures(place / "audit/2025-06")["fuel_in_kWh"]["logged"] == pytest.approx(48 * 2550.0, rel=1e-9)
    (place / "plant.toml").write_text(PLANT.replace('"30 %"', '"40 %"'), encoding="utf-8")
    assert did(place) == all_are("published")


def test_an_output_that_was_deleted_or_edited_is_written_again(place: Path) -> None:
    """The same bytes as before; the other month is left alone."""
    nightly(place)
    before = digests(place / "audit")
    (place / "audit/2025-06/report.html").unlink()
    (place / "audit/2025-05/intervals.csv").write_text("machine\n", encoding="utf-8")
    assert did(place) == all_are("published")
    after = digests(place / "audit")
    assert {name for name in before if before[name] != after[name]} <= {"run.log"}


def test_a_lost_index_is_written_again(place: Path) -> None:
    """The page of all months comes back by itself, as every other output does."""
    nightly(place)
    before = digests(place / "audit")
    (place / "audit/index.html").unlink()
    nightly(place)
    assert digests(place / "audit").get("index.html") == before["index.html"]


def test_index_lists_the_months_newest_first(place: Path) -> None:
    """One link to each report, with each machine's headline or why it is withheld."""
    nightly(place)
    page = (place / "audit/index.html").read_text(encoding="utf-8")
    links = re.findall(r'href="(\d{4}-\d\d)/report\.html"', page)
    assert [month for month in links if month != "2025-07"] == ["2025-06", "2025-05"]
    assert "Small Works" in page and "Gas engine" in page and "withheld" in page
    assert not re.search(r'(?:src|href)="(?:https?:)?//', page)


def test_one_bad_site_never_stops_the_next(tmp_path: Path) -> None:
    """Three sites, the middle one broken: the others are published; the worst exit code is returned."""
    files = {f"plant/{date}.csv": day(date) for date in DAYS[2:]}
    places = [site(tmp_path / name, PLANT, files) for name in ("first", "second", "third")]
    (places[1] / "plant.toml").write_text(PLANT.replace('clock = "UTC"\n', ""), encoding="utf-8")
    done = run("nightly", *places, "--json")
    assert done.code == 2 and "clock" in done.err
    entries = {entry["site"]: entry for entry in json.loads(done.out)}
    assert [entries[name]["exit_code"] for name in ("first", "second", "third")] == [6, 2, 6]
    assert "clock" in entries["second"]["failure"] and entries["first"]["failure"] is None
    for name, published in (("first", True), ("second", False), ("third", True)):
        assert (tmp_path / name / "audit/2025-06/report.html").is_file() is published
    assert "failed, exit 2" in (tmp_path / "second/audit/run.log").read_text(encoding="utf-8")
    quiet = run("nightly", *places, "--quiet")
    assert quiet.code == 2 and quiet.out == "" and "second" in quiet.err and "first" not in quiet.err
    assert run("nightly", places[0], "--quiet").err == ""
    assert run("nightly", places[0], tmp_path / "nowhere").code == 2
    assert not (tmp_path / "nowhere").exists()


def test_audit_and_nightly_publish_the_same_bytes(place: Path) -> None:
    """A month audited by hand is not audited again at night, and the other way round."""
    assert run("audit", place, "--month", "2025-05", "--quiet").code == 6
    by_hand = digests(place / "audit/2025-05")
    assert nightly(place)[1]["works"]["2025-05"] == "unchanged"
    (place / "audit/history.sqlite").unlink()
    assert nightly(place)[1]["works"]["2025-05"] == "published"
    assert digests(place / "audit/2025-05") == by_hand
    assert run("audit", place, "--month", "2025-05", "--quiet").code == 6
    assert digests(place / "audit/2025-05") == by_hand
    assert statement(place / "audit/2025-05")["period"]["label"] == "2025-05"
