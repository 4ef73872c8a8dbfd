"""Following an attractor along a parameter: against the slow twin, bit for bit, and against exact folds."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray

from atlas.families.catalogue import family
from atlas.families.reader import Family, family_from_config
from atlas.orbits.follow import Follower, count_followed
from atlas.orbits.histogram import Histogram
from atlas.orbits.orbit import OrbitCounter, Rules, Stopped
from atlas.orbits.schedule import schedule
from tests.reference.followed import FollowingTwin
from tests.reference.orbits import key
from tests.reference.published import published
from tiles.number import exact
from tiles.window import View


def _family(name: str, step: str, parameters: dict[str, str], start: str = "0.3") -> Family:
    return family_from_config(
        name,
        {
            "state": {"x": {"start": start}},
            "parameters": {one: {"default": value} for one, value in parameters.items()},
            "step": {"x": step},
            "escape": "1000",
        },
    )


CUSP = _family("cusp", "a + b * x - x * x * x", {"a": "0", "b": "1.8"}, "0.1")
SUBCRITICAL = _family("subcritical", "m * x + x * x * x - x * x * x * x * x", {"m": "1"})
MAPS: dict[str, tuple[Family, Any, Any]] = {
    "cusp": (CUSP, lambda x, a: a + 1.8 * x - x * x * x, lambda x, a: 1.8 - 3.0 * x * x),
    "subcritical": (
        SUBCRITICAL,
        lambda x, m: m * x + x * x * x - x * x * x * x * x,
        lambda x, m: m + 3.0 * x * x - 5.0 * x * x * x * x,
    ),
    "logistic": (family("logistic"), lambda x, r: r * x * (1.0 - x), lambda x, r: r * (1.0 - 2.0 * x)),
    "tent": (
        family("tent"),
        lambda x, mu: mu * min(x, 1.0 - x),
        lambda x, mu: mu if x < 1.0 - x else -mu,
    ),
    "quadratic": (family("quadratic"), lambda x, c: x * x + c, lambda x, c: 2.0 * x),
}
CASES: dict[str, tuple[str, tuple[str, str, str], tuple[str, str, str], Rules, tuple[float, ...]]] = {
    "folds": ("cusp", ("a", "-0.8", "0.8"), ("x", "-2", "2"), Rules(50, 3000, 40, 2, 8), (0.1, -0.4)),
    "subcritical": (
        "subcritical",
        ("m", "0.6", "1.2"),
        ("x", "-1.2", "1.2"),
        Rules(60, 3000, 600, 2, 8),
        (0.3,),
    ),
    "cascade": ("logistic", ("r", "2.9", "4"), ("x", "0", "1"), Rules(100, 3000, 700, 2, 16), (0.3, 0.7)),
    "slow": ("logistic", ("r", "2.99", "3.01"), ("x", "0.6", "0.7"), Rules(99, 800, 64, 1, 8), (0.3,)),
    "escapes": ("logistic", ("r", "3.9", "4.2"), ("x", "0", "1"), Rules(20, 500, 700, 2, 16), (0.3,)),
    "extinction": ("logistic", ("r", "0.2", "1.8"), ("x", "0", "1"), Rules(400, 3000, 64, 2, 8), (0.3, 0.0)),
    "collapse": ("tent", ("mu", "0.5", "3.5"), ("x", "0", "1"), Rules(100, 1000, 300, 1, 16), (0.3,)),
    "crisis": ("quadratic", ("c", "-2.1", "0.3"), ("x", "-2", "2"), Rules(40, 500, 200, 3, 16), (0.5, 0.0)),
    "no transient": ("logistic", ("r", "3.5", "3.9"), ("x", "0", "1"), Rules(0, 500, 33, 2, 16), (0.3,)),
}
COLUMNS, ROWS = 23, 37


def _counter(case: str, lanes: int = 64) -> OrbitCounter:
    name, across, up, rules, starts = CASES[case]
    begin = [{"x": exact(repr(start))} for start in starts]
    return OrbitCounter(MAPS[name][0], View(across, up), COLUMNS, ROWS, rules, starts=begin, lanes=lanes)


@pytest.mark.parametrize("case", CASES)
@pytest.mark.parametrize("direction", ["up", "down"])
def test_a_sweep_equals_the_slow_twin(case: str, direction: str) -> None:
    name, _, _, rules, starts = CASES[case]
    counter = _counter(case)
    own, step, slope = MAPS[name]
    edges = counter.view.up.edges(ROWS)
    twin = FollowingTwin(step, slope, float(own.escape), edges, 0.5 * counter.view.up.cell_size(ROWS))
    values = counter.view.across.values(COLUMNS, rules.values_per_column)
    expected = twin.sweep(values.tolist(), starts, rules, down=direction == "down")
    seen = []
    for width in (5, 64):
        for counted in Follower(counter, direction).strips(width=width):
            strip = counted.strip
            strip.check()
            for at, counts in enumerate(strip.counts):
                column = expected[strip.first + at]
                cells = np.zeros(ROWS, np.uint32)
                for cell, number in column.cells.items():
                    cells[cell] = number
                np.testing.assert_array_equal(counts, cells, err_msg=f"column {strip.first + at}")
                for kind in ("below", "above", "escaped", "unsettled", "collapsed"):
                    assert getattr(strip, kind)[at] == getattr(column, kind), (strip.first + at, kind)
                seen.append(strip.first + at)
    assert sorted(seen) == sorted(2 * list(range(COLUMNS)))


def test_the_cases_meet_every_decision() -> None:
    met = set()
    for case in CASES:
        for direction in ("up", "down"):
            for counted in Follower(_counter(case), direction).strips():
                met |= {k for k in ("escaped", "unsettled", "collapsed") if getattr(counted.strip, k).any()}
                met |= {"filled"} if counted.filled else set()
                met |= {"on repelling"} if counted.on_repelling else set()
    assert met == {"escaped", "unsettled", "collapsed", "filled", "on repelling"}


@pytest.mark.parametrize("lanes", [1, 7])
@pytest.mark.parametrize("case", ["folds", "collapse"])
def test_the_lanes_do_not_matter(case: str, lanes: int) -> None:
    assert _swept(_counter(case, lanes))["up"].digest() == _swept(_counter(case))["up"].digest()


def _swept(counter: OrbitCounter, follow: str = "both", workers: int = 1) -> dict[str, Histogram]:
    with schedule(workers) as opened:
        return count_followed(counter, follow, opened)


def test_neither_workers_nor_the_other_sweep_matter() -> None:
    counter = _counter("cascade")
    one, seven = _swept(counter), _swept(counter, workers=7)
    assert list(one) == ["up", "down"]
    for direction, histogram in one.items():
        assert histogram.digest() == seven[direction].digest()
        assert histogram.digest() == _swept(counter, direction)[direction].digest()


def test_progress_is_told_of_every_sample_and_the_stop_flag_is_heard() -> None:
    counter, told = _counter("cascade"), list[int]()
    with schedule(1) as opened:
        count_followed(counter, "both", opened, told.append)
    assert sum(told) == 2 * COLUMNS * counter.exposure
    with pytest.raises(Stopped):
        next(Follower(counter, "up").strips(stop=np.ones(1, np.uint8)))


# Hysteresis


def _centres(histogram: Histogram, view: View) -> NDArray[np.float64]:
    """Return the mean state of every column."""
    counts = histogram.strip.counts.astype(float)
    found: NDArray[np.float64] = counts @ view.up.centres(counts.shape[1]) / counts.sum(axis=1)
    return found


def test_jumps_lie_at_the_folds_of_the_cusp() -> None:
    assert published("cus.fold").value == "27 a^2 = 4 (b-1)^3"
    fold = (4 * 0.3**3 / 27) ** 0.5
    view = View(("a", "-0.15", "0.15"), ("x", "-1.2", "1.2"))
    rules = Rules(500, 100_000, 50, 1)
    counter = OrbitCounter(CUSP, view, 300, 200, rules, set={"b": exact("1.3")})
    sweeps = _swept(counter)
    a = view.across.centres(300)
    up, down = (_centres(sweeps[direction], view) for direction in ("up", "down"))
    np.testing.assert_allclose(up[[0, -1]], down[[0, -1]], atol=1e-12)
    rises = a[1:][np.diff(up) > 0.3]
    falls = a[:-1][np.diff(down) > 0.3]
    assert rises.size == falls.size == 1
    assert fold < rises[0] < fold + 0.002
    assert -fold - 0.002 < falls[0] < -fold
    between = np.abs(a) < fold - 0.001
    assert (up[between] < down[between] - 0.3).all()


def test_a_subcritical_branch_is_left_at_the_fold_and_entered_at_the_loss_of_stability() -> None:
    # x = 0 loses stability at m = 1; x^2 = (1 + sqrt(1 - 4 (1 - m))) / 2 folds at m = 3/4 (exact algebra)
    view = View(("m", "0.6", "1.2"), ("x", "-1.3", "1.3"))
    start = [{"x": exact("1e-3")}]
    counter = OrbitCounter(SUBCRITICAL, view, 300, 401, Rules(1000, 100_000, 50, 1), starts=start)
    sweeps = _swept(counter)
    m = view.across.centres(300)
    up, down = (np.abs(_centres(sweeps[direction], view)) for direction in ("up", "down"))
    assert m[up > 0.5].min() == pytest.approx(1.0, abs=0.0041)
    assert m[down > 0.5].min() == pytest.approx(0.75, abs=0.0041)
    assert (up[m > 1.01] > 0.9).all()
    assert (up[m < 0.995] < 0.01).all()


def test_a_state_that_underflowed_to_zero_leaves_it_when_zero_repels() -> None:
    view = View(("r", "0.2", "1.8"), ("x", 0, "0.5"))
    counter = OrbitCounter(family("logistic"), view, 160, 50, Rules(1000, 100_000, 20, 1))
    up = _centres(_swept(counter, "up")["up"], view)
    r = view.across.centres(160)
    np.testing.assert_allclose(up[r > 1.03], 1 - 1 / r[r > 1.03], atol=0.006)


def test_an_extinct_predator_comes_back_when_it_can_invade_chaotic_prey() -> None:
    wild = family_from_config(
        "wild",
        {
            "state": {"n": {"start": "0.4"}, "p": {"start": "0.2"}},
            "parameters": {"g": {"default": "1"}},
            "step": {"n": "3.9 * n * (1 - n) / (1 + 0.1 * p)", "p": "g * p * n / (1 + 0.5 * p)"},
            "escape": "1000",
        },
    )
    view = View(("g", "0.2", "3.2"), ("p", 0, 4))
    counter = OrbitCounter(wild, view, 75, 80, Rules(1000, 2000, 200, 1))
    up = _centres(_swept(counter, "up")["up"], view)
    fresh = _centres(Histogram(counter.count(0, 75).strip, 200, 0, 0), view)
    g = view.across.centres(75)
    assert (up[g < 1.9] < 0.03).all()
    np.testing.assert_allclose(up[g > 2.1], fresh[g > 2.1], atol=0.05)


# Several variables, observables, records, patterns


def test_observables_of_two_variables_are_followed() -> None:
    henon = family_from_config(
        "henon",
        {
            "state": {"x": {"start": "0.1"}, "y": {"start": "0.1"}},
            "parameters": {"a": {"default": "1.4"}},
            "step": {"x": "1 - a * x * x + y", "y": "0.3 * x"},
            "observables": {"sum": "x + y"},
            "escape": "1000",
        },
    )
    view = View(("a", "1.35", "1.4"), ("sum", "-2", "2"))
    counter = OrbitCounter(henon, view, 7, 40, Rules(100, 100, 300, 2))
    strip = _swept(counter, "down")["down"].strip
    values, edges = view.across.values(7, 2), view.up.edges(40)
    expected = np.zeros((7, 40), np.uint32)
    for v in range(2):
        x = y = 0.1
        for column in reversed(range(7)):
            a = values[column, v]
            for n in range(400):
                x, y = 1.0 - a * x * x + y, 0.3 * x
                if n >= 100:
                    expected[column, np.searchsorted(edges, x + y, "right") - 1] += 1
    np.testing.assert_array_equal(strip.counts, expected)


@pytest.mark.parametrize(("every", "phase", "transient"), [(1, 0, 101), (4, 3, 100), (3, 1, 50)])
def test_columns_begin_with_a_pattern_and_a_record(every: int, phase: int, transient: int) -> None:
    forced = family("forced_logistic")
    view = View(("a", "3.7", "3.8"), ("x", 0, 1))
    rules = Rules(transient, transient, 90, 1, every=every, phase=phase)
    counter = OrbitCounter(forced, view, 9, 30, rules, set={"b": exact("3.9")})
    (strip,) = (one.strip for one in Follower(counter, "up").strips())
    assert strip.unsettled.sum() == strip.collapsed.sum() == 0
    edges, values = view.up.edges(30), view.across.values(9, 1)[:, 0]
    expected = np.zeros((9, 30), np.uint32)
    settled = transient + (phase - transient) % every
    x = float(forced.states[0].start)
    for column in range(9):
        counted = n = 0
        while counted < 90 or n % (2 * every):
            x = (values[column] if n % 2 == 0 else 3.9) * x * (1.0 - x)
            n += 1
            if n > settled and n % every == phase and counted < 90:
                expected[column, np.searchsorted(edges, x, "right") - 1] += 1
                counted += 1
    np.testing.assert_array_equal(strip.counts, expected)


def test_keys_are_those_of_columns_that_are_not_followed() -> None:
    counter = _counter("cascade")
    assert counter.orbits(3, 4).key.tolist() == [key(3, v, s) for v in range(2) for s in range(2)]
