"""The slow, obviously right twin of the orbit kernels: one orbit at a time, in plain Python.

Multipliers of cycles of several variables are eigenvalues of the exact product of the Jacobians.
"""

from __future__ import annotations

from bisect import bisect_right
from collections import Counter
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from itertools import pairwise
from math import exp, inf, lcm, sqrt
from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

from atlas.orbits.orbit import Rules
from tests.reference.slow_maps import State, apart, exponents_of_cycle

Step = Callable[[State, int], State]

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
    on_repelling: int = 0

    def add(self, twin: OrbitTwin, orbit: Orbit) -> None:
        """Count an orbit on the one axis of its twin."""
        samples = twin.rules.samples
        self.escaped += samples * orbit.escaped
        self.unsettled += samples * orbit.unsettled
        self.collapsed += orbit.collapsed
        self.on_repelling += orbit.on_repelling
        top = len(twin.axes[0].edges)
        for x in orbit.states:
            (cell,) = twin.cells(x)
            if cell == 0:
                self.below += 1
            elif cell == top:
                self.above += 1
            else:
                self.cells[cell - 1] += 1


class Escaped(Exception):
    """An orbit left the bound."""


class Collapsed(Exception):
    """Rounding dropped an orbit onto a repelling cycle."""


class Unsettled(Exception):
    """The transient had not died out at the limit."""


@dataclass(frozen=True)
class Shown:
    """A counted axis.

    Attributes
    ----------
    name : str
        Of a state variable or observable.
    edges : ndarray of float64
        Cell edges.
    half_cell : float
        In units of the logarithm where relative.
    relative : bool
        Whether the axis is logarithmic.
    """

    name: str
    edges: NDArray[np.float64]
    half_cell: float
    relative: bool = False

    def cell(self, y: float) -> int:
        """Return 0 below the window, 1 + the cell inside, 1 + the number of cells above."""
        if not y >= self.edges[0]:
            return 0
        if y > self.edges[-1]:
            return len(self.edges)
        return min(bisect_right(self.edges, y), len(self.edges) - 1)


class Moves(Protocol):
    """What a twin asks of a map: `tests.reference.slow_maps.SlowMap`, or :class:`OneVariable`."""

    bound: float
    word: Sequence[Any]
    widths: Sequence[float]
    names: Sequence[str]

    def step(self, x: State, time: int) -> State:
        """Return the state after the one at that time."""

    def jacobian(self, x: State, time: int) -> Sequence[Sequence[float]]:
        """Return the derivative of the step at a state."""

    def shown(self, name: str, x: State) -> float:
        """Return a state variable or observable."""

    def distance(self, x: State, y: State) -> float:
        """Return the largest difference of a state variable."""


@dataclass(frozen=True)
class Orbit:
    """What becomes of an orbit: its recorded states, or why there are none."""

    states: Sequence[State] = ()
    escaped: bool = False
    unsettled: bool = False
    collapsed: bool = False
    on_repelling: bool = False


@dataclass
class OrbitTwin:
    """A map with what decides about its orbits, as the docstring of `atlas.orbits.block` says.

    Attributes
    ----------
    map : Moves
    axes : sequence of Shown
        One or two counted axes.
    rules : Rules
    """

    map: Moves
    axes: Sequence[Shown]
    rules: Rules
    _on_repelling: bool = False

    def __post_init__(self) -> None:
        rules, word = self.rules, len(self.map.word)
        self.transient = rules.transient + (rules.phase - rules.transient) % rules.every
        self.pattern = lcm(rules.every, word) // rules.every
        self.longest = max(rules.longest_period, self.pattern)

    def orbit(self, start: State, seed: int) -> Orbit:
        """Run an orbit to its end."""
        self._on_repelling = collapsed = False
        try:
            try:
                states = self.recorded(start)
            except Collapsed:
                collapsed = True
                states = self.disturbed(start, seed)
        except Escaped:
            return Orbit(escaped=True, collapsed=collapsed)
        except Unsettled:
            return Orbit(unsettled=True)
        return Orbit(states, collapsed=collapsed, on_repelling=self._on_repelling)

    def cells(self, x: State) -> tuple[int, ...]:
        """Return the cell of a state on every axis."""
        return tuple(axis.cell(self.map.shown(axis.name, x)) for axis in self.axes)

    def recorded(self, start: State) -> list[State]:
        """Return the recorded states of an orbit that is not disturbed."""
        rules = self.rules
        x, repeats = self.settled(start)
        states: list[State] = []
        while len(states) < rules.samples:
            now, reference = self._time(len(states)), x
            stage = self._recorded(x, now, min(ROUND, rules.samples - len(states)), self.map.step)
            states += stage
            x = states[-1]
            hits = [n for n, state in enumerate(stage, 1) if state == reference and n % self.pattern == 0]
            if hits and not repeats:
                self._refuse_repelling(x, self._time(len(states)), hits[0])
        if not repeats:
            now = self._time(len(states))
            cycle = self._repeat(self._ahead(x, now, self.longest))
            if cycle:
                self._refuse_repelling(x, now, cycle)
        return states

    def _time(self, records: int) -> int:
        return self.transient + records * self.rules.every

    def settled(self, start: State) -> tuple[State, bool]:
        """Return the state after the transient and its extensions, and whether it comes back bit for bit."""
        x, done, steps = start, 0, self.transient
        limit = max(self.transient, self.rules.transient_limit)
        unit = self.pattern * self.rules.every
        while True:
            x = ([x, *self._stage(x, done, steps, self.map.step)])[-1]
            done += steps
            ahead = self._ahead(x, done, max(4 * self.longest, 64))
            cycle = self._repeat(ahead)
            if cycle:
                steps_round = self._path(x, done, cycle * self.rules.every)
                if start not in steps_round:
                    self._refuse_repelling(x, done, cycle)
                else:
                    self._on_repelling = self._is_repelling(x, done, cycle)
                return x, True
            if not self._is_slow(start, done, ahead[: self.longest + 1]):
                return x, False
            if done >= limit:
                raise Unsettled
            steps = -(-min(max(done, 64), limit - done) // unit) * unit

    def _path(self, x: State, time: int, steps: int) -> list[State]:
        """Return a state and those after it, as many as there are steps, the last left out."""
        states = [x]
        for n in range(steps - 1):
            states.append(self.map.step(states[-1], time + n))
        return states

    def _ahead(self, x: State, time: int, records: int) -> list[State]:
        return self._path(x, time, records * self.rules.every + 1)[:: self.rules.every]

    def _repeat(self, ahead: Sequence[State]) -> int:
        """Return after how many records the first state comes back bit for bit, 0 if it does not."""
        for n in range(self.pattern, len(ahead), self.pattern):
            if self.map.distance(ahead[n], ahead[0]) == 0.0:
                return n
        return 0

    def _stage(self, x: State, before: int, steps: int, step: Step, every: int = 1) -> list[State]:
        states = []
        gone = self._outside(x) if steps == 0 else False
        for n in range(1, steps + 1):
            for e in range(every):
                x = step(x, before + (n - 1) * every + e)
            states.append(x)
            if (n % TESTED_EVERY == 0 or n == steps) and self._outside(x):
                gone = True
        if gone:
            raise Escaped
        return states

    def _recorded(self, x: State, before: int, records: int, step: Step) -> list[State]:
        return self._stage(x, before, records, step, self.rules.every)

    def _outside(self, x: State) -> bool:
        return not all(abs(value) < self.map.bound for value in x)

    def _refuse_repelling(self, x: State, time: int, cycle: int) -> None:
        if self._is_repelling(x, time, cycle):
            raise Collapsed

    def _is_repelling(self, x: State, time: int, cycle: int) -> bool:
        steps = cycle * self.rules.every
        if len(x) > 1:
            return exp(exponents_of_cycle(self.map, x, time, steps)[0] * steps) > 1 + 1e-6
        multiplier = 1.0
        for n, state in enumerate(self._path(x, time, steps)):
            multiplier *= self.map.jacobian(state, time + n)[0][0]
        return abs(multiplier) > 1 + 1e-6

    def _is_slow(self, start: State, time: int, ahead: Sequence[State]) -> bool:
        gaps = {
            n: self.map.distance(ahead[n], ahead[0]) for n in range(self.pattern, len(ahead), self.pattern)
        }
        gaps = {n: gap for n, gap in gaps.items() if gap < inf}
        if not gaps:
            return False
        size = max(abs(value) for x in ahead for value in x)
        period = min(gaps, key=lambda n: gaps[n])
        if not gaps[period] < max(size, *map(abs, start)) / 1024:
            return False
        one = len(start) == 1
        turns = self._path(ahead[0], time, (3 if one else 8) * period * self.rules.every + 1)
        turns = turns[:: period * self.rules.every]
        away = [self.map.distance(new, old) for old, new in pairwise(turns)]
        if away[0] <= 1e-15 * size:
            return False
        if one:
            ratio = max(away[1] / away[0], away[2] / away[1] if away[1] > 0 else 0.0)
        else:
            ratio = sqrt(sqrt(max(away[4:]) / max(away[:4])))
        if not ratio < 1:
            return False
        return any(self._left(axis, turns, ratio) > 1.0 for axis in self.axes)

    def _left(self, axis: Shown, turns: Sequence[State], ratio: float) -> float:
        """Return the estimated distance to the limit along an axis, in half cells."""
        names = list(self.map.names)
        width = self.map.widths[names.index(axis.name)] if axis.name in names else 0.0
        values = [self.map.shown(axis.name, x) for x in turns]
        away = [apart(new, old, width) for old, new in pairwise(values)]
        left = 4.0 * (away[0] if len(names) == 1 else max(away)) * ratio / (1.0 - ratio)
        return (left / abs(values[-1]) if axis.relative else left) / axis.half_cell

    def disturbed(self, start: State, seed: int) -> list[State]:
        """Return the recorded states of an orbit of which every step is disturbed."""

        def step(x: State, time: int) -> State:
            hashed = mixed((seed + (time + 1) * 0x9E3779B97F4A7C15) & MASK)
            factor = 1.0 - float(hashed >> 11) * 2.0**-93
            return tuple(value * factor for value in self.map.step(x, time))

        x = ([start, *self._stage(start, 0, self.transient, step)])[-1]
        return self._recorded(x, self.transient, self.rules.samples, step)


@dataclass(frozen=True)
class OneVariable:
    """A map of one variable and one parameter, given as functions of (state, parameter)."""

    move: Callable[[float, float], float]
    slope: Callable[[float, float], float]
    parameter: float
    bound: float
    word: Sequence[Any] = (None,)
    widths: Sequence[float] = (0.0,)
    names: Sequence[str] = ("x",)

    def step(self, x: State, _: int) -> State:
        """Return the next state."""
        return (self.move(x[0], self.parameter),)

    def jacobian(self, x: State, _: int) -> Sequence[Sequence[float]]:
        """Return the derivative of the step."""
        return [[self.slope(x[0], self.parameter)]]

    def shown(self, _: str, x: State) -> float:
        """Return the state."""
        return x[0]

    def distance(self, x: State, y: State) -> float:
        """Return how far apart two states are."""
        return abs(x[0] - y[0])


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

    def at(self, value: float, rules: Rules) -> OrbitTwin:
        """Return the twin of the orbits at one value of the parameter."""
        axes = [Shown("x", self.edges, self.half_cell, self.relative)]
        return OrbitTwin(OneVariable(self.step, self.slope, value, self.bound), axes, rules)

    def column(self, number: int, values: Sequence[float], starts: Sequence[float], rules: Rules) -> Column:
        """Run every orbit of a column to its end and count it."""
        column = Column()
        for v, value in enumerate(values):
            twin = self.at(value, rules)
            for s, start in enumerate(starts):
                column.add(twin, twin.orbit((start,), key(number, v, s)))
        return column


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
