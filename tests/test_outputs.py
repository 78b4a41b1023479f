"""Tables, statement, terminal texts and the index: complete, inert, and the same figures everywhere."""

from __future__ import annotations

import csv
import io
import json
import math

import numpy as np
import pandas as pd
import pytest
from report_factory import make_result

import auditor
from auditor.history import PastAudit
from auditor.records.errors import Exit
from auditor.records.result import AuditResult
from auditor.records.verdicts import Status
from auditor.report.index import render_index
from auditor.report.statement import findings_json, published_name, statement, statement_json
from auditor.report.tables import (
    INTERVAL_COLUMNS,
    defused,
    dispositions_csv,
    intervals_csv,
    intervals_parquet,
    local_iso,
    number_text,
)
from auditor.report.terminal import audit_summary


@pytest.fixture(scope="module")
def result() -> AuditResult:
    """A month with withheld figures, impossible intervals, and hostile names."""
    return make_result()


def rows_of(content: bytes) -> list[dict[str, str]]:
    """A CSV file as rows by heading."""
    return list(csv.DictReader(io.StringIO(content.decode())))


def test_intervals_have_every_column_and_every_interval(result: AuditResult) -> None:
    """One row per machine and interval, in the columns that were promised."""
    rows = rows_of(intervals_csv(result))
    assert tuple(rows[0]) == INTERVAL_COLUMNS
    assert len(rows) == sum(balance.interval.start_us.size for balance in result.balances.values())


def test_parquet_and_csv_hold_the_same_table(result: AuditResult) -> None:
    """Numbers agree to the digits of the text; unknown is empty here and NaN there."""
    rows = rows_of(intervals_csv(result))
    frame = pd.read_parquet(io.BytesIO(intervals_parquet(result)))
    assert tuple(frame.columns) == INTERVAL_COLUMNS
    for name in ("machine", "start", "verdict", "reasons"):
        assert [defused(text) for text in frame[name]] == [row[name] for row in rows]
    for name in ("coverage_pct", "gross_pct", "margin_U_pct"):
        texts = np.array([float(row[name]) if row[name] else math.nan for row in rows])
        np.testing.assert_allclose(frame[name], texts, rtol=1e-9)


def test_frames_for_python_agree_with_the_files(result: AuditResult) -> None:
    """The DataFrames are the same tables with real instants."""
    frame = auditor.interval_frame(result)
    assert tuple(frame.columns) == INTERVAL_COLUMNS
    assert str(frame["start"].dt.tz) == result.period.zone
    figures = auditor.period_frame(result)
    assert set(figures["machine"]) == set(result.balances)


@pytest.mark.parametrize(
    ("text", "safe"),
    [
        ("=1+1", "'=1+1"),
        ("+49", "'+49"),
        ("-x", "'-x"),
        ("@a", "'@a"),
        ("\tx", "'\tx"),
        ("a=b", "a=b"),
        ("", ""),
    ],
)
def test_no_text_cell_starts_a_formula(text: str, safe: str) -> None:
    """Spreadsheets run cells that begin so; an apostrophe makes them text."""
    assert defused(text) == safe


def test_stamps_carry_the_offset_of_their_season() -> None:
    """Both passes of the repeated autumn hour can be told apart."""
    summer, winter = local_iso((1_761_438_600_000_000, 1_761_442_200_000_000), "Europe/Copenhagen")
    assert (summer, winter) == ("2025-10-26T02:30:00+02:00", "2025-10-26T02:30:00+01:00")


def test_numbers_have_ten_digits_and_unknown_is_empty() -> None:
    """Nothing pretends to be zero."""
    assert number_text(1 / 3) == "0.3333333333"
    assert number_text(math.nan) == number_text(math.inf) == ""


def test_statement_has_each_figure_with_its_uncertainty_and_standing(result: AuditResult) -> None:
    """A withheld figure has no value and says why; JSON holds no NaN."""
    content = json.loads(statement_json(result), parse_constant=pytest.fail)
    for name, balance in result.balances.items():
        figures = content["machines"][name]["figures"]
        assert len(figures) == len(balance.period)
        for key, figure in balance.period.items():
            entry = figures[published_name(key)[0]]
            assert {"value", "U", "unit", "basis", "coverage_pct", "status"} <= set(entry)
            if figure.status is Status.WITHHELD:
                assert entry["value"] is None
                assert entry["withheld_because"]


def test_names_carry_their_unit() -> None:
    """Display units of the published names (1 kWh is 3.6 MJ by definition)."""
    assert published_name("fuel_in_J") == ("fuel_in_kWh", "kWh", pytest.approx(1 / 3.6e6))
    assert published_name("gross") == ("gross_pct", "%", 100.0)
    assert published_name("entropy_generation_W_per_K")[:2] == ("entropy_generation_kW_per_K", "kW/K")


def test_findings_come_with_words_and_codes(result: AuditResult) -> None:
    """Each finding has its title, what was seen, and the one check that settles it."""
    entries = json.loads(findings_json(result))
    assert len(entries) == len(result.findings)
    assert all(entry["title"] and entry["text"] and entry["check"] and entry["code"] for entry in entries)


def test_both_ledgers_are_written_out(result: AuditResult) -> None:
    """The dispositions of a tag add up to its raw cells, the seconds to the period."""
    rows = rows_of(dispositions_csv(result))
    for tag in result.ticks.cells.tags:
        cells = [row for row in rows if row["ledger"] == "cells" and row["tag"] == defused(tag)]
        parts = [int(row["amount"]) for row in cells if row["kind"] != "all raw cells"]
        (whole,) = (int(row["amount"]) for row in cells if row["kind"] == "all raw cells")
        assert sum(parts) == whole
        seconds = [
            float(row["amount"]) for row in rows if row["ledger"] == "seconds" and row["tag"] == defused(tag)
        ]
        assert sum(seconds) == pytest.approx(result.period.seconds)


def test_the_summary_names_the_report_and_the_headlines(result: AuditResult) -> None:
    """What the command prints tells where the report lies and what stands in it."""
    text = audit_summary(result, "site/audit/2026-07/report.html")
    assert text.startswith("Report: site/audit/2026-07/report.html\n")
    for machine in result.plant.machines.values():
        assert machine.title in text


def test_the_index_lists_months_newest_first_and_is_inert(result: AuditResult) -> None:
    """Names are escaped, every month links its report, nothing is fetched."""
    figures = statement(result)
    figures["machines"]["extra"] = figures["machines"][next(iter(result.balances))] | {
        "title": "<script>x</script>"
    }
    months = [PastAudit(label, "", "", int(Exit.FIRM), {}, figures) for label in ("2026-06", "2026-07")]
    page = render_index("<b>Works</b>", months)
    assert page.index('href="2026-07/report.html"') < page.index('href="2026-06/report.html"')
    assert "<script>" not in page and "<b>Works" not in page
    assert "http:" not in page and "https:" not in page
