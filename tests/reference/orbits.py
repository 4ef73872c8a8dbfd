"""The slow, obviously right twin of the orbit kernels: one orbit at a time, in plain Python."""

from __future__ import annotations

from bisect import bisect_right
from collections import Counter
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from atlas.orbits.orbit import Rules

MASK = (1 << 64) - 1
TESTED_EVERY = 16
ROUND = 512


@dataclass
class Column:
    """What one column received; cells are counted by number."""

    cells: Counter[int] = field(default_factory=Counter)
    below: int = 0
    above: int = 0
    escaped: int = 0
    unsettled: int = 0
    collapsed: int = 0


class Escaped(Exception):
    """An orbit left the bound."""


class Collapsed(Exception):
    """Rounding dropped an orbit onto a repelling cycle."""


class Unsettled(Exception):
    """The transient had not died out at the limit."""


@dataclass(frozen=True)
class Twin:
    """A one-variable map with what decides about its orbits.

    Attributes
    ----------
    step, slope : callable of (state, parameter)
    bound : float
    edges : ndarray of float64
        Cell edges of the counted axis.
    half_cell : float
        In units of the logarithm where relative.
    relative : bool
        Whether the axis is logarithmic.
    """

    step: Callable[[float, float], float]
    slope: Callable[[float, float], float]
    bound: float
    edges: NDArray[np.float64]
    half_cell: float
    relative: bool = False

    def column(self, number: int, values: Sequence[float], starts: Sequence[float], rules: Rules) -> Column:
        """Run every orbit of a column to its end and count it."""
        column = Column()
        for v, value in enumerate(values):
            for s, start in enumerate(starts):
                try:
                    try:
                        states = self._states(value, start, rules)
                    except Collapsed:
                        column.collapsed += 1
                        states = self._disturbed(key(number, v, s), value, start, rules)
                    self._count(column, states)
                except Escaped:
                    column.escaped += rules.samples
                except Unsettled:
                    column.unsettled += rules.samples
        return column

    def _count(self, column: Column, states: Sequence[float]) -> None:
        for x in states:
            if not x >= self.edges[0]:
                column.below += 1
            elif x > self.edges[-1]:
                column.above += 1
            else:
                column.cells[min(bisect_right(self.edges, x), len(self.edges) - 1) - 1] += 1

    def _states(self, value: float, start: float, rules: Rules) -> list[float]:
        def step(x: float, _: int) -> float:
            return self.step(x, value)

        x, repeats = self._settled(value, start, rules, step)
        states: list[float] = []
        while len(states) < rules.samples:
            reference = x
            stage = self._stage(x, 0, min(ROUND, rules.samples - len(states)), step)
            states += stage
            x = states[-1]
            if reference in stage and not repeats:
                self._refuse_repelling(value, x, stage.index(reference) + 1)
        ahead = x
        for cycle in range(1, 0 if repeats else rules.longest_period + 1):
            ahead = self.step(ahead, value)
            if ahead == x:
                self._refuse_repelling(value, x, cycle)
                break
        return states

    def _settled(
        self, value: float, start: float, rules: Rules, step: Callable[[float, int], float]
    ) -> tuple[float, bool]:
        x, done, steps = start, 0, rules.transient
        while True:
            x = ([x, *self._stage(x, 0, steps, step)])[-1]
            done += steps
            ahead = [x]
            for _ in range(max(4 * rules.longest_period, 64)):
                ahead.append(self.step(ahead[-1], value))
            if x in ahead[1:]:
                cycle = ahead.index(x, 1)
                if start not in ahead[:cycle]:
                    self._refuse_repelling(value, x, cycle)
                return x, True
            if not self._is_slow(value, start, ahead[: rules.longest_period + 1]):
                return x, False
            if done >= rules.transient_limit:
                raise Unsettled
            steps = min(max(done, 64), rules.transient_limit - done)

    def _stage(self, x: float, before: int, steps: int, step: Callable[[float, int], float]) -> list[float]:
        states = []
        gone = not abs(x) < self.bound if steps == 0 else False
        for n in range(1, steps + 1):
            x = step(x, before + n)
            states.append(x)
            if (n % TESTED_EVERY == 0 or n == steps) and not abs(x) < self.bound:
                gone = True
        if gone:
            raise Escaped
        return states

    def _refuse_repelling(self, value: float, x: float, cycle: int) -> None:
        multiplier = 1.0
        for _ in range(cycle):
            multiplier *= self.slope(x, value)
            x = self.step(x, value)
        if abs(multiplier) > 1 + 1e-6:
            raise Collapsed

    def _is_slow(self, value: float, start: float, ahead: Sequence[float]) -> bool:
        gaps = [abs(x - ahead[0]) for x in ahead[1:]]
        size = max(map(abs, ahead))
        period = gaps.index(min(gaps)) + 1
        if not min(gaps) < max(size, abs(start)) / 1024:
            return False
        x, turns = ahead[0], []
        for _ in range(3):
            before = x
            for _ in range(period):
                x = self.step(x, value)
            turns.append(abs(x - before))
        if turns[0] <= 1e-15 * size:
            return False
        ratio = max(turns[1] / turns[0], turns[2] / turns[1] if turns[1] > 0 else 0.0)
        if not ratio < 1:
            return False
        left = 4.0 * turns[0] * ratio / (1.0 - ratio)
        return (left / abs(x) if self.relative else left) / self.half_cell > 1.0

    def _disturbed(self, seed: int, value: float, start: float, rules: Rules) -> list[float]:
        def step(x: float, n: int) -> float:
            hashed = mixed((seed + n * 0x9E3779B97F4A7C15) & MASK)
            return self.step(x, value) * (1.0 - float(hashed >> 11) * 2.0**-93)

        x = ([start, *self._stage(start, 0, rules.transient, step)])[-1]
        return self._stage(x, rules.transient, rules.samples, step)


def mixed(z: int) -> int:
    """Return the finaliser of SplitMix64 of a 64-bit number."""
    z = ((z ^ (z >> 30)) * 0xBF58476D1CE4E5B9) & MASK
    z = ((z ^ (z >> 27)) * 0x94D049BB133111EB) & MASK
    return z ^ (z >> 31)


def key(column: int, value: int, start: int) -> int:
    """Return the number that seeds the disturbance of an orbit."""
    z = column
    for part in (0, value, start):
        z = mixed(((z ^ part) + 0x9E3779B97F4A7C15) & MASK)
    return z
