"""Questions about units read as sentences, whichever comparison they came from and however sparse."""

from __future__ import annotations

from dataclasses import replace

import pytest
from report_factory import START_US, make_plant

from auditor.judging import familiar
from auditor.records.findings import Finding, FindingCode
from auditor.report.wording.findings import finding_sentences
from auditor.report.wording.unit_findings import CAUSES

PLANT = make_plant()
DAY_US = 86_400_000_000
COMPARED = ("range", "second meter", "own past", "nameplate", "pressure kind", "temperature step", "level")
FULL = Finding(
    FindingCode.UNIT_SUSPECTED,
    tag="oil_hot",
    machine="orc",
    start_us=START_US + 9 * DAY_US,
    end_us=START_US + 31 * DAY_US,
    energy_J=3.6e11,
    numbers={
        "ratio": 1.0563,
        "ratio_U": 0.0042,
        "familiar": 1.0549,
        "before": 300.0,
        "after": 372.0,
        "pressure_Pa": 35_000.0,
        "air_Pa": 101_325.0,
    },
    words={
        "candidates": "normal or 15 degC=1.0549; heating value basis=1.06",
        "other": "oil_flow",
        "unit": "degF",
        "declared": "degC",
        "first": "544",
        "last": "540",
        "figure": "gross",
    },
    suspects=("oil_hot", "oil_flow"),
)


@pytest.mark.parametrize("evidence", (*COMPARED, ""))
def test_every_comparison_reads_as_sentences(evidence: str) -> None:
    """Title, sentence and check stand, with all numbers and with none; nothing is said to be corrected."""
    sparse = Finding(FindingCode.UNIT_SUSPECTED, words={"evidence": evidence})
    for finding in (replace(FULL, words={**FULL.words, "evidence": evidence}), sparse):
        text = finding_sentences(finding, PLANT)
        for part in text:
            assert part[0].isupper() or not part[0].isalpha()
            assert "  " not in part and " ." not in part and " ," not in part
            assert "None" not in part and "nan" not in part.split()
        assert text.sentence.endswith(".") and text.check.endswith(".")
        assert "Nothing was co" in text.sentence  # converted or corrected


def test_candidates_are_asked_and_each_has_its_check() -> None:
    """The ratio with its uncertainty, the familiar ones beside it, and what settles each of them."""
    text = finding_sentences(replace(FULL, words={**FULL.words, "evidence": "own past"}), PLANT)
    assert "1.0563 ± 0.0042" in text.sentence
    assert "(1.0549); or higher heating value taken for the lower" in text.sentence
    assert "?" in text.sentence
    assert "volume corrector; else read on the supplier's sheet" in text.check


def test_every_cause_has_its_words() -> None:
    """A cause without words could not be asked about."""
    of_fuel = [*familiar._REFERENCE_STATES, familiar._GAS_HEATING_VALUE, familiar._LIQUID_HEATING_VALUE]
    causes = {each.cause for each in (*familiar.OF_POWER, *familiar.OF_FLOW, *of_fuel)}
    by_comparison = {"net or gross", "gauge pressure read as absolute", "absolute pressure read as gauge"}
    assert set(CAUSES) == causes | by_comparison
