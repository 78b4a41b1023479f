"""What becomes of cells and seconds: the words of the two ledgers."""

from __future__ import annotations

from auditor.records.plant import Tag
from auditor.records.samples import Disposition
from auditor.records.ticks import SecondKind
from auditor.report.numbers import duration

DISPOSITIONS: dict[Disposition, str] = {
    Disposition.USED: "entered the means that every figure is made of",
    Disposition.EMPTY: "nothing stood in the cell",
    Disposition.STATUS_WORD: "a word stood in place of a number; kept verbatim below",
    Disposition.SENTINEL: "a number that the plant file says means no value",
    Disposition.OUT_OF_RANGE: "outside the believable range of the plant file",
    Disposition.SPIKE: "a single reading far from both of its neighbours",
    Disposition.FROZEN: "the tag stood still for longer than the plant file believes",
    Disposition.DUPLICATE: "the same value with the same stamp had been read already",
    Disposition.CONFLICT_LOST: "another value with the same stamp took precedence",
    Disposition.UNPARSEABLE: "neither a number nor a known word",
    Disposition.BAD_STAMP: "the line has no stamp that could be read or placed",
    Disposition.DISTRUSTED: "excluded by a person in the plant file",
    Disposition.OUTSIDE_PERIOD: "before or after the period of this statement",
    Disposition.CARRIED_IN: "before the period, but still holding when it began",
    Disposition.CHANGED_TOO_FAST: "farther from the last believed reading than the plant file lets it change",
    Disposition.ZERO_WHILE_RUNNING: "zero, or in one tick with a zero, while another tag speaks against it",
}

SECONDS: dict[SecondKind, str] = {
    SecondKind.COVERED: "a reading stood behind it",
    SecondKind.STALE: "the last reading was older than the plant file lets it hold",
    SecondKind.REJECTED: "logged, but the reading was rejected",
    SecondKind.NEVER_LOGGED: "before the first or after the last reading of the tag",
}


def standing(tag: Tag) -> str:
    """Say whether a tag is tested for standing still while its machine runs."""
    if tag.stands_by_design:
        return "not tested: it may"
    if tag.frozen_after_s is None:
        return "not tested"
    return f"tested, {duration(tag.frozen_after_s)}"
