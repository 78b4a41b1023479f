"""The book of faults that one reading of a plant file fills, and the nearest valid word."""

from __future__ import annotations

import difflib
from collections.abc import Callable, Iterable
from typing import ParamSpec, TypeVar

from auditor.plant_file.key_lines import KeyLines, KeyPath
from auditor.plant_file.written import key_text
from auditor.records.errors import Fault, PlantFileError

_Arguments = ParamSpec("_Arguments")
_Result = TypeVar("_Result")


_MOST_CHOICES = 12
"""So many valid words are listed; a fault should fit a screen."""


_COLUMNS = {"range": "low and high"}
"""Keys that are written otherwise in a row of a table."""


class UnusableError(ValueError):
    """A value that cannot be used: what was found, and what to write instead."""

    def __init__(self, found: str, fix: str) -> None:
        super().__init__(found, fix)
        self.found = found
        self.fix = fix


class FaultBook:
    """Collects the faults of one file, each with the line of its key, for one error at the end."""

    def __init__(self, file_name: str, lines: KeyLines) -> None:
        self._file_name = file_name
        self._lines = lines
        self._faults: list[tuple[tuple[str, int], KeyPath, Fault]] = []
        self._elsewhere: dict[KeyPath, tuple[str, int]] = {}

    def comes_from(self, path: KeyPath, file: str, line: int) -> None:
        """Note that a table was read from a row of another file."""
        self._elsewhere[path] = (file, line)

    def add(self, path: KeyPath, found: str, fix: str) -> None:
        """Note one fault at a key."""
        row, inside = self._row(path)
        if row is not None:
            column = "" if not inside else f", column {_COLUMNS.get(str(inside[0]), inside[0])}"
            fault = Fault(f"{row[0]}:{row[1]}{column}", found, fix)
            self._faults.append((row, path, fault))
            return
        line = self._lines.of(path)
        name = key_text(path)
        where = f"{self._file_name}:{line}, {name}" if name else f"{self._file_name}:{line}"
        self._faults.append((("", line), path, Fault(where, found, fix)))

    def add_at(self, row: tuple[str, int], fault: Fault) -> None:
        """Note one fault of another file, which keeps the whole plant from being read."""
        self._faults.append((row, (), fault))

    def _row(self, path: KeyPath) -> tuple[tuple[str, int] | None, KeyPath]:
        """File and line of the row that a key was read from, and the key's path in it."""
        for end in range(len(path), 0, -1):
            if path[:end] in self._elsewhere:
                return self._elsewhere[path[:end]], path[end:]
        return None, path

    def attempt(
        self,
        path: KeyPath,
        convert: Callable[_Arguments, _Result],
        *args: _Arguments.args,
        **kwargs: _Arguments.kwargs,
    ) -> _Result | None:
        """Call a conversion; note an unusable value as a fault at the key and give None instead."""
        try:
            return convert(*args, **kwargs)
        except UnusableError as unusable:
            self.add(path, unusable.found, unusable.fix)
            return None

    def clean(self, path: KeyPath) -> bool:
        """Whether nothing at or below a key is at fault."""
        return all(noted[: len(path)] != path for _, noted, _ in self._faults)

    def line(self, path: KeyPath) -> int:
        """Line of a key."""
        row, _ = self._row(path)
        return self._lines.of(path) if row is None else row[1]

    def file(self, path: KeyPath) -> str:
        """File that a key stands in."""
        row, _ = self._row(path)
        return self._file_name if row is None else row[0]

    def close(self) -> None:
        """Raise every fault noted: first the plant file, then lists beside it, in the order of the lines.

        Raises
        ------
        PlantFileError
            If there is any fault.
        """
        if self._faults:
            in_order = sorted(self._faults, key=lambda noted: noted[0])
            raise PlantFileError(dict.fromkeys(fault for _, _, fault in in_order))


def nearest(word: str, options: Iterable[str]) -> str | None:
    """Return the option that a person most likely meant, or None when none is near."""
    by_folded = {option.casefold(): option for option in options}
    close = difflib.get_close_matches(word.casefold(), by_folded, n=1, cutoff=0.6)
    return by_folded[close[0]] if close else None


def choices(word: str, options: Iterable[str]) -> str:
    """Say which words are valid, the nearest one first when one is near.

    Examples
    --------
    >>> choices("gros", ["gross", "net"])
    'nearest is "gross"; valid are "gross", "net"'
    """
    listed = list(options)
    near = nearest(word, listed)
    rest = len(listed) - _MOST_CHOICES
    shown = listed if rest <= 1 else listed[:_MOST_CHOICES]
    more = "" if rest <= 1 else f" and {rest} more"
    valid = (
        "valid are " + ", ".join(f'"{option}"' for option in shown) + more if listed else "none is declared"
    )
    return f'nearest is "{near}"; {valid}' if near is not None else valid
