"""Parts of the plant file about exports: one table for each kind of file, one for each tag in it."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType
from typing import Annotated, Any, ClassVar, Literal

from pydantic import GetJsonSchemaHandler
from pydantic.json_schema import JsonSchemaValue
from pydantic_core import CoreSchema

from auditor.plant_file.aliases import ColumnHeadings
from auditor.plant_file.leaves import (
    Clock,
    Duration,
    Encoding,
    FilePatterns,
    MonthNames,
    NameOrNames,
    OneLine,
    OwnUnitValue,
    Spread,
    StampColumns,
    TagListFile,
    TagPattern,
    UnitText,
)
from auditor.plant_file.parts import Choice, Part, keys_of, optional, required
from auditor.plant_file.tag_changes import (
    CounterTagChange,
    InstantTagChange,
    MeanTagChange,
    NumberTagChange,
)

_BETWEEN = "what the value means between two stamps: step, line, mean, amount, counter or state"
_HOLD = "longest time between two samples that is still covered"
_FULL_STRETCH = "longest stretch that one stamp can stand for"
_COLUMN = (
    "heading of the column; in a long export, or with one file per tag, the name of the tag there; "
    "a list where it was renamed, with from and until where the dates matter"
)
_CHANGES = "what is different about the tag from a date on: unit, range, uncertainty..."
_KELVINS = [{"from": "2026-07-20", "unit": "K"}, {"from": "2026-07-21", "unit": "degC"}]
_EXCHANGE = [{"from": "2026-07-10T08:00:00", "standard": "0.5 %"}]
_UNCERTAINTY = 'a bare number is in the tag\'s own unit, "2 %" is of the reading, "2 % of 1200 kW" of a span'


class NumberTag(Part):
    """What every tag has whose cells hold numbers."""

    either: ClassVar[tuple[tuple[str, str], ...]] = (("standard", "limit"),)

    column: ColumnHeadings = required(_COLUMN, "OR-G")
    unit: UnitText = required("unit of the logged number", "kW")
    standard: Spread | None = optional(f"one standard uncertainty; {_UNCERTAINTY}", "0.5 %")
    limit: Spread | None = optional(
        f"class limit of the instrument (rectangular); {_UNCERTAINTY}", "2 % of 1200 kW"
    )
    random: Spread | None = optional(
        "standard uncertainty of the random part of one sample; estimated from the log without it", 0.5
    )
    resolution: OwnUnitValue | None = optional("smallest step of the logged number", "0.1 kWh")
    believable: list[float] | None = optional(
        "least and largest believable value, in the tag's own unit", [0, 700], alias="range"
    )
    same_quantity_as: OneLine | None = optional(
        "tag of another meter of the very same thing, or of its counter: the two are compared, nothing else",
        "gross_power",
    )


class EvidencePart(Part):
    """What another tag must show for a zero not to be believed."""

    either: ClassVar[tuple[tuple[str, str], ...]] = (("above", "is"),)

    tag: OneLine = required("the other tag", "breaker")
    above: OwnUnitValue | None = optional("it speaks against a zero while it is above this value", "20 kW")
    is_: OneLine | None = optional("it speaks against a zero while it is in this state", "closed", alias="is")


class PlainTag(NumberTag):
    """A tag of a level, a rate or an amount, not of the reading of a counter."""

    not_zero_while: EvidencePart | None = optional(
        "when an exact zero cannot be true: such zeros, and the ticks they touch, count as missing",
        {"tag": "breaker", "is": "closed"},
    )


class InstantTag(PlainTag):
    """A tag whose number is a level or a rate, not an amount."""

    spike: OwnUnitValue | None = optional(
        'how far one or two samples may stand from their neighbours: a size, or "6 times its scatter"', "5 K"
    )
    change_at_most: OneLine | None = optional(
        "largest believable change within the time it names, and in proportion over a longer one", "5 K/min"
    )
    saturates_at: list[float] | None = optional(
        "value at which the reading stays when the quantity goes on: the upper end, or the lower and the "
        "upper end, in the tag's own unit",
        [700],
    )

    frozen_after: Duration | None = optional(
        "time without any change after which the tag counts as frozen while the plant runs", "2 h"
    )
    cut_off: OwnUnitValue | None = optional("size below which a flow or power counts as zero", "0.5 m3/h")
    pressure: Literal["gauge", "absolute"] | None = optional(
        "whether a pressure is read against the air or against vacuum; required for every pressure", "gauge"
    )
    basis: Literal["dry", "wet"] | None = optional(
        "whether a gas is analysed dry or wet; required where oxygen gives a flue-gas flow", "dry"
    )


class StepTag(InstantTag):
    """The value holds until the next one is stored."""

    between: Literal["step"] = required(_BETWEEN, "step")
    hold: Duration = required(_HOLD, "60 min")
    deadband: OwnUnitValue | None = optional("change that it takes before a new value is stored", "5 K")
    changes: list[InstantTagChange] | None = optional(_CHANGES, _KELVINS)


class LineTag(InstantTag):
    """Between two stamps the value runs along a straight line."""

    between: Literal["line"] = required(_BETWEEN, "line")
    hold: Duration = required(_HOLD, "5 min")
    deadband: OwnUnitValue | None = optional("change that it takes before a new value is stored", "0.5 K")
    changes: list[InstantTagChange] | None = optional(_CHANGES, _KELVINS)


class MeanTag(InstantTag):
    """The value is the mean over the stretch that its stamp marks."""

    between: Literal["mean"] = required(_BETWEEN, "mean")
    stamp_marks: Literal["start", "end"] = required("which end of its stretch the stamp marks", "end")
    hold: Duration = optional(_FULL_STRETCH, "15 min", default="1 h")
    changes: list[MeanTagChange] | None = optional(_CHANGES, _KELVINS)


class AmountTag(PlainTag):
    """The value is the amount in the stretch that its stamp marks."""

    between: Literal["amount"] = required(_BETWEEN, "amount")
    stamp_marks: Literal["start", "end"] = required("which end of its stretch the stamp marks", "end")
    hold: Duration = optional(_FULL_STRETCH, "15 min", default="1 h")
    changes: list[NumberTagChange] | None = optional(_CHANGES, _EXCHANGE)


class CounterTag(NumberTag):
    """The value is the reading of an index that counts up."""

    between: Literal["counter"] = required(_BETWEEN, "counter")
    at_most: OwnUnitValue = required("largest believable rate of the counter", "1300 kW")
    hold: Duration = optional(
        "longest time between two readings over which their difference is spread", "15 min", default="15 min"
    )
    full_scale: OwnUnitValue | None = optional(
        "number of units after which the counter begins again at zero: of seven digits, 10000000",
        "10000000 kWh",
    )
    changes: list[CounterTagChange] | None = optional(_CHANGES, _EXCHANGE)


class StateTag(Part):
    """The cell holds a state: a breaker, a mode."""

    column: ColumnHeadings = required(_COLUMN, "BKR")
    between: Literal["state"] = required(_BETWEEN, "state")
    hold: Duration = required(_HOLD, "5 min")
    states: dict[str, OneLine] = required(
        "every raw text of the export with the name of its state", {"0": "open", "1": "closed"}
    )


AnyTag = StepTag | LineTag | MeanTag | AmountTag | CounterTag | StateTag
_TAG_FORMS: Mapping[str, type[Part]] = MappingProxyType(
    {
        "step": StepTag,
        "line": LineTag,
        "mean": MeanTag,
        "amount": AmountTag,
        "counter": CounterTag,
        "state": StateTag,
    }
)


class UndecidedTag(Part):
    """A tag that does not say what its value means between two stamps: nothing more can be checked."""

    also_known: ClassVar[frozenset[str]] = frozenset(
        key for form in _TAG_FORMS.values() for key in keys_of(form)
    )

    column: ColumnHeadings = required(_COLUMN, "OR-G")
    between: Literal["step", "line", "mean", "amount", "counter", "state"] = required(_BETWEEN, "line")


def tag_form(raw: Mapping[str, Any]) -> type[Part]:
    """Form of a tag, from what its value means between two stamps."""
    return _TAG_FORMS.get(str(raw.get("between")), UndecidedTag)


class QualityPart(Part):
    """Column of a long export that says whether its value is good."""

    column: OneLine = required("heading of the quality code", "quality")
    good: NameOrNames = required(
        "codes of good values, as they stand in the file; every other code is rejected and counted",
        ["192", "good"],
    )


class LongLayoutPart(Part):
    """Headings of a long export: one row per stamp, tag and value."""

    stamp: OneLine = required("heading of the stamp", "time")
    tag: OneLine = required("heading of the column that names the tag", "point")
    value: OneLine = required("heading of the value", "reading")
    quality: QualityPart | None = optional(
        "column that says whether the value is good", {"column": "quality", "good": ["192", "good"]}
    )


class PairsLayoutPart(Part):
    """Every tag has a stamp column of its own."""

    pairs: Literal[True] = required(
        "each tag's column has its own stamp column, at its left; the pairs may differ in length", True
    )


class FilePerTagPart(Part):
    """Every file holds one tag; a tag's "column" is the name found in the file's name or first lines."""

    either: ClassVar[tuple[tuple[str, str], ...]] = (("tag_in_file_name", "tag_in_preamble"),)

    tag_in_file_name: TagPattern | None = optional(
        "name of a file with {tag} where the name of its tag stands; * for any other text",
        "trend_{tag}_*.csv",
    )
    tag_in_preamble: TagPattern | None = optional(
        "line above the headings with {tag} where the name of the tag stands; * for any other text",
        "Point: {tag}",
    )
    value: OneLine = required("heading of the value", "reading")


def layout_form(raw: Mapping[str, Any]) -> type[Part]:
    """Form of a layout other than one column per tag."""
    if "pairs" in raw:
        return PairsLayoutPart
    return FilePerTagPart if {"tag_in_file_name", "tag_in_preamble"} & raw.keys() else LongLayoutPart


class ExportPart(Part):
    """One kind of export file."""

    @classmethod
    def __get_pydantic_json_schema__(
        cls, core_schema: CoreSchema, handler: GetJsonSchemaHandler, /
    ) -> JsonSchemaValue:
        """Let a tag list stand in the place of the tags."""
        schema = super().__get_pydantic_json_schema__(core_schema, handler)
        body = handler.resolve_ref_schema(schema)
        body["required"] = [key for key in body["required"] if key != "tags"]
        body["anyOf"] = [{"required": ["tags"]}, {"required": ["tag_list"]}]
        return schema

    files: FilePatterns = required(
        "patterns below logs/; where two of them hold the same stamp, the earlier one wins", ["power/*.csv"]
    )
    clock: Clock = required("whose clock the stamps are of: a zone, UTC or a fixed offset", "+01:00")
    date_order: Literal[
        "year first", "day first", "month first", "epoch seconds", "epoch milliseconds", "spreadsheet days"
    ] = required("how stamps are written; spreadsheet days are serial dates such as 45931.25", "day first")
    decimal: Literal[".", ","] = required("decimal mark of the numbers", ",")
    thousands: Literal["space", "'", ".", ","] | None = optional(
        "mark between groups of three digits; space stands for no-break and thin ones too", "space"
    )
    month_names: MonthNames | None = optional(
        "names of the months in the stamps, January first; English names are known without",
        ["jan", "feb", "mar", "apr", "maj", "jun", "jul", "aug", "sep", "okt", "nov", "dec"],
    )
    repeated_hour: Literal["by order", "drop"] | None = optional(
        "how the hour is resolved that an autumn clock change repeats; by order without it", "by order"
    )
    delimiter: Literal[",", ";", "tab"] | None = optional(
        "column separator; found from the files without it", ";"
    )
    encoding: Encoding | None = optional("text encoding; found from the files without it", "cp1252")
    layout: Annotated[LongLayoutPart | PairsLayoutPart | FilePerTagPart, Choice(layout_form)] | None = (
        optional(
            "only where a file is not one column per tag with one stamp: one row per stamp, tag and value;"
            " pairs of columns; or one file per tag",
            {"stamp": "time", "tag": "point", "value": "reading"},
        )
    )
    stamp: StampColumns | None = optional(
        "heading of the stamp, or two where date and time stand apart; the first column without it",
        ["Date", "Time"],
    )
    sentinels: list[float] | None = optional("numbers that stand for a missing value", [-9999])
    status_words: dict[str, float] | None = optional(
        "words that stand for a number; every other word is missing, kept and counted", {"off": 0}
    )
    when_stamps_repeat: Literal["keep first", "keep later", "reject both"] = optional(
        "which of several different values of one stamp is kept", "keep later", default="reject both"
    )
    tag_list: TagListFile | None = optional(
        "CSV file beside the plant file with one row per tag, the keys of a tag as columns", "tags.csv"
    )
    tags: dict[str, Annotated[AnyTag, Choice(tag_form)]] = required(
        "the tags read from this export, by the names used in this file",
        {"power": {"column": "OR-G", "unit": "kW", "between": "line", "hold": "5 min", "standard": "0.5 %"}},
    )
