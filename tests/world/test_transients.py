"""Near a bifurcation transients die out like a power of time; a fixed number of steps smears the picture.

Common practice, no source: 200 steps are usually thrown away. At r = 3 the distance from the fixed point of
the logistic map decays like 1 / sqrt(18 n) (exact algebra: third order of the twice iterated map), so 200
steps leave 0.017, and 10^6 still 2.4e-4.
"""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest
from numpy.typing import NDArray

from tests.world.test_logistic import fixed_point, two_cycle
from tests.world.views import Interval, at, cell_of, counted, values_of

ACROSS: Interval = ("r", "2.9901", "3.0101")
UP: Interval = ("x", "0.6", "0.7301")
COLUMNS, ROWS = 100, 512


def plain_sweep(transient: int, samples: int) -> NDArray[np.int64]:
    """Return the histogram of the usual script: all parameters at once, a fixed transient, then counting."""
    r = np.array([[float(value) for value in values] for values in values_of(ACROSS, COLUMNS, 4)])
    x = np.full(r.shape, 0.3)
    for _ in range(transient):
        x = r * x * (1 - x)
    column = np.broadcast_to(np.arange(COLUMNS)[:, None], r.shape)
    counts = np.zeros((ROWS, COLUMNS), np.int64)
    low, high = float(UP[1]), float(UP[2])
    for _ in range(samples):
        x = r * x * (1 - x)
        cell = np.floor((x - low) / (high - low) * ROWS).astype(int)
        seen = (cell >= 0) & (cell < ROWS)
        np.add.at(counts, (cell[seen], column[seen]), 1)
    return counts


def allowed() -> NDArray[np.bool_]:
    """Return the cells of the attractors of each column, and the cells that touch them."""
    cells = np.zeros((ROWS, COLUMNS), np.bool_)
    for column, values in enumerate(values_of(ACROSS, COLUMNS, 4)):
        for r in values:
            for x in fixed_point(r) if r <= 3 else two_cycle(r):
                middle = cell_of(UP, ROWS, x)
                cells[max(middle - 1, 0) : middle + 2, column] = True
    return cells


def test_the_usual_transient_smears_near_3() -> None:
    """A plain sweep that drops 200 steps draws dozens of cells where there are two branches."""
    smeared = (plain_sweep(200, 1000) > 0) & ~allowed()
    middle = slice(COLUMNS // 2 - 10, COLUMNS // 2 + 10)
    assert smeared[:, middle].sum(axis=0).min() > 20
    assert smeared.sum() > 1000


@pytest.mark.parametrize("transient", [50, 200, 1000])
def test_a_short_transient_is_extended_until_nothing_is_smeared(transient: int) -> None:
    """Only cells that touch the cycle of a value of the column are drawn, whatever transient is asked."""
    made = counted("logistic", ACROSS, up=UP, size=(COLUMNS, ROWS), transient=transient)
    assert not made.counts.values[~allowed()].any()
    assert (made.counts.values > 0).any(axis=0).all()
    unsettled = made.unsettled.values > 0
    assert unsettled.sum() <= 2
    inside = made.counts.values.sum(axis=0)
    np.testing.assert_array_equal(inside + made.unsettled.values, made.exposure.values)


def test_where_the_limit_forbids_it_the_orbits_are_counted_as_unsettled() -> None:
    """With 200 steps and no more, the columns around r = 3 hold nothing that they should not."""
    made = counted("logistic", ACROSS, up=UP, size=(COLUMNS, ROWS), transient=200, transient_limit=200)
    assert not made.counts.values[~allowed()].any()
    unsettled = made.unsettled.values
    middle = COLUMNS // 2
    assert (unsettled[middle - 10 : middle + 10] == made.exposure.values[0]).all()
    assert not made.counts.values[:, middle - 10 : middle + 10].any()
    np.testing.assert_array_equal(made.counts.values.sum(axis=0) + unsettled, made.exposure.values)


def test_at_3_itself_a_million_steps_do_not_reach_a_fine_cell() -> None:
    """x is still 2.4e-4 away: unsettled in a fine view, settled in one of coarser cells than that."""
    third = Fraction(2, 3)
    for reach, settled in (("0.001", False), ("0.3", True)):
        up: Interval = ("x", third - Fraction(reach), third + Fraction(reach))
        made = at("logistic", "r", "3", rows=101, up=up, transient=200, samples=100)
        assert int(made.unsettled[0]) == (0 if settled else 100)
        assert int(made.counts.sum()) == (100 if settled else 0)


def test_the_distance_at_3_decays_like_the_root_of_the_steps() -> None:
    """Source: exact algebra; here a plain loop, to show what the two tests above rest on."""
    x = 0.3
    for _ in range(1_000_000):
        x = 3.0 * x * (1.0 - x)
    assert abs(x - 2 / 3) == pytest.approx(1 / np.sqrt(18 * 1_000_000), rel=0.01)


@pytest.mark.parametrize("transient", [200, 1000])
@pytest.mark.parametrize("rows", [1000, 8000])
def test_slow_extinction_is_not_smeared_either(rows: int, transient: int) -> None:
    """Around r = 1 the population dies out like r^n, at r = 1 like 1/n (exact algebra).

    The state becomes much smaller than its start was, and with it the steps that it still makes.
    """
    across, up = ("r", "0.9503", "1.0501"), ("x", "-0.00011", "0.1")
    made = counted(
        "logistic", across, up=up, size=(101, rows), values_per_column=1, transient=transient, samples=1000
    )
    for column, (r,) in enumerate(values_of(across, 101, 1)):
        limit = cell_of(up, rows, max(Fraction(0), 1 - 1 / r))
        cells = np.flatnonzero(made.counts.values[:, column])
        assert np.abs(cells - limit).max(initial=0) <= 1
    assert (made.unsettled.values > 0).sum() <= 1
    assert not made.below.any()
    assert not made.above.any()


def test_a_slow_birth_of_two_branches_is_not_smeared_either() -> None:
    """The pitchfork of x -> r x (1 - x^2) at r = 1, sqrt(1 - 1/r) above it (exact algebra)."""
    across, up = ("r", "0.9003", "1.1001"), ("x", "-0.5003", "0.5")
    made = counted("cubic", across, up=up, size=(101, 2000), values_per_column=1, transient=200)
    for column, (r,) in enumerate(values_of(across, 101, 1)):
        limit = Fraction(float(max(Fraction(0), 1 - 1 / r)) ** 0.5)
        cells = np.flatnonzero(made.counts.values[:, column])
        assert np.abs(cells - cell_of(up, 2000, limit)).max(initial=0) <= 1
    assert (made.unsettled.values > 0).sum() <= 1
