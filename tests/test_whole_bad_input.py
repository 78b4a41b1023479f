"""Bad input, from the command line to the exit code: what is refused, what is noted, what stays untouched."""

from __future__ import annotations

import csv
import gzip
import io
import os
import signal
import stat
import subprocess
import sys
import time
import zipfile
from html.parser import HTMLParser
from pathlib import Path

import numpy as np
import pytest
from site_factory import (
    GAS_ENGINE,
    TWO_EXPORTS,
    Layout,
    changed,
    command,
    digests,
    export,
    figures,
    findings,
    instants,
    one_day,
    run,
    run_apart,
    site,
    statement,
    surroundings,
)

DAY = "2025-06-03"
SECONDS = instants(DAY, "2025-06-04T00:05")
COLUMNS = {"G": 250.0, "P": 1000.0, "F": 16.25, "S": 90.0, "R": 70.0}
GOOD = export(SECONDS, COLUMNS)


def nothing_published(place: Path) -> bool:
    """Whether a site holds no output of any audit."""
    return not any(path.suffix in (".html", ".json", ".parquet", ".csv") for path in place.glob("audit/**/*"))


# --- nothing to audit


def test_an_empty_or_absent_logs_folder_is_no_data(tmp_path: Path) -> None:
    """Exit 3, the folder is named, nothing is written."""
    place = site(tmp_path / "site", GAS_ENGINE, {})
    for _ in ("empty", "absent"):
        done = run("audit", place, *one_day(DAY))
        assert done.code == 3 and str(place / "logs") in done.err and done.out == ""
        assert nothing_published(place)
        if (place / "logs").exists():
            (place / "logs").rmdir()


def test_a_period_without_data_leaves_the_earlier_report(tmp_path: Path) -> None:
    """Exit 3 for another day, in the site's own folder and in one named by --out; not a byte changes."""
    place = site(tmp_path / "site", GAS_ENGINE, {"plant/a.csv": GOOD})
    for where in ((), ("--out", tmp_path / "out")):
        folder = where[1] if where else place / "audit"
        assert run("audit", place, *one_day(DAY), *where).code == 0
        before = digests(folder)
        done = run("audit", place, *one_day("2025-07-09"), *where)
        assert done.code == 3 and "2025-07-09" in done.err
        assert digests(folder) == before


def test_a_folder_that_is_no_site_is_left_alone(tmp_path: Path) -> None:
    """Exit 2, and no folder for outputs is made in it."""
    (tmp_path / "photos").mkdir()
    for arguments in (("audit", tmp_path / "photos"), ("check", tmp_path / "photos")):
        done = run(*arguments)
        assert done.code == 2 and "plant.toml" in done.err
    assert list((tmp_path / "photos").iterdir()) == []


# --- a plant file or an export that does not fit


def test_all_faults_of_a_plant_file_are_told_at_once(tmp_path: Path) -> None:
    """Five faults of five kinds: exit 2, each with its line, its key and a remedy; nothing is written."""
    plant = changed(
        GAS_ENGINE,
        ('clock = "UTC"\n', ""),
        ('unit = "m3/h"', 'unit = "m3/moon"'),
        ('role = "useful heat"', 'role = "usefull heat"'),
        ('volume = "gas"', 'volume = "gass"'),
        ('rated_power = "1000 kW"', 'rated_powr = "1000 kW"'),
    )
    place = site(tmp_path / "site", plant, {"plant/a.csv": GOOD})
    done = run("audit", place, *one_day(DAY))
    assert done.code == 2 and done.out == "" and nothing_published(place)
    for word in ("clock", "m3/moon", "usefull heat", "gass", "rated_powr"):
        assert word in done.err, word
    for word in ("m3/moon", "usefull heat"):
        number = 1 + plant[: plant.index(word)].count("\n")
        assert f"plant.toml:{number}" in done.err, word
    assert '"useful heat"' in done.err and done.err.count("fix: ") >= 5


def test_a_heading_that_is_in_no_file(tmp_path: Path) -> None:
    """Exit 2: the heading that was asked for, and the nearest that the files hold."""
    renamed = {"GN-POWER" if name == "P" else name: value for name, value in COLUMNS.items()}
    plant = changed(GAS_ENGINE, ('column = "P"', 'column = "GN-PWOER"'))
    place = site(tmp_path / "site", plant, {"plant/a.csv": export(SECONDS, renamed)})
    done = run("audit", place, *one_day(DAY))
    assert done.code == 2 and nothing_published(place)
    assert "GN-PWOER" in done.err and "GN-POWER" in done.err.replace("GN-PWOER", "")


def test_a_unit_row_that_contradicts_the_plant_file(tmp_path: Path) -> None:
    """MW in the export, kW in the plant file: exit 2 with both, for one is wrong by a thousand."""
    units = Layout(units=("m3/h", "MW", "kg/s", "degC", "degC"))
    place = site(tmp_path / "site", GAS_ENGINE, {"plant/a.csv": export(SECONDS, COLUMNS, units)})
    done = run("audit", place, *one_day(DAY))
    assert done.code == 2 and "MW" in done.err and "kW" in done.err and nothing_published(place)


@pytest.mark.parametrize(
    "period",
    [
        ("--month", "2025-13"),
        ("--month", "2025-6"),
        ("--month", "June"),
        ("--from", "2025-06-31", "--to", "2025-07-01"),
        ("--from", "2025-06-03"),
        ("--from", "2025-06-04", "--to", "2025-06-03"),
        ("--month", "2025-06", "--from", DAY, "--to", DAY),
    ],
)
def test_a_period_that_is_none(tmp_path: Path, period: tuple[str, ...]) -> None:
    """Exit 2 and the option is named; nothing is written."""
    place = site(tmp_path / "site", GAS_ENGINE, {"plant/a.csv": GOOD})
    done = run("audit", place, *period)
    assert done.code == 2 and "--" in done.err and nothing_published(place)


def test_demo_names_and_folders(tmp_path: Path) -> None:
    """An unknown name and a folder that holds something already: exit 2, nothing laid out."""
    done = run("demo", "atlantis", tmp_path / "new")
    assert done.code == 2 and "emberlund" in done.err and "quillmere" in done.err
    assert not (tmp_path / "new").exists()
    (tmp_path / "mine").mkdir()
    (tmp_path / "mine/letter.txt").write_text("dear all")
    assert run("demo", "emberlund", tmp_path / "mine").code == 2
    assert [path.name for path in (tmp_path / "mine").iterdir()] == ["letter.txt"]
    done = run("demo", "emberlund", tmp_path / "new")
    assert done.code == 0 and str(tmp_path / "new/plant.toml") in done.out
    assert (tmp_path / "new/logs").is_dir() and not (tmp_path / "new/audit").exists()


def test_a_missing_export_makes_the_month_provisional(tmp_path: Path) -> None:
    """No power file: exit 6, fuel is published, the efficiency withheld; no file at all: exit 3."""
    boiler_house = {name: value for name, value in COLUMNS.items() if name != "P"}
    place = site(tmp_path / "site", TWO_EXPORTS, {"plant/a.csv": export(SECONDS, boiler_house)})
    assert run("audit", place, *one_day(DAY)).code == 6
    out = place / "audit" / f"{DAY}_{DAY}"
    assert figures(out)["fuel_in_kWh"]["value"] == pytest.approx(60_000.0, rel=1e-9)
    gross = figures(out)["gross_pct"]
    assert gross["status"] == "withheld" and gross["value"] is None and gross["U"] is None
    assert "missing export" in {each["code"] for each in findings(out)}
    before = digests(out)
    (place / "logs/plant/a.csv").rename(place / "logs/a.bak")
    done = run("audit", place, *one_day(DAY))
    assert done.code == 3 and digests(out) == before


# --- noise, names and cells


def test_binary_noise_among_the_exports_is_noted(tmp_path: Path) -> None:
    """Files of noise, claimed and not, empty and NUL-filled: named with digest, the rest audited as ever."""
    noise = np.random.default_rng(5).integers(0, 256, 20_000, dtype=np.uint8).tobytes()
    place = site(tmp_path / "site", GAS_ENGINE, {"plant/a.csv": GOOD})
    assert run("audit", place, *one_day(DAY), "--out", tmp_path / "clean").code == 0
    bad = {"plant/noise.csv": noise, "plant/nothing.csv": b"", "plant/zeros.csv": bytes(4096), "x.bin": noise}
    for name, content in bad.items():
        (place / "logs" / name).write_bytes(content)
    done = run("audit", place, *one_day(DAY), "--out", tmp_path / "noisy")
    assert done.code in (0, 6), done.err
    assert statement(tmp_path / "noisy")["machines"] == statement(tmp_path / "clean")["machines"]
    inputs = {each["file"]: each for each in statement(tmp_path / "noisy")["inputs"]}
    found = digests(place / "logs")
    assert {name: inputs[name]["sha256"] for name in found} == found
    told = {(each["code"], each["file"]) for each in findings(tmp_path / "noisy")}
    for name in ("plant/noise.csv", "plant/zeros.csv"):
        assert ("unreadable file", name) in told, told
    assert "plant/nothing.csv" in (tmp_path / "noisy/report.html").read_text(encoding="utf-8")
    assert ("unclaimed file", "x.bin") in told


def test_damaged_archives_and_endless_lines_are_noted(tmp_path: Path) -> None:
    """Cut off, overwritten, packed noise, one line of 2 MB, a folder named as a file: the rest is audited."""
    packed, archive = gzip.compress(GOOD, mtime=0), io.BytesIO()
    with zipfile.ZipFile(archive, "w", zipfile.ZIP_DEFLATED) as written:
        written.writestr("b.csv", GOOD)
    content = archive.getvalue()
    bad = {
        "plant/cut.csv.gz": packed[: len(packed) // 2],
        "plant/cut.zip": content[:-40],
        "plant/flipped.zip": content[:150] + bytes([content[150] ^ 255]) + content[151:],
        "plant/line.csv": b"x" * 2_000_000,
    }
    patterns = ('files = ["plant/*.csv"]', 'files = ["plant/*.csv", "plant/*.csv.gz", "plant/*.zip"]')
    place = site(tmp_path / "site", changed(GAS_ENGINE, patterns), {"plant/a.csv": GOOD, **bad})
    (place / "logs/plant/folder.csv").mkdir()
    assert run("audit", place, *one_day(DAY), "--out", tmp_path / "out").code == 0
    assert figures(tmp_path / "out")["work_gross_kWh"]["value"] == pytest.approx(24_000.0, rel=1e-9)
    told = {each["file"] for each in findings(tmp_path / "out") if each["code"] == "unreadable file"}
    assert {name.partition("!")[0] for name in told} == bad.keys()


@pytest.mark.skipif(sys.platform != "linux", reason="file names of any bytes are a matter of this system")
def test_a_file_name_that_is_no_text_is_noted(tmp_path: Path) -> None:
    """A name in another encoding, as old archives leave them, does not stop the audit."""
    place = site(tmp_path / "site", GAS_ENGINE, {"plant/a.csv": GOOD})
    with open(os.fsencode(place / "logs/plant/") + b"caf\xe9.csv", "wb") as file:
        file.write(export(instants("2025-06-04", "2025-06-04T01:00"), COLUMNS))
    done = run_apart("audit", place, *one_day(DAY), "--out", tmp_path / "out")
    assert done.code == 0, done.err
    assert len(statement(tmp_path / "out")["inputs"]) == 2


class Elements(HTMLParser):
    """Attributes of every element, the content of every script, and the text of all the rest."""

    def __init__(self) -> None:
        super().__init__()
        self.attributes: list[tuple[str, str]] = []
        self.scripts: list[str] = []
        self.text: list[str] = []
        self._script = False

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        """Note the attributes; a script begins."""
        self._script = tag == "script"
        self.attributes += [(name, value or "") for name, value in attrs]
        if self._script:
            self.scripts.append("")

    def handle_endtag(self, tag: str) -> None:
        """A script may end."""
        self._script = False if tag == "script" else self._script

    def handle_data(self, data: str) -> None:
        """Note text."""
        if self._script:
            self.scripts[-1] += data
        else:
            self.text.append(data)


def test_names_and_cells_that_are_code_stay_text(tmp_path: Path) -> None:
    """A tag named as a script, a title as an image, a file and cells as formulas: inert in HTML and CSV."""
    script, image = "<script>alert(1)</script>", "<img src=x onerror=alert(2)>"
    plant = changed(
        GAS_ENGINE,
        ("tags.power  = { column = \"P\"", f"tags.\"{script}\" = {{ column = \"{script}\""),
        ('tag = "power"', f'tag = "{script}"'),
        ('title = "Gas engine"', f'title = "{image}"'),
        ('files = ["plant/*.csv"]', 'files = ["*.csv"]'),
    )  # fmt: skip
    power = ["1000.0"] * SECONDS.size
    words = ("=1+1", "@SUM(A1)", "+cmd|'/C calc'!A0", "<b>bad</b>", "-")
    power[100:105] = words
    columns = {
        script if name == "P" else name: power if name == "P" else value for name, value in COLUMNS.items()
    }
    place = site(tmp_path / "site", plant, {"=1+1.csv": export(SECONDS, columns)})
    done = run("audit", place, *one_day(DAY), "--out", tmp_path / "out")
    assert done.code == 0, done.err
    page = (tmp_path / "out/report.html").read_text(encoding="utf-8")
    assert script not in page and image not in page
    elements = Elements()
    elements.feed(page)
    assert len(elements.scripts) == 3
    assert all("alert(" not in program for program in elements.scripts)
    assert not any(name.startswith("on") for name, _ in elements.attributes)
    said = "".join(elements.text)
    assert script in said and image in said
    for name in ("intervals.csv", "dispositions.csv"):
        with (tmp_path / "out" / name).open(encoding="utf-8", newline="") as file:
            for row in csv.reader(file):
                risky = [cell for cell in row if cell[:1] in ("=", "+", "@", "-", "\t", "\r")]
                assert all(cell[0] == "-" and float(cell) < 0.0 for cell in risky), risky
    with (tmp_path / "out/dispositions.csv").open(encoding="utf-8", newline="") as file:
        rows = [row for row in csv.DictReader(file) if row["tag"] == script]
    rejected = {row["kind"]: row for row in rows if row["kind"] in ("status word", "unparseable")}
    assert sum(int(row["amount"]) for row in rejected.values()) == len(words)
    shown = {text for row in rejected.values() for text in (row["first_text"], row["last_text"])}
    assert "'=1+1" in shown and {row["first_file"] for row in rejected.values()} == {"'=1+1.csv"}


# --- inputs are only ever read; a killed run and a second run


def test_inputs_are_only_read(tmp_path: Path) -> None:
    """Read-only files and folders are audited; content and times of change stay as they were."""
    place = site(tmp_path / "site", GAS_ENGINE, {"plant/a.csv": GOOD, "notes.txt": b"shift log"})
    inputs = [place / "plant.toml", *sorted((place / "logs").rglob("*")), place / "logs"]
    for path in inputs:
        path.chmod(stat.S_IREAD | (stat.S_IEXEC if path.is_dir() else 0))
    before = {path: (path.stat().st_mtime_ns, path.stat().st_size) for path in inputs}
    found = digests(place)
    try:
        for arguments in (("check", place), ("audit", place, *one_day(DAY)), ("nightly", place)):
            assert run(*arguments).code in (0, 6)
    finally:
        for path in inputs:
            path.chmod(stat.S_IREAD | stat.S_IWRITE | (stat.S_IEXEC if path.is_dir() else 0))
    assert {path: (path.stat().st_mtime_ns, path.stat().st_size) for path in inputs} == before
    after = digests(place)
    assert {name: after[name] for name in found} == found


def writing(out: Path) -> bool:
    """Whether a run has begun to write outputs."""
    return any(out.glob(".writing-*"))


@pytest.mark.parametrize("moment", ["reading", "first output", "last output"])
def test_a_killed_run_leaves_whole_reports(tmp_path: Path, moment: str) -> None:
    """Killed without warning: every output is the old or the new one; the next run sets it right."""
    place, out = site(tmp_path / "site", GAS_ENGINE, {"plant/a.csv": GOOD}), tmp_path / "out"
    arguments = ("audit", place, *one_day(DAY), "--out")
    assert run(*arguments, out).code == 0
    old = digests(out)
    edited = GAS_ENGINE.replace("1000 kW", "1010 kW").replace('name = "Small Works"', 'name = "Larger Works"')
    (place / "plant.toml").write_text(edited, encoding="utf-8")
    assert run(*arguments, tmp_path / "new").code == 0
    new = digests(tmp_path / "new")
    assert new["report.html"] != old["report.html"]

    victim = subprocess.Popen(command(*arguments, out), env=surroundings(), stderr=subprocess.PIPE, text=True)
    assert victim.stderr is not None
    if moment == "reading":
        assert victim.stderr.readline() != ""
    else:
        wanted = ".writing-report.html" if moment == "last output" else ".writing-*"
        deadline = time.monotonic() + 60.0
        while victim.poll() is None and not any(out.glob(wanted)) and time.monotonic() < deadline:
            time.sleep(0.0005)
    victim.send_signal(signal.SIGKILL)
    victim.communicate()
    left = digests(out)
    for name in ("report.html", "statement.json", "intervals.csv"):
        assert left[name] in (old[name], new[name]), name
    if moment == "reading":
        assert victim.returncode == -signal.SIGKILL and left == old
    assert run(*arguments, out).code == 0
    assert digests(out) == new and not writing(out)


def test_of_two_runs_at_once_the_second_is_refused(tmp_path: Path) -> None:
    """While one run holds the site (stopped in its middle), the next exits 5 and changes nothing."""
    place = site(tmp_path / "site", GAS_ENGINE, {"plant/a.csv": GOOD})
    first = subprocess.Popen(
        command("audit", place, *one_day(DAY)), env=surroundings(), stderr=subprocess.PIPE, text=True
    )
    assert first.stderr is not None and first.stderr.readline() != ""
    first.send_signal(signal.SIGSTOP)
    try:
        before = digests(place)
        for arguments in (("audit", place, *one_day(DAY)), ("nightly", place)):
            second = run(*arguments)
            assert second.code == 5 and "another run" in second.err
        after = digests(place)
        after.pop("audit/run.log", None)
        assert after == before
    finally:
        first.send_signal(signal.SIGCONT)
        first.communicate(timeout=60)
    assert first.returncode == 0
    assert run("audit", place, *one_day(DAY)).code == 0
