"""Efficiency and its ceiling over time, with the verdict strip below."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from auditor.records.verdicts import Verdict
from auditor.report.charts.style import BAND, BLUE, MARKS, OCHRE, axis, hatching, label
from auditor.report.charts.thinning import envelope, every, group_size, milliseconds, numbers

if TYPE_CHECKING:
    from numpy.typing import NDArray

    from auditor.records.balances import IntervalFigures

_LANE_PX = 30
"""Height of one lane of the strip: its name and its bar."""
_LINES_PX = 330
"""Height of the part with the lines."""
_AROUND_PX = 110
"""Height of legend, axis and margins."""
_SHOWN = (Verdict.NOT_ASSESSED, Verdict.STOPPED)
"""Verdicts whose efficiency means nothing and is not drawn."""


def drawable(values: NDArray[np.float64], verdict: NDArray[np.int8]) -> NDArray[np.float64]:
    """Keep the figure where it means something: not while standing still, not without its inputs."""
    return np.where(np.isin(verdict, _SHOWN), np.nan, values)


def axis_top(values: NDArray[np.float64], ceiling: NDArray[np.float64] | None) -> float:
    """Upper end of the efficiency axis: wild values must not flatten all others."""
    finite = values[np.isfinite(values)]
    top = float(np.percentile(finite, 99.0)) if finite.size else 1.0
    if ceiling is not None and np.isfinite(ceiling).any():
        top = max(top, float(np.nanpercentile(ceiling, 99.0)))
    return max(1.12 * top, 1e-3)


def height_px(verdict: NDArray[np.int8]) -> int:
    """Height of the chart: lanes for the verdicts that occur, below the lines."""
    return _LINES_PX + _AROUND_PX + _LANE_PX * len(np.unique(verdict))


def efficiency_over_time(
    interval: IntervalFigures,
    figure: tuple[str, NDArray[np.float64], NDArray[np.float64]],
    ceiling: tuple[str, NDArray[np.float64]] | None,
    verdict: NDArray[np.int8],
    offset: tuple[int, str],
) -> dict[str, object]:
    """Build the chart.

    Parameters
    ----------
    interval : IntervalFigures
        For the times.
    figure : (title, values [1], U [1])
        The headline efficiency.
    ceiling : (title, values [1]) or None
        Its named ceiling.
    verdict : ndarray of Verdict
    offset : (microseconds, name)
        Standard time of the site.
    """
    title, values, U = figure
    shown = drawable(values, verdict)
    times = (interval.start_us + interval.end_us) // 2
    data = [_uncertainty_band(times, shown, U, offset[0])]
    data.append(_line(times, shown, offset[0], title, {"color": BLUE, "width": 1.3}))
    if ceiling is not None:
        style = {"color": OCHRE, "width": 1.6, "dash": "dash"}
        data.append(_line(times, ceiling[1], offset[0], ceiling[0], style))
    hits = np.flatnonzero((verdict == Verdict.IMPOSSIBLE) & np.isfinite(shown))
    if hits.size:
        data.append(_points(times[hits], shown[hits], offset[0]))
    present = [word for word in Verdict if (verdict == word).any()]
    strip, notes = _strip(interval, verdict, present, offset[0])
    top = axis_top(shown, ceiling[1] if ceiling is not None else None)
    strip_height = _LANE_PX * len(present) / (_LANE_PX * len(present) + _LINES_PX)
    layout = {
        "xaxis": axis(
            f"site standard time ({offset[1]})",
            type="date",
            anchor="y2",
            range=milliseconds(np.array([interval.start_us[0], interval.end_us[-1]]), offset[0]),
        ),
        "yaxis": axis("efficiency, %", domain=[strip_height + 0.04, 1.0], range=[0.0, 100.0 * top]),
        "yaxis2": {
            "domain": [0.0, strip_height],
            "range": [0, len(present)],
            "visible": False,
            "fixedrange": True,
        },
        "annotations": notes,
        "barmode": "overlay",
        "bargap": 0,
        "hovermode": "closest",
    }
    return {"data": data + strip, "layout": layout}


def _line(
    times: NDArray[np.int64], values: NDArray[np.float64], offset_us: int, name: str, style: dict[str, object]
) -> dict[str, object]:
    kept = envelope(values)
    return {
        "type": "scatter",
        "mode": "lines",
        "name": label(name),
        "x": milliseconds(times[kept], offset_us),
        "y": numbers(values[kept] * 100.0),
        "line": style,
        "connectgaps": False,
        "hovertemplate": "%{x|%d %b %H:%M}<br>%{y:.1f} %<extra>" + label(name) + "</extra>",
    }


def _uncertainty_band(
    times: NDArray[np.int64], values: NDArray[np.float64], U: NDArray[np.float64], offset_us: int
) -> dict[str, object]:
    """Close an outline per stretch without gaps, from the lowest value - U to the highest value + U."""
    size = group_size(times.shape[0])
    groups = np.arange(times.shape[0]) // size
    count = int(groups[-1]) + 1
    low, high = np.full(count, np.inf), np.full(count, -np.inf)
    known = np.isfinite(values) & np.isfinite(U)
    np.minimum.at(low, groups[known], (values - U)[known])
    np.maximum.at(high, groups[known], (values + U)[known])
    middle = times[np.minimum(np.arange(count) * size + size // 2, times.shape[0] - 1)]
    filled = np.flatnonzero(np.isfinite(low) & np.isfinite(high))
    runs = np.split(filled, np.flatnonzero(np.diff(filled) > 1) + 1) if filled.size else []
    x: list[int | None] = []
    y: list[float | None] = []
    for run in runs:
        stamps = milliseconds(middle[run], offset_us)
        x += [*stamps, *reversed(stamps), None]
        y += [*numbers(high[run] * 100.0), *reversed(numbers(low[run] * 100.0)), None]
    return {
        "type": "scatter",
        "mode": "lines",
        "name": "± U (k = 2)",
        "x": x,
        "y": y,
        "fill": "toself",
        "fillcolor": BAND,
        "line": {"width": 0},
        "hoverinfo": "skip",
    }


def _points(times: NDArray[np.int64], values: NDArray[np.float64], offset_us: int) -> dict[str, object]:
    mark = MARKS[Verdict.IMPOSSIBLE]
    some = every(times.shape[0])
    return {
        "type": "scatter",
        "mode": "markers",
        "name": "impossible interval",
        "x": milliseconds(times[some], offset_us),
        "y": numbers(values[some] * 100.0),
        "marker": {"symbol": mark.symbol, "color": mark.colour, "size": 7},
        "hovertemplate": "%{x|%d %b %H:%M}<br>%{y:.1f} %<extra>impossible</extra>",
    }


def _strip(
    interval: IntervalFigures, verdict: NDArray[np.int8], present: list[Verdict], offset_us: int
) -> tuple[list[dict[str, object]], list[dict[str, object]]]:
    """One lane per verdict that occurs, named above it; a run of equal verdicts is one bar."""
    edges = np.flatnonzero(np.diff(verdict)) + 1
    first = np.concatenate(([0], edges))
    last = np.concatenate((edges, [verdict.shape[0]])) - 1
    words = verdict[first]
    traces: list[dict[str, object]] = []
    notes: list[dict[str, object]] = []
    for lane, word in enumerate(reversed(present)):
        runs = words == word
        start, end = interval.start_us[first[runs]], interval.end_us[last[runs]]
        mark = MARKS[word]
        hours = float((end - start).sum()) / 3.6e9
        traces.append(
            {
                "type": "bar",
                "name": word.word,
                "x": milliseconds((start + end) // 2, offset_us),
                "width": ((end - start) // 1000).tolist(),
                "y": [0.42] * int(runs.sum()),
                "base": [lane + 0.06] * int(runs.sum()),
                "yaxis": "y2",
                "marker": {
                    "color": mark.colour,
                    "line": {"width": 0},
                    "pattern": hatching(mark.hatch, mark.colour),
                },
                "showlegend": False,
                "hovertemplate": "%{x|%d %b %H:%M}<extra>" + word.word + "</extra>",
            }
        )
        notes.append(
            {
                "text": f"{word.word}, {hours:.1f} h",
                "x": 0.0,
                "xref": "paper",
                "xanchor": "left",
                "y": lane + 0.5,
                "yref": "y2",
                "yanchor": "bottom",
                "showarrow": False,
                "font": {"size": 10.5},
                "borderpad": 0,
            }
        )
    return traces, notes
