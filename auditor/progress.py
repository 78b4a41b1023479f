"""Progress on a terminal as a bar, plain lines otherwise; always on standard error."""

from __future__ import annotations

import contextlib
import sys
from collections.abc import Callable, Iterator

_Progress = Callable[[str, float], None]


@contextlib.contextmanager
def shown_progress(*, quiet: bool) -> Iterator[_Progress]:
    """Give a callable that takes a stage's name and the share done, and shows it fittingly."""
    if quiet:
        yield lambda _stage, _done: None
    elif sys.stderr.isatty():
        with _bar() as progress:
            yield progress
    else:
        yield lambda stage, _done: print(stage, file=sys.stderr, flush=True)


@contextlib.contextmanager
def _bar() -> Iterator[_Progress]:
    from rich.console import Console
    from rich.progress import BarColumn, Progress, TextColumn, TimeElapsedColumn

    columns = (TextColumn("{task.description}"), BarColumn(), TimeElapsedColumn())
    with Progress(*columns, console=Console(stderr=True), transient=True) as bars:
        task = bars.add_task("opening", total=1.0)
        yield lambda stage, done: bars.update(task, description=stage, completed=done)
