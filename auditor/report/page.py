"""The whole statement as one HTML file that needs nothing else."""

from __future__ import annotations

import json

from markupsafe import Markup

from auditor.records.result import AuditResult
from auditor.report.charts.style import BASE_LAYOUT, CONFIG
from auditor.report.plotting_script import digest, plotting_script
from auditor.report.sections import inputs, ledgers, method
from auditor.report.sections.machine import MachineView, machine_view
from auditor.report.sections.summary import summary
from auditor.report.sections.worked import worked_interval
from auditor.report.templates import environment, source
from auditor.report.wording.cautions import CAUTIONS
from auditor.report.wording.findings import finding_sentences


def render_report(result: AuditResult) -> str:
    """Write the statement of one audit.

    Parameters
    ----------
    result : AuditResult

    Returns
    -------
    str
        A self-contained HTML page: styles, pictures and scripts inside, no request to anywhere. The same
        result gives the same text.

    Raises
    ------
    AuditorError
        If the folder of templates is missing from the installation.
    """
    machines = tuple(
        machine_view(number, result.plant.machines[name], result)
        for number, name in enumerate(result.balances, start=1)
    )
    boot = source("boot.js")
    script = plotting_script()
    return (
        environment()
        .get_template("report.html")
        .render(
            summary=summary(result),
            machines=machines,
            findings=tuple(finding_sentences(finding, result.plant) for finding in result.findings),
            ledger=_ledger(result),
            files=_files(result),
            method=_method(result),
            worked=worked_interval(result),
            cautions=CAUTIONS,
            plant_text=result.plant.whole_text,
            plant_sha256=result.plant_sha256,
            input_sha256=inputs.input_digest(result.notes),
            version=result.version,
            style=Markup(source("report.css")),
            boot=Markup(boot),
            plotting=script,
            charts=_embedded(machines),
            policy=_policy(script.digest, digest(boot)),
        )
    )


def _ledger(result: AuditResult) -> dict[str, object]:
    return {
        "cells": ledgers.cell_table(result),
        "meanings": ledgers.disposition_meanings(result),
        "seconds": ledgers.second_table(result),
        "examples": ledgers.example_table(result),
        "words": ledgers.word_table(result),
    }


def _files(result: AuditResult) -> dict[str, object]:
    return {
        "exports": inputs.exports(result),
        "unclaimed_files": inputs.unclaimed_files(result),
        "unclaimed_columns": inputs.unclaimed_columns(result),
    }


def _method(result: AuditResult) -> dict[str, object]:
    return {
        "equations": method.equations(result),
        "assumptions": method.assumption_table(result),
        "heating_values": method.heating_value_table(result),
        "rules": method.rule_table(result),
        "names": method.nomenclature_table(result),
    }


def _policy(*digests: str) -> str:
    """Content policy: nothing is fetched, and only the scripts of this page run."""
    scripts = " ".join(f"'{name}'" for name in digests)
    return f"default-src 'none'; script-src {scripts}; style-src 'unsafe-inline'; img-src data: blob:"


def _embedded(machines: tuple[MachineView, ...]) -> Markup:
    """All charts as JSON that cannot end its own element."""
    figures = {
        picture.id: picture.chart
        for machine in machines
        for picture in machine.pictures
        if picture.chart is not None
    }
    text = json.dumps(
        {"config": CONFIG, "layout": BASE_LAYOUT, "figures": figures},
        ensure_ascii=True,
        allow_nan=False,
        separators=(",", ":"),
    )
    return Markup(text.replace("<", "\\u003c").replace(">", "\\u003e").replace("&", "\\u0026"))
