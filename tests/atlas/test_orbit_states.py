"""Orbit kernels of several variables, patterns, observables, records and two axes, against the slow twin."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass
from functools import cache
from typing import Any

import numpy as np
import pytest

from atlas.families.catalogue import family
from atlas.families.map_family import Family
from atlas.families.reader import family_from_config
from atlas.orbits.orbit import OrbitCounter, Rules
from atlas.orbits.portrait import PortraitCounter
from tests.reference.orbits import Column, OrbitTwin, Shown, key
from tests.reference.slow_maps import SlowMap
from tiles.number import exact
from tiles.window import View

COLUMNS, ROWS = 5, 23
KINDS = ("below", "above", "escaped", "unsettled", "collapsed")


@dataclass(frozen=True)
class Case:
    """A small histogram: a parameter across, or a phase portrait."""

    family: Family
    across: Any
    up: Any
    rules: Rules
    starts: tuple[dict[str, str], ...]

    @property
    def view(self) -> View:
        """The view."""
        return View(self.across, self.up)

    @property
    def begin(self) -> list[dict[str, Any]]:
        """The starts, as exact numbers."""
        return [{name: exact(value) for name, value in start.items()} for start in self.starts]

    def begins(self) -> list[tuple[float, ...]]:
        """Return the starts as states."""
        return [
            tuple(float(start.get(state.name, state.start)) for state in self.family.states)
            for start in self.begin
        ]


COUPLED = family_from_config(
    "tents_of_one_pace",
    {
        "state": {"x": {"start": "0.3"}, "y": {"start": "0.1"}},
        "parameters": {"mu": {"default": "2"}, "b": {"default": "0.5"}},
        "step": {"x": "mu * min(x, 1 - x)", "y": "mu * min(y, 1 - y)"},
        "observables": {"total": "x + y"},
    },
)
AAB = family("forced_logistic").with_patterns({"r": ("a", "a", "b")})
COLUMNS_OF = {
    "two states": Case(
        family("henon"),
        ("a", "0.3", "1.45"),
        ("x", "-1.2", "1.2"),
        Rules(100, 900, 150, 2, 16),
        ({}, {"x": "0.3"}),
    ),
    "second state, slow": Case(
        family("delayed_logistic"),
        ("r", "0.9", "1.1"),
        ("y", 0, "0.2"),
        Rules(60, 400, 100, 1, 8),
        ({},),
    ),
    "observable": Case(
        COUPLED, ("mu", "1.5", "2.5"), ("total", 0, 2), Rules(80, 200, 100, 1, 8), ({}, {"x": "0", "y": "0"})
    ),
    "wrapped": Case(
        family("circle"), ("Omega", "0", "0.5"), ("theta", 0, 1), Rules(50, 300, 120, 2, 8), ({},)
    ),
    "pattern": Case(
        family("forced_logistic"),
        ("a", "2.8", "4.2"),
        ("x", 0, 1),
        Rules(60, 700, 600, 2, 8),
        ({}, {"x": "0.8"}),
    ),
    "longer pattern": Case(AAB, ("a", "2.8", "4.1"), ("x", 0, 1), Rules(61, 500, 120, 2, 8), ({},)),
    "every second": Case(
        family("logistic"),
        ("r", "2.9", "4.1"),
        ("x", 0, 1),
        Rules(60, 500, 600, 2, 8, every=2, phase=1),
        ({},),
    ),
    "pattern of 3, every second": Case(
        AAB, ("a", "2.8", "4"), ("x", 0, 1), Rules(60, 500, 90, 2, 8, every=2, phase=1), ({},)
    ),
    "pattern of 2, every fourth": Case(
        family("forced_logistic"),
        ("b", "2.8", "4"),
        ("x", 0, 1),
        Rules(0, 500, 90, 2, 8, every=4, phase=3),
        ({},),
    ),
    "two states, every third": Case(
        family("henon"),
        ("a", "0.3", "1.45"),
        ("y", "-0.4", "0.4"),
        Rules(50, 400, 60, 1, 8, every=3, phase=2),
        ({},),
    ),
}
PORTRAITS = {
    "two axes": Case(
        family("henon"),
        ("x", "-1.1", "1.1"),
        ("y", "-0.3", "0.35"),
        Rules(40, 200, 700, 1, 16),
        ({}, {"x": "3"}),
    ),
    "observable and log axis": Case(
        COUPLED,
        ("total", "0.1", "1.9"),
        {"name": "y", "low": "1e-2", "high": 1, "scale": "log"},
        Rules(80, 200, 100, 1, 8),
        ({}, {"x": "0", "y": "0"}, {"x": "0.25"}),
    ),
    "wrapped twice": Case(
        family("standard"),
        ("theta", "0", "2*pi"),
        ("p", "pi/6", "2*pi"),
        Rules(10, 100, 200, 1, 8),
        ({}, {"theta": "pi", "p": "1"}, {"theta": "0", "p": "0"}),
    ),
}


def axis_of(axis: Any, cells: int) -> Shown:
    return Shown(axis.name, axis.edges(cells), 0.5 * axis.cell_size(cells), axis.scale == "log")


@cache
def slow_columns(name: str) -> list[Column]:
    """Return what the twin counts in every column."""
    case = COLUMNS_OF[name]
    view, each = case.view, case.rules.values_per_column
    values = view.across.values(COLUMNS, each)
    columns = []
    for number in range(COLUMNS):
        column = Column()
        for v in range(each):
            slow = SlowMap(case.family, {view.across.name: float(values[number][v])})
            twin = OrbitTwin(slow, [axis_of(view.up, ROWS)], case.rules)
            for s, start in enumerate(case.begins()):
                column.add(twin, twin.orbit(start, key(number, v, s)))
        columns.append(column)
    return columns


@pytest.mark.parametrize(
    ("name", "lanes"),
    [*((name, 7) for name in COLUMNS_OF), ("pattern", 1), ("pattern", 32)],
)
def test_columns_equal_those_of_the_slow_twin(name: str, lanes: int) -> None:
    case = COLUMNS_OF[name]
    counter = OrbitCounter(case.family, case.view, COLUMNS, ROWS, case.rules, starts=case.begin, lanes=lanes)
    for first, last in ((0, 2), (2, COLUMNS)):
        counted = counter.count(first, last)
        counted.strip.check()
        slow = slow_columns(name)[first:last]
        assert counted.on_repelling == sum(column.on_repelling for column in slow)
        for at, expected in enumerate(slow):
            cells = np.zeros(ROWS, np.uint32)
            for cell, number in expected.cells.items():
                cells[cell] = number
            np.testing.assert_array_equal(counted.strip.counts[at], cells, err_msg=f"column {first + at}")
            for kind in KINDS:
                assert getattr(counted.strip, kind)[at] == getattr(expected, kind), (first + at, kind)


@cache
def slow_portrait(name: str) -> tuple[Counter[tuple[int, ...]], Counter[str]]:
    """Return the counts of cells (row, column), the surroundings included, and of what befell orbits."""
    case = PORTRAITS[name]
    axes = [axis_of(case.view.up, ROWS), axis_of(case.view.across, COLUMNS)]
    twin = OrbitTwin(SlowMap(case.family, {}), axes, case.rules)
    cells: Counter[tuple[int, ...]] = Counter()
    kinds: Counter[str] = Counter()
    for s, start in enumerate(case.begins()):
        orbit = twin.orbit(start, key(0, 0, s))
        cells.update(twin.cells(x) for x in orbit.states)
        for kind in ("escaped", "unsettled", "collapsed", "on_repelling"):
            kinds[kind] += getattr(orbit, kind)
    return cells, kinds


@pytest.mark.parametrize("name", PORTRAITS)
def test_portraits_equal_those_of_the_slow_twin(name: str) -> None:
    case = PORTRAITS[name]
    counter = PortraitCounter(case.family, case.view, COLUMNS, ROWS, case.rules, starts=case.begin, lanes=7)
    assert counter.copies == 1, "a copy would start elsewhere"
    room = counter.room()
    outcome = counter.count(0, len(case.starts), room)
    table = room[: counter.cells].reshape(COLUMNS + 2, ROWS + 2)
    cells, kinds = slow_portrait(name)
    expected = np.zeros_like(table)
    for (row, column), number in cells.items():
        expected[column, row] = number
    np.testing.assert_array_equal(table, expected)
    for kind in ("escaped", "unsettled"):
        assert getattr(outcome, kind) == kinds[kind] * case.rules.samples
    assert (outcome.collapsed, outcome.on_repelling) == (kinds["collapsed"], kinds["on_repelling"])


def test_the_cases_meet_every_decision() -> None:
    met = {kind for name in COLUMNS_OF for kind in KINDS if any(getattr(c, kind) for c in slow_columns(name))}
    met |= {"on repelling"} if any(c.on_repelling for n in COLUMNS_OF for c in slow_columns(n)) else set()
    assert met == {*KINDS, "on repelling"}
    befell = sum((slow_portrait(name)[1] for name in PORTRAITS), Counter())
    assert set(befell) >= {"escaped", "collapsed", "on_repelling"}
