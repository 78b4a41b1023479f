"""The command line: help, versions, what goes to which stream, and the texts for other programs."""

from __future__ import annotations

import json
import subprocess
import sys
from pathlib import Path

import pytest
from site_factory import GAS_ENGINE, command, export, instants, one_day, run, run_apart, site, surroundings

import auditor

DAY = "2025-06-03"
FILES = {
    "plant/a.csv": export(
        instants(DAY, "2025-06-04"), {"G": 250.0, "P": 1000.0, "F": 16.25, "S": 90.0, "R": 70.0, "SPARE": 1.0}
    ),
    "notes.txt": b"nobody claims this",
}
COMMANDS = ("audit", "check", "draft", "demo", "nightly")


def test_help_of_the_program_names_commands_and_exit_codes() -> None:
    """Exit 0, on standard output."""
    done = run("--help")
    assert done.code == 0 and done.err == ""
    assert all(name in done.out for name in COMMANDS)
    assert all(f"\n  {code}  " in done.out for code in range(7))


@pytest.mark.parametrize("name", COMMANDS)
def test_help_of_each_command(name: str) -> None:
    """Exit 0; every command has --quiet and --json, and tells the exit codes."""
    done = run(name, "--help")
    assert done.code == 0 and done.err == ""
    assert "--quiet" in done.out and "--json" in done.out and "exit codes" in done.out


def test_version() -> None:
    """The number of the package."""
    done = run("--version")
    assert done.code == 0 and done.out == f"auditor {auditor.__version__}\n"


@pytest.mark.parametrize(
    "arguments", [(), ("audit",), ("sing",), ("audit", "--moth", "2025-06"), ("nightly",)]
)
def test_wrong_usage(arguments: tuple[str, ...]) -> None:
    """Exit 2, on standard error."""
    done = run(*arguments)
    assert done.code == 2 and done.out == "" and "usage" in done.err


def test_help_is_quick_because_nothing_heavy_is_imported() -> None:
    """No table, unit, property or drawing library before a command is known."""
    code = (
        "import sys\nfrom auditor.command_line import main\n"
        "try:\n    main(['--help'])\nexcept SystemExit:\n    pass\n"
        "heavy = {'numpy', 'pandas', 'pyarrow', 'pint', 'plotly', 'scipy', 'CoolProp', 'pydantic'}\n"
        "sys.exit(' '.join(sorted(heavy & sys.modules.keys())) or None)\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", code], env=surroundings(), capture_output=True, text=True, check=False
    )
    assert done.returncode == 0, done.stderr


def test_data_on_standard_output_everything_else_on_standard_error(tmp_path: Path) -> None:
    """--json prints JSON and nothing else; progress and messages go to the other stream; --quiet is quiet."""
    place = site(tmp_path / "site", GAS_ENGINE, FILES)
    done = run_apart("audit", place, *one_day(DAY), "--json")
    assert done.code == 0 and "reading plant" in done.err
    printed = json.loads(done.out)
    report = Path(printed["report"])
    assert report.is_file() and report == place / "audit" / f"{DAY}_{DAY}" / "report.html"
    stored = json.loads((report.parent / "statement.json").read_text(encoding="utf-8"))
    assert printed["statement"] == stored
    quiet = run_apart("audit", place, *one_day(DAY), "--quiet")
    assert quiet.code == 0 and quiet.err == "" and str(report) in quiet.out
    both = run("audit", place, *one_day(DAY), "--quiet", "--json")
    assert both.err == "" and json.loads(both.out) == printed


def test_the_summary_says_what_the_statement_says(tmp_path: Path) -> None:
    """Where the report lies, how far to believe it, and the headline of each machine."""
    place = site(tmp_path / "site", GAS_ENGINE, FILES)
    done = run("audit", place, *one_day(DAY), "--out", tmp_path / "out")
    assert done.code == 0
    assert f"Report: {tmp_path / 'out' / 'report.html'}" in done.out
    plain = done.out.replace("\u00a0", " ")
    assert "Published, firm" in plain and "40.0 ± 1.0 %" in plain and "lower heating value" in plain
    assert not (place / "audit").exists()


def test_check_tells_what_was_recognised_and_what_nobody_claims(tmp_path: Path) -> None:
    """Tags with their columns, the file nobody claims and the column nobody claims; nothing is written."""
    place = site(tmp_path / "site", GAS_ENGINE, FILES)
    done = run("check", place, "--quiet")
    assert done.code == 0 and done.err == ""
    for word in ("plant/a.csv", "notes.txt", "SPARE", 'tag power: column "P", kW', "step"):
        assert word in done.out, word
    printed = json.loads(run("check", place, "--json", "--quiet").out)
    assert printed["tags"]["power"]["column"] == "P"
    by_name = {each["file"]: each for each in printed["files"]}
    assert by_name["plant/a.csv"]["unclaimed_cells"] == {"SPARE": 1440}
    assert by_name["plant/a.csv"]["lines"] == 1441 and by_name["notes.txt"]["export"] is None
    assert sorted(path.name for path in place.iterdir()) == ["logs", "plant.toml"]


def test_check_prints_the_schema_of_the_plant_file() -> None:
    """A JSON schema, with or without a site."""
    done = run("check", "--schema")
    assert done.code == 0
    schema = json.loads(done.out)
    assert {"site", "exports", "machines"} <= schema["properties"].keys()


def test_the_same_verbs_are_functions(tmp_path: Path) -> None:
    """``auditor.audit`` returns what the command publishes, and writes nothing."""
    import datetime

    place = site(tmp_path / "site", GAS_ENGINE, FILES)
    date = datetime.date.fromisoformat(DAY)
    result = auditor.audit(place, start=date, end=date)
    assert result.balances["engine"].period["gross"].value == pytest.approx(0.40, rel=1e-9)
    assert sorted(path.name for path in place.iterdir()) == ["logs", "plant.toml"]


def test_a_reader_that_goes_away_is_no_failure_of_ours(tmp_path: Path) -> None:
    """Standard output closed by the other side: no traceback."""
    place = site(tmp_path / "site", GAS_ENGINE, FILES)
    process = subprocess.Popen(
        command("check", place, "--quiet"), env=surroundings(), stdout=subprocess.PIPE, stderr=subprocess.PIPE
    )
    assert process.stdout is not None and process.stderr is not None
    process.stdout.close()
    assert b"Traceback" not in process.stderr.read()
    process.stderr.close()
    assert process.wait(60) in (0, 5)
