"""One month, written in every layout that loggers use: the energies are the same."""

from __future__ import annotations

import gzip
import io
import zipfile
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import pytest
from site_factory import (
    GAS_ENGINE,
    PLAIN,
    Layout,
    audited,
    changed,
    export,
    figures,
    instants,
)

SECONDS = instants("2025-05-31T23:45", "2025-07-01T00:16", 900)
MONTHLY = changed(
    GAS_ENGINE.replace('between = "step", hold = "1 min"', 'between = "line", hold = "15 min"'),
    ('tick = "1 min"', 'tick = "15 min"'),
    ('interval = "15 min"', 'interval = "1 h"'),
)
"""The gas engine, logged every quarter of an hour."""


def columns() -> dict[str, np.ndarray]:
    """A month that moves: slow swings of load, noise of a fixed seed."""
    draw = np.random.default_rng(5).standard_normal((5, SECONDS.size))
    load = 0.85 + 0.1 * np.sin(SECONDS / 70_000.0)
    return {
        "G": 250.0 * load * (1.0 + 0.003 * draw[0]),
        "P": 1000.0 * load * (1.0 + 0.003 * draw[1]),
        "F": 16.25 * load * (1.0 + 0.005 * draw[2]),
        "S": 90.0 + 0.2 * draw[3],
        "R": 70.0 + 0.2 * draw[4],
    }


@dataclass(frozen=True)
class Written:
    """A way of writing the month: the layout, edits of the plant file, and how text becomes files."""

    layout: Layout = PLAIN
    edits: tuple[tuple[str, str], ...] = ()
    files: Callable[[bytes], Mapping[str, bytes]] = lambda content: {"plant/a.csv": content}


def packed(content: bytes) -> dict[str, bytes]:
    """The file in an archive."""
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w", zipfile.ZIP_DEFLATED) as archive:
        archive.writestr("june/a.csv", content)
    return {"plant/a.zip": buffer.getvalue()}


def halves(content: bytes) -> dict[str, bytes]:
    """The file cut in two, the first half named last, both with the heading."""
    head, *lines = content.splitlines(keepends=True)
    cut = len(lines) // 3
    return {
        "plant/2.csv": head + b"".join(lines[:cut]),
        "plant/1.csv": head + b"".join(lines[cut:]),
    }


def in_epoch_seconds(content: bytes) -> dict[str, bytes]:
    """The file with seconds after 1970 in place of its stamps."""
    head, *lines = content.splitlines(keepends=True)
    cells = [line.partition(b",")[2] for line in lines]
    stamped = [b"%d," % second + rest for second, rest in zip(SECONDS.tolist(), cells, strict=True)]
    return {"plant/a.csv": head + b"".join(stamped)}


def newest_first(content: bytes) -> dict[str, bytes]:
    """The file turned round."""
    head, *lines = content.splitlines(keepends=True)
    return {"plant/a.csv": head + b"".join(lines[::-1])}


COMMA = ('decimal = "."', 'decimal = ","')
DAY_FIRST = ('date_order = "year first"', 'date_order = "day first"')
LONG = ('decimal = "."', 'decimal = "."\nlayout = { stamp = "time", tag = "point", value = "reading" }')
LONG_COMMA = (LONG[0], LONG[1].replace('"."', '","'))
WRITTEN = {
    "semicolon and decimal comma": Written(Layout(delimiter=";", decimal=","), (COMMA,)),
    "tab, decimal comma, Windows-1252, unit row": Written(
        Layout(
            delimiter="\t",
            decimal=",",
            encoding="cp1252",
            units=("m³/h", "kW", "kg/s", "°C", "°C"),
            preamble=("Gerät 7", ""),
        ),
        (COMMA,),
    ),
    "UTF-16 and tab": Written(Layout(delimiter="\t", encoding="utf-16")),
    "byte order mark and Windows line ends": Written(Layout(encoding="utf-8-sig", line_end="\r\n")),
    "day first": Written(Layout(stamp="%d.%m.%Y %H:%M", delimiter=";"), (DAY_FIRST,)),
    "epoch seconds": Written(
        edits=(('date_order = "year first"', 'date_order = "epoch seconds"'),), files=in_epoch_seconds
    ),
    "winter time all year": Written(
        Layout(clock="Etc/GMT-1"), (('clock = "UTC"', 'clock = "+01:00"'),)
    ),
    "long": Written(Layout(long=True), (LONG,)),
    "long, semicolon, decimal comma": Written(
        Layout(long=True, delimiter=";", decimal=","), (LONG_COMMA,)
    ),
    "gzip": Written(files=lambda content: {"plant/a.csv.gz": gzip.compress(content)},
                    edits=(('"plant/*.csv"', '"plant/*.csv.gz"'),)),
    "zip": Written(files=packed, edits=(('"plant/*.csv"', '"plant/*.zip"'),)),
    "two files": Written(files=halves),
    "newest first": Written(files=newest_first),
}  # fmt: skip


def written_energies(folder: Path, way: Written) -> dict[str, float]:
    """Energies of the month, kWh."""
    content = export(SECONDS, columns(), way.layout)
    out = audited(folder, changed(MONTHLY, *way.edits), way.files(content), "--month", "2025-06")
    return {
        key: figure["value"]
        for key, figure in figures(out).items()
        if figure["unit"] == "kWh" and figure["value"] is not None
    }


@pytest.fixture(scope="module")
def plain(tmp_path_factory: pytest.TempPathFactory) -> dict[str, float]:
    """Energies of the month written plainly: comma, decimal point, UTF-8, one column per tag."""
    return written_energies(tmp_path_factory.mktemp("plain"), Written())


@pytest.mark.parametrize("name", WRITTEN)
def test_a_month_has_the_same_energies_in_every_layout(
    tmp_path: Path, plain: dict[str, float], name: str
) -> None:
    """Every energy of June equal to 1e-9, however the export is written."""
    energies = written_energies(tmp_path, WRITTEN[name])
    assert energies.keys() == plain.keys() and len(plain) >= 6
    for key, energy in plain.items():
        assert energies[key] == pytest.approx(energy, rel=1e-9), key


def test_the_month_is_that_of_its_columns(plain: dict[str, float]) -> None:
    """By hand: straight lines between quarter-hours, the trapezoid rule from 1 June to 1 July."""
    power = columns()["P"][1:-1]
    energy_kWh = 0.25 * (power[:-1] + power[1:]).sum() / 2.0
    assert plain["work_gross_kWh"] == pytest.approx(energy_kWh, rel=1e-9)
