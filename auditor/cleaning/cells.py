"""The ledger of cells: what became of every raw cell, with the first and last example of each kind."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass, fields
from typing import TYPE_CHECKING

import numpy as np

from auditor.records.samples import Disposition
from auditor.records.ticks import CellLedger, Example

if TYPE_CHECKING:
    from collections.abc import Sequence

    from numpy.typing import NDArray

    from auditor.records.samples import SampleBlock


@dataclass(frozen=True)
class Cells:
    """Numbers of one tag with the places they were read at, struct of arrays in order of time."""

    instants_us: NDArray[np.int64]
    values: NDArray[np.float64]
    """SI."""
    raw: NDArray[np.float64]
    file: NDArray[np.int32]
    """Index into the files of the book; -1: carried over from the period before, no cell of this one."""
    line: NDArray[np.int64]

    def __len__(self) -> int:
        """Return the number of cells."""
        return int(self.instants_us.size)

    def take(self, index: NDArray[np.intp] | NDArray[np.bool_] | slice) -> Cells:
        """Return some of the cells."""
        return Cells(*(getattr(self, field.name)[index] for field in fields(self)))

    def followed_by(self, other: Cells) -> Cells:
        """Return these cells and then the others."""
        return Cells(
            *(
                np.concatenate((getattr(self, field.name), getattr(other, field.name)))
                for field in fields(self)
            )
        )


class CellBook:
    """Counts and examples while an audit runs; local to one call of ``clean``."""

    def __init__(self, tags: Sequence[str]) -> None:
        self.tags = tuple(tags)
        self.place = {tag: index for index, tag in enumerate(self.tags)}
        self.counts = np.zeros((len(self.tags), len(Disposition)), dtype=np.int64)
        self.raw_cells = np.zeros(len(self.tags), dtype=np.int64)
        self.first: dict[tuple[str, Disposition], Example] = {}
        self.last: dict[tuple[str, Disposition], Example] = {}
        self.words: dict[str, Counter[str]] = {}
        self._names: list[str] = []
        self._numbers: dict[str, int] = {}

    def enter_block(self, block: SampleBlock, at_row: NDArray[np.intp]) -> None:
        """Count a block's raw cells, and enter those that reading rejected."""
        index = [self.place[tag] for tag in block.tags]
        self.counts[index] += block.rejected
        self.raw_cells[index] += block.rejected.sum(axis=1) + np.isfinite(block.values).sum(axis=1)
        rejects = block.rejects
        if not rejects.line.size:
            return
        kinds = rejects.tag.astype(np.int64) * len(Disposition) + rejects.disposition
        for kind in np.unique(kinds).tolist():
            entries = np.flatnonzero(kinds == kind)
            tag, code = divmod(kind, len(Disposition))
            disposition = Disposition(code)
            for entry in (int(entries[0]), int(entries[-1])):
                self._keep(block.tags[tag], disposition, _reject_example(block, entry, int(at_row[entry])))
            if disposition is Disposition.STATUS_WORD:
                words, counts = np.unique(rejects.word[entries], return_counts=True)
                counter = self.words.setdefault(block.tags[tag], Counter())
                for word, count in zip(words.tolist(), counts.tolist(), strict=True):
                    counter[rejects.words[word]] += count

    def enter(
        self, tag: str, disposition: Disposition, cells: Cells, at: NDArray[np.intp] | None = None
    ) -> None:
        """Enter numbers of one tag in order of time: those ``at`` some places, or all."""
        count = len(cells) if at is None else at.size
        if count:
            ends = (0, -1) if at is None else (int(at[0]), int(at[-1]))
            self.enter_stretch(tag, disposition, cells, count, ends)

    def enter_stretch(
        self, tag: str, disposition: Disposition, cells: Cells, count: int, ends: tuple[int, int]
    ) -> None:
        """Enter so many numbers of one tag, of which the first and the last stand at ``ends``."""
        self.counts[self.place[tag], disposition] += count
        for end in ends:
            self._keep(tag, disposition, self.example(cells, end))

    def example(self, cells: Cells, at: int) -> Example:
        """Return one of the cells as an example."""
        return Example(
            file=self._names[int(cells.file[at])],
            line=int(cells.line[at]),
            instant_us=int(cells.instants_us[at]),
            raw=raw_text(cells.raw[at]),
        )

    def number_files(self, block: SampleBlock) -> NDArray[np.int32]:
        """Return the number of each file of a block, numbering those not met before."""
        for name in block.files:
            if name not in self._numbers:
                self._numbers[name] = len(self._names)
                self._names.append(name)
        return np.array([self._numbers[name] for name in block.files], dtype=np.int32)

    def file_name(self, number: int) -> str | None:
        """Return the name of a file by its number; None for -1."""
        return self._names[number] if number >= 0 else None

    def move(
        self, tag: str, source: Disposition, target: Disposition, count: int, examples: tuple[Example, ...]
    ) -> None:
        """Move cells from one disposition to another; the examples are the first and the last of them."""
        if not count:
            return
        self.counts[self.place[tag], source] -= count
        self.counts[self.place[tag], target] += count
        for example in examples:
            self._keep(tag, target, example)

    def ledger(self) -> CellLedger:
        """Close the book.

        Raises
        ------
        RuntimeError
            If the dispositions of a tag do not add up to its raw cells: a fault of the program.
        """
        wrong = np.flatnonzero(self.counts.sum(axis=1) != self.raw_cells)
        if wrong.size or (self.counts < 0).any():
            names = ", ".join(self.tags[index] for index in wrong.tolist())
            raise RuntimeError(f"the ledger of cells does not add up: {names}")
        gone = {(tag, kind) for tag, kind in self.first if not self.counts[self.place[tag], kind]}
        return CellLedger(
            tags=self.tags,
            counts=self.counts,
            raw_cells=self.raw_cells,
            first={key: example for key, example in self.first.items() if key not in gone},
            last={key: example for key, example in self.last.items() if key not in gone},
            words={
                tag: dict(sorted(self.words[tag].items(), key=lambda item: (-item[1], item[0])))
                for tag in self.tags
                if tag in self.words
            },
        )

    def _keep(self, tag: str, disposition: Disposition, example: Example) -> None:
        """Keep an example if it is the earliest or latest so far; without stamps, by order of arrival."""
        key = (tag, disposition)
        first, last = self.first.get(key), self.last.get(key)
        if first is None or _earlier(example, first):
            self.first[key] = example
        if last is None or not _earlier(example, last):
            self.last[key] = example


def _earlier(one: Example, other: Example) -> bool:
    return one.instant_us is not None and other.instant_us is not None and one.instant_us < other.instant_us


def raw_text(number: float) -> str:
    """Write a raw number in its shortest form."""
    return repr(float(number)).removesuffix(".0")


def _reject_example(block: SampleBlock, entry: int, row: int) -> Example:
    rejects = block.rejects
    return Example(
        file=block.files[int(rejects.source[entry])],
        line=int(rejects.line[entry]),
        instant_us=int(block.instants_us[row]) if row >= 0 else None,
        raw=rejects.words[int(rejects.word[entry])],
    )
