"""The site's folder: outputs whole or not at all, one lock, and a history that only grows."""

from __future__ import annotations

import subprocess
import sys
import textwrap
from pathlib import Path

import pytest

from auditor import history, site_folder
from auditor.records.errors import Exit, InputOutputError, worst
from auditor.site_folder import append_run_log, locked, write_outputs


def test_a_second_run_is_refused_at_once(tmp_path: Path) -> None:
    """Another process holding the lock: exit code 5, nothing changed."""
    code = textwrap.dedent("""
        import sys
        from pathlib import Path
        from auditor.site_folder import locked
        with locked(Path(sys.argv[1])):
            print("held", flush=True)
            sys.stdin.read()
    """)
    holder = subprocess.Popen(
        [sys.executable, "-c", code, str(tmp_path)], stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True
    )
    try:
        assert holder.stdout is not None and holder.stdout.readline() == "held\n"
        with pytest.raises(InputOutputError, match="another run") as refused, locked(tmp_path):
            pytest.fail("the lock was given twice")
        assert refused.value.exit_code is Exit.INPUT_OUTPUT
    finally:
        holder.communicate("")
    with locked(tmp_path):
        pass


def test_a_killed_run_leaves_the_lock_free(tmp_path: Path) -> None:
    """The lock dies with its process; the lock file that stays does not matter."""
    code = (
        "import os, sys\nfrom pathlib import Path\nfrom auditor.site_folder import locked\n"
        "with locked(Path(sys.argv[1])):\n    os._exit(9)\n"
    )
    subprocess.run([sys.executable, "-c", code, str(tmp_path)], check=False)
    with locked(tmp_path):
        pass


def test_outputs_are_replaced_only_when_all_are_ready(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """A run that dies while writing leaves every earlier output whole, and its leftovers are swept."""
    write_outputs(tmp_path, {"intervals.csv": b"old", "report.html": b"old report"})

    def killed(_handle: int) -> None:
        raise KeyboardInterrupt

    with monkeypatch.context() as patch:
        patch.setattr(site_folder.os, "fsync", killed)
        with pytest.raises(KeyboardInterrupt):
            write_outputs(tmp_path, {"intervals.csv": b"new", "report.html": b"new report"})
    assert (tmp_path / "intervals.csv").read_bytes() == b"old"
    assert (tmp_path / "report.html").read_bytes() == b"old report"
    assert any(path.name.startswith(".writing-") for path in tmp_path.iterdir())
    write_outputs(tmp_path, {"intervals.csv": b"new", "report.html": b"new report"})
    assert sorted(path.name for path in tmp_path.iterdir()) == ["intervals.csv", "report.html"]
    assert (tmp_path / "report.html").read_bytes() == b"new report"


def test_right_bytes_are_not_written_again(tmp_path: Path) -> None:
    """An output that is right already keeps its time of change."""
    write_outputs(tmp_path, {"report.html": b"same"})
    before = (tmp_path / "report.html").stat().st_mtime_ns
    write_outputs(tmp_path, {"report.html": b"same"})
    assert (tmp_path / "report.html").stat().st_mtime_ns == before


def test_a_folder_that_cannot_be_written_is_explained(tmp_path: Path) -> None:
    """A file where the folder should be: the message names it and exit code 5 follows."""
    (tmp_path / "audit").write_text("a file")
    with pytest.raises(InputOutputError, match="audit"):
        write_outputs(tmp_path / "audit", {"report.html": b"x"})
    with pytest.raises(InputOutputError, match="audit"):
        append_run_log(tmp_path / "audit", ["line"])


def past(key: str) -> history.PastAudit:
    """An entry of the history."""
    return history.PastAudit("2026-07", key, "1.0", 0, {"report.html": "ab"}, {"machines": {}})


def test_history_keeps_the_latest_of_each_month(tmp_path: Path) -> None:
    """Entries are appended, never changed; the same entry twice is one entry."""
    assert history.read_past(tmp_path) == {}
    for key in ("first", "second", "second"):
        history.append(tmp_path, past(key))
    assert history.read_past(tmp_path) == {"2026-07": past("second")}
    with history._opened(tmp_path / history.HISTORY) as connection:
        keys = [row[0] for row in connection.execute("SELECT content_key FROM audits ORDER BY number")]
        assert connection.execute("PRAGMA journal_mode").fetchone() == ("delete",)
    assert keys == ["first", "second"]


def test_a_damaged_history_is_explained(tmp_path: Path) -> None:
    """Noise in place of the history: exit code 5 with the remedy, not a traceback."""
    (tmp_path / history.HISTORY).write_bytes(b"noise" * 400)
    with pytest.raises(InputOutputError, match="history"):
        history.read_past(tmp_path)


def test_worst_exit_code() -> None:
    """1, 5, 2, 3, 4, 6, 0 from worst to best, also over several sites."""
    order = [Exit(code) for code in (1, 5, 2, 3, 4, 6, 0)]
    for place in range(len(order)):
        assert worst(reversed(order[place:])) is order[place]
    assert worst([]) is Exit.FIRM
