"""Errors that speak to the person who runs an audit, and the exit codes of the program."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from enum import IntEnum


class Exit(IntEnum):
    """Exit codes of every command."""

    FIRM = 0
    """Published, every headline figure firm."""
    OWN_FAILURE = 1
    """A fault of the program itself, shown with its traceback."""
    USAGE = 2
    """Wrong usage or plant file; nothing was published."""
    NO_DATA = 3
    """No usable data; earlier reports are untouched."""
    LOOK = 4
    """Published, but a person must look: impossible intervals, or a balance that does not close."""
    INPUT_OUTPUT = 5
    """Input/output failure, or another run holds the lock."""
    PROVISIONAL = 6
    """Published, provisional: coverage, missing or late exports."""


_WORST_FIRST = (
    Exit.OWN_FAILURE,
    Exit.INPUT_OUTPUT,
    Exit.USAGE,
    Exit.NO_DATA,
    Exit.LOOK,
    Exit.PROVISIONAL,
    Exit.FIRM,
)


def worst(codes: Iterable[Exit]) -> Exit:
    """Return the worst of several exit codes (``FIRM`` when there are none)."""
    return min(codes, key=_WORST_FIRST.index, default=Exit.FIRM)


@dataclass(frozen=True)
class Fault:
    """One thing that a person can put right: where it is, what was found there, what to change."""

    where: str
    """File with line, and the key or column: ``plant.toml:14, exports.power.clock``."""
    found: str
    fix: str

    def __str__(self) -> str:
        """Two lines: place and problem, then the remedy."""
        return f"{self.where}: {self.found}\n  fix: {self.fix}"


class AuditorError(Exception):
    """Base of all errors that the command line turns into a message and an exit code."""

    exit_code: Exit = Exit.OWN_FAILURE

    def __init__(self, faults: Iterable[Fault]) -> None:
        self.faults = tuple(faults)
        super().__init__(self.faults)

    def __reduce__(self) -> tuple[type[AuditorError], tuple[tuple[Fault, ...]]]:
        """Survive pickling between processes."""
        return type(self), (self.faults,)

    def __str__(self) -> str:
        """All faults, one below the other."""
        return "\n".join(str(fault) for fault in self.faults)


class PlantFileError(AuditorError):
    """The plant file, or what it says about the exports, cannot be used as it stands."""

    exit_code = Exit.USAGE


class UsageError(AuditorError):
    """The command was called with arguments that cannot be followed."""

    exit_code = Exit.USAGE


class NoDataError(AuditorError):
    """Nothing usable was found for the period; no report is written."""

    exit_code = Exit.NO_DATA


class InputOutputError(AuditorError):
    """A file could not be read or written, or another run holds the site's lock."""

    exit_code = Exit.INPUT_OUTPUT
