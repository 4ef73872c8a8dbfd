"""Densities split by attractor: which start reaches which attractor, along the columns of a view.

At every parameter value the starts are sorted by the attractor that they reach, as `atlas.attractors.ends`
says, on a grid over the box that they visit themselves. From one value to the next, an attractor *continues*
as the one that its own end state reaches when it is run on at the next parameter value: what somebody would
see who moves the parameter slowly, up the axis. An attractor keeps its number as long as it continues. Where
two continue as the same, it keeps the number of the nearer one: that whose end state, before it is run on,
lies nearest to one of 1024 states of the attractor; so the number of an attractor that vanishes in a fold or
a crisis ends there. An attractor that none continues as takes over the number that was lost last, if that
was within the last 64 values: coexisting chaos is not always recognised, and no start may have settled at a
value. Else it gets the next number, numbers beginning with 1 at the first value in the order of the lowest
starts that reach them.

So numbers can change where an attractor comes and goes within the starts' reach: one that no start reaches
for longer is new when it is reached again; an attractor that returns after a fold (hysteresis seen
against its direction) is new; two that merge leave one number, and which of two that part keeps it is decided
by the end state, which may be on either. Numbers beyond ``most`` are joined in the last.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from functools import partial

import numpy as np
from numpy.typing import NDArray

from atlas.attractors.ends import Ends, Floats, Sorter, Whole
from atlas.attractors.per_pixel import Sorted, sort_groups, sorter_of
from atlas.orbits.histogram import Progress
from atlas.orbits.orbit import Stopped
from atlas.orbits.schedule import Schedule
from atlas.orbits.setting import hashed
from atlas.planes.finder import FateFinder
from atlas.planes.pixels import Pixels

MOST_TOLD_APART = 8
VALUES_AT_ONCE = 256
ORBITS_AT_ONCE = 1 << 16
MISSED = 64
"""Values for which the number of an attractor that ended is kept for one that begins."""
STATES_COMPARED = 1024
"""States of an attractor that an end state is compared with."""

Numbers = NDArray[np.uint8]


@dataclass(frozen=True)
class Reached:
    """The attractors that the starts reach at neighbouring parameter values.

    Attributes
    ----------
    number : ndarray of int64, shape (values, starts)
        Within each value, from 0; -1 of starts that reach none.
    onward : ndarray of int64, shape (values - 1, attractors)
        The attractor at the next value whose number each value's attractor hands on; -1 where it ends.
    """

    number: Whole
    onward: Whole


class StartSorter:
    """Sorts starts by the attractors that they reach, at neighbouring parameter values.

    Parameters
    ----------
    finder : FateFinder
        Of the family, its starts and the view; which parameter runs across says the view.
    values : ndarray of float64, shape (values,), optional
        Of that parameter, in the order of the axis; without them all parameters are as the finder has them.
    """

    def __init__(self, finder: FateFinder, values: Floats | None = None) -> None:
        self.finder, self.starts = finder, finder.setting.starts
        self.values = values
        self.size = 1 if values is None else values.size

    def reached(self, first: int, last: int, stop: NDArray[np.uint8]) -> Reached:
        """Sort the starts at the values ``first … last - 1``, and find how their attractors continue.

        Raises
        ------
        Stopped
            When ``stop`` was set.
        """
        sorter = sorter_of(self.finder, stop)
        values, starts = last - first, len(self.starts)
        own = self._ends(np.tile(self.starts.T, values), first, last, starts, stop)
        alone = sort_groups(sorter, own, values)
        slots = max(1, int(alone.different.max()))
        onward = np.full((values - 1, slots), -1)
        if values == 1:
            return Reached(alone.number, onward)
        lowest = np.zeros((values, slots), np.int64)
        for start in reversed(range(starts)):
            met = np.flatnonzero(alone.number[:, start] >= 0)
            lowest[met, alone.number[met, start]] = start
        place = (np.arange(values)[:, None] * starts + lowest)[:-1].reshape(-1)
        carried = self._ends(own.x[:, place], first + 1, last, slots, stop)
        both = self._beside(own, carried, values, slots)
        number = sort_groups(sorter, both, values - 1).number
        before = own.x[:, place].reshape(len(own.x), values - 1, slots)
        for value in range(values - 1):
            wanted = self._continued(number[value], alone, value, slots)
            self._contested(sorter, both, wanted, before[:, value], value * (starts + slots))
            for attractor, (target, _) in wanted.items():
                onward[value, attractor] = target
        return Reached(alone.number, onward)

    def _beside(self, own: Ends, carried: Ends, values: int, slots: int) -> Ends:
        """Return, value by value from the second on, the starts' orbits and then those carried on."""
        starts = len(self.starts)
        row = np.arange(values - 1)[:, None]
        mine = (row + 1) * starts + np.arange(starts)
        others = values * starts + row * slots + np.arange(slots)
        return Ends.together([own, carried]).taken(np.concatenate([mine, others], axis=1).reshape(-1))

    def _continued(self, number: Whole, alone: Sorted, value: int, slots: int) -> dict[int, tuple[int, int]]:
        """Return what each attractor of a value continues as at the next: its number, and a start there."""
        starts = len(self.starts)
        found = {}
        for attractor in range(int(alone.different[value])):
            label = number[starts + attractor]
            same = np.flatnonzero(number[:starts] == label) if label >= 0 else np.empty(0, np.int64)
            if same.size:
                found[attractor] = (int(alone.number[value + 1, same[0]]), int(same[0]))
        return found

    def _contested(
        self, sorter: Sorter, both: Ends, wanted: dict[int, tuple[int, int]], before: Floats, base: int
    ) -> None:
        """Where several attractors continue as the same, leave it to the nearest."""
        claims: dict[int, list[int]] = {}
        for attractor, (target, _) in wanted.items():
            claims.setdefault(target, []).append(attractor)
        for claimed in claims.values():
            if len(claimed) > 1:
                states = sorter.states(both, base + wanted[claimed[0]][1], STATES_COMPARED)
                away = [self._away(states, before[:, one]) for one in claimed]
                nearest = claimed[int(np.argmin(away))]
                for one in claimed:
                    if one != nearest:
                        del wanted[one]

    def _away(self, states: Floats, state: Floats) -> float:
        """Return how far a state is from the nearest of some, the shorter way round periodic variables."""
        gaps = np.abs(states - state)
        gaps = np.minimum(gaps, np.abs(np.array(self.finder.source.widths) - gaps))
        return float(gaps.max(axis=1).min())

    def _ends(self, begin: Floats, first: int, last: int, each: int, stop: NDArray[np.uint8]) -> Ends:
        finder = self.finder
        key = hashed(np.arange(first * each, last * each, dtype=np.uint64)[: begin.shape[1]])
        varying = {}
        if self.values is not None:
            varying[finder.view.across.name] = np.repeat(self.values[first:last], each)
        orbits = finder.setting.orbits(finder.module, finder.source, begin, key, varying)
        found = Pixels(finder.module, finder.rules, orbits, finder.low, stop)
        found.run()
        if stop[0]:
            raise Stopped("the work was interrupted")
        return Ends.of(found)


def attractor_numbers(
    sorter: StartSorter,
    schedule: Schedule,
    progress: Progress | None = None,
    *,
    most: int = MOST_TOLD_APART,
) -> Numbers:
    """Return the number of the attractor that each start reaches at each parameter value.

    Parameters
    ----------
    sorter : StartSorter
    schedule : Schedule
        The workers; their number does not change the result.
    progress : callable of int, optional
        Told of the orbits of every finished group of values.
    most : int
        Numbers given, up to 255; further attractors are joined in the last.

    Returns
    -------
    ndarray of uint8, shape (values, starts)
        From 1; 0 for starts that reach no attractor.
    """
    width = _values_at_once(len(sorter.starts))

    def group(first: int) -> Reached:
        last = min(first + width + 1, sorter.size)
        reached = sorter.reached(first, last, schedule.stop)
        if progress is not None:
            progress(min(width, sorter.size - first) * len(sorter.starts))
        return reached

    numbers = np.zeros((sorter.size, len(sorter.starts)), np.uint8)
    names = _Names()
    row = 0

    def done(reached: Reached) -> None:
        nonlocal row
        for value in range(min(width, sorter.size - row)):
            own = reached.number[value].tolist()
            names.give(range(max(own) + 1))
            numbers[row] = [min(names.of[one], most) if one >= 0 else 0 for one in own]
            row += 1
            if value < len(reached.onward):
                names.hand_on(reached.onward[value].tolist())

    sorter.finder.warm()
    schedule.run((partial(group, first) for first in range(0, sorter.size, width)), done)
    return numbers


def _values_at_once(starts: int) -> int:
    return max(1, min(VALUES_AT_ONCE, ORBITS_AT_ONCE // starts))


def orbits_sorted_at_once(starts: int) -> int:
    """Return how many orbits a thread holds at most: of each value the starts', and those carried on."""
    return 2 * starts * (_values_at_once(starts) + 1)


class _Names:
    """The numbers of the attractors of one value after the other."""

    def __init__(self) -> None:
        self.of: dict[int, int] = {}
        self.lost: dict[int, int] = {}
        self.given = self.value = 0

    def give(self, attractors: Iterable[int]) -> None:
        """Give a number to every attractor that has none: one lost of late, else the next."""
        for attractor in attractors:
            if attractor in self.of:
                continue
            recent = [one for one, value in self.lost.items() if self.value - value <= MISSED]
            if recent:
                name = max(recent, key=lambda one: (self.lost[one], -one))
                del self.lost[name]
            else:
                self.given += 1
                name = self.given
            self.of[attractor] = name

    def hand_on(self, onward: Sequence[int]) -> None:
        """Go to the next value, where each attractor continues as ``onward`` says; -1 where it ends."""
        before, self.of = self.of, {}
        for attractor, target in enumerate(onward):
            if target >= 0 and attractor in before:
                self.of[target] = before[attractor]
        for name in set(before.values()) - set(self.of.values()):
            self.lost[name] = self.value
        self.value += 1
