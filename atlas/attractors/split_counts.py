"""Counts of orbits split by the attractor that their starts reach: orbit histograms and phase portraits."""

from __future__ import annotations

import threading
from collections.abc import Callable
from dataclasses import dataclass
from functools import partial

import numpy as np
from numpy.typing import NDArray

from atlas.attractors.by_start import MOST_TOLD_APART, Numbers, StartSorter, attractor_numbers
from atlas.orbits.block import Block
from atlas.orbits.histogram import Progress, block_width
from atlas.orbits.orbit import OrbitCounter, Stopped
from atlas.orbits.orbit_kernels import GONE, SLOW
from atlas.orbits.portrait import Outcome, PortraitCounter
from atlas.orbits.schedule import Schedule
from atlas.planes.finder import FateFinder
from atlas.planes.pixels import FateRules

Counts = NDArray[np.uint32]


@dataclass(frozen=True)
class SplitCounts:
    """Counts by attractor.

    Attributes
    ----------
    layers : ndarray of uint32, shape (most + 1, columns, rows)
        Layer k holds the states of orbits whose starts reach attractor k, as `atlas.attractors.by_start`
        numbers them, layer 0 those of starts that reach none. Their sum is the density that is not split.
    numbers : ndarray of uint8, shape (values, starts)
        The attractor that each start reaches at each parameter value.
    outside, escaped, unsettled : int
        Samples that are in no cell, of orbits that stayed, escaped and did not settle.
    exposure : int
        All samples.
    """

    layers: Counts
    numbers: Numbers
    outside: int
    escaped: int
    unsettled: int
    exposure: int

    @property
    def present(self) -> list[int]:
        """Numbers of the attractors that some start reaches."""
        found: list[int] = np.unique(self.numbers[self.numbers > 0]).tolist()
        return found


def start_sorter(counter: OrbitCounter | PortraitCounter, rules: FateRules) -> StartSorter:
    """Return what sorts the starts of a counter by attractor.

    Parameters
    ----------
    counter : OrbitCounter or PortraitCounter
    rules : FateRules
        How the fates of the starts are looked for.
    """
    finder = FateFinder(
        counter.family, counter.view, counter.columns, counter.rows, rules, extinct={}, lanes=counter.lanes
    )
    finder.setting = counter.setting
    if isinstance(counter, PortraitCounter):
        return StartSorter(finder)
    each = counter.rules.values_per_column
    return StartSorter(finder, counter.view.across.values(counter.columns, each).reshape(-1))


def split_histogram(
    counter: OrbitCounter,
    rules: FateRules,
    schedule: Schedule,
    progress: Progress | None = None,
    *,
    most: int = MOST_TOLD_APART,
) -> SplitCounts:
    """Count every column of a view, each attractor by itself.

    Parameters
    ----------
    counter : OrbitCounter
    rules : FateRules
        How the fates of the starts are looked for.
    schedule : Schedule
        The workers; their number does not change the result.
    progress : callable of int, optional
        Told of the samples of every finished block of columns.
    most : int
        Attractors told apart; further ones are joined in the last.
    """
    numbers = attractor_numbers(start_sorter(counter, rules), schedule, most=most)
    layers = np.zeros((most + 1, counter.columns, counter.rows), np.uint32)
    width = max(1, block_width(counter) // (most + 1))
    totals = np.zeros(3, np.int64)

    def block(first: int) -> Callable[[], NDArray[np.int64]]:
        last = min(first + width, counter.columns)
        each = counter.rules.values_per_column

        def count() -> NDArray[np.int64]:
            own = numbers[first * each : last * each].reshape(-1)
            lost = _count_columns(counter, first, last, own, layers[:, first:last], schedule.stop)
            if progress is not None:
                progress((last - first) * counter.exposure)
            return lost

        return count

    def done(lost: NDArray[np.int64]) -> None:
        totals[:] += lost

    counter.warm()
    schedule.run((block(first) for first in range(0, counter.columns, width)), done)
    return SplitCounts(layers, numbers, *_whole(totals), counter.columns * counter.exposure)


def _whole(totals: NDArray[np.int64]) -> tuple[int, int, int]:
    outside, escaped, unsettled = totals.tolist()
    return outside, escaped, unsettled


def _count_columns(
    counter: OrbitCounter, first: int, last: int, numbers: Numbers, out: Counts, stop: NDArray[np.uint8]
) -> NDArray[np.int64]:
    """Count columns into layers; return the samples outside, escaped and unsettled."""
    width, stride, layers = last - first, counter.rows + 2, len(out)
    column = np.repeat(np.arange(width), counter.orbits_per_column)
    base = ((numbers * width + column) * stride).astype(np.int32)
    counts = np.zeros((layers * width + 1) * stride, np.uint32)
    orbits = counter.orbits(first, last)
    block = Block(counter.module, counter.rules, (counter.window,), orbits, base, counts, stop)
    block.sample(block.settle())
    block.run_again()
    if stop[0]:
        raise Stopped("the work was interrupted")
    table = counts[: layers * width * stride].reshape(layers, width, stride)
    out[:] = table[:, :, 1:-1]
    outside = int(table[:, :, 0].sum(dtype=np.uint64) + table[:, :, -1].sum(dtype=np.uint64))
    ended = [int((block.outcome == outcome).sum()) * counter.rules.samples for outcome in (GONE, SLOW)]
    return np.array([outside, *ended])


def split_portrait(
    counter: PortraitCounter,
    rules: FateRules,
    schedule: Schedule,
    progress: Progress | None = None,
    *,
    most: int = MOST_TOLD_APART,
) -> SplitCounts:
    """Count a phase portrait, each attractor by itself; parameters as for :func:`split_histogram`."""
    numbers = attractor_numbers(start_sorter(counter, rules), schedule, most=most)
    layers = np.zeros((most + 1, counter.columns, counter.rows), np.uint32)
    totals = np.zeros(3, np.int64)
    counter.warm()
    for number in np.unique(numbers).tolist():
        starts = np.flatnonzero(numbers[0] == number).tolist()
        totals += _count_portrait(counter, starts, layers[number], schedule, progress)
    return SplitCounts(layers, numbers, *_whole(totals), counter.exposure)


def _count_portrait(
    counter: PortraitCounter,
    starts: list[int],
    out: Counts,
    schedule: Schedule,
    progress: Progress | None,
) -> NDArray[np.int64]:
    """Count the copies of some starts; return the samples outside, escaped and unsettled."""
    spare: list[Counts] = []
    rooms: list[Counts] = []
    lock = threading.Lock()

    def count(first: int, last: int) -> Outcome:
        with lock:
            room = spare.pop() if spare else None
            if room is None:
                room = counter.room()
                rooms.append(room)
        try:
            return counter.count(first, last, room, stop=schedule.stop)
        finally:
            with lock:
                spare.append(room)
            if progress is not None:
                progress((last - first) * counter.samples_of_a_copy)

    outcomes: list[Outcome] = []
    copies = counter.copies
    tasks = (
        partial(count, start * copies + copy, start * copies + min(copy + counter.lanes, copies))
        for start in starts
        for copy in range(0, copies, counter.lanes)
    )
    schedule.run(tasks, outcomes.append)
    whole = rooms.pop()[: counter.cells]
    while rooms:
        whole += rooms.pop()[: counter.cells]
    out[:] = whole.reshape(counter.columns + 2, counter.rows + 2)[1:-1, 1:-1]
    outside = int(whole.sum(dtype=np.uint64)) - int(out.sum(dtype=np.uint64))
    return np.array([outside, sum(o.escaped for o in outcomes), sum(o.unsettled for o in outcomes)])
