"""Which sources of uncertainty touch a stream, and all of them in a fixed order."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import TYPE_CHECKING

import numpy as np

from auditor.metering.calibrations import Calibration, calibrations_of
from auditor.records.powers import Source

if TYPE_CHECKING:
    from auditor.metering.metered import Metered
    from auditor.metering.settings import MeteringSettings
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
        keys |= {each.key for each in calibrations_of(tag) if _touches(each, ticks)}
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


def _touches(calibration: Calibration, ticks: TickTable) -> bool:
    declared = calibration.tag.calibration
    is_uncertain = declared is not None and (declared.absolute > 0.0 or declared.relative > 0.0)
    return is_uncertain and bool(calibration.holds(ticks.grid.start_us).any())


def _all(metered: Mapping[str, Metered], settings: MeteringSettings) -> Iterator[Source]:
    for name, tag in settings.tags.items():
        yield from (Source(each.key, "calibration", name) for each in calibrations_of(tag))
        yield Source(f"random:{name}", "random", name)
    names = dict.fromkeys(assumed.key for stream in metered.values() for assumed in stream.assumed)
    for name in names:
        yield Source(f"assumed:{name}", "assumed", name)
