"""Work done ahead of its turn on the other cores, its results handed on in order.

What is done, and with what knowledge, depends on the order of the jobs alone, never on how many threads
there are or which of them is quicker: results are the same bytes on any number of cores.
"""

from __future__ import annotations

import os
from collections import deque
from collections.abc import Callable, Iterator
from concurrent.futures import Future, ThreadPoolExecutor
from itertools import islice
from typing import TypeVar

T = TypeVar("T")

DEPTH = 2
"""Jobs taken before the result of the oldest of them is wanted; bounds the memory."""
_MOST_THREADS = 3


def usable_threads() -> int:
    """Return how many threads are worth while: one for each core that this process may use, up to three."""
    if hasattr(os, "sched_getaffinity"):
        return min(len(os.sched_getaffinity(0)), _MOST_THREADS)
    return min(os.cpu_count() or 1, _MOST_THREADS)


def in_order(jobs: Iterator[Callable[[], T]], threads: int) -> Iterator[T]:
    """Do jobs and give their results in order.

    The first job is done before the second is taken, as it teaches most; from then on up to ``DEPTH``
    jobs are under way.

    Parameters
    ----------
    jobs : iterator of callables
        Asked for its next job in the caller's thread, after the result of the job ``DEPTH`` before has
        been used. What it raises is raised after the results of the jobs it gave before.
    threads : int
        Threads that do the jobs; with one, each is done in its turn in the caller's thread.
    """
    first = next(jobs, None)
    if first is None:
        return
    yield first()
    if threads < 2:
        yield from _results(jobs, lambda job: job)
        return
    with ThreadPoolExecutor(threads, "reading") as pool:
        yield from _results(jobs, lambda job: pool.submit(job).result)


def _results(
    jobs: Iterator[Callable[[], T]], begin: Callable[[Callable[[], T]], Callable[[], T]]
) -> Iterator[T]:
    """Give the results of jobs, ``DEPTH`` of which are begun; ``begin`` returns what waits for the result."""
    under_way: deque[Callable[[], T]] = deque()
    failure: Exception | None = None
    is_open = True
    while True:
        while is_open and len(under_way) < DEPTH:
            try:
                job = next(jobs, None)
            except Exception as error:
                failure, job = error, None
            if job is None:
                is_open = False
            else:
                under_way.append(begin(job))
        if not under_way:
            break
        yield under_way.popleft()()
    if failure is not None:
        raise failure


def one_ahead(pieces: Iterator[T], threads: int) -> Iterator[T]:
    """Hand on what an iterator gives, asking it for the next piece meanwhile, in a thread of its own."""
    if threads < 2:
        yield from pieces
        return

    def following() -> list[T]:
        return list(islice(pieces, 1))

    with ThreadPoolExecutor(1, "merging") as pool:
        coming: Future[list[T]] = pool.submit(following)
        while found := coming.result():
            coming = pool.submit(following)
            yield found[0]
