"""Colours, symbols and hatchings of the charts: told apart without colour, and with any colour vision."""

from __future__ import annotations

from dataclasses import dataclass
from html import escape

from auditor.records.verdicts import Verdict

INK = "#1f2933"
FAINT = "#5b6670"
RULE = "#d9d5cb"
BLUE = "#1f5a85"
OCHRE = "#8f5208"
BAND = "rgba(31,90,133,0.16)"
FONT = "system-ui, 'Segoe UI', 'Helvetica Neue', Arial, sans-serif"


@dataclass(frozen=True)
class Mark:
    """How a verdict looks: as a stretch of the strip and as a point."""

    colour: str
    hatch: str
    symbol: str


MARKS: dict[Verdict, Mark] = {
    Verdict.NOT_ASSESSED: Mark("#8a8f94", "x", "circle-open"),
    Verdict.STOPPED: Mark("#c4c0b6", "", "line-ew-open"),
    Verdict.LOW_LOAD: Mark("#6fa8cf", ".", "triangle-down-open"),
    Verdict.TRANSIENT: Mark("#4d8f86", "-", "diamond-open"),
    Verdict.IMPOSSIBLE: Mark("#b3361e", "/", "x"),
    Verdict.OVER_CEILING_UNPROVEN: Mark("#c9791a", "\\", "triangle-up"),
    Verdict.IMPLAUSIBLE: Mark("#8a4a86", "|", "square-open"),
    Verdict.LOW: Mark("#7a6a12", "+", "triangle-down"),
    Verdict.NO_CEILING: Mark("#5b6670", "", "cross-thin-open"),
    Verdict.CREDIBLE: Mark(BLUE, "", "circle"),
}


def label(text: str) -> str:
    """Neutralise a name for a chart: the plotting script reads a subset of HTML in its texts."""
    return escape(text, quote=False)


def axis(title: str, **rest: object) -> dict[str, object]:
    """One axis in the report's own quiet style."""
    return {
        "title": {"text": title, "font": {"size": 12, "color": FAINT}, "standoff": 8},
        "gridcolor": "#ebe8e0",
        "linecolor": RULE,
        "showline": True,
        "ticks": "outside",
        "ticklen": 4,
        "tickcolor": RULE,
        "zeroline": False,
        "automargin": True,
    } | rest


def hatching(shape: str, colour: str) -> dict[str, object]:
    """White hatching on a colour; an empty shape is the plain colour."""
    return {"shape": shape, "fgcolor": "#ffffff", "bgcolor": colour, "size": 6, "solidity": 0.22}


BASE_LAYOUT: dict[str, object] = {
    "template": "none",
    "font": {"family": FONT, "size": 12, "color": INK},
    "paper_bgcolor": "rgba(0,0,0,0)",
    "plot_bgcolor": "rgba(0,0,0,0)",
    "margin": {"l": 56, "r": 12, "t": 12, "b": 48},
    "hoverlabel": {"font": {"family": FONT, "size": 12}},
    "legend": {"orientation": "h", "x": 0, "y": 1.02, "xanchor": "left", "yanchor": "bottom"},
    "dragmode": "zoom",
}
"""Laid under the layout of every chart by the page's script."""

CONFIG: dict[str, object] = {
    "displaylogo": False,
    "responsive": True,
    "showSendToCloud": False,
    "plotlyServerURL": "",
    "modeBarButtonsToRemove": ["select2d", "lasso2d", "autoScale2d"],
}
"""No button sends anything anywhere."""
