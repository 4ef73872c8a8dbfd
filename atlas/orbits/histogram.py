"""The orbit histogram of a whole view, put together from blocks of columns that workers count."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from hashlib import blake2b

import numpy as np
from numpy.typing import NDArray

from atlas.orbits.orbit import LANES, Counted, OrbitCounter
from atlas.orbits.schedule import Schedule
from tiles.strip import PER_COLUMN, Strip

BLOCK_BYTES = 1 << 20
BLOCK_ORBITS = 1 << 14

Progress = Callable[[int], None]


@dataclass(frozen=True)
class Histogram:
    """Counts of every column of a view.

    Attributes
    ----------
    strip : Strip
        All columns.
    samples : int
        Samples of each orbit.
    filled : int
        Samples that exact repeats filled.
    on_repelling : int
        Orbits whose start lies exactly on a repelling cycle.
    """

    strip: Strip
    samples: int
    filled: int
    on_repelling: int

    def digest(self) -> str:
        """Return 32 hexadecimal digits of the counts and of what is known of each column, little-endian."""
        state = blake2b(digest_size=16)
        state.update(np.ascontiguousarray(self.strip.counts, "<u4").data)
        for name in PER_COLUMN:
            state.update(np.ascontiguousarray(getattr(self.strip, name), "<u8").data)
        return state.hexdigest()

    def shares(self) -> dict[str, float | int]:
        """Return what was not counted inside, as shares of all samples, and the orbits to be told of."""
        total = int(self.strip.exposure.sum())
        shares: dict[str, float | int] = {
            name: int(getattr(self.strip, name).sum()) / total
            for name in ("below", "above", "escaped", "unsettled")
        }
        shares["collapsed_orbits"] = int(self.strip.collapsed.sum())
        shares["orbits_on_repelling_start"] = self.on_repelling
        return shares


def block_width(counter: OrbitCounter) -> int:
    """Return how many columns a block has: enough to fill the lanes, few enough to stay in the cache."""
    full = -(-LANES // counter.orbits_per_column)
    cached = min(256, BLOCK_BYTES // (4 * (counter.rows + 2)))
    few = max(1, BLOCK_ORBITS // counter.orbits_per_column)
    return min(full * max(2, cached // full), few)


def count_histogram(counter: OrbitCounter, schedule: Schedule, progress: Progress | None = None) -> Histogram:
    """Count every column of a view.

    Parameters
    ----------
    counter : OrbitCounter
    schedule : Schedule
        The workers; their number does not change the result.
    progress : callable of int, optional
        Told of every finished block's samples, in the thread that counted it.

    Returns
    -------
    Histogram
    """
    columns = counter.columns
    counts = np.empty((columns, counter.rows), np.uint32)
    numbers: dict[str, NDArray[np.uint64]] = {name: np.empty(columns, np.uint64) for name in PER_COLUMN}
    totals = [0, 0]
    width = block_width(counter)

    def block(first: int) -> Callable[[], Counted]:
        last = min(first + width, columns)

        def count() -> Counted:
            counted = counter.count(first, last, out=counts[first:last], stop=schedule.stop)
            if progress is not None:
                progress((last - first) * counter.exposure)
            return counted

        return count

    def done(counted: Counted) -> None:
        strip = counted.strip
        for name, array in numbers.items():
            array[strip.first : strip.last] = getattr(strip, name)
        totals[0] += counted.filled
        totals[1] += counted.on_repelling

    counter.warm()
    schedule.run((block(first) for first in range(0, columns, width)), done)
    return Histogram(Strip(0, counts, **numbers), counter.rules.samples, *totals)
