"""Orbit histograms: every column of a view, its orbits run, decided about and counted.

How an orbit is treated, always by its own step numbers:

1. It runs ``transient`` steps. It has *escaped* when a test, made after every 16th step of a stage and at the
   end of each stage, finds a state variable not below the escape bound in size.
2. It is looked at ahead, without being moved. A state that comes back bit for bit is a *repeat*: the cycle is
   counted for all its samples and the orbit stops. If the multiplier of that cycle exceeds 1 + 1e-6 in size,
   rounding has dropped the orbit onto a repelling cycle: it has *collapsed*, and is run again from its start
   with every step disturbed by a hashed factor 1 - u 2**-40; unless its start lies on that cycle itself.
3. If it comes back almost (nearer than 2**-10 of its size or its start's) at a period up to
   ``longest_period`` and the distance to its limit, estimated as 4 d r / (1 - r), exceeds half a cell, it
   runs on: as many steps again as it has done, up to ``transient_limit`` in all; then it is *unsettled* and
   nothing of it is counted.
4. Otherwise every following state is counted, in rounds of 512; a repeat found in a round fills the rest.
   After the last round it is looked at ahead once more, up to ``longest_period``, for a collapse in that
   round. An escape or a collapse takes back what was counted.
"""

from __future__ import annotations

import copy
import threading
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from pathlib import Path
from types import ModuleType

import numpy as np
from numba import __version__ as numba_version
from numpy.typing import NDArray

import atlas.arithmetic.functions as functions
from atlas.families.reader import Family
from atlas.orbits.kernels import AGAIN, FILLED, GONE, READY, SLOW, kernel_source
from atlas.orbits.step import StepSource, load_module, step_source
from tiles.errors import Failure
from tiles.number import Exact
from tiles.strip import Strip
from tiles.window import View

LANES = 64
ROUND = 512
MOST_VALUES_KEPT = 1 << 20
LOOK_AHEAD = 4


@dataclass(frozen=True)
class Rules:
    """How orbits are sampled.

    Attributes
    ----------
    transient, transient_limit : int
        Steps before the first decision, and at most.
    samples : int
        States counted of each orbit.
    values_per_column : int
        Parameter values spread over each column.
    longest_period : int
        Longest period that is looked for where an orbit converges slowly.
    repeats : bool
        Whether exact repeats end an orbit; False only to measure the bare kernel.
    """

    transient: int = 1000
    transient_limit: int = 1_000_000
    samples: int = 1000
    values_per_column: int = 4
    longest_period: int = 64
    repeats: bool = True


class Stopped(Failure):
    """Another thread asked the counting to end; there is no result."""


@dataclass(frozen=True)
class Counted:
    """A strip of counted columns, and how it came about.

    Attributes
    ----------
    strip : Strip
    filled : int
        Samples that exact repeats filled without running them.
    on_repelling : int
        Orbits whose start was put exactly on a repelling cycle; counted there, not disturbed.
    """

    strip: Strip
    filled: int
    on_repelling: int


class OrbitCounter:
    """Counts the orbits of a family over a view of one parameter across and one state variable up.

    Parameters
    ----------
    family : Family
    view : View
        ``across`` names a parameter, ``up`` a state variable.
    columns, rows : int
        Resolution of the whole view.
    rules : Rules
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
        self.family = family
        self.view = view
        self.columns = columns
        self.rows = rows
        self.rules = rules
        self.lanes = lanes
        self._local = threading.local()
        self.fixed = {one.name: float(one.default) for one in family.parameters}
        self.fixed |= {name: float(value) for name, value in (set or {}).items()}
        self.starts = np.array(
            [
                [float(start.get(state.name, state.start)) for state in family.states]
                for start in (starts or [{}])
            ]
        )

    @property
    def orbits_per_column(self) -> int:
        """Parameter values times starts."""
        return self.rules.values_per_column * len(self.starts)

    @property
    def exposure(self) -> int:
        """Samples that every column receives."""
        return self.orbits_per_column * self.rules.samples

    @cached_property
    def module(self) -> ModuleType:
        """The compiled kernels of the family for this view."""
        states = [state.name for state in self.family.states]
        text = kernel_source(
            self._source,
            states.index(self.view.up.name),
            log=self.view.up.scale == "log",
            lanes=self.lanes,
        )
        return load_module(text, Path(functions.__file__).read_text() + numba_version)

    @cached_property
    def edges(self) -> NDArray[np.float64]:
        """Cell edges of ``up``, each exact and rounded once."""
        return self.view.up.edges(self.rows)

    @cached_property
    def cell_axis(self) -> tuple[float, float, float]:
        """Low end, inverse cell size and how near to an edge the exact edges decide, in cells."""
        up = self.view.up
        inverse = 1.0 / up.cell_size(self.rows)
        low, high = float(self.edges[0]), float(self.edges[-1])
        if up.scale == "log":
            low, high = float(np.log(low)), float(np.log(high))
        slack = 1e-15 * (self.rows + 2.0 * max(abs(low), abs(high)) * inverse)
        return low, inverse, 4.0 * slack

    def at(self, columns: int, rows: int, rules: Rules) -> OrbitCounter:
        """Return a counter of the same orbits at another resolution and under other rules."""
        other = copy.copy(self)
        for cached in ("edges", "cell_axis", "half_cell", "_all_values"):
            other.__dict__.pop(cached, None)
        other.columns, other.rows, other.rules = columns, rows, rules
        other._local = threading.local()
        return other

    def with_samples(self, samples: int) -> OrbitCounter:
        """Return a counter that counts another number of states of each orbit."""
        return self.at(self.columns, self.rows, replace(self.rules, samples=samples))

    def warm(self) -> None:
        """Compile the kernels, so that a later timing or progress bar does not include it."""
        few = OrbitCounter(
            self.family, self.view, self.columns, self.rows, Rules(0, 0, 1, 1), lanes=self.lanes
        )
        few.__dict__["module"] = self.module
        counts = np.zeros(2 * (self.rows + 2), np.uint32)
        block = few._run(0, 1, counts, np.zeros(1, np.uint8))
        block.sample(np.zeros(1, np.int64))

    def count(
        self,
        first: int,
        last: int,
        *,
        out: NDArray[np.uint32] | None = None,
        stop: NDArray[np.uint8] | None = None,
    ) -> Counted:
        """Count the columns ``first … last - 1``.

        Parameters
        ----------
        first, last : int
            Range of columns of the view.
        out : ndarray of uint32, shape (last - first, rows), optional
            Where the counts are written; a new array without it.
        stop : ndarray of uint8, shape (1,), optional
            When another thread sets it, the work ends early.

        Returns
        -------
        Counted

        Raises
        ------
        Stopped
            When ``stop`` was set.
        """
        width, rules = last - first, self.rules
        stride = self.rows + 2
        counts = self._scratch((width + 1) * stride)
        block = self._run(first, last, counts, np.zeros(1, np.uint8) if stop is None else stop)
        if stop is not None and stop[0]:
            raise Stopped("the work was interrupted")
        table = counts[: width * stride].reshape(width, stride)
        if out is None:
            out = np.empty((width, self.rows), np.uint32)
        out[:] = table[:, 1:-1]
        outcomes = block.outcome.reshape(width, self.orbits_per_column)

        def samples_of(flags: NDArray[np.bool_]) -> NDArray[np.uint64]:
            orbits: NDArray[np.uint64] = flags.sum(axis=1, dtype=np.uint64)
            return orbits * np.uint64(rules.samples)

        strip = Strip(
            first,
            out,
            exposure=np.full(width, self.exposure, np.uint64),
            below=table[:, 0].astype(np.uint64),
            above=table[:, -1].astype(np.uint64),
            escaped=samples_of(outcomes == GONE),
            unsettled=samples_of(outcomes == SLOW),
            collapsed=block.again.reshape(outcomes.shape).sum(axis=1, dtype=np.uint64),
        )
        return Counted(strip, int(block.filled.sum()), int(block.on_repelling[0]))

    def _scratch(self, size: int) -> NDArray[np.uint32]:
        """Return zeros that this thread uses again for its next strip."""
        kept = getattr(self._local, "counts", None)
        if kept is None or kept.size < size:
            kept = self._local.counts = np.empty(size, np.uint32)
        counts: NDArray[np.uint32] = kept[:size]
        counts[:] = 0
        return counts

    def _run(self, first: int, last: int, counts: NDArray[np.uint32], stop: NDArray[np.uint8]) -> _Block:
        start, parameters = self._orbits(first, last)
        c = np.empty((max(self._source.coefficients, 1), start.shape[1]))
        self.module.coefficients(parameters, c)
        stride = np.int32(self.rows + 2)
        base = np.repeat(np.arange(last - first, dtype=np.int32) * stride, self.orbits_per_column)
        block = _Block(self, start, c, self._keys(first, last), base, counts, stop)
        ready = block.settle()
        block.sample(ready)
        block.run_again()
        return block

    @cached_property
    def _source(self) -> StepSource:
        return step_source(self.family)

    @cached_property
    def half_cell(self) -> float:
        """Half the size of a cell of ``up``, on a log axis in units of the logarithm."""
        return 0.5 * self.view.up.cell_size(self.rows)

    def _orbits(self, first: int, last: int) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        starts = self.starts
        values = self._values(first, last)
        x = np.tile(starts.T, values.size)
        parameters = np.empty((len(self.fixed), values.size * len(starts)))
        for row, (name, value) in zip(parameters, self.fixed.items(), strict=True):
            row[:] = np.repeat(values, len(starts)) if name == self.view.across.name else value
        return np.ascontiguousarray(x), parameters

    def _values(self, first: int, last: int) -> NDArray[np.float64]:
        across, each = self.view.across, self.rules.values_per_column
        if self.columns * each > MOST_VALUES_KEPT:
            return across.values(self.columns, each, first, last).reshape(-1)
        kept: NDArray[np.float64] = self._all_values[first * each : last * each]
        return kept

    @cached_property
    def _all_values(self) -> NDArray[np.float64]:
        return self.view.across.values(self.columns, self.rules.values_per_column).reshape(-1)

    def _keys(self, first: int, last: int) -> NDArray[np.uint64]:
        columns = np.arange(first, last, dtype=np.uint64)[:, None, None]
        values = np.arange(self.rules.values_per_column, dtype=np.uint64)[None, :, None]
        starts = np.arange(len(self.starts), dtype=np.uint64)[None, None, :]
        return hashed(hashed(hashed(columns) ^ values) ^ starts).reshape(-1)


class _Block:
    """The orbits of neighbouring columns on their way through transient, decision and sampling."""

    def __init__(
        self,
        counter: OrbitCounter,
        start: NDArray[np.float64],
        c: NDArray[np.float64],
        key: NDArray[np.uint64],
        base: NDArray[np.int32],
        counts: NDArray[np.uint32],
        stop: NDArray[np.uint8],
    ) -> None:
        orbits = start.shape[1]
        self.counter, self.rules, self.kernels = counter, counter.rules, counter.module
        self.start, self.x, self.c, self.key, self.stop = start, start.copy(), c, key, stop
        self.bound = float(counter.family.escape)
        self.window = (counter.cell_axis, counter.edges)
        self.target = (base, counts)
        self.trash = counts.size - counter.rows - 2
        self.outcome = np.full(orbits, READY, np.int8)
        self.again = np.zeros(orbits, np.bool_)
        self.filled = np.zeros(orbits, np.int64)
        self.on_repelling = np.zeros(1, np.int64)

    def settle(self) -> NDArray[np.int64]:
        """Run the transients and their extensions; return the orbits that are ready for sampling."""
        rules = self.rules
        limit = max(rules.transient, rules.transient_limit)
        order = np.arange(self.outcome.size)
        ready = []
        done, steps = 0, rules.transient
        while order.size and not self.stop[0]:
            self.kernels.advance(self.x, self.c, self.key, order, done, steps, self.bound, self.outcome)
            done += steps
            if rules.repeats:
                self._decide(order)
            outcome = self.outcome[order]
            ready.append(order[outcome == READY])
            order = order[outcome == SLOW]
            if done >= limit:
                break
            steps = min(max(done, 64), limit - done)
        return np.sort(np.concatenate(ready)) if ready else np.empty(0, np.int64)

    def _decide(self, order: NDArray[np.int64]) -> None:
        longest = self.rules.longest_period
        seen = (np.zeros(self.outcome.size, np.int64), *self._seen())
        self.kernels.returns(self.x, self.c, order, longest, max(LOOK_AHEAD * longest, 64), *seen)
        counter = self.counter
        rules = (self.rules.samples, counter.half_cell, counter.view.up.scale == "log")
        self.kernels.settle(
            self.x, self.c, self.start, order, seen, rules, *self.window, *self.target, self.outcome,
            self.on_repelling,
        )  # fmt: skip
        done = order[self.outcome[order] == FILLED]
        self.filled[done] = self.rules.samples
        self.again[order[self.outcome[order] == AGAIN]] = True

    def sample(self, order: NDArray[np.int64]) -> None:
        """Count the states of settled orbits, in rounds after which finished orbits drop out."""
        samples, done = self.rules.samples, 0
        begin = self.x.copy()
        hit = np.zeros(self.outcome.size, np.int64)
        while order.size and done < samples and not self.stop[0]:
            steps = min(ROUND, samples - done)
            self.kernels.sample(
                self.x, self.c, self.key, order, 0, steps, self.bound, self.outcome, hit, self.target[0],
                self.trash, *self.window, self.target[1],
            )  # fmt: skip
            done += steps
            if not self.rules.repeats:
                hit[:] = 0
            order = self._finish(order, begin, hit, done)
        if self.rules.repeats and order.size and not self.stop[0]:
            longest = self.rules.longest_period
            self.kernels.returns(self.x, self.c, order, longest, longest, hit, *self._seen())
            self._finish(order, begin, hit, done)

    def _finish(
        self, order: NDArray[np.int64], begin: NDArray[np.float64], hit: NDArray[np.int64], done: int
    ) -> NDArray[np.int64]:
        """Decide after a round, and return the orbits that go on."""
        self.kernels.finish(
            self.x, self.c, begin, self.key, order, hit, (self.rules.samples, done), *self.window,
            *self.target, self.outcome, self.filled,
        )  # fmt: skip
        self.again[order[self.outcome[order] == AGAIN]] = True
        going_on: NDArray[np.int64] = order[self.outcome[order] == READY]
        return going_on

    def _seen(self) -> tuple[NDArray[np.int64], NDArray[np.float64], NDArray[np.float64]]:
        """Return room for the period, the gap and the size of every orbit."""
        orbits = self.outcome.size
        return np.zeros(orbits, np.int64), np.zeros(orbits), np.zeros(orbits)

    def run_again(self) -> None:
        """Run the collapsed orbits once more from their starts, disturbed, and count them."""
        order = np.flatnonzero(self.again)
        if not order.size or self.stop[0]:
            return
        transient, samples = self.rules.transient, self.rules.samples
        self.x[:, order] = self.start[:, order]
        self.outcome[order] = READY
        self.kernels.advance_disturbed(
            self.x, self.c, self.key, order, 0, transient, self.bound, self.outcome
        )
        order = order[self.outcome[order] == READY]
        begin = self.x.copy()
        hit = np.zeros(self.outcome.size, np.int64)
        self.kernels.sample_disturbed(
            self.x, self.c, self.key, order, transient, samples, self.bound, self.outcome, hit,
            self.target[0], self.trash, *self.window, self.target[1],
        )  # fmt: skip
        self.kernels.take_back(
            begin, self.c, self.key, order, transient, samples, *self.window, *self.target, self.outcome
        )


def hashed(numbers: NDArray[np.uint64]) -> NDArray[np.uint64]:
    """Return well-mixed 64-bit numbers (finaliser of SplitMix64, Steele, Lea & Flood 2014)."""
    z = numbers + np.uint64(0x9E3779B97F4A7C15)
    z = (z ^ (z >> np.uint64(30))) * np.uint64(0xBF58476D1CE4E5B9)
    z = (z ^ (z >> np.uint64(27))) * np.uint64(0x94D049BB133111EB)
    return z ^ (z >> np.uint64(31))
