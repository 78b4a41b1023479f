"""What is different about a tag from a date on: its parts of the plant file, and their records."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import TYPE_CHECKING, Any, Literal

from auditor.plant_file.clocks import instant_us
from auditor.plant_file.faults import FaultBook
from auditor.plant_file.key_lines import KeyPath
from auditor.plant_file.leaves import Moment, OwnUnitValue, Spread, UnitText
from auditor.plant_file.parts import Part, keys_of, optional, required
from auditor.records.plant import Tag, TagChange

if TYPE_CHECKING:
    from auditor.plant_file.export_parts import NumberTag


class NumberTagChange(Part):
    """What may change of every tag whose cells hold numbers; a key that is not written goes on as before."""

    from_: Moment = required(
        "moment from which this holds, until the next change", "2026-07-10", alias="from"
    )
    unit: UnitText | None = optional("unit of the logged number from then on", "K")
    standard: Spread | None = optional(
        "one standard uncertainty from then on: says that another instrument, or a new calibration, reads",
        "0.5 %",
    )
    limit: Spread | None = optional(
        "class limit from then on: says that another instrument, or a new calibration, reads",
        "2 % of 1200 kW",
    )
    random: Spread | None = optional("random part of one sample from then on", 0.5)
    resolution: OwnUnitValue | None = optional("smallest step of the logged number from then on", "0.1 kWh")
    believable: list[float] | None = optional(
        "least and largest believable value from then on, in the unit of then", [0, 700], alias="range"
    )


class MeanTagChange(NumberTagChange):
    """What may change of a level or a rate."""

    cut_off: OwnUnitValue | None = optional("size below which it counts as zero from then on", "0.5 m3/h")
    pressure: Literal["gauge", "absolute"] | None = optional(
        "whether a pressure is read against the air or against vacuum from then on", "absolute"
    )


class InstantTagChange(MeanTagChange):
    """What may change of a level or a rate that is stored at an instant."""

    deadband: OwnUnitValue | None = optional(
        "change that it takes, from then on, before a new value is stored", "0.5 K"
    )


class CounterTagChange(NumberTagChange):
    """What may change of a counter."""

    at_most: OwnUnitValue | None = optional("largest believable rate from then on", "1300 kW")
    full_scale: OwnUnitValue | None = optional(
        "number of units after which the counter begins again at zero, from then on", "10000000 kWh"
    )


_FIELDS = {
    "unit": ("unit", "scale", "offset"),
    "standard": ("calibration",),
    "limit": ("calibration",),
}
"""Fields of the record that a key decides; any other key decides the field of its own name."""

Resolve = Callable[[str, Any, KeyPath, FaultBook], Tag | None]


def resolve_changes(
    tag: Tag, part: NumberTag, zone: str | None, place: tuple[KeyPath, FaultBook], resolve: Resolve
) -> tuple[TagChange, ...]:
    """Make the records of what changes, each with the whole tag as it is from then on.

    What a change does not write stays what it was: a range of 0 to 700 degC stays that when the logger
    goes over to kelvins.
    """
    path, book = place
    found: list[TagChange] = []
    changes: list[NumberTagChange] = getattr(part, "changes", None) or []
    for index, change in enumerate(changes):
        at: KeyPath = (*path, "changes", index)
        if not book.clean(at) or change.from_ is None or zone is None:
            continue
        from_us = instant_us(change.from_, zone)
        before = found[-1].tag if found else tag
        _check_change(change, from_us, found, at, book)
        then = resolve(tag.name, _as_tag(part, change, before), at, book)
        if then is not None and then.quantity != before.quantity:
            book.add(
                (*at, "unit"),
                f'"{then.unit}" is a unit of {then.quantity}, but the tag measures {tag.quantity}',
                "declare another tag for another quantity",
            )
        elif then is not None and book.clean(at):
            keys = _written(change)
            fields = [field for key in keys for field in _FIELDS.get(key, (key,))]
            merged = replace(before, **{field: getattr(then, field) for field in fields})
            found.append(
                TagChange(
                    from_us,
                    change.from_.isoformat(),
                    merged,
                    new_calibration="standard" in keys or "limit" in keys,
                )
            )
    return tuple(found)


def _written(change: NumberTagChange) -> list[str]:
    names = (name for name, _ in keys_of(type(change)).values() if name != "from_")
    return [name for name in names if getattr(change, name) is not None]


def _check_change(
    change: NumberTagChange, from_us: int, found: list[TagChange], path: KeyPath, book: FaultBook
) -> None:
    if not _written(change):
        book.add(path, "nothing is said to change", 'write what does: { from = 2026-07-10, unit = "K" }')
    if found and from_us <= found[-1].from_us:
        book.add(
            (*path, "from"),
            f"{change.from_.isoformat()} is not after {found[-1].since}, the change before",
            "write the changes of a tag in order of time",
        )
    if change.standard is not None and change.limit is not None:
        book.add((*path, "limit"), 'both "standard" and "limit" are written', "keep one of them")


def _as_tag(part: NumberTag, change: NumberTagChange, before: Tag) -> NumberTag:
    """Return a tag that declares only what the change writes, in the unit of then."""
    values: dict[str, Any] = dict.fromkeys(type(part).model_fields)
    for name in ("column", "between", "stamp_marks", "hold", "basis"):
        if name in values:
            values[name] = getattr(part, name)
    if "pressure" in values:
        values["pressure"] = before.pressure
    values |= {"unit": before.unit} | {name: getattr(change, name) for name in _written(change)}
    return type(part).model_construct(**values)
