"""The complex quadratic map: components of periods 1 and 2, where others touch them, the area of all.

Exact algebra for the components (quad.cardioid, quad.disc, quad.roots). The area: J. H. Ewing and G. Schober
1992 (bounds), and numerical estimates; leading digits from memory.
"""

from __future__ import annotations

import math
from fractions import Fraction
from typing import Any

import numpy as np
import pytest

import atlas
from atlas.planes.fates import CHAOTIC, CLASS_ESCAPES, ESCAPES, QUASI_PERIODIC, UNSETTLED
from tests.reference.published import published
from tests.world.planes import agreed, centred, classes, pixel, plane, shares, wrong

NAME = "complex_quadratic"
LAYERS = ("fate", "period", "lyapunov", "lyapunov_2", "escape")
ROWS = 125
AREA_OF_PIXEL = (1.25 / ROWS) ** 2


def multiplier(c: np.ndarray) -> np.ndarray:
    """Return that of the fixed point that may attract."""
    return 1 - np.sqrt(1 - 4 * c)


def said(x: np.ndarray, y: np.ndarray) -> np.ndarray:
    """Return the class by cardioid and disc; far out the critical point escapes."""
    c = x + 1j * y
    return np.select([abs(multiplier(c)) < 1, abs(c + 1) < 1 / 4, abs(c) > 2], [1, 2, CLASS_ESCAPES], 0)


@pytest.fixture(scope="module")
def upper() -> Any:
    """Return the upper half of the plane; the lower is its mirror image."""
    return plane(NAME, ("c_re", "-2", "0.5"), ("c_im", 0, "1.25"), (2 * ROWS, ROWS), LAYERS)


def constant(made: Any) -> np.ndarray:
    return np.asarray(made.c_re.values[np.newaxis] + 1j * made.c_im.values[:, np.newaxis])


def test_cardioid_and_disc_hold_periods_1_and_2_to_a_pixel(upper: Any) -> None:
    assert published("quad.cardioid").value.startswith("c = e^{it}/2 - e^{2it}/4")
    assert published("quad.disc").value.startswith("|c+1| = 1/4")
    assert wrong(upper, said) == []
    spoken = shares(upper, said)
    assert spoken[1] > 5000
    assert spoken[2] > 800
    assert spoken[CLASS_ESCAPES] > 1500
    t = np.linspace(0, math.pi, 50)
    np.testing.assert_allclose(abs(multiplier(np.exp(1j * t) / 2 - np.exp(2j * t) / 4)), 1, atol=1e-12)


def test_their_areas(upper: Any) -> None:
    """3 pi / 8 and pi / 16, each to a third of a pixel along half its boundary."""
    found = classes(upper)
    for period, area, boundary in ((1, 3 * math.pi / 8, 4.0), (2, math.pi / 16, math.pi / 2)):
        pixels = 2 * AREA_OF_PIXEL * np.count_nonzero(found == period)
        assert pixels == pytest.approx(area, abs=boundary * math.sqrt(AREA_OF_PIXEL) / 3)


def test_both_exponents_are_the_logarithm_of_the_multiplier(upper: Any) -> None:
    """A complex multiplier m stretches all directions alike: ln|m|, twice; on the cycle of 2 it is 4 (c + 1).

    Off cycles the finite time shows: a vector that only turns changes its largest component by up to 2**0.5.
    """
    told, c = agreed(upper, said), constant(upper)
    one, two = told == 1, told == 2
    np.testing.assert_allclose(upper.lyapunov.values[one], np.log(abs(multiplier(c[one]))), atol=2e-6)
    np.testing.assert_allclose(upper.lyapunov.values[two], np.log(abs(4 * (c[two] + 1))) / 2, atol=2e-6)
    cycle, other = upper.period.values > 0, upper.fate.values == QUASI_PERIODIC
    apart = abs(upper.lyapunov - upper.lyapunov_2).values
    assert apart[cycle].max() < 1e-6
    assert apart[other].max() < 2 * math.log(2) / 2000


def test_the_area_by_pixel_count(upper: Any) -> None:
    """quad.area: all pixels that do not escape, 1.5066.

    The boundary passes through all sizes, so the error of a count is not known exactly. With pixels of width
    1/100 the count is off by about the square root of the 2000 pixels at the boundary, 50 pixels of 1e-4
    doubled for the mirror image: 0.01. Unsettled pixels, and those whose slow spirals towards a neutral cycle
    pass for quasi-periodic, lie at the edges of components and belong to the set; whether they count
    changes the area by less than the same 0.01. No chaos has an area here (it is on the real axis only).
    """
    fate = upper.fate.values
    doubtful = np.isin(fate, (UNSETTLED, QUASI_PERIODIC, CHAOTIC)).sum() * 2 * AREA_OF_PIXEL
    assert doubtful < 0.01
    assert not (fate == CHAOTIC).any()
    area = 2 * AREA_OF_PIXEL * np.count_nonzero(fate != ESCAPES)
    assert area == pytest.approx(float(published("quad.area").number()), abs=0.01)


def test_the_steps_to_escape_grow_inwards(upper: Any) -> None:
    """Beyond |c| = 2 the critical orbit leaves at once; on the way to c = 1/4 it takes ever longer.

    For c = 1/4 + e the time grows like pi / sqrt(e): exact in the limit, a classical computation.
    """
    far = abs(constant(upper)) > 2
    assert np.nanmax(upper.escape.values[far]) < 8
    assert (np.isnan(upper.escape.values) == (upper.fate.values != ESCAPES)).all()
    for small in (Fraction(1, 10**4), Fraction(1, 10**6)):
        at = {"c_re": Fraction(1, 4) + small, "c_im": 0}
        found = pixel(NAME, at, LAYERS, transient=10_000)
        assert found["escape"] * math.sqrt(small) == pytest.approx(math.pi, rel=0.03)


def test_where_the_components_of_periods_3_and_4_touch() -> None:
    """quad.roots: at a third and a quarter of a turn, seen along the normal of the cardioid."""
    third, quarter = (complex(text.replace("i", "j")) for text in published("quad.roots").value)
    assert multiplier(np.array(third)) == pytest.approx(np.exp(2j * math.pi / 3))
    assert multiplier(np.array(quarter)) == pytest.approx(1j)
    cell = Fraction(1, 500)
    touch = Fraction(third.imag)
    up = ("c_im", touch - Fraction(9, 2) * cell, touch + Fraction(9, 2) * cell)
    made = plane(NAME, centred("c_re", Fraction(-1, 8)), up, (1, 9), LAYERS)
    assert classes(made)[:4, 0].tolist() == [1] * 4
    assert classes(made)[5:, 0].tolist() == [3] * 4
    axes = [
        (name, at - Fraction(9, 2) * cell, at + Fraction(9, 2) * cell)
        for name, at in (("c_re", Fraction(1, 4)), ("c_im", Fraction(1, 2)))
    ]
    along = classes(plane(NAME, axes[0], axes[1], (9, 9), LAYERS)).diagonal()
    assert along[:4].tolist() == [1] * 4
    assert along[5:].tolist() == [4] * 4


@pytest.mark.parametrize("c", ["-1.3", "-1.5", "-1.75488", "-1.9"])
def test_on_the_real_axis_it_is_the_real_map(c: str) -> None:
    found = pixel(NAME, {"c_re": c, "c_im": 0}, LAYERS)
    twin = atlas.lyapunov_spectrum(atlas.family("quadratic"), {"c": c}, starts=[{"x": 0}], steps=2000)
    assert found["fate"] == twin.fate[0]
    assert found["period"] == twin.period[0]
    slack = 0.05 if found["fate"] == CHAOTIC else 1e-6
    assert found["lyapunov"] == pytest.approx(float(twin.lyapunov[0, 0]), abs=slack)
