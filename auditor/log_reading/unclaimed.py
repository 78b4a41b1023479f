"""Files below ``logs/`` that no export claims, as findings."""

from __future__ import annotations

from auditor.log_reading.listing import Listing, StoredFile
from auditor.records.findings import Finding, FindingCode

_FOLDER_OF_MANY = 3
"""So many unclaimed files of one folder are told as one."""


def unclaimed_files(listing: Listing) -> list[Finding]:
    """Files that no pattern claims: one finding each, or one for a folder of many."""
    folders: dict[str, list[StoredFile]] = {}
    for stored in listing.unclaimed:
        if not stored.set_aside:
            folders.setdefault(stored.path.rpartition("/")[0], []).append(stored)
    findings = []
    for folder, stored_files in folders.items():
        if len(stored_files) <= _FOLDER_OF_MANY:
            findings += [
                Finding(
                    FindingCode.UNCLAIMED_FILE, file=stored.path, numbers={"count": 1, "bytes": stored.bytes}
                )
                for stored in stored_files
            ]
            continue
        names = [stored.path.rpartition("/")[2] for stored in stored_files]
        numbers = {"count": len(names), "bytes": sum(stored.bytes for stored in stored_files)}
        words = {"first": names[0], "last": names[-1]}
        findings.append(Finding(FindingCode.UNCLAIMED_FILE, file=f"{folder}/", numbers=numbers, words=words))
    return findings
