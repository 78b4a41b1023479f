"""The nightly job of one or many sites: audit every month whose content changed, and only those."""

from __future__ import annotations

import dataclasses
import hashlib
import json
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import auditor
from auditor.audit_run import (
    OpenedSite,
    audit_period,
    logged_us,
    month_period,
    months_of,
    open_site,
    window_us,
)
from auditor.history import read_past
from auditor.log_reading import hash_files
from auditor.publishing import publish_index, publish_month
from auditor.records.errors import AuditorError, Exit, Fault, NoDataError, worst
from auditor.records.period import Period
from auditor.records.plant import Fuel, Plant
from auditor.site_folder import AUDIT, LOGS, append_run_log, locked, require_site

_SHORTEST_DAY_US = 23 * 3_600_000_000
"""Less than this between first and last stamp is no day of logs, not even of the spring clock change."""
_WITH_REPORT = ("published", "unchanged")

Say = Callable[[str], None]
"""Takes one plain line about what happened."""


@dataclass(frozen=True)
class MonthRun:
    """What the nightly job did with one month of one site."""

    site: str
    month: str
    action: str
    """``published``, ``unchanged``, ``no data`` or ``less than a day of logs``."""
    status: Exit


@dataclass(frozen=True)
class SiteRun:
    """What the nightly job did with one site."""

    site: str
    months: tuple[MonthRun, ...]
    failure: str
    """Message of what stopped the site; empty if nothing did."""
    status: Exit


def nightly(sites: Iterable[Path], say: Say) -> list[SiteRun]:
    """Run the nightly job over sites, one after the other; a bad site never stops the next.

    Parameters
    ----------
    sites : iterable of Path
        Site folders.
    say : callable
        Takes one plain line per event.
    """
    return [_one_site(Path(site), say) for site in sites]


def _one_site(site: Path, say: Say) -> SiteRun:
    name = site.resolve().name
    try:
        require_site(site)
        with locked(site / AUDIT):
            months = _changed_months(site, say)
            append_run_log(site / AUDIT, [_log_line(run) for run in months])
    except AuditorError as error:
        say(f"{name}: {error}")
        _log_failure(site, f"failed, exit {int(error.exit_code)}: {error}")
        return SiteRun(name, (), str(error), error.exit_code)
    except Exception as error:
        # One site's unforeseen failure must not cost the others their night; it is logged in full below.
        import traceback

        text = "".join(traceback.format_exception(error))
        say(f"{name}: the program failed\n{text}")
        _log_failure(site, f"failed, exit {int(Exit.OWN_FAILURE)}: {text}")
        return SiteRun(name, (), text, Exit.OWN_FAILURE)
    usable = [run.status for run in months if run.action in _WITH_REPORT]
    status = worst(usable) if usable else Exit.NO_DATA
    return SiteRun(name, tuple(months), "", status)


def _log_line(run: MonthRun) -> str:
    tail = f", exit {int(run.status)}" if run.action in _WITH_REPORT else ""
    return f"{run.month} {run.action}{tail}"


def _log_failure(site: Path, line: str) -> None:
    if not (site / "plant.toml").is_file():
        return
    try:
        append_run_log(site / AUDIT, [line.replace("\n", " | ")])
    except AuditorError:
        # The folder cannot be written: the message already went to the caller, there is nowhere else.
        return


def _changed_months(site: Path, say: Say) -> list[MonthRun]:
    name = site.resolve().name
    opened = open_site(site)
    folder = opened.plant.folder
    digests = hash_files(folder / LOGS)
    past = read_past(folder / AUDIT)
    runs = []
    labels = months_of(opened)
    if not labels:
        raise _no_months(folder)
    for label in labels:
        period = month_period(opened, label)
        if logged_us(opened, period) < _SHORTEST_DAY_US:
            runs.append(MonthRun(name, label, "less than a day of logs", Exit.NO_DATA))
            say(f"{name} {label}: less than a day of logs, left alone")
            continue
        key = content_key(opened, period, digests)
        before = past.get(label)
        if (
            before is not None
            and before.content_key == key
            and _outputs_whole(folder / AUDIT / label, before.outputs)
        ):
            runs.append(MonthRun(name, label, "unchanged", Exit(before.exit_code)))
            say(f"{name} {label}: unchanged")
            continue
        try:
            result = audit_period(opened, period)
        except NoDataError:
            runs.append(MonthRun(name, label, "no data", Exit.NO_DATA))
            say(f"{name} {label}: no usable data, nothing written")
            continue
        publish_month(result, folder / AUDIT, key)
        runs.append(MonthRun(name, label, "published", result.status))
        say(f"{name} {label}: published, exit {int(result.status)}")
    publish_index(opened.plant.site.name, folder / AUDIT)
    return runs


def _no_months(folder: Path) -> NoDataError:
    """Return the error for exports in which no stamp was recognised."""
    return NoDataError(
        [
            Fault(
                str(folder / LOGS),
                "no file that the plant file claims holds a readable stamp",
                "look at `auditor check` for what was recognised in each file",
            )
        ]
    )


def _outputs_whole(folder: Path, digests: Mapping[str, str]) -> bool:
    """Whether every published file is still there as it was written."""
    return all(
        (folder / name).is_file() and hashlib.sha256((folder / name).read_bytes()).hexdigest() == digest
        for name, digest in digests.items()
    )


def content_key(opened: OpenedSite, period: Period, digests: dict[str, str]) -> str:
    """Digest of everything a month's audit is made from.

    The program's version, the slice of the plant that matters for the month, and the content of every
    file whose stamps reach into the month (files without readable stamps count for every month).
    """
    start_us, end_us = window_us(opened.plant, period)
    ranges = {file: (first, last) for file, first, last in opened.recognition.ranges()}
    touching = {
        file: digest
        for file, digest in digests.items()
        if file not in ranges or (ranges[file][0] < end_us and ranges[file][1] >= start_us)
    }
    content = {
        "version": auditor.__version__,
        "period": [period.label, period.start_us, period.end_us],
        "plant": plant_slice(opened.plant, period),
        "files": sorted(touching.items()),
    }
    return hashlib.sha256(json.dumps(content, sort_keys=True).encode()).hexdigest()


def plant_slice(plant: Plant, period: Period) -> dict[str, Any]:
    """Return what of the plant bears on a month: entries dated outside it, lines and wording are left out."""
    distrust = [
        entry for entry in plant.distrust if entry.start_us < period.end_us and entry.end_us > period.start_us
    ]
    fuels = {name: _dated(fuel, period) for name, fuel in plant.fuels.items()}
    slim = dataclasses.replace(plant, distrust=tuple(distrust), fuels=fuels, text="")
    plain = _plain(slim)
    assert isinstance(plain, dict)
    for place in ("path", "folder", "text"):
        plain.pop(place)
    return plain


def _dated(fuel: Fuel, period: Period) -> Fuel:
    started = [value for value in fuel.values if value.from_us < period.end_us]
    current = max((value.from_us for value in started if value.from_us <= period.start_us), default=None)
    kept = [value for value in started if current is None or value.from_us >= current]
    return dataclasses.replace(fuel, values=tuple(kept))


def _plain(value: object) -> object:
    """Turn records into plain JSON values; line numbers are not content."""
    if dataclasses.is_dataclass(value) and not isinstance(value, type):
        return {
            field.name: _plain(getattr(value, field.name))
            for field in dataclasses.fields(value)
            if field.name != "line"
        }
    if isinstance(value, Mapping):
        return {str(key): _plain(item) for key, item in value.items()}
    if isinstance(value, (list, tuple)):
        return [_plain(item) for item in value]
    if isinstance(value, (str, int, float, bool)) or value is None:
        return value
    return str(value)
