"""Fates of orbits against their slow twin: every decision, and every number that goes with it."""

from __future__ import annotations

import tracemalloc
from dataclasses import dataclass, field
from functools import cache
from typing import Any

import numpy as np
import pytest

from atlas.families.catalogue import family
from atlas.families.map_family import Family
from atlas.families.reader import family_from_config
from atlas.planes.fates import FATES, FIXED_POINT, PERIODIC
from atlas.planes.finder import FateFinder, Region
from atlas.planes.pixels import FateRules, Pixels
from atlas.planes.turns import rotation
from tests.reference.fates import FateTwin, Found
from tests.reference.orbits import key
from tests.reference.slow_maps import SlowMap
from tiles.number import exact
from tiles.window import View

COLUMNS, ROWS = 7, 5
USUAL = FateRules(150, 96, 700, 16)
WHOLE = Region(0, COLUMNS, 0, ROWS)


@dataclass(frozen=True)
class Case:
    """A small plane."""

    family: Family
    across: tuple[Any, ...]
    up: tuple[Any, ...]
    rules: FateRules = USUAL
    start: dict[str, str] = field(default_factory=dict)
    word: tuple[str, ...] = ()
    number: int = 0

    @property
    def turns(self) -> bool:
        """Whether orbits have rotation numbers."""
        return len(self.family.states) > 1 or any(state.wrap for state in self.family.states)

    def finder(self, lanes: int = 64) -> FateFinder:
        """Return what finds its fates."""
        mapped = self.family.with_patterns({"r": self.word}) if self.word else self.family
        starts = [{}, {name: exact(value) for name, value in self.start.items()}]
        return FateFinder(
            mapped, View(self.across, self.up), COLUMNS, ROWS, self.rules, starts=starts, lanes=lanes
        )

    def found(self, region: Region = WHOLE, lanes: int = 64) -> Pixels:
        """Return the fates of a region, as kernels find them."""
        return self.finder(lanes).find(region, start=1)


TENT = family_from_config(
    "tent_pair",
    {
        "state": {"x": {"start": "0.3"}, "y": {"start": "0.3"}},
        "parameters": {"mu": {"default": "2"}, "b": {"default": "0.5"}},
        "step": {"x": "mu * min(x, 1 - x)", "y": "b * y"},
    },
)
HUNTED = family_from_config(
    "hunted",
    {
        "state": {"n": {"start": "0.2"}, "m": {"start": "0.2"}},
        "parameters": {"r": {"default": "2"}, "s": {"default": "1"}},
        "step": {"n": "r * n * (1 - n)", "m": "s * m * (1 - m / 2)"},
        "extinct": {"m": "1e-3"},
        "escape": "100",
    },
)
SPINNING = family_from_config(
    "spinning",
    {
        "state": {"x": {"start": "0.3"}, "y": {"start": "0.1"}, "z": {"start": "0.2"}},
        "parameters": {"r": {"default": "2"}, "b": {"default": "0.3"}},
        "step": {"x": "r * x * (1 - y)", "y": "x", "z": "b * z + x * y"},
        "escape": "1000",
    },
)
CASES = {
    "logistic": Case(family("logistic"), ("r", "2.9", "4.1"), ("x", 0, 1)),
    "slow": Case(family("logistic"), ("r", "2.99", "3.005"), ("x", "0.1", "0.9")),
    "slow then met": Case(
        family("logistic"), ("r", "2.9", "3.1"), ("x", "0.1", "0.9"), FateRules(20, 64, 5000, 16)
    ),
    "windows": Case(
        family("logistic"), ("r", "3.82", "3.86"), ("x", "0.1", "0.9"), FateRules(40, 64, 3000, 32)
    ),
    "passing": Case(
        family("logistic"), ("r", "3.82838", "3.82843"), ("x", "0.1", "0.9"), FateRules(80, 64, 3000, 6)
    ),
    "dying out": Case(family("logistic"), ("r", "0.9", "1.1"), ("x", 0, 1)),
    "full height": Case(
        family("logistic"), ("r", "3.9999999", "4.0000001"), ("x", 0, 1), FateRules(60, 300, 500, 16)
    ),
    "no transient": Case(family("logistic"), ("r", "2.5", "4"), ("x", 0, 1), FateRules(0, 64, 300, 8)),
    "repelling start": Case(family("logistic"), ("r", "3", "4"), ("x", "-0.2", "0.2")),
    "lingering": Case(
        family("quadratic"), ("c", "0.2503", "0.253"), ("x", "0.1", "0.49"), FateRules(200, 64, 900, 100)
    ),
    "quadratic": Case(family("quadratic"), ("c", "-2.1", "0.3"), ("x", "-2", "2")),
    "forced AB": Case(family("forced_logistic"), ("a", "2.8", "4"), ("b", "2.8", "4")),
    "forced AAB": Case(family("forced_logistic"), ("a", "2.8", "4"), ("b", "2.8", "4"), word=("a", "a", "b")),
    "henon": Case(family("henon"), ("a", "0.2", "1.5"), ("b", "0.1", "0.4")),
    "henon long batches": Case(
        family("henon"), ("a", "0.9", "1.4"), ("b", "0.2", "0.3"), FateRules(64, 640, 900, 8)
    ),
    "lozi": Case(family("lozi"), ("a", "0.5", "1.8"), ("b", "0.1", "0.6")),
    "delayed logistic": Case(
        family("delayed_logistic"), ("r", "1.5", "2.4"), ("x", "0.3", "0.6"), FateRules(150, 320, 700, 16)
    ),
    "circle": Case(family("circle"), ("Omega", 0, 1), ("K", 0, 3)),
    "collapse": Case(TENT, ("mu", "1.9", "2.1"), ("b", "-0.5", "0.5"), start={"x": "0.7", "y": "0.1"}),
    "extinct": Case(HUNTED, ("r", "2.5", "4.2"), ("s", "0.4", "4.5")),
    "three states": Case(SPINNING, ("r", "1.6", "2.4"), ("b", "0.1", "0.9"), FateRules(150, 128, 500, 12)),
}


@cache
def slow_fates(name: str) -> list[tuple[Found, float]]:
    """Return what the twin says of every pixel and its rotation number, column by column."""
    case = CASES[name]
    finder = case.finder()
    view, family_ = finder.view, finder.family
    across, up = view.across.values(COLUMNS, 1).reshape(-1), view.up.values(ROWS, 1).reshape(-1)
    found = []
    for column in range(COLUMNS):
        for row in range(ROWS):
            given = {name: exact(value) for name, value in case.start.items()}
            start = {state.name: float(given.get(state.name, state.start)) for state in family_.states}
            along = {view.across.name: float(across[column]), view.up.name: float(up[row])}
            begin = tuple(along.pop(name, value) for name, value in start.items())
            twin = FateTwin(SlowMap(family_, along), case.rules, finder.low.tolist())
            fate = twin.of(begin, key(column, row, 1))
            found.append((fate, twin.rotation(fate)))
    return found


def check(name: str, at: int, slow: Found, quick: Pixels, m: int) -> None:
    """Compare one orbit of the kernels with what its twin says."""
    where = f"{name}, pixel {divmod(at, ROWS)}"
    assert FATES[quick.fate[m]] == FATES[slow.fate], where
    for what in ("period", "collapsed", "repelling"):
        assert getattr(quick, what)[m] == getattr(slow, what), (where, what)
    cyclic = slow.fate in (FIXED_POINT, PERIODIC)
    if cyclic:
        assert quick.turn[m] == slow.turn, where
    # Of cycles the twin takes eigenvalues of the exact product; the rest is equal to the last bit.
    np.testing.assert_allclose(
        quick.exponents[:, m], slow.exponents, rtol=0, atol=1e-8 if cyclic else 0, err_msg=where
    )
    np.testing.assert_equal(quick.error[m], slow.error, err_msg=where)
    np.testing.assert_equal(quick.escape[m], slow.escape, err_msg=where)
    np.testing.assert_array_equal(quick.x[:, m], slow.x, err_msg=where)


@pytest.mark.parametrize(
    ("name", "lanes"),
    [
        *((name, 64) for name in CASES),
        *((name, lanes) for name in ("logistic", "windows", "lozi") for lanes in (1, 7)),
    ],
)
def test_fates_equal_those_of_the_slow_twin(name: str, lanes: int) -> None:
    quick = CASES[name].found(lanes=lanes)
    for at, (slow, _) in enumerate(slow_fates(name)):
        check(name, at, slow, quick, at)


@pytest.mark.parametrize("name", CASES)
def test_fates_do_not_depend_on_the_pixels_side_by_side(name: str) -> None:
    slow = slow_fates(name)
    for region in (
        Region(0, 1, 0, 1),
        Region(0, 3, 0, ROWS),
        Region(3, COLUMNS, 0, 2),
        Region(5, 6, 2, ROWS),
    ):
        quick = CASES[name].found(region)
        for m in range(quick.fate.size):
            column, row = divmod(m, region.shape[1])
            at = (region.left + column) * ROWS + region.low + row
            check(name, at, slow[at][0], quick, m)


@pytest.mark.parametrize("name", [name for name, case in CASES.items() if case.turns])
def test_rotation_numbers_equal_those_of_the_slow_twin(name: str) -> None:
    finder = CASES[name].finder()
    quick = rotation(finder.find(WHOLE, start=1), finder.winding)
    np.testing.assert_allclose(quick, [turns for _, turns in slow_fates(name)], rtol=0, atol=1e-11)


def test_the_cases_meet_every_decision() -> None:
    met = set()
    for name in CASES:
        for slow, _ in slow_fates(name):
            met |= {FATES[slow.fate], *slow.ways}
            met |= {"collapsed"} if slow.collapsed else set()
            met |= {"repelling start"} if slow.repelling else set()
    ways = {"approaching", "approached, then met", "approached, then unsettled", "measured anew"}
    ways |= {"near a repelling cycle", "tests disagree", "collapsed", "repelling start"}
    assert met >= {*FATES, *ways}


def test_orbits_that_linger_and_then_escape_are_no_fixed_points() -> None:
    assert {FATES[fate] for fate in CASES["lingering"].found().fate} == {"escapes"}


def test_a_cycle_of_period_2_makes_half_a_turn_a_step_about_its_mean() -> None:
    finder = CASES["lozi"].finder()
    found = finder.find(WHOLE, start=1)
    turns = rotation(found, finder.winding)[found.period == 2]
    assert turns.size > 3
    assert set(turns) == {0.5}


def test_the_slow_map_computes_what_its_formulas_say() -> None:
    a, b, x, y = 1.37, 0.29, 0.6180339887, -0.21
    henon = SlowMap(family("henon"), {"a": a, "b": b})
    assert henon.step((x, y), 5) == (1 - a * (x * x) + y, b * x)
    assert henon.jacobian((x, y), 0)[0][1] == 1.0
    assert henon.jacobian((x, y), 0)[1] == [b, 0.0]
    np.testing.assert_allclose(henon.jacobian((x, y), 0)[0][0], -2 * a * x, rtol=1e-15)
    forced = SlowMap(family("forced_logistic"), {"a": 3.1, "b": 3.7})
    assert [forced.step((0.3,), time)[0] for time in range(3)] == [
        r * 0.3 * (1 - 0.3) for r in (3.1, 3.7, 3.1)
    ]
    turning = SlowMap(family("circle"), {"Omega": 0.75, "K": 0.0})
    assert (turning.lift((0.5,), 0), turning.step((0.5,), 0)) == ((1.25,), (0.25,))
    assert turning.distance((0.9375,), (0.0625,)) == 0.125


def test_rotation_numbers_do_not_depend_on_how_long_kernels_run(monkeypatch: pytest.MonkeyPatch) -> None:
    for name in ("circle", "lozi", "delayed logistic"):
        finder = CASES[name].finder()
        found = finder.find(WHOLE, start=1)
        whole = rotation(found, finder.winding)
        assert np.isfinite(whole).any()
        monkeypatch.setattr("atlas.planes.turns.STEPS_AT_ONCE", 7 * found.fate.size)
        np.testing.assert_array_equal(rotation(found, finder.winding), whole)
        monkeypatch.undo()


def test_rotation_numbers_of_long_runs_hold_no_weights_of_every_step() -> None:
    finder = FateFinder(
        family("circle"), View(("Omega", "0.31", "0.32"), ("K", "0.5", "0.6")), 1, 1, FateRules(64, 10**6)
    )
    found = finder.find(Region(0, 1, 0, 1))
    assert FATES[found.fate[0]] == "quasi-periodic"
    turns = rotation(found, finder.winding)  # what is compiled now is not compiled below
    tracemalloc.start()
    np.testing.assert_array_equal(rotation(found, finder.winding), turns)
    _, peak = tracemalloc.get_traced_memory()
    tracemalloc.stop()
    assert peak < 1 << 20
    assert 0.305 < turns[0] < 0.31


def test_rotation_numbers_end_early_when_they_are_told_to(monkeypatch: pytest.MonkeyPatch) -> None:
    finder = CASES["circle"].finder()
    found = finder.find(WHOLE, start=1)
    calls = []
    monkeypatch.setattr(found.kernels, "turning", lambda *given: calls.append(given))
    found.stop[0] = 1
    rotation(found, finder.winding)
    assert not calls
