"""Every code has its words, and the words keep what the statement promises."""

from __future__ import annotations

from typing import get_args

import pytest
from report_factory import make_findings
from report_plant import HOSTILE, START_US, make_plant

from auditor.records.errors import Exit
from auditor.records.findings import Finding, FindingCode
from auditor.records.machines import CeilingKind, Role, Way
from auditor.records.plant import Rules
from auditor.records.samples import Disposition
from auditor.records.ticks import SecondKind
from auditor.records.verdicts import Closure, Reason, Status, Verdict
from auditor.report.charts.style import MARKS
from auditor.report.wording import cautions, ledgers, methods, names, verdicts
from auditor.report.wording.findings import WRITERS, finding_sentences, first_things

PLANT = make_plant()


@pytest.mark.parametrize(
    ("codes", "words"),
    [
        (FindingCode, WRITERS),
        (Verdict, verdicts.MEANINGS),
        (Verdict, MARKS),
        (Reason, verdicts.REASONS),
        (Status, verdicts.STATUSES),
        (Closure, verdicts.CLOSURES),
        (Disposition, ledgers.DISPOSITIONS),
        (SecondKind, ledgers.SECONDS),
        (Role, names.ROLES),
        (CeilingKind, methods.CEILINGS),
        (get_args(Way), methods.WAYS),
        ((Exit.FIRM, Exit.PROVISIONAL, Exit.LOOK), verdicts.OVERALL),
    ],
)
def test_every_code_has_its_words(codes: object, words: dict[object, object]) -> None:
    """A code without words could never be shown to a person."""
    assert set(codes) == set(words)  # type: ignore[call-overload]


@pytest.mark.parametrize("finding", make_findings(), ids=lambda finding: finding.code.value)
def test_every_finding_reads_as_sentences(finding: Finding) -> None:
    """Title, sentence and check stand even where a room gave no more than the code."""
    text = finding_sentences(finding, PLANT)
    for part in text:
        assert part[0].isupper() or not part[0].isalpha()
        assert "  " not in part and " ." not in part and " ," not in part
        assert "None" not in part and "nan" not in part.split()
    assert text.sentence.endswith(".") and text.check.endswith(".")


def test_a_finding_tells_time_size_and_suspects() -> None:
    """The impossible cluster of the made-up month, told with its own numbers."""
    text = finding_sentences(make_findings()[0], PLANT)
    assert "40\u00a0intervals from 6\u00a0Jul, 00:00 to 10:00 break" in text.sentence
    assert "2\u202f610\u00a0kWh" in text.sentence  # 9.4 GJ / 3.6 MJ per kWh
    assert text.check.endswith(f"Suspect first: oil_flow (column TO-F) and {HOSTILE} (column =1+1).")


def test_one_interval_breaks_and_two_break() -> None:
    """Verbs agree with their number."""
    one, two = (
        finding_sentences(
            Finding(FindingCode.IMPOSSIBLE_CLUSTER, machine="orc", numbers={"count": count}), PLANT
        )
        for count in (1.0, 2.0)
    )
    assert "1\u00a0interval breaks" in one.sentence
    assert "2\u00a0intervals break" in two.sentence


def test_values_are_told_in_the_unit_of_the_export() -> None:
    """A frozen 345.15 K is the 72 degrees Celsius that the person finds in the file."""
    finding = Finding(
        FindingCode.FROZEN,
        tag="hot_return",
        start_us=START_US,
        end_us=START_US + 31 * 3_600_000_000,
        numbers={"value_SI": 345.15},
    )
    assert "72.00\u00a0°C" in finding_sentences(finding, PLANT).sentence


def test_first_things_name_each_kind_of_trouble_once() -> None:
    """Eight clusters of one machine are one thing to do, not the whole first page."""
    clusters = [
        Finding(FindingCode.IMPOSSIBLE_CLUSTER, machine="orc", start_us=START_US, numbers={"count": 8.0})
    ] * 8
    gap = Finding(FindingCode.GAP, export="oil", tag="oil_hot", start_us=START_US, end_us=START_US + 10**9)
    note = Finding(FindingCode.UNCLAIMED_FILE, file="notes.txt")
    texts = first_things([*clusters, gap, note], PLANT)
    assert [text.title[:7] for text in texts] == ["Organic", "No read"]
    assert texts[0].sentence.endswith("7\u00a0more findings like it below.")
    assert first_things([note], PLANT)[0].title == "The file notes.txt belongs to no export"


def test_a_refusal_gives_both_numbers() -> None:
    """Who reads that a figure is withheld learns what it had and what it needed."""
    said = verdicts.withheld("coverage", 0.612, Rules())
    assert "61.2\u00a0%" in said and "75\u00a0%" in said


def test_all_cautions_are_there() -> None:
    """Thirteen cautions; the one on ceilings word for word."""
    assert len(cautions.CAUTIONS) == 13
    assert cautions.CEILING == (
        "Ceiling is a theoretical limit for the stated temperatures; no real machine reaches it; "
        "distance to it is not a savings estimate."
    )
