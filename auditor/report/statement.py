"""statement.json and findings.json: every published figure and finding for other programs."""

from __future__ import annotations

import json
import math
from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

from auditor.records.nomenclature import TERMS
from auditor.records.verdicts import Status
from auditor.report.tables import local_iso

if TYPE_CHECKING:
    from auditor.records.balances import MachineBalance, PeriodFigure
    from auditor.records.findings import Finding
    from auditor.records.machines import Machine
    from auditor.records.result import AuditResult

_DISPLAY = {
    "power": ("W", "kW", 1e-3),
    "energy": ("J", "kWh", 1.0 / 3.6e6),
    "fraction": ("", "pct", 100.0),
    "temperature": ("K", "K", 1.0),
    "temperature difference": ("K", "K", 1.0),
    "entropy rate": ("W_per_K", "kW_per_K", 1e-3),
}
_UNIT_WORDS = {"pct": "%", "kW_per_K": "kW/K"}


def published_name(key: str) -> tuple[str, str, float]:
    """Name, unit and factor under which a figure of the nomenclature is published.

    Returns
    -------
    (name, unit, factor)
        ``fuel_in_J`` becomes ``("fuel_in_kWh", "kWh", 1/3.6e6)``, ``gross`` becomes
        ``("gross_pct", "%", 100.0)``.
    """
    si, suffix, factor = _DISPLAY[TERMS[key].quantity]
    stem = key.removesuffix(f"_{si}") if si else key
    return f"{stem}_{suffix}", _UNIT_WORDS.get(suffix, suffix), factor


def statement(result: AuditResult) -> dict[str, Any]:
    """Every figure of every machine with value, U, unit, basis, coverage and status."""
    period = result.period
    start, end = local_iso((period.start_us, period.end_us), period.zone)
    return {
        "program": "auditor",
        "version": result.version,
        "site": result.plant.site.name,
        "period": {
            "label": period.label,
            "start": start,
            "end": end,
            "zone": period.zone,
            "hours": period.seconds / 3600.0,
            "unfinished": period.unfinished,
        },
        "plant_file_sha256": result.plant_sha256,
        "exit_code": int(result.status),
        "status": result.status.name.lower(),
        "uncertainty": "expanded, k = 2, about 95 %",
        "rules": {
            name: getattr(result.plant.rules, name) for name in result.plant.rules.__dataclass_fields__
        },
        "machines": {name: _machine(result, name) for name in result.balances},
        "inputs": [
            {"file": note.file, "bytes": note.bytes, "sha256": note.sha256, "export": note.export}
            for note in result.notes
        ],
    }


def _machine(result: AuditResult, name: str) -> dict[str, Any]:
    machine, balance, judgement = result.plant.machines[name], result.balances[name], result.judgements[name]
    return {
        "title": machine.title,
        "kind": machine.kind,
        "headline": machine.headline,
        "ceiling_kind": machine.ceiling.kind.value if machine.ceiling else "none",
        "closure": balance.closure.value,
        "impossible_period": judgement.impossible_period,
        "interval_minutes": balance.interval_s / 60.0,
        "running_h": balance.running_s / 3600.0,
        "stopped_h": balance.stopped_s / 3600.0,
        "unknown_h": balance.unknown_s / 3600.0,
        "hours_by_verdict": dict(judgement.hours),
        "figures": {
            published_name(key)[0]: _figure(key, figure, machine) for key, figure in balance.period.items()
        },
        "largest_influences": _influences(balance),
    }


def _figure(key: str, figure: PeriodFigure, machine: Machine) -> dict[str, Any]:
    _, unit, factor = published_name(key)
    withheld = figure.status is Status.WITHHELD
    entry = {
        "title": TERMS[key].title,
        "value": None if withheld else _number(figure.value * factor),
        "U": None if withheld else _number(figure.expanded_U * factor),
        "unit": unit,
        "basis": _basis(key, machine),
        "coverage_pct": _number(figure.coverage * 100.0),
        "status": figure.status.value,
        "withheld_because": figure.withheld_because or None,
    }
    if TERMS[key].quantity == "energy":
        entry["logged"] = _number(figure.logged * factor)
        entry["common"] = _number(figure.common * factor)
    return entry


def _basis(key: str, machine: Machine) -> str:
    if key.startswith("fuel_in_lower"):
        return "lower heating value"
    if key.startswith("fuel_in_higher"):
        return "higher heating value"
    if machine.basis is None:
        return "heat input" if TERMS[key].quantity == "fraction" else "as metered"
    return f"{machine.basis} heating value"


def _influences(balance: MachineBalance) -> dict[str, Any]:
    ranked = {}
    for key, contributions in balance.contributions.items():
        name, _, factor = published_name(key)
        ranked[name] = [
            {
                "source": contribution.source,
                "change": _number(contribution.change * factor),
                "share_pct": _number(contribution.share * 100.0),
            }
            for contribution in contributions[:5]
        ]
    return ranked


def _number(number: float) -> float | None:
    """Twelve significant digits; null for what is not known (JSON has no NaN)."""
    return float(f"{number:.12g}") if math.isfinite(number) else None


def statement_json(result: AuditResult) -> bytes:
    """Write statement.json."""
    return _json(statement(result))


def _json(content: object) -> bytes:
    return (json.dumps(content, indent=1, ensure_ascii=False, allow_nan=False) + "\n").encode()


def finding_entry(finding: Finding, zone: str) -> dict[str, Any]:
    """One finding: codes, place, time in the site's clock, size and numbers."""
    stamps = [None if us is None else local_iso((us,), zone)[0] for us in (finding.start_us, finding.end_us)]
    return {
        "code": finding.code.value,
        "machine": finding.machine,
        "stream": finding.stream,
        "tag": finding.tag,
        "export": finding.export,
        "file": finding.file,
        "line": finding.line,
        "from": stamps[0],
        "until": stamps[1],
        "energy_kWh": None if finding.energy_J is None else _number(finding.energy_J / 3.6e6),
        "suspects": list(finding.suspects),
        "numbers": _numbers(finding.numbers),
        "words": dict(sorted(finding.words.items())),
    }


def _numbers(numbers: Mapping[str, float]) -> dict[str, float | None]:
    return {name: _number(value) for name, value in sorted(numbers.items())}


def findings_json(result: AuditResult) -> bytes:
    """Write findings.json, most important first, each with the words of the report."""
    from auditor.report.wording.findings import finding_sentences

    entries = []
    for finding in result.findings:
        title, sentence, check = finding_sentences(finding, result.plant)
        entry = finding_entry(finding, result.period.zone)
        entries.append({"title": title, "text": sentence, "check": check, **entry})
    return _json(entries)
