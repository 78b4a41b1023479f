"""Keys of one tag that say which of its values are not believed: spikes, fast changes, ends of the range."""

from __future__ import annotations

import re
from typing import TypedDict

from auditor.plant_file.export_parts import InstantTag, NumberTag
from auditor.plant_file.faults import FaultBook, UnusableError
from auditor.plant_file.key_lines import KeyPath
from auditor.plant_file.quantities import amount, difference, in_own_unit
from auditor.plant_file.written import shown
from auditor.records.plant import ChangeRule, SpikeRule
from auditor.units import Conversion

_TIMES = re.compile(r"\s*(\d+(?:\.\d+)?)\s+times\s+its\s+scatter\s*")
_FEWEST_TIMES = 3.0
"""Below three standard deviations ordinary noise is taken out (1 sample of 370)."""


class ValueTests(TypedDict):
    """The fields of a tag that its value tests go by."""

    spike: SpikeRule | None
    change_at_most: ChangeRule | None
    saturates_at: tuple[float | None, float | None] | None


def value_tests(part: NumberTag, own: Conversion, path: KeyPath, book: FaultBook) -> ValueTests:
    """Read the value tests of a tag; a counter or an amount has none of them."""
    none = ValueTests(spike=None, change_at_most=None, saturates_at=None)
    if not isinstance(part, InstantTag):
        return none
    if part.spike is not None:
        none["spike"] = book.attempt(
            (*path, "spike"), _spike, part.spike, part, own.quantity, part.resolution is not None
        )
    if part.change_at_most is not None:
        none["change_at_most"] = book.attempt(
            (*path, "change_at_most"), _change, part.change_at_most, part, own.quantity
        )
    if part.saturates_at is not None:
        none["saturates_at"] = book.attempt((*path, "saturates_at"), _ends, part.saturates_at, own)
    return none


def _spike(written: float | str, part: InstantTag, quantity: str, resolved: bool) -> SpikeRule:
    found = _TIMES.fullmatch(written) if isinstance(written, str) else None
    if found is None:
        size = in_own_unit(written, part.unit, quantity)
        if size == 0.0:
            raise UnusableError(
                f"{shown(written)} would make every change a spike", "write a size above zero"
            )
        return SpikeRule(size, None)
    times = float(found[1])
    if times < _FEWEST_TIMES:
        raise UnusableError(
            f"{shown(written)} would take ordinary noise out", 'write at least "3 times its scatter"'
        )
    if not resolved:
        raise UnusableError(
            "the scatter of a tag at rest is zero, and the smallest step of its number is not declared",
            f'add the key resolution, such as resolution = "0.1 {part.unit}", or write spike as a size',
        )
    return SpikeRule(None, times)


def _change(written: str, part: InstantTag, quantity: str) -> ChangeRule:
    size, slash, time = written.rpartition("/")
    example = f'write it as "5 {"K" if quantity == "temperature" else part.unit}/min"'
    if not slash or not time.strip():
        raise UnusableError(f"{shown(written)} names no time", example)
    within = amount(time if time.strip()[0].isdigit() else f"1 {time.strip()}", "time", "1 min").value
    change = amount(size, difference(quantity), example.split('"')[1].rpartition("/")[0]).value
    if change <= 0.0 or within <= 0.0:
        raise UnusableError(f"{shown(written)} is not above zero", example)
    return ChangeRule(change, within)


def _ends(written: list[float], own: Conversion) -> tuple[float | None, float | None]:
    if len(written) not in (1, 2) or sorted(set(written)) != written:
        raise UnusableError(
            f"{written} is neither one end of a range nor two",
            "write the upper end, [700], or the lower and the upper one: [0, 700]",
        )
    ends = [own.scale * end + own.offset for end in written]
    return (None, ends[0]) if len(ends) == 1 else (ends[0], ends[1])
