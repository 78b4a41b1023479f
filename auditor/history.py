"""What earlier runs published: one append-only register per site, in SQLite.

The register holds digests, statuses and figures, never a clock of the run: the run log has that. It
uses a rollback journal with full synchronisation, since the folder may lie on a network share.
"""

from __future__ import annotations

import json
import sqlite3
from collections.abc import Iterator, Mapping, Sequence
from contextlib import closing, contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Protocol

from auditor.records.errors import Fault, InputOutputError

HISTORY = "history.sqlite"

_TABLE = """
CREATE TABLE IF NOT EXISTS audits (
    number INTEGER PRIMARY KEY,
    month TEXT NOT NULL,
    content_key TEXT NOT NULL,
    version TEXT NOT NULL,
    exit_code INTEGER NOT NULL,
    outputs TEXT NOT NULL,
    statement TEXT NOT NULL
)
"""

_RESTATEMENTS = """
CREATE TABLE IF NOT EXISTS restatements (
    audit INTEGER NOT NULL REFERENCES audits (number),
    month TEXT NOT NULL,
    reasons TEXT NOT NULL,
    machine TEXT,
    figure TEXT,
    unit TEXT,
    old REAL,
    new REAL,
    old_status TEXT,
    new_status TEXT
)
"""
"""One row for each headline figure that an audit changed; where it changed none, one row without a figure."""


class ChangedFigure(Protocol):
    """A headline figure before and after; a value is None while it is withheld."""

    @property
    def row(self) -> tuple[str, str, str, float | None, float | None, str, str]:
        """Machine, figure, unit, old and new value, old and new status."""


class Changes(Protocol):
    """What an audit changed of the one before."""

    @property
    def reasons(self) -> Sequence[str]:
        """Which inputs changed, in plain words."""

    @property
    def figures(self) -> Sequence[ChangedFigure]:
        """Headline figures that changed."""


@dataclass(frozen=True)
class PastAudit:
    """One published audit of one month."""

    month: str
    content_key: str
    """Digest of the inputs, the plant's slice and the program version that it was made from."""
    version: str
    exit_code: int
    outputs: Mapping[str, str]
    """SHA-256 by file name."""
    statement: Mapping[str, Any]
    """The figures of statement.json."""


@contextmanager
def _opened(path: Path) -> Iterator[sqlite3.Connection]:
    try:
        with closing(sqlite3.connect(path, isolation_level=None, timeout=10.0)) as connection:
            connection.execute("PRAGMA journal_mode = DELETE")
            connection.execute("PRAGMA synchronous = FULL")
            yield connection
    except sqlite3.Error as error:
        raise InputOutputError(
            [
                Fault(
                    str(path),
                    f"the history cannot be used: {error}",
                    "check the disk and the folder's rights; if the file is damaged, move it away and run "
                    "again: the months are then audited anew",
                )
            ]
        ) from error


def read_past(folder: Path) -> dict[str, PastAudit]:
    """Read the latest published audit of every month; empty where there is no history yet."""
    path = folder / HISTORY
    if not path.is_file():
        return {}
    with _opened(path) as connection:
        connection.execute(_TABLE)
        rows = connection.execute(
            "SELECT month, content_key, version, exit_code, outputs, statement FROM audits ORDER BY number"
        ).fetchall()
    return {
        month: PastAudit(month, key, version, code, json.loads(outputs), json.loads(figures))
        for month, key, version, code, outputs, figures in rows
    }


def append(folder: Path, audit: PastAudit, changes: Changes | None = None) -> None:
    """Append one published audit and what it changed, unless it is the same as the month's latest."""
    if read_past(folder).get(audit.month) == audit:
        return
    with _opened(folder / HISTORY) as connection:
        # Immediate: a deferred transaction that reads first may be refused at the write.
        connection.execute("BEGIN IMMEDIATE")
        connection.execute(_TABLE)
        connection.execute(_RESTATEMENTS)
        number = connection.execute(
            "INSERT INTO audits (month, content_key, version, exit_code, outputs, statement) "
            "VALUES (?, ?, ?, ?, ?, ?)",
            (
                audit.month,
                audit.content_key,
                audit.version,
                audit.exit_code,
                json.dumps(audit.outputs, sort_keys=True),
                json.dumps(audit.statement, sort_keys=True),
            ),
        ).lastrowid
        if changes is not None:
            reasons = json.dumps(list(changes.reasons), ensure_ascii=False)
            rows: list[tuple[str | float | None, ...]] = [figure.row for figure in changes.figures]
            connection.executemany(
                "INSERT INTO restatements VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?)",
                [(number, audit.month, reasons, *row) for row in rows or [(None,) * 7]],
            )
        connection.execute("COMMIT")
