"""A large file that is not in order gives the same samples as in order, and leaves nothing behind."""

from __future__ import annotations

import random
from datetime import datetime, timedelta
from pathlib import Path

import numpy as np
import pytest
from log_reading_factory import Reading, make_export, read

from auditor.log_reading import read_export, recognise

START = datetime(2026, 7, 1)
LINES = [
    f"{START + timedelta(minutes=5 * row):%Y-%m-%d %H:%M:%S};{row}.5;{'Bad' * (row % 9 == 0)}"
    for row in range(45_000)
]


@pytest.fixture
def scratch(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """The only place for temporary files."""
    place = tmp_path / "scratch"
    place.mkdir()
    monkeypatch.setattr("tempfile.tempdir", str(place))
    monkeypatch.setattr("auditor.log_reading.chunks.CHUNK", 200_000)
    return place


def read_lines(folder: Path, lines: list[str]) -> Reading:
    """Read one file, whose stamps may stand in any order."""
    text = "\n".join(["t;a;b", *lines, ""])
    assert len(text) > 1 << 20, "the file is too large to be looked at whole"
    return read(folder, {"log.csv": text}, make_export({"a": "a", "b": "b"}))


@pytest.mark.parametrize("order", ["newest first", "shuffled"])
def test_order_of_lines_never_matters(tmp_path: Path, scratch: Path, order: str) -> None:
    """Newest first or shuffled: samples, rejects and counts are those of the file in order."""
    lines = [*LINES, "2026-02-31 00:00:00;1;2"]
    mixed = lines[::-1]
    if order == "shuffled":
        random.Random(7).shuffle(mixed)
    plain, other = read_lines(tmp_path / "1", lines), read_lines(tmp_path / "2", mixed)
    for one, two in zip(stacked(plain), stacked(other), strict=True):
        np.testing.assert_array_equal(one, two)
    assert (
        plain.rejected("b") == other.rejected("b") == {"empty": 40_000, "status word": 5_000, "bad stamp": 1}
    )
    assert plain.counts() == other.counts() == (45_002, 45_000, 1, 1)
    assert max(block.instants_us.size for block in other.blocks) <= 288, "no more than a day is held"
    assert not list(scratch.iterdir())


def stacked(reading: Reading) -> tuple[np.ndarray, np.ndarray]:
    """Stamps and values of all rows."""
    instants_us = np.concatenate([block.instants_us for block in reading.blocks])
    return instants_us, np.concatenate([block.values for block in reading.blocks], axis=1)


def test_nothing_is_left_behind_when_reading_is_given_up(tmp_path: Path, scratch: Path) -> None:
    """A reader that stops half-way leaves no temporary files."""
    (tmp_path / "logs").mkdir()
    (tmp_path / "logs" / "log.csv").write_text("\n".join(["t;a;b", *LINES[::-1], ""]))
    export, tags = make_export({"a": "a", "b": "b"})
    blocks = read_export(recognise(tmp_path / "logs", {"x": export}, tags), "x", (0, 2**62))
    next(blocks)
    assert list(scratch.iterdir())
    blocks.close()
    assert not list(scratch.iterdir())
