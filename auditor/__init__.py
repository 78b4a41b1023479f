"""Turn a month of plant-logger CSV exports into a statement that a person can sign.

From Python::

    result = auditor.audit("SITE", month="2026-07")
    auditor.interval_frame(result)  # a DataFrame with the columns of intervals.csv
    auditor.period_frame(result)  # a DataFrame of every figure of the period
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING

__version__ = "0.1.0"
__all__ = ["__version__", "audit", "interval_frame", "period_frame"]

if TYPE_CHECKING:
    from auditor.audit_run import audit
    from auditor.report.frames import interval_frame, period_frame

_HOMES = {
    "audit": "auditor.audit_run",
    "interval_frame": "auditor.report.frames",
    "period_frame": "auditor.report.frames",
}


def __getattr__(name: str) -> object:
    # These pull in numpy and more; a bare `import auditor` (and `auditor --help`) must stay quick.
    if name in _HOMES:
        return getattr(import_module(_HOMES[name]), name)
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
