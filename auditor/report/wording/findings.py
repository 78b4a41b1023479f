"""Findings in sentences: what was noticed, when, its size, and the check that settles it."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from types import MappingProxyType
from typing import NamedTuple

from auditor.records.findings import Finding, FindingCode
from auditor.records.plant import Plant
from auditor.report.numbers import count
from auditor.report.wording import data_findings, figure_findings, file_findings, value_findings
from auditor.report.wording.names import listing, sentence, tag


class FindingText(NamedTuple):
    """A finding in words."""

    title: str
    sentence: str
    check: str
    """The one thing to do that settles it."""


_Writer = Callable[[Finding, Plant], tuple[str, str, str]]

WRITERS: Mapping[FindingCode, _Writer] = MappingProxyType(
    data_findings.WRITERS | value_findings.WRITERS | file_findings.WRITERS | figure_findings.WRITERS
)

_TAKE_NOTE_ONLY = frozenset(
    {
        FindingCode.DISTRUSTED,
        FindingCode.HEATING_VALUE_CHANGED,
        FindingCode.INCOMPLETE_LINE,
        FindingCode.RENAMED_COLUMN,
        FindingCode.UNCLAIMED_COLUMN,
        FindingCode.UNCLAIMED_FILE,
    }
)
"""Findings that can wait: they stand among the first things only when nothing else does."""


def finding_sentences(finding: Finding, plant: Plant) -> FindingText:
    """Put one finding into words.

    Parameters
    ----------
    finding : Finding
    plant : Plant
        For titles, headings and the site's clock.

    Returns
    -------
    FindingText
        Title, sentence and check: plain text, not yet escaped for any page.
    """
    title, said, check = (_tidy(text) for text in WRITERS[finding.code](finding, plant))
    if finding.words.get("kind") == "many":
        said = _summed_up(finding, plant)
    return FindingText(sentence(title), sentence(said), f"{check}{_suspects(finding, plant)}")


def first_things(findings: Sequence[Finding], plant: Plant, most: int = 5) -> tuple[FindingText, ...]:
    """Choose what to do first: the most important findings, each kind of each tag or machine once.

    Parameters
    ----------
    findings : sequence of Finding
        Most important first.
    plant : Plant
    most : int
        Largest number of texts.

    Returns
    -------
    tuple of FindingText
        Where more findings of the same kind and place follow, the sentence says how many.
    """
    groups: dict[tuple[object, ...], list[Finding]] = {}
    for finding in findings:
        groups.setdefault((finding.code, finding.machine, finding.tag, finding.export), []).append(finding)
    urgent = [group for group in groups.values() if group[0].code not in _TAKE_NOTE_ONLY]
    return tuple(_group_text(group, plant) for group in (urgent or list(groups.values()))[:most])


def _group_text(group: list[Finding], plant: Plant) -> FindingText:
    text = finding_sentences(group[0], plant)
    if len(group) == 1:
        return text
    more = f" {sentence(count(len(group) - 1, 'more finding', 'more findings'))} like it below."
    return text._replace(sentence=f"{text.sentence}{more}")


def _tidy(text: str) -> str:
    """Close the holes that an unknown time or number leaves in a sentence."""
    words = " ".join(word for word in text.split(" ") if word)
    for mark in ".,:;":
        words = words.replace(f" {mark}", mark)
    return words


def _summed_up(finding: Finding, plant: Plant) -> str:
    """Tell of the smaller findings of one kind that were summed up in one."""
    number = count(finding.numbers.get("findings", 0.0), "smaller case", "smaller cases")
    return _tidy(
        f"{number} of this kind, taken together, {data_findings.when(finding, plant)}."
        f"{data_findings.size(finding, 'They touch {} in all.')}"
    )


def _suspects(finding: Finding, plant: Plant) -> str:
    if not finding.suspects or finding.code is FindingCode.UNIT_SUSPECTED:
        return ""
    named = listing([tag(plant, name) for name in finding.suspects])
    return f" Suspect first: {named}."
