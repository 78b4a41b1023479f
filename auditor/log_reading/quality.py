"""Quality codes of a long export: only values whose code is declared good are used."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pyarrow as pa

from auditor.log_reading.decide import Cells
from auditor.log_reading.table import distinct
from auditor.records.plant import Quality
from auditor.records.samples import Disposition

NO_CODE = "without a code"


def reject_by_quality(cells: Cells, codes: pa.Array, quality: Quality) -> Cells:
    """Reject the numbers whose quality code is not among the good ones.

    A cell that gave no number keeps its own reason. A rejected one is counted under its code, written
    behind the heading of the code's column: ``quality 0``.

    Parameters
    ----------
    cells : Cells
        Decided cells of a long chunk.
    codes : pyarrow.Array
        Quality code of each row.
    quality : Quality
        As declared.
    """
    if cells.tag_of_row is None:
        raise ValueError("only a long export has one quality code per value")
    index, words = distinct(codes)
    good = {code.strip() for code in quality.good}
    is_good = np.array([word.strip() in good for word in words], np.bool_)
    hit = np.flatnonzero(~is_good[index] & (cells.tag_of_row >= 0) & np.isfinite(cells.values[0]))
    if not hit.size:
        return cells
    values = cells.values.copy()
    values[0, hit] = np.nan
    told = tuple(f"{quality.column} {word.strip() or NO_CODE}" for word in words)
    return replace(
        cells,
        values=values,
        row=np.concatenate([cells.row, hit]),
        tag=np.concatenate([cells.tag, cells.tag_of_row[hit]]),
        disposition=np.concatenate([cells.disposition, np.full(hit.size, Disposition.STATUS_WORD)]),
        word=np.concatenate([cells.word, index[hit] + len(cells.words)]),
        words=(*cells.words, *told),
    )
