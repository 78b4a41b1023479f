"""One stream on its way from a checked part to a record."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from auditor.plant_file.faults import FaultBook
from auditor.plant_file.key_lines import KeyPath
from auditor.plant_file.references import Declared, find_tag

TEMPERATURE = ("temperature",)


@dataclass(frozen=True)
class Place:
    """One stream on its way to a record: where it stands and what it may point at."""

    machine: str
    name: str
    siblings: Mapping[str, Any]
    """Streams of the same machine."""
    declared: Declared
    book: FaultBook

    @property
    def path(self) -> KeyPath:
        """Where the stream stands in the file."""
        return ("machines", self.machine, "streams", self.name)

    def tag(self, key: str, name: str | None, *wanted: str) -> None:
        """Check a key that names a tag."""
        find_tag(name, wanted, self.declared, (*self.path, key), self.book)
