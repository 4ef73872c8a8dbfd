"""The whole phase portrait: orbits shared out to workers, their counts added; and samples: auto."""

from __future__ import annotations

import math
import threading
from collections.abc import Callable
from dataclasses import fields, replace

import numpy as np
from numpy.typing import NDArray

from atlas.orbits.histogram import Progress
from atlas.orbits.orbit import LANES, Stopped
from atlas.orbits.orbit_kernels import FILLED, READY
from atlas.orbits.portrait import Counts, Outcome, Portrait, PortraitCounter, most_samples
from atlas.orbits.sampling import LEAST, LEAST_SHARE, ON_PLATES
from atlas.orbits.schedule import Schedule

MOST_ORBITS_AT_ONCE, TASKS = 1024, 64
PILOT_CELLS, PILOT_SAMPLES, PILOT_LIMIT = 256, 1 << 19, 20_000
TOGETHER = 2.0**-16
"""Copies of a start that are nearer than this part of their size have not parted."""


def room_memory(columns: int, rows: int) -> int:
    """Return the bytes that each worker counts in."""
    return 8 * (columns + 2) * (rows + 2)


def result_memory(columns: int, rows: int) -> int:
    """Return the bytes of the counts that are handed over, alive beside the rooms of the workers."""
    return 4 * columns * rows


def workers_that_fit(columns: int, rows: int, memory: int, workers: int) -> int:
    """Return how many workers can count side by side in an amount of memory; 0 where not even one can."""
    room = (memory - result_memory(columns, rows)) // room_memory(columns, rows)
    return max(0, min(workers, room))


def count_portrait(
    counter: PortraitCounter,
    schedule: Schedule,
    progress: Progress | None = None,
    *,
    at_once: int | None = None,
) -> Portrait:
    """Count the orbits of all starts.

    Parameters
    ----------
    counter : PortraitCounter
    schedule : Schedule
        The workers; their number does not change the result.
    progress : callable of int, optional
        Told of the samples of every finished group of orbits, in the thread that counted it.
    at_once : int, optional
        Most workers that may count side by side, where memory is short.

    Returns
    -------
    Portrait
    """
    spare: list[Counts] = []
    rooms: list[Counts] = []
    lock = threading.Lock()
    width = min(MOST_ORBITS_AT_ONCE, LANES * -(-counter.orbits // (LANES * TASKS)))

    def group(first: int) -> Callable[[], Outcome]:
        last = min(first + width, counter.orbits)

        def count() -> Outcome:
            with lock:
                room = spare.pop() if spare else None
            if room is None:
                room = counter.room()
                with lock:
                    rooms.append(room)
            try:
                return counter.count(first, last, room, stop=schedule.stop)
            finally:
                with lock:
                    spare.append(room)
                if progress is not None:
                    progress((last - first) * counter.samples_of_a_copy)

        return count

    outcomes: list[Outcome] = []
    counter.warm()
    schedule.run(
        (group(first) for first in range(0, counter.orbits, width)), outcomes.append, at_once=at_once
    )
    return _portrait(counter, rooms, outcomes)


def _portrait(counter: PortraitCounter, rooms: list[Counts], outcomes: list[Outcome]) -> Portrait:
    whole = rooms.pop()[: counter.cells]
    while rooms:
        whole += rooms.pop()[: counter.cells]
    table = whole.reshape(counter.columns + 2, counter.rows + 2)
    totals = {name.name: sum(getattr(one, name.name) for one in outcomes) for name in fields(Outcome)}
    sides = {"left": table[0], "right": table[-1], "below": table[1:-1, 0], "above": table[1:-1, -1]}
    totals |= {name: int(part.sum(dtype=np.uint64)) for name, part in sides.items()}
    totals["exposure"] = counter.exposure
    counts = np.ascontiguousarray(table[1:-1, 1:-1])
    return Portrait(counts, totals, counter.rules.samples, counter.copies)


def automatic_samples(
    counter: PortraitCounter, counts_per_cell: int = ON_PLATES, stop: NDArray[np.uint8] | None = None
) -> int:
    """Return the samples of each start that give the mean counts aimed at in the occupied cells.

    A pilot on 256 x 256 cells finds the share of samples inside the view, how many cells are occupied, and
    how their number grows with the resolution (as a box-counting dimension between the pilot's cells and
    those of twice their size). Where copies of a start stay together and are on no cycle, each copy alone
    must cover a closed curve across the view.

    Parameters
    ----------
    counter : PortraitCounter
        Its own number of samples does not matter.
    counts_per_cell : int
        Mean counts aimed at.
    stop : ndarray of uint8, shape (1,), optional
        When another thread sets it, the pilot ends early.

    Raises
    ------
    Stopped
        When ``stop`` was set.
    """
    starts = len(counter.starts)
    limit = max(counter.rules.transient, min(counter.rules.transient_limit, PILOT_LIMIT))
    samples = max(8192, PILOT_SAMPLES // starts)
    columns, rows = min(counter.columns, PILOT_CELLS), min(counter.rows, PILOT_CELLS)
    pilot = counter.at(columns, rows, replace(counter.rules, samples=samples, transient_limit=limit))
    room = pilot.room()
    block = pilot.run(0, pilot.orbits, room, stop)
    if stop is not None and stop[0]:
        raise Stopped("the work was interrupted")
    occupied = room[: pilot.cells].reshape(columns + 2, rows + 2)[1:-1, 1:-1]
    inside = int(occupied.sum(dtype=np.uint64))
    if not inside:
        return min(LEAST * counts_per_cell, most_samples(starts))
    cells = _cells_at(occupied > 0, counter.columns, counter.rows)
    share = max(inside / pilot.exposure, LEAST_SHARE)
    wanted = counts_per_cell * cells / (share * starts)
    if _some_together(block.x, block.outcome, pilot):
        curve = min(cells, 2.0 * (counter.columns + counter.rows))
        most = counter.with_samples(most_samples(starts)).copies
        wanted = max(wanted, counts_per_cell * curve * most)
    return min(max(LEAST, math.ceil(wanted)), most_samples(starts))


def _cells_at(occupied: NDArray[np.bool_], columns: int, rows: int) -> float:
    """Return about how many cells are occupied at another resolution."""
    wide, high = occupied.shape
    fine = int(occupied.sum())
    even = np.pad(occupied, ((0, wide % 2), (0, high % 2)))
    coarse = int(even.reshape(-1, 2, even.shape[1] // 2, 2).any(axis=(1, 3)).sum())
    dimension = min(2.0, math.log2(fine / coarse))
    growth: float = math.sqrt(columns / wide * (rows / high)) ** dimension
    return min(fine * growth, float(columns * rows))


def _some_together(x: NDArray[np.float64], outcome: NDArray[np.int8], pilot: PortraitCounter) -> bool:
    """Return whether the copies of some start are on no cycle and have not parted."""
    states = x.reshape(len(x), -1, pilot.copies)
    widths = np.array(pilot.source.widths)[:, None, None]
    with np.errstate(invalid="ignore", over="ignore"):
        gaps = np.abs(states - states[:, :, :1])
        gaps = np.where(widths > 0.0, np.minimum(gaps, np.abs(widths - gaps)), gaps)
        near = (gaps <= TOGETHER * np.abs(states).max(axis=(0, 2), keepdims=True)).all(axis=0)
    going = np.isin(outcome, (READY, FILLED)).reshape(-1, pilot.copies)
    turning = (outcome == READY).reshape(-1, pilot.copies)
    return bool(((near & going).all(axis=1) & turning.any(axis=1)).any())
