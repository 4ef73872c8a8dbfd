"""The slow, obviously right twin of following: one orbit at a time handed from column to column."""

from __future__ import annotations

from collections.abc import Sequence

from atlas.orbits.orbit import Rules
from tests.reference.orbits import ROUND, Collapsed, Column, Escaped, Orbit, Twin, Unsettled, key

NEGLIGIBLE = 2.0**-40


class FollowingTwin(Twin):
    """A one-variable map whose columns start where their neighbours ended."""

    def sweep(
        self, values: Sequence[Sequence[float]], starts: Sequence[float], rules: Rules, *, down: bool
    ) -> list[Column]:
        """Run every column; return what each received, in ascending order."""
        columns = [Column() for _ in values]
        order = range(len(values))
        for v in range(rules.values_per_column):
            for s, own in enumerate(starts):
                start = own
                for number in reversed(order) if down else order:
                    seed = key(number, v, s)
                    start = self._follow(columns[number], values[number][v], start, own, rules, seed)
        return columns

    def _follow(
        self, column: Column, value: float, start: float, own: float, rules: Rules, seed: int
    ) -> float:
        """Run one orbit of one column; return where the next column starts."""
        try:
            try:
                states, end, cyclic, repelled = self._ran(value, start, rules)
                if start != own and (repelled or (start == 0.0 and own != 0.0 and not cyclic)):
                    start = own if repelled else NEGLIGIBLE * own
                    states, end, *_ = self._ran(value, start, rules)
            except Collapsed:
                column.collapsed += 1
                states = [x for (x,) in self.at(value, rules).disturbed((start,), seed)]
                end = states[-1]
            column.add(self.at(value, rules), Orbit([(x,) for x in states]))
        except Escaped:
            column.escaped += rules.samples
            return own
        except Unsettled:
            column.unsettled += rules.samples
            end = start
            for _ in range(max(rules.transient, rules.transient_limit)):
                end = self.step(end, value)
        return 0.0 if abs(end) < NEGLIGIBLE * abs(own) else end

    def _ran(self, value: float, start: float, rules: Rules) -> tuple[list[float], float, bool, bool]:
        """Return the states, the last one, whether on a cycle, and whether that is the start's and repels."""
        twin = self.at(value, rules)
        (begin,), repeats = twin.settled((start,))
        states = [x for (x,) in twin.recorded((start,))]
        if repeats:
            return states, begin, True, self._repels(value, begin)
        for done in range(ROUND, rules.samples + ROUND, ROUND):
            before = begin if done == ROUND else states[done - ROUND - 1]
            if before in states[done - ROUND : done]:
                return states, states[min(done, rules.samples) - 1], True, False
        x = ahead = states[-1]
        for _ in range(rules.longest_period):
            ahead = self.step(ahead, value)
            if ahead == x:
                return states, x, True, False
        return states, x, False, False

    def _repels(self, value: float, x: float) -> bool:
        first, multiplier = x, 1.0
        while True:
            multiplier *= self.slope(x, value)
            x = self.step(x, value)
            if x == first:
                return abs(multiplier) > 1 + 1e-6
