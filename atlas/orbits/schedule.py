"""Runs independent pieces of work on threads, through dask, with bounded results in flight."""

from __future__ import annotations

import itertools
import os
from collections.abc import Callable, Iterable, Iterator
from concurrent.futures import ThreadPoolExecutor
from contextlib import contextmanager
from typing import TypeVar

import numpy as np
from dask import threaded
from dask.delayed import delayed
from numpy.typing import NDArray

from atlas.errors import PlanRefused, shown

MOST_THREADS = 1024
T = TypeVar("T")
BATCH = 32
"""Tasks a worker gets in one batch; only so many results wait for their turn."""


def default_workers() -> int:
    """Return how many processors this process may use."""
    return len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1


def threads(workers: int | None) -> int:
    """Return how many threads are asked for: one a processor for None.

    Raises
    ------
    PlanRefused
        For anything but a whole number from 1 to 1024.
    """
    if workers is None:
        return default_workers()
    if not isinstance(workers, int) or not 1 <= workers <= MOST_THREADS:
        raise PlanRefused(f"workers: {shown(workers)} is not a whole number from 1 to {MOST_THREADS}")
    return workers


class Schedule:
    """Worker threads and the flag that stops them.

    Use :func:`schedule` to open one. Kernels release the interpreter's lock, so threads run side by side.

    Attributes
    ----------
    workers : int
    stop : ndarray of uint8, shape (1,)
        Becomes 1 when the work is interrupted; kernels look at it and return early.
    """

    def __init__(self, workers: int) -> None:
        self.workers = workers
        self.stop: NDArray[np.uint8] = np.zeros(1, np.uint8)
        self._pool = ThreadPoolExecutor(workers)

    def run(
        self,
        tasks: Iterable[Callable[[], T]],
        done: Callable[[T], None],
        *,
        at_once: int | None = None,
    ) -> None:
        """Run tasks and hand over their results.

        Parameters
        ----------
        tasks : iterable of callables without arguments
            Consumed lazily, a batch at a time.
        done : callable of a result
            Called in the calling thread, in the order of the tasks.
        at_once : int, optional
            Most tasks that may be under way, where memory is short.
        """
        short = at_once is not None and at_once < self.workers
        for batch in _batches(tasks, at_once if short and at_once else BATCH * self.workers):
            lazy = [delayed(task, pure=False)() for task in batch]
            graph = {key: node for one in lazy for key, node in one.__dask_graph__().items()}
            for result in threaded.get(graph, [one.key for one in lazy], pool=self._pool):
                done(result)

    def close(self, *, interrupted: bool) -> None:
        """Wait for the threads; make running kernels return early where the work was interrupted."""
        if interrupted:
            self.stop[0] = 1
        self._pool.shutdown(wait=True, cancel_futures=interrupted)


@contextmanager
def schedule(workers: int | None = None) -> Iterator[Schedule]:
    """Open worker threads for the time of a block.

    Parameters
    ----------
    workers : int, optional
        Number of threads; the default is :func:`default_workers`.

    Raises
    ------
    PlanRefused
        For a number that is none of threads.
    """
    opened = Schedule(threads(workers))
    try:
        yield opened
    except BaseException:
        opened.close(interrupted=True)
        raise
    opened.close(interrupted=False)


def _batches(tasks: Iterable[Callable[[], T]], size: int) -> Iterator[list[Callable[[], T]]]:
    waiting = iter(tasks)
    while batch := list(itertools.islice(waiting, size)):
        yield batch
