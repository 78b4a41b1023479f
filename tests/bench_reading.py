"""Times reading, cleaning and averaging to ticks against the bare parse of the same bytes. Run by hand.

``python tests/bench_reading.py --days 7 --rounds 5 [--folder DIR]`` makes its own seeded exports (one sample
a second of 40 tags: wide, wide with decimal comma, and long), times whole processes in turn, and prints
medians of one run. Only ratios within one run mean anything; other load on the machine is shown beside them.
"""

from __future__ import annotations

import argparse
import json
import os
import re
import resource
import statistics
import subprocess
import sys
import tempfile
import time
from collections.abc import Sequence
from datetime import UTC, date, datetime, timedelta
from pathlib import Path

import numpy as np

SEED = 7
FIRST = date(2026, 3, 2)
DAY_S = 86_400
TAGS = tuple(f"signal_{number:02d}" for number in range(40))
WORDS = ("Störung", "no answer", "----", "")
WORDY = 0.005
"""Share of cells that hold a word or nothing, in runs of some length."""
LONG_DAYS = 0.5
"""The long export repeats stamp and name beside every number, and is this much shorter."""
SHAPES = ("wide", "comma", "long")
WORKS = ("parse 1", "parse 2", "audit 1", "audit 2")


def day_of_values(day: int) -> tuple[np.ndarray, np.ndarray]:
    """Numbers of one day, shape (tags, seconds), and the word of each cell (-1: none)."""
    rng = np.random.default_rng([SEED, day])
    second = np.arange(DAY_S)
    load = np.sin(2 * np.pi * second / DAY_S) + 0.3 * np.sin(2 * np.pi * second / 5_000)
    shape = (len(TAGS), DAY_S)
    scale = 10.0 ** rng.integers(0, 5, (len(TAGS), 1))
    values = scale * (2.0 + 0.5 * load + 0.01 * rng.standard_normal(shape))
    words = np.full(shape, -1, np.int8)
    lengths = rng.integers(1, 12, round(WORDY / 6 * words.size))
    starts = rng.integers(0, words.size - 12, lengths.size)
    at = (
        np.repeat(starts, lengths)
        + np.arange(lengths.sum())
        - np.repeat(np.cumsum(lengths) - lengths, lengths)
    )
    words.ravel()[at] = np.repeat(rng.choice(len(WORDS), lengths.size, p=(0.5, 0.2, 0.1, 0.2)), lengths)
    return values.round(3), words


def write_export(path: Path, shape: str, days: float) -> None:
    """Write one export of so many days."""
    import pyarrow as pa
    import pyarrow.compute as pc
    import pyarrow.csv as pacsv

    delimiter = ";" if shape == "comma" else ","
    options = pacsv.WriteOptions(include_header=False, quoting_style="none", delimiter=delimiter)
    names = ["stamp", "tag", "value"] if shape == "long" else ["stamp", *TAGS]
    with path.open("wb") as file:
        file.write(delimiter.join(names).encode() + b"\n")
        for day in range(int(np.ceil(days))):
            rows = round(min(1.0, days - day) * DAY_S)
            values, words = (part[:, :rows] for part in day_of_values(day))
            start = int(datetime(FIRST.year, FIRST.month, FIRST.day, tzinfo=UTC).timestamp()) + day * DAY_S
            form = "%d.%m.%Y %H:%M:%S" if shape == "comma" else "%Y-%m-%d %H:%M:%S"
            stamps = pc.strftime(pa.array((start + np.arange(rows)).astype("datetime64[s]")), form)
            columns = []
            for row, word in zip(values, words, strict=True):
                texts = pc.cast(pa.array(row), pa.string())
                texts = pc.replace_substring(texts, ".", ",") if shape == "comma" else texts
                said = pa.array(WORDS).take(pa.array(np.maximum(word, 0)))
                columns.append(pc.if_else(pa.array(word >= 0), said, texts))
            if shape == "long":
                place = pa.array(np.arange(rows * len(TAGS)).reshape(-1, rows).T.ravel())
                name = pa.array(TAGS).take(pa.array(np.tile(np.arange(len(TAGS)), rows)))
                stamp = stamps.take(pa.array(np.repeat(np.arange(rows), len(TAGS))))
                columns, stamps = [name, pa.concat_arrays(columns).take(place)], stamp
            pacsv.write_csv(pa.table([stamps, *columns], names=names), file, options)


def parse(path: Path, shape: str, cores: int) -> int:
    """Parse an export with nothing but the parser, every number as float64."""
    import pyarrow as pa
    import pyarrow.csv as pacsv

    pa.set_cpu_count(cores)
    pa.set_io_thread_count(cores)
    types = dict.fromkeys(TAGS, pa.float64())
    if shape == "long":
        types = {"tag": pa.dictionary(pa.int32(), pa.string()), "value": pa.float64()}
    types["stamp"] = pa.string() if shape == "comma" else pa.timestamp("s")
    table = pacsv.read_csv(
        path,
        pacsv.ReadOptions(use_threads=cores > 1),
        pacsv.ParseOptions(delimiter=";" if shape == "comma" else ","),
        pacsv.ConvertOptions(
            column_types=types, null_values=WORDS, decimal_point="," if shape == "comma" else "."
        ),
    )
    return int(table.num_rows)


def audit(path: Path, shape: str, cores: int, days: int) -> int:
    """Read, clean and average to ticks, all tags bound."""
    from auditor.cleaning import CleaningSettings, between_dates, clean, make_grid
    from auditor.log_reading import read_export, recognise
    from auditor.records.plant import Export, LongLayout, Tag
    from auditor.records.samples import ReadingNote
    from auditor.records.uncertain import Uncertainty

    export = Export(
        name="plant",
        files=(path.name,),
        clock="UTC",
        repeated_hour="by order",
        date_order="day first" if shape == "comma" else "year first",
        decimal="," if shape == "comma" else ".",
        delimiter=None,
        encoding=None,
        layout=LongLayout("stamp", "tag", "value") if shape == "long" else None,
        stamp_columns=(),
        sentinels=(),
        status_words={},
        when_stamps_repeat="keep first",
        tags=TAGS,
    )
    tags = {
        name: Tag(
            name=name,
            export="plant",
            column=name,
            unit="kW",
            quantity="power",
            scale=1000.0,
            offset=0.0,
            si_unit="W",
            between="step",
            stamp_marks=None,
            hold_s=60.0,
            calibration=Uncertainty(0.01, 0.0, "declared"),
            believable=(-1e9, 1e9),
            frozen_after_s=3600.0,
        )
        for name in TAGS
    }
    grid = make_grid(between_dates(FIRST, FIRST + timedelta(days=days - 1), "UTC"), 60, 900)
    recognition = recognise(path.parent, {"plant": export}, tags)
    ever = (-(2**62), 2**62)
    pieces = read_export(recognition, "plant", ever, threads=cores)
    blocks = (piece for piece in pieces if not isinstance(piece, ReadingNote))
    table, _ = clean({"plant": blocks}, CleaningSettings({"plant": export}, tags, (), {}, {}), grid)
    return int(table.cells.raw_cells.sum())


def child(work: str, shape: str, path: Path, days: int) -> None:
    """Do one piece of work in this process, and print what it took."""
    kind, cores = work.split()
    amount = parse(path, shape, int(cores)) if kind == "parse" else audit(path, shape, int(cores), days)
    used = resource.getrusage(resource.RUSAGE_SELF)
    print(json.dumps({"cpu": used.ru_utime + used.ru_stime, "rss": peak_MB(), "amount": amount}))


def peak_MB() -> float:
    """Peak memory of this process; its getrusage would include what its parent held when it forked."""
    status = Path("/proc/self/status")
    if not status.exists():
        return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
    return int(re.search(r"VmHWM:\s*(\d+)", status.read_text())[1]) / 1024


def busy_s() -> float:
    """Processor time of the whole machine so far; zero where the system does not tell."""
    stat = Path("/proc/stat")
    if not stat.exists():
        return 0.0
    fields = [int(field) for field in stat.read_text().split("\n", 1)[0].split()[1:8]]
    return (sum(fields) - fields[3] - fields[4]) / os.sysconf("SC_CLK_TCK")


def timed(work: str, shape: str, path: Path, days: int) -> dict[str, float]:
    """Run one piece of work as a process of its own."""
    command = [sys.executable, __file__, "--child", work, "--shape", shape, "--folder", str(path)]
    busy, start = busy_s(), time.perf_counter()
    done = subprocess.run([*command, "--days", str(days)], check=True, capture_output=True, text=True)
    wall = time.perf_counter() - start
    told = json.loads(done.stdout)
    return {"wall": wall, "other": max(0.0, busy_s() - busy - told["cpu"]) / wall} | told


def compare(shape: str, path: Path, days: int, rounds: int) -> None:
    """Time the four works in turn, and print a table of medians."""
    runs: dict[str, list[dict[str, float]]] = {work: [] for work in WORKS}
    for _ in range(rounds):
        for work in WORKS:
            runs[work].append(timed(work, shape, path, days))
    size = path.stat().st_size / 1e6
    print(f"\n{shape}: {size:.0f} MB, {days} days, {rounds} rounds")
    print("work      wall s   min s   cpu s  MB/s   RSS MB  other  x parse 1  x parse 2")
    middle = {
        work: {key: statistics.median(run[key] for run in runs[work]) for key in runs[work][0]}
        for work in WORKS
    }
    for work, row in middle.items():
        ratios = [row["wall"] / middle[bare]["wall"] for bare in WORKS[:2]]
        print(
            f"{work:8} {row['wall']:7.2f} {min(run['wall'] for run in runs[work]):7.2f} {row['cpu']:7.2f}"
            f" {size / row['wall']:5.0f} {row['rss']:8.0f} {row['other']:6.2f}"
            f" {ratios[0]:10.2f} {ratios[1]:10.2f}"
        )
    print(f"two cores over one: {middle['audit 1']['wall'] / middle['audit 2']['wall']:.2f} x", flush=True)


def main(arguments: Sequence[str] | None = None) -> None:
    """Make the exports that are missing, and time what is asked for."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--days", type=int, default=7)
    parser.add_argument("--rounds", type=int, default=5)
    parser.add_argument("--shape", choices=SHAPES, action="append")
    parser.add_argument("--folder", type=Path, help="where the exports are kept for the next run")
    parser.add_argument("--child", choices=WORKS, help=argparse.SUPPRESS)
    options = parser.parse_args(arguments)
    if options.child:
        child(options.child, options.shape[0], options.folder, options.days)
        return
    with tempfile.TemporaryDirectory() as scratch:
        for shape in options.shape or SHAPES:
            folder = (options.folder or Path(scratch)) / f"{shape}_{options.days}"
            folder.mkdir(parents=True, exist_ok=True)
            path = folder / "export.csv"
            if not path.exists():
                write_export(path, shape, options.days * (LONG_DAYS if shape == "long" else 1))
            compare(shape, path, options.days, options.rounds)


if __name__ == "__main__":
    main()
