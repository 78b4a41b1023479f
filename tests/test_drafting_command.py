"""The command ``auditor draft``: streams, exit codes, and files that are never written over."""

from __future__ import annotations

import json
import tomllib
from pathlib import Path

from site_factory import run

LOG = "t;P [kW]\n" + "".join(f"2026-07-13 {hour:02d}:00;{hour}.5\n" for hour in range(24))


def logs(folder: Path) -> Path:
    """Lay out a folder with one export and one note."""
    folder.mkdir()
    (folder / "a.csv").write_text(LOG, encoding="utf-8")
    (folder / "notes.txt").write_text("engine down\n", encoding="utf-8")
    return folder


def test_draft_goes_to_standard_output_and_notes_do_not(tmp_path: Path) -> None:
    """Exit 0; what was skipped is told on standard error, and not at all when quiet."""
    folder = logs(tmp_path / "logs")
    done = run("draft", folder)
    assert done.code == 0 and tomllib.loads(done.out)["schema"] == 1
    assert "skipped notes.txt" in done.err and "1 tags proposed" in done.err
    quiet = run("draft", folder, "--quiet")
    assert quiet.out == done.out and quiet.err == ""
    assert run("draft", tmp_path, "--quiet").out == done.out, "a site's folder means its logs/"


def test_out_is_written_once_and_never_over(tmp_path: Path) -> None:
    """Exit 2 where the file exists, and it is left as it was."""
    folder, target = logs(tmp_path / "logs"), tmp_path / "plant.toml"
    done = run("draft", folder, "--out", target)
    assert done.code == 0 and done.out == ""
    assert target.read_text(encoding="utf-8") == run("draft", folder).out
    target.write_text("mine", encoding="utf-8")
    again = run("draft", folder, "--out", target)
    assert (
        again.code == 2 and "never writes over" in again.err and target.read_text(encoding="utf-8") == "mine"
    )


def test_draft_then_check_names_what_is_missing(tmp_path: Path) -> None:
    """The draft beside its logs is a plant file whose blanks `check` names, exit 2."""
    folder = logs(tmp_path / "logs")
    assert run("draft", folder, "--out", tmp_path / "plant.toml").code == 0
    done = run("check", tmp_path)
    assert done.code == 2
    assert all(key in done.err for key in ("exports.logger.clock", "site.zone", "machines"))


def test_json(tmp_path: Path) -> None:
    """The same for other programs: blanks are null, and the text is in it."""
    folder = logs(tmp_path / "logs")
    entries = json.loads(run("draft", folder, "--json").out)
    (export,) = entries["exports"]
    assert export["clock"] is None and export["tags"][0]["unit"]["unit"] == "kW"
    assert export["tags"][0]["between"] is None
    assert entries["plant_file"] == run("draft", folder).out
    assert entries["skipped"][0]["file"] == "notes.txt"


def test_exit_codes_of_failures(tmp_path: Path) -> None:
    """No such folder is 2, nothing to draft from is 3, no place to write is 5."""
    assert run("draft", tmp_path / "nowhere").code == 2
    empty = tmp_path / "empty"
    empty.mkdir()
    assert run("draft", empty).code == 3
    folder = logs(tmp_path / "logs")
    assert run("draft", folder, "--out", tmp_path / "no" / "plant.toml").code == 5
