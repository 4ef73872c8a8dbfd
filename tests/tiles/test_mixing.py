"""Mixed colours: means in linear light, inks over each other, and colours that stay as they are."""

from itertools import permutations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from tests.tiles.colour_vision import difference, lab, least_difference, linear
from tiles.curve import LEVELS
from tiles.mixing import INKS, ink_table, inked, mixed, swatch
from tiles.palette import lightness
from tiles.shading import MISSING, colour_table

TABLES = arrays(np.uint8, (8, 3))


def light(byte):
    """Return linear light by the definition."""
    part = byte / 255
    return part / 12.92 if part <= 0.04045 else ((part + 0.055) / 1.055) ** 2.4


def byte(found):
    """Return the sRGB value, 0 to 255, not rounded."""
    return 255 * (12.92 * found if found <= 0.0031308 else 1.055 * found ** (1 / 2.4) - 0.055)


@given(TABLES, st.sampled_from([1, 2, 4]), st.integers(1, 5), st.integers(1, 5), st.randoms())
def test_a_block_has_the_mean_of_its_colours(table, factor, lines, pixels, random):
    indices = np.array(
        [[random.randrange(8) for _ in range(pixels * factor)] for _ in range(lines * factor)], np.uint8
    )
    found = mixed(indices, table, factor)
    assert found.shape == (lines, pixels, 3)
    for line in range(lines):
        for pixel in range(pixels):
            block = indices[line * factor : (line + 1) * factor, pixel * factor : (pixel + 1) * factor]
            for part in range(3):
                mean = sum(light(int(table[index, part])) for index in block.flat) / factor**2
                assert abs(float(found[line, pixel, part]) - byte(mean)) < 0.6


@given(arrays(np.uint8, (3, 5), elements=st.integers(0, 7)), TABLES, st.sampled_from([1, 2, 4]))
def test_blocks_of_one_colour_keep_it(indices, table, factor):
    large = np.repeat(np.repeat(indices, factor, axis=0), factor, axis=1)
    assert np.array_equal(mixed(large, table, factor), table[indices])


def test_a_large_array_is_mixed_like_its_parts():
    indices = np.random.default_rng(2).integers(0, 72, (4 * 150, 4 * 30), np.uint8)
    table = colour_table("kinds")
    whole = mixed(indices, table, 4)
    assert np.array_equal(
        whole[::50], np.concatenate([mixed(indices[n : n + 4], table, 4) for n in range(0, 600, 200)])
    )


@pytest.mark.parametrize(("shape", "factor"), [((4, 6), 4), ((3, 4), 2), ((4, 4), 0)])
def test_only_whole_blocks_are_mixed(shape, factor):
    with pytest.raises(ValueError, match="no blocks"):
        mixed(np.zeros(shape, np.uint8), np.zeros((1, 3), np.uint8), factor)


@pytest.mark.parametrize("ink", INKS)
def test_an_ink_runs_from_pale_to_dark_by_steps_of_lightness(ink):
    heights = np.array([lightness(tuple(map(int, row))) for row in ink_table(ink)])
    assert heights[0] == 100
    assert heights[MISSING] < 97
    steps = -np.diff(heights[1:MISSING])
    assert steps.min() >= 0
    assert steps.max() < 1
    assert abs(heights[1] - 88) < 1
    assert abs(heights[LEVELS] - 28) < 1


def test_the_first_inks_are_told_apart_by_all_eyes():
    for shade in (100, 150, 200, LEVELS):
        assert least_difference([ink_table(ink)[shade] for ink in INKS[:2]]) > 20
        assert least_difference([ink_table(ink)[shade] for ink in INKS[:3]]) > 10
        shades = lab(linear([ink_table(ink)[shade] for ink in INKS]))
        first, second = np.triu_indices(len(INKS), 1)
        assert difference(shades[first], shades[second]).min() > 12


@given(st.lists(arrays(np.uint8, (2, 4), elements=st.integers(0, MISSING)), min_size=1, max_size=3))
def test_inks_are_multiplied_where_they_meet(shades):
    inks = INKS[: len(shades)]
    found = inked(shades, inks)
    for at in np.ndindex(2, 4):
        printed = [
            ink_table(ink)[each[at]] for each, ink in zip(shades, inks, strict=True) if 0 < each[at] < MISSING
        ]
        if len(printed) == 1:
            assert found[at].tolist() == printed[0].tolist()
        elif printed:
            for part in range(3):
                product = np.prod([light(int(rgb[part])) for rgb in printed])
                assert abs(float(found[at][part]) - byte(product)) < 1.1
        else:
            missing = all(each[at] == MISSING for each in shades)
            assert found[at].tolist() == [240 if missing else 255] * 3


def test_the_order_of_the_inks_does_not_matter():
    rng = np.random.default_rng(4)
    shades = [rng.integers(0, MISSING + 1, (70, 9), np.uint8) for _ in range(3)]
    pictures = [
        inked([shades[n] for n in order], [INKS[n] for n in order]).astype(int)
        for order in permutations(range(3))
    ]
    assert np.ptp(pictures, axis=0).max() == 0


def test_empty_cells_have_the_colours_asked_for():
    found = inked(
        [np.array([[0, MISSING, 0]], np.uint8), np.array([[0, MISSING, MISSING]], np.uint8)],
        INKS[:2],
        background=(1, 2, 3),
        missing=(9, 9, 9),
    )
    assert found.tolist() == [[[1, 2, 3], [9, 9, 9], [1, 2, 3]]]


def test_a_legend_shows_an_ink_and_where_two_meet():
    one, two, both = swatch(INKS[0]), swatch(INKS[1]), swatch(*INKS[:2])
    assert one == tuple(ink_table(INKS[0])[2 * LEVELS // 3].tolist())
    assert lightness(both) < min(lightness(one), lightness(two)) - 10
    assert least_difference([one, two, both]) > 15


def test_every_density_needs_an_ink():
    with pytest.raises(ValueError, match="2 densities need as many inks, not 1"):
        inked([np.zeros((1, 1), np.uint8)] * 2, INKS[:1])
