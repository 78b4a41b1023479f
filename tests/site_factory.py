"""Small sites on disk for tests of the whole program: plant files, exports in any layout, and a way to run.

A plant file is a plain text below with explicit edits (:func:`changed`); exports are written from arrays
of UTC instants and numbers by :func:`export`, in the layout and on the clock that a test asks for.
"""

from __future__ import annotations

import contextlib
import csv
import hashlib
import io
import json
import os
import subprocess
import sys
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from datetime import UTC, datetime, timedelta
from html.parser import HTMLParser
from pathlib import Path
from typing import Any
from zoneinfo import ZoneInfo

import numpy as np

from auditor.command_line import main

ROOT = Path(__file__).resolve().parents[1]
MINUTE = 60
DAY = 86_400
EPOCH = datetime(1970, 1, 1, tzinfo=UTC)

GAS_ENGINE = """\
schema = 1

[site]
name = "Small Works"
zone = "UTC"
tick = "1 min"
interval = "15 min"

[exports.plant]
files = ["plant/*.csv"]
clock = "UTC"
date_order = "year first"
decimal = "."
tags.gas    = { column = "G", unit = "m3/h", between = "step", hold = "1 min", standard = "1 %" }
tags.power  = { column = "P", unit = "kW", between = "step", hold = "1 min", standard = "0.5 %" }
tags.flow   = { column = "F", unit = "kg/s", between = "step", hold = "1 min", standard = "1 %" }
tags.supply = { column = "S", unit = "degC", between = "step", hold = "1 min", range = [0, 130], standard = "0.1 K" }
tags.back   = { column = "R", unit = "degC", between = "step", hold = "1 min", range = [0, 130], standard = "0.1 K" }

[fluids.brine]
heat_capacity = { constant = "4 kJ/(kg K)", standard = "0.1 %" }

[fuels.natural_gas]
volume_state = "0 degC, 101.325 kPa, dry"
unit = "kWh/m3"
standard = "0.4 %"
values = [
  { from = 2025-01-01, lower = 10.0, higher = 11.06, source = "sheet" },
]
exergy = { value = 1.04, of = "lower", standard = 0.01 }

[gas_meters.meter]
reads = "already at the fuel's state"

[machines.engine]
title = "Gas engine"
kind = "gas engine"
heating_value = "lower"
headline = "gross"
rated_power = "1000 kW"
minimum_load = "30 %"
running = { tag = "gas", above = "5 m3/h" }
ceiling = { kind = "fuel exergy" }
streams.fuel  = { role = "fuel in", by = "gas volume", fuel = "natural_gas", volume = "gas", meter = "meter" }
streams.power = { role = "work out", by = "power", tag = "power", measured_at = "generator terminals" }
streams.heat  = { role = "useful heat", by = "flow and temperatures", flow = "flow", inlet = "back", outlet = "supply", fluid = "brine" }
"""  # noqa: E501 - a plant file has one tag or stream on a line
"""A gas engine with heat recovery; every value holds for exactly one minute after its stamp."""

HEAT_ENGINE = """\
schema = 1

[site]
name = "Small Works"
zone = "UTC"

[exports.plant]
files = ["plant/*.csv"]
clock = "UTC"
date_order = "year first"
decimal = "."
tags.flow  = { column = "M", unit = "kg/s", between = "step", hold = "1 min", standard = "1 %" }
tags.hot   = { column = "T1", unit = "degC", between = "step", hold = "1 min", range = [-50, 700], standard = "0.000001 K" }
tags.cold  = { column = "T2", unit = "degC", between = "step", hold = "1 min", range = [-50, 700], standard = "0.000001 K" }
tags.power = { column = "P", unit = "kW", between = "step", hold = "1 min", standard = "0.5 %" }
tags.sink  = { column = "A", unit = "kg/s", between = "step", hold = "1 min", standard = "25 %" }
tags.into  = { column = "A1", unit = "degC", between = "step", hold = "1 min", range = [-50, 90], standard = "0.000001 K" }
tags.out   = { column = "A2", unit = "degC", between = "step", hold = "1 min", range = [-50, 90], standard = "0.000001 K" }

[fluids.carrier]
heat_capacity = { constant = "1 kJ/(kg K)", standard = "0.0001 %" }

[machines.engine]
title = "Heat engine"
kind = "generic heat engine"
headline = "gross"
running = { tag = "power", above = "1 kW" }
ceiling = { kind = "finite source and sink", source = "heat", sink = "air" }
streams.heat  = { role = "heat in", by = "flow and temperatures", flow = "flow", inlet = "hot", outlet = "cold", fluid = "carrier" }
streams.power = { role = "work out", by = "power", tag = "power", measured_at = "shaft" }
streams.air   = { role = "rejected heat", by = "flow and temperatures", flow = "sink", inlet = "into", outlet = "out", fluid = "carrier" }
"""  # noqa: E501
"""A heat engine between two streams of 1 kJ/(kg K): kilograms per second times kelvin are kilowatts."""


def changed(text: str, *edits: tuple[str, str]) -> str:
    """Return a text with edits, each of a piece that stands in it exactly once."""
    for old, new in edits:
        if text.count(old) != 1:
            raise ValueError(f"{old!r} stands {text.count(old)} times in the text")
        text = text.replace(old, new)
    return text


POWER_TAG = (
    'tags.power  = { column = "P", unit = "kW", between = "step", hold = "1 min", standard = "0.5 %" }\n'
)
TWO_EXPORTS = changed(
    GAS_ENGINE,
    (POWER_TAG, ""),
    (
        "[fluids.brine]",
        '[exports.power]\nfiles = ["power/*.csv"]\nclock = "UTC"\ndate_order = "year first"\n'
        f'decimal = "."\n{POWER_TAG}\n[fluids.brine]',
    ),
)
"""The gas engine with its power in an export of its own."""


def instants(start: str, end: str, step_s: int = MINUTE, clock: str = "UTC") -> np.ndarray:
    """UTC seconds from one wall-clock moment to another (left out), evenly spaced."""
    first, last = (
        (datetime.fromisoformat(text).replace(tzinfo=ZoneInfo(clock)) - EPOCH) // timedelta(seconds=1)
        for text in (start, end)
    )
    return np.arange(first, last, step_s, dtype=np.int64)


Column = Sequence[str] | np.ndarray | float


@dataclass(frozen=True)
class Layout:
    """How an export is written."""

    clock: str = "UTC"
    stamp: str = "%Y-%m-%d %H:%M:%S"
    delimiter: str = ","
    decimal: str = "."
    encoding: str = "utf-8"
    units: tuple[str, ...] = ()
    """A row of units below the heading."""
    preamble: tuple[str, ...] = ()
    long: bool = False
    line_end: str = "\n"


PLAIN = Layout()


def export(seconds: np.ndarray, columns: Mapping[str, Column], layout: Layout = PLAIN) -> bytes:
    """Write an export: numbers with all their digits, texts as they are, NaN as an empty cell."""
    zone = ZoneInfo(layout.clock)
    moments = [(EPOCH + timedelta(seconds=int(second))).astimezone(zone) for second in seconds]
    stamps = [moment.strftime(layout.stamp) for moment in moments]
    cells = {name: _cells(column, len(stamps), layout.decimal) for name, column in columns.items()}
    buffer = io.StringIO()
    for line in layout.preamble:
        buffer.write(line + layout.line_end)
    writer = csv.writer(buffer, delimiter=layout.delimiter, lineterminator=layout.line_end)
    if layout.long:
        writer.writerow(("time", "point", "reading"))
        for place, stamp in enumerate(stamps):
            writer.writerows((stamp, name, column[place]) for name, column in cells.items() if column[place])
    else:
        writer.writerow(("time", *cells))
        if layout.units:
            writer.writerow(("", *layout.units))
        writer.writerows(zip(stamps, *cells.values(), strict=True))
    return buffer.getvalue().encode(layout.encoding)


def _cells(column: Column, count: int, decimal: str) -> list[str]:
    if isinstance(column, float | int):
        column = np.full(count, float(column))
    if not isinstance(column, np.ndarray):
        return list(column)
    texts = [repr(value) if value == value else "" for value in column.tolist()]
    return texts if decimal == "." else [text.replace(".", decimal) for text in texts]


def site(folder: Path, plant: str, files: Mapping[str, bytes]) -> Path:
    """Lay out a site: plant.toml, and files by their path below ``logs/``."""
    (folder / "logs").mkdir(parents=True)
    (folder / "plant.toml").write_text(plant, encoding="utf-8")
    for name, content in files.items():
        path = folder / "logs" / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_bytes(content)
    return folder


@dataclass(frozen=True)
class Run:
    """What a run of the program gave."""

    code: int
    out: str
    err: str


def run(*arguments: object) -> Run:
    """Run the program in this process."""
    out, err = io.StringIO(), io.StringIO()
    with contextlib.redirect_stdout(out), contextlib.redirect_stderr(err):
        try:
            code = main([str(argument) for argument in arguments])
        except SystemExit as leaving:
            code = int(leaving.code or 0)
    return Run(code, out.getvalue(), err.getvalue())


def command(*arguments: object, prefix: Sequence[str] = ()) -> list[str]:
    """Command line of the program in a process of its own."""
    return [*prefix, sys.executable, "-W", "error", "-m", "auditor", *map(str, arguments)]


def surroundings(**variables: str) -> dict[str, str]:
    """Environment in which the program of this checkout is found."""
    return {**os.environ, "PYTHONPATH": str(ROOT), "PYTHONDONTWRITEBYTECODE": "1", **variables}


def run_apart(
    *arguments: object, cwd: Path | None = None, prefix: Sequence[str] = (), **variables: str
) -> Run:
    """Run the program in a process of its own."""
    done = subprocess.run(
        command(*arguments, prefix=prefix),
        cwd=cwd,
        env=surroundings(**variables),
        capture_output=True,
        check=False,
        timeout=120,
    )
    return Run(done.returncode, done.stdout.decode(), done.stderr.decode())


def statement(folder: Path) -> dict[str, Any]:
    """Read statement.json of an output folder."""
    read: dict[str, Any] = json.loads((folder / "statement.json").read_text(encoding="utf-8"))
    return read


def figures(folder: Path, machine: str = "engine") -> dict[str, dict[str, Any]]:
    """Period figures of one machine."""
    found: dict[str, dict[str, Any]] = statement(folder)["machines"][machine]["figures"]
    return found


def intervals(folder: Path, machine: str = "engine") -> dict[str, np.ndarray]:
    """Read intervals.csv of one machine, column by column; numbers as floats, NaN where empty."""
    with (folder / "intervals.csv").open(encoding="utf-8", newline="") as file:
        rows = [row for row in csv.DictReader(file) if row["machine"] == machine]
    texts = {"machine", "start", "end", "ceiling_kind", "verdict", "reasons"}
    return {
        name: np.array([row[name] if name in texts else float(row[name] or "nan") for row in rows])
        for name in rows[0]
    }


def findings(folder: Path) -> list[dict[str, Any]]:
    """Read findings.json of an output folder."""
    read: list[dict[str, Any]] = json.loads((folder / "findings.json").read_text(encoding="utf-8"))
    return read


def digests(folder: Path) -> dict[str, str]:
    """SHA-256 of every file below a folder."""
    return {
        path.relative_to(folder).as_posix(): hashlib.sha256(path.read_bytes()).hexdigest()
        for path in sorted(folder.rglob("*"))
        if path.is_file()
    }


def audited(tmp_path: Path, plant: str, files: Mapping[str, bytes], *period: str, expect: int = 0) -> Path:
    """Lay out a site below ``tmp_path``, audit it, check the exit code, and return the output folder."""
    place = site(tmp_path / "site", plant, files)
    done = run("audit", place, "--out", tmp_path / "out", "--quiet", *period)
    assert done.code == expect, f"exit {done.code}, not {expect}\n{done.out}\n{done.err}"
    return tmp_path / "out"


def one_day(day: str) -> tuple[str, ...]:
    """Options for a period of one local day."""
    return "--from", day, "--to", day


class _Headlines(HTMLParser):
    """Rows of the tables inside elements of class ``headline``: figure, value, standing."""

    def __init__(self) -> None:
        super().__init__()
        self.captions: list[str] = []
        self.rows: dict[str, list[list[str]]] = {}
        self._in: list[str] = []
        self._depth = 0

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        if tag == "div":
            starts = dict(attrs).get("class") == "headline"
            self._depth = 1 if starts else self._depth + 1 if self._depth else 0
        elif self._depth and tag == "tr":
            self.rows[self.captions[-1]].append([])
        elif self._depth and tag in ("caption", "td", "th"):
            self._in.append("")

    def handle_endtag(self, tag: str) -> None:
        if tag == "div":
            self._depth = max(0, self._depth - 1)
        elif self._depth and tag == "caption":
            self.captions.append(self._in.pop())
            self.rows[self.captions[-1]] = []
        elif self._depth and tag in ("td", "th"):
            self.rows[self.captions[-1]][-1].append(self._in.pop().strip())

    def handle_data(self, data: str) -> None:
        if self._in:
            self._in[-1] += data


@dataclass(frozen=True)
class Printed:
    """A figure as it stands on paper."""

    value: float
    U: float
    unit: str
    rounding: float
    """Half of the last place of the value."""

    def agrees(self, value: float, U: float) -> bool:
        """Whether the printed figure is these numbers, rounded."""
        return abs(self.value - value) <= self.rounding and abs(self.U - U) <= self.rounding


def printed(text: str) -> Printed:
    """Read ``40.6 ± 1.0 %, of ...``: thousands apart by a space, a true minus sign."""
    numbers, _, rest = text.partition(" ± ".replace(" ", "\u00a0"))
    U, _, unit = rest.partition("\u00a0")
    value, U = (part.replace("\u202f", "").replace("\u2212", "-") for part in (numbers, U))
    places = len(value.partition(".")[2])
    zeros = len(U) - len(U.rstrip("0")) if "." not in U else 0
    return Printed(float(value), float(U), unit.partition(",")[0], 0.5 * 10.0 ** (zeros - places) + 1e-9)


def headlines(folder: Path) -> list[dict[str, str]]:
    """Figures of the first page of report.html, one table per machine: name to text."""
    parser = _Headlines()
    parser.feed((folder / "report.html").read_text(encoding="utf-8"))
    return [{row[0]: row[1] for row in rows[1:]} for rows in parser.rows.values()]
