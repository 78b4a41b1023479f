"""Reading ahead on several threads: the same samples, notes and ticks as on one, to the last byte."""

from __future__ import annotations

import pickle
import random
import threading
import time
from collections.abc import Callable, Iterator
from dataclasses import replace
from datetime import date
from pathlib import Path
from typing import IO

import numpy as np
import pytest
from log_reading_factory import ALL_TIME, make_export

from auditor.cleaning import CleaningSettings, between_dates, clean, make_grid
from auditor.log_reading import chunks, read_export, recognise
from auditor.log_reading.ahead import in_order, one_ahead
from auditor.log_reading.long_layout import pivot
from auditor.records.findings import FindingCode
from auditor.records.plant import Export, LongLayout, PairsLayout, Quality, Tag
from auditor.records.samples import ReadingNote

WORDS = ("Störung", "off", "", "n/a", "-9999", " bad ", "7,5")


def wide_text(zone_change: bool) -> str:
    """Two days of minutes with words, ragged and blank lines, perhaps around the end of summer time."""
    rng = random.Random(5)
    lines = ["stamp;a;b;c"]
    for minute in range(2 * 1440):
        day = 25 + (minute >= 1440)
        hour, rest = divmod(minute % 1440, 60)
        repeats = 2 if zone_change and day == 26 and hour == 2 and rest == 0 else 1
        for turn in range(repeats):
            for part in range(60 if repeats == 2 else 1):
                cells = [f"{rng.random():.4f}" if rng.random() > 0.1 else rng.choice(WORDS) for _ in "abc"]
                stamp = f"2025-10-{day} {hour:02d}:{part if repeats == 2 else rest:02d}:{turn:02d}"
                lines.append(";".join([stamp, *cells]))
        if rng.random() < 0.01:
            lines.append(rng.choice(["", "2025-10-25;1", "no stamp;1;2;3"]))
    return "\n".join([*lines, "end of export"])


def long_text() -> str:
    """A day of half minutes of three tags, one of them unknown, some stamps without all of them."""
    rng = random.Random(6)
    lines = ["t,n,v"]
    for second in range(0, 86_400, 30):
        hour, minute = divmod(second // 60, 60)
        stamp = f"2025-10-25 {hour:02d}:{minute:02d}:{second % 60:02d}"
        for name in rng.sample(["A", "B", "C", "X"], rng.randint(1, 4)):
            lines.append(f"{stamp},{name},{rng.choice(WORDS) if rng.random() < 0.1 else rng.random()}")
    return "\n".join(lines) + "\n"


def pairs_text() -> str:
    """A day of minutes of three tags, each with stamps of its own; the pairs end one after the other."""
    rng = random.Random(7)
    lines = ["t1;a;t2;b;t3;c"]
    for minute in range(1440):
        cells = []
        for column in range(3):
            stamp = f"2025-10-25 {minute // 60:02d}:{minute % 60:02d}:{rng.randint(0, 59):02d}"
            filled = minute < 1440 - 200 * column
            number = f"{rng.random():.3f}" if rng.random() > 0.1 else rng.choice(WORDS)
            cells += [stamp if rng.random() > 0.02 else "no stamp", number] if filled else ["", ""]
        lines.append(";".join(cells))
    return "\n".join(lines) + "\n"


def coded_text() -> str:
    """A day of minutes of three tags with quality codes, grouped digits, units, exponents; rows on top."""
    rng = random.Random(8)
    lines = ["2025-10-25 00:00:00;A;1;192", "t;n;v;q"]
    for minute in range(1, 1440):
        stamp = f"2025-10-25 {minute // 60:02d}:{minute % 60:02d}:00"
        for name in "ABC":
            number = f"{10_000 + minute * 7 + rng.random():,.2f}".replace(",", " ")
            number += " W" if rng.random() < 0.1 else ""
            counter = rng.choice([f"{100_000 + minute}", "1.0E+05", f"{100_000 + minute:.6E}"])
            text = rng.choice(WORDS) if rng.random() < 0.05 else counter if name == "C" else number
            lines.append(f"{stamp};{name};{text.replace(',', '.')};{rng.choice(['192', '192', '0', ''])}")
    return "\n".join(lines) + "\n"


def text_of(shape: str) -> str:
    """The export of a shape."""
    texts = {"long": long_text, "pairs": pairs_text, "coded": coded_text}
    return texts[shape]() if shape in texts else wide_text(zone_change=shape == "autumn")


def declared(shape: str) -> tuple[Export, dict[str, Tag]]:
    """The declaration of the exports above."""
    if shape == "long":
        layout = LongLayout("t", "n", "v")
        return make_export({"a": "A", "b": "B", "c": "C"}, layout=layout)
    if shape == "pairs":
        return make_export({"a": "a", "b": "b", "c": "c"}, layout=PairsLayout())
    if shape == "coded":
        layout = LongLayout("t", "n", "v", Quality("q", ("192",)))
        names, units = {"a": "A", "b": "B", "c": "C"}, {"a": "W", "b": "W"}
        export, tags = make_export(names, layout=layout, units=units, thousands="space")
        return export, tags | {"c": replace(tags["c"], between="counter")}
    return make_export({"a": "a", "b": "b", "c": "c"}, clock="Europe/Stockholm", sentinels=(-9999.0,))


def everything(folder: Path, shape: str, threads: int) -> bytes:
    """All that reading and cleaning give, as bytes."""
    export, tags = declared(shape)
    recognition = recognise(folder, {"x": export}, tags)
    pieces = list(read_export(recognition, "x", ALL_TIME, threads=threads))
    blocks = [piece for piece in pieces if not isinstance(piece, ReadingNote)]
    grid = make_grid(between_dates(date(2025, 10, 25), date(2025, 10, 26), export.clock), 60, 900)
    ticks, findings = clean({"x": blocks}, CleaningSettings({"x": export}, tags, (), {}, {}), grid)
    assert len(blocks) > 5, "the file must be read in several chunks"
    return pickle.dumps([repr(piece) for piece in pieces]) + b"".join(
        [
            *(
                block.values.tobytes() + block.instants_us.tobytes() + block.line.tobytes()
                for block in blocks
            ),
            ticks.mean.tobytes() + ticks.covered_s.tobytes() + ticks.cells.counts.tobytes(),
            repr((findings, ticks.cells.first, ticks.cells.last, ticks.cells.words)).encode(),
        ]
    )


@pytest.mark.parametrize("shape", ["wide", "autumn", "long", "pairs", "coded"])
def test_any_number_of_threads_reads_the_same(
    tmp_path: Path, shape: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Blocks, notes, ticks and ledgers are the same bytes with one, two and four threads."""
    monkeypatch.setattr(chunks, "CHUNK", 8192)
    (tmp_path / "export.csv").write_text(text_of(shape))
    alone = everything(tmp_path, shape, 1)
    assert all(everything(tmp_path, shape, threads) == alone for threads in (2, 4))


def test_lines_before_a_broken_place_are_kept(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """What stands before the place where a file cannot be read on is read with any number of threads."""
    monkeypatch.setattr(chunks, "CHUNK", 4096)
    (tmp_path / "export.csv").write_text(wide_text(zone_change=False))
    export, tags = declared("wide")
    recognition = recognise(tmp_path, {"x": export}, tags)
    whole = chunks.read_chunks

    def broken(stream: IO[bytes], size: int | None, head_lines: int = 0) -> Iterator[chunks.Chunk]:
        for number, chunk in enumerate(whole(stream, size)):
            if number == 9:
                raise OSError(5, "the disk went away")
            yield chunk

    monkeypatch.setattr("auditor.log_reading.file_reading.read_chunks", broken)
    told = []
    for threads in (1, 3):
        pieces = read_export(recognition, "x", ALL_TIME, threads=threads)
        (note,) = [piece for piece in pieces if isinstance(piece, ReadingNote)]
        assert FindingCode.UNREADABLE_FILE in [finding.code for finding in note.findings]
        told.append((note.lines, note.lines_data))
    assert told[0] == told[1] and told[0][1] > 500


@pytest.mark.parametrize("threads", [1, 2, 5])
def test_results_come_in_the_order_of_the_jobs(threads: int) -> None:
    """A slow job holds up the results behind it; what the source of jobs raises comes last."""

    def job(number: int) -> int:
        time.sleep(0.002 * (number % 3))
        return number

    def jobs() -> Iterator[Callable[[], int]]:
        for number in range(12):
            yield lambda number=number: job(number)  # type: ignore[misc]
        raise OSError("no more")

    seen: list[int] = []
    with pytest.raises(OSError, match="no more"):
        for result in in_order(jobs(), threads):
            seen.append(result)
    assert seen == list(range(12))


def test_reading_that_is_given_up_leaves_no_thread() -> None:
    """Whoever stops in the middle stops the threads too."""
    before = threading.active_count()
    pieces = one_ahead(iter(range(100)), 2)
    assert [next(pieces), next(pieces)] == [0, 1]
    assert threading.active_count() == before + 1
    pieces.close()  # type: ignore[attr-defined]
    assert threading.active_count() == before


def test_rows_of_a_stamp_in_any_order_of_tags() -> None:
    """Lines of one stamp share a row in any order of their tags; a tag that comes again opens another."""
    instants = np.array([1, 1, 1, 2, 2, 3, 3])
    tag = np.array([2, 0, 1, 1, 0, 0, 0])
    values = np.arange(7.0)
    out, stamps, line = pivot(values, tag, instants, np.arange(10, 17), 3)
    assert stamps.tolist() == [1, 2, 3, 3] and line.tolist() == [10, 13, 15, 16]
    kept = pivot(values[:5], tag[:5], instants[:5], np.arange(10, 15), 3)
    assert np.array_equal(kept[0], out[:, :2], equal_nan=True) and kept[2].tolist() == [10, 13]
    assert np.nan_to_num(out, nan=-1.0).tolist() == [[1, 4, 5, 6], [2, 3, -1, -1], [0, -1, -1, -1]]
