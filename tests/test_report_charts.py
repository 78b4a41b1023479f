"""Charts: few points that keep the extremes, valid for the plotting library, names that stay names."""

from __future__ import annotations

import datetime

import numpy as np
import plotly.graph_objects as go
import pytest
from report_factory import make_result

from auditor.records.verdicts import Verdict
from auditor.report.charts.style import BASE_LAYOUT, label
from auditor.report.charts.thinning import MOST_POINTS, envelope
from auditor.report.sections.machine import machine_view

RESULT = make_result()
VIEWS = [
    machine_view(number, machine, RESULT)
    for number, machine in enumerate(RESULT.plant.machines.values(), start=1)
]
CHARTS = {figure.id: figure.chart for view in VIEWS for figure in view.pictures if figure.chart is not None}


def test_thinning_keeps_the_lowest_and_the_highest() -> None:
    """A spike of one minute in a month is still in the picture."""
    values = np.zeros(44_640)
    values[12_345], values[31_415] = 9.0, -7.0
    kept = envelope(values)
    assert kept.size <= MOST_POINTS
    assert {12_345, 31_415} <= set(kept.tolist())
    assert (np.diff(kept) > 0).all()


def test_thinning_keeps_gaps() -> None:
    """A day without numbers is a gap in the line, not a bridge."""
    values = np.ones(10_000)
    values[4_000:5_000] = np.nan
    kept = envelope(values)
    inside = kept[(kept >= 4_000) & (kept < 5_000)]
    assert inside.size and np.isnan(values[inside]).all()


def test_short_series_are_drawn_as_they_are() -> None:
    """Nothing is thinned that fits."""
    assert envelope(np.arange(2_000.0)).size == 2_000


@pytest.mark.parametrize("name", CHARTS)
def test_charts_are_valid(name: str) -> None:
    """The plotting library knows every trace and every option (it refuses what it does not know)."""
    chart = CHARTS[name]
    assert isinstance(chart["layout"], dict)
    go.Figure(data=chart["data"], layout=BASE_LAYOUT | chart["layout"])


@pytest.mark.parametrize("name", CHARTS)
def test_no_line_has_more_points_than_allowed(name: str) -> None:
    """At most 2 000 points a line."""
    data = CHARTS[name]["data"]
    assert isinstance(data, list) and data
    assert all(len(trace["x"]) == len(trace["y"]) <= MOST_POINTS for trace in data)


def test_time_axis_is_standard_time() -> None:
    """The first interval of July starts at 23:00 standard time: local midnight is summer time."""
    layout = CHARTS["machine-2-time"]["layout"]
    assert isinstance(layout, dict)
    start = datetime.datetime.fromtimestamp(layout["xaxis"]["range"][0] / 1000.0, tz=datetime.UTC)
    assert start == datetime.datetime(2026, 6, 30, 23, 0, tzinfo=datetime.UTC)
    assert "UTC+01:00" in layout["xaxis"]["title"]["text"]


def test_strip_covers_every_moment_once() -> None:
    """The lanes of the verdict strip together are as long as the month."""
    data = CHARTS["machine-2-time"]["data"]
    assert isinstance(data, list)
    bars = [trace for trace in data if trace["type"] == "bar"]
    assert sum(sum(trace["width"]) for trace in bars) == 31 * 24 * 3_600_000
    assert {trace["name"] for trace in bars} == {
        word.word for word in Verdict if (RESULT.judgements["orc"].verdict == word).any()
    }


def test_names_cannot_become_markup_in_a_chart() -> None:
    """The plotting script reads a subset of HTML in texts; names are not HTML."""
    assert label("<b>x</b> & y") == "&lt;b&gt;x&lt;/b&gt; &amp; y"


def test_daily_rejection_compares_like_with_like() -> None:
    """Implied rejection of a day is demanded rejection plus rest, also on the day with a gap."""
    data = CHARTS["machine-2-rejection"]["data"]
    assert isinstance(data, list)
    demanded, rest, measured = (np.array(trace["y"], dtype=float) for trace in data)
    implied = demanded + rest
    # The made-up engine rejects to air within a few percent of what its balance leaves, except on the
    # sixth day, when its oil meter reads low.
    healthy = np.arange(31) != 5
    assert np.abs(implied[healthy] / measured[healthy] - 1.0).max() < 0.05
