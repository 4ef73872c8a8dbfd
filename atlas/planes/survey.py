"""The fates of a whole plane, put together from regions that workers look at."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from functools import partial
from typing import Any, TypeVar

import numpy as np
from numpy.typing import NDArray

from atlas.attractors.per_pixel import attractor_counts
from atlas.orbits.schedule import Schedule
from atlas.planes.fates import CLASS_ESCAPES, CLASS_EXTINCT, CLASS_UNSETTLED
from atlas.planes.finder import FateFinder, Region
from atlas.planes.layers import LAYERS, classes_of
from atlas.planes.pixels import Pixels

PIXELS_AT_ONCE = 1 << 14
REGION_ROWS = 256
T = TypeVar("T")
Progress = Callable[[int], None]
Layers = dict[str, NDArray[Any]]


@dataclass
class Tally:
    """How many pixels of a plane are of each class, and what must not go unsaid of them.

    Attributes
    ----------
    classes : dict of int to int
        Pixels by class, see `atlas.planes.fates`.
    collapsed : int
        Orbits that rounding dropped onto a repelling cycle, run again.
    repelling : int
        Orbits whose start lies exactly on a repelling cycle.
    """

    classes: dict[int, int]
    collapsed: int = 0
    repelling: int = 0

    def add(self, other: Tally) -> None:
        """Add the pixels of another part of the plane."""
        for number, pixels in other.classes.items():
            self.classes[number] = self.classes.get(number, 0) + pixels
        self.collapsed += other.collapsed
        self.repelling += other.repelling

    def shares(self) -> dict[str, float | int]:
        """Return what a certificate says of the fates: shares of pixels, and numbers of orbits."""
        total = max(1, sum(self.classes.values()))
        shares: dict[str, float | int] = {
            name: self.classes.get(number, 0) / total
            for name, number in (
                ("escaped", CLASS_ESCAPES),
                ("extinct", CLASS_EXTINCT),
                ("unsettled", CLASS_UNSETTLED),
            )
        }
        return {
            **shares,
            "collapsed_orbits": self.collapsed,
            "orbits_on_repelling_start": self.repelling,
        }


def tally_of(found: Pixels) -> Tally:
    """Return the tally of the pixels of a region."""
    numbers, often = np.unique(classes_of(found.fate, found.period), return_counts=True)
    classes = dict(zip(numbers.tolist(), often.tolist(), strict=True))
    return Tally(classes, int(found.collapsed.sum()), int(found.repelling.sum()))


def regions(columns: int, rows: int) -> Iterator[Region]:
    """Yield regions that cover a plane, column by column of regions, each from the lowest up."""
    height = min(rows, REGION_ROWS)
    width = max(1, min(columns, PIXELS_AT_ONCE // height))
    for left in range(0, columns, width):
        for low in range(0, rows, height):
            yield Region(left, min(left + width, columns), low, min(low + height, rows))


def layers_of(finder: FateFinder, region: Region, names: tuple[str, ...], stop: Any) -> tuple[Layers, Tally]:
    """Return some layers of a region, each of its shape, and the tally of its pixels."""
    found = finder.find(region, stop=stop)
    taken: Layers = {}
    for name in names:
        take = LAYERS[name].take
        values = take(found, finder.winding) if take else attractor_counts(finder, region, stop)
        taken[name] = values.reshape(region.shape)
    return taken, tally_of(found)


def survey(
    finder: FateFinder,
    look: Callable[[Region], T],
    done: Callable[[Region, T], None],
    schedule: Schedule,
    progress: Progress | None = None,
) -> None:
    """Look at every region of a plane on the workers, and hand over what was seen in order.

    Parameters
    ----------
    finder : FateFinder
    look : callable of Region
        Called in the threads of the schedule.
    done : callable of (Region, result)
        Called in the calling thread, in the order of the regions.
    schedule : Schedule
    progress : callable of int, optional
        Told of the pixels of every finished region.
    """

    def looked(region: Region) -> tuple[Region, T]:
        result = look(region)
        if progress is not None:
            progress(region.shape[0] * region.shape[1])
        return region, result

    finder.warm()
    tasks = (partial(looked, region) for region in regions(finder.columns, finder.rows))
    schedule.run(tasks, lambda pair: done(*pair))


def whole_plane(
    finder: FateFinder, names: tuple[str, ...], schedule: Schedule, progress: Progress | None = None
) -> tuple[Layers, Tally]:
    """Return layers of a whole plane, arrays of shape (columns, rows), and the tally of its pixels."""
    shape = (finder.columns, finder.rows)
    whole: Layers = {name: np.empty(shape, LAYERS[name].kind) for name in names}
    tally = Tally({})

    def done(region: Region, result: tuple[Layers, Tally]) -> None:
        layers, part = result
        for name, values in layers.items():
            whole[name][region.left : region.right, region.low : region.high] = values
        tally.add(part)

    survey(finder, lambda region: layers_of(finder, region, names, schedule.stop), done, schedule, progress)
    return whole, tally
