"""Sizes of sheets: pixels from millimetres as printers and journals round them."""

from __future__ import annotations

from fractions import Fraction

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from atlas.reading.sheet import Size
from tiles.errors import Refusal


def test_the_size_of_the_main_plate_is_exact():
    assert Size.parse("180x110").pixels(600) == (4252, 2598)


# Usual artwork rules (common practice, no source): a column of 90 mm and a page of 190 mm.
@pytest.mark.parametrize(
    ("millimetres", "dpi", "pixels"),
    [
        (90, 300, 1063),
        (90, 500, 1772),
        (90, 1000, 3543),
        (190, 300, 2244),
        (190, 500, 3740),
        (190, 1000, 7480),
    ],
)
def test_columns_of_journals(millimetres: int, dpi: int, pixels: int):
    assert Size.parse(f"{millimetres}x50").pixels(dpi)[0] == pixels


def test_pixels_do_not_depend_on_the_resolution():
    size = Size.parse("1200x800px")
    assert size.pixels(72) == size.pixels(1200) == (1200, 800)
    assert size.millimetres(300) == (101.6, pytest.approx(67.7333333333))


def test_half_a_pixel_is_rounded_up():
    assert Size(Fraction("12.7"), Fraction("38.1")).pixels(1) == (1, 2)


@pytest.mark.parametrize("text", ["180 x 110", "180×110", " 180x110mm ", "180.0x110.00 mm"])
def test_ways_to_write_the_same_size(text: str):
    assert Size.parse(text) == Size.parse("180x110")


@pytest.mark.parametrize(
    "text",
    ["", "180", "180x", "x110", "180x110cm", "-180x110", "1e2x1e2", "0x10", "10x0px", "1.5x2px", "180x110x2"],
)
def test_what_is_no_size_is_refused(text: str):
    with pytest.raises(Refusal):
        Size.parse(text)


@settings(deadline=None)
@given(
    st.decimals(min_value="0.001", max_value=99999, places=3), st.integers(1, 10**6), st.integers(10, 5000)
)
def test_text_and_pixels_agree_with_exact_arithmetic(width, height: int, dpi: int):
    size = Size(Fraction(width), Fraction(height))
    assert Size.parse(str(size)) == size
    exact_pixels = Fraction(width) * dpi / Fraction("25.4")
    assert abs(size.pixels(dpi)[0] - exact_pixels) <= Fraction(1, 2)
    in_pixels = Size(Fraction(height), Fraction(dpi), "px")
    assert Size.parse(str(in_pixels)) == in_pixels
