"""One audit of one site over one period: the order of the rooms, and nothing else."""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from datetime import date
from pathlib import Path

import auditor
from auditor import influences
from auditor.balancing import BalancingSettings, balance, finish, rebalance
from auditor.cleaning import CleaningSettings, clean, compare_clocks
from auditor.cleaning.grid import between_dates, calendar_month, make_grid, month_labels
from auditor.judging import JudgingSettings, judge
from auditor.log_reading import Recognition, read_export, recognise, recognition_notes
from auditor.metering import MeteringSettings, meter, meter_moved
from auditor.plant_file import read_plant
from auditor.records.balances import MachineBalance, MachineFigures
from auditor.records.errors import Fault, NoDataError, UsageError
from auditor.records.findings import Finding
from auditor.records.period import Grid, Period
from auditor.records.plant import Plant
from auditor.records.powers import Move, PowerTable
from auditor.records.result import AuditResult, CheckResult
from auditor.records.samples import ReadingNote, SampleBlock
from auditor.records.ticks import TickTable
from auditor.site_folder import LOGS

Progress = Callable[[str, float], None]
"""Called with the name of a stage and the share of the whole audit that is done [1]."""

_HALF = 0.5
_DAY_US = 86_400_000_000
_EVER = (-(2**62), 2**62)
"""A window that every stamp lies in [us]."""


def _silent(_stage: str, _done: float) -> None:
    """Take progress and say nothing."""


@dataclass(frozen=True)
class OpenedSite:
    """A site whose plant file is read and whose exports are recognised: ready for any period."""

    plant: Plant
    recognition: Recognition


def open_site(site: Path) -> OpenedSite:
    """Read the plant file of a site and recognise its exports.

    Raises
    ------
    PlantFileError
        For every fault of the plant file, or of what it says about the exports.
    NoDataError
        If there is no ``logs`` folder, or nothing in it.
    """
    plant = read_plant(site)
    logs = plant.folder / LOGS
    if not logs.is_dir() or not any(path.is_file() for path in logs.rglob("*")):
        raise NoDataError(
            [
                Fault(
                    str(logs),
                    "there are no exports",
                    "drop the logger's exports into this folder, then run again",
                )
            ]
        )
    return OpenedSite(plant, recognise(logs, plant.exports, plant.tags))


def audit(
    site: str | Path,
    *,
    month: str | None = None,
    start: date | None = None,
    end: date | None = None,
    progress: Progress = _silent,
) -> AuditResult:
    """Audit one site over one period and return everything that was found. Writes nothing.

    Parameters
    ----------
    site : path
        The site folder, which holds ``plant.toml`` and ``logs/``.
    month : str, optional
        A calendar month in the site's zone, ``2026-07``.
    start, end : date, optional
        First and last local date, both inclusive, in place of a month.
    progress : callable, optional
        Called with a stage's name and the share of the audit that is done.

    Returns
    -------
    AuditResult
        Without a period: of the latest month in which a machine has half of its ticks.

    Raises
    ------
    PlantFileError, UsageError, NoDataError, InputOutputError
        Each with every fault, its place and its remedy.
    """
    return audit_opened(open_site(Path(site)), month=month, start=start, end=end, progress=progress)


def audit_opened(
    opened: OpenedSite,
    *,
    month: str | None = None,
    start: date | None = None,
    end: date | None = None,
    progress: Progress = _silent,
) -> AuditResult:
    """Audit a site that is open already; the parameters are those of :func:`audit`."""
    zone = opened.plant.site.zone
    if month is not None and (start is not None or end is not None):
        raise UsageError([Fault("--month", "a month and dates were both given", "give one of them")])
    if month is not None:
        return audit_period(opened, month_period(opened, month), progress=progress)
    if start is not None or end is not None:
        if start is None or end is None or end < start:
            raise UsageError(
                [
                    Fault(
                        "--from, --to", "a first and a last date are needed, in this order", "give both dates"
                    )
                ]
            )
        return audit_period(opened, between_dates(start, end, zone), progress=progress)
    return _latest_month(opened, progress)


def check(opened: OpenedSite, progress: Progress = _silent) -> CheckResult:
    """Read every export from end to end, compute nothing, and return what was recognised."""
    notes: list[ReadingNote] = []
    names = list(opened.plant.exports)
    for place, name in enumerate(names):
        progress(f"reading {name}", place / len(names))
        pieces = read_export(opened.recognition, name, _EVER)
        notes += [piece for piece in pieces if isinstance(piece, ReadingNote)]
    notes += recognition_notes(opened.recognition)
    notes.sort(key=lambda note: note.file)
    found = [finding for note in notes for finding in note.findings]
    return CheckResult(opened.plant, tuple(notes), (*opened.recognition.findings, *found))


def months_of(opened: OpenedSite) -> list[str]:
    """Calendar months (site's zone) that the exports touch, oldest first."""
    ranges = [(first, last) for _, first, last in opened.recognition.ranges()]
    return month_labels(ranges, opened.plant.site.zone)


def month_period(opened: OpenedSite, label: str) -> Period:
    """Return a calendar month, cut at its last finished local day while it is in progress."""
    return _unfinished(opened, calendar_month(label, opened.plant.site.zone))


def _unfinished(opened: OpenedSite, period: Period) -> Period:
    """Cut a month in progress at the end of its last finished local day.

    The clock is that of the logs: a month is in progress while the newest stamp of all exports lies
    inside it, before its last day.
    """
    newest_us = max((last for _, _, last in opened.recognition.ranges()), default=period.end_us)
    days = make_grid(period, opened.plant.site.tick_s, opened.plant.site.interval_s).day_start_us
    if newest_us >= days[-2] or newest_us < period.start_us:
        return period
    finished_us = int(days[days <= newest_us][-1])
    return replace(period, end_us=finished_us, unfinished=True) if finished_us > period.start_us else period


def _latest_month(opened: OpenedSite, progress: Progress) -> AuditResult:
    zone = opened.plant.site.zone
    passed_over: list[str] = []
    for label in reversed(months_of(opened)):
        whole = calendar_month(label, zone)
        stretch_us = logged_us(opened, whole)
        result = None
        # Stamps that span less than half of the month cannot fill half of its ticks: no need to read them.
        if stretch_us >= _HALF * (whole.end_us - whole.start_us):
            result = _with_data(opened, month_period(opened, label), progress)
        if result is not None:
            share = result.period.seconds / whole.seconds
            if any(of.interval.coverage.mean() * share >= _HALF for of in result.balances.values()):
                said = f"{label} is the latest month in which a machine has half of its minutes"
                if passed_over:
                    said += f"; passed over for too little data: {', '.join(passed_over)}"
                return replace(result, period_said=said)
        if stretch_us >= _DAY_US:
            passed_over.append(label)
    raise NoDataError(
        [
            Fault(
                str(opened.plant.folder / LOGS),
                "in no month has any machine half of its minutes"
                + (f" (looked at {', '.join(passed_over)})" if passed_over else ""),
                "add the missing exports, or name a period with --month or --from and --to",
            )
        ]
    )


def logged_us(opened: OpenedSite, period: Period) -> int:
    """Longest stretch of a period between the first and the last stamp of any one export in it."""
    longest = 0
    for files in opened.recognition.files.values():
        inside = [file for file in files if file.first_us < period.end_us and file.last_us >= period.start_us]
        if inside:
            first_us = max(min(file.first_us for file in inside), period.start_us)
            last_us = min(max(file.last_us for file in inside), period.end_us)
            longest = max(longest, last_us - first_us)
    return longest


def _with_data(opened: OpenedSite, period: Period, progress: Progress) -> AuditResult | None:
    try:
        return audit_period(opened, period, progress=progress)
    except NoDataError:
        return None


def audit_period(opened: OpenedSite, period: Period, *, progress: Progress = _silent) -> AuditResult:
    """Audit an opened site over one period: every room in its order."""
    plant = opened.plant
    grid = make_grid(period, plant.site.tick_s, plant.site.interval_s)
    ticks, notes, findings = _read_and_clean(opened, grid, progress)
    progress("metering", 0.65)
    metering = MeteringSettings.from_plant(plant)
    powers, metered = meter(ticks, metering)
    _require_data(opened, period, bool(powers.known.any()))
    progress("balancing", 0.7)
    balances = _balances(plant, ticks, metering, powers, progress)
    progress("judging", 0.95)
    judged = judge(balances, powers, ticks, JudgingSettings.from_plant(plant), [*findings, *metered])
    return AuditResult(
        version=auditor.__version__,
        plant=plant,
        plant_sha256=hashlib.sha256(plant.whole_text.encode()).hexdigest(),
        period=period,
        period_said="",
        notes=notes,
        ticks=ticks,
        powers=powers,
        balances=balances,
        judgements=judged.judgements,
        findings=judged.findings,
        worked=judged.worked,
        status=judged.status,
    )


def _read_and_clean(
    opened: OpenedSite, grid: Grid, progress: Progress
) -> tuple[TickTable, tuple[ReadingNote, ...], list[Finding]]:
    plant = opened.plant
    window = window_us(plant, grid.period)
    notes: list[ReadingNote] = []

    def blocks(name: str, done: float) -> Iterator[SampleBlock]:
        progress(f"reading {name}", done)
        for piece in read_export(opened.recognition, name, window):
            if not isinstance(piece, ReadingNote):
                yield piece
            elif _reaches(piece, window):
                notes.append(piece)

    names = list(plant.exports)
    exports = {name: blocks(name, 0.6 * place / len(names)) for place, name in enumerate(names)}
    settings = CleaningSettings.from_plant(plant)
    ticks, cleaned = clean(exports, settings, grid)
    notes += recognition_notes(opened.recognition)
    notes.sort(key=lambda note: note.file)
    findings = [*opened.recognition.findings, *cleaned, *compare_clocks(ticks, settings)]
    findings += [finding for note in notes for finding in note.findings]
    return ticks, tuple(notes), findings


def _reaches(note: ReadingNote, window: tuple[int, int]) -> bool:
    """Whether a file bears on the stretch; one without a readable stamp does as far as anybody knows."""
    if note.first_us is None or note.last_us is None:
        return True
    return note.first_us < window[1] and note.last_us >= window[0]


def window_us(plant: Plant, period: Period) -> tuple[int, int]:
    """Stretch to read: from the longest hold before the period to one hold after it."""
    longest_us = int(max((tag.hold_s for tag in plant.tags.values()), default=0.0) * 1e6)
    return period.start_us - longest_us, period.end_us + longest_us


def _require_data(opened: OpenedSite, period: Period, anything: bool) -> None:
    if not anything:
        raise NoDataError(
            [
                Fault(
                    str(opened.plant.folder / LOGS),
                    f"the exports hold no usable value for {period.label}",
                    "add the exports of this period, or look at `auditor check` for what was recognised",
                )
            ]
        )


def _balances(
    plant: Plant, ticks: TickTable, metering: MeteringSettings, powers: PowerTable, progress: Progress
) -> dict[str, MachineBalance]:
    """Balance every machine, then repeat metering and balancing with each source of uncertainty moved."""
    base = balance(powers, ticks, BalancingSettings.from_plant(plant))
    progress("moving every source of uncertainty", 0.75)

    def chain(move: Move) -> dict[str, MachineFigures]:
        return rebalance(meter_moved(ticks, metering, move, powers), base, move.source)

    moved = influences.propagate(chain, base.figures, powers.all_sources, influences.step_memory(ticks))
    return finish(base, moved)
