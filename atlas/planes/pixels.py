"""Orbits of neighbouring pixels on their way to their fates; `atlas.planes.fates` says how these are
decided."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from functools import reduce
from types import ModuleType

import numpy as np
from numpy.typing import NDArray

from atlas.orbits.block import STEPS_AT_ONCE, Orbits
from atlas.orbits.lane_kernels import CHUNK
from atlas.orbits.volumes import lengths
from atlas.planes.fates import CHAOTIC, ESCAPES, EXTINCT, FIXED_POINT, PERIODIC, QUASI_PERIODIC, UNSETTLED
from atlas.planes.plane_kernels import AGAIN, DEAD, GONE, MET, NEAR, OPEN

BATCHES = 16
LOOKS = 4
FIRST_STAGE = 64
NEARER = 0.8
"""To what part the gaps of an orbit that approaches its limit must fall while the steps are doubled: beside a
period doubling they fall to 0.39 at most; at a Neimark-Sacker bifurcation, where the orbit turns, to 0.71."""
SLICE = 1 << 12
"""Steps of a batch after which growth is added up, whatever orbits are measured together."""

Floats = NDArray[np.float64]
Order = NDArray[np.int64]


@dataclass(frozen=True)
class FateRules:
    """How fates are looked for.

    Attributes
    ----------
    transient : int
        Steps before the exponents are measured.
    steps : int
        Steps in which they are measured, at least 64.
    transient_limit : int
        Steps up to which an orbit that approaches a cycle is run on.
    longest_period : int
        Longest cycle looked for.
    """

    transient: int = 1000
    steps: int = 2000
    transient_limit: int = 100_000
    longest_period: int = 64


class Pixels:
    """Orbits side by side, and what becomes of them.

    Attributes
    ----------
    fate : ndarray of uint8, shape (orbits,)
        Codes of `atlas.planes.fates`.
    period : ndarray of uint16, shape (orbits,)
        Of a cycle, 1 for a fixed point; else 0.
    exponents : ndarray of float64, shape (states, orbits)
        Largest first; NaN where there are none.
    error : ndarray of float64, shape (orbits,)
        Standard error of the largest exponent; 0 on a cycle.
    escape : ndarray of float64, shape (orbits,)
        Steps to escape, smooth; NaN for those that do not.
    x : ndarray of float64, shape (states, orbits)
        Where the orbits stand at last, at the beginning of a pattern.
    turn : ndarray of int64, shape (orbits,)
        Of a cycle, a number of steps after which state and pattern come back.
    collapsed, repelling : ndarray of bool, shape (orbits,)
        Run again, disturbed; put on a repelling cycle by their start.
    """

    def __init__(
        self,
        kernels: ModuleType,
        rules: FateRules,
        orbits: Orbits,
        low: Floats,
        stop: NDArray[np.uint8],
    ) -> None:
        states, number = orbits.start.shape
        self.kernels, self.rules, self.low, self.stop = kernels, rules, low, stop
        self.map, self.bound, self.key = (orbits.c, orbits.word), orbits.bound, orbits.key
        self.start, self.x = orbits.start, orbits.start.copy()
        self.unit = orbits.word.size
        self.longest = max(rules.longest_period, self.unit)
        self.outcome = np.full(number, OPEN, np.int8)
        self.since = np.zeros(number, np.int64)
        self.turn = np.zeros(number, np.int64)
        self.fate = np.full(number, UNSETTLED, np.uint8)
        self.period = np.zeros(number, np.uint16)
        self.exponents = np.full((states, number), np.nan)
        self.error = np.full(number, np.nan)
        self.escape = np.full(number, np.nan)
        self.away = np.full(number, np.inf)
        self.collapsed = np.zeros(number, np.bool_)
        self.repelling = np.zeros(number, np.bool_)

    def run(self) -> None:
        """Find every fate; does nothing more once ``stop`` is set."""
        order, done = self._transient()
        order, done = self._measured(order, done)
        self._extended(order, done)
        self._again()
        if self.stop[0]:
            return
        self.fate[self.outcome == GONE] = ESCAPES
        self.fate[self.outcome == DEAD] = EXTINCT
        met = self.outcome == MET
        self.fate[met] = np.where(self.period[met] == 1, FIXED_POINT, PERIODIC)
        self.error[met] = 0.0
        gone = np.flatnonzero(self.outcome == GONE)
        self.kernels.leaving(self.x, *self.map, gone, self.since, self.bound, self.escape)

    def _whole(self, steps: int) -> int:
        """Return a number of steps rounded up to whole patterns."""
        return self.unit * -(-steps // self.unit)

    def _transient(self) -> tuple[Order, int]:
        order = np.arange(self.outcome.size)
        whole = self._whole(self.rules.transient)
        done = 0
        while done < whole and order.size and not self.stop[0]:
            steps = min(self._whole(max(done, FIRST_STAGE)), whole - done)
            order = self._fled(order, done, steps)
            done += steps
            order = self._open(self._looked(order))
        return order, whole

    def _fled(self, order: Order, before: int, steps: int, *, disturbed: bool = False) -> Order:
        kernel = self.kernels.flee_disturbed if disturbed else self.kernels.flee
        for first, last in self._slices(order, steps):
            kernel(
                self.x, *self.map, self.key, order, before + first, last - first, self.bound, self.low,
                self.outcome, self.since,
            )  # fmt: skip
            order = order[self.outcome[order] == OPEN]
        return order

    def _slices(self, order: Order, steps: int) -> Iterator[tuple[int, int]]:
        each = max(1, STEPS_AT_ONCE // (CHUNK * max(1, order.size))) * CHUNK
        for first in range(0, steps, each):
            if self.stop[0]:
                return
            yield first, min(first + each, steps)

    def _looked(self, order: Order) -> Order:
        """Look orbits at ahead; return those that have not met a cycle nor collapsed."""
        if not order.size or self.stop[0]:
            return order[:0]
        number = self.outcome.size
        seen = (np.zeros(number, np.int64), np.zeros(number, np.int64), np.zeros(number), np.zeros(number))
        self.kernels.returns(self.x, *self.map, order, 0, self.longest, self.longest, *seen)
        rules = (np.ones(len(self.x)), np.zeros(len(self.x), np.bool_), self.low)
        known = (self.outcome, self.period, self.turn, self.repelling, self.away)
        self.kernels.judge(self.x, *self.map, self.start, order, 0, seen, rules, known, self.exponents)
        left: Order = order[(self.outcome[order] == OPEN) | (self.outcome[order] == NEAR)]
        return left

    def _open(self, order: Order) -> Order:
        self.outcome[order] = OPEN
        return order

    def _measured(self, order: Order, done: int, *, anew: bool = False) -> tuple[Order, int]:
        """Measure exponents and decide by them; return the orbits that approach a cycle, unless anew."""
        growth, steps, left = self._growth(order, done, self.kernels.measure, looks=True)
        near = left[(self.outcome[left] == NEAR) & (not anew)]
        self._decide(left[(self.outcome[left] == OPEN) | anew], growth, steps)
        return near, done + steps * BATCHES

    def _growth(
        self, order: Order, done: int, kernel: Callable[..., None], *, looks: bool
    ) -> tuple[Floats, int, Order]:
        """Return the growth of volumes in every batch, the steps of a batch, and the orbits left."""
        states, number = self.x.shape
        steps = self._whole(max(1, self.rules.steps // BATCHES))
        growth = np.zeros((BATCHES, states, number if order.size else 0))
        vectors, logs = np.ones((sum(lengths(states)), number)), np.zeros((states, number))
        for batch in range(BATCHES):
            for first in range(0, steps, SLICE):
                if not order.size or self.stop[0]:
                    return growth, steps, order[:0]
                kernel(
                    self.x, vectors, *self.map, self.key, order, done + first, min(SLICE, steps - first),
                    self.bound, self.low, self.outcome, self.since, logs,
                )  # fmt: skip
                order = order[self.outcome[order] == OPEN]
                growth[batch][:, order] += logs[:, order]
            done += steps
            if looks and (batch + 1) % (BATCHES // LOOKS) == 0:
                order = self._looked(order)
                if batch + 1 < BATCHES:
                    self._open(order)
        return growth, steps, order

    def _decide(self, order: Order, growth: Floats, steps: int) -> None:
        """Decide by the exponents of orbits that met no cycle."""
        if not order.size:
            return
        with np.errstate(invalid="ignore"):
            rates = np.diff(growth[:, :, order], axis=1, prepend=0.0) / steps
            means = _total(rates) / BATCHES
            spread = _total((rates[:, 0] - means[0]) ** 2)
            error = np.sqrt(spread / (BATCHES - 1) / BATCHES)
        total = steps * BATCHES
        tolerance = 3.0 * error + np.log(total) / total
        largest = means[0]
        fate = np.where(largest > tolerance, CHAOTIC, np.where(largest >= -tolerance, QUASI_PERIODIC, 0))
        self.fate[order] = np.where(np.isfinite(largest) & np.isfinite(error), fate, UNSETTLED)
        self.exponents[:, order] = np.where(np.isfinite(means), means, np.nan)
        self.error[order] = error

    def _extended(self, order: Order, done: int) -> None:
        """Run on the orbits that approach a cycle, as long as they come nearer.

        The last steps may be fewer than those done before: how far the gaps fall then says nothing.
        """
        limit = self.rules.transient_limit
        while order.size and done < limit and not self.stop[0]:
            steps = self._whole(min(max(done, FIRST_STAGE), limit - done))
            before = self.away.copy()
            order = self._looked(self._fled(self._open(order), done, steps))
            done += steps
            nearer = self.outcome[order] == NEAR
            if 2 * steps >= done:  # done holds them already
                nearer &= self.away[order] < NEARER * before[order]
            self._measured(self._open(order[~nearer]), done, anew=True)
            order = order[nearer]

    def _again(self) -> None:
        """Run the collapsed orbits once more from their starts, disturbed."""
        order = np.flatnonzero(self.outcome == AGAIN)
        if not order.size or self.stop[0]:
            return
        self.collapsed[order] = True
        self.x[:, order] = self.start[:, order]
        self._open(order)
        whole = self._whole(self.rules.transient)
        order = self._fled(order, 0, whole, disturbed=True)
        growth, steps, left = self._growth(order, whole, self.kernels.measure_disturbed, looks=False)
        self._decide(left, growth, steps)


def _total(batches: Floats) -> Floats:
    """Return the sum over batches, added in their order, however many orbits stand side by side."""
    total: Floats = reduce(np.add, batches)
    return total
