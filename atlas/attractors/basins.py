"""Basin charts: a plane of initial conditions, and the attractor that the orbit of each reaches.

Fates are found as `atlas.planes.fates` says, and attractors told apart as `atlas.attractors.ends` says, each
once in the whole view: cycles by nearest points; quasi-periodic and chaotic orbits by the cells of one grid
over the box that they visit, joined by all of them. The box is guessed from a coarse chart of 64 by 64
starts, with a margin; where an orbit leaves it, everything is done once more with the box now known. Orbits
that escape while they are run on count as escapes.

Attractors are numbered from 1 in the order of the lowest start that reaches each: lowest row first, then
leftmost column. The share of the box of starts that a basin holds is the share of the grid's points; its
standard error is that of a binomial count, sqrt(q (1 - q) / n), as if the n points lay at random. A grid does
better where basins have smooth edges; where the edge is a fractal, or the points are few, not much.

Nothing but four bytes an orbit is kept of the whole view. At most ``most`` attractors are told apart;
further ones, in the order of their numbers, are one class, and counted. Where volumes in state space are
preserved there are no attractors: the invariant curves and chaotic zones that orbits fill are joined wherever
they share a cell, and the chart says of how many orbits that is so.
"""

from __future__ import annotations

import copy
from collections.abc import Iterator
from dataclasses import dataclass
from functools import partial
from hashlib import blake2b
from math import sqrt

import numpy as np
from numpy.typing import NDArray

from atlas.attractors.per_pixel import sorter_of
from atlas.attractors.registry import FURTHER, Attractor, Box, Keys, Registry, Sighting, look
from atlas.orbits.schedule import Schedule
from atlas.planes.fates import CLASS_OF_FATE, ESCAPES, EXTINCT, UNSETTLED
from atlas.planes.finder import FateFinder, Region
from atlas.planes.survey import Progress, regions

MOST_ATTRACTORS = 1000
PILOT, PILOT_COLUMNS = 64, 8
MARGIN = 1 / 16
CELLS_AT_ONCE = 1 << 20


@dataclass(frozen=True)
class Basins:
    """A basin chart.

    Attributes
    ----------
    classes : ndarray of uint16, shape (columns, rows)
        Number of the attractor that each start reaches, from 1, and ``len(attractors) + 1`` for those that
        are not told apart; else the class of its fate, see `atlas.planes.fates`.
    attractors : list of Attractor
        In the order of their numbers.
    further : int
        Attractors that are not told apart, at least.
    further_orbits : int
        Starts that reach these.
    fates : dict of int to int
        Starts that reach no attractor, by their fate.
    left_late : int
        Of these, orbits that were quasi-periodic or chaotic until they were run on, and escaped then.
    steady : int
        Quasi-periodic and chaotic orbits on which volumes in state space are preserved.
    """

    classes: NDArray[np.uint16]
    attractors: list[Attractor]
    further: int
    further_orbits: int
    fates: dict[int, int]
    left_late: int
    steady: int

    def digest(self) -> str:
        """Return 32 hexadecimal digits of the classes, little-endian."""
        return blake2b(np.ascontiguousarray(self.classes, "<u2").data, digest_size=16).hexdigest()

    def shares(self) -> dict[str, float | int]:
        """Return what a certificate says of the starts that reach no attractor, and of what is joined."""
        total = max(1, self.classes.size)
        shares: dict[str, float | int] = {
            name: self.fates.get(fate, 0) / total
            for name, fate in (("escaped", ESCAPES), ("extinct", EXTINCT), ("unsettled", UNSETTLED))
        }
        return {
            **shares,
            "further_attractors": self.further_orbits / total,
            "volume_preserving_orbits": self.steady,
            "orbits_escaped_late": self.left_late,
        }


def share_and_error(orbits: int, total: int) -> tuple[float, float]:
    """Return a share of a box of starts and its standard error, that of a binomial count."""
    share = orbits / total
    return share, sqrt(share * (1.0 - share) / total)


def chart_basins(
    finder: FateFinder, schedule: Schedule, progress: Progress | None = None, *, most: int = MOST_ATTRACTORS
) -> Basins:
    """Find the attractor that every start of a plane of initial conditions reaches.

    Parameters
    ----------
    finder : FateFinder
        Both of its axes are state variables; variables on no axis start at the first start.
    schedule : Schedule
        The workers; their number does not change the result.
    progress : callable of int, optional
        Told of the starts of every finished region; not of those looked at a second time.
    most : int
        Attractors that are told apart.

    Returns
    -------
    Basins

    Raises
    ------
    Stopped
        When the schedule was stopped.
    """
    finder.warm()
    pilot = copy.copy(finder)
    pilot.columns, pilot.rows = min(finder.columns, PILOT), min(finder.rows, PILOT)
    unknown = Box(*np.zeros((2, len(finder.family.states))))
    guessed = _pass(pilot, unknown, schedule, most, _strips(pilot), None, None)
    keys = np.empty((finder.columns, finder.rows), np.uint32)
    box = guessed.box.wider(MARGIN)
    registry = _pass(finder, box, schedule, most, regions(finder.columns, finder.rows), keys, progress)
    if not box.holds(registry.box):
        every = regions(finder.columns, finder.rows)
        registry = _pass(finder, registry.box, schedule, most, every, keys, None)
    return _chart(keys, registry, most)


def _strips(finder: FateFinder) -> Iterator[Region]:
    for left in range(0, finder.columns, PILOT_COLUMNS):
        yield Region(left, min(left + PILOT_COLUMNS, finder.columns), 0, finder.rows)


def _pass(
    finder: FateFinder,
    box: Box,
    schedule: Schedule,
    most: int,
    every: Iterator[Region],
    keys: Keys | None,
    progress: Progress | None,
) -> Registry:
    """Look at all regions once, with a grid over a box."""
    sorter = sorter_of(finder, schedule.stop)
    registry = Registry(sorter.kernels, finder.source.widths, sorter.reach, most)

    def looked(region: Region) -> tuple[Region, Sighting]:
        sighting = look(finder, sorter, region, box, schedule.stop)
        if progress is not None:
            progress(region.shape[0] * region.shape[1])
        return region, sighting

    def done(pair: tuple[Region, Sighting]) -> None:
        region, sighting = pair
        own = registry.add(sighting)
        if keys is not None:
            keys[region.left : region.right, region.low : region.high] = own

    schedule.run((partial(looked, region) for region in every), done)
    return registry


def _chart(keys: Keys, registry: Registry, most: int) -> Basins:
    attractors, numbers = registry.attractors()
    last = min(len(attractors), most)
    class_of_key = np.zeros(int(keys.max()) + 1, np.uint16)
    class_of_key[: min(FURTHER, class_of_key.size)] = CLASS_OF_FATE[: class_of_key.size]
    for key, number in numbers.items():
        if key < class_of_key.size:
            class_of_key[key] = min(number, last + 1)
    if class_of_key.size > FURTHER:
        class_of_key[FURTHER] = last + 1
    classes = np.empty(keys.shape, np.uint16)
    fates = np.zeros(FURTHER + 1, np.int64)
    width = max(1, CELLS_AT_ONCE // keys.shape[1])
    for first in range(0, len(keys), width):
        part = keys[first : first + width]
        classes[first : first + width] = class_of_key[part]
        fates += np.bincount(np.minimum(part, FURTHER).reshape(-1), minlength=fates.size)
    for attractor in attractors:
        attractor.share, attractor.error = share_and_error(attractor.orbits, keys.size)
    kept = attractors[:last]
    none = fates[:FURTHER]
    return Basins(
        classes,
        kept,
        len(attractors) - last + registry.unknown_cycles,
        int(keys.size - none.sum()) - sum(attractor.orbits for attractor in kept),
        {fate: int(often) for fate, often in enumerate(none) if often},
        registry.left_late,
        registry.steady,
    )
