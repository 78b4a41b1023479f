"""Which sources of uncertainty touch a stream, and all of them in a fixed order."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import TYPE_CHECKING

import numpy as np

from auditor.records.powers import Source, SourceKind

if TYPE_CHECKING:
    from auditor.metering.metered import Metered
    from auditor.metering.settings import MeteringSettings
    from auditor.records.plant import Tag
    from auditor.records.ticks import TickTable


def sources_of(metered: Metered, ticks: TickTable, settings: MeteringSettings) -> frozenset[str]:
    """Keys of the sources that move a stream.

    A calibration that is declared as zero, a tag without noise and a number without uncertainty are
    no sources; neither is a state, nor the tag that tells whether a machine runs.
    """
    keys = {f"assumed:{assumed.key}" for assumed in metered.assumed if assumed.standard > 0.0}
    for column in metered.columns:
        index = ticks.column(column)
        tag = settings.tags[ticks.tags[index]]
        if tag.states is not None:
            continue
        if _has_calibration(tag):
            keys.add(f"calibration:{tag.name}")
        if np.nanmax(ticks.noise[:, index], initial=0.0) > 0.0:
            keys.add(f"random:{tag.name}")
    return frozenset(keys)


def ordered_sources(
    metered: Mapping[str, Metered],
    sources: Mapping[str, frozenset[str]],
    settings: MeteringSettings,
) -> tuple[Source, ...]:
    """Every source of the plant: tags in its order, then assumed numbers by first use."""
    used = frozenset[str]().union(*sources.values())
    return tuple(source for source in _all(metered, settings) if source.key in used)


def _has_calibration(tag: Tag) -> bool:
    declared = tag.calibration
    return declared is not None and (declared.absolute > 0.0 or declared.relative > 0.0)


def _all(metered: Mapping[str, Metered], settings: MeteringSettings) -> Iterator[Source]:
    kinds: tuple[SourceKind, ...] = ("calibration", "random")
    for tag in settings.tags:
        for kind in kinds:
            yield Source(f"{kind}:{tag}", kind, tag)
    names = dict.fromkeys(assumed.key for stream in metered.values() for assumed in stream.assumed)
    for name in names:
        yield Source(f"assumed:{name}", "assumed", name)
