"""index.html of a site: all published months at a glance, newest first."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import Any, Protocol

from markupsafe import Markup

from auditor.records.errors import Exit
from auditor.report.numbers import figure as shown_figure
from auditor.report.statement import published_name
from auditor.report.templates import environment, source

_FIGURES = ("gross", "net", "heat", "total")
_STATUS_WORDS = {
    Exit.FIRM: "firm",
    Exit.PROVISIONAL: "provisional",
    Exit.LOOK: "a person must look",
}


class PublishedMonth(Protocol):
    """What the index needs of a published month."""

    @property
    def month(self) -> str:
        """Label of the month, also the name of its folder."""

    @property
    def exit_code(self) -> int:
        """Exit code it was published with."""

    @property
    def statement(self) -> Mapping[str, Any]:
        """The content of its statement.json."""


def render_index(site_name: str, months: Iterable[PublishedMonth]) -> str:
    """Render the page that links all months of a site, with each machine's efficiencies."""
    ordered = sorted(months, key=lambda entry: entry.month, reverse=True)
    return (
        environment()
        .get_template("index.html")
        .render(
            site_name=site_name,
            style=Markup(source("report.css")),
            months=[_month(entry) for entry in ordered],
        )
    )


def _month(entry: PublishedMonth) -> dict[str, Any]:
    machines = entry.statement["machines"]
    return {
        "label": entry.month,
        "status": _STATUS_WORDS[Exit(entry.exit_code)],
        "unfinished": entry.statement["period"]["unfinished"],
        "machines": [_machine(machine) for machine in machines.values()],
    }


def _machine(machine: Mapping[str, Any]) -> dict[str, Any]:
    figures = [
        {"title": figure["title"], "text": _figure_text(key, figure), "basis": figure["basis"]}
        for key in _FIGURES
        if (figure := machine["figures"].get(published_name(key)[0])) is not None
    ]
    hours = machine["hours_by_verdict"]["impossible"]
    return {
        "title": machine["title"],
        "figures": figures,
        "closure": machine["closure"],
        "impossible": f"{hours:g} h" if hours else "none",
    }


def _figure_text(key: str, figure: Mapping[str, Any]) -> str:
    if figure["value"] is None:
        return "withheld"
    factor = published_name(key)[2]
    U = figure["U"] if figure["U"] is not None else float("nan")
    return shown_figure(key, figure["value"] / factor, U / factor).text
