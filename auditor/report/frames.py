"""The tables of a result as pandas DataFrames, for whoever goes on from Python."""

from __future__ import annotations

from typing import TYPE_CHECKING

from auditor.report.statement import statement
from auditor.report.tables import interval_columns

if TYPE_CHECKING:
    import pandas as pd

    from auditor.records.result import AuditResult


def interval_frame(result: AuditResult) -> pd.DataFrame:
    """All intervals of all machines, with the columns of intervals.csv, numbers unrounded.

    ``start`` and ``end`` are instants in the site's time zone.
    """
    import pandas as pd

    frame = pd.DataFrame(interval_columns(result))
    for end in ("start", "end"):
        instants = pd.to_datetime(frame[end], utc=True, format="ISO8601")
        frame[end] = instants.dt.tz_convert(result.period.zone)
    return frame


def period_frame(result: AuditResult) -> pd.DataFrame:
    """Every figure of the period: one row per machine and figure, as statement.json has them."""
    import pandas as pd

    rows = [
        {"machine": machine, "figure": figure, **entry}
        for machine, content in statement(result)["machines"].items()
        for figure, entry in content["figures"].items()
    ]
    return pd.DataFrame(rows)
