"""The folder of a site: where outputs go, how they are written, the lock, and the run log.

Inputs are only ever read. Outputs appear whole or not at all: each is written to a temporary file in
its own folder, flushed to disk, and renamed into place after every other output of the run is ready.
"""

from __future__ import annotations

import contextlib
import os
from collections.abc import Iterator, Mapping
from datetime import UTC, datetime
from pathlib import Path

from auditor.records.errors import Fault, InputOutputError, UsageError

LOGS = "logs"
AUDIT = "audit"
RUN_LOG = "run.log"
_TEMPORARY = ".writing-"


def require_site(site: Path) -> None:
    """Refuse a folder that is no site, before anything is made in it.

    Raises
    ------
    UsageError
        If it holds no ``plant.toml``.
    """
    if not (site / "plant.toml").is_file():
        raise UsageError(
            [
                Fault(
                    str(site),
                    "there is no plant.toml in this folder",
                    "name the folder that holds plant.toml and logs/",
                )
            ]
        )


@contextlib.contextmanager
def locked(folder: Path) -> Iterator[None]:
    """Hold the one lock of an output folder; a second run is refused at once.

    Raises
    ------
    InputOutputError
        If another run holds the lock, or the folder cannot be written.
    """
    from filelock import FileLock, Timeout

    with _explained(folder, "the folder cannot be written"):
        folder.mkdir(parents=True, exist_ok=True)
        lock = FileLock(folder / ".lock")
        try:
            lock.acquire(timeout=0)
        except Timeout:
            raise InputOutputError(
                [
                    Fault(
                        str(folder),
                        "another run is writing here",
                        "wait until it has ended, then run again; nothing was changed by this run",
                    )
                ]
            ) from None
    try:
        yield
    finally:
        lock.release()


@contextlib.contextmanager
def _explained(path: Path, problem: str) -> Iterator[None]:
    """Turn an error of the operating system into one that names the file and the remedy."""
    try:
        yield
    except OSError as error:
        reason = error.strerror or type(error).__name__
        raise InputOutputError(
            [
                Fault(
                    str(error.filename or path),
                    f"{problem}: {reason}",
                    "check the disk and the folder's rights",
                )
            ]
        ) from error


def write_outputs(folder: Path, outputs: Mapping[str, bytes]) -> None:
    """Write a set of files whole: all temporaries first, then one rename after the other.

    Leftovers of a run that was killed are swept first. A file whose bytes are already right is not
    touched.
    """
    with _explained(folder, "an output cannot be written"):
        folder.mkdir(parents=True, exist_ok=True)
        for leftover in folder.glob(f"{_TEMPORARY}*"):
            leftover.unlink()
        ready: list[tuple[Path, Path]] = []
        for name, content in outputs.items():
            target = folder / name
            if target.is_file() and target.read_bytes() == content:
                continue
            temporary = folder / f"{_TEMPORARY}{name}"
            with temporary.open("wb") as file:
                file.write(content)
                file.flush()
                os.fsync(file.fileno())
            ready.append((temporary, target))
        for temporary, target in ready:
            os.replace(temporary, target)
        _sync_folder(folder)


def _sync_folder(folder: Path) -> None:
    if os.name == "nt":  # folders cannot be opened there; the rename itself is durable enough
        return
    handle = os.open(folder, os.O_RDONLY)
    try:
        os.fsync(handle)
    finally:
        os.close(handle)


def append_run_log(folder: Path, lines: list[str]) -> None:
    """Append lines to the plain run log, each with the time of the machine's clock in UTC.

    The run log is the only output that carries the time of the run.
    """
    stamp = datetime.now(UTC).strftime("%Y-%m-%dT%H:%M:%SZ")
    with _explained(folder / RUN_LOG, "the run log cannot be written"):
        folder.mkdir(parents=True, exist_ok=True)
        with (folder / RUN_LOG).open("a", encoding="utf-8", newline="\n") as file:
            file.writelines(f"{stamp} {line}\n" for line in lines)
