"""Orbits whose fates are known, at their ends, and which of them are on the same attractor.

*Cycles* are told apart by nearest points: two are the same where one period divides the other (a cycle that
has just doubled can pass for either) and a point of one lies within 2**-16 of a point of the other. That is
in units of the largest initial value of any state variable in the view, or of the cycle's own size where this
is larger; sixteen times what a cycle is confirmed with (`atlas.planes.fates`). *Other* orbits are run on by
``RECORDS`` states. One that then ends within 2**-10 of a point of a cycle that another orbit reaches is on
its way there, too slowly to tell before. The rest are on the same attractor where the cells that they visit,
of a grid over the box of all these states, are joined through cells that others visit too. So two attractors
that pass through the same cell count as one, and so do the neighbouring curves of a map that preserves areas.

Where parameters follow a pattern, only states at its beginning are compared: two orbits that go through the
same states at different places of the pattern are on different attractors.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from types import ModuleType

import numpy as np
from numpy.typing import NDArray

from atlas.planes.fates import CHAOTIC, FIXED_POINT, PERIODIC, QUASI_PERIODIC
from atlas.planes.pixels import Pixels

RECORDS = 1024
"""States of an orbit that is on no cycle that are looked at."""
RECORDS_AT_ONCE = 1 << 22
"""States of all orbits together that one call of a kernel may look at, so that an interrupt is soon heard."""
NEAR = 2.0**-16
"""How near points of cycles lie that count as the same."""
WIDE = 2.0**-10
"""How near to a point of a cycle an orbit ends that is on its way there."""

_EACH_ORBIT = ("x", "c", "key", "fate", "period", "turn", "collapsed", "steady")

Floats = NDArray[np.float64]
Whole = NDArray[np.int64]


@dataclass(frozen=True)
class Ends:
    """Orbits side by side, at their ends.

    Attributes
    ----------
    x : ndarray of float64, shape (states, orbits)
        Where they stand, at the beginning of a pattern.
    c : ndarray of float64, shape (rows, orbits)
        Coefficients.
    word : ndarray of int64, shape (length,)
        The pattern.
    key : ndarray of uint64, shape (orbits,)
        Seeds of the disturbance of collapsed orbits.
    fate : ndarray of uint8, period : ndarray of uint16, turn : ndarray of int64, shape (orbits,)
        As `atlas.planes.pixels.Pixels` has them.
    collapsed : ndarray of bool, shape (orbits,)
    steady : ndarray of bool, shape (orbits,)
        On no cycle, of several state variables, and volumes in state space neither shrink nor grow.
    bound : float
        Where an orbit has escaped.
    """

    x: Floats
    c: Floats
    word: Whole
    key: NDArray[np.uint64]
    fate: NDArray[np.uint8]
    period: NDArray[np.uint16]
    turn: Whole
    collapsed: NDArray[np.bool_]
    steady: NDArray[np.bool_]
    bound: float

    @staticmethod
    def of(found: Pixels) -> Ends:
        """Return the ends of orbits whose fates are known."""
        other = (found.fate == QUASI_PERIODIC) | (found.fate == CHAOTIC)
        steady = other & (len(found.x) > 1)
        steady[steady] = np.abs(found.exponents[:, steady].sum(axis=0)) < 1e-9
        return Ends(
            found.x, *found.map, found.key, found.fate, found.period, found.turn, found.collapsed, steady,
            found.bound,
        )  # fmt: skip

    @staticmethod
    def together(parts: Sequence[Ends]) -> Ends:
        """Return the orbits of several parts of the same map, one part after the other."""
        whole = {
            name: np.concatenate([getattr(part, name) for part in parts], axis=-1) for name in _EACH_ORBIT
        }
        return Ends(word=parts[0].word, bound=parts[0].bound, **whole)

    def taken(self, orbits: Whole) -> Ends:
        """Return some of the orbits, in a given order."""
        some = {name: np.ascontiguousarray(getattr(self, name)[..., orbits]) for name in _EACH_ORBIT}
        return Ends(word=self.word, bound=self.bound, **some)

    @property
    def on_cycles(self) -> NDArray[np.bool_]:
        """Orbits on cycles."""
        found: NDArray[np.bool_] = (self.fate == FIXED_POINT) | (self.fate == PERIODIC)
        return found

    @property
    def others(self) -> NDArray[np.bool_]:
        """Quasi-periodic and chaotic orbits."""
        found: NDArray[np.bool_] = (self.fate == QUASI_PERIODIC) | (self.fate == CHAOTIC)
        return found


@dataclass(frozen=True)
class Cycles:
    """Which orbits are on the same cycle.

    Attributes
    ----------
    own : ndarray of int64, shape (orbits,)
        Number of the cycle within the orbit's group, from 0; -1 for orbits on none, and -2 where there were
        too many cycles.
    points : list of ndarray of float64, shape (points, states)
        Of the cycles of the last group.
    firsts : ndarray of int64
        An orbit on each of these, of the least period found there.
    """

    own: Whole
    points: list[Floats]
    firsts: Whole


@dataclass(frozen=True)
class Visits:
    """What the next states of some orbits are.

    Attributes
    ----------
    low, high : ndarray of float64, shape (states, orbits)
        The box that each orbit visits.
    total : ndarray of float64, shape (states, orbits)
        Sum of its states.
    end : ndarray of float64, shape (states, orbits)
        The last of them.
    """

    low: Floats
    high: Floats
    total: Floats
    end: Floats


@dataclass(frozen=True)
class Grid:
    """Cells over boxes, one box a group of orbits.

    Attributes
    ----------
    low, inverse : ndarray of float64, shape (states, groups)
        Where the cells begin, and their inverse size; 0 where a box is flat.
    side : int
        Cells along each axis.
    """

    low: Floats
    inverse: Floats
    side: int

    @staticmethod
    def over(low: Floats, high: Floats, side: int) -> Grid:
        """Return cells over boxes, given by their ends, shape (states, groups)."""
        with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
            inverse = side / (high - low)
        return Grid(low, np.where(np.isfinite(inverse), inverse, 0.0), side)

    @property
    def cells(self) -> int:
        """Cells of a group."""
        return int(self.side ** len(self.low))


class Sorter:
    """Finds which of many ends are on the same attractor.

    Parameters
    ----------
    kernels : module
        From `atlas.attractors.kernels.attractor_module`.
    reach : float
        Largest size of any initial value.
    before : int
        Steps done, which the disturbance of collapsed orbits goes on from.
    stop : ndarray of uint8, shape (1,), optional
        When another thread sets it, the work ends early; the results are then worth nothing.
    """

    def __init__(
        self, kernels: ModuleType, reach: float, before: int, stop: NDArray[np.uint8] | None = None
    ) -> None:
        self.kernels, self.reach, self.before = kernels, reach, before
        self.stop = np.zeros(1, np.uint8) if stop is None else stop

    def cycles(self, ends: Ends, end: Floats, order: Whole, group: Whole, most: int) -> Cycles:
        """Number the cycles of each group in the order of the orbits.

        Parameters
        ----------
        ends : Ends
        end : ndarray of float64, shape (states, orbits)
            Last states of orbits that are on no cycle, from :meth:`visits`.
        order : ndarray of int64
            Orbits of a group next to each other, first those on cycles.
        group : ndarray of int64, shape (orbits,)
        most : int
            Cycles told apart in a group.
        """
        own = np.full(ends.fate.size, -1)
        if not order.size:
            return Cycles(own, [], order)
        longest = max(1, int(ends.turn[order].max()) // ends.word.size)
        points = np.empty((most, longest, len(ends.x)))
        sizes, firsts = np.zeros(most, np.int64), np.zeros(most, np.int64)
        period = np.where(ends.on_cycles, ends.period, 0)
        known = self.kernels.gather(
            ends.x, end, ends.c, ends.word, order, group, period, ends.turn, NEAR, WIDE, self.reach, own,
            points, sizes, firsts,
        )  # fmt: skip
        full = order[(own[order] < 0) & ends.on_cycles[order]]
        own[full] = -2
        return Cycles(own, [points[a, : sizes[a]].copy() for a in range(known)], firsts[:known].copy())

    def states(self, ends: Ends, orbit: int, number: int) -> Floats:
        """Return the next states of an orbit where patterns begin, shape (number, states)."""
        states = np.empty((number, len(ends.x)))
        self.kernels.follow(ends.x, ends.c, ends.word, orbit, number, states)
        return states

    def visits(self, ends: Ends, order: Whole) -> tuple[Visits, Whole]:
        """Look at the next states of orbits; return them, and the orbits that did not leave the bound."""
        shape = ends.x.shape
        visits = Visits(np.full(shape, np.inf), np.full(shape, -np.inf), np.zeros(shape), np.zeros(shape))
        gone = np.zeros(shape[1], np.bool_)
        for part, kernel in self._parts(ends, order, "visit"):
            kernel(
                ends.x, ends.c, ends.word, ends.key, part, self.before, RECORDS, ends.bound, visits.low,
                visits.high, visits.total, visits.end, gone,
            )  # fmt: skip
        return visits, order[~gone[order]]

    def joined(self, ends: Ends, order: Whole, grid: Grid, group: Whole, parent: Whole) -> Whole:
        """Join the cells that orbits visit; return the lowest cell that each is joined to, -1 of others.

        Parameters
        ----------
        ends : Ends
        order : ndarray of int64
        grid : Grid
            The cells of each group of orbits.
        group : ndarray of int64, shape (orbits,)
            Every orbit's group.
        parent : ndarray of int64, shape (groups * cells of a group,)
            The cells that cells are joined to; changed.
        """
        entered = np.full(ends.fate.size, -1)
        for part, kernel in self._parts(ends, order, "join"):
            kernel(
                ends.x, ends.c, ends.word, ends.key, part, self.before, RECORDS, grid.low, grid.inverse,
                grid.side, group, parent, entered,
            )  # fmt: skip
        if not self.stop[0]:
            self.kernels.lowest(parent, order, entered)
        return entered

    def _parts(self, ends: Ends, order: Whole, name: str) -> Iterator[tuple[Whole, Callable[..., None]]]:
        """Yield few orbits at a time and the kernel for them: collapsed ones are disturbed."""
        few = max(1, RECORDS_AT_ONCE // (RECORDS * ends.word.size))
        for disturbed in (False, True):
            kernel = getattr(self.kernels, f"{name}_disturbed" if disturbed else name)
            some = order[ends.collapsed[order] == disturbed]
            for first in range(0, some.size, few):
                if self.stop[0]:
                    return
                yield some[first : first + few], kernel


def roots(parent: Whole) -> Whole:
    """Return the lowest cell that each cell is joined to."""
    while True:
        further = parent[parent]
        if np.array_equal(further, parent):
            return further
        parent = further
