"""Clocks of exports held against each other by the events that they share: offsets, time rules, drift."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, replace
from itertools import combinations
from typing import TYPE_CHECKING

import numpy as np

from auditor.cleaning.clock_lag import daily_lags, daily_spectra, theil_sen
from auditor.records.findings import Finding, FindingCode

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from auditor.cleaning.settings import CleaningSettings
    from auditor.records.ticks import TickTable

_MOST_TAGS = 8
"""So many signals of one machine and export are compared; quick ones first."""
_SLOWEST_S = 900.0
"""Signals that are logged more rarely tell no minutes."""
_SLOW = ("temperature", "pressure", "fraction")
"""Quantities that follow their cause late by themselves."""
_LEAST_S = 180.0
"""Smaller differences between quick signals are taken for the way of the thing itself."""
_LEAST_SLOW_S = 1_200.0
"""The same where one of the two is slow: heat needs minutes to arrive."""
_WHOLE_STEP = 0.9
"""Share of a step between samples that a lag of one step still shows, noise taken off."""
_SAME_S = 150.0
"""Days whose lags differ by no more belong together."""
_LEAST_DAYS = 3
_LEAST_DAYS_OF_DRIFT = 8
_LEAST_DRIFT_S = 120.0
_RULES_S = (3600.0, 7200.0)
_NEAR_RULE_S = 240.0


@dataclass(frozen=True)
class _Stretch:
    """Days on which two exports are apart by one amount, or by one that grows evenly."""

    first: str
    second: str
    tags: tuple[str, str]
    days: NDArray[np.int64]
    """Days that show it clearly, in order."""
    offset_s: float
    """By how much the second export stamps the same events later, in the middle of the stretch."""
    spread_s: float
    """Expanded uncertainty of it."""
    drift_s_per_day: float
    """0 unless the offset grows evenly."""

    @property
    def largest_s(self) -> float:
        """Largest offset within the stretch."""
        return abs(self.offset_s) + 0.5 * abs(self.drift_s_per_day) * float(self.days[-1] - self.days[0])


def compare_clocks(ticks: TickTable, settings: CleaningSettings) -> tuple[Finding, ...]:
    """Estimate how far the clocks of exports that belong to one machine are apart; nothing is shifted.

    For each pair of exports and each pair of their signals the lag of common events is found day by day
    (:func:`~auditor.cleaning.clock_lag.daily_lags`); the pair of signals that shows it on most days speaks.
    A constant lag over at least three days is an offset, near 60 or 120 min a time rule; one that grows by
    two minutes or more over at least eight clear days (Theil-Sen line, 95 %) is a drift. Another pair of
    signals that shows the same stretch without a lag withdraws it: then the lag is one of the plant.

    Parameters
    ----------
    ticks : TickTable
    settings : CleaningSettings
        Says which export and which machines each tag belongs to.

    Returns
    -------
    tuple of Finding
        One ``CLOCK_OFFSET`` for each stretch, in the order of the plant file and of time.

    Notes
    -----
    Limits: signals logged, or cut into ticks, more rarely than every 15 min are not compared; events that
    come back within 150 min in equal distances give no clear peak; two exports alone do not tell which of
    them is wrong.
    """
    if ticks.grid.tick_s > _SLOWEST_S:
        return ()
    columns = _columns_of_exports(ticks, settings)
    wanted = sorted({column for pairs in columns.values() for pair in pairs for column in pair})
    spectra = {column: daily_spectra(ticks.mean[:, column], ticks.grid) for column in wanted}
    stretches: list[_Stretch] = []
    for (first, second), pairs in columns.items():
        lags = {pair: daily_lags(spectra[pair[0]], spectra[pair[1]], ticks.grid) for pair in pairs}
        stretches += _stretches(first, second, lags, ticks, settings)
    return tuple(_findings(stretches, ticks, settings))


def _columns_of_exports(
    ticks: TickTable, settings: CleaningSettings
) -> dict[tuple[str, str], list[tuple[int, int]]]:
    """Per pair of exports the pairs of columns that belong to one machine, in a fixed order."""
    found: dict[tuple[str, str], dict[tuple[int, int], None]] = {}
    for machine in settings.running:
        own: dict[str, list[int]] = {name: [] for name in settings.exports}
        for column, name in enumerate(ticks.tags):
            tag = settings.tags[name]
            is_quick_enough = ticks.native_step_s[column] <= _SLOWEST_S
            runs = settings.running[machine].tick_column == ticks.columns[column]
            if is_quick_enough and (
                runs or (machine in settings.users.get(name, ()) and tag.between != "state")
            ):
                own[tag.export].append(column)
        for export, columns in own.items():
            own[export] = sorted(columns, key=lambda column: (_is_slow(column, ticks, settings), column))
        for first, second in combinations(settings.exports, 2):
            pairs = found.setdefault((first, second), {})
            for one in own[first][:_MOST_TAGS]:
                pairs |= dict.fromkeys((one, other) for other in own[second][:_MOST_TAGS])
    return {exports: list(pairs) for exports, pairs in found.items()}


def _is_slow(column: int, ticks: TickTable, settings: CleaningSettings) -> bool:
    return settings.tags[ticks.tags[column]].quantity in _SLOW


def _stretches(
    first: str,
    second: str,
    lags: Mapping[tuple[int, int], NDArray[np.float64]],
    ticks: TickTable,
    settings: CleaningSettings,
) -> Iterator[_Stretch]:
    """Give the stretches in which two exports are apart, none of them twice for the same days."""
    best: tuple[int, list[_Stretch]] = (0, [])
    for pair, lag in lags.items():
        slow = any(_is_slow(column, ticks, settings) for column in pair)
        coarse_s = max(ticks.grid.tick_s, *(float(ticks.native_step_s[column]) for column in pair))
        least_s = max(_LEAST_SLOW_S if slow else _LEAST_S, _WHOLE_STEP * coarse_s)
        tags = (ticks.tags[pair[0]], ticks.tags[pair[1]])
        told = []
        for days in _parts(lag, max(_SAME_S, 1.5 * ticks.grid.tick_s)):
            stretch = _fitted(
                _Stretch(first, second, tags, days, 0.0, 0.0, 0.0), lag[days], ticks.grid.tick_s
            )
            least = _LEAST_DRIFT_S if stretch.drift_s_per_day and not slow else least_s
            if stretch.largest_s >= least and not _is_withdrawn(stretch, lags):
                told.append(stretch)
        clear = sum(stretch.days.size for stretch in told)
        if clear > best[0]:
            best = (clear, told)
    yield from best[1]


def _parts(lag: NDArray[np.float64], same_s: float) -> list[NDArray[np.int64]]:
    """Split the clear days where the lag jumps and stays; lone days that jump away are left out."""
    clear = np.flatnonzero(np.isfinite(lag))
    parts: list[list[int]] = []
    for place, day in enumerate(clear.tolist()):
        if parts and abs(lag[day] - np.median(lag[parts[-1][-_LEAST_DAYS:]])) <= same_s:
            parts[-1].append(day)
            continue
        following = clear[place + 1 : place + _LEAST_DAYS]
        if following.size and np.abs(lag[following] - lag[day]).min() <= same_s:
            parts.append([day])
    return [np.array(part, np.int64) for part in parts if len(part) >= _LEAST_DAYS]


def _fitted(stretch: _Stretch, lag: NDArray[np.float64], tick_s: int) -> _Stretch:
    """Give a stretch its offset, and its drift where the line through its days has one beyond doubt."""
    days = stretch.days
    middle = float(np.median(lag))
    spread = 2.0 * 1.4826 * float(np.median(np.abs(lag - middle))) / np.sqrt(days.size)
    level = replace(stretch, offset_s=middle, spread_s=max(spread, 0.5 * tick_s))
    if days.size < _LEAST_DAYS_OF_DRIFT:
        return level
    slope, low, high = theil_sen(days, lag)
    span = float(days[-1] - days[0])
    if low * high <= 0 or abs(slope) * span < _LEAST_DRIFT_S:
        return level
    centre = 0.5 * float(days[0] + days[-1])
    rest = lag - slope * (days - centre)
    spread = 2.0 * 1.4826 * float(np.median(np.abs(rest - np.median(rest)))) / np.sqrt(days.size)
    return replace(
        level,
        offset_s=float(np.median(rest)),
        spread_s=max(spread, 0.5 * tick_s),
        drift_s_per_day=slope,
    )


def _is_withdrawn(stretch: _Stretch, lags: Mapping[tuple[int, int], NDArray[np.float64]]) -> bool:
    """Whether some other pair of signals shows the same days as clearly, but without such a lag."""
    first, last = int(stretch.days[0]), int(stretch.days[-1])
    for lag in lags.values():
        seen = lag[first : last + 1][np.isfinite(lag[first : last + 1])]
        if seen.size >= max(_LEAST_DAYS, stretch.days.size // 2):
            middle = float(np.median(seen))
            steady = np.median(np.abs(seen - middle)) <= _SAME_S
            if steady and abs(middle) < 0.5 * abs(stretch.offset_s):
                return True
    return False


def _findings(stretches: list[_Stretch], ticks: TickTable, settings: CleaningSettings) -> list[Finding]:
    """Name the export that differs from most others, once for all that it differs from."""
    count = {name: 0 for name in settings.exports}
    for stretch in stretches:
        count[stretch.first] += 1
        count[stretch.second] += 1
    merged: list[tuple[str, list[str], _Stretch]] = []
    for stretch in stretches:
        own, other = stretch, stretch.first
        if _suspect(stretch, count, settings) == stretch.first:
            own = replace(
                stretch,
                first=stretch.second,
                second=stretch.first,
                tags=(stretch.tags[1], stretch.tags[0]),
                offset_s=-stretch.offset_s,
                drift_s_per_day=-stretch.drift_s_per_day,
            )
            other = stretch.second
        for suspect, others, known in merged:
            meet = known.days[0] <= own.days[-1] and own.days[0] <= known.days[-1]
            if suspect == own.second and meet and abs(known.offset_s - own.offset_s) <= _SAME_S:
                others.append(other)
                break
        else:
            merged.append((own.second, [other], own))
    return [_finding(stretch, others, ticks) for _, others, stretch in merged]


def _suspect(stretch: _Stretch, count: Mapping[str, int], settings: CleaningSettings) -> str:
    """Of two exports the one that is apart from more others; else the one that keeps summer time."""
    first, second = stretch.first, stretch.second
    if count[first] != count[second]:
        return first if count[first] > count[second] else second
    keeps = {name: "/" in settings.exports[name].clock for name in (first, second)}
    return first if keeps[first] and not keeps[second] else second


def _finding(stretch: _Stretch, others: list[str], ticks: TickTable) -> Finding:
    edges = ticks.grid.day_start_us
    near = min(abs(abs(stretch.offset_s) - rule) for rule in _RULES_S)
    kind = "drift" if stretch.drift_s_per_day else "time rule" if near <= _NEAR_RULE_S else "offset"
    numbers = {
        "offset_s": _rounded(stretch.offset_s),
        "spread_s": _rounded(stretch.spread_s),
        "days": stretch.days.size,
    }
    if stretch.drift_s_per_day:
        half = 0.5 * stretch.drift_s_per_day * float(stretch.days[-1] - stretch.days[0])
        numbers["drift_s_per_day"] = _rounded(stretch.drift_s_per_day)
        numbers["first_s"] = _rounded(stretch.offset_s - half)
        numbers["last_s"] = _rounded(stretch.offset_s + half)
    return Finding(
        code=FindingCode.CLOCK_OFFSET,
        export=stretch.second,
        start_us=int(edges[stretch.days[0]]),
        end_us=int(edges[stretch.days[-1] + 1]),
        numbers=numbers,
        words={"kind": kind, "others": ", ".join(others), "tags": f"{stretch.tags[1]}, {stretch.tags[0]}"},
    )


def _rounded(seconds: float) -> float:
    """To hundredths: what lies below is rounding of the transform."""
    return round(seconds, 2)
