"""What each command does, and what it prints; imported once the command is known."""

from __future__ import annotations

import argparse
import json
import re
import shutil
import sys
from datetime import date
from pathlib import Path

from auditor.audit_run import OpenedSite, audit_opened, check, open_site
from auditor.drafting import Draft, draft_entries, draft_plant, draft_text
from auditor.log_reading import hash_files
from auditor.nightly import content_key, nightly
from auditor.plant_file import plant_schema
from auditor.progress import shown_progress
from auditor.publishing import REPORT, publish, publish_month
from auditor.records.errors import Exit, Fault, InputOutputError, UsageError, worst
from auditor.records.result import AuditResult
from auditor.report.statement import statement
from auditor.report.terminal import audit_summary, check_json, check_text
from auditor.resources import folder as shipped_folder
from auditor.site_folder import AUDIT, LOGS, append_run_log, locked, require_site


def _out(text: str) -> None:
    sys.stdout.write(text if text.endswith("\n") else text + "\n")


def _date(text: str | None, option: str) -> date | None:
    if text is None:
        return None
    try:
        return date.fromisoformat(text)
    except ValueError:
        raise UsageError([Fault(option, f'"{text}" is not a date', "write it as YYYY-MM-DD")]) from None


def run_audit(options: argparse.Namespace) -> int:
    """``auditor audit``: one site, one period, one report."""
    if options.month is not None and not re.fullmatch(r"\d{4}-(0[1-9]|1[0-2])", options.month):
        raise UsageError([Fault("--month", f'"{options.month}" is not a month', "write it as YYYY-MM")])
    start, end = _date(options.start, "--from"), _date(options.end, "--to")
    site: Path = options.site
    target: Path = options.out if options.out is not None else site / AUDIT
    require_site(site)
    with locked(target), shown_progress(quiet=options.quiet) as progress:
        opened = open_site(site)
        result = audit_opened(opened, month=options.month, start=start, end=end, progress=progress)
        progress("writing the report", 0.97)
        report = _published(result, opened, options.out)
    _tell(result, report, as_json=options.json)
    return int(result.status)


def _published(result: AuditResult, opened: OpenedSite, out: Path | None) -> Path:
    """Write the outputs; into the site's own folder also the history, the index and the run log."""
    if out is not None:
        publish(result, out)
        return out / REPORT
    site, label = opened.plant.folder, result.period.label
    restated = None
    if re.fullmatch(r"\d{4}-\d{2}", label):
        key = content_key(opened, result.period, hash_files(site / LOGS))
        restated = publish_month(result, site / AUDIT, key)
    else:
        publish(result, site / AUDIT / label)
    more = [] if restated is None else restated.lines(label)
    append_run_log(site / AUDIT, [f"{label} audited, exit {int(result.status)}", *more])
    return site / AUDIT / label / REPORT


def _tell(result: AuditResult, report: Path, *, as_json: bool) -> None:
    if as_json:
        _out(
            json.dumps({"report": str(report), "statement": statement(result)}, indent=1, ensure_ascii=False)
        )
    else:
        _out(audit_summary(result, str(report)))


def run_check(options: argparse.Namespace) -> int:
    """``auditor check``: what was recognised, what is bound, what nobody claims."""
    if options.schema:
        _out(json.dumps(plant_schema(), indent=2))
        return int(Exit.FIRM)
    if options.site is None:
        raise UsageError(
            [Fault("check", "no site was named", "name the folder that holds plant.toml and logs/")]
        )
    opened = open_site(options.site)
    with shown_progress(quiet=options.quiet) as progress:
        checked = check(opened, progress)
    _out(check_json(checked) if options.json else check_text(checked))
    return int(Exit.FIRM)


def run_draft(options: argparse.Namespace) -> int:
    """``auditor draft``: a first plant file, with a blank for everything that exports do not prove."""
    logs, target = options.logs, options.out
    if not logs.is_dir():
        raise UsageError([Fault(str(logs), "there is no such folder", "name the folder of the exports")])
    if target is not None and target.exists():
        raise UsageError(
            [Fault(str(target), "this file exists, and a draft never writes over one", "name a new file")]
        )
    # Patterns of the plant file are below logs/, also where the site's folder was named.
    draft = draft_plant(logs / LOGS if (logs / LOGS).is_dir() else logs)
    text = draft_text(draft)
    if target is not None:
        try:
            with target.open("x", encoding="utf-8", newline="\n") as stream:
                stream.write(text)
        except OSError as error:
            raise InputOutputError(
                [
                    Fault(
                        str(target),
                        f"it cannot be written: {error.strerror}",
                        "name a file in a folder that exists and that you may write to",
                    )
                ]
            ) from error
    if options.json:
        _out(json.dumps({**draft_entries(draft), "plant_file": text}, indent=1, ensure_ascii=False))
    elif target is None:
        _out(text)
    if not options.quiet:
        _tell_of_draft(draft)
    return int(Exit.FIRM)


def _tell_of_draft(draft: Draft) -> None:
    for path, reason in draft.skipped:
        sys.stderr.write(f"skipped {path}: {reason}\n")
    files = sum(export.count for export in draft.exports)
    tags = sum(len(export.tags) for export in draft.exports)
    sys.stderr.write(
        f"{len(draft.exports)} kinds of export in {files} files, {tags} tags proposed;"
        ' fill the lines that begin with "#?", then run auditor check SITE\n'
    )


def run_demo(options: argparse.Namespace) -> int:
    """``auditor demo``: lay out a demo site, and audit it if asked to."""
    samples = shipped_folder("sample_logs")
    names = sorted(path.parent.name for path in samples.glob("*/plant.toml"))
    if options.name not in names:
        raise UsageError(
            [Fault("demo", f'there is no demo site "{options.name}"', f"choose one of: {', '.join(names)}")]
        )
    target: Path = options.folder
    if target.exists() and (not target.is_dir() or any(target.iterdir())):
        raise UsageError([Fault(str(target), "the folder is not empty", "name a new or an empty folder")])
    shutil.copytree(samples / options.name / LOGS, target / LOGS)
    shutil.copyfile(samples / options.name / "plant.toml", target / "plant.toml")
    if not options.audit:
        _out(f"{target / 'plant.toml'}\n{target / LOGS}")
        return int(Exit.FIRM)
    with locked(target / AUDIT), shown_progress(quiet=options.quiet) as progress:
        opened = open_site(target)
        result = audit_opened(opened, progress=progress)
        progress("writing the report", 0.97)
        report = _published(result, opened, None)
    _tell(result, report, as_json=options.json)
    return int(Exit.FIRM)


def run_nightly(options: argparse.Namespace) -> int:
    """``auditor nightly``: every month whose content changed, of one or many sites."""

    def say(line: str) -> None:
        if not options.quiet:
            sys.stderr.write(line + "\n")

    runs = nightly(options.sites, say)
    if options.json:
        entries = [
            {
                "site": run.site,
                "exit_code": int(run.status),
                "failure": run.failure or None,
                "months": [
                    {"month": month.month, "action": month.action, "exit_code": int(month.status)}
                    for month in run.months
                ],
            }
            for run in runs
        ]
        _out(json.dumps(entries, indent=1, ensure_ascii=False))
    if options.quiet:
        for run in runs:
            if run.failure:
                sys.stderr.write(f"{run.site}: {run.failure}\n")
    return int(worst(run.status for run in runs))
