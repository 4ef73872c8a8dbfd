"""The logistic map against algebra and against the literature."""

from __future__ import annotations

from collections.abc import Callable
from fractions import Fraction

import mpmath
import numpy as np
import pytest

from tests.reference.published import published
from tests.world.views import (
    Interval,
    at,
    bands,
    branches,
    cell_of,
    counted,
    expected_counts,
    outside,
    values_of,
)

SAMPLES = 200


def fixed_point(r: Fraction) -> list[Fraction]:
    """Return 1 - 1/r (exact algebra)."""
    return [1 - 1 / r]


def two_cycle(r: Fraction) -> list[Fraction]:
    """Return (r + 1 -+ sqrt((r - 3) (r + 1))) / 2r (exact algebra), to 40 digits."""
    with mpmath.workdps(40):
        ratio = mpmath.mpf(r.numerator) / r.denominator
        root = mpmath.sqrt((ratio - 3) * (ratio + 1))
        both = [(ratio + 1 - root) / (2 * ratio), (ratio + 1 + root) / (2 * ratio)]
        return [Fraction(mpmath.nstr(x, 40)) for x in both]


@pytest.mark.parametrize(
    ("across", "up", "size", "cycle"),
    [
        (("r", "1.0501", "2.9477"), ("x", 0, 1), (190, 293), fixed_point),
        (("r", "2.7134", "2.8717"), ("x", "0.6302", "0.6561"), (331, 499), fixed_point),
        (("r", "2.5011", "2.9"), ("x", "0.617", "0.641"), (100, 211), fixed_point),
        (("r", "3.0501", "3.4377"), ("x", 0, 1), (195, 293), two_cycle),
        (("r", "3.1317", "3.2911"), ("x", "0.7583", "0.8261"), (157, 499), two_cycle),
        (("r", "3.1317", "3.2911"), ("x", "0.4761", "0.5403"), (157, 499), two_cycle),
    ],
)
def test_every_sample_of_every_column_lies_in_the_pixel_of_the_cycle(
    across: Interval, up: Interval, size: tuple[int, int], cycle: Callable[[Fraction], list[Fraction]]
) -> None:
    """Source: exact algebra (record log.period2.formula for the two branches)."""
    columns, rows = size
    made = counted("logistic", across, up=up, size=size, samples=SAMPLES)
    points = [[cycle(r) for r in values] for values in values_of(across, columns, 4)]
    inside, below, above = expected_counts(up, rows, points, SAMPLES)
    np.testing.assert_array_equal(made.counts, inside)
    np.testing.assert_array_equal(made.below, below)
    np.testing.assert_array_equal(made.above, above)
    assert not made.escaped.any()
    assert not made.unsettled.any()
    assert not made.collapsed.any()


def test_the_four_cycle_at_3_5_lies_in_its_pixels() -> None:
    """Source: common practice, no source; computed in 40 digits."""
    rows = 997
    column = at("logistic", "r", "3.5", rows=rows).counts.values[:, 0]
    cells = [cell_of(("x", 0, 1), rows, Fraction(x)) for x in published("log.pts.3.5").value]
    assert np.flatnonzero(column).tolist() == sorted(cells)
    assert set(column[cells]) == {250}


def test_below_1_the_population_dies_out_and_above_it_does_not() -> None:
    """Transcritical bifurcation of x = 0 at r = 1; source: exact algebra."""
    middle = published("log.transcritical").number()
    made = counted(
        "logistic",
        ("r", middle - Fraction(1, 2), middle + Fraction(1, 2)),
        size=(20, 400),
        values_per_column=1,
    )
    counts = made.counts.values
    assert all(np.flatnonzero(column).tolist() == [0] for column in counts[:, :10].T)
    assert all(column.argmax() > 0 for column in counts[:, 10:].T)
    assert branches(counts) == [1] * 20


def test_the_period_three_window_shows_exactly_three_branches() -> None:
    """The window opens at 1 + sqrt 8 (exact algebra) and doubles at 3.8415 (citation from memory)."""
    opens, doubles = (published("log.win.p3.1").number(key) for key in ("saddle_node", "first_doubling"))
    assert opens == pytest.approx(1 + 8**0.5, abs=1e-15)
    across = ("r", Fraction("3.8285"), Fraction("3.8414"))
    assert opens < across[1] < across[2] < doubles
    made = counted("logistic", across, size=(40, 300), transient=20_000)
    assert branches(made.counts.values) == [3] * 40
    assert outside(made) == 0


@pytest.mark.parametrize("name", ["log.bands.3.6", "log.bands.3.58"])
def test_chaotic_bands_end_at_images_of_one_half(name: str) -> None:
    """Source: exact algebra, f^k(1/2), to one cell."""
    record, rows = published(name), 1000
    up = ("x", Fraction(0), Fraction("1.000007"))
    made = at("logistic", "r", str(record.parameters["r"]), rows=rows, up=up, samples=2_000_000)
    values = record.value.values() if isinstance(record.value, dict) else record.value
    expected = [[cell_of(up, rows, Fraction(edge)) for edge in band] for band in values]
    found = bands(made.counts.values[:, 0])
    assert len(found) == len(expected)
    np.testing.assert_allclose(found, expected, rtol=0, atol=1)
    assert outside(made) == 0
