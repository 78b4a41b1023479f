"""Efficiency against load: one point per interval, its shape the verdict."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from auditor.records.verdicts import Verdict
from auditor.report.charts.over_time import axis_top
from auditor.report.charts.style import MARKS, OCHRE, axis, label
from auditor.report.charts.thinning import every, numbers

if TYPE_CHECKING:
    from numpy.typing import NDArray

DRAWN = (
    Verdict.CREDIBLE,
    Verdict.NO_CEILING,
    Verdict.LOW,
    Verdict.LOW_LOAD,
    Verdict.TRANSIENT,
    Verdict.IMPLAUSIBLE,
    Verdict.OVER_CEILING_UNPROVEN,
    Verdict.IMPOSSIBLE,
)
"""Verdicts with a figure, the rarer ones drawn over the usual ones."""


def efficiency_against_load(
    load: tuple[str, NDArray[np.float64]],
    figure: tuple[str, NDArray[np.float64]],
    ceiling: NDArray[np.float64] | None,
    verdict: NDArray[np.int8],
) -> dict[str, object]:
    """Build the chart; ``load`` is (title of the axis, values), ``figure`` (title, values [1])."""
    known = np.isfinite(load[1]) & np.isfinite(figure[1])
    data = [
        _cloud(load[1][chosen], figure[1][chosen], word)
        for word in DRAWN
        if (chosen := known & (verdict == word)).any()
    ]
    if ceiling is not None:
        data.append(_ceiling_line(load[1], ceiling, known & np.isin(verdict, DRAWN)))
    usual = figure[1][known & np.isin(verdict, DRAWN)]
    layout = {
        "xaxis": axis(load[0], rangemode="tozero"),
        "yaxis": axis(f"{label(figure[0])}, %", range=[0.0, 100.0 * axis_top(usual, ceiling)]),
        "hovermode": "closest",
    }
    return {"data": data, "layout": layout}


def _cloud(load: NDArray[np.float64], values: NDArray[np.float64], word: Verdict) -> dict[str, object]:
    mark = MARKS[word]
    some = every(load.shape[0])
    return {
        "type": "scatter",
        "mode": "markers",
        "name": word.word,
        "x": numbers(load[some], 4),
        "y": numbers(values[some] * 100.0, 4),
        "marker": {
            "symbol": mark.symbol,
            "color": mark.colour,
            "size": 4 if word is Verdict.CREDIBLE else 6,
            "opacity": 0.45 if word is Verdict.CREDIBLE else 0.9,
        },
        "hovertemplate": "%{x}: %{y:.1f} %<extra>" + word.word + "</extra>",
    }


def _ceiling_line(
    load: NDArray[np.float64], ceiling: NDArray[np.float64], chosen: NDArray[np.bool_]
) -> dict[str, object]:
    """Median ceiling of twenty classes of load, as a line."""
    chosen = chosen & np.isfinite(ceiling)
    x, y = load[chosen], ceiling[chosen]
    points: list[tuple[float, float]] = []
    if x.size:
        edges = np.linspace(x.min(), x.max(), 21)
        place = np.clip(np.searchsorted(edges, x, side="right") - 1, 0, 19)
        points = [
            ((edges[i] + edges[i + 1]) / 2, float(np.median(y[place == i])))
            for i in range(20)
            if (place == i).any()
        ]
    return {
        "type": "scatter",
        "mode": "lines",
        "name": "ceiling (median)",
        "x": numbers(np.array([point[0] for point in points]), 4),
        "y": numbers(np.array([point[1] for point in points]) * 100.0, 4),
        "line": {"color": OCHRE, "width": 1.6, "dash": "dash"},
        "hoverinfo": "skip",
    }
