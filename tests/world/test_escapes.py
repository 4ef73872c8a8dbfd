"""Orbits that leave for good are told of, and leave nothing in the picture."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest

from tests.reference.published import published
from tests.world.views import at, bands, cell_of, counted

STARTS = [Fraction(k, 101) for k in range(1, 101)]


def test_above_4_every_orbit_of_the_logistic_map_escapes() -> None:
    """Almost every start in (0, 1) escapes at r = 4.01; source: exact algebra."""
    r = str(published("log.escape").parameters["r"])
    made = at("logistic", "r", r, rows=100, starts=STARTS, transient=10_000)
    np.testing.assert_array_equal(made.escaped, made.exposure)
    assert not made.counts.any()
    assert np.all(made.density == 0.0)


def test_a_view_across_4_is_filled_to_it_and_empty_beyond() -> None:
    made = counted("logistic", ("r", "3.9", "4.1"), size=(20, 50), starts=STARTS, transient=10_000)
    np.testing.assert_array_equal(made.escaped[10:], made.exposure[10:])
    assert not made.escaped[:10].any()
    assert (made.counts[:, :10].sum("x") == made.exposure[:10]).all()


@pytest.mark.parametrize(("r", "gone"), [("2.999", 0), ("3.001", 100)])
def test_beside_3_all_orbits_of_the_cubic_map_stay_or_escape(r: str, gone: int) -> None:
    """Beyond r = 3 the images of the extrema leave [-2/sqrt 3, 2/sqrt 3]; source: exact algebra."""
    made = at("cubic", "r", r, rows=100, starts=STARTS, transient=10_000, samples=1000)
    assert int(made.escaped[0]) == 1000 * gone


def test_at_3_rounding_carries_orbits_of_the_cubic_map_out_and_they_are_not_drawn() -> None:
    """In exact arithmetic all stay in [-2/sqrt 3, 2/sqrt 3] (exact algebra); measured: 1 in 10^8 leaves."""
    up, rows, samples = ("x", "-1.2", "1.2"), 240, 300_000
    starts = [Fraction(2 * k + 1, 2001) - Fraction(1, 2) for k in range(1000)]
    made = at("cubic", "r", "3", rows=rows, up=up, starts=starts, samples=samples)
    lost, rest = divmod(int(made.escaped[0]), samples)
    assert rest == 0
    assert 1 <= lost <= 20
    highest = cell_of(up, rows, Fraction(2 / 3**0.5))
    assert bands(made.counts.values[:, 0]) == [(rows - 1 - highest, highest)]
    assert int(made.below[0]) == int(made.above[0]) == 0


def test_the_quadratic_map_escapes_on_both_sides_of_its_interval() -> None:
    """Bounded orbits exist for -2 <= c <= 1/4 alone; source: exact algebra."""
    for across in (("c", "-2.2", "-2.01"), ("c", "0.26", "0.5")):
        made = counted("quadratic", across, size=(20, 50), transient=10_000, samples=100)
        np.testing.assert_array_equal(made.escaped, made.exposure)
    made = counted("quadratic", ("c", "-2", "0.25"), size=(50, 50), samples=100)
    assert not made.escaped.any()
