"""Tags whose column goes by several headings: read one by one, put together again as one signal.

While files are looked at and cut, every further heading stands for a tag of its own, named after the tag
and the heading. Its numbers then join the rows of the tag. Where two headings hold a number for the same
stamp the second one becomes a row of its own, and is judged like any stamp that comes twice.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field, replace
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from auditor.log_reading.pieces import Piece
from auditor.records.findings import Finding, FindingCode
from auditor.records.plant import Export, Heading, Tag
from auditor.records.samples import Disposition, ReadingNote, Rejects, SampleBlock

_JOINT = "="
"""Stands between tag and heading; no tag of a plant file has it in its name."""


def by_heading(
    exports: Mapping[str, Export], tags: Mapping[str, Tag]
) -> tuple[dict[str, Export], dict[str, Tag]]:
    """Give every further heading of a tag a tag of its own, behind those of its export."""
    wide_exports, wide_tags = dict(exports), dict(tags)
    for name, export in exports.items():
        further = {
            f"{tag}{_JOINT}{heading.name}": replace(tags[tag], column=heading.name)
            for tag in export.tags
            for heading in tags[tag].headings[1:]
        }
        wide_tags |= further
        if further:
            wide_exports[name] = replace(export, tags=(*export.tags, *further))
    return wide_exports, wide_tags


def tag_of(name: str) -> str:
    """Name of the tag that a heading's own tag belongs to."""
    return name.partition(_JOINT)[0]


def by_tag(export: Export) -> Export:
    """Return the export with the tags that the plant file declares."""
    return replace(export, tags=tuple(name for name in export.tags if _JOINT not in name))


def unread_tags(names: tuple[str, ...], bound: Mapping[str, int]) -> list[str]:
    """Tags of which a file holds none of the headings."""
    found = {tag_of(name) for name in bound}
    return list(dict.fromkeys(tag for name in names if (tag := tag_of(name)) not in found))


@dataclass
class _Met:
    """First and last reading under one heading."""

    first: tuple[int, float]
    last: tuple[int, float]


@dataclass
class Folding:
    """Puts the headings of one export's tags together; lives as long as the export is read."""

    export: Export
    """With a tag for every heading."""
    tags: Mapping[str, Tag]
    _met: dict[str, dict[str, _Met]] = field(default_factory=dict)

    @property
    def is_needed(self) -> bool:
        """Whether any tag has several headings, or one with dates."""
        return any(self.tags[name].headings for name in self.export.tags)

    def fold(self, pieces: Iterator[Piece | ReadingNote]) -> Iterator[Piece | ReadingNote]:
        """Fold the pieces of one file, and tell in its note what was left out."""
        outside = dict.fromkeys(self.export.tags, 0)
        for piece in pieces:
            yield (
                _amended(piece, self._headings, outside)
                if isinstance(piece, ReadingNote)
                else (self._folded(piece, outside))
            )

    def joins(self) -> list[Finding]:
        """Where a tag went over from one heading to another, with the readings on both sides."""
        found = []
        for tag, by_name in self._met.items():
            in_order = sorted(by_name.items(), key=lambda met: (met[1].first[0], met[0]))
            for (old, before), (new, after) in pairwise(in_order):
                if before.last[0] >= after.first[0]:
                    continue
                record = self.tags[tag]
                numbers = {
                    "before": _in_si(record, *before.last),
                    "after": _in_si(record, *after.first),
                    "gap_s": (after.first[0] - before.last[0]) / 1e6,
                }
                found.append(
                    Finding(
                        FindingCode.RENAMED_COLUMN,
                        export=self.export.name,
                        tag=tag,
                        start_us=before.last[0],
                        end_us=after.first[0],
                        numbers=numbers,
                        words={"old": old, "new": new},
                    )
                )
        return found

    @property
    def _headings(self) -> dict[str, Heading]:
        """Per heading's tag: the heading with its dates."""
        found = {}
        for name in self.export.tags:
            tag = self.tags[name]
            found[name] = next(
                (heading for heading in tag.headings if heading.name == tag.column), Heading(tag.column)
            )
        return found

    def _folded(self, piece: Piece, outside: dict[str, int]) -> Piece:
        names = self.export.tags
        owners = np.array([names.index(tag_of(name)) for name in names])
        values, rejects, rejected = piece.values.copy(), piece.rejects, piece.rejected.copy()
        when_us = piece.reject_instants()
        for place, (name, heading) in enumerate(self._headings.items()):
            left_out = ~_valid(piece.instants_us, heading)
            if left_out.any():
                outside[name] += int(np.isfinite(values[place, left_out]).sum())
                values[place, left_out] = np.nan
            gone = (rejects.tag == place) & ~_valid(when_us, heading)
            gone &= rejects.disposition != Disposition.BAD_STAMP
            if gone.any():
                outside[name] += int(gone.sum())
                np.subtract.at(rejected[place], rejects.disposition[gone], 1)
                rejects, when_us = _without(rejects, gone), when_us[~gone]
            if self.tags[name].headings and self.tags[name].states is None:
                self._meet(tag_of(name), heading.name, piece.instants_us, values[place])
        k = int((owners == np.arange(owners.size)).sum())
        for place in range(k, owners.size):
            rejected[owners[place]] += rejected[place]
        rejects = replace(rejects, tag=owners[rejects.tag].astype(np.int16))
        instants_us, line, values = _joined(piece, values, owners, k)
        return Piece(instants_us, line, values, rejected[:k], rejects)

    def _meet(
        self, tag: str, heading: str, instants_us: NDArray[np.int64], values: NDArray[np.float64]
    ) -> None:
        rows = np.flatnonzero(np.isfinite(values))
        if not rows.size:
            return
        first, last = ((int(instants_us[row]), float(values[row])) for row in (rows[0], rows[-1]))
        met = self._met.setdefault(tag, {}).setdefault(heading, _Met(first, last))
        met.first, met.last = min(met.first, first), max(met.last, last)


def with_joins(
    pieces: Iterator[SampleBlock | ReadingNote], folding: Folding
) -> Iterator[SampleBlock | ReadingNote]:
    """Hand everything on, and add what was found at the joins to the note of the last file."""
    waiting: ReadingNote | None = None
    for piece in pieces:
        if isinstance(piece, ReadingNote):
            if waiting is not None:
                yield waiting
            waiting = piece
        else:
            yield piece
    if waiting is not None:
        yield replace(waiting, findings=(*waiting.findings, *folding.joins()))


def _joined(
    piece: Piece, values: NDArray[np.float64], owners: NDArray[np.int64], k: int
) -> tuple[NDArray[np.int64], NDArray[np.int64], NDArray[np.float64]]:
    """Move the numbers of further headings to the rows of their tags, or to rows behind them."""
    own, rows = values[:k], [np.arange(piece.instants_us.size)]
    more = [own]
    for place in range(k, owners.size):
        owner = owners[place]
        filled = np.isfinite(values[place])
        free = filled & np.isnan(own[owner])
        own[owner, free] = values[place, free]
        taken = np.flatnonzero(filled & ~free)
        if taken.size:
            extra = np.full((k, taken.size), np.nan)
            extra[owner] = values[place, taken]
            rows.append(taken)
            more.append(extra)
    if len(more) == 1:
        return piece.instants_us, piece.line, own
    row, together = np.concatenate(rows), np.concatenate(more, axis=1)
    order = np.argsort(row, kind="stable")
    row = row[order]
    return piece.instants_us[row], piece.line[row], together[:, order]


def _valid(instants_us: NDArray[np.int64], heading: Heading) -> NDArray[np.bool_]:
    valid = np.ones(instants_us.size, np.bool_)
    if heading.from_us is not None:
        valid &= instants_us >= heading.from_us
    if heading.until_us is not None:
        valid &= instants_us < heading.until_us
    return valid


def _without(rejects: Rejects, gone: NDArray[np.bool_]) -> Rejects:
    kept = ~gone
    return replace(
        rejects,
        tag=rejects.tag[kept],
        disposition=rejects.disposition[kept],
        source=rejects.source[kept],
        line=rejects.line[kept],
        word=rejects.word[kept],
    )


def _amended(note: ReadingNote, headings: Mapping[str, Heading], outside: Mapping[str, int]) -> ReadingNote:
    """Count the cells outside a heading's dates as those of a column that no tag binds."""
    left_out = {headings[name].name: count for name, count in outside.items() if count}
    if not left_out:
        return note
    cells = dict(note.unclaimed_cells)
    for name, count in left_out.items():
        cells[name] = cells.get(name, 0) + count
    said = [
        f"{count} cells of column {name} lie outside the dates that the plant file gives it"
        for name, count in left_out.items()
    ]
    return replace(
        note,
        unclaimed_cells=cells,
        unclaimed_columns=tuple(dict.fromkeys((*note.unclaimed_columns, *left_out))),
        evidence=(*note.evidence, *said),
    )


def _in_si(tag: Tag, instant_us: int, raw: float) -> float:
    then = next(then for start, end, then in tag.stretches if start <= instant_us < end)
    return then.scale * raw + then.offset
