"""Palettes: monotone in lightness, also for colour-blind eyes and in grey print; colours and refusals."""

import subprocess
import sys
from contextlib import suppress
from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tests.tiles.colour_vision import EYES, MACHADO, difference, lab, seen_by
from tiles.palette import KINDS, PALETTES, STOPS, PaletteRefused, colour, lightness, palette
from tiles.shading import LEVELS, MISSING, colour_table

SEQUENTIAL = [row.name for row in PALETTES.values() if row.kind == "sequential"]
RAMPS = [row.name for row in PALETTES.values() if row.kind != "categorical"]


def seen(stops, kind):
    """Return the lightness of colours as simulated for a kind of colour blindness."""
    return lab(seen_by([colour(stop) for stop in stops], kind))[..., 0]


def shades(name):
    """Return the shades of a ramp, shape (LEVELS, 3)."""
    return colour_table(name)[1 : LEVELS + 1]


def test_there_are_enough_palettes_and_their_names_are_plain_words():
    assert len(PALETTES) >= 8
    assert all(name.isalpha() and name.islower() and row.name == name for name, row in PALETTES.items())
    assert sum("deuteranopia" in row.safe_for for row in PALETTES.values()) >= 4
    assert all(row.note for row in PALETTES.values())
    assert {row.kind for row in PALETTES.values()} == set(KINDS)


@pytest.mark.parametrize("name", SEQUENTIAL)
def test_stops_change_lightness_by_nearly_equal_steps(name):
    row = palette(name)
    heights = [lightness(stop) for stop in row.stops]
    steps = np.diff(heights) * np.sign(heights[-1] - heights[0])
    assert steps.min() > 0.7 * steps.mean()
    assert steps.max() < 1.3 * steps.mean()
    assert abs(heights[0] - row.first) < 1
    assert abs(heights[-1] - row.last) < 6 if name == "grey" else abs(heights[-1] - row.last) < 1


@pytest.mark.parametrize("name", SEQUENTIAL)
def test_every_shade_differs_in_lightness_from_the_one_before(name):
    heights = [lightness(tuple(map(int, row))) for row in colour_table(name)[1 : LEVELS + 1]]
    steps = np.diff(heights) * np.sign(heights[-1] - heights[0])
    assert steps.min() > 0
    assert abs(heights[-1] - heights[0]) > 60


@pytest.mark.parametrize("name", SEQUENTIAL)
def test_the_lowest_shade_stands_out_from_the_ground(name):
    table = [tuple(map(int, row)) for row in colour_table(name)]
    ground, lowest, missing = lightness(table[0]), lightness(table[1]), lightness(table[MISSING])
    assert abs(ground - lowest) > 9.5
    assert min(ground, lowest) + 3 < missing < max(ground, lowest) - 3
    if palette(name).background == "#ffffff":
        assert 88 <= lowest <= 92
    else:
        assert ground < 2


@pytest.mark.parametrize(
    ("name", "kind"), [(name, kind) for name in SEQUENTIAL for kind in palette(name).safe_for]
)
def test_palettes_called_safe_stay_monotone_for_colour_blind_eyes(name, kind):
    heights = seen(palette(name).stops, kind)
    steps = np.diff(heights) * np.sign(heights[-1] - heights[0])
    assert steps.min() > 0
    assert steps.sum() > 60


def test_a_diverging_ramp_darkens_equally_from_a_pale_centre():
    heights = np.array([lightness(tuple(map(int, row))) for row in shades("balance")])
    half = LEVELS // 2
    assert np.abs(heights - heights[::-1]).max() < 0.5
    assert (np.diff(heights[:half]) > 0).all()
    assert (np.diff(heights[half:]) < 0).all()
    assert 89 < heights[half] < 91
    assert heights[0] < 23
    table = [lightness(tuple(map(int, row))) for row in colour_table("balance")]
    assert table[0] - max(heights) > 9.5
    assert table[0] - 3 > table[MISSING] > max(heights) + 3


@pytest.mark.parametrize("eyes", EYES)
def test_signs_are_told_apart_on_a_diverging_ramp(eyes):
    colours = lab(seen_by(shades("balance"), eyes))
    half = LEVELS // 2
    apart = difference(colours[:half][::-1], colours[half:])
    assert apart[:2].min() > 2.3
    assert apart[half // 8 :].min() > 15
    assert (np.diff(colours[:half, 0]) > 0).all()
    assert (np.diff(colours[half:, 0]) < 0).all()


@pytest.mark.parametrize("eyes", EYES)
def test_a_cyclic_ramp_closes_and_no_two_of_its_quarters_look_alike(eyes):
    colours = lab(seen_by(shades("wheel"), eyes))
    steps = difference(colours, np.roll(colours, -1, axis=0))
    assert steps[-1] < 1.5 * steps.max()
    assert steps.max() < 2.5
    turned = [difference(colours, np.roll(colours, by, axis=0)) for by in range(LEVELS // 4, LEVELS // 2 + 1)]
    assert np.min(turned) > 20
    turned = [difference(colours, np.roll(colours, by, axis=0)) for by in range(LEVELS // 8, LEVELS // 4)]
    assert np.min(turned) > 10


def test_colours_of_a_categorical_palette_stand_in_lists_for_that_purpose():
    import colorcet

    lists = [colours for name, colours in colorcet.palette.items() if name.startswith("glasbey")]
    assert set(palette("kinds").stops) <= {each.lower() for colours in lists for each in colours}


def test_the_simulation_leaves_greys_alone():
    for kind in MACHADO:
        assert np.abs(np.array(MACHADO[kind]).sum(axis=1) - 1).max() < 2e-6


def test_differences_of_colours_are_the_published_ones():
    # pairs out of Sharma, Wu & Dalal (2005), table 1; from memory
    for one, other, expected in (
        ((50, 2.6772, -79.7751), (50, 0, -82.7485), 2.0425),
        ((50, 2.5, 0), (50, 0, -2.5), 4.3065),
        ((50, 2.5, 0), (73, 25, -18), 27.1492),
        ((2.0776, 0.0795, -1.1350), (0.9033, -0.0636, -0.5514), 0.9082),
    ):
        assert difference(np.array(one), np.array(other)) == pytest.approx(expected, abs=5e-5)


def test_grey_is_grey():
    table = colour_table("grey")
    assert (table == table[:, :1]).all()


def test_stops_are_colours_of_the_list_they_name():
    import colorcet

    for row in PALETTES.values():
        if isinstance(row.source, str):
            assert set(row.stops) <= set(colorcet.palette[row.source])
            assert len(set(row.stops)) == (26 if row.kind == "diverging" else STOPS)


@pytest.mark.parametrize(
    ("given_colour", "expected"),
    [("#ffffff", 100.0), ("#000000", 0.0), ("#ff0000", 53.24), ("#00ff00", 87.74), ("#0000ff", 32.30)],
)
def test_lightness_of_known_colours(given_colour, expected):
    # corners of the sRGB cube in CIELAB, as commonly tabulated (from memory)
    assert lightness(given_colour) == pytest.approx(expected, abs=0.01)


def test_lightness_of_greys_rises():
    assert all(low < high for low, high in pairwise(lightness((level,) * 3) for level in range(256)))


def test_colours_are_read():
    assert colour("#0a1B2c") == (10, 27, 44)
    assert colour("#1af") == (17, 170, 255)
    assert colour("white") == (255, 255, 255)
    assert colour("black") == (0, 0, 0)


@pytest.mark.parametrize(
    "bad", ["", "#12", "#12345", "#1234567", "12ab34", "#gg0000", "red", "#ffffff\n", 7, None]
)
def test_other_texts_are_no_colours(bad):
    with pytest.raises(PaletteRefused, match="#rrggbb"):
        colour(bad)


@given(st.text(max_size=9))
def test_any_text_is_a_colour_or_refused(text):
    with suppress(PaletteRefused):
        assert all(0 <= part <= 255 for part in colour(text))


def test_an_unknown_palette_names_the_nearest():
    with pytest.raises(PaletteRefused, match="did you mean 'grey'"):
        palette("gray")
    with pytest.raises(PaletteRefused, match=r"allowed: .*blue"):
        palette("nothing like it")


def test_looking_a_palette_up_imports_nothing_heavy():
    code = (
        "import sys, tiles.palette as p; p.palette('blue'); print({'colorcet', 'numpy'} & set(sys.modules))"
    )
    here = Path(__file__).parents[2]
    run = subprocess.run([sys.executable, "-c", code], cwd=here, capture_output=True, text=True, check=True)
    assert run.stdout == "set()\n"
