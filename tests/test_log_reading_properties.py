"""Whatever stands in a file: every line and every cell is accounted for, and good lines are read."""

from __future__ import annotations

import tempfile
from pathlib import Path

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from log_reading_factory import Reading, make_export, read

from auditor.log_reading.samples import count_lines

WORDS = [
    "Bad",
    "---",
    "Störung",
    "NaN",
    "inf",
    "0x1F",
    "12.3 kW",
    "1,5",
    "1.2.3",
    "",
    "  ",
    '"',
    '"7"',
    '5"',
    "\0",
    "-9999",
]
NUMBERS = st.floats(-1e6, 1e6, allow_nan=False).map(lambda value: f"{value:.4g}")
CELLS = st.one_of(NUMBERS, NUMBERS, NUMBERS, st.sampled_from(WORDS), st.text(max_size=4))
STAMPS = st.one_of(
    st.integers(0, 5000).map(lambda at: f"2026-07-0{1 + at // 1440} {at // 60 % 24:02}:{at % 60:02}"),
    st.sampled_from(["2026-02-31 00:00", "", "2026-07-01", "x", "2026-07-01T24:00"]),
)
LINES = st.one_of(
    st.tuples(STAMPS, CELLS, CELLS).map(";".join),
    st.tuples(STAMPS, CELLS, CELLS).map(";".join),
    st.lists(CELLS, max_size=6).map(";".join),
    st.sampled_from(["", "t;a;b", ";;", "end", "t;a;b;"]),
)
SETTINGS = settings(suppress_health_check=list(HealthCheck))


def read_bytes(content: bytes) -> Reading:
    """Read one file, both of whose columns are bound."""
    with tempfile.TemporaryDirectory() as folder:
        return read(
            Path(folder), {"log.csv": content}, make_export({"a": "a", "b": "b"}, sentinels=(-9999.0,))
        )


@SETTINGS
@given(
    st.lists(LINES, max_size=40),
    st.sampled_from(["\n", "\r\n", "\r"]),
    st.integers(0, 30),
    st.sampled_from(["utf-8", "utf-16"]),
)
def test_lines_and_cells_add_up(lines: list[str], end: str, cut: int, encoding: str) -> None:
    """Data, skipped and rejected lines are all lines; values and rejects are all cells of whole lines."""
    text = end.join(["t;a;b", "2026-07-01 00:00;1.5;2", *lines, ""])
    content = text[: len(text) - min(cut, len(text) - 30)].encode(encoding, "replace")
    got = read_bytes(content)
    note = got.note
    recoded = content.decode(encoding, "replace").encode()
    assert note.lines == count_lines(recoded) + (not recoded.endswith((b"\n", b"\r")))
    finite = sum(np.isfinite(block.values).sum(axis=1) for block in got.blocks)
    rejected = sum(block.rejected.sum(axis=1) for block in got.blocks)
    cells = finite + rejected
    assert cells[0] == cells[1], "both columns have a cell on every whole line"
    assert note.lines_data <= cells[0] <= note.lines_data + note.lines_rejected


@SETTINGS
@given(
    st.lists(
        st.tuples(st.integers(0, 5000), NUMBERS, NUMBERS),
        min_size=1,
        max_size=40,
        unique_by=lambda row: row[0],
    ),
    st.randoms(),
)
def test_order_and_splitting_never_change_a_sample(rows: list[tuple[int, str, str]], random: object) -> None:
    """Shuffled rows, or rows spread over two files, give the same samples in the same order."""
    lines = [
        f"2026-07-0{1 + at // 1440} {at // 60 % 24:02}:{at % 60:02};{a};{b}" for at, a, b in sorted(rows)
    ]
    shuffled = list(lines)
    random.shuffle(shuffled)
    plain = read_bytes("\n".join(["t;a;b", *lines, ""]).encode())
    mixed = read_bytes("\n".join(["t;a;b", *shuffled, ""]).encode())
    with tempfile.TemporaryDirectory() as folder:
        parts = {
            f"{name}.csv": "\n".join(["t;a;b", *part, ""])
            for name, part in (("1", shuffled[::2]), ("2", shuffled[1::2]))
            if part
        }
        split = read(Path(folder), parts, make_export({"a": "a", "b": "b"}))
    assert plain.values == [(float(a), float(b)) for _, a, b in sorted(rows)]
    for other in (mixed, split):
        assert [(stamp, values) for stamp, _, values in other.rows] == [
            (stamp, values) for stamp, _, values in plain.rows
        ]


@SETTINGS
@given(
    st.lists(LINES, min_size=60, max_size=150), st.sampled_from(["\n", "\r\n", "\r"]), st.integers(2000, 4000)
)
def test_where_a_file_is_cut_changes_nothing(lines: list[str], end: str, size: int) -> None:
    """Chunks of any size give the same rows, rejects and counts."""
    content = end.join(["t;a;b", "2026-07-01 00:00;1.5;2", *lines, ""]).encode("utf-8", "replace")
    whole = read_bytes(content)
    with pytest.MonkeyPatch.context() as patched:
        patched.setattr("auditor.log_reading.chunks.CHUNK", size)
        cut = read_bytes(content)
    assert cut.rows == whole.rows
    assert sorted(cut.rejects) == sorted(whole.rejects)
    assert cut.counts() == whole.counts()
