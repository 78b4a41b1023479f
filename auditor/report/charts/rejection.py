"""Rejected heat by day: what the second law demands, the rest, and what was metered."""

from __future__ import annotations

from typing import TYPE_CHECKING

from auditor.report.charts.style import OCHRE, axis, hatching
from auditor.report.charts.thinning import numbers

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray


def rejected_heat_by_day(
    days: list[str],
    implied_MWh: NDArray[np.float64],
    demanded_MWh: NDArray[np.float64] | None,
    measured_MWh: NDArray[np.float64] | None,
) -> dict[str, object]:
    """Build the chart: bars add up to the implied rejection, diamonds are the metered one."""
    data: list[dict[str, object]] = []
    if demanded_MWh is None:
        data.append(_bars(days, implied_MWh, "rejected heat, implied by the balance", "#9db8c9", ""))
    else:
        data.append(_bars(days, demanded_MWh, "demanded by the second law", "#5f8fb0", "/"))
        data.append(_bars(days, implied_MWh - demanded_MWh, "rest", "#d8c7a6", ""))
    if measured_MWh is not None:
        data.append(
            {
                "type": "scatter",
                "mode": "markers",
                "name": "measured",
                "x": days,
                "y": numbers(measured_MWh, 4),
                "marker": {"symbol": "diamond", "color": OCHRE, "size": 8},
                "hovertemplate": "%{x}: %{y:.2f} MWh<extra>measured</extra>",
            }
        )
    layout = {
        "xaxis": axis("local day", type="category", tickangle=0, nticks=10),
        "yaxis": axis("MWh a day", rangemode="tozero"),
        "barmode": "relative",
        "bargap": 0.18,
    }
    return {"data": data, "layout": layout}


def _bars(
    days: list[str], values: NDArray[np.float64], name: str, colour: str, hatch: str
) -> dict[str, object]:
    return {
        "type": "bar",
        "name": name,
        "x": days,
        "y": numbers(values, 4),
        "marker": {
            "color": colour,
            "line": {"width": 0},
            "pattern": hatching(hatch, colour),
        },
        "hovertemplate": "%{x}: %{y:.2f} MWh<extra>" + name + "</extra>",
    }
