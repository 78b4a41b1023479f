"""ruff and mypy are part of the tests."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[1]


@pytest.mark.parametrize(
    "command",
    [
        ("ruff", "check", "--no-cache", "."),
        ("ruff", "format", "--no-cache", "--check", "."),
        ("mypy", "--cache-dir", "{cache}"),
    ],
    ids=lambda command: " ".join(command[:2]),
)
def test_tools_have_nothing_to_say(command: tuple[str, ...], tmp_path: Path) -> None:
    """Linter, formatter and type checker (strict on the package) are silent."""
    if command[0] == "mypy" and sys.version_info[:2] != (3, 11):
        pytest.skip("types are checked on Python 3.11 only: numpy's stubs differ from version to version")
    words = [word.replace("{cache}", str(tmp_path)) for word in command]
    done = subprocess.run(
        [sys.executable, "-m", *words], cwd=ROOT, capture_output=True, text=True, check=False
    )
    assert done.returncode == 0, done.stdout + done.stderr
