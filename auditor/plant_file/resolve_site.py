"""The site, its rules, and a person's own exclusions, from checked parts to records."""

from __future__ import annotations

import re
from collections.abc import Mapping

from auditor.plant_file.clocks import instant_us
from auditor.plant_file.export_parts import ExportPart, FilePerTagPart, LongLayoutPart, PairsLayoutPart
from auditor.plant_file.faults import FaultBook, UnusableError, choices
from auditor.plant_file.leaves import FIXED_OFFSET
from auditor.plant_file.quantities import Amount, UncertaintyKind, assumed, uncertainty
from auditor.plant_file.site_parts import (
    AltitudePressure,
    BarometerPressure,
    DistrustPart,
    RulesPart,
    SitePart,
)
from auditor.plant_file.standard_air import HIGHEST_ALTITUDE_M, LOWEST_ALTITUDE_M, standard_pressure_Pa
from auditor.records.plant import (
    AirPressure,
    Distrust,
    Export,
    FilePerTag,
    LongLayout,
    PairsLayout,
    Quality,
    Rules,
    Site,
    Tag,
)
from auditor.records.uncertain import Assumed

_HOUR_S = 3600


def resolve_site(part: SitePart | None, book: FaultBook) -> Site | None:
    """Make the record of the site; None when something of it is at fault."""
    if part is None:
        return None
    tick_s = _grid_step(part.tick, "tick", book)
    interval_s = _grid_step(part.interval, "interval", book)
    if tick_s and interval_s and interval_s % tick_s:
        book.add(
            ("site", "interval"),
            f"{part.interval.declared} is no whole number of ticks of {part.tick.declared}",
            "make the interval a multiple of the tick",
        )
    air_pressure = _air_pressure(part, book)
    if not book.clean(("site",)) or tick_s is None or interval_s is None:
        return None
    return Site(
        name=part.name,
        zone=part.zone,
        altitude_m=_si(part.altitude),
        air_pressure=air_pressure,
        reference_temperature_K=_si(part.reference_temperature),
        tick_s=tick_s,
        interval_s=interval_s,
    )


def _si(amount: Amount | None) -> float | None:
    return None if amount is None else amount.value


def _grid_step(length: Amount | None, key: str, book: FaultBook) -> int | None:
    if length is None:
        return None
    seconds = round(length.value)
    if seconds < 1 or abs(seconds - length.value) > 1e-9 or _HOUR_S % seconds:
        book.add(
            ("site", key),
            f"{length.declared} does not divide one hour into equal steps",
            f'write for example {key} = "{"1 min" if key == "tick" else "15 min"}"; '
            "days have 23, 24 or 25 hours, so only a step that divides the hour fits every day",
        )
        return None
    return seconds


def _air_pressure(part: SitePart, book: FaultBook) -> AirPressure | None:
    declared = part.air_pressure
    if isinstance(declared, BarometerPressure):
        return AirPressure(declared.tag, None)
    if not isinstance(declared, AltitudePressure):
        return None
    if part.altitude is None:
        if book.clean(("site", "altitude")):
            book.add(
                ("site", "altitude"),
                'the key "altitude" is missing, but the air pressure is to follow from it',
                'add altitude = "85 m", or name a barometer: air_pressure = { tag = "barometer" }',
            )
        return None
    pressure = book.attempt(("site", "altitude"), _pressure_at, part.altitude)
    number = (
        None if pressure is None else book.attempt(("site", "air_pressure"), _with_spread, pressure, declared)
    )
    return None if number is None else AirPressure(None, number)


def _pressure_at(altitude: Amount) -> Amount:
    if not LOWEST_ALTITUDE_M <= altitude.value <= HIGHEST_ALTITUDE_M:
        raise UnusableError(
            f'no plant stands at "{altitude.declared}"',
            "write the site's altitude above sea level, in m or ft",
        )
    pressure_Pa = standard_pressure_Pa(altitude.value)
    return Amount(
        pressure_Pa, "Pa", "pressure", f"{pressure_Pa / 1e3:.2f} kPa from the altitude {altitude.declared}"
    )


def _with_spread(pressure: Amount, declared: AltitudePressure) -> Assumed:
    kind: UncertaintyKind = "standard" if declared.limit is None else "limit"
    written = declared.standard if declared.limit is None else declared.limit
    if written is None:
        raise UnusableError("the air pressure has no uncertainty", 'add standard = "0.9 kPa"')
    if any(isinstance(term, float) for term in (written if isinstance(written, list) else [written])):
        raise UnusableError(
            f"the uncertainty {written} has no unit", f'write it with its unit: {kind} = "0.9 kPa"'
        )
    return assumed("site.air_pressure", pressure, uncertainty(written, kind, "Pa", "pressure"), "Pa")


def check_barometer(part: SitePart | None, tags: Mapping[str, Tag | None], book: FaultBook) -> None:
    """Check that a named barometer is a tag of absolute pressure."""
    if part is None or not isinstance(part.air_pressure, BarometerPressure) or part.air_pressure.tag is None:
        return
    name, path = part.air_pressure.tag, ("site", "air_pressure", "tag")
    if name not in tags:
        book.add(path, f'there is no tag "{name}"', choices(name, tags))
        return
    tag = tags[name]
    against_air = tag is not None and any(then.pressure == "gauge" for _, _, then in tag.stretches)
    if tag is not None and (tag.quantity != "pressure" or against_air):
        book.add(
            path,
            f'tag "{name}" is no absolute pressure',
            'name a tag in a unit of pressure with pressure = "absolute"',
        )


def resolve_rules(part: RulesPart | None, book: FaultBook) -> Rules | None:
    """Make the record of the coverage thresholds."""
    if part is None:
        return None
    shares = {name: getattr(part, name) for name in RulesPart.model_fields}
    for name, share in shares.items():
        if share is not None and share.value > 1.0:
            book.add(("rules", name), f'"{share.declared}" is more than all of it', 'write at most "100 %"')
    firm, publish = part.firm_coverage, part.publish_coverage
    if firm is not None and publish is not None and publish.value > firm.value:
        book.add(
            ("rules", "publish_coverage"),
            f"figures would be withheld below {publish.declared} yet firm from {firm.declared} on",
            "make publish_coverage no larger than firm_coverage",
        )
    if not book.clean(("rules",)):
        return None
    return Rules(**{name: share.value for name, share in shares.items()})


def resolve_export(name: str, part: ExportPart, book: FaultBook) -> Export | None:
    """Make the record of one export; its tags are made apart."""
    path = ("exports", name)
    keeps_time = part.clock is not None and (part.clock == "UTC" or FIXED_OFFSET.fullmatch(part.clock))
    if part.repeated_hour is not None and keeps_time:
        book.add(
            (*path, "repeated_hour"),
            f'the clock "{part.clock}" never repeats an hour',
            "remove the key, or write the zone whose summer time the logger follows as the clock",
        )
    if part.stamp is not None and isinstance(part.layout, LongLayoutPart | PairsLayoutPart):
        book.add((*path, "stamp"), "the layout names the stamp already", "remove one of the two")
    if part.thousands is not None and part.thousands == part.decimal:
        book.add(
            (*path, "thousands"),
            f'"{part.thousands}" cannot both group the digits and be the decimal mark',
            "correct one of the two, or remove thousands where the digits are not grouped",
        )
    counts_seconds = part.date_order is not None and part.date_order.startswith("epoch")
    if counts_seconds and part.clock not in (None, "UTC"):
        book.add(
            (*path, "clock"),
            f"{part.date_order} are counted in UTC, not on the clock of {part.clock}",
            'write clock = "UTC"',
        )
    if not book.clean(path):
        return None
    return Export(
        name=name,
        files=part.files,
        clock=part.clock,
        repeated_hour=part.repeated_hour or "by order",
        date_order=part.date_order,
        decimal=part.decimal,
        delimiter="\t" if part.delimiter == "tab" else part.delimiter,
        encoding=part.encoding,
        layout=_layout(part),
        stamp_columns=part.stamp or (),
        sentinels=tuple(part.sentinels or ()),
        status_words=dict(part.status_words or {}),
        when_stamps_repeat=part.when_stamps_repeat,
        tags=tuple(part.tags),
        thousands=part.thousands,
        month_names=part.month_names or (),
    )


def _layout(part: ExportPart) -> LongLayout | PairsLayout | FilePerTag | None:
    layout = part.layout
    if layout is None:
        return None
    if isinstance(layout, PairsLayoutPart):
        return PairsLayout()
    if isinstance(layout, FilePerTagPart):
        return FilePerTag(layout.value, layout.tag_in_file_name, layout.tag_in_preamble)
    quality = None if layout.quality is None else Quality(layout.quality.column, layout.quality.good)
    return LongLayout(layout.stamp, layout.tag, layout.value, quality)


def check_patterns(exports: Mapping[str, ExportPart], book: FaultBook) -> None:
    """Check that no pattern is claimed by two exports: every file belongs to one of them."""
    claimed: dict[str, str] = {}
    for name, part in exports.items():
        for pattern in part.files or ():
            plain = re.sub(r"^(?:\./)+", "", pattern)
            if plain in claimed and claimed[plain] != name:
                book.add(
                    ("exports", name, "files"),
                    f'the pattern "{pattern}" is claimed by the export "{claimed[plain]}" already',
                    "give each export its own files",
                )
            claimed.setdefault(plain, name)


def resolve_distrust(
    parts: list[DistrustPart] | None, zone: str | None, tags: Mapping[str, Tag | None], book: FaultBook
) -> tuple[Distrust, ...]:
    """Make the records of a person's own exclusions."""
    return tuple(
        record
        for index, part in enumerate(parts or [])
        if (record := _distrust(part, index, zone, (tags, book))) is not None
    )


def _distrust(
    part: DistrustPart, index: int, zone: str | None, known: tuple[Mapping[str, Tag | None], FaultBook]
) -> Distrust | None:
    tags, book = known
    path = ("distrust", index)
    if part.tag is not None and part.tag not in tags:
        book.add((*path, "tag"), f'there is no tag "{part.tag}"', choices(part.tag, tags))
    if part.from_ is None or part.until is None or zone is None:
        return None
    start_us, end_us = instant_us(part.from_, zone), instant_us(part.until, zone, later=True)
    if end_us <= start_us:
        book.add(
            (*path, "until"),
            f"{part.until.isoformat()} is not after {part.from_.isoformat()}",
            "write the moment from which the tag is believed again; a bare date means its midnight",
        )
    if not book.clean(path):
        return None
    return Distrust(part.tag, start_us, end_us, part.reason, book.line(path))
