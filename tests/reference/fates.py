"""The slow, obviously right twin of how fates are decided: one orbit at a time, in plain Python.

It follows the docstring of `atlas.planes.fates`. Exponents of cycles of several variables are the eigenvalues
of the exact product of the Jacobians, in 50 digits; everything else is meant to be equal to the last bit.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field, replace
from itertools import pairwise
from math import atan2, exp, frexp, inf, isfinite, log, nan, pi, sqrt

from atlas.planes.fates import (
    CHAOTIC,
    ESCAPES,
    EXTINCT,
    FIXED_POINT,
    PERIODIC,
    QUASI_PERIODIC,
    UNSETTLED,
)
from atlas.planes.pixels import FateRules
from tests.reference.orbits import MASK, mixed
from tests.reference.slow_maps import LOG, SlowMap, State, compound, exponents_of_cycle

TESTED_EVERY = 16
FIRST_STAGE = 64
BATCHES = 16
LN2 = 0.6931471805599453
BACKWARD = 2.0**-8


class Escaped(Exception):
    """A test found a state variable not below the bound; carries the time and state of the test before."""


class Extinct(Exception):
    """A test found a state variable that had been below its threshold; carries the state a test before."""


class Collapsed(Exception):
    """Rounding dropped the orbit onto a repelling cycle."""


@dataclass(frozen=True)
class Found:
    """What became of an orbit; the names are those of `atlas.planes.pixels.Pixels`, but for ``ways``.

    ``ways`` says which decisions were met that do not show in the fate.
    """

    fate: int
    x: State
    exponents: State
    error: float = nan
    period: int = 0
    turn: int = 0
    escape: float = nan
    collapsed: bool = False
    repelling: bool = False
    ways: frozenset[str] = frozenset()


@dataclass(frozen=True)
class Cycle:
    """A confirmed cycle."""

    turn: int
    period: int
    exponents: State
    repelling: bool


@dataclass(frozen=True)
class Approaching:
    """What a look finds of an orbit that nears a cycle."""

    away: float


@dataclass
class FateTwin:
    """Decides about the orbits of a map, one at a time.

    Attributes
    ----------
    map : SlowMap
    rules : FateRules
    low : sequence of float
        Thresholds of extinction; 0 where there is none.
    """

    map: SlowMap
    rules: FateRules
    low: Sequence[float]
    _start: State = ()
    _ways: set[str] = field(default_factory=set)

    def of(self, start: State, seed: int) -> Found:
        """Return what becomes of the orbit from a start."""
        self._start, self._ways = start, set()
        collapsed = False
        try:
            try:
                found = self._undisturbed(start)
            except Collapsed:
                collapsed = True
                found = self._disturbed(start, seed)
        except Escaped as escaped:
            since, x = escaped.args
            found = self._nothing(ESCAPES, x, escape=self._leaving(since, x))
        except Extinct as extinct:
            found = self._nothing(EXTINCT, extinct.args[0])
        return replace(found, collapsed=collapsed, ways=frozenset(self._ways))

    def _nothing(self, fate: int, x: State, *, escape: float = nan) -> Found:
        return Found(fate, x, (nan,) * len(x), escape=escape)

    def _whole(self, steps: int) -> int:
        length = len(self.map.word)
        return -(-steps // length) * length

    def _undisturbed(self, x: State) -> Found:
        whole, done = self._whole(self.rules.transient), 0
        while done < whole:
            steps = min(self._whole(max(done, FIRST_STAGE)), whole - done)
            x = self._stage(x, done, steps, self.map.step)
            done += steps
            seen = self._look(x)
            if isinstance(seen, Cycle):
                return self._met(x, seen)
        return self._measured(x, done)

    def _stage(
        self,
        x: State,
        before: int,
        steps: int,
        step: Callable[[State, int], State],
        each: Callable[[State, int], None] = lambda x, time: None,
    ) -> State:
        since, kept, dying = before, x, False
        for n in range(1, steps + 1):
            each(x, before + n - 1)
            x = step(x, before + n - 1)
            dying = dying or any(abs(value) < low for value, low in zip(x, self.low, strict=True))
            if n % TESTED_EVERY == 0 or n == steps:
                if not all(abs(value) < self.map.bound for value in x):
                    raise Escaped(since, kept)
                if dying:
                    raise Extinct(kept)
                since, kept = before + n, x
        return x

    def _look(self, x: State) -> Cycle | Approaching | None:
        unit = len(self.map.word)
        longest = max(self.rules.longest_period, unit)
        ahead = [x]
        for n in range(longest):
            ahead.append(self.map.step(ahead[-1], n))
        gaps = {p: self.map.distance(ahead[p], x) for p in range(unit, longest + 1, unit)}
        gaps = {p: gap for p, gap in gaps.items() if gap < inf}
        if not gaps:
            return None
        repeats = [p for p, gap in gaps.items() if gap == 0.0]
        p = repeats[0] if repeats else min(gaps, key=lambda period: gaps[period])
        largest = max(abs(value) for state in ahead[: p + 1] for value in state)
        size = max(largest, *map(abs, self._start))
        if not repeats:
            if not gaps[p] < size * 2.0**-10:
                return None
            left = self._distance_left(x, p, largest, size)
            if left is None:
                return None
            dying = any(
                low > 0.0 and abs(value) < size * 2.0**-20 for value, low in zip(x, self.low, strict=True)
            )
            if left > size * 2.0**-20 or dying:
                self._ways.add("approaching")
                return Approaching(self._widest_gap(x, p, 64))
        exponents = self._multipliers(x, p)
        repelling = exponents[0] * p > 1e-6
        if repelling:
            if not repeats:
                self._ways.add("near a repelling cycle")
                return None
            if self._start not in ahead[:p]:
                raise Collapsed
        return Cycle(p, self._least(self._next_round(ahead[:p]), size * 2.0**-17), exponents, repelling)

    def _distance_left(self, x: State, p: int, largest: float, size: float) -> float | None:
        """Return the estimated distance to the limit; None where there is none."""
        return self._left_of_one(x, p, largest) if len(x) == 1 else self._left_of_several(x, p, largest, size)

    def _left_of_one(self, x: State, p: int, largest: float) -> float | None:
        begin, gaps, time = x, [], 0
        for _ in range(3):
            before = x
            for _ in range(p):
                x = self.map.step(x, time)
                time += 1
            gaps.append(self.map.distance(x, before))
        if gaps[0] <= 1e-15 * largest:
            return 0.0
        ratio = max(gaps[1] / gaps[0], gaps[2] / gaps[1] if gaps[1] > 0.0 else 0.0)
        if not ratio < 1.0:
            return None
        left = 4.0 * gaps[0] * ratio / (1.0 - ratio)
        return left * (self._widest_gap(begin, p, p) / gaps[0]) if left > 0.0 else left

    def _left_of_several(self, x: State, p: int, largest: float, size: float) -> float | None:
        """Return the estimate from the widest gap and the largest multiplier, if the gaps do not grow."""
        begin, steps = x, max(p, 64)
        early = self._widest_gap(x, p, 64)
        if early <= 1e-15 * largest:
            return 0.0
        for n in range(steps):
            x = self.map.step(x, n)
        states = [x]
        for n in range(steps + p - 1):
            states.append(self.map.step(states[-1], steps + n))
        late = max(self.map.distance(states[n + p], states[n]) for n in range(steps))
        if not late <= 1.0625 * early:
            return None
        rate = exp(self._multipliers(begin, p)[0] * p)
        if rate >= 1.0:
            self._ways.add("near a repelling cycle")
            return None
        left = 4.0 * early * rate / (1.0 - rate)
        return left if late < early or left <= size * 2.0**-20 else None

    def _widest_gap(self, x: State, p: int, least: int) -> float:
        """Return the widest gap between states p steps apart, over p and at least some steps."""
        steps = max(p, least)
        states = [x]
        for n in range(steps + p - 1):
            states.append(self.map.step(states[-1], n))
        return max(self.map.distance(states[n + p], states[n]) for n in range(steps))

    def _multipliers(self, x: State, p: int) -> State:
        if len(x) == 1:
            product = 1.0
            for n in range(p):
                product *= self.map.jacobian(x, n)[0][0]
                x = self.map.step(x, n)
            return (float(LOG(abs(product))) / p,)
        return exponents_of_cycle(self.map, x, 0, p)

    def _next_round(self, states: Sequence[State]) -> list[State]:
        p, x = len(states), states[-1]
        found = []
        for n in range(p):
            x = self.map.step(x, p - 1 + n)
            found.append(x)
        return found

    def _least(self, states: Sequence[State], near: float) -> int:
        p = len(states)
        for period in range(1, p):
            if p % period == 0 and all(
                self.map.distance(states[(n + period) % p], states[n]) <= near for n in range(p)
            ):
                return period
        return p

    def _met(self, x: State, cycle: Cycle) -> Found:
        fate = FIXED_POINT if cycle.period == 1 else PERIODIC
        return Found(fate, x, cycle.exponents, 0.0, cycle.period, cycle.turn, repelling=cycle.repelling)

    def _measured(self, x: State, done: int, *, anew: bool = False) -> Found:
        growth = Growth(self.map, self._whole(max(1, self.rules.steps // BATCHES)))
        seen: Cycle | Approaching | None = None
        for batch in range(1, BATCHES + 1):
            x = self._stage(x, done, growth.steps, self.map.step, growth.carry)
            growth.note()
            done += growth.steps
            if batch % (BATCHES // 4) == 0:
                seen = self._look(x)
                if isinstance(seen, Cycle):
                    return self._met(x, seen)
        if isinstance(seen, Approaching) and not anew:
            return self._extended(x, done, seen.away)
        return self._decided(x, growth)

    def _extended(self, x: State, done: int, away: float) -> Found:
        limit = self.rules.transient_limit
        while done < limit:
            steps = self._whole(min(max(done, FIRST_STAGE), limit - done))
            x = self._stage(x, done, steps, self.map.step)
            doubled = steps >= done
            done += steps
            seen = self._look(x)
            if isinstance(seen, Cycle):
                self._ways.add("approached, then met")
                return self._met(x, seen)
            if seen is None or (doubled and not seen.away < 0.8 * away):
                self._ways.add("measured anew")
                return self._measured(x, done, anew=True)
            away = seen.away
        self._ways.add("approached, then unsettled")
        return self._nothing(UNSETTLED, x)

    def _decided(self, x: State, growth: Growth) -> Found:
        total = BATCHES * growth.steps
        rates = growth.rates
        means = [sum_in_order([rate[k] for rate in rates]) / BATCHES for k in range(len(x))]
        largest = means[0]
        spread = sum_in_order([(rate[0] - largest) * (rate[0] - largest) for rate in rates])
        error = sqrt(spread / (BATCHES - 1) / BATCHES)
        tolerance = 3.0 * error + log(total) / total
        if not (isfinite(largest) and isfinite(error)) or largest < -tolerance:
            self._ways.add("tests disagree")
            fate = UNSETTLED
        else:
            fate = CHAOTIC if largest > tolerance else QUASI_PERIODIC
        return Found(fate, x, tuple(mean if isfinite(mean) else nan for mean in means), error)

    def _disturbed(self, x: State, seed: int) -> Found:
        def step(x: State, time: int) -> State:
            number = mixed((seed + (time + 1) * 0x9E3779B97F4A7C15) & MASK)
            factor = 1.0 - float(number >> 11) * 2.0**-93
            return tuple(value * factor for value in self.map.step(x, time))

        done = self._whole(self.rules.transient)
        x = self._stage(x, 0, done, step) if done else x
        growth = Growth(self.map, self._whole(max(1, self.rules.steps // BATCHES)))
        for _ in range(BATCHES):
            x = self._stage(x, done, growth.steps, step, growth.carry)
            growth.note()
            done += growth.steps
        return self._decided(x, growth)

    def _leaving(self, since: int, x: State) -> float:
        """Return the smooth number of steps after which an orbit passed the bound; disturbed or not."""
        bound = self.map.bound
        for n in range(since, since + TESTED_EVERY):
            last = max(map(abs, x))
            x = self.map.step(x, n)
            if not all(abs(value) < bound for value in x):
                size = max(map(abs, x))
                if bound <= size < inf and last > 0.0:
                    return n + 1 - float(LOG(size / bound)) / float(LOG(size / last))
                return float(n + 1)
        return float(since + TESTED_EVERY)

    def rotation(self, found: Found) -> float:
        """Return the rotation number of an orbit whose fate is known; NaN where there is none."""
        winding = [k for k, width in enumerate(self.map.widths) if width]
        if not winding and len(found.x) == 1:
            return nan
        if found.fate == PERIODIC or (found.fate == FIXED_POINT and winding):
            total = sum(self._turns(found.x, found.turn, winding))
            turns = round(total) / found.turn
        elif found.fate in (QUASI_PERIODIC, CHAOTIC):
            steps = self.rules.steps
            times = [(n + 0.5) / steps for n in range(steps)]
            weights = [exp(-1.0 / (time * (1.0 - time))) for time in times]
            each = self._turns(found.x, steps, winding)
            turns = sum(w * turn for w, turn in zip(weights, each, strict=True)) / sum(weights)
        else:
            return nan
        return turns if winding else min(abs(turns), 1.0 - abs(turns))

    def _turns(self, x: State, steps: int, winding: Sequence[int]) -> list[float]:
        states = [x]
        for n in range(steps):
            states.append(self.map.step(states[-1], n))
        if winding:
            k = winding[-1]
            return [(self.map.lift(x, n)[k] - x[k]) / self.map.widths[k] for n, x in enumerate(states[:-1])]
        middle = [sum(x[k] for x in states[1:]) / steps for k in range(2)]
        angles = [atan2(x[1] - middle[1], x[0] - middle[0]) / (2.0 * pi) for x in states]
        low = -0.5 - BACKWARD
        return [(new - old - low) % 1.0 + low for old, new in pairwise(angles)]


class Growth:
    """Growth of tangent lengths, areas and volumes, batch by batch."""

    def __init__(self, slow: SlowMap, steps: int) -> None:
        self.map, self.steps = slow, steps
        self.rates: list[list[float]] = []
        states = len(slow.names)
        sides = [len(compound([[0.0] * states] * states, order)) for order in range(1, states + 1)]
        self._vectors = [[1.0] * side for side in sides]

    def carry(self, x: State, time: int) -> None:
        """Carry every vector along one step."""
        jacobian = self.map.jacobian(x, time)
        for k, vector in enumerate(self._vectors):
            rows = compound(jacobian, k + 1)
            self._vectors[k] = [
                sum_in_order([entry * part for entry, part in zip(row, vector, strict=True)]) for row in rows
            ]

    def note(self) -> None:
        """End a batch: note the growth in it and make the largest part of every vector 1."""
        logs = []
        for k, vector in enumerate(self._vectors):
            most = max(map(abs, vector))
            factor, power = frexp(most)
            logs.append((power - 1) * LN2 + float(LOG(2.0 * factor)))
            self._vectors[k] = [part / most if 0.0 < most < inf else 1.0 for part in vector]
        self.rates.append([(new - old) / self.steps for old, new in zip([0.0, *logs], logs, strict=False)])


def sum_in_order(numbers: Sequence[float]) -> float:
    """Return the sum, added one number after the other."""
    total = numbers[0]
    for number in numbers[1:]:
        total += number
    return total
