"""Small exports for the tests of reading: declarations, files on disk, and everything read from them."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

import numpy as np

from auditor.log_reading import Recognition, read_export, recognise
from auditor.records.findings import FindingCode
from auditor.records.plant import Export, Tag
from auditor.records.samples import Disposition, ReadingNote, SampleBlock

ALL_TIME = (-(2**62), 2**62)


def make_export(columns: Mapping[str, str], **changes: Any) -> tuple[Export, dict[str, Tag]]:
    """Declare one export ``x``: tag to heading; ``units`` and ``states`` by tag, the rest are its fields."""
    units, states = changes.pop("units", {}), changes.pop("states", {})
    export = Export(
        name="x",
        files=("*",),
        clock="UTC",
        repeated_hour="by order",
        date_order="year first",
        decimal=".",
        delimiter=None,
        encoding=None,
        layout=None,
        stamp_columns=(),
        sentinels=(),
        status_words={},
        when_stamps_repeat="keep first",
        tags=tuple(columns),
    )
    tags = {
        name: make_tag(name, heading, units.get(name, ""), states.get(name))
        for name, heading in columns.items()
    }
    return replace(export, **changes), tags


def make_tag(name: str, heading: str, unit: str, states: Mapping[str, str] | None) -> Tag:
    """Declare one tag whose raw numbers are SI already."""
    return Tag(
        name=name,
        export="x",
        column=heading,
        unit=unit,
        quantity="",
        scale=1.0,
        offset=0.0,
        si_unit="",
        between="state" if states else "line",
        stamp_marks=None,
        hold_s=300.0,
        calibration=None,
        states=states,
    )


@dataclass
class Reading:
    """Everything that one export gave."""

    recognition: Recognition
    blocks: list[SampleBlock] = field(default_factory=list)
    notes: list[ReadingNote] = field(default_factory=list)

    @property
    def rows(self) -> list[tuple[str, int, tuple[float | None, ...]]]:
        """Stamp in ISO form, line and values (None where there is none) of each row."""
        return [
            (
                datetime.fromtimestamp(us / 1e6, UTC)
                .strftime("%Y-%m-%dT%H:%M:%S.%f")[:-4]
                .removesuffix(".00"),
                int(line),
                tuple(None if np.isnan(value) else float(value) for value in values),
            )
            for block in self.blocks
            for us, line, values in zip(
                block.instants_us.tolist(), block.line.tolist(), block.values.T, strict=True
            )
        ]

    @property
    def values(self) -> list[tuple[float | None, ...]]:
        """Values of each row."""
        return [values for _, _, values in self.rows]

    @property
    def stamps(self) -> list[str]:
        """Stamp of each row."""
        return [stamp for stamp, _, _ in self.rows]

    def rejected(self, tag: str) -> dict[str, int]:
        """Cells of a tag that gave no number, by the word of their disposition."""
        total = sum(block.rejected[block.tags.index(tag)] for block in self.blocks)
        return {Disposition(kind).word: int(count) for kind, count in enumerate(total) if count}

    @property
    def rejects(self) -> list[tuple[str, str, int, str]]:
        """Tag, disposition, line and raw text of each rejected cell."""
        return [
            (block.tags[tag], Disposition(kind).word, int(line), block.rejects.words[word])
            for block in self.blocks
            for tag, kind, line, word in zip(
                block.rejects.tag,
                block.rejects.disposition,
                block.rejects.line,
                block.rejects.word,
                strict=True,
            )
        ]

    @property
    def note(self) -> ReadingNote:
        """The note of the only file."""
        assert len(self.notes) == 1
        return self.notes[0]

    def counts(self) -> tuple[int, int, int, int]:
        """Lines in all, data, skipped, rejected of the only file."""
        note = self.note
        return note.lines, note.lines_data, note.lines_skipped, note.lines_rejected

    def found(self) -> list[FindingCode]:
        """Codes of all findings."""
        findings = [
            *self.recognition.findings,
            *(finding for note in self.notes for finding in note.findings),
        ]
        return [finding.code for finding in findings]


def read(
    folder: Path,
    files: Mapping[str, bytes | str],
    declared: tuple[Export, dict[str, Tag]],
    window_us: tuple[int, int] = ALL_TIME,
) -> Reading:
    """Write files, recognise and read them, and hold what must hold of every reading."""
    for name, content in files.items():
        path = folder / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_bytes(content.encode() if isinstance(content, str) else content)
    export, tags = declared
    reading = Reading(recognise(folder, {export.name: export}, tags))
    for piece in read_export(reading.recognition, export.name, window_us):
        if isinstance(piece, ReadingNote):
            reading.notes.append(piece)
        else:
            reading.blocks.append(piece)
    _hold(reading)
    return reading


def _hold(reading: Reading) -> None:
    before = None
    for block in reading.blocks:
        k, n = len(block.tags), block.instants_us.size
        assert block.values.shape == (k, n)
        assert block.rejected.shape == (k, len(Disposition))
        listed = block.rejected.sum() - block.rejected[:, Disposition.OUTSIDE_PERIOD].sum()
        assert block.rejects.tag.size == listed
        assert len(set(block.rejects.words)) == len(block.rejects.words)
        if n:
            assert (np.diff(block.instants_us) >= 0).all()
            assert before is None or block.instants_us[0] >= before
            before = block.instants_us[-1]
            level = np.diff(block.instants_us) == 0
            rank = block.source.astype(np.int64) * 2**40 + block.line
            assert (np.diff(rank)[level] >= 0).all(), "equal stamps stand in order of precedence"
    for note in reading.notes:
        assert note.lines_data + note.lines_skipped + note.lines_rejected == note.lines
