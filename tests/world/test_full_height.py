"""Invariant densities that are known in closed form, where float64 loses orbits by rounding."""

from __future__ import annotations

from fractions import Fraction
from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.stats import chisquare

from tests.reference.published import published
from tests.world.views import at, counted, outside

ROWS, ORBITS = 100, 32_000


def starts(number: int) -> list[Fraction]:
    """Return starts spread evenly inside (0, 1), none of them special."""
    return [Fraction(2 * k + 1, 2 * number + 1) for k in range(number)]


def arcsine_mass(low: Any, high: Any) -> Any:
    """Return the mass of 1 / (pi sqrt(x (1 - x))) between two states."""
    return 2 / np.pi * (np.arcsin(np.sqrt(high)) - np.arcsin(np.sqrt(low)))


def arcsine_masses(rows: int) -> NDArray[np.float64]:
    """Return the mass of every cell of [0, 1]; it sums to 1."""
    edges = np.arange(rows + 1) / rows
    return np.asarray(arcsine_mass(edges[:-1], edges[1:]))


def one_state_each(family: str, parameter: str, value: str) -> NDArray[np.int64]:
    """Count one state of each of many orbits, so that the counts are independent of one another."""
    every = starts(ORBITS)
    counts = np.zeros(ROWS, np.int64)
    for first in range(0, ORBITS, 4000):
        some = every[first : first + 4000]
        made = at(family, parameter, value, rows=ROWS, starts=some, transient=200, samples=1)
        assert outside(made) == 0
        counts += made.counts.values[:, 0]
    return counts


def test_the_density_at_4_is_that_of_ulam_and_von_neumann() -> None:
    """Chi-square test against 1 / (pi sqrt(x (1 - x))).

    Source: S. M. Ulam and J. von Neumann 1947, Bull. Amer. Math. Soc. 53, 1120 (citation from memory).
    """
    observed = one_state_each("logistic", "r", "4")
    assert observed.sum() == ORBITS
    assert chisquare(observed, ORBITS * arcsine_masses(ROWS)).pvalue > 0.01


def test_the_chi_square_test_tells_a_slightly_lower_map_apart() -> None:
    """Own check of the test above: at r = 3.999 the density is another one."""
    observed = one_state_each("logistic", "r", "3.999")
    assert chisquare(observed, ORBITS * arcsine_masses(ROWS)).pvalue < 1e-6


def test_a_column_that_ends_at_4_has_that_density_too() -> None:
    """The values of a column of width 1e-9 below 4; the source is the same."""
    rows, each = 100, 300
    across = ("r", 4 - Fraction(1, 10**9), 4)
    made = counted(
        "logistic",
        across,
        size=(1, rows),
        starts=starts(200),
        values_per_column=each,
        transient=200,
        samples=1,
    )
    observed = made.counts.values[:, 0]
    assert outside(made) == 0
    assert observed.sum() == 200 * each
    assert chisquare(observed, 200 * each * arcsine_masses(rows)).pvalue > 0.01


def test_long_orbits_at_4_have_that_density_although_rounding_loses_some() -> None:
    """Masses of three intervals, within the published tolerance; orbits that fell onto 0 are not drawn.

    Sources: von Neumann & Ulam 1947 (citation from memory); that 4 x (1 - x) in float64 drops an orbit in
    some 10^8 steps onto 0 is an own measurement; these are 4 10^8.
    """
    record, rows = published("log.hist.r4"), 10_000
    made = at("logistic", "r", "4", rows=rows, starts=starts(1000), samples=400_000)
    observed, total = made.counts.values[:, 0].astype(np.int64), int(made.exposure[0])
    assert outside(made) == 0
    assert 1 <= int(made.collapsed[0]) <= 20
    for key, first, last in (("m0_001", 0, 100), ("m_mid", 4900, 5100), ("m0_025", 0, 2500)):
        mass = float(record.number(key))
        assert mass == pytest.approx(arcsine_mass(first / rows, last / rows), abs=1e-14)
        noise = 1.5 * 5 * np.sqrt(mass * (1 - mass) / total)
        assert observed[first:last].sum() / total == pytest.approx(mass, abs=noise)
    lowest = arcsine_mass(0, 1 / rows)
    assert observed[0] / total == pytest.approx(lowest, abs=7.5 * np.sqrt(lowest / total))


def test_a_start_of_one_half_at_4_is_counted_as_collapsed() -> None:
    """1/2 -> 1 -> 0 is exact; the orbit is disturbed and the density drawn, not the extinction."""
    made = at("logistic", "r", "4", rows=10, starts=["1/2"], samples=200_000)
    assert int(made.collapsed[0]) == 1
    assert made.attrs["orbits_on_repelling_start"] == 0
    shares = made.counts.values[:, 0] / int(made.exposure[0])
    np.testing.assert_allclose(shares, arcsine_masses(10), atol=0.01)


def test_a_start_on_extinction_is_reported_and_stays_there() -> None:
    made = at("logistic", "r", "4", rows=10, starts=["0"], samples=100)
    assert made.attrs["orbits_on_repelling_start"] == 1
    assert int(made.collapsed[0]) == 0
    assert made.counts.values[:, 0].tolist() == [100] + [0] * 9


def test_the_quadratic_map_at_minus_2_loses_its_start_0_in_the_same_way() -> None:
    """0 -> -2 -> 2 is exact; conjugate to the logistic map at r = 4 by c = r/2 - r^2/4 (exact algebra)."""
    made = at("quadratic", "c", "-2", rows=10, starts=["0"], samples=200_000)
    assert int(made.collapsed[0]) == 1
    shares = made.counts.values[:, 0] / int(made.exposure[0])
    np.testing.assert_allclose(shares, arcsine_masses(10), atol=0.01)


def test_a_plain_loop_at_slope_2_ends_on_0_within_some_55_steps() -> None:
    """The rounding that the next test is about; source: own computation, note of record tent.dens2."""
    steps = []
    for x in (0.1, 0.3, 0.37, *(float(start) for start in starts(1000))):
        count = 0
        while x != 0.0:
            x, count = 2.0 * min(x, 1.0 - x), count + 1
        steps.append(count)
    assert steps[:3] == [56, 55, 54]
    assert max(steps) < 70


def test_the_density_of_the_tent_map_at_slope_2_is_uniform() -> None:
    """Every orbit collapses onto 0, is counted as collapsed and drawn as the uniform density.

    Source: exact algebra.
    """
    rows, orbits = 100, 2000
    made = at("tent", "mu", "2", rows=rows, starts=starts(orbits), samples=10_000)
    assert int(made.collapsed[0]) == orbits
    assert outside(made) == 0
    shares = made.counts.values[:, 0] / int(made.exposure[0])
    assert np.abs(shares - float(published("tent.dens2").number()) / rows).sum() < 0.01


def test_one_state_of_each_tent_orbit_at_slope_2_is_uniform_by_a_chi_square_test() -> None:
    """Source: exact algebra."""
    assert chisquare(one_state_each("tent", "mu", "2")).pvalue > 0.01


@pytest.mark.parametrize(("transient", "samples"), [(0, 400), (40, 60), (55, 300)])
def test_a_collapse_among_the_last_samples_is_counted_too(transient: int, samples: int) -> None:
    made = at("tent", "mu", "2", rows=20, starts=starts(100), transient=transient, samples=samples)
    assert int(made.collapsed[0]) == 100
    assert made.counts.values[0, 0] < 0.07 * int(made.exposure[0])
