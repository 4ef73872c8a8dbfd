"""The attractors of one view, collected from the regions that workers look at."""

from __future__ import annotations

from dataclasses import dataclass, replace
from math import lcm
from types import ModuleType

import numpy as np
from numpy.typing import NDArray

from atlas.attractors.ends import (
    NEAR,
    RECORDS,
    WIDE,
    Cycles,
    Ends,
    Floats,
    Grid,
    Sorter,
    Visits,
    Whole,
    roots,
)
from atlas.planes.fates import CHAOTIC, ESCAPES, FIXED_POINT, PERIODIC, QUASI_PERIODIC
from atlas.planes.finder import FateFinder, Region

SIDES = {1: 1024, 2: 256, 3: 40}
"""Cells along each axis of the grid of a view, by the number of state variables."""
MOST_CYCLES = 512
"""Cycles that are told apart in one region."""
FURTHER, FIRST_CYCLE, FIRST_CELL = 7, 8, 1 << 16
"""Keys of orbits: below come the fates that are no attractor; cycles that are not told apart; and so on."""

Keys = NDArray[np.uint32]


@dataclass(frozen=True)
class Box:
    """What the states of quasi-periodic and chaotic orbits span, shape (states,) each."""

    low: Floats
    high: Floats

    def holds(self, other: Box) -> bool:
        """Return whether another box lies inside."""
        return bool((other.low >= self.low).all() and (other.high <= self.high).all())

    def with_another(self, other: Box) -> Box:
        """Return the box that holds both."""
        return Box(np.minimum(self.low, other.low), np.maximum(self.high, other.high))

    def wider(self, share: float) -> Box:
        """Return the box with a margin at each side, a share of its width."""
        with np.errstate(invalid="ignore"):
            margin = np.where(np.isfinite(self.low), (self.high - self.low) * share, 0.0)
        return Box(self.low - margin, self.high + margin)

    @staticmethod
    def empty(states: int) -> Box:
        """Return a box that holds nothing."""
        return Box(np.full(states, np.inf), np.full(states, -np.inf))


@dataclass(frozen=True)
class Cycle:
    """A cycle that orbits of a region reach.

    Attributes
    ----------
    points : ndarray of float64, shape (points, states)
        Where patterns begin.
    period, lowest, orbits : int
        Least period; the lowest start that reaches it, counted row by row; and how many do.
    """

    points: Floats
    period: int
    lowest: int
    orbits: int


@dataclass(frozen=True)
class Entries:
    """What is known of the quasi-periodic and chaotic orbits of a region, by the cell they are joined to.

    Attributes
    ----------
    cells : ndarray of int64, shape (cells,)
    orbits : ndarray of int64, shape (2, cells)
        Quasi-periodic, and chaotic.
    lowest : ndarray of int64, shape (cells,)
    low, high, total : ndarray of float64, shape (states, cells)
    end : ndarray of float64, shape (states, cells)
        Last state of the lowest start.
    """

    cells: Whole
    orbits: Whole
    lowest: Whole
    low: Floats
    high: Floats
    total: Floats
    end: Floats


@dataclass(frozen=True)
class Sighting:
    """What was seen of a region.

    Attributes
    ----------
    keys : ndarray of uint32, shape (columns, rows)
        A fate that is no attractor, or a key of a cycle of the region or of a cell.
    cycles : list of Cycle
    entries : Entries
    joined : (ndarray of int64, ndarray of int64)
        Cells, and the cells that they are joined to.
    box : Box
    left_late, steady : int
        Orbits that left the bound when they were run on; orbits on which volumes are preserved.
    """

    keys: Keys
    cycles: list[Cycle]
    entries: Entries
    joined: tuple[Whole, Whole]
    box: Box
    left_late: int
    steady: int


def look(finder: FateFinder, sorter: Sorter, region: Region, box: Box, stop: NDArray[np.uint8]) -> Sighting:
    """Look at the attractors that the orbits of a region reach.

    Parameters
    ----------
    finder : FateFinder
        Of a plane of initial values.
    sorter : Sorter
    region : Region
    box : Box
        Over which the cells of the grid lie.
    stop : ndarray of uint8, shape (1,)
    """
    ends = Ends.of(finder.find(region, stop=stop))
    columns, rows = region.shape
    column = np.repeat(np.arange(region.left, region.right), rows)
    rank = np.tile(np.arange(region.low, region.high), columns) * finder.columns + column
    lowest_first = np.argsort(rank)
    keys = ends.fate.astype(np.uint32)
    visits, stayed = sorter.visits(ends, lowest_first[ends.others[lowest_first]])
    order = np.concatenate([lowest_first[ends.on_cycles[lowest_first]], stayed])
    one_group = np.zeros(keys.size, np.int64)
    found = sorter.cycles(ends, visits.end, order, one_group, MOST_CYCLES)
    states = len(ends.x)
    grid = Grid.over(box.low[:, None], box.high[:, None], SIDES[states])
    parent = np.arange(grid.cells)
    rest = stayed[found.own[stayed] < 0]
    entered = sorter.joined(ends, rest, grid, one_group, parent)
    keys[ends.others] = ESCAPES
    keys[order] = np.where(found.own[order] < 0, FURTHER, FIRST_CYCLE + found.own[order])
    keys[rest] = FIRST_CELL + entered[rest]
    parent = roots(parent)
    changed = np.flatnonzero(parent != np.arange(parent.size))
    return Sighting(
        keys.reshape(region.shape),
        _cycles(ends, found, rank),
        _entries(ends, visits, rest, entered, rank),
        (changed, parent[changed]),
        _box(visits, rest, states),
        int(ends.others.sum()) - stayed.size,
        int(ends.steady.sum()),
    )


def _cycles(ends: Ends, found: Cycles, rank: Whole) -> list[Cycle]:
    """Return the cycles of a region."""
    told = np.flatnonzero(found.own >= 0)
    told = told[np.argsort(found.own[told], kind="stable")]
    _, at, often = np.unique(found.own[told], return_index=True, return_counts=True)
    lowest = np.minimum.reduceat(rank[told], at) if told.size else told
    cycles = []
    for points, orbit, least, number in zip(found.points, found.firsts, lowest, often, strict=True):
        period = int(ends.period[orbit])
        points = points[: lcm(period, ends.word.size) // ends.word.size]
        cycles.append(Cycle(points, period, int(least), int(number)))
    return cycles


def _box(visits: Visits, orbits: Whole, states: int) -> Box:
    if not orbits.size:
        return Box.empty(states)
    return Box(visits.low[:, orbits].min(axis=1), visits.high[:, orbits].max(axis=1))


def _entries(ends: Ends, visits: Visits, orbits: Whole, entered: Whole, rank: Whole) -> Entries:
    order = orbits[np.lexsort((rank[orbits], entered[orbits]))]
    cells, at = np.unique(entered[order], return_index=True)
    if not cells.size:
        none = np.empty((len(ends.x), 0))
        return Entries(cells, np.empty((2, 0), np.int64), cells, none, none, none, none)
    kinds = [np.add.reduceat((ends.fate[order] == one).astype(np.int64), at) for one in _KINDS]
    return Entries(
        cells,
        np.array(kinds),
        np.minimum.reduceat(rank[order], at),
        np.minimum.reduceat(visits.low[:, order], at, axis=1),
        np.maximum.reduceat(visits.high[:, order], at, axis=1),
        np.add.reduceat(visits.total[:, order], at, axis=1),
        visits.end[:, order[at]],
    )


_KINDS = (QUASI_PERIODIC, CHAOTIC)


@dataclass
class Attractor:
    """An attractor of a view.

    Attributes
    ----------
    number : int
        From 1, in the order of the lowest start that reaches each: lowest row first, then leftmost column.
    fate : int
        Code of `atlas.planes.fates`; where quasi-periodic and chaotic orbits are on the same attractor, that
        of most.
    period : int
        Of a cycle; else 0.
    points : ndarray of float64, shape (points, states)
        Of a cycle, in the order in which they follow each other, where patterns begin; of others none.
    low, high, mean : ndarray of float64, shape (states,)
        The box of its states, and their mean.
    orbits : int
        Starts that reach it.
    lowest : int
        The lowest of them, counted row by row.
    share, error : float
        Share of the box of starts, and its standard error.
    """

    number: int
    fate: int
    period: int
    points: Floats
    low: Floats
    high: Floats
    mean: Floats
    orbits: int
    lowest: int
    share: float = 0.0
    error: float = 0.0


class Registry:
    """Keeps the attractors of all regions of a view, told of one region after the other.

    Parameters
    ----------
    kernels : module
        From `atlas.attractors.kernels.attractor_module`.
    widths : sequence of float
        Of periodic state variables; 0 for the others.
    reach : float
        Largest size of any initial value.
    most : int
        Cycles that are told apart in the view.
    """

    def __init__(self, kernels: ModuleType, widths: tuple[float, ...], reach: float, most: int) -> None:
        states = len(widths)
        self.kernels, self.widths, self.reach, self.most = kernels, np.array(widths), reach, most
        self.cycles: list[Cycle] = []
        self.all_points = np.empty((0, states))
        self.owner = np.empty(0, np.int64)
        self.unknown_cycles = 0
        cells = SIDES[states] ** states
        self.parent = np.arange(cells)
        self.orbits, self.lowest = np.zeros((2, cells), np.int64), np.full(cells, np.iinfo(np.int64).max)
        self.low, self.high = np.full((states, cells), np.inf), np.full((states, cells), -np.inf)
        self.total, self.end = np.zeros((states, cells)), np.zeros((states, cells))
        self.box = Box.empty(states)
        self.left_late = self.steady = 0

    def add(self, seen: Sighting) -> Keys:
        """Take in a region; return its keys, those of cycles as the whole view has them."""
        translation = np.arange(FIRST_CYCLE + len(seen.cycles), dtype=np.uint32)
        for number, cycle in enumerate(seen.cycles):
            translation[FIRST_CYCLE + number] = self._key_of(cycle)
        entries = seen.entries
        self.kernels.unite(self.parent, *seen.joined)
        self.orbits[:, entries.cells] += entries.orbits
        lower = entries.lowest < self.lowest[entries.cells]
        self.end[:, entries.cells[lower]] = entries.end[:, lower]
        self.lowest[entries.cells[lower]] = entries.lowest[lower]
        self.low[:, entries.cells] = np.minimum(self.low[:, entries.cells], entries.low)
        self.high[:, entries.cells] = np.maximum(self.high[:, entries.cells], entries.high)
        self.total[:, entries.cells] += entries.total
        self.box = self.box.with_another(seen.box)
        self.left_late += seen.left_late
        self.steady += seen.steady
        keys: Keys = np.where(
            seen.keys < FIRST_CELL, translation[np.minimum(seen.keys, translation.size - 1)], seen.keys
        )
        return keys

    def _key_of(self, cycle: Cycle) -> int:
        """Return the key of a cycle: that of one already known, which it is the same as, or its own."""
        met = self._met(cycle)
        if not met and len(self.cycles) >= self.most:
            self.unknown_cycles += 1
            return FURTHER
        if not met:
            met = [len(self.cycles)]
            self.cycles.append(cycle)
            self.all_points = np.concatenate([self.all_points, cycle.points])
            self.owner = np.concatenate([self.owner, np.full(len(cycle.points), met[0])])
        else:
            old = self.cycles[met[0]]
            kept = min(old, cycle, key=lambda one: (one.period, one.lowest))
            lowest, orbits = min(old.lowest, cycle.lowest), old.orbits + cycle.orbits
            self.cycles[met[0]] = replace(kept, lowest=lowest, orbits=orbits)
        return FIRST_CYCLE + met[0]

    def _met(self, cycle: Cycle) -> list[int]:
        """Return the known cycles that one is the same as."""
        size = max(self.reach, float(np.abs(cycle.points).max()))
        found = sorted(set().union(*(self._near(point, NEAR * size) for point in cycle.points)))
        periods = {number: self.cycles[number].period for number in found}
        return [n for n in found if cycle.period % periods[n] == 0 or periods[n] % cycle.period == 0]

    def _near(self, state: Floats, distance: float) -> set[int]:
        """Return the known cycles that have a point near a state."""
        away = np.abs(self.all_points - state)
        near = np.minimum(away, np.abs(self.widths - away)).max(axis=1) <= distance
        return set(self.owner[near].tolist())

    def _on_the_way(self, cells: Whole) -> int | None:
        """Return the cycle near which all orbits end that entered cells, if there is one."""
        near = [self._near(state, WIDE * self.reach) for state in self.end[:, cells].T]
        common = set.intersection(*near)
        return min(common) if common else None

    def attractors(self) -> tuple[list[Attractor], dict[int, int]]:
        """Return all attractors in order, and the number of each key."""
        found = [(_of_cycle(cycle), [FIRST_CYCLE + n]) for n, cycle in enumerate(self.cycles)]
        parent = roots(self.parent)
        entered = np.flatnonzero(self.orbits.sum(axis=0))
        for root in np.unique(parent[entered]):
            cells = entered[parent[entered] == root]
            keys = (FIRST_CELL + cells).tolist()
            cycle = self._on_the_way(cells)
            if cycle is None:
                found.append((self._of_cells(cells), keys))
            else:
                attractor, own_keys = found[cycle]
                attractor.orbits += int(self.orbits[:, cells].sum())
                attractor.lowest = min(attractor.lowest, int(self.lowest[cells].min()))
                own_keys += keys
        found.sort(key=lambda pair: pair[0].lowest)
        numbers: dict[int, int] = {}
        for number, (attractor, keys) in enumerate(found, 1):
            attractor.number = number
            numbers |= dict.fromkeys(keys, number)
        return [attractor for attractor, _ in found], numbers

    def _of_cells(self, cells: Whole) -> Attractor:
        kinds = self.orbits[:, cells].sum(axis=1)
        orbits = int(kinds.sum())
        return Attractor(
            0,
            _KINDS[int(kinds[1] >= kinds[0])],
            0,
            np.empty((0, len(self.low))),
            self.low[:, cells].min(axis=1),
            self.high[:, cells].max(axis=1),
            self.total[:, cells].sum(axis=1) / (orbits * RECORDS),
            orbits,
            int(self.lowest[cells].min()),
        )


def _of_cycle(cycle: Cycle) -> Attractor:
    points = cycle.points
    first = min(range(len(points)), key=lambda n: tuple(points[n]))
    points = np.roll(points, -first, axis=0)
    fate = FIXED_POINT if cycle.period == 1 else PERIODIC
    return Attractor(
        0, fate, cycle.period, points, points.min(axis=0), points.max(axis=0), points.mean(axis=0),
        cycle.orbits, cycle.lowest,
    )  # fmt: skip
