"""Cycles of the skew tent map with offset, the normal form of a border collision, from exact formulas.

For 0 < a < 1 and mu > 0 a cycle of n points, one of them above the border, attracts for
-1/a^(n-1) < b < -(1 - a^(n-1)) / ((1 - a) a^(n-2)). Sources: Nusse & Yorke 1992, Physica D 57, 39; Banerjee
et al. 2000, IEEE Trans. Circuits Syst. I 47, 389 (citations from memory); derived anew, exact algebra.
"""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest

from tests.reference.published import ids, published
from tests.world.views import Interval, around, at, counted, expected_counts, outside, values_of

UP = ("x", -8, 2)


def cycle(a: Fraction, b: Fraction, mu: Fraction, period: int) -> list[Fraction]:
    """Return the cycle with one point above the border, in exact arithmetic."""
    slope, offset = b, mu
    for _ in range(period - 1):
        slope, offset = a * slope, a * offset + mu
    x = offset / (1 - slope)
    points = [x]
    for _ in range(period - 1):
        x = a * x + mu if x <= 0 else b * x + mu
        points.append(x)
    assert (a * x + mu if x <= 0 else b * x + mu) == points[0]
    assert [point > 0 for point in points] == [True] + [False] * (period - 1)
    return points


def stable_slopes(name: str) -> tuple[Fraction, int, Fraction, Fraction]:
    """Return a, the period and the ends of the interval of b of a record, after checking the formula."""
    record = published(name)
    a, n = Fraction(str(record.parameters["a"])), int(record.parameters["n"])
    low, high = record.number(0), record.number(1)
    assert low == -1 / a ** (n - 1)
    assert high == -(1 - a ** (n - 1)) / ((1 - a) * a ** (n - 2))
    return a, n, low, high


@pytest.mark.parametrize("name", ids("bc.a0."))
def test_cycles_lie_in_their_pixels_all_over_their_interval(name: str) -> None:
    """Every sample of every column lies in the cell of a point of the exact cycle."""
    a, period, low, high = stable_slopes(name)
    rows, samples = 1013, 60 * period
    inset = (high - low) / 50
    across = ("b", low + inset, high - inset)
    made = counted(
        "skew_tent", across, up=UP, size=(80, rows), set={"a": a}, transient=30_000, samples=samples
    )
    points = [[cycle(a, b, Fraction(1), period) for b in values] for values in values_of(across, 80, 4)]
    inside, below, above = expected_counts(UP, rows, points, samples)
    np.testing.assert_array_equal(made.counts, inside)
    np.testing.assert_array_equal(made.below, below)
    np.testing.assert_array_equal(made.above, above)
    assert not made.unsettled.any()


@pytest.mark.parametrize("name", ids("bc.a0."))
def test_intervals_of_the_slope_begin_and_end_in_the_right_column(name: str) -> None:
    """Outside of its interval the cycle of n is no attractor; what is there is chaos, or the fixed point."""
    a, period, low, high = stable_slopes(name)
    for edge, inwards in ((low, 1), (high, -1)):
        made = counted(
            "skew_tent",
            around("b", edge + Fraction(1, 3000), Fraction(1, 100)),
            up=UP,
            size=(9, 20_000),
            set={"a": a},
            values_per_column=1,
            transient=30_000,
            samples=20_000,
        )
        occupied = (made.counts.values > 0).sum(axis=0)[::inwards].tolist()
        assert occupied[5:] == [period] * 4
        if edge == -1:  # -1 < b: the fixed point mu / (1 - b) attracts (record bc.fixed)
            assert occupied[:4] == [1] * 4
        else:
            assert min(occupied[:4]) > 10 * period


@pytest.mark.parametrize("b", ["-0.9", "-0.3", "0.4"])
def test_the_fixed_point_above_the_border(b: str) -> None:
    """For mu > 0 it is mu / (1 - b), stable for -1 < b < 1; source: exact algebra (record bc.fixed)."""
    up: Interval = ("x", -1, 2)
    made = at("skew_tent", "b", b, up=up, rows=997, samples=50)
    inside, _, _ = expected_counts(up, 997, [[[1 / (1 - Fraction(b))]]], 50)
    np.testing.assert_array_equal(made.counts, inside)


@pytest.mark.parametrize("b", ["-0.9", "-2.5", "-3.5"])
def test_the_fixed_point_below_the_border_attracts_while_the_offset_is_negative(b: str) -> None:
    """For mu < 0 it is mu / (1 - a), whatever b is, if |a| < 1; source: exact algebra (record bc.fixed)."""
    across = ("mu", "-1.013", "-0.217")
    up: Interval = ("x", -3, 1)
    made = counted("skew_tent", across, up=up, size=(50, 997), set={"b": b}, starts=["-0.5"], samples=50)
    points = [[[mu / (1 - Fraction(1, 2))] for mu in values] for values in values_of(across, 50, 4)]
    np.testing.assert_array_equal(made.counts, expected_counts(up, 997, points, 50)[0])


def test_the_attractor_grows_in_proportion_to_the_offset() -> None:
    """The picture across mu is a cone from mu = 0 (record bc.fixed, exact algebra): period 3 at b = -3.5."""
    across = ("mu", "0.0113", "2.017")
    up: Interval = ("x", -6, 2)
    made = counted("skew_tent", across, up=up, size=(60, 2011), set={"b": "-3.5"}, transient=5000, samples=60)
    a, b = Fraction(1, 2), Fraction("-3.5")
    points = [[cycle(a, b, mu, 3) for mu in values] for values in values_of(across, 60, 4)]
    np.testing.assert_array_equal(made.counts, expected_counts(up, 2011, points, 60)[0])


def test_between_period_2_and_period_3_there_is_chaos_without_windows() -> None:
    """Robust chaos at a = 0.5, -3 < b < -2 (record bc.chaos.a: common practice, no source)."""
    made = counted(
        "skew_tent", ("b", "-2.98", "-2.02"), up=UP, size=(100, 2000), values_per_column=1, samples=50_000
    )
    assert (made.counts.values > 0).sum(axis=0).min() > 30
    assert made.attrs["samples_filled_by_repeats"] == 0
    assert outside(made) == 0
