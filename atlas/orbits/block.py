"""A block of neighbouring orbits on their way through transient, decision and sampling.

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

Where only every so many-th state is recorded, the transient is prolonged to the phase asked for, and from
then on *state*, *repeat*, *period* and *round* mean recorded states. Where parameters follow a pattern,
states are the same only at the same place in the pattern, and extensions are whole patterns.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from math import lcm
from types import ModuleType

import numpy as np
from numpy.typing import NDArray

from atlas.orbits.lane_kernels import CHUNK
from atlas.orbits.orbit_kernels import AGAIN, FILLED, READY, SLOW

ROUND = 512
LOOK_AHEAD = 4
STEPS_AT_ONCE = 1 << 24
"""Steps of all orbits together that one call of a kernel may take, so that an interrupt is soon heard."""


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
    every, phase : int
        Only states whose number of steps, divided by ``every``, leaves ``phase`` are recorded.
    """

    transient: int = 1000
    transient_limit: int = 1_000_000
    samples: int = 1000
    values_per_column: int = 4
    longest_period: int = 64
    repeats: bool = True
    every: int = 1
    phase: int = 0


@dataclass(frozen=True)
class CountedAxis:
    """One counted axis, as kernels take it.

    Attributes
    ----------
    numbers : (float, float, float)
        Low end, inverse cell size, and how near to an edge the exact edges decide, in cells; of the logarithm
        on a log axis.
    edges : ndarray of float64, shape (cells + 1,)
        Each exact and rounded once.
    half_cell : float
        In units of the axis, or of the logarithm.
    relative : bool
        Whether the axis is logarithmic.
    """

    numbers: tuple[float, float, float]
    edges: NDArray[np.float64]
    half_cell: float
    relative: bool


@dataclass(frozen=True)
class Orbits:
    """Orbits side by side, as kernels take them.

    Attributes
    ----------
    start : ndarray of float64, shape (states, orbits)
    c : ndarray of float64, shape (rows, orbits)
        Coefficients of every letter of the pattern.
    word : ndarray of int64, shape (length,)
        Letter that holds at each time.
    key : ndarray of uint64, shape (orbits,)
        Seeds of the disturbance.
    bound : float
        Where an orbit has escaped.
    """

    start: NDArray[np.float64]
    c: NDArray[np.float64]
    word: NDArray[np.int64]
    key: NDArray[np.uint64]
    bound: float


class Block:
    """The orbits of neighbouring columns on their way through transient, decision and sampling."""

    def __init__(
        self,
        kernels: ModuleType,
        rules: Rules,
        axes: Sequence[CountedAxis],
        orbits: Orbits,
        base: NDArray[np.int32],
        counts: NDArray[np.uint32],
        stop: NDArray[np.uint8],
    ) -> None:
        number = orbits.start.shape[1]
        self.kernels, self.rules, self.stop = kernels, rules, stop
        self.bound, self.key, self.start = orbits.bound, orbits.key, orbits.start
        self.x, self.map = orbits.start.copy(), (orbits.c, orbits.word)
        self.half = np.array([axis.half_cell for axis in axes])
        self.relative = np.array([axis.relative for axis in axes])
        self.window = tuple(part for axis in axes for part in (axis.numbers, axis.edges))
        self.target = (base, counts)
        self.trash = counts.size - int(np.prod([axis.edges.size + 1 for axis in axes]))
        self.outcome = np.full(number, READY, np.int8)
        self.again = np.zeros(number, np.bool_)
        self.filled = np.zeros(number, np.int64)
        self.on_repelling = np.zeros(number, np.bool_)
        self.transient = rules.transient + (rules.phase - rules.transient) % rules.every
        self.unit = lcm(rules.every, orbits.word.size)
        self.longest = max(rules.longest_period, self.unit // rules.every)

    def settle(self) -> NDArray[np.int64]:
        """Run the transients and their extensions; return the orbits that are ready for sampling."""
        rules = self.rules
        limit = max(self.transient, rules.transient_limit)
        order = np.arange(self.outcome.size)
        ready = []
        done, steps = 0, self.transient
        while order.size and not self.stop[0]:
            self._advance(self.kernels.advance, order, done, steps)
            if self.stop[0]:
                break
            done += steps
            if rules.repeats:
                self._decide(order)
            outcome = self.outcome[order]
            ready.append(order[outcome == READY])
            order = order[outcome == SLOW]
            if done >= limit:
                break
            steps = self.unit * -(-min(max(done, 64), limit - done) // self.unit)
        return np.sort(np.concatenate(ready)) if ready else np.empty(0, np.int64)

    def _advance(
        self, kernel: Callable[..., None], order: NDArray[np.int64], before: int, steps: int
    ) -> None:
        """Advance orbits a stage in slices that end at escape tests; no slice changes a decision."""
        for first, last in self._slices(order, steps):
            kernel(self.x, *self.map, self.key, order, before + first, last - first, self.bound, self.outcome)

    def _slices(self, order: NDArray[np.int64], steps: int) -> Iterator[tuple[int, int]]:
        each = max(1, STEPS_AT_ONCE // (CHUNK * self.rules.every * max(1, order.size))) * CHUNK
        for first in range(0, max(steps, 1), each):
            if self.stop[0]:
                return
            yield first, min(first + each, steps)

    def _decide(self, order: NDArray[np.int64]) -> None:
        longest, before = self.longest, self.transient
        seen = (np.zeros(self.outcome.size, np.int64), *self._seen())
        self.kernels.returns(self.x, *self.map, order, before, longest, max(LOOK_AHEAD * longest, 64), *seen)
        rules = (self.rules.samples, self.half, self.relative)
        self.kernels.settle(
            self.x, *self.map, self.start, order, before, seen, rules, *self.window, *self.target,
            self.outcome, self.on_repelling,
        )  # fmt: skip
        done = order[self.outcome[order] == FILLED]
        self.filled[done] = self.rules.samples
        self.again[order[self.outcome[order] == AGAIN]] = True

    def sample(self, order: NDArray[np.int64]) -> None:
        """Count the states of settled orbits, in rounds after which finished orbits drop out."""
        samples, every, done = self.rules.samples, self.rules.every, 0
        begin = self.x.copy()
        hit = np.zeros(self.outcome.size, np.int64)
        while order.size and done < samples and not self.stop[0]:
            steps = min(ROUND, samples - done)
            self.kernels.sample(
                self.x, *self.map, self.key, order, self.transient + done * every, steps, self.bound,
                self.outcome, hit, self.target[0], self.trash, *self.window, self.target[1],
            )  # fmt: skip
            done += steps
            if not self.rules.repeats:
                hit[:] = 0
            order = self._finish(order, begin, hit, done)
        if self.rules.repeats and order.size and not self.stop[0]:
            now = self.transient + done * every
            self.kernels.returns(
                self.x, *self.map, order, now, self.longest, self.longest, hit, *self._seen()
            )
            self._finish(order, begin, hit, done)

    def _finish(
        self, order: NDArray[np.int64], begin: NDArray[np.float64], hit: NDArray[np.int64], done: int
    ) -> NDArray[np.int64]:
        """Decide after a round, and return the orbits that go on."""
        rules = (self.transient, self.rules.samples, done)
        self.kernels.finish(
            self.x, *self.map, begin, self.key, order, hit, rules, *self.window, *self.target, self.outcome,
            self.filled,
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
        transient, samples, every = self.transient, self.rules.samples, self.rules.every
        self.x[:, order] = self.start[:, order]
        self.outcome[order] = READY
        self._advance(self.kernels.advance_disturbed, order, 0, transient)
        order = order[self.outcome[order] == READY]
        begin = self.x.copy()
        hit = np.zeros(self.outcome.size, np.int64)
        for first, last in self._slices(order, samples):
            self.kernels.sample_disturbed(
                self.x, *self.map, self.key, order, transient + first * every, last - first, self.bound,
                self.outcome, hit, self.target[0], self.trash, *self.window, self.target[1],
            )  # fmt: skip
        self.kernels.take_back(
            begin, *self.map, self.key, order, transient, samples, *self.window, *self.target, self.outcome
        )
