"""Kinds of value that say where orbits start: a list of states, or a grid of them over a box."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction
from itertools import product
from math import prod
from typing import Any

from atlas.reading.kinds import Kind, Schema, Whole
from atlas.reading.orbit_kinds import Interval, NumbersKind
from atlas.reading.place import Place, shown
from atlas.reading.section import Key, read_section, section_schema, text_keys
from tiles.number import Exact

MOST_STARTS = 4096
SIDE = Interval()
COUNT = Whole(1, 1 << 31)


@dataclass(frozen=True)
class GridKind(Kind[tuple[int, ...]]):
    """How many starts stand along each side of a box."""

    @property
    def allowed(self) -> str:
        return "a list of whole numbers such as [8, 8], one for each state variable of the box"

    def read(self, given: Any, place: Place) -> tuple[int, ...]:
        if not isinstance(given, list | tuple) or not given:
            raise place.refusal(f"{shown(given)} is not {self.allowed}")
        return tuple(COUNT.read(entry, place.at(number)) for number, entry in enumerate(given, 1))

    def schema(self) -> Schema:
        return {"type": "array", "items": COUNT.schema(), "minItems": 1}


@dataclass(frozen=True)
class BoxKind(Kind[dict[str, tuple[Exact, Exact]]]):
    """A mapping of state variables to intervals, in the order in which it was written."""

    @property
    def allowed(self) -> str:
        return "a mapping of state variables to intervals such as {x: [0, 1]}"

    def read(self, given: Any, place: Place) -> dict[str, tuple[Exact, Exact]]:
        box = {name: self._side(given[name], place.at(name)) for name in text_keys(given, place)}
        if not box:
            raise place.refusal(f"an empty mapping is not {self.allowed}")
        return box

    def _side(self, given: Any, place: Place) -> tuple[Exact, Exact]:
        low, high = SIDE.read(given, place)
        if low.value and high.value and low.of_pi != high.of_pi:
            raise place.refusal(
                f"the interval from {low} to {high} mixes a plain number and a multiple of pi; "
                "write both ends as one or the other"
            )
        return low, high

    def schema(self) -> Schema:
        return {"type": "object", "additionalProperties": SIDE.schema(), "minProperties": 1}


GRID_KEYS: tuple[Key[Any], ...] = (
    Key("grid", GridKind(), None, "How many starts stand along each side of the box.", True),
    Key("box", BoxKind(), None, "State variables and the intervals over which starts are spread.", True),
)


@dataclass(frozen=True)
class StartsKind(Kind[tuple[dict[str, Exact], ...]]):
    """A list of states, or a grid of them over a box: the centres of its cells, the first name slowest."""

    @property
    def allowed(self) -> str:
        return "a list of states such as [{x: 0.3}, {x: 0.7}], or {grid: [8, 8], box: {x: [0, 1], y: [0, 1]}}"

    def read(self, given: Any, place: Place) -> tuple[dict[str, Exact], ...]:
        if isinstance(given, Mapping) and not {"grid", "box"}.isdisjoint(given):
            return _spread(**read_section(GRID_KEYS, given, place), place=place)
        if not isinstance(given, list | tuple) or not given:
            raise place.refusal(f"{shown(given)} is not {self.allowed}")
        if len(given) > MOST_STARTS:
            raise place.refusal(f"{len(given)} starts are too many; at most {MOST_STARTS} are allowed")
        one = NumbersKind("state variables")
        return tuple(one.read(entry, place.at(number)) for number, entry in enumerate(given, 1))

    def schema(self) -> Schema:
        one = NumbersKind("state variables").schema()
        many = {"type": "array", "items": one, "minItems": 1, "maxItems": MOST_STARTS}
        return {"anyOf": [many, section_schema(GRID_KEYS)]}

    def write(self, value: tuple[dict[str, Exact], ...]) -> Any:
        return [NumbersKind("state variables").write(start) for start in value]


def _spread(
    grid: tuple[int, ...], box: dict[str, tuple[Exact, Exact]], place: Place
) -> tuple[dict[str, Exact], ...]:
    if len(grid) != len(box):
        raise place.at("grid").refusal(
            f"{len(grid)} counts are given for the {len(box)} sides of the box; write one count a side"
        )
    if prod(grid) > MOST_STARTS:
        told = " x ".join(map(str, grid))
        raise place.at("grid").refusal(
            f"a grid of {told} has {prod(grid)} starts; at most {MOST_STARTS} are allowed"
        )
    sides = [
        [_centre(*side, number, count) for number in range(count)]
        for side, count in zip(box.values(), grid, strict=True)
    ]
    return tuple(dict(zip(box, corner, strict=True)) for corner in product(*sides))


def _centre(low: Exact, high: Exact, number: int, count: int) -> Exact:
    share = Fraction(2 * number + 1, 2 * count)
    return Exact(low.value + share * (high.value - low.value), low.of_pi or high.of_pi)
