"""Following an attractor along a parameter: each column starts where its neighbour ended.

A sweep goes up or down the across axis, column by column; the orbits of a column are its parameter values
times the starts. Within a column an orbit is treated as `atlas.orbits.block` says. It begins

1. at its own start in the first column of a sweep, and wherever the orbit of the same value and start in the
   column before has escaped;
2. else where that orbit stopped, run on to the beginning of a pattern and of a record. A state variable
   nearer to 0 than 2**-40 of its own start there counts as 0, as if it had underflowed;
3. at its own start after all, if what 2 says lies exactly on a repelling cycle of this column; and
4. if a variable is at 0 by underflow and the orbit is on no cycle, with that variable at 2**-40 of its own
   start: an orbit that can leave the zero does.

A variable whose own start is 0 is left alone. Nothing depends on how many workers there are: a sweep is one
task.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from atlas.orbits.block import Block, Orbits
from atlas.orbits.histogram import Histogram, Progress
from atlas.orbits.orbit import Counted, OrbitCounter, Stopped
from atlas.orbits.orbit_kernels import FILLED, GONE, READY, SLOW
from atlas.orbits.schedule import Schedule
from tiles.strip import PER_COLUMN, Strip

UP, DOWN, BOTH = "up", "down", "both"
SWEEPS = {UP: (UP,), DOWN: (DOWN,), BOTH: (UP, DOWN)}
NEGLIGIBLE = 2.0**-40
COLUMNS_AT_ONCE = 64

Floats = NDArray[np.float64]


class Follower:
    """Counts the orbits of a view, each column starting where its neighbour ended.

    Parameters
    ----------
    counter : OrbitCounter
        Of the same view, rules and starts.
    direction : "up" or "down"
        Along the across axis.
    """

    def __init__(self, counter: OrbitCounter, direction: str) -> None:
        self.counter, self.direction = counter, direction

    def strips(
        self, *, width: int = COLUMNS_AT_ONCE, stop: NDArray[np.uint8] | None = None
    ) -> Iterator[Counted]:
        """Count all columns, in the order of the sweep.

        Parameters
        ----------
        width : int
            Columns of a strip; changes nothing else.
        stop : ndarray of uint8, shape (1,), optional
            When another thread sets it, the work ends early.

        Yields
        ------
        Counted
            Strips of neighbouring columns; for a sweep down the last columns come first.

        Raises
        ------
        Stopped
            When ``stop`` was set.
        """
        columns = self.counter.columns
        flag = np.zeros(1, np.uint8) if stop is None else stop
        start: Floats | None = None
        for first in range(0, columns, width):
            last = min(first + width, columns)
            low, high = (first, last) if self.direction == UP else (columns - last, columns - first)
            found = _Found(low, high, self.counter.rows)
            for column in range(low, high) if self.direction == UP else range(high - 1, low - 1, -1):
                start = self._column(column, start, found, flag)
            yield found.counted(self.counter)

    def _column(self, column: int, start: Floats | None, found: _Found, stop: NDArray[np.uint8]) -> Floats:
        """Count a column; return where the orbits of the next one begin."""
        own = self.counter.orbits(column, column + 1)
        start = own.start if start is None else start
        block = self._run(replace(own, start=start), found, stop)
        better = _better(block, start, own.start)
        if better is not None:
            block = self._run(replace(own, start=better), found, stop)
        if stop[0]:
            raise Stopped("the work was interrupted")
        found.take(column, block)
        return self._handed_on(block, own)

    def _run(self, orbits: Orbits, found: _Found, stop: NDArray[np.uint8]) -> Block:
        counter = self.counter
        found.scratch[:] = 0
        base = np.zeros(orbits.start.shape[1], np.int32)
        block = Block(counter.module, counter.rules, (counter.window,), orbits, base, found.scratch, stop)
        block.sample(block.settle())
        block.run_again()
        return block

    def _handed_on(self, block: Block, own: Orbits) -> Floats:
        """Return where orbits stand at the next beginning of a pattern and of a record."""
        samples = np.where(block.outcome == SLOW, 0, block.rules.samples - block.filled)
        done = block.transient + samples * block.rules.every
        left = -done % block.unit
        outcome = np.where(block.outcome == GONE, GONE, READY).astype(np.int8)
        for steps in np.unique(left[(left > 0) & (outcome == READY)]):
            order = np.flatnonzero((left == steps) & (outcome == READY))
            block.kernels.advance(
                block.x, *block.map, block.key, order, block.unit - steps, steps, block.bound, outcome
            )
        ended = np.where(outcome == GONE, own.start, block.x)
        return np.where(np.abs(ended) < NEGLIGIBLE * np.abs(own.start), 0.0, ended)


def _better(block: Block, start: Floats, own: Floats) -> Floats | None:
    """Return starts for a column whose orbits must not begin as their neighbours ended; None if they may."""
    moved = (start != own).any(axis=0)
    repelled = block.on_repelling & moved
    sunk = (start == 0.0) & (own != 0.0) & (block.outcome != FILLED) & moved & ~repelled
    if not repelled.any() and not sunk.any():
        return None
    return np.where(repelled, own, np.where(sunk, NEGLIGIBLE * own, start))


class _Found:
    """Room for the counts of a strip and what is known of its columns."""

    def __init__(self, first: int, last: int, rows: int) -> None:
        self.first, self.rows = first, rows
        self.scratch = np.zeros(2 * (rows + 2), np.uint32)
        self.counts = np.empty((last - first, rows), np.uint32)
        self.numbers = {name: np.zeros(last - first, np.uint64) for name in PER_COLUMN}
        self.filled = self.on_repelling = 0

    def take(self, column: int, block: Block) -> None:
        """Take over the counts of a column."""
        at, samples = column - self.first, block.rules.samples
        self.counts[at] = self.scratch[1 : self.rows + 1]
        found = {
            "exposure": block.outcome.size * samples,
            "below": self.scratch[0],
            "above": self.scratch[self.rows + 1],
            "escaped": np.count_nonzero(block.outcome == GONE) * samples,
            "unsettled": np.count_nonzero(block.outcome == SLOW) * samples,
            "collapsed": np.count_nonzero(block.again),
        }
        for name, number in found.items():
            self.numbers[name][at] = number
        self.filled += int(block.filled.sum())
        self.on_repelling += int(block.on_repelling.sum())

    def counted(self, counter: OrbitCounter) -> Counted:
        """Return the strip."""
        return Counted(Strip(self.first, self.counts, **self.numbers), self.filled, self.on_repelling)


def count_followed(
    counter: OrbitCounter, follow: str, schedule: Schedule, progress: Progress | None = None
) -> dict[str, Histogram]:
    """Count every column of a view in one sweep or in both.

    Parameters
    ----------
    counter : OrbitCounter
    follow : "up", "down" or "both"
    schedule : Schedule
        A sweep is one task; their number of workers does not change the result.
    progress : callable of int, optional
        Told of the samples of every finished strip, in the thread that counted it.

    Returns
    -------
    dict of str to Histogram
        By the direction of the sweep.
    """

    def sweep(direction: str) -> Callable[[], Histogram]:
        return lambda: swept(direction)

    def swept(direction: str) -> Histogram:
        columns = counter.columns
        counts = np.empty((columns, counter.rows), np.uint32)
        numbers = {name: np.empty(columns, np.uint64) for name in PER_COLUMN}
        filled = on_repelling = 0
        for counted in Follower(counter, direction).strips(stop=schedule.stop):
            strip = counted.strip
            counts[strip.first : strip.last] = strip.counts
            for name, array in numbers.items():
                array[strip.first : strip.last] = getattr(strip, name)
            filled += counted.filled
            on_repelling += counted.on_repelling
            if progress is not None:
                progress(len(strip.counts) * counter.exposure)
        return Histogram(Strip(0, counts, **numbers), counter.rules.samples, filled, on_repelling)

    directions = SWEEPS[follow]
    found: list[Histogram] = []
    counter.warm()
    schedule.run(map(sweep, directions), found.append)
    return dict(zip(directions, found, strict=True))
