"""Damage exports at random and read them: no crash, no hang, no line and no cell unaccounted for.

Run by hand, it is no test of the suite::

    python tests/fuzz_reading.py --inputs 200000 --seed 1 --jobs 2

Every input is one export, damaged one to six times, read alone or beside a whole file of the same export,
every third one again in small pieces.
Same seed, same inputs. The exit code is 1 if anything failed; failing inputs are kept in ``--keep``.
"""

from __future__ import annotations

import argparse
import faulthandler
import gzip
import io
import multiprocessing
import random
import re
import signal
import tempfile
import time
import traceback
import warnings
import zipfile
from collections import Counter
from collections.abc import Callable, Mapping
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass, replace
from datetime import UTC, datetime, timedelta
from pathlib import Path
from typing import Any
from unittest.mock import patch

import numpy as np
from log_reading_factory import make_export

from auditor.cleaning import CleaningSettings, clean
from auditor.log_reading import Recognition, read_export, recognise, recognition_notes
from auditor.records.errors import AuditorError
from auditor.records.period import Grid, Period
from auditor.records.plant import Export, LongLayout, Tag
from auditor.records.samples import ReadingNote, SampleBlock

LIMIT_S = 10.0
"""One input may take so long; the usual one takes a hundredth of a second."""
START = datetime(2026, 7, 1, tzinfo=UTC)
PERIOD_US = (int(START.timestamp()) * 1_000_000, int(START.timestamp() + 3600) * 1_000_000)
GRID = Grid(
    Period("one hour", *PERIOD_US, "UTC"),
    60,
    900,
    np.arange(*PERIOD_US, 60_000_000),
    np.array(PERIOD_US),
)
PASSED = re.compile(rb"\r\n|\r|\n")


@dataclass(frozen=True)
class Seed:
    """A whole export and how it is declared."""

    content: bytes
    export: Export
    tags: Mapping[str, Tag]
    suffix: str = ".csv"


def seeds() -> list[Seed]:
    """Whole exports of one hour in many layouts."""

    def rows(stamp: str, cells: Callable[[int], list[str]], delimiter: str = ";") -> list[str]:
        moments = [START + timedelta(minutes=place) for place in range(60)]
        return [
            delimiter.join([moment.strftime(stamp), *cells(place)]) for place, moment in enumerate(moments)
        ]

    def two(place: int) -> list[str]:
        return [f"{20.5 + place}", f"{-0.25 * place}"]

    def comma(place: int) -> list[str]:
        return [cell.replace(".", ",") for cell in two(place)]

    iso = "%Y-%m-%d %H:%M:%S"
    columns = {"a": "Kühler ein", "b": "Kühler aus"}
    head = "time;Kühler ein;Kühler aus"
    long_rows = [
        f"{(START + timedelta(minutes=place)).strftime(iso)},{name},{cell}"
        for place in range(60)
        for name, cell in zip(("Kühler ein", "Kühler aus"), two(place), strict=True)
    ]
    texts: list[tuple[list[str], str, str, dict[str, Any]]] = [
        ([head, *rows(iso, two)], "\n", "utf-8", {}),
        (
            [head, *rows("%d.%m.%Y %H:%M", comma)],
            "\r\n",
            "cp1252",
            {"date_order": "day first", "decimal": ","},
        ),
        (
            [head.replace(";", "\t"), *rows("%m/%d/%Y %H:%M:%S", two, "\t")],
            "\r",
            "utf-16",
            {"date_order": "month first"},
        ),
        (
            [head.replace(";", ","), *rows(iso, lambda at: [f'"{cell}"' for cell in two(at)], ",")],
            "\r\n",
            "utf-8-sig",
            {},
        ),
        (
            ["Logger 7", "", head, ";[m3/h];kW", *rows(iso, two), "", "Total;1;2"],
            "\n",
            "utf-8",
            {"units": {"a": "m3/h", "b": "kW"}},
        ),
        (
            ["time,point,reading", *long_rows],
            "\n",
            "utf-8",
            {"layout": LongLayout("time", "point", "reading")},
        ),
        (
            [head, *rows(iso, lambda at: ["-9999" if at % 7 == 0 else "Störung", two(at)[1]])],
            "\n",
            "utf-8",
            {"sentinels": (-9999.0,), "status_words": {"off": 0.0}},
        ),
        (
            ["day;clock;Kühler ein;Kühler aus", *rows("%Y-%m-%d;%H:%M:%S", two)],
            "\n",
            "utf-8",
            {"stamp_columns": ("day", "clock")},
        ),
        (
            [head, *[f"{int(START.timestamp()) + 60 * at};{at};{at}" for at in range(60)]],
            "\n",
            "utf-8",
            {"date_order": "epoch seconds"},
        ),
        ([head, *rows("%Y-10-26 0%M:%S", two)], "\n", "utf-8", {"clock": "Europe/Copenhagen"}),
        ([head, *rows(iso, two)[::-1]], "\n", "utf-8", {"when_stamps_repeat": "reject both"}),
        (
            [head, *rows(iso, lambda at: [str(1000 + 3 * at), "on" if at % 9 else "off"])],
            "\n",
            "utf-8",
            {"states": {"b": {"on": "on", "off": "off"}}},
        ),
    ]
    made = []
    for number, (lines, end, encoding, changes) in enumerate(texts):
        export, tags = make_export(columns, **changes)
        if number == len(texts) - 1:
            tags["a"] = replace(tags["a"], between="counter", si_unit="J", full_scale=5000.0, at_most=10.0)
        made.append(Seed((end.join(lines) + end).encode(encoding), export, tags))
    packed = io.BytesIO()
    with zipfile.ZipFile(packed, "w") as archive:
        archive.writestr("one.csv", made[0].content)
        archive.writestr("two.csv", made[0].content)
    return [
        *made,
        replace(made[0], content=gzip.compress(made[0].content, mtime=0), suffix=".csv.gz"),
        replace(made[0], content=packed.getvalue(), suffix=".zip"),
    ]


SPLICES = (
    *(
        b'"',
        b'""',
        b";",
        b",",
        b"\t",
        b"\r",
        b"\n",
        b"\r\n",
        b"\n\n",
        b"\0",
        b"\0" * 600,
        b"\xff\xfe",
        b"\xef\xbb\xbf",
    ),
    *(
        b"'",
        b"\\",
        b"#",
        b"\x1a",
        b"\x85",
        b"\xe2\x80\xa8",
        b"\xc2\xa0",
        b"\x0b\x0c",
        b"-",
        b"+",
        b"=1+1",
        b"1e999",
    ),
    *(
        b"NaN",
        b"inf",
        b"<0.5",
        b"24:00:00",
        b"2026-02-31 00:00:00",
        b"1970-01-01 00:00:00",
        b"9999-12-31 23:59:59",
    ),
    *(
        b"0000-00-00 00:00",
        b"2026-07-01T00:00:00+25:00",
        b"99999999999999999999",
        b"-9999",
        b"x" * 70_000,
        b"<b>&amp;",
    ),
    *("Störung".encode(), "Störung".encode("cp1252"), "Störung".encode("utf-16"), b";" * 5000, b'"' * 3001),
)


def flip_a_bit(content: bytes, at: int, to: int, chance: random.Random) -> bytes:
    """One bit the other way."""
    return content[:at] + bytes([content[at] ^ 1 << chance.randrange(8)]) + content[at + 1 :]


def change_a_byte(content: bytes, at: int, to: int, chance: random.Random) -> bytes:
    """Any byte in place of one."""
    return content[:at] + bytes([chance.randrange(256)]) + content[at + 1 :]


def cut_off(content: bytes, at: int, to: int, chance: random.Random) -> bytes:
    """The end is missing."""
    return content[:at]


def cut_out(content: bytes, at: int, to: int, chance: random.Random) -> bytes:
    """A piece is missing."""
    return content[:at] + content[to:]


def splice(content: bytes, at: int, to: int, chance: random.Random) -> bytes:
    """Something odd stands in between."""
    return content[:at] + chance.choice(SPLICES) + content[at:]


def write_twice(content: bytes, at: int, to: int, chance: random.Random) -> bytes:
    """A piece stands twice."""
    return content[:at] + content[at:to] * 2 + content[to:]


def blank_out(content: bytes, at: int, to: int, chance: random.Random) -> bytes:
    """A piece is zero bytes."""
    return content[:at] + bytes(to - at) + content[to:]


def move(content: bytes, at: int, to: int, chance: random.Random) -> bytes:
    """A piece has moved to the front."""
    return content[at:to] + content[:at] + content[to:]


def shuffle_lines(content: bytes, at: int, to: int, chance: random.Random) -> bytes:
    """Lines in any order."""
    lines = content.splitlines(keepends=True)
    chance.shuffle(lines)
    return b"".join(lines)


def repeat_a_line(content: bytes, at: int, to: int, chance: random.Random) -> bytes:
    """A line stands many times."""
    lines = content.splitlines(keepends=True)
    place = chance.randrange(len(lines))
    return b"".join([*lines[:place], lines[place] * chance.choice((2, 3, 50)), *lines[place + 1 :]])


def exchange_marks(content: bytes, at: int, to: int, chance: random.Random) -> bytes:
    """Another separator, decimal mark or line end, here and there or everywhere."""
    pairs = (b";,", b".,", b",.", b"\n\r", b"-/", b":.")
    old, new = (bytes([mark]) for mark in chance.choice(pairs))
    return content.replace(old, new, chance.choice((1, 5, -1)))


def recode(content: bytes, at: int, to: int, chance: random.Random) -> bytes:
    """Another encoding."""
    pairs = (("utf-8", "utf-16"), ("cp1252", "utf-8"), ("utf-16", "utf-8"), ("utf-8", "cp1252"))
    old, new = chance.choice(pairs)
    return content.decode(old, "replace").encode(new, "replace")


def change_a_cell(content: bytes, at: int, to: int, chance: random.Random) -> bytes:
    """Something odd in place of a cell or of a separator."""
    lines = content.splitlines(keepends=True)
    place = chance.randrange(len(lines))
    cells = re.split(rb"([;,\t])", lines[place])
    cells[chance.randrange(len(cells))] = chance.choice(SPLICES)
    return b"".join([*lines[:place], b"".join(cells), *lines[place + 1 :]])


DAMAGES = (
    *(flip_a_bit, change_a_byte, cut_off, cut_out, splice, splice, write_twice, blank_out, move),
    *(shuffle_lines, repeat_a_line, exchange_marks, recode, change_a_cell),
)


def damage(content: bytes, chance: random.Random) -> bytes:
    """Damage an export once."""
    if not content:
        return chance.choice(SPLICES)
    at, to = sorted((chance.randrange(len(content)), chance.randrange(len(content))))
    return chance.choice(DAMAGES)(content, at, to, chance)


class TooSlowError(Exception):
    """An input took longer than its limit."""


def too_slow(*_: object) -> None:
    """Answer the alarm clock."""
    raise TooSlowError


@dataclass(frozen=True)
class Got:
    """Everything that was read."""

    recognition: Recognition
    blocks: tuple[SampleBlock, ...]
    notes: tuple[ReadingNote, ...]

    def cells(self, tag: str) -> int:
        """Cells of a tag, good and bad."""
        places = [(block, block.tags.index(tag)) for block in self.blocks]
        return sum(
            int(np.isfinite(block.values[at]).sum() + block.rejected[at].sum()) for block, at in places
        )

    def samples(self, tag: str) -> list[tuple[int, float]]:
        """Every number of a tag with its stamp, in the order in which they are given."""
        found = []
        for block in self.blocks:
            values = block.values[block.tags.index(tag)]
            good = np.isfinite(values)
            found += list(zip(block.instants_us[good].tolist(), values[good].tolist(), strict=True))
        return found

    def lines(self) -> list[tuple[str, int, int, int, int]]:
        """The account of every file."""
        return [
            (note.file, note.lines, note.lines_data, note.lines_skipped, note.lines_rejected)
            for note in self.notes
        ]


def read_input(folder: Path, seed: Seed) -> Got:
    """Recognise and read a folder."""
    window_us = (PERIOD_US[0] - 10**12, PERIOD_US[1] + 10**12)
    recognition = recognise(folder, {"x": seed.export}, seed.tags)
    pieces = list(read_export(recognition, "x", window_us))
    notes = tuple(piece for piece in pieces if isinstance(piece, ReadingNote))
    return Got(recognition, tuple(piece for piece in pieces if isinstance(piece, SampleBlock)), notes)


def hold_cells(seed: Seed, got: Got) -> None:
    """Clean, and hold that every cell and every microsecond is in its ledger."""
    settings = CleaningSettings({"x": seed.export}, seed.tags, (), {}, {})
    table, _ = clean({"x": iter(got.blocks)}, settings, GRID)
    cells = {tag: got.cells(tag) for tag in seed.tags}
    told = dict(zip(table.cells.tags, table.cells.counts.sum(axis=1).tolist(), strict=True))
    assert told == cells, f"cells given {cells}, in the ledger {told}"
    assert (table.seconds.microseconds.sum(axis=1) == PERIOD_US[1] - PERIOD_US[0]).all(), "seconds"
    data = sum(note.lines_data for note in got.notes)
    whole = data + sum(note.lines_rejected for note in got.notes)
    if seed.export.layout is None:
        assert data <= max(cells.values(), default=0) <= whole or not data, "cells against lines"
    else:
        assert sum(cells.values()) <= whole, "cells against lines"


def hold_lines(folder: Path, content: bytes, got: Got) -> None:
    """Hold that every file has its note, and every line of it its place."""
    for note in got.notes:
        assert note.lines_data + note.lines_skipped + note.lines_rejected == note.lines, "lines do not add up"
        if note.file == "damaged.csv" and note.lines and "16" not in note.encoding:
            ends = len(PASSED.findall(content)) + (not content.endswith((b"\r", b"\n")))
            assert note.lines == ends, f"{note.lines} lines told, {ends} in the file ({note.encoding})"
    everything = (*got.notes, *recognition_notes(got.recognition))
    names = {note.file.partition("!")[0] for note in everything}
    assert names == {path.name for path in folder.iterdir()}, "a file without a note"


def examine(folder: Path, seed: Seed, content: bytes, chance: random.Random) -> str:
    """Read one input and hold what must hold; what became of it in a word."""
    for old in folder.iterdir():
        old.unlink()
    (folder / f"damaged{seed.suffix}").write_bytes(content)
    if chance.random() < 0.5:
        (folder / f"whole{seed.suffix}").write_bytes(seed.content)
    try:
        got = read_input(folder, seed)
    except AuditorError:
        return "refused"
    hold_lines(folder, content, got)
    hold_cells(seed, got)
    if chance.random() < 0.3:
        with patch("auditor.log_reading.chunks.CHUNK", chance.randrange(200, 4000)):
            cut = read_input(folder, seed)
        assert cut.lines() == got.lines(), "where a file is cut changes its lines"
        for tag in seed.tags:
            assert cut.samples(tag) == got.samples(tag), f"where a file is cut changes the samples of {tag}"
    is_read = any(note.file.startswith("damaged") and note.lines_data for note in got.notes)
    return "read" if is_read else "set aside"


def work(job: int, jobs: int, inputs: int, start: int, keep: Path) -> Counter[str]:
    """Examine every ``jobs``-th input."""
    warnings.simplefilter("error")
    signal.signal(signal.SIGALRM, too_slow)
    counts: Counter[str] = Counter()
    kinds = seeds()
    with tempfile.TemporaryDirectory() as name:
        for number in range(job, inputs, jobs):
            if job == 0 and number and number % (5_000 * jobs) == 0:
                print(f"about {number} of {inputs} inputs", flush=True)
            chance = random.Random(start * 1_000_003 + number)
            seed = chance.choice(kinds)
            content = seed.content
            for _ in range(chance.choice((1, 1, 1, 2, 2, 3, 6))):
                content = damage(content, chance)
            faulthandler.dump_traceback_later(6 * LIMIT_S, exit=True)
            signal.setitimer(signal.ITIMER_REAL, LIMIT_S)
            try:
                counts[examine(Path(name), seed, content, chance)] += 1
            except Exception:
                signal.setitimer(signal.ITIMER_REAL, 0)
                counts["failed"] += 1
                if counts["failed"] <= 20:
                    keep.mkdir(parents=True, exist_ok=True)
                    (keep / f"{start}_{number}{seed.suffix}").write_bytes(content)
                    print(f"input {number} of seed {start}\n{traceback.format_exc(limit=-4)}", flush=True)
            finally:
                signal.setitimer(signal.ITIMER_REAL, 0)
                faulthandler.cancel_dump_traceback_later()
    return counts


def main() -> int:
    """Share the inputs among processes and print what became of them."""
    parser = argparse.ArgumentParser(description=__doc__.partition("\n")[0])
    parser.add_argument("--inputs", type=int, default=2000)
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--jobs", type=int, default=1)
    parser.add_argument("--keep", type=Path, default=Path(tempfile.gettempdir()) / "fuzz_reading")
    chosen = parser.parse_args()
    began = time.perf_counter()
    counts: Counter[str] = Counter()
    with ProcessPoolExecutor(chosen.jobs, multiprocessing.get_context("spawn")) as pool:
        shares = [
            pool.submit(work, job, chosen.jobs, chosen.inputs, chosen.seed, chosen.keep)
            for job in range(chosen.jobs)
        ]
        for share in shares:
            counts += share.result()
    told = ", ".join(f"{count} {word}" for word, count in sorted(counts.items()))
    print(f"{counts.total()} inputs in {time.perf_counter() - began:.0f} s: {told}")
    return 1 if counts["failed"] or counts.total() != chosen.inputs else 0


if __name__ == "__main__":
    raise SystemExit(main())
