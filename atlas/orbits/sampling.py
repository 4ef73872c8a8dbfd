"""How many samples each orbit gets when a config says ``samples: auto``."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from atlas.orbits.orbit import OrbitCounter
from tiles.strip import Strip

ON_PLATES, IN_TILES = 48, 16
"""Mean counts aimed at, per cell of a column's occupied range; at least 8 are promised."""

LEAST, PILOT_COLUMNS, PILOT_ROWS, PILOT_SAMPLES = 256, 128, 1024, 1024
LEAST_SHARE = 1 / 64
MOST = (1 << 32) - 1


def whole_height(rows: int, orbits_per_column: int, counts_per_cell: int) -> int:
    """Return the samples of each orbit that fill a column from end to end.

    That is enough wherever the attractor lies inside the view.
    """
    return min(max(LEAST, math.ceil(counts_per_cell * rows / orbits_per_column)), MOST // orbits_per_column)


LOOKED_AT = 256


def counts_reached(strip: Strip) -> float:
    """Return the median over columns of the mean counts per cell of the column's occupied range.

    Some 256 columns are looked at; those without counts inside the view are passed over, and without any
    there is nothing to miss: infinity.
    """
    chosen = strip.counts[:: max(1, len(strip.counts) // LOOKED_AT)]
    means = []
    for column in chosen:
        occupied = np.flatnonzero(column)
        if occupied.size:
            means.append(float(column.sum(dtype=np.uint64)) / float(occupied[-1] - occupied[0] + 1))
    return float(np.median(means)) if means else math.inf


def automatic(
    counter: OrbitCounter, counts_per_cell: int = ON_PLATES, stop: NDArray[np.uint8] | None = None
) -> int:
    """Return the samples of each orbit that give the mean counts aimed at in every column.

    A pilot of 128 columns finds which part of the samples falls inside the view and over how many cells it
    is spread. Columns with less than 1/64 of their samples inside do not raise the number further: a deep
    zoom may stay below the mean aimed at, which :func:`counts_reached` tells afterwards.

    Parameters
    ----------
    counter : OrbitCounter
        At the deepest resolution asked for; its own number of samples does not matter.
    counts_per_cell : int
        Mean counts aimed at.
    stop : ndarray of uint8, shape (1,), optional
        When another thread sets it, the pilot ends early.

    Returns
    -------
    int
    """
    rows = min(counter.rows, PILOT_ROWS)
    rules = replace(
        counter.rules,
        samples=PILOT_SAMPLES,
        values_per_column=1,
        transient_limit=max(counter.rules.transient, min(counter.rules.transient_limit, 20_000)),
    )
    pilot = counter.at(min(counter.columns, PILOT_COLUMNS), rows, rules)
    strip = pilot.count(0, pilot.columns, stop=stop).strip
    occupied = strip.counts > 0
    some = occupied.any(axis=1)
    if not some.any():
        return whole_height(counter.rows, counter.orbits_per_column, counts_per_cell)
    lowest = occupied.argmax(axis=1)
    highest = rows - 1 - occupied[:, ::-1].argmax(axis=1)
    span = (highest - lowest + 1)[some] * (counter.rows / rows)
    share = strip.counts.sum(axis=1)[some] / strip.exposure[some]
    wanted = counts_per_cell * span / np.maximum(share, LEAST_SHARE) / counter.orbits_per_column
    return min(max(LEAST, math.ceil(float(wanted.max()))), MOST // counter.orbits_per_column)
