"""From a result to files: the set of outputs of one audit, written whole, and its entry in the history."""

from __future__ import annotations

import hashlib
from pathlib import Path

from auditor.history import PastAudit, append, read_past
from auditor.records.result import AuditResult
from auditor.report.index import render_index
from auditor.report.page import render_report
from auditor.report.statement import findings_json, statement, statement_json
from auditor.report.tables import dispositions_csv, intervals_csv, intervals_parquet
from auditor.restating import Restatement, restatement
from auditor.site_folder import write_outputs

REPORT = "report.html"
INDEX = "index.html"


def outputs_of(result: AuditResult) -> dict[str, bytes]:
    """All files of one audit by name; the report last, so that it is the last to be replaced."""
    return {
        "intervals.csv": intervals_csv(result),
        "intervals.parquet": intervals_parquet(result),
        "dispositions.csv": dispositions_csv(result),
        "findings.json": findings_json(result),
        "statement.json": statement_json(result),
        REPORT: render_report(result).encode(),
    }


def publish(result: AuditResult, folder: Path) -> dict[str, str]:
    """Write all outputs of one audit into a folder; return their SHA-256 by name."""
    outputs = outputs_of(result)
    write_outputs(folder, outputs)
    return {name: hashlib.sha256(content).hexdigest() for name, content in outputs.items()}


def publish_index(site_name: str, audit_folder: Path) -> None:
    """Write index.html from the history, where there is one."""
    past = read_past(audit_folder)
    if past:
        write_outputs(audit_folder, {INDEX: render_index(site_name, past.values()).encode()})


def publish_month(result: AuditResult, audit_folder: Path, content_key: str) -> Restatement | None:
    """Publish a calendar month below a site's audit folder: its outputs, its history entry, the index.

    Returns
    -------
    Restatement or None
        What changed, where the month had been published otherwise before.
    """
    label = result.period.label
    before = read_past(audit_folder).get(label)
    audit = PastAudit(
        month=label,
        content_key=content_key,
        version=result.version,
        exit_code=int(result.status),
        outputs=publish(result, audit_folder / label),
        statement=statement(result),
    )
    restated = None
    if before is not None and before != audit:
        restated = restatement(before.statement, audit.statement, result)
    append(audit_folder, audit, restated)
    publish_index(result.plant.site.name, audit_folder)
    return restated
