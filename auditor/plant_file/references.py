"""Names that point from one part of the plant file to another, and what a tag must measure for its use."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TypeVar

from auditor.plant_file.faults import FaultBook, UnusableError, choices
from auditor.plant_file.key_lines import KeyPath
from auditor.plant_file.machine_parts import MachinePart
from auditor.plant_file.quantities import RATE_UNITS, RATES, amount, difference, in_own_unit, unit_conversion
from auditor.plant_file.written import shown
from auditor.records.plant import Fluid, Fuel, GasMeter, Site, Tag

_Declared = TypeVar("_Declared")


@dataclass(frozen=True)
class Declared:
    """Everything that can be pointed at. What is declared but at fault stands with None."""

    site: Site | None
    tags: Mapping[str, Tag | None]
    fluids: Mapping[str, Fluid | None]
    fuels: Mapping[str, Fuel | None]
    gas_meters: Mapping[str, GasMeter | None]
    machines: Mapping[str, MachinePart]


def find(
    what: str, name: str | None, declared: Mapping[str, _Declared | None], path: KeyPath, book: FaultBook
) -> _Declared | None:
    """Look up what a key points at; an unknown name is a fault, a declared one at fault gives None."""
    if name is None:
        return None
    if name not in declared:
        book.add(
            path,
            f"there is no {what} {shown(name)}",
            f"correct the name or declare it; {choices(name, declared)}",
        )
        return None
    return declared[name]


def tick_quantity(tag: Tag) -> str:
    """Quantity of a tag's mean over a tick: counters and amounts become rates."""
    return RATES[tag.quantity] if tag.between in ("counter", "amount") else tag.quantity


def find_tag(
    name: str | None, wanted: tuple[str, ...], declared: Declared, path: KeyPath, book: FaultBook
) -> Tag | None:
    """Look up a tag and check that its mean over a tick is one of the wanted quantities."""
    tag = find("tag", name, declared.tags, path, book)
    if tag is None:
        return None
    if tag.states is not None:
        book.add(path, f'tag "{name}" is a state', f"name a tag that measures {' or '.join(wanted)}")
        return None
    if tick_quantity(tag) not in wanted:
        fitting = [
            other.name
            for other in declared.tags.values()
            if other is not None and other.states is None and tick_quantity(other) in wanted
        ]
        names = ", ".join(f'"{other}"' for other in fitting)
        book.add(
            path,
            f'tag "{name}" measures {tag.quantity} ({tag.unit}), but {" or ".join(wanted)} is needed here',
            "name another tag or correct its unit" + (f"; fitting tags are {names}" if names else ""),
        )
        return None
    return tag


def level_of(written: float | str, tag: Tag) -> float:
    """SI value of a threshold for the tag's mean over a tick.

    Raises
    ------
    UnusableError
        If it cannot be read, or is a bare number although the tag's mean is in another unit.
    """
    quantity = tick_quantity(tag)
    if isinstance(written, str):
        return amount(written, quantity, f"20 {_tick_unit(tag)}").value
    _refuse_bare(written, tag)
    own = unit_conversion(tag.unit, quantity)
    return own.scale * written + own.offset


def change_of(written: float | str, tag: Tag) -> float:
    """SI size of a change of the tag's mean over a tick.

    Raises
    ------
    UnusableError
        If it cannot be read, or is a bare number although the tag's mean is in another unit.
    """
    quantity = tick_quantity(tag)
    if isinstance(written, str) and written.rstrip().endswith("%") and quantity != "fraction":
        raise UnusableError(
            f"{shown(written)} does not say of what", f'write it of a span: "5 % of 1000 {_tick_unit(tag)}"'
        )
    if not isinstance(written, str):
        _refuse_bare(written, tag)
    size = in_own_unit(written, _tick_unit(tag), quantity)
    if size <= 0.0:
        raise UnusableError(
            f"{shown(written)} is not above zero", f"write a {difference(quantity)} above zero"
        )
    return size


def _tick_unit(tag: Tag) -> str:
    return RATE_UNITS[tag.quantity] if tag.between in ("counter", "amount") else tag.unit


def _refuse_bare(written: float, tag: Tag) -> None:
    if tag.between in ("counter", "amount"):
        unit = RATE_UNITS[tag.quantity]
        raise UnusableError(
            f"{written:g} stands without a unit, and the tag counts in {tag.unit}",
            f'write the rate with its unit: "{written:g} {unit}"',
        )
