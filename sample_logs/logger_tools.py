"""Tools of both demo generators: seeded noise, clocks, number formats, file writers, sums of energy."""

from __future__ import annotations

import gzip
import io
import json
import zipfile
import zlib
from collections.abc import Mapping, Sequence
from datetime import UTC, datetime, timedelta, timezone
from pathlib import Path
from typing import Any
from zoneinfo import ZoneInfo

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]
Mask = npt.NDArray[np.bool_]
Minutes = npt.NDArray[np.int64]

MINUTE = timedelta(minutes=1)
EPOCH = datetime(1970, 1, 1, tzinfo=UTC)
BIAS_SHARE_OF_STANDARD = (
    0.6  # calibration errors are drawn within +/- 0.6 of one declared standard uncertainty
)


# --- seeded randomness: RandomState, because numpy promises never to change its streams -----------


def stream(seed: int, name: str) -> np.random.RandomState:
    """Give each named quantity a random stream of its own: a new instrument leaves the others as they are."""
    return np.random.RandomState((seed * 2_654_435_761 + zlib.crc32(name.encode())) % 2**32)


def white_noise(seed: int, name: str, count: int, standard: float) -> Array:
    """Give sample noise: independent normal values."""
    return standard * stream(seed, f"noise {name}").standard_normal(count)


def calibration_bias(seed: int, name: str, standard: float) -> float:
    """Draw the constant error of one instrument, rounded so that truth.json states it exactly."""
    drawn = stream(seed, f"bias {name}").uniform(-BIAS_SHARE_OF_STANDARD, BIAS_SHARE_OF_STANDARD)
    return round(float(drawn * standard), 6)


def slow_wander(seed: int, name: str, minutes: Minutes, knot_minutes: int) -> Array:
    """Give a smooth random course of unit size: normal values at knots, joined by cosine pieces."""
    knots = stream(seed, f"wander {name}").standard_normal(int(len(minutes) // knot_minutes) + 3)
    place = (minutes - minutes[0]) / knot_minutes
    left = place.astype(np.int64)
    blend = 0.5 - 0.5 * np.cos(np.pi * (place - left))
    course: Array = knots[left] * (1.0 - blend) + knots[left + 1] * blend
    return course


# --- clocks ---------------------------------------------------------------------------------------


def minute_of(moment: datetime) -> int:
    """Count whole minutes since 1970 UTC of an aware moment."""
    return round((moment - EPOCH) / MINUTE)


def clock_minutes(minutes: Minutes, zone: ZoneInfo | timezone) -> Minutes:
    """Give what a clock in `zone` shows, in minutes since its 1970.

    The hour that an autumn clock change repeats stays repeated.
    """
    hours, place = np.unique(minutes // 60, return_inverse=True)
    moments = [(EPOCH + timedelta(hours=int(hour))).astimezone(zone) for hour in hours]
    offsets = [(moment.utcoffset() or timedelta(0)) // MINUTE for moment in moments]
    return minutes + np.array(offsets, dtype=np.int64)[place]


def iso_text(shown: Minutes) -> list[str]:
    """Write '2026-07-01T00:00' for each minute that a clock shows."""
    texts: list[str] = np.datetime_as_string(shown.astype("datetime64[m]")).tolist()
    return texts


def moment_text(minute: int, zone: ZoneInfo) -> str:
    """Write an ISO moment with offset, for truth.json."""
    return (EPOCH + int(minute) * MINUTE).astimezone(zone).isoformat()


def ramp(minutes: Minutes, start: int, length: int) -> Array:
    """Rise from 0 at `start` to 1 at `start + length`, linearly."""
    return np.clip((minutes - start) / length, 0.0, 1.0)


def within(minutes: Minutes, start: int, end: int) -> Mask:
    """Tell which minutes lie in the half-open span [start, end)."""
    return (minutes >= start) & (minutes < end)


# --- files ----------------------------------------------------------------------------------------


def decimals(values: Array, places: int, mark: str = ".") -> list[str]:
    """Write numbers as a logger prints them; NaN is an empty cell, a rounded -0.0 loses its sign."""
    form = f"%.{places}f"
    rounded = np.round(values, places) + 0.0
    texts = ["" if text == "nan" else text for text in (form % value for value in rounded.tolist())]
    return [text.replace(".", mark) for text in texts] if mark != "." else texts


def write_text(path: Path, lines: Sequence[str], encoding: str = "utf-8", line_end: str = "\n") -> None:
    """Write lines with the logger's own encoding and line end."""
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_bytes((line_end.join(lines) + line_end).encode(encoding))


def write_gzip(path: Path, lines: Sequence[str]) -> None:
    """Write a gzip file whose header holds neither a time nor a name, so that its bytes are repeatable."""
    path.parent.mkdir(parents=True, exist_ok=True)
    buffer = io.BytesIO()
    with gzip.GzipFile(filename="", mode="wb", compresslevel=9, fileobj=buffer, mtime=0) as archive:
        archive.write(("\n".join(lines) + "\n").encode())
    path.write_bytes(buffer.getvalue())


def write_zip(path: Path, name: str, lines: Sequence[str], date: tuple[int, int, int]) -> None:
    """Write one file into a zip with a fixed date."""
    path.parent.mkdir(parents=True, exist_ok=True)
    entry = zipfile.ZipInfo(name, date_time=(*date, 0, 0, 0))
    entry.compress_type = zipfile.ZIP_DEFLATED
    entry.create_system = 3
    entry.external_attr = 0o644 << 16
    with zipfile.ZipFile(path, "w") as archive:
        archive.writestr(entry, ("\r\n".join(lines) + "\r\n").encode(), compresslevel=9)


def write_truth(path: Path, truth: Mapping[str, Any]) -> None:
    """Write truth.json in the order in which it was built."""
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_bytes((json.dumps(truth, indent=1, ensure_ascii=False, allow_nan=False) + "\n").encode())
