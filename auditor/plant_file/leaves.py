"""The single values of a plant file: texts, amounts, uncertainties, clocks, each with its own complaint."""

from __future__ import annotations

import codecs
import re
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from datetime import date, datetime
from typing import Annotated, Any, TypeAlias
from zoneinfo import ZoneInfo, ZoneInfoNotFoundError, available_timezones

from pydantic import GetCoreSchemaHandler, GetJsonSchemaHandler
from pydantic.json_schema import JsonSchemaValue
from pydantic_core import CoreSchema, core_schema

from auditor.plant_file.faults import UnusableError, choices, nearest
from auditor.plant_file.quantities import Amount, UncertaintyText, amount, bare, unit_conversion
from auditor.plant_file.written import printable, shown
from auditor.records.machines import Role

FIXED_OFFSET = re.compile(r"([+-])(\d{2}):(\d{2})")


@dataclass(frozen=True, eq=False)  # by identity: the schema is no hashable thing
class Leaf:
    """How one kind of value is read, and how the JSON schema describes it."""

    read: Callable[[Any], Any]
    json_schema: Mapping[str, Any]

    def __get_pydantic_core_schema__(self, source: Any, handler: GetCoreSchemaHandler, /) -> CoreSchema:
        """Let the reader be all that a value passes through."""
        return core_schema.no_info_plain_validator_function(self.read)

    def __get_pydantic_json_schema__(
        self, schema: CoreSchema, handler: GetJsonSchemaHandler, /
    ) -> JsonSchemaValue:
        """Describe the value as the file writes it."""
        return dict(self.json_schema)


_TEXT_SCHEMA: Mapping[str, Any] = {"type": "string"}
_TEXTS_SCHEMA: Mapping[str, Any] = {"type": "array", "items": {"type": "string"}, "minItems": 1}
_TEXT_OR_TEXTS: Mapping[str, Any] = {"oneOf": [_TEXT_SCHEMA, _TEXTS_SCHEMA]}
_NUMBER_OR_TEXT: Mapping[str, Any] = {"type": ["number", "string"]}
_SPREAD_SCHEMA: Mapping[str, Any] = {
    "oneOf": [_NUMBER_OR_TEXT, {"type": "array", "items": _NUMBER_OR_TEXT, "minItems": 1}]
}
_ROLE_SCHEMA: Mapping[str, Any] = {"enum": [member.value for member in Role]}


def check_name(name: str) -> str:
    """Accept the name of a tag, stream, machine, fluid...: printable, on one line, no blanks around it."""
    if not name or name != name.strip() or not name.isprintable():
        raise UnusableError(
            f"the name {shown(name)} is empty, has blanks around it, or holds a control character",
            "write a name of printable characters",
        )
    return name


def one_line(text: object) -> str:
    """Accept printable text on one line."""
    return _text(text, allowed="")


def words(text: object) -> str:
    """Accept text that may run over several lines."""
    return _text(text, allowed="\n")


def _text(text: object, allowed: str) -> str:
    if not isinstance(text, str):
        raise UnusableError(f"{shown(text)} is no text", "write it in quotes")
    if not text.strip():
        raise UnusableError("the text is empty", "write something, or remove the key where it is optional")
    control = next((mark for mark in text if not mark.isprintable() and mark not in allowed), None)
    if control is not None:
        raise UnusableError(
            f"{shown(text)} holds a control character ({printable(control)})",
            "in double quotes a backslash begins an escape: write the text in single quotes, "
            "or / instead of the backslash",
        )
    return text


def file_pattern(text: object) -> str:
    r"""Accept a pattern of files below ``logs/``: relative, with ``/``."""
    pattern = one_line(text)
    parts = pattern.split("/")
    if "\\" in pattern or re.match(r"[A-Za-z]:", pattern) or pattern.startswith("/") or ".." in parts:
        raise UnusableError(
            f"{shown(pattern)} is no place below the folder logs/",
            'write it from the folder logs/ on, with "/" between folders: "power/*.csv"',
        )
    return pattern


def file_patterns(value: object) -> tuple[str, ...]:
    """Accept a list of patterns."""
    if not isinstance(value, list) or not value:
        raise UnusableError(f"{shown(value)} is no list of patterns", 'write files = ["power/*.csv"]')
    patterns = tuple(file_pattern(item) for item in value)
    twice = next((item for item in patterns if patterns.count(item) > 1), None)
    if twice is not None:
        raise UnusableError(f"the pattern {shown(twice)} is written twice", "write each pattern once")
    return patterns


def tag_list_file(text: object) -> str:
    """Accept the name of a CSV file in the site folder."""
    name = file_pattern(text)
    if re.search(r"[*?\[\]]", name) or not name.lower().endswith(".csv"):
        raise UnusableError(
            f"{shown(name)} is no CSV file of the site folder",
            'write its name, such as tag_list = "tags.csv"',
        )
    return name


def stamp_columns(value: object) -> tuple[str, ...]:
    """Accept one heading, or two where date and time stand apart."""
    columns = tuple(one_line(item) for item in (value if isinstance(value, list) else [value]))
    if len(columns) not in (1, 2) or len(set(columns)) != len(columns):
        raise UnusableError(
            f"{shown(value)} is neither one heading nor two",
            'write stamp = "Time" or stamp = ["Date", "Time"]',
        )
    return columns


def name_or_names(value: object) -> tuple[str, ...]:
    """Accept one name or a list of names."""
    names = tuple(one_line(item) for item in (value if isinstance(value, list) else [value]))
    if not names or len(set(names)) != len(names):
        raise UnusableError(
            f"{shown(value)} is empty or names something twice",
            "write one name, or a list of different names",
        )
    return names


def month_names(value: object) -> tuple[str, ...]:
    """Accept the names of the twelve months, January first."""
    names = tuple(one_line(item).strip() for item in (value if isinstance(value, list) else [value]))
    plain = {name.casefold() for name in names}
    if len(names) != 12 or len(plain) != 12 or any(re.search(r"[\d\s]", name) for name in names):
        raise UnusableError(
            f"{shown(value)} are not twelve different names without digits or blanks",
            "write the names of the twelve months as the export writes them, January first",
        )
    return names


def tag_pattern(text: object) -> str:
    """Accept a pattern in which ``{tag}`` stands once for the name of a tag."""
    pattern = one_line(text)
    if pattern.count("{tag}") != 1:
        raise UnusableError(
            f"{shown(pattern)} does not say where the name of the tag stands",
            'write {tag} once in its place and * for any other text: "trend_{tag}_*.csv", "Point: {tag}"',
        )
    return pattern


def zone(text: object) -> str:
    """Accept a zone of the IANA database."""
    name = one_line(text)
    try:
        ZoneInfo(name)
    except (ZoneInfoNotFoundError, ValueError, OSError) as error:
        near = nearest(name, sorted(available_timezones()))
        hint = f'; nearest is "{near}"' if near else ""
        raise UnusableError(
            f"{shown(name)} is no time zone", f'write an IANA zone, such as "Europe/Stockholm"{hint}'
        ) from error
    return name


def clock(text: object) -> str:
    """Accept a zone, ``UTC`` or a fixed offset from UTC."""
    name = one_line(text)
    offset = FIXED_OFFSET.fullmatch(name)
    if offset:
        if int(offset[2]) > 14 or int(offset[3]) > 59:
            raise UnusableError(f"{shown(name)} is no offset of any place on earth", 'write it as "+01:00"')
        return name
    if re.fullmatch(r"[+-].*|(?:UTC|GMT)[+-].*|Z", name):
        raise UnusableError(
            f"the offset {shown(name)} is not understood", 'write a fixed offset as "+01:00", or "UTC"'
        )
    try:
        return zone(name)
    except UnusableError as unusable:
        fix = unusable.fix.replace(
            "write an IANA zone", 'write "UTC", a fixed offset like "+01:00", or a zone'
        )
        raise UnusableError(f"{shown(name)} is no clock", fix) from unusable


def encoding(text: object) -> str:
    """Accept a text encoding that can be decoded here."""
    name = one_line(text)
    try:
        "".encode(name)
    except (LookupError, UnicodeError) as error:
        near = nearest(name, ("utf-8", "utf-16", "cp1252", "latin-1"))
        hint = f'; nearest is "{near}"' if near else ""
        raise UnusableError(
            f"{shown(name)} is no text encoding", f'write for example "cp1252" or "utf-8"{hint}'
        ) from error
    return codecs.lookup(name).name


def moment(value: object) -> date:
    """Accept a date, or a date with a time of day, as TOML writes them (no quotes)."""
    if isinstance(value, str):
        raise UnusableError(
            f"{shown(value)} stands in quotes", "write the date without quotes: 2026-07-28T09:00:00"
        )
    if not isinstance(value, date):
        raise UnusableError(f"{shown(value)} is no date", "write it as 2026-07-28 or 2026-07-28T09:00:00")
    return value


def spread(value: Any) -> UncertaintyText:
    """Accept the shape of an uncertainty: a number, a text, or a list of these."""
    parts = value if isinstance(value, list) else [value]
    if not parts or any(isinstance(part, bool) or not isinstance(part, int | float | str) for part in parts):
        raise UnusableError(
            f"{shown(value)} is no uncertainty",
            'write 0.2 (own unit), "0.5 K", "2 %", "2 % of 1200 kW", or a list of these',
        )
    return [part if isinstance(part, str) else float(part) for part in parts]


def number_or_text(value: Any) -> float | str:
    """Accept a number in the tag's own unit, or a text that names its unit."""
    if isinstance(value, bool) or not isinstance(value, int | float | str):
        raise UnusableError(
            f"{shown(value)} is neither a number nor a text",
            'write a number, or a text with a unit: "0.1 m3"',
        )
    return value


def ratio(value: object) -> Amount:
    """Accept a bare ratio such as 0.035, or the same in percent."""
    if isinstance(value, str):
        return amount(value, "fraction", "3.5 %")
    if isinstance(value, bool) or not isinstance(value, int | float):
        raise UnusableError(f"{shown(value)} is no number", 'write a ratio such as 0.035, or "3.5 %"')
    return bare(float(value))


def unit_text(value: object) -> str:
    """Accept a unit that is known."""
    text = one_line(value)
    unit_conversion(text)
    return text


def role(value: Any) -> Role:
    """Accept the role of a stream."""
    try:
        return Role(value)
    except ValueError as error:
        raise UnusableError(
            f"{shown(value)} is no role of a stream", choices(str(value), list(Role))
        ) from error


def measured(quantity: str, example: str, *, positive: bool = True) -> Leaf:
    """Leaf for an amount that carries its unit."""

    def read(value: object) -> Amount:
        number = amount(value, quantity, example)
        if positive and number.value <= 0.0:
            raise UnusableError(
                f"{shown(number.declared)} is not above zero", f'write for example "{example}"'
            )
        return number

    return Leaf(read, _TEXT_SCHEMA)


OneLine: TypeAlias = Annotated[str, Leaf(one_line, _TEXT_SCHEMA)]
Words: TypeAlias = Annotated[str, Leaf(words, _TEXT_SCHEMA)]
FilePatterns: TypeAlias = Annotated[tuple[str, ...], Leaf(file_patterns, _TEXTS_SCHEMA)]
TagListFile: TypeAlias = Annotated[str, Leaf(tag_list_file, _TEXT_SCHEMA)]
StampColumns: TypeAlias = Annotated[tuple[str, ...], Leaf(stamp_columns, _TEXT_OR_TEXTS)]
MonthNames: TypeAlias = Annotated[tuple[str, ...], Leaf(month_names, _TEXTS_SCHEMA)]
TagPattern: TypeAlias = Annotated[str, Leaf(tag_pattern, _TEXT_SCHEMA)]
NameOrNames: TypeAlias = Annotated[tuple[str, ...], Leaf(name_or_names, _TEXT_OR_TEXTS)]
Zone: TypeAlias = Annotated[str, Leaf(zone, _TEXT_SCHEMA)]
Clock: TypeAlias = Annotated[str, Leaf(clock, _TEXT_SCHEMA)]
Encoding: TypeAlias = Annotated[str, Leaf(encoding, _TEXT_SCHEMA)]
Moment: TypeAlias = Annotated[date | datetime, Leaf(moment, _TEXT_SCHEMA)]
Spread: TypeAlias = Annotated[UncertaintyText, Leaf(spread, _SPREAD_SCHEMA)]
OwnUnitValue: TypeAlias = Annotated[float | str, Leaf(number_or_text, _NUMBER_OR_TEXT)]
Ratio: TypeAlias = Annotated[Amount, Leaf(ratio, _NUMBER_OR_TEXT)]
UnitText: TypeAlias = Annotated[str, Leaf(unit_text, _TEXT_SCHEMA)]
RoleName: TypeAlias = Annotated[Role, Leaf(role, _ROLE_SCHEMA)]
Duration: TypeAlias = Annotated[Amount, measured("time", "5 min")]
Share: TypeAlias = Annotated[Amount, measured("fraction", "50 %")]
Altitude: TypeAlias = Annotated[Amount, measured("length", "85 m", positive=False)]
Temperature: TypeAlias = Annotated[Amount, measured("temperature", "25 degC")]
Power: TypeAlias = Annotated[Amount, measured("power", "1200 kW")]
HeatCapacity: TypeAlias = Annotated[Amount, measured("heat capacity", "2.35 kJ/(kg K)")]
Density: TypeAlias = Annotated[Amount, measured("density", "840 kg/m3")]
VolumeRatio: TypeAlias = Annotated[Amount, measured("volume ratio", "9.6 m3/m3")]
VolumeExpansion: TypeAlias = Annotated[Amount, measured("volume expansion", "0.0008 1/K")]
