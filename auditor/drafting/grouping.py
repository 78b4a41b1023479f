"""Files that are one kind of export, and the patterns that say so."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass

from auditor.drafting.first_look import Sighting
from auditor.drafting.gathering import Gathered, gather
from auditor.log_reading.cells import read_number

_DATE_FOLDER = re.compile(r"(19|20)\d\d([-_.]?\d\d){0,2}|(19|20)\d\d[-_.]?[wW]\d\d")
_DAY_FOLDER = re.compile(r"[wW]?\d\d")
_COMPARED_ROWS = 200
_ENOUGH_ROWS = 10
_ALIKE = 0.9


@dataclass(frozen=True)
class Group:
    """Files of one export, by folder and headings."""

    files: tuple[Sighting, ...]
    patterns: tuple[str, ...]
    gathered: Gathered
    remarks: tuple[str, ...] = ()

    @property
    def headings(self) -> tuple[str, ...]:
        """Headings of its first file, and those that only later files have."""
        return tuple(dict.fromkeys(name for file in self.files for name in file.table.headings if name))


def group_files(sightings: Sequence[Sighting], others: Sequence[str]) -> tuple[Group, ...]:
    """Put files of the same folder, headings and delimiter together, and give them patterns.

    Parameters
    ----------
    sightings : sequence of Sighting
        Files with a table, in order of path.
    others : sequence of str
        Paths of files that no pattern should claim.

    Returns
    -------
    tuple of Group
        Where the same rows stand in files of two folders, they are one group of two patterns.
    """
    kinds: dict[tuple[str, frozenset[str], str, tuple[str, ...]], list[Sighting]] = {}
    for sighting in sightings:
        table = sighting.table
        stamp = tuple(table.headings[place] for place in table.stamp)
        folder = _dateless(_outer(sighting.stored.path).rpartition("/")[0])
        kinds.setdefault((folder, frozenset(table.headings) - {""}, table.delimiter, stamp), []).append(
            sighting
        )
    everything = {sighting.stored.path for sighting in sightings} | set(others)
    groups = []
    for files in kinds.values():
        own = {file.stored.path for file in files}
        groups.append(Group(tuple(files), _patterns(own, everything - own), gather(files)))
    return tuple(_joined(groups))


def _dateless(folder: str) -> str:
    """Put a star for every part of a folder that is a date: a year, and months and days below it.

    Examples
    --------
    >>> _dateless("boiler/2026/07/01"), _dateless("2026-07-01/boiler"), _dateless("engine1")
    ('boiler/*/*/*', '*/boiler', 'engine1')
    """
    parts: list[str] = []
    for part in folder.split("/"):
        is_date = _DATE_FOLDER.fullmatch(part) or (parts[-1:] == ["*"] and _DAY_FOLDER.fullmatch(part))
        parts.append("*" if is_date else _escaped(part))
    return "/".join(parts)


def _outer(path: str) -> str:
    return path.partition("!")[0]


def _patterns(own: set[str], others: set[str]) -> tuple[str, ...]:
    """Return the widest plain pattern that claims these files and no others."""
    outer = {_outer(path) for path in own}
    if all(_outer(path) not in outer for path in others):
        own, others = outer, {_outer(path) for path in others}
    folder = _dateless(_outer(min(own)).rpartition("/")[0])
    folder += "/" if folder else ""
    names = sorted(path.rpartition("/")[2] for path in own)
    if any("!" in name for name in names):
        return tuple(_escaped(path) for path in sorted(own))
    endings = {_ending(name) for name in names}
    for pattern in (
        *(f"{folder}*{ending}" for ending in endings),
        *(f"{folder}{shape}" for shape in _shapes(names)),
    ):
        claims = glob_pattern(pattern)
        if all(claims.fullmatch(path) for path in own) and not any(claims.fullmatch(path) for path in others):
            return (pattern,)
    return tuple(_escaped(path) for path in sorted(own))


def _ending(name: str) -> str:
    found = re.search(r"(\.[A-Za-z]{1,5})?(\.[A-Za-z0-9]{1,5})$", name)
    return found[0] if found else ""


def _shapes(names: Sequence[str]) -> list[str]:
    """Patterns of what names have in common: their digits blanked, or their common beginning."""
    blanked = {re.sub(r"\d[\d_.T-]*\d|\d", "*", _escaped(name)) for name in names}
    start = names[0]
    for name in names:
        while not name.startswith(start):
            start = start[:-1]
    endings = {_ending(name) for name in names}
    common = [f"{_escaped(start)}*{endings.pop()}"] if start and len(endings) == 1 and len(names) > 1 else []
    return [*(sorted(blanked) if len(blanked) == 1 else []), *common]


def _escaped(path: str) -> str:
    return re.sub(r"([*?\[])", r"[\1]", path)


def glob_pattern(pattern: str) -> re.Pattern[str]:
    """Turn a pattern of one folder into a regular expression."""
    parts = re.split(r"(\[[*?\[]\]|\*|\?)", pattern)
    known = {"*": "[^/]*", "?": "[^/]"}
    return re.compile("".join(known.get(part) or re.escape(_bare(part)) for part in parts))


def _bare(part: str) -> str:
    return part[1] if re.fullmatch(r"\[[*?\[]\]", part) else part


def _joined(groups: Sequence[Group]) -> list[Group]:
    """Join groups of the same rows, the one with more columns first."""
    left = sorted(groups, key=lambda group: (-len(group.headings), group.patterns))
    joined: list[Group] = []
    for group in left:
        for at, host in enumerate(joined):
            because = _same_source(host, group)
            if because:
                joined[at] = Group(
                    (*host.files, *group.files),
                    (*host.patterns, *group.patterns),
                    Gathered(
                        (*host.gathered.pieces, *group.gathered.pieces),
                        (*host.gathered.heads, *group.gathered.heads),
                    ),
                    (*host.remarks, because),
                )
                break
        else:
            joined.append(group)
    return sorted(joined, key=lambda group: group.patterns)


def _same_source(host: Group, group: Group) -> str:
    """Say why two groups are pulls of one logger; empty where that is not shown.

    Two machines may well have the same headings, so headings prove nothing: the same numbers at the same
    stamps do.
    """
    common = set(host.headings) & set(group.headings)
    if not set(group.headings) <= common or host.files[0].table.delimiter != group.files[0].table.delimiter:
        return ""
    stamps = {name for file in group.files for name in (file.table.headings[at] for at in file.table.stamp)}
    first, second = host.gathered.records, group.gathered.records
    both = [stamp for stamp in second if stamp in first][:_COMPARED_ROWS]
    if len(both) < _ENOUGH_ROWS:
        return ""
    shares = []
    for name in sorted(common - stamps):
        pairs = [(first[stamp].get(name, "").strip(), second[stamp].get(name, "").strip()) for stamp in both]
        if len({one for one, _ in pairs}) > 1:
            shares.append(sum(_alike(*pair) for pair in pairs) / len(pairs))
    if not shares or min(shares) < _ALIKE:
        return ""
    return (
        f"{host.patterns[0]} and {group.patterns[0]} hold the same rows ({len(both)} stamps compared), so"
        " they are one export; where both hold the same stamp, the earlier pattern wins"
    )


def _alike(one: str, two: str) -> bool:
    if one == two:
        return True
    numbers = [read_number(text, ",") if "," in text else read_number(text, ".") for text in (one, two)]
    return numbers[0] is not None and numbers[0] == numbers[1]
