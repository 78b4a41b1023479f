"""One file per tag: the name of the tag stands in the name of the file, or in a line above the headings."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence

from auditor.log_reading.dialect import heading_key
from auditor.records.plant import FilePerTag, Tag

_PREAMBLE_LINES = 60


def name_in_file(layout: FilePerTag, path: str, head: Sequence[str]) -> str | None:
    """Find the name of the tag that a file holds.

    Parameters
    ----------
    layout : FilePerTag
        Where the name stands.
    path : str
        Path below ``logs/``; of an archive's member with the archive before ``!``.
    head : sequence of str
        First lines of the file.

    Returns
    -------
    str or None
        None where the name of the file, or every line, is written otherwise.

    Examples
    --------
    >>> name_in_file(FilePerTag("v", "trend_{tag}_*.csv", None), "july/trend_PT-101_07.csv", [])
    'PT-101'
    """
    if layout.file_name is not None:
        file_name = path.rpartition("/")[2].rpartition("!")[2]
        found = _as_regex(layout.file_name).fullmatch(file_name)
        return None if found is None else heading_key(found["tag"])
    pattern = _as_regex(layout.preamble or "")
    lines = (line.strip().rstrip(";,\t ").strip('"') for line in head[:_PREAMBLE_LINES])
    found = next((match for line in lines if (match := pattern.fullmatch(line))), None)
    return None if found is None else heading_key(found["tag"])


def tags_named(name: str, tags: Mapping[str, Tag]) -> dict[str, Tag]:
    """Return the tag that binds a name (none, or one)."""
    return {key: tag for key, tag in tags.items() if heading_key(tag.column) == name}


def pattern_key(layout: FilePerTag) -> str:
    """Name the key that holds the pattern."""
    return "tag_in_preamble" if layout.file_name is None else "tag_in_file_name"


def _as_regex(pattern: str) -> re.Pattern[str]:
    # The name takes as much as it can: it may hold the letters that separate it from what follows.
    parts = re.split(r"(\{tag\}|\*)", pattern)
    meaning = {"{tag}": "(?P<tag>.+)", "*": ".*"}
    return re.compile("".join(meaning.get(part, re.escape(part)) for part in parts))
