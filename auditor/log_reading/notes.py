"""The account of one file: every line in one of three places, what was recognised, what was odd."""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from auditor.log_reading.listing import StoredFile, hash_file
from auditor.log_reading.recognition import RecognisedFile, Recognition, UnopenedFile
from auditor.records.findings import Finding, FindingCode
from auditor.records.samples import ReadingNote

_STEPS_TOLD = 3
_FEW = 3
_US = 1_000_000


class Step(NamedTuple):
    """A step back of a clock."""

    error_us: int
    """By how much it was set: the fall and the usual step, negative."""
    line: int
    before_us: int
    after_us: int


@dataclass
class Tally:
    """Counts of one file while it is being read."""

    file: RecognisedFile
    lines: int = 0
    data: int = 0
    skipped: int = 0
    rejected: int = 0
    first_us: int | None = None
    last_us: int | None = None
    falls: int = 0
    steps: list[Step] = field(default_factory=list)
    """The largest steps back of the clock."""
    set_back: int = 0
    """How often the clock stepped back; the other falls are rows that were written late."""
    usual_us: int = 0
    """Usual step from row to row."""
    resets: int = 0
    """Rows of a clock that was reset."""
    first_reset: tuple[int, int, int] = (0, 0, 0)
    """Line, stamp [us] and error of the clock [us] of the first of them."""
    repeated: int = 0
    """Rows in a repeated hour that the order of lines resolved."""
    dropped: int = 0
    """Rows in a repeated hour that nothing resolved."""
    dropped_us: tuple[int, int] = (0, 0)
    skipped_hour: int = 0
    skipped_hour_line: int = 0
    outside: int = 0
    refused: int = 0
    """Rejected lines whose text or fields are at fault."""
    first_rejected: tuple[int, str] | None = None
    unclaimed: dict[str, int] = field(default_factory=dict)
    pairs: dict[str, int] = field(default_factory=dict)
    """Pairs of columns: cells of each bound pair."""
    lost_digits: dict[str, tuple[int, int, str]] = field(default_factory=dict)
    """Counters: how many readings hide digits in an exponent, line and text of the first."""
    torn: int = 0
    footer: str = ""
    strays: int = 0
    """Bytes that have no meaning in the file's encoding."""
    findings: list[Finding] = field(default_factory=list)

    def reject_line(self, line: int, text: str, count: int = 1) -> None:
        """Count a line that gave no row, and keep the first."""
        self.rejected += count
        self.refused += count
        if self.first_rejected is None or line < self.first_rejected[0]:
            self.first_rejected = (line, text[:200])

    def lose_digits(self, tag: str, place: tuple[int, str], count: int) -> None:
        """Count readings of a counter that hide digits in an exponent, and keep the first."""
        before, line, text = self.lost_digits.get(tag, (0, *place))
        self.lost_digits[tag] = (before + count, line, text)

    def see(
        self, instants_us: NDArray[np.int64], line: NDArray[np.int64], before: tuple[int, int] | None
    ) -> None:
        """Take good stamps in the order of the file; ``before`` is the line and stamp before them."""
        if not instants_us.size:
            return
        low, high = int(instants_us.min()), int(instants_us.max())
        self.first_us = low if self.first_us is None else min(self.first_us, low)
        self.last_us = high if self.last_us is None else max(self.last_us, high)
        if before is not None:
            instants_us = np.concatenate([[before[1]], instants_us])
            line = np.concatenate([[before[0]], line])
        steps = np.diff(instants_us)
        if (rises := steps[steps > 0]).size >= _FEW or not self.usual_us:
            self.usual_us = int(np.median(rises)) if rises.size else self.usual_us
        falls = np.flatnonzero(steps < 0)
        self.falls += falls.size
        set_back = falls[self._are_steps(instants_us, falls)]
        self.set_back += set_back.size
        for at in set_back[np.argsort(steps[set_back], kind="stable")[:_STEPS_TOLD]].tolist():
            error_us = int(steps[at]) - self.usual_us
            self.steps.append(
                Step(error_us, int(line[at + 1]), int(instants_us[at]), int(instants_us[at + 1]))
            )
        self.steps = sorted(self.steps)[:_STEPS_TOLD]

    def _are_steps(self, instants_us: NDArray[np.int64], falls: NDArray[np.int64]) -> NDArray[np.bool_]:
        """Tell steps of the clock from rows that were only written late.

        A clock that was set back runs again over the time that it had shown; after late rows the stamps
        leap back to where they had been.
        """
        reached_us = np.maximum.accumulate(instants_us)
        from_front = instants_us[falls] == reached_us[falls]
        back_at = np.searchsorted(reached_us, instants_us[falls], side="right")
        is_back = back_at < instants_us.size
        back_at = np.minimum(back_at, instants_us.size - 1)
        leap_us = instants_us[back_at] - instants_us[back_at - 1]
        late: NDArray[np.bool_] = is_back & (leap_us > 2 * self.usual_us)
        is_step: NDArray[np.bool_] = from_front & ~late
        return is_step

    def see_reset(
        self,
        instants_us: NDArray[np.int64],
        line: NDArray[np.int64],
        reset: NDArray[np.bool_],
        good: NDArray[np.bool_],
    ) -> None:
        """Count rows of a clock that was reset, and keep the first with the error of its clock."""
        if not self.resets:
            first = int(np.argmax(reset))
            earlier = np.flatnonzero(good[:first])
            before_us = int(instants_us[earlier[-1]]) if earlier.size else self.last_us
            steps = np.diff(instants_us[good])
            usual_us = self.usual_us or int(np.median(steps[steps > 0]) if (steps > 0).any() else 0)
            due_us = int(instants_us[first]) if before_us is None else before_us + usual_us
            self.first_reset = int(line[first]), int(instants_us[first]), int(instants_us[first]) - due_us
        self.resets += int(reset.sum())

    def note(self, export: str, sha256: str) -> ReadingNote:
        """Close the account."""
        assert self.data + self.skipped + self.rejected == self.lines, "lines of a file are not accounted for"
        file, dialect = self.file, self.file.dialect
        evidence = list(file.evidence)
        if self.repeated:
            evidence.append(
                f"{self.repeated} rows of a repeated hour: both passes told apart by the order of lines"
            )
        if self.falls > self.set_back and not file.is_descending:
            evidence.append(
                f"its stamps fall {self.falls - self.set_back} times for rows that were written late"
            )
        if self.pairs:
            counts = ", ".join(f"{name} {count}" for name, count in self.pairs.items())
            evidence.append(f"cells of each pair of columns: {counts}")
        if self.outside:
            evidence.append(f"{self.outside} rows lie outside the stretch that was asked for")
        if self.strays:
            evidence.append(
                f"{self.strays} bytes that {file.encoding.shown} does not know were read as Windows-1252"
            )
        if self.footer:
            evidence.append(f'passed over below the data: "{self.footer}"')
        return ReadingNote(
            export=export,
            file=file.path,
            pattern=file.claim.pattern,
            bytes=file.claim.stored.bytes,
            sha256=sha256,
            encoding=file.encoding.shown,
            delimiter=dialect.delimiter,
            layout="one file per tag" if file.point else dialect.layout,
            heading_line=dialect.heading_line,
            unit_line=dialect.unit_line,
            columns=dialect.headings,
            unclaimed_columns=tuple(self.unclaimed),
            unclaimed_cells=dict(self.unclaimed),
            stamp_format=file.stamp_format,
            evidence=tuple(evidence),
            lines=self.lines,
            lines_data=self.data,
            lines_skipped=self.skipped,
            lines_rejected=self.rejected,
            first_us=self.first_us,
            last_us=self.last_us,
            backward_steps=self.falls,
            findings=tuple(self.findings + self._own_findings(export)),
        )

    def _lost_digits(self, export: str) -> list[Finding]:
        return [
            Finding(
                FindingCode.LOST_DIGITS,
                export=export,
                file=self.file.path,
                line=line,
                tag=tag,
                numbers={"count": count},
                words={"first": text},
                suspects=(tag,),
            )
            for tag, (count, line, text) in self.lost_digits.items()
        ]

    def _own_findings(self, export: str) -> list[Finding]:
        path = self.file.path
        found = []
        if self.refused and self.first_rejected is not None:
            line, text = self.first_rejected
            found.append(
                Finding(
                    FindingCode.REJECTED_LINES,
                    export=export,
                    file=path,
                    line=line,
                    numbers={"count": self.refused, "lines": self.lines},
                    words={"first": text},
                )
            )
        found += self._lost_digits(export)
        if self.dropped:
            found.append(
                Finding(
                    FindingCode.REPEATED_HOUR,
                    export=export,
                    file=path,
                    start_us=self.dropped_us[0],
                    end_us=self.dropped_us[1],
                    numbers={"count": self.dropped},
                )
            )
        if self.skipped_hour:
            found.append(
                Finding(
                    FindingCode.CLOCK_OFFSET,
                    export=export,
                    file=path,
                    line=self.skipped_hour_line,
                    numbers={"count": self.skipped_hour},
                    words={"sign": "stamps in the hour that summer time skips"},
                )
            )
        if self.resets:
            found.append(self._reset_finding(export))
        for step in [] if self.file.is_descending else self.steps:
            found.append(
                Finding(
                    FindingCode.CLOCK_STEP,
                    export=export,
                    file=path,
                    line=step.line,
                    start_us=step.after_us,
                    end_us=step.before_us,
                    numbers={"step_s": step.error_us / _US, "count": self.set_back},
                )
            )
        return found

    def _reset_finding(self, export: str) -> Finding:
        line, stamp_us, error_us = self.first_reset
        numbers = {"count": float(self.resets), "reset": float(self.resets)}
        if error_us:
            numbers["step_s"] = error_us / _US
        return Finding(
            FindingCode.CLOCK_STEP,
            export=export,
            file=self.file.path,
            line=line,
            numbers=numbers,
            words={"year": str(np.datetime64(stamp_us, "us").astype("datetime64[Y]"))},
        )


def unread_note(file: RecognisedFile, export: str) -> ReadingNote:
    """Note of a file that lies wholly outside the stretch that was asked for."""
    note = Tally(file).note(export, "")
    said = "not opened for this period: its stamps lie wholly outside"
    return replace(note, first_us=file.first_us, last_us=file.last_us, evidence=(*note.evidence, said))


def with_late_rows(note: ReadingNote, count: int, late_us: int) -> ReadingNote:
    """Move rows that came too late to be put in order from the data lines to the rejected ones."""
    finding = Finding(
        FindingCode.CLOCK_STEP,
        export=note.export,
        file=note.file,
        numbers={"step_s": -late_us / _US, "count": count, "rejected": count},
    )
    return replace(
        note,
        lines_data=note.lines_data - count,
        lines_rejected=note.lines_rejected + count,
        evidence=(*note.evidence, f"{count} rows came too late to be put in order and were rejected"),
        findings=(*note.findings, finding),
    )


def recognition_notes(recognition: Recognition) -> tuple[ReadingNote, ...]:
    """Return the notes of the files that no export reads: unclaimed, set aside, unreadable."""
    digests: dict[str, str] = {}
    return tuple(_unopened_note(file, _digest(file.stored, digests)) for file in recognition.unopened)


def _digest(stored: StoredFile, digests: dict[str, str]) -> str:
    key = str(stored.real)
    if key not in digests:
        try:
            digests[key] = hash_file(stored.real)
        except OSError:
            digests[key] = ""
    return digests[key]


def _unopened_note(file: UnopenedFile, sha256: str) -> ReadingNote:
    if file.export is None:
        said = f"passed over: {file.reason}" if file.reason else "no export of the plant file claims it"
    else:
        said = f"could not be read: {file.reason}"
    return ReadingNote(
        export=file.export,
        file=file.stored.path,
        pattern=file.pattern,
        bytes=file.stored.bytes,
        sha256=sha256,
        encoding="",
        delimiter="",
        layout="",
        heading_line=0,
        unit_line=None,
        columns=(),
        unclaimed_columns=(),
        unclaimed_cells={},
        stamp_format="",
        evidence=(said,),
        lines=0,
        lines_data=0,
        lines_skipped=0,
        lines_rejected=0,
        first_us=None,
        last_us=None,
        backward_steps=0,
        findings=(),
    )
