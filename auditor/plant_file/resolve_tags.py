"""Tags, from checked parts to records in SI."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

from auditor.plant_file.aliases import resolve_headings
from auditor.plant_file.export_parts import (
    AmountTag,
    AnyTag,
    CounterTag,
    ExportPart,
    InstantTag,
    LineTag,
    MeanTag,
    NumberTag,
    StateTag,
    StepTag,
    UndecidedTag,
)
from auditor.plant_file.faults import FaultBook, UnusableError
from auditor.plant_file.key_lines import KeyPath
from auditor.plant_file.quantities import (
    RATE_UNITS,
    RATES,
    UncertaintyKind,
    UncertaintyText,
    amount,
    in_own_unit,
    uncertainty,
    unit_conversion,
)
from auditor.plant_file.references import find, tick_quantity
from auditor.plant_file.tag_changes import resolve_changes
from auditor.plant_file.value_tests import value_tests
from auditor.plant_file.written import shown
from auditor.records.plant import Tag, TagChange
from auditor.records.uncertain import Uncertainty

REFERENCE = "reference"
"""Stands for the reference temperature in a flue-gas stream, so no tag may have this name."""


def resolve_tags(
    exports: Mapping[str, ExportPart], zone: str | None, book: FaultBook
) -> dict[str, Tag | None]:
    """Make the records of all tags; one at fault stands with None, so that it still counts as declared.

    ``zone`` is the site's: dates without an offset are of its clock.
    """
    tags: dict[str, Tag | None] = {}
    homes: dict[str, str] = {}
    for export, export_part in exports.items():
        columns: dict[str, str] = {}
        for name, part in (export_part.tags or {}).items():
            path: KeyPath = ("exports", export, "tags", name)
            _check_name(name, path, homes, book)
            _check_column(name, part, columns, (path, book))
            homes.setdefault(name, export)
            tags.setdefault(name, _dated_tag(name, part, zone, path, book))
    for tag in tags.values():
        if tag is not None and tag.same_quantity_as is not None:
            _check_second_meter(tag, tags, book)
    return tags


def _check_second_meter(tag: Tag, tags: Mapping[str, Tag | None], book: FaultBook) -> None:
    path = ("exports", tag.export, "tags", tag.name, "same_quantity_as")
    other = find("tag", tag.same_quantity_as, tags, path, book)
    if other is tag:
        book.add(path, "a tag is not its own second meter", "name the other meter's tag")
    elif other is not None and (other.states is not None or tick_quantity(other) != tick_quantity(tag)):
        book.add(
            path,
            f'tag "{other.name}" measures {other.quantity} ({other.unit}), not the {tick_quantity(tag)} '
            f"that this tag measures",
            "name a tag of the same quantity (a counter goes with its rate), or correct the unit",
        )


def _dated_tag(name: str, part: AnyTag, zone: str | None, path: KeyPath, book: FaultBook) -> Tag | None:
    """Make the record of a tag with everything that has dates."""
    tag = _resolve_tag(name, part, path, book)
    if tag is None:
        return None
    headings = resolve_headings(part.column or (), zone, path, book)
    changes: tuple[TagChange, ...] = ()
    if isinstance(part, NumberTag):
        changes = resolve_changes(tag, part, zone, (path, book), _resolve_tag)
    return replace(tag, headings=headings, changes=changes) if book.clean(path) else None


def _check_name(name: str, path: KeyPath, homes: Mapping[str, str], book: FaultBook) -> None:
    if name in homes:
        book.add(
            path,
            f'the tag "{name}" is declared in the export "{homes[name]}" too',
            "give each tag its own name",
        )
    if name == REFERENCE or "=" in name:
        book.add(
            path, f'a tag cannot be named "{name}"', f'choose a name other than "{REFERENCE}" and without "="'
        )


def _check_column(
    name: str, part: AnyTag, columns: dict[str, str], noting: tuple[KeyPath, FaultBook]
) -> None:
    path, book = noting
    if part.column is None:
        return
    for heading in part.column:
        if heading.name in columns:
            book.add(
                (*path, "column"),
                f'the column "{heading.name}" is bound to the tag "{columns[heading.name]}" already',
                "bind each column once; two streams may point at the same tag",
            )
        columns.setdefault(heading.name, name)


def _resolve_tag(name: str, part: AnyTag, path: KeyPath, book: FaultBook) -> Tag | None:
    """Make the record, to be used where nothing below its path is at fault."""
    if isinstance(part, StateTag):
        return _state(name, part, path, book)
    if isinstance(part, UndecidedTag) or part.unit is None:
        return None
    own = unit_conversion(part.unit)
    _check_quantity(part, own.quantity, path, book)
    reader = _OwnUnit(part, own.quantity, path, book)
    calibration = reader.calibration()
    return Tag(
        name=name,
        export=str(path[1]),
        column=part.column[0].name if part.column else "",
        unit=part.unit,
        quantity=own.quantity,
        scale=own.scale,
        offset=own.offset,
        si_unit=own.si_unit,
        between=part.between,
        stamp_marks=part.stamp_marks if isinstance(part, MeanTag | AmountTag) else None,
        hold_s=part.hold.value if part.hold is not None else 0.0,
        calibration=calibration,
        random=reader.random(),
        deadband=reader.size("deadband", part.deadband) if isinstance(part, StepTag | LineTag) else None,
        resolution=reader.size("resolution", part.resolution),
        full_scale=reader.size("full_scale", part.full_scale) if isinstance(part, CounterTag) else None,
        at_most=reader.rate(part.at_most) if isinstance(part, CounterTag) else None,
        believable=reader.believable(own.scale, own.offset),
        frozen_after_s=part.frozen_after.value
        if isinstance(part, InstantTag) and part.frozen_after
        else None,
        **value_tests(part, own, path, book),
        cut_off=reader.size("cut_off", part.cut_off) if isinstance(part, InstantTag) else None,
        pressure=part.pressure if isinstance(part, InstantTag) else None,
        basis=part.basis if isinstance(part, InstantTag) else None,
        same_quantity_as=part.same_quantity_as,
        line=book.line(path),
        declared_in=book.file(path),
    )


def _state(name: str, part: StateTag, path: KeyPath, book: FaultBook) -> Tag | None:
    if part.states is not None and not part.states:
        book.add(
            (*path, "states"),
            "no state is named",
            'write for example states = { "0" = "open", "1" = "closed" }',
        )
    if not book.clean(path):
        return None
    return Tag(
        name=name,
        export=str(path[1]),
        column=part.column[0].name,
        unit="",
        quantity="dimensionless",
        scale=1.0,
        offset=0.0,
        si_unit="1",
        between="state",
        stamp_marks=None,
        hold_s=part.hold.value,
        calibration=None,
        states=dict(part.states),
        line=book.line(path),
        declared_in=book.file(path),
    )


def _check_quantity(part: NumberTag, quantity: str, path: KeyPath, book: FaultBook) -> None:
    """Check that what the tag says of its number suits its unit."""
    if isinstance(part, CounterTag | AmountTag) and quantity not in RATES:
        book.add(
            (*path, "unit"),
            f'"{part.unit}" is a unit of {quantity}, which does not add up over time',
            "a counter or an amount is energy, volume or mass; "
            'of a level or a rate, between is "line", "step" or "mean"',
        )
    if not isinstance(part, InstantTag):
        return
    if quantity == "pressure" and part.pressure is None and book.clean((*path, "pressure")):
        book.add(
            (*path, "pressure"),
            'the key "pressure" is missing',
            'add pressure = "gauge" (against the air) or pressure = "absolute" (against vacuum)',
        )
    if quantity != "pressure" and part.pressure is not None:
        book.add(
            (*path, "pressure"),
            f'"{part.unit}" is no unit of pressure',
            "remove the key, or correct the unit",
        )
    if quantity != "fraction" and part.basis is not None:
        book.add(
            (*path, "basis"), f'"{part.unit}" is no share of a gas', "remove the key, or correct the unit"
        )
    if quantity == "temperature" and part.cut_off is not None:
        book.add((*path, "cut_off"), "a temperature has no size below which it is nothing", "remove the key")


class _OwnUnit:
    """Reads the keys of one tag that are written in its own unit."""

    def __init__(self, part: NumberTag, quantity: str, path: KeyPath, book: FaultBook) -> None:
        self._part, self._quantity, self._path, self._book = part, quantity, path, book

    def size(self, key: str, written: float | str | None) -> float | None:
        """Difference or amount in SI."""
        if written is None:
            return None
        path = (*self._path, key)
        size = self._book.attempt(path, in_own_unit, written, self._part.unit, self._quantity)
        if size == 0.0 and key == "full_scale":
            self._book.add(path, "a counter cannot begin again at zero", "write its largest reading")
        return size

    def rate(self, written: float | str | None) -> float | None:
        """Largest rate of a counter, SI per second."""
        if written is None or self._quantity not in RATES:
            return None
        rate = RATES[self._quantity], f"1300 {RATE_UNITS[self._quantity]}"
        path = (*self._path, "at_most")
        read = self._book.attempt(path, amount, written, *rate)
        if read is not None and read.value <= 0.0:
            self._book.add(
                path, f"{shown(read.declared)} is not above zero", f'write for example "{rate[1]}"'
            )
        return None if read is None else read.value

    def believable(self, scale: float, offset: float) -> tuple[float, float] | None:
        """Believable range in SI."""
        written = self._part.believable
        if written is None:
            return None
        path = (*self._path, "range")
        if len(written) != 2 or not written[0] < written[1]:
            self._book.add(
                path, f"{written} is no range", "write the least and the largest value: range = [0, 700]"
            )
            return None
        return scale * written[0] + offset, scale * written[1] + offset

    def calibration(self) -> Uncertainty | None:
        """Calibration part; of a counter or an amount it is that of the rate."""
        key: UncertaintyKind = "standard" if self._part.limit is None else "limit"
        written = self._part.standard if self._part.limit is None else self._part.limit
        if written is None:
            return None
        path = (*self._path, key)
        if not isinstance(self._part, CounterTag | AmountTag):
            return self._book.attempt(path, uncertainty, written, key, self._part.unit, self._quantity)
        if self._quantity not in RATES:
            return None
        return self._book.attempt(path, _of_rate, written, key, self._quantity)

    def random(self) -> Uncertainty | None:
        """Random part of one sample."""
        written = self._part.random
        if written is None:
            return None
        path = (*self._path, "random")
        read = self._book.attempt(path, uncertainty, written, "standard", self._part.unit, self._quantity)
        if read is not None and read.relative and isinstance(self._part, CounterTag):
            self._book.add(
                path,
                "a counter's scatter does not grow with its reading",
                f"write it in {self._part.unit}: random = 0.5",
            )
        return read


def _of_rate(written: UncertaintyText, kind: UncertaintyKind, quantity: str) -> Uncertainty:
    terms = written if isinstance(written, list) else [written]
    unit = RATE_UNITS[quantity]
    if any(isinstance(term, float) for term in terms):
        raise UnusableError(
            f"the bare number in {written} is an error of the index, which cancels in its differences",
            f'write it in percent of the reading ("1 %"), or of a rate ("1 % of 1200 {unit}")',
        )
    return uncertainty(written, kind, unit, RATES[quantity])
