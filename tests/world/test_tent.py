"""The tent map against algebra."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest

from tests.reference.published import published
from tests.world.views import at, bands, cell_of, counted, outside

UP = ("x", 0, 1)


def test_the_attractor_at_slope_1_7_fills_its_support() -> None:
    """[mu (1 - mu/2), mu/2], images of 1/2, to one cell; source: exact algebra."""
    record, rows = published("tent.support"), 1009
    made = at("tent", "mu", str(record.parameters["mu"]), rows=rows, samples=2_000_000)
    (found,) = bands(made.counts.values[:, 0])
    expected = [cell_of(UP, rows, record.number(k)) for k in (0, 1)]
    np.testing.assert_allclose(found, expected, rtol=0, atol=1)
    assert outside(made) == 0


@pytest.mark.parametrize("mu", ["1.45", "1.6", "1.85", "1.99"])
def test_the_support_between_sqrt_2_and_2_is_one_band(mu: str) -> None:
    """Source: exact algebra; from memory for the merging at sqrt 2 (Ito, Tanaka & Nakada 1979)."""
    rows, slope = 997, Fraction(mu)
    made = at("tent", "mu", mu, rows=rows, samples=2_000_000)
    (found,) = bands(made.counts.values[:, 0])
    expected = [cell_of(UP, rows, slope * (1 - slope / 2)), cell_of(UP, rows, slope / 2)]
    np.testing.assert_allclose(found, expected, rtol=0, atol=1)


def test_below_slope_1_everything_falls_to_0() -> None:
    """The fixed point 0 attracts with multiplier mu; source: exact algebra."""
    across = ("mu", "0.1", "0.9")
    made = counted("tent", across, size=(20, 300), samples=40)
    assert (made.counts.values[0] == 4 * 40).all()
    assert not made.counts.values[1:].any()


def test_above_slope_2_orbits_escape() -> None:
    """Almost every start in (0, 1) leaves it for good; source: exact algebra."""
    starts = [Fraction(k, 101) for k in range(1, 101)]
    made = counted(
        "tent", ("mu", "2.01", "2.5"), size=(10, 100), starts=starts, transient=10_000, samples=100
    )
    np.testing.assert_array_equal(made.escaped, made.exposure)
    assert not made.counts.any()


def test_a_start_on_the_repelling_fixed_point_is_reported() -> None:
    """mu / (1 + mu) = 2/3 at slope 2 is no float64; 0 is, and stays (exact algebra)."""
    made = at("tent", "mu", "2", rows=10, starts=["0"], samples=77)
    assert made.attrs["orbits_on_repelling_start"] == 1
    assert made.counts.values[0, 0] == 77
