"""Columns of one export: its layout, its decimal mark, the units it names, and tags to propose."""

from __future__ import annotations

import re
import unicodedata
from collections import Counter
from collections.abc import Iterable, Mapping, Sequence
from functools import lru_cache
from typing import Literal

from auditor.drafting.first_look import Table, is_number
from auditor.drafting.gathering import Column, Gathered
from auditor.drafting.proposals import UnitFound
from auditor.units import UnitError, meanings, split_qualifier

_MOST_LONG_COLUMNS = 8
_LINES_COMPARED = 2_000
_POINT = re.compile(r"[+-]?\d*\.\d+(?:[eE][+-]?\d+)?")
_COMMA = re.compile(r"[+-]?\d*,\d+(?:[eE][+-]?\d+)?")
_THOUSANDS_LIKE = re.compile(r"[+-]?[1-9]\d{0,2}[.,]\d{3}")
_BRACKETS = re.compile(r"(?P<open>[\[({])\s*(?P<unit>[^\[\](){}]*(?:\([^()]*\)[^\[\](){}]*)?)\s*[\])}]\s*$")


def long_layout(gathered: Gathered, columns: Mapping[str, Column]) -> tuple[str, str, str] | None:
    """Headings of stamp, tag and value where one stamp stands on several rows under several names."""
    table = gathered.pieces[0].table
    names = [name for place, name in enumerate(table.headings) if name and place not in table.stamp]
    if len(table.stamp) != 1 or not 2 <= len(names) <= _MOST_LONG_COLUMNS:
        return None
    numeric = [name for name in names if _share(columns[name].texts) > 0.5 and not is_fixed(columns[name])]
    texts = [name for name in names if _share(columns[name].texts) < 0.5]
    stamp = table.headings[table.stamp[0]]
    for text in texts:
        if numeric and _repeats_by_name(gathered, stamp, text):
            return stamp, text, numeric[0]
    return None


def _share(texts: Iterable[str]) -> float:
    filled = [text for text in texts if text]
    return sum(is_number(text) for text in filled) / len(filled) if filled else 0.5


def is_fixed(column: Column) -> bool:
    """Whether all filled cells of a column are the same."""
    return len({text for text in column.texts if text}) <= 1


def _repeats_by_name(gathered: Gathered, stamp: str, text: str) -> bool:
    """Whether some stamps stand on several rows, each time with other names."""
    several, doubled = 0, 0
    for piece in gathered.pieces:
        headings = piece.table.headings
        if stamp not in headings or text not in headings:
            continue
        at, place = headings.index(stamp), headings.index(text)
        rows = [row for row in piece.rows(most=_LINES_COMPARED) if len(row) > max(at, place)]
        names: dict[str, list[str]] = {}
        for row in rows:
            names.setdefault(row[at], []).append(row[place])
        several += sum(len(set(found)) > 1 for found in names.values())
        doubled += sum(len(set(found)) < len(found) for found in names.values())
    return several >= 2 and several > 5 * doubled


def long_columns(
    gathered: Gathered, columns: Mapping[str, Column], layout: tuple[str, str, str]
) -> tuple[dict[str, Column], dict[str, str]]:
    """Cells by the name in the tag column, and for each the unit that a column of units names."""
    _, tag, value = layout
    texts: dict[str, list[str]] = {}
    pieces: dict[str, list[int]] = {}
    for name, text, piece in zip(columns[tag].texts, columns[value].texts, columns[tag].pieces, strict=True):
        if name:
            texts.setdefault(name, []).append(text)
            pieces.setdefault(name, []).append(piece)
    by_name = {name: Column(tuple(texts[name]), tuple(pieces[name])) for name in sorted(texts)}
    return by_name, _unit_column(columns, tag, [name for name in columns if name not in layout])


def _unit_column(columns: Mapping[str, Column], tag: str, others: Sequence[str]) -> dict[str, str]:
    for other in others:
        if _share(columns[other].texts) > 0.0:
            continue
        found: dict[str, set[str]] = {}
        for name, text in zip(columns[tag].texts, columns[other].texts, strict=True):
            found.setdefault(name, set()).add(text)
        if all(len(texts) == 1 and _unit(next(iter(texts))) for texts in found.values()):
            return {name: next(iter(texts)) for name, texts in found.items()}
    return {}


def decimal_mark(cells: Iterable[str], delimiter: str) -> tuple[Literal[".", ","] | None, str]:
    """Decide the decimal mark, or say why it is left blank.

    Examples
    --------
    >>> decimal_mark(["20,5", "3"], ";")
    (',', 'numbers such as "20,5"')
    >>> decimal_mark(["1.234", "2.500"], ";")[0] is None
    True
    """
    points: list[str] = []
    commas: list[str] = []
    for text in cells:
        if _POINT.fullmatch(text):
            points.append(text)
        elif _COMMA.fullmatch(text):
            commas.append(text)
    proven: dict[Literal[".", ","], list[str]] = {
        ".": [text for text in points if not _THOUSANDS_LIKE.fullmatch(text)],
        ",": [text for text in commas if not _THOUSANDS_LIKE.fullmatch(text)],
    }
    counts = Counter({mark: len(found) for mark, found in proven.items()})
    mark, count = (".", counts["."]) if counts["."] >= counts[","] else (",", counts[","])
    other = counts["," if mark == "." else "."]
    if count and not other:
        return (
            (".", f'numbers such as "{proven["."][0]}"')
            if mark == "."
            else (
                ",",
                f'numbers such as "{proven[","][0]}"',
            )
        )
    if count:
        return None, f'both marks were seen: "{proven["."][0]}" and "{proven[","][0]}"'
    if points and not commas and delimiter == ",":
        return ".", f'numbers such as "{points[0]}", and commas separate the columns'
    if points or commas:
        text = (points or commas)[0]
        whole, part = re.split("[.,]", text)
        return None, f'"{text}" may be {whole}{part}, or {whole} and {int(part)} thousandths'
    return None, "only whole numbers were seen"


_HEADING_WORDS = {
    "temperature": r"temp",
    "flow": r"flow|durchfl|volumenstrom|massenstrom|d[ée]bit|fl[öø]de|caudal|portata",
    "power": r"power|leistung|puissance|effekt|potencia|potenza",
    "pressure": r"press|druck|tryck|tryk|presi[óo]n",
    "energy or amount": r"energ|counter|total|z[äa]hler|compteur|contador",
}
"""How headings of a few languages name what they hold; common practice, no source. A hint, never a unit."""


def _heading_hint(heading: str) -> str:
    """Say what a heading without a unit reads like; empty where its words tell nothing.

    Examples
    --------
    >>> _heading_hint("Durchfluss V40"), _heading_hint("OR-G")
    ('; its heading reads like a flow', '')
    """
    kinds = [kind for kind, words in _HEADING_WORDS.items() if re.search(words, heading, re.IGNORECASE)]
    if len(kinds) != 1:
        return ""
    return f"; its heading reads like {'an' if kinds[0][0] in 'aeiou' else 'a'} {kinds[0]}"


def unit_of(heading: str, rows: Iterable[tuple[str, str]]) -> UnitFound:
    """Say which unit an export names for a column.

    Parameters
    ----------
    heading : str
        Heading of the column; brackets at its end may hold a unit.
    rows : iterable of (str, str)
        Texts that unit rows or a unit column give, each with where it stands.

    Examples
    --------
    >>> unit_of("T flow [°C]", ()).unit, unit_of("P", [("bar(g)", "unit row, line 2")]).unit
    ('degC', 'bar')
    >>> unit_of("Volume (gal)", ()).unit
    ''
    """
    written = [(text, where) for text, where in rows if text]
    if not written:
        found = _BRACKETS.search(heading)
        if found is None:
            return UnitFound("", "", "", "nothing in the export names it" + _heading_hint(heading))
        # One letter in round brackets is as often a phase or a place as a unit.
        if (found["open"] == "(" and len(found["unit"]) == 1 and found["unit"] != "%") or found[
            "unit"
        ].isdigit():
            return UnitFound("", "", "", f'is the "{found["unit"]}" in brackets its unit?')
        written = [(found["unit"], "in brackets in the heading")]
    read = {_unit(text)[:2] for text, _ in written}
    text, where = written[0]
    if len(read) > 1:
        shown = " and ".join(dict.fromkeys(f'"{text}"' for text, _ in written))
        return UnitFound(text, "", "", f"the files differ: {shown}")
    unit, quantity, beyond = _unit(text)
    if not unit:
        return UnitFound(text, "", "", f'the export writes "{text}", which {beyond}')
    because = f'"{text}", {where}' + (f"; {beyond}" if beyond else "")
    return UnitFound(text, unit, quantity, because)


@lru_cache(maxsize=4096)
def _unit(text: str) -> tuple[str, str, str]:
    """Return unit and quantity of a text, and what it says beyond them or why it is not understood."""
    unit, qualifier = split_qualifier(text)
    try:
        meaning = meanings(unit)[0]
    except UnitError as error:
        return "", "", error.reason
    beyond = ""
    if qualifier in ("gauge", "absolute"):
        beyond = "what this says of gauge or absolute is for you to confirm"
    elif qualifier is not None:
        beyond = "which state of the gas this is, is declared with the fuel and its meter"
    return meaning.shown, meaning.quantity, beyond


def tag_name(column: str) -> str:
    """Return a name for a tag that TOML takes without quotes: the heading without its brackets.

    Examples
    --------
    >>> tag_name("Temperatur Kühler 1 [ °C]"), tag_name("OR-G")
    ('Temperatur_Kuhler_1', 'OR-G')
    """
    bare = _BRACKETS.sub("", column).strip() or column
    plain = unicodedata.normalize("NFKD", bare).encode("ascii", "ignore").decode("ascii")
    name = re.sub(r"[^A-Za-z0-9_-]+", "_", plain).strip("_")
    return name or "tag"


def unit_rows(tables: Iterable[Table], heading: str) -> list[tuple[str, str]]:
    """Texts that the unit rows of the files give for a heading."""
    found: dict[str, str] = {}
    for table in tables:
        if table.unit_line is not None and heading in table.headings:
            text = table.units[table.headings.index(heading)]
            found.setdefault(text, f"unit row, line {table.unit_line}")
    return list(found.items())
