"""Phase portraits: two state variables or observables of orbits, counted at one setting of the parameters.

Every start is run as several copies, so that the lanes and the workers are filled. Copy 0 is the start
itself; in every other copy each state variable is multiplied by 1 - u 2**-40 with u hashed from start, copy
and variable, so that a zero stays a zero. A start that lies exactly on a repelling cycle is not disturbed:
all its copies are the start. On a chaotic attractor of exponent L copies part within some 28 / L steps and
are as good as different orbits; on a cycle or an invariant curve they stay together, and their counts are
those of one copy, many times over. How many copies there are follows from the number of samples and of starts
alone.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from hashlib import blake2b
from types import ModuleType

import numpy as np
from numpy.typing import NDArray

from atlas.families.map_family import Family
from atlas.orbits.block import Block, CountedAxis, Orbits, Rules
from atlas.orbits.kernel_source import kernel_source
from atlas.orbits.orbit import LANES, MOST_CELLS, Stopped
from atlas.orbits.orbit_kernels import GONE, SLOW
from atlas.orbits.setting import Setting, counted_axis, hashed
from atlas.orbits.step import StepSource, load_module, step_source
from tiles.errors import TooLarge
from tiles.number import Exact
from tiles.window import View

ORBITS, MOST_COPIES, SAMPLES_OF_A_COPY = 1024, 256, 4096
"""Orbits wanted side by side, copies of a start at most, and samples of each copy at least."""
SIDES = ("below", "above", "left", "right")
TOTALS = ("exposure", *SIDES, "escaped", "unsettled", "collapsed", "on_repelling", "filled")

Counts = NDArray[np.uint32]


@dataclass(frozen=True)
class Portrait:
    """Counts of a phase portrait.

    Attributes
    ----------
    counts : ndarray of uint32, shape (columns, rows)
        Row 0 lowest.
    totals : dict of str to int
        In samples: ``exposure``, ``left`` and ``right`` of the view, ``below`` and ``above`` between them,
        ``escaped``, ``unsettled``, and ``filled`` by exact repeats; in orbits: ``collapsed`` and
        ``on_repelling``. Inside + the four sides + escaped + unsettled = exposure.
    samples : int
        Of each start.
    copies : int
        Of each start.
    """

    counts: Counts
    totals: dict[str, int]
    samples: int
    copies: int

    @property
    def reached(self) -> float:
        """Mean counts of the occupied cells; infinite without any."""
        occupied = int(np.count_nonzero(self.counts))
        return int(self.counts.sum(dtype=np.uint64)) / occupied if occupied else math.inf

    def digest(self) -> str:
        """Return 32 hexadecimal digits of the counts and the totals, little-endian."""
        state = blake2b(digest_size=16)
        state.update(np.ascontiguousarray(self.counts, "<u4").data)
        state.update(np.array([self.totals[name] for name in TOTALS], "<u8").data)
        return state.hexdigest()

    def shares(self) -> dict[str, float | int]:
        """Return what was not counted inside, as shares of all samples, and the orbits to be told of."""
        shares: dict[str, float | int] = {
            name: self.totals[name] / self.totals["exposure"] for name in (*SIDES, "escaped", "unsettled")
        }
        shares["collapsed_orbits"] = self.totals["collapsed"]
        shares["orbits_on_repelling_start"] = self.totals["on_repelling"]
        return shares


@dataclass(frozen=True)
class Outcome:
    """What became of some of the orbits, in orbits and in samples."""

    escaped: int
    unsettled: int
    collapsed: int
    on_repelling: int
    filled: int


def copies_of(samples: int, starts: int) -> int:
    """Return as how many copies each start is run.

    Examples
    --------
    >>> copies_of(1000, 1), copies_of(1_000_000, 1), copies_of(10**8, 1), copies_of(10**8, 64)
    (1, 244, 256, 16)
    """
    return max(1, min(MOST_COPIES, -(-ORBITS // starts), samples // SAMPLES_OF_A_COPY))


def most_samples(starts: int) -> int:
    """Return the samples of each start up to which no count can overflow, however they are rounded up."""
    return max(1, ((1 << 32) - 1) // starts - MOST_COPIES)


class PortraitCounter:
    """Counts the orbits of all starts over a view of two state variables or observables.

    Parameters
    ----------
    family : Family
    view : View
        Both axes name a state variable or an observable.
    columns, rows : int
        Resolution of the view.
    rules : Rules
        ``samples`` are those of a start, rounded up to whole numbers for each of its copies;
        ``values_per_column`` says nothing here.
    set : mapping of str to Exact, optional
        Parameters that differ from the family's defaults.
    starts : sequence of mappings of str to Exact, optional
        Initial conditions; variables left out start where the family says.
    lanes : int
        Orbits that advance together; changes nothing but speed.
    """

    def __init__(
        self,
        family: Family,
        view: View,
        columns: int,
        rows: int,
        rules: Rules,
        *,
        set: Mapping[str, Exact] | None = None,
        starts: Sequence[Mapping[str, Exact]] = (),
        lanes: int = LANES,
    ) -> None:
        self.family, self.view, self.columns, self.rows = family, view, columns, rows
        self.rules, self.lanes = rules, lanes
        self.setting = Setting(family, set, starts)
        self._on_repelling: NDArray[np.bool_] | None = None
        if 2 * self.cells > MOST_CELLS:
            raise TooLarge(f"{columns} x {rows} cells are too many for a phase portrait; take fewer")

    @property
    def starts(self) -> NDArray[np.float64]:
        """Initial conditions, shape (starts, states)."""
        return self.setting.starts

    @property
    def copies(self) -> int:
        """Copies of each start."""
        return copies_of(self.rules.samples, len(self.starts))

    @property
    def samples_of_a_copy(self) -> int:
        """States counted of each copy of a start."""
        return -(-self.rules.samples // self.copies)

    @property
    def orbits(self) -> int:
        """Copies of all starts."""
        return self.copies * len(self.starts)

    @property
    def exposure(self) -> int:
        """Samples of all orbits."""
        return self.orbits * self.samples_of_a_copy

    @property
    def cells(self) -> int:
        """Cells of the view and around it."""
        return (self.columns + 2) * (self.rows + 2)

    @cached_property
    def source(self) -> StepSource:
        """The compiled map."""
        return step_source(self.family, (self.view.up.name, self.view.across.name))

    @cached_property
    def module(self) -> ModuleType:
        """The compiled kernels of the family for this view."""
        logarithmic = [axis.scale == "log" for axis in (self.view.up, self.view.across)]
        return load_module(kernel_source(self.source, logarithmic, lanes=self.lanes, every=self.rules.every))

    @cached_property
    def axes(self) -> tuple[CountedAxis, CountedAxis]:
        """The cells of ``up`` and ``across`` as kernels take them."""
        return counted_axis(self.view.up, self.rows), counted_axis(self.view.across, self.columns)

    def at(self, columns: int, rows: int, rules: Rules) -> PortraitCounter:
        """Return a counter of the same starts at another resolution and under other rules."""
        other = PortraitCounter(self.family, self.view, columns, rows, rules, lanes=self.lanes)
        other.setting = self.setting
        if "module" in self.__dict__:
            other.__dict__["module"] = self.module
        return other

    def with_samples(self, samples: int) -> PortraitCounter:
        """Return a counter that counts another number of states of each start."""
        return self.at(self.columns, self.rows, replace(self.rules, samples=samples))

    def warm(self) -> None:
        """Compile the kernels, so that a later timing or progress bar does not include it."""
        few = self.at(1, 1, replace(self.rules, transient=0, transient_limit=0, samples=1))
        few.run(0, 1, few.room()).sample(np.zeros(1, np.int64))

    def room(self) -> Counts:
        """Return zeros in which one worker counts: the cells, and as many again for lanes that idle."""
        return np.zeros(2 * self.cells, np.uint32)

    def count(
        self, first: int, last: int, counts: Counts, *, stop: NDArray[np.uint8] | None = None
    ) -> Outcome:
        """Count the orbits ``first … last - 1``, start by start, copy by copy.

        Parameters
        ----------
        first, last : int
        counts : ndarray of uint32
            From :meth:`room`, of which no other thread makes use meanwhile; the counts are added to it.
        stop : ndarray of uint8, shape (1,), optional
            When another thread sets it, the work ends early.

        Raises
        ------
        Stopped
            When ``stop`` was set.
        """
        block = self.run(first, last, counts, stop)
        if stop is not None and stop[0]:
            raise Stopped("the work was interrupted")
        gone, slow = (int((block.outcome == outcome).sum()) for outcome in (GONE, SLOW))
        return Outcome(
            escaped=gone * self.samples_of_a_copy,
            unsettled=slow * self.samples_of_a_copy,
            collapsed=int(block.again.sum()),
            on_repelling=int(block.on_repelling.sum()),
            filled=int(block.filled.sum()),
        )

    def run(self, first: int, last: int, counts: Counts, stop: NDArray[np.uint8] | None = None) -> Block:
        """Run the orbits ``first … last - 1``; return them where they stopped."""
        rules = replace(self.rules, samples=self.samples_of_a_copy)
        base = np.zeros(last - first, np.int32)
        flag = np.zeros(1, np.uint8) if stop is None else stop
        block = Block(self.module, rules, self.axes, self._orbits(first, last, flag), base, counts, flag)
        block.sample(block.settle())
        block.run_again()
        return block

    def _orbits(self, first: int, last: int, stop: NDArray[np.uint8]) -> Orbits:
        repelling = self._repelling(stop)
        start, copy = np.divmod(np.arange(first, last, dtype=np.uint64), np.uint64(self.copies))
        key = hashed(hashed(hashed(np.uint64(0) * start) ^ copy) ^ start)
        states = self.starts[start.astype(np.int64)].T.copy()
        for variable, row in enumerate(states):
            u = hashed(key ^ np.uint64(variable + 1)) >> np.uint64(11)
            factor = 1.0 - u.astype(np.float64) * 2.0**-93
            row *= np.where((copy == 0) | repelling[start.astype(np.int64)], 1.0, factor)
        return self.setting.orbits(self.module, self.source, states, key, {})

    def _repelling(self, stop: NDArray[np.uint8]) -> NDArray[np.bool_]:
        """Return whether each start lies exactly on a repelling cycle; worth nothing once ``stop`` is set."""
        if self._on_repelling is not None:
            return self._on_repelling
        number = len(self.starts)
        few = self.at(1, 1, replace(self.rules, samples=1, transient_limit=0))
        keys, base = np.zeros(number, np.uint64), np.zeros(number, np.int32)
        orbits = self.setting.orbits(self.module, self.source, self.starts.T, keys, {})
        block = Block(self.module, few.rules, few.axes, orbits, base, few.room(), stop)
        block.settle()
        if not stop[0]:
            self._on_repelling = block.on_repelling
        return block.on_repelling
