"""What lies below ``logs/``: every file and archive member, and the export that claims it."""

from __future__ import annotations

import gzip
import hashlib
import os
import re
import zipfile
import zlib
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import IO, cast

from auditor.records.errors import Fault, PlantFileError
from auditor.records.plant import Export


class UnreadableError(Exception):
    """A file opens, but what it holds cannot be read."""


READ_ERRORS = (OSError, EOFError, zlib.error, zipfile.BadZipFile, NotImplementedError, UnreadableError)
"""What a locked, vanished, damaged, encrypted or senseless file raises while it is read."""

_UNFINISHED = (".tmp", ".part", ".partial", ".crdownload")
_ENCRYPTED = 0x1


@dataclass(frozen=True)
class StoredFile:
    """One readable thing below ``logs/``: a file, or a member of an archive."""

    path: str
    """Below ``logs/`` with ``/``; a member as ``gas/october.zip!index.csv``."""
    real: Path
    """The file on disk (of a member: its archive)."""
    member: str | None
    bytes: int
    """Size as stored; of a member: its size once unpacked."""
    set_aside: str = ""
    """Why it is not looked into, in plain words; empty for an ordinary file."""

    @property
    def is_plain(self) -> bool:
        """Whether its bytes can be read in place, without unpacking."""
        return self.member is None and self.real.suffix.lower() != ".gz"


@dataclass(frozen=True)
class Claim:
    """A file together with the export and the pattern that claim it."""

    stored: StoredFile
    export: str
    pattern: int


_EMPTY = "empty file"
_UNFINISHED_COPY = "unfinished copy"
_COME_BACK = (_EMPTY, _UNFINISHED_COPY)
"""Reasons to set a file aside that will pass: the next run reads it."""


@dataclass(frozen=True)
class Listing:
    """Every file below ``logs/``, sorted by path, in one of three places."""

    claims: tuple[Claim, ...]
    unclaimed: tuple[StoredFile, ...]
    unreadable: tuple[tuple[Claim, str], ...]
    """Claimed files that cannot be read, or not yet, with the reason."""


def list_logs(logs: Path, exports: Mapping[str, Export]) -> Listing:
    """Find every file below ``logs/`` and the export that claims it.

    Raises
    ------
    PlantFileError
        If patterns of two exports claim the same file.
    """
    patterns = [
        (name, place, _as_regex(pattern))
        for name, export in exports.items()
        for place, pattern in enumerate(export.files)
    ]
    claims: list[Claim] = []
    unclaimed: list[StoredFile] = []
    unreadable: list[tuple[Claim, str]] = []
    faults: list[Fault] = []
    for stored in _walk(logs):
        by_path = _claimants(stored.path, patterns)
        try:
            members = _members(stored) if _may_hold_claims(stored, by_path, patterns) else (stored,)
        except READ_ERRORS as error:
            name, place = by_path[0] if by_path else ("", 0)
            unreadable.append((Claim(stored, name, place), reason_of(error)))
            continue
        for member in members:
            found = by_path or _claimants(member.path, patterns)
            owners = list(dict.fromkeys(name for name, _ in found))
            if owners and member.set_aside in _COME_BACK:
                unreadable.append((Claim(member, *found[0]), member.set_aside))
            elif member.set_aside or not owners:
                unclaimed.append(member)
            elif len(owners) > 1:
                faults.append(_two_owners(member, owners))
            else:
                claims.append(Claim(member, *found[0]))
    if faults:
        raise PlantFileError(faults)
    return Listing(tuple(claims), tuple(unclaimed), tuple(unreadable))


def every_file(logs: Path) -> tuple[tuple[StoredFile, ...], tuple[tuple[str, str], ...]]:
    """Return every file and archive member below a folder, and the archives that cannot be read with why."""
    files: list[StoredFile] = []
    unreadable: list[tuple[str, str]] = []
    for stored in _walk(logs):
        try:
            is_archive = not stored.set_aside and stored.path.lower().endswith(".zip")
            files += _members(stored) if is_archive else (stored,)
        except READ_ERRORS as error:
            unreadable.append((stored.path, reason_of(error)))
    return tuple(files), tuple(unreadable)


def hash_files(logs: Path) -> dict[str, str]:
    """Return the SHA-256 of the stored bytes of every file below ``logs/``, by path with ``/``.

    A file that cannot be read has an empty digest.
    """
    digests = {}
    for stored in _walk(logs):
        try:
            digests[stored.path] = hash_file(stored.real)
        except OSError:
            digests[stored.path] = ""
    return digests


def hash_file(path: Path) -> str:
    """Return the SHA-256 of a file's bytes as stored."""
    with path.open("rb") as stream:
        return hashlib.file_digest(stream, "sha256").hexdigest()


@contextmanager
def open_stored(stored: StoredFile) -> Iterator[IO[bytes]]:
    """Open a file or an archive member for reading, unpacked."""
    if stored.member is not None:
        with zipfile.ZipFile(stored.real) as archive:
            try:
                entry = archive.getinfo(stored.member)
            except KeyError as error:
                raise UnreadableError("no longer in its archive") from error
            if entry.flag_bits & _ENCRYPTED:
                raise UnreadableError("encrypted")
            with archive.open(stored.member) as stream:
                yield stream
    elif stored.is_plain:
        with stored.real.open("rb") as stream:
            yield stream
    else:
        with gzip.open(stored.real) as unpacked:
            yield cast("IO[bytes]", unpacked)


def reason_of(error: BaseException) -> str:
    """Say in a few words why a file could not be read, without paths of this machine."""
    if isinstance(error, OSError) and error.strerror:
        return error.strerror
    return str(error).splitlines()[0] if str(error) else type(error).__name__


def _walk(logs: Path) -> Iterator[StoredFile]:
    found = []
    for path in logs.rglob("*"):
        try:
            if path.is_file():
                found.append((_printable(path.relative_to(logs)), path, path.stat().st_size))
        except OSError:  # vanished between listing and looking: the next run sees the folder anew
            continue
    for name, path, size in sorted(found):
        yield StoredFile(name, path, None, size, _set_aside(name, size))


def _printable(path: Path) -> str:
    """Path with ``/``; bytes of a name that are no UTF-8 are written out, so that any output can hold it."""
    return os.fsencode(path.as_posix()).decode("utf-8", "backslashreplace")


def _set_aside(path: str, size: int) -> str:
    name = path.rpartition("/")[2].rpartition("!")[2]
    if any(part.startswith(".") for part in path.split("/")) or path.startswith("__MACOSX"):
        return "hidden file"
    if name.startswith("~$"):
        return "lock file of an office program"
    if name.lower().endswith(_UNFINISHED):
        return _UNFINISHED_COPY
    return "" if size else _EMPTY


def _members(stored: StoredFile) -> tuple[StoredFile, ...]:
    with zipfile.ZipFile(stored.real) as archive:
        entries = sorted(archive.infolist(), key=lambda entry: entry.filename)
    if all(entry.is_dir() for entry in entries):
        raise UnreadableError("archive without files")
    return tuple(
        StoredFile(
            f"{stored.path}!{entry.filename}",
            stored.real,
            entry.filename,
            entry.file_size,
            _set_aside(entry.filename, entry.file_size),
        )
        for entry in entries
        if not entry.is_dir()
    )


def _may_hold_claims(
    stored: StoredFile, by_path: list[tuple[str, int]], patterns: list[tuple[str, int, re.Pattern[str]]]
) -> bool:
    if stored.set_aside or not stored.path.lower().endswith(".zip"):
        return False
    return bool(by_path) or any("!" in pattern.pattern for _, _, pattern in patterns)


def _claimants(path: str, patterns: list[tuple[str, int, re.Pattern[str]]]) -> list[tuple[str, int]]:
    return [(name, place) for name, place, pattern in patterns if pattern.fullmatch(path)]


def _two_owners(stored: StoredFile, owners: list[str]) -> Fault:
    keys = " and ".join(f"exports.{name}.files" for name in owners)
    return Fault(
        f"plant.toml, {keys}",
        f"both claim logs/{stored.path}",
        "narrow one of the patterns, so that every file belongs to one export",
    )


def _as_regex(pattern: str) -> re.Pattern[str]:
    """Glob below ``logs/``: ``*`` and ``?`` stay inside a folder, ``**`` crosses folders."""
    out, place = "", 0
    while place < len(pattern):
        rest = pattern[place:]
        if rest.startswith("**/"):
            out, place = out + "(?:.*/)?", place + 3
        elif rest.startswith("**"):
            out, place = out + ".*", place + 2
        elif rest[0] == "*":
            out, place = out + "[^/]*", place + 1
        elif rest[0] == "?":
            out, place = out + "[^/]", place + 1
        elif (choice := re.match(r"\[(!?)([^\]/]+)\]", rest)) is not None:
            out += f"[{'^' if choice[1] else ''}{re.escape(choice[2]).replace(chr(92) + '-', '-')}]"
            place += choice.end()
        else:
            out, place = out + re.escape(rest[0]), place + 1
    return re.compile(out)
