"""Colours of classes: the same everywhere, told apart also by colour-blind eyes, few enough for a palette."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tests.tiles.colour_vision import least_difference
from tiles.classes import COLOURS, ClassRefused, class_colours, class_shades, class_table
from tiles.palette import PALETTES, colour, lightness
from tiles.shading import LEVELS, MISSING, colour_table

OWN = range(60000, 60006)


@given(st.lists(st.integers(0, 65535), max_size=30))
def test_a_colour_depends_on_its_class_alone(codes):
    colours = class_colours(codes)
    assert colours == [class_colours([code])[0] for code in codes]
    looked_up = class_table()[class_shades(np.array(codes, np.uint16))]
    assert [tuple(row) for row in looked_up.tolist()] == colours


def test_the_first_thirteen_are_those_of_the_palette():
    assert class_colours(range(1, 14)) == [colour(stop) for stop in PALETTES["kinds"].stops]
    assert class_colours([0, 60003, 60005, 60006, 65535]) == [(255, 255, 255)] * 5


def test_classes_to_65_all_differ_and_longer_ones_repeat_them():
    assert len(set(class_colours([*range(1, 66), *OWN]))) == 65 + 5
    assert class_colours(range(14, 66)) == class_colours(range(66, 118))
    assert class_colours([59999])[0] in class_colours(range(14, 66))


def test_a_class_and_its_double_are_told_apart_by_all_eyes():
    for code in range(1, 33):
        assert least_difference(class_colours([code, 2 * code])) > 9, code


@pytest.mark.parametrize(("first", "least"), [(4, 13.0), (8, 11.0), (13, 9.5)])
def test_the_first_classes_are_told_apart_by_all_eyes(first, least):
    # in CIEDE2000, where 1 to 2 is just noticed (common practice, no source)
    own = class_colours([60000, 60001, 60002, 60003, 60004])
    assert least_difference(class_colours(range(1, first + 1)) + own) > least


def test_what_is_chaotic_is_the_darkest_of_all_and_lies_beside_light_colours_of_short_cycles():
    heights = [lightness(rgb) for rgb in class_colours([60002, *range(1, 14)])]
    assert heights[0] < 10
    assert min(heights[1:]) > 35
    assert heights[1] > 75


def test_a_picture_of_classes_is_a_palette_image():
    assert COLOURS == len(class_table()) <= 128
    table = colour_table("kinds")
    assert np.array_equal(table[:COLOURS], class_table())
    assert table.shape == (LEVELS + 2, 3)
    changed = colour_table("kinds", background="#000", missing="#123456")
    assert np.array_equal(changed[1:MISSING], table[1:MISSING])
    assert changed[[0, MISSING]].tolist() == [[0, 0, 0], [18, 52, 86]]


def test_shades_keep_their_shape():
    codes = np.arange(60000, 60006, dtype=np.uint16).reshape(2, 3)
    assert class_shades(codes).shape == (2, 3)
    assert class_shades(codes).dtype == np.uint8


@pytest.mark.parametrize("code", [-1, 65536])
def test_other_numbers_are_no_classes(code):
    with pytest.raises(ClassRefused, match="allowed: 0 to 65535"):
        class_colours([code])
