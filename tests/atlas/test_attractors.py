"""Attractors of a parameter plane counted pixel by pixel, and densities split by attractor."""

from __future__ import annotations

from functools import partial
from typing import Any

import numpy as np
import pytest

from atlas.attractors.by_start import StartSorter, attractor_numbers
from atlas.attractors.per_pixel import attractor_counts
from atlas.attractors.split_counts import SplitCounts, split_histogram, split_portrait
from atlas.families.catalogue import family
from atlas.families.reader import family_from_config
from atlas.orbits.block import Rules
from atlas.orbits.histogram import count_histogram
from atlas.orbits.orbit import OrbitCounter
from atlas.orbits.portrait import PortraitCounter
from atlas.orbits.portrait_counts import count_portrait
from atlas.orbits.schedule import schedule
from atlas.planes.finder import FateFinder, Region
from atlas.planes.pixels import FateRules
from tests.atlas.basin_cases import RULES, finder
from tests.reference.attractors import ESCAPED, State, sorted_starts
from tiles.number import exact
from tiles.window import View

CUBIC = family_from_config(
    "odd_cubic",
    {
        "state": {"x": {"start": "0.1"}},
        "parameters": {"a": {"default": "0"}, "b": {"default": "1.5"}},
        "step": {"x": "a + b * x - x**3"},
        "escape": "1e6",
    },
    where="tests",
)
FORCED = family("forced_logistic")
BURGERS = family("burgers")
FOLD = 2 * (0.5 / 3) ** 1.5
"""Where x -> a + 1.5 x - x**3 loses one of its two stable fixed points."""


def cubic_step(a: float, b: float, state: State) -> State:
    """Return the next state of the odd cubic."""
    (x,) = state
    return (a + b * x - x**3,)


def starts_at(*values: float) -> list[dict[str, Any]]:
    """Return starts of one state variable."""
    return [{"x": exact(value)} for value in values]


EVERYWHERE = starts_at(-1.1, -0.7, -0.3, 0.02, 0.3, 0.7, 1.1)


def test_inside_a_cusp_there_are_two_attractors_and_outside_one() -> None:
    made = finder(CUBIC, ("a", "-0.3", "0.3"), ("b", "1.2", "1.8"), (40, 24), starts=EVERYWHERE)
    counts = attractor_counts(made, Region(0, 40, 0, 24))
    a, b = made.view.across.values(40, 1).reshape(-1), made.view.up.values(24, 1).reshape(-1)
    inside = np.abs(a)[:, None] < 2 * ((b - 1) / 3)[None] ** 1.5
    assert counts.dtype == np.uint16
    assert (counts == np.where(inside, 2, 1)).all()
    assert 2 in counts
    assert 1 in counts


def test_mirrored_chaos_is_two_attractors_until_it_merges() -> None:
    # the image of the maximum 2 (b/3)**(3/2) reaches 0 at b**2 = 27/4; both bands are chaotic beside it
    made = finder(CUBIC, ("a", "-0.01", "0.01"), ("b", "2.56", "2.64"), (1, 4), starts=EVERYWHERE)
    assert attractor_counts(made, Region(0, 1, 0, 4)).tolist() == [[2, 2, 1, 1]]


def test_an_orbit_that_is_slow_to_reach_a_cycle_is_counted_there() -> None:
    # the multiplier of the lower fixed point is -0.9991; the upper one is the other attractor
    made = finder(
        CUBIC, ("a", "-0.1265635", "-0.1265615"), ("b", "1.80312", "1.80313"), (1, 1),
        starts=starts_at(*np.linspace(-1.2, 1.2, 49).round(3).tolist()), rules=FateRules(),
    )  # fmt: skip
    assert attractor_counts(made, Region(0, 1, 0, 1)).tolist() == [[2]]


def test_counts_are_those_of_a_slow_twin_in_any_region() -> None:
    starts = (-1.3, -0.4, 0.2, 0.9, 1.9)
    made = finder(CUBIC, ("a", "-0.4", "0.4"), ("b", "1.3", "2.9"), (7, 6), starts=starts_at(*starts))
    counts = attractor_counts(made, Region(0, 7, 0, 6))
    found = made.find(Region(0, 7, 0, 6)).fate
    assert len(set(found.tolist())) > 2
    a, b = made.view.across.values(7, 1).reshape(-1), made.view.up.values(6, 1).reshape(-1)
    for column in range(7):
        for row in range(6):
            here = (float(a[column]), float(b[row]))
            twin = sorted_starts(
                partial(cubic_step, *here), [(x,) for x in starts], settle=5000, kept=1500, near=2e-3
            )
            different = len(set(twin) - {ESCAPED})
            assert counts[column, row] == different, here
    part = attractor_counts(made, Region(2, 5, 1, 6))
    assert (part == counts[2:5, 1:6]).all()


def test_with_a_pattern_the_same_states_at_other_places_are_another_attractor() -> None:
    starts = starts_at(0.2, 0.3, 0.45, 0.6)
    made = finder(FORCED, ("a", "3.2", "3.3"), ("b", "3.2", "3.3"), (2, 2), starts=starts)
    counts = attractor_counts(made, Region(0, 2, 0, 2))
    assert (counts == 2).all()


def _numbers(low: str, high: str, values: int, starts: Any, workers: int = 1, **options: Any) -> Any:
    made = finder(CUBIC, ("a", low, high), ("x", "-1.5", "1.5"), (values, 10), starts=starts)
    sorter = StartSorter(made, made.view.across.values(values, 1).reshape(-1))
    with schedule(workers) as opened:
        return attractor_numbers(sorter, opened, **options)


def test_numbers_follow_the_branches_through_both_folds() -> None:
    numbers = _numbers("-0.3", "0.3", 300, starts_at(-0.6, 0.6))
    a = -0.3 + (np.arange(300) + 0.5) / 500
    lower, upper = numbers.T
    assert (lower[a < FOLD] == 1).all()
    assert (upper[a < -FOLD] == 1).all()
    assert (upper[a > -FOLD] == 2).all()
    assert (lower[a > FOLD] == 2).all()


def test_numbers_depend_on_neither_workers_nor_groups_of_values(monkeypatch: pytest.MonkeyPatch) -> None:
    whole = _numbers("-0.3", "0.3", 90, EVERYWHERE)
    monkeypatch.setattr("atlas.attractors.by_start.VALUES_AT_ONCE", 13)
    for workers in (1, 2, 7):
        assert (_numbers("-0.3", "0.3", 90, EVERYWHERE, workers) == whole).all()


def test_starts_that_escape_have_no_number_and_further_attractors_share_the_last() -> None:
    numbers = _numbers("-0.1", "0.1", 5, starts_at(-1, 5, 1))
    assert numbers.tolist() == [[1, 0, 2]] * 5
    assert _numbers("-0.1", "0.1", 5, starts_at(-1, 5, 1), most=1).tolist() == [[1, 0, 1]] * 5


def test_an_attractor_keeps_its_number_across_the_seam_of_a_periodic_variable() -> None:
    """Two wells of a circle at s and s + 1/2, of which the second is lost while s goes through 0."""
    wells = family_from_config(
        "two_wells",
        {
            "state": {"t": {"start": "0.9", "wrap": [0, 1]}},
            "parameters": {"q": {"default": "0"}},
            "helpers": {"d": "t - 0.04*q + 0.02"},
            "step": {"t": "t - 0.03*((1.5 - 1.25*q)*sin(4*pi*d) + sin(2*pi*d))"},
        },
        where="tests",
    )
    view = View(("q", "-0.5", "1.5"), ("t", 0, 1))
    made = FateFinder(wells, view, 2, 4, RULES, starts=[{"t": exact("0.9")}, {"t": exact("0.45")}])
    with schedule(1) as opened:
        numbers = attractor_numbers(StartSorter(made, view.across.values(2, 1).reshape(-1)), opened)
    assert numbers.tolist() == [[1, 2], [1, 1]]


def _split(starts: Any, workers: int = 1) -> tuple[OrbitCounter, SplitCounts]:
    view = View(("a", "-0.3", "0.3"), ("x", "-1.5", "1.5"))
    counter = OrbitCounter(CUBIC, view, 60, 50, Rules(300, 5000, 200, 3), set={}, starts=starts)
    with schedule(workers) as opened:
        return counter, split_histogram(counter, RULES, opened)


def test_a_split_density_adds_up_to_the_whole() -> None:
    counter, split = _split(starts_at(-1, 5, 1))
    with schedule(1) as opened:
        whole = count_histogram(counter, opened)
    assert (split.layers.sum(axis=0) == whole.strip.counts).all()
    assert split.escaped == int(whole.strip.escaped.sum()) > 0
    assert split.unsettled == int(whole.strip.unsettled.sum())
    assert int(split.layers.sum()) + split.outside + split.escaped + split.unsettled == split.exposure
    assert split.present == [1, 2]
    assert not split.layers[0].any()
    edges = np.linspace(-1.5, 1.5, 51)
    lower = split.layers[1][:, edges[1:] <= 0].sum()
    assert lower == split.layers[1].sum() > 0
    left = -0.3 + np.arange(61) / 100
    assert not split.layers[1][left[:-1] > FOLD].any()
    assert not split.layers[2][left[1:] < -FOLD].any()
    assert not split.layers[2][:, edges[1:] <= 0].any()


@pytest.mark.parametrize("workers", [2, 7])
def test_split_densities_do_not_depend_on_workers(workers: int) -> None:
    _, one = _split(EVERYWHERE)
    _, other = _split(EVERYWHERE, workers)
    assert (one.layers == other.layers).all()
    assert (one.numbers == other.numbers).all()
    assert (one.escaped, one.unsettled) == (other.escaped, other.unsettled)


def test_a_split_portrait_adds_up_and_its_parts_are_mirror_images() -> None:
    view = View(("x", "-1.3", "0"), ("y", "-0.8", "0.8"))
    starts = [{"x": exact("-0.5"), "y": exact(y)} for y in ("0.3", "-0.3", "9")]
    counter = PortraitCounter(
        BURGERS, view, 40, 30, Rules(500, 5000, 20_000, 1), set={"b": exact("1.55")}, starts=starts
    )
    with schedule(2) as opened:
        split = split_portrait(counter, FateRules(1000, 2000, 20_000, 32), opened)
        whole = count_portrait(counter, opened)
    assert split.numbers.tolist() == [[1, 2, 0]]
    assert (split.layers.sum(axis=0) == whole.counts).all()
    assert (split.escaped, split.unsettled) == (whole.totals["escaped"], whole.totals["unsettled"])
    upper, lower = split.layers[1], split.layers[2]
    assert not upper[:, :15].any()
    assert not lower[:, 15:].any()
    assert np.abs(upper[:, 15:].astype(int) - lower[:, 14::-1]).sum() < 0.1 * upper.sum()
