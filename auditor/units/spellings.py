"""Unit texts as loggers and people write them, and what each of them means.

A general unit parser answers these texts, and wrongly: a bare C is a coulomb
to it, T/h tesla per hour, bar(g) bar times gram, Nm3 newton cubic metres. So
every spelling that is understood stands in this one table, with an expression
that the unit library reads without doubt and the kind of quantity it measures.
What a spelling says beyond its unit (gauge, normal state) is split off and
never converted: it is declared as such in the plant file.
"""

from __future__ import annotations

import difflib
import re
import unicodedata
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import Final, Literal

from auditor.units.table import REFUSED, ROWS

Qualifier = Literal["gauge", "absolute", "normal state", "standard state"]


class UnitError(ValueError):
    """A unit or amount that cannot be understood without guessing.

    Attributes
    ----------
    text : str
        What was written.
    reason : str
        What is wrong with it, as the rest of a sentence that begins with the text.
    suggestions : tuple of str
        Spellings that would be understood; possibly empty.
    """

    def __init__(self, text: str, reason: str, suggestions: Iterable[str] = ()) -> None:
        self.text, self.reason, self.suggestions = text, reason, tuple(suggestions)
        super().__init__(text, reason, self.suggestions)

    def __str__(self) -> str:
        """One sentence, with what to write instead."""
        sentence = f'"{self.text}" {self.reason}'
        if self.suggestions:
            sentence += "; write " + " or ".join(f'"{word}"' for word in self.suggestions)
        return sentence


@dataclass(frozen=True)
class Meaning:
    """What one spelling stands for."""

    quantity: str
    expression: str
    """For the unit library; of a temperature, its scale."""
    shown: str = field(compare=False)
    """The spelling that messages use."""


# A degree sign as other encodings and typists leave it: masculine ordinal, ring above, UTF-8 read
# as cp1252, the mark of an undecodable byte, and a plain question mark.
_DEGREE = re.compile(r"(?:Â°|Âº|°|º|˚|ï¿½|\ufffd|\?)(?=\s*[CFK]\b)")
_MIS_STORED = re.compile(r"Â(?=[²³·µ])")
_GAUGE = re.compile(r"^(.+?)[._-]?(?:gauge|ga|g|ü|ue)$", re.IGNORECASE)
_ABSOLUTE = re.compile(r"^(.+?)[._-]?(?:absolute|abs\.?|a)$", re.IGNORECASE)
_NORMAL = re.compile(r"(?<![A-Za-z])(?:N(?=m3|l|L)|n(?=m3))|(?<=m3)[nN](?![A-Za-z])|(?<=m)_?[nN](?=3)")
_STANDARD = re.compile(r"(?<![A-Za-z])(?:S|std|Std)(?=m3|ft3)")
_SCF = re.compile(r"^scf(?=$|[mh]$|/)", re.IGNORECASE)


def normalised(text: str) -> str:
    """Return a unit text without the accidents of writing: blanks, brackets, signs, encodings.

    Examples
    --------
    >>> normalised("[kJ/(kg·K)]"), normalised("m³/h"), normalised(" °C ")
    ('kJ/kgK', 'm3/h', 'degC')
    """
    repaired = _DEGREE.sub("deg", _MIS_STORED.sub("", text))
    plain = unicodedata.normalize("NFKC", repaired).replace("°", "deg").replace("\u2212", "-")
    return re.sub(r"[\s()\[\]{}^*·⋅∙\u00d7]|(?<=deg)\.", "", plain)


def _spellings() -> dict[str, tuple[Meaning, ...]]:
    table: dict[str, tuple[Meaning, ...]] = {}
    for quantity, expression, words in ROWS:
        first, *others = words.split()
        meaning = Meaning(quantity, expression, first.replace("_", " "))
        for word in (normalised(meaning.shown), *others):
            table[word] = (*table.get(word, ()), meaning)
    return table


SPELLINGS: Final[Mapping[str, tuple[Meaning, ...]]] = MappingProxyType(_spellings())
"""Every normalised spelling with its meanings, the likeliest first."""

_BY_FOLDED: Final[Mapping[str, tuple[str, ...]]] = MappingProxyType(
    {
        folded: tuple(word for word in SPELLINGS if word.casefold() == folded)
        for folded in dict.fromkeys(word.casefold() for word in SPELLINGS)
    }
)


def split_qualifier(text: str) -> tuple[str, Qualifier | None]:
    """Split what a unit text says beyond its unit: gauge or absolute, a gas reference state.

    Parameters
    ----------
    text : str
        A unit as written, for instance in the unit row of an export.

    Returns
    -------
    tuple of str and str or None
        The normalised unit, and ``gauge``, ``absolute``, ``normal state``,
        ``standard state`` or None.

    Examples
    --------
    >>> split_qualifier("bar(g)"), split_qualifier("Nm³/h"), split_qualifier("kPa")
    (('bar', 'gauge'), ('m3/h', 'normal state'), ('kPa', None))
    """
    unit = normalised(text)
    if _meanings(unit):
        return unit, None
    suffixes: tuple[tuple[re.Pattern[str], Qualifier], ...] = (
        (_GAUGE, "gauge"),
        (_ABSOLUTE, "absolute"),
    )
    for pattern, qualifier in suffixes:
        match = pattern.match(unit)
        if match and any(m.quantity == "pressure" for m in _meanings(match[1])):
            return match[1], qualifier
    prefixes: tuple[tuple[re.Pattern[str], str, Qualifier], ...] = (
        (_NORMAL, "", "normal state"),
        (_STANDARD, "", "standard state"),
        (_SCF, "cf", "standard state"),
    )
    for pattern, replacement, qualifier in prefixes:
        for spelling in (unit, unit.casefold()):
            base, found = pattern.subn(replacement, spelling)
            if found and _meanings(base):
                return base, qualifier
    return unit, None


def meanings(text: str) -> tuple[Meaning, ...]:
    """Return what a unit text stands for, the likeliest kind of quantity first.

    Raises
    ------
    UnitError
        If the text is unknown, ambiguous, or says more than a unit.
    """
    unit, qualifier = split_qualifier(text)
    if qualifier is not None:
        raise UnitError(text, *_instead_of(qualifier, shown(unit)))
    found = _meanings(unit)
    if found:
        return found
    refused = REFUSED.get(unit) or REFUSED.get(_refused_by_case(unit))
    if refused:
        raise UnitError(text, *refused)
    raise UnitError(text, "is not a known unit", nearest(unit))


def same_unit(text_a: str, text_b: str) -> bool:
    """Whether two unit texts mean the same unit, however they are written.

    A unit that says more than the other (``bar(g)`` and ``bar``, ``Nm3/h``
    and ``m3/h``) is not the same. Two texts that nobody knows are the same
    when nothing but case, blanks and brackets tells them apart.

    Examples
    --------
    >>> same_unit("°C", "deg C"), same_unit("m³/h", "m3/hr"), same_unit("Nm3/h", "m3/h")
    (True, True, False)
    """
    unit_a, qualifier_a = split_qualifier(text_a)
    unit_b, qualifier_b = split_qualifier(text_b)
    if qualifier_a != qualifier_b:
        return False
    known_a, known_b = _meanings(unit_a), _meanings(unit_b)
    if known_a or known_b:
        # The likeliest meaning only: as differences degC and K are one, as readings they are not.
        return known_a[:1] == known_b[:1]
    return unit_a.casefold() == unit_b.casefold()


def shown(unit: str) -> str:
    """Return the spelling that messages use for a unit; the text itself for an unknown one."""
    found = _meanings(normalised(unit))
    return found[0].shown if found else unit


def nearest(unit: str, quantity: str | None = None) -> tuple[str, ...]:
    """Return up to three known spellings that resemble an unknown one, of one kind if asked."""
    candidates: dict[str, str] = {}
    for word, found in SPELLINGS.items():
        fitting = [m.shown for m in found if quantity in (None, m.quantity)]
        for meaning in fitting[:1]:
            candidates.setdefault(word.casefold(), meaning)
    close = difflib.get_close_matches(normalised(unit).casefold(), candidates, n=6, cutoff=0.6)
    return tuple(dict.fromkeys(candidates[word] for word in close))[:3]


def units_of(quantity: str) -> tuple[str, ...]:
    """Return the shown spellings of one kind of quantity, in the order of the table."""
    words = (m.shown for found in SPELLINGS.values() for m in found if m.quantity == quantity)
    return tuple(dict.fromkeys(words))


def _meanings(unit: str) -> tuple[Meaning, ...]:
    if unit in SPELLINGS:
        return SPELLINGS[unit]
    if len(unit) < 2 or unit in REFUSED:
        return ()
    # KW and kw are kW, but no other case of an M prefix: a thousandth is not a million.
    words = [w for w in _BY_FOLDED.get(unit.casefold(), ()) if _same_prefix(unit, w)]
    distinct = {SPELLINGS[word] for word in words}
    return distinct.pop() if len(distinct) == 1 else ()


def _same_prefix(unit: str, word: str) -> bool:
    return all(
        mine[:1] == theirs[:1] or theirs[:1] not in "mM" or not theirs[1:2].isalpha()
        for mine, theirs in zip(unit.split("/"), word.split("/"), strict=True)
    )


def _refused_by_case(unit: str) -> str:
    folded = [word for word in REFUSED if word.casefold() == unit.casefold()]
    return folded[0] if folded else unit


def _instead_of(qualifier: Qualifier, unit: str) -> tuple[str, tuple[str, ...]]:
    if qualifier in ("gauge", "absolute"):
        said = f'says "{qualifier}", which is a key of its own (pressure = "{qualifier}")'
        return said, (unit,)
    return (
        f"names a gas {qualifier}, which is no unit: the state is declared with the fuel "
        "(volume_state) and whether a meter already reads at it with the gas meter (reads)",
        (unit,),
    )
