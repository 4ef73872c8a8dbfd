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

from tiles.palette import PALETTES, STOPS, PaletteRefused, colour, lightness, palette
from tiles.shading import LEVELS, MISSING, colour_table

# Machado, Oliveira & Fernandes (2009), IEEE Trans. Vis. Comput. Graphics 15, 1291-1298: full severity, for
# linear sRGB. Matrices cited from memory; a test below checks that they leave greys unchanged.
MACHADO = {
    "protanopia": (
        (0.152286, 1.052583, -0.204868),
        (0.114503, 0.786281, 0.099216),
        (-0.003882, -0.048116, 1.051998),
    ),
    "deuteranopia": (
        (0.367322, 0.860646, -0.227968),
        (0.280085, 0.672501, 0.047413),
        (-0.011820, 0.042940, 0.968881),
    ),
    "tritanopia": (
        (1.255528, -0.076749, -0.178779),
        (-0.078411, 0.930809, 0.147602),
        (0.004733, 0.691367, 0.303900),
    ),
}


def seen(stops, kind):
    """Return the lightness of colours as simulated for a kind of colour blindness."""
    levels = np.array([colour(stop) for stop in stops]) / 255
    linear = np.where(levels <= 0.04045, levels / 12.92, ((levels + 0.055) / 1.055) ** 2.4)
    luminance = np.clip(linear @ np.array(MACHADO[kind]).T, 0, 1) @ [0.2126, 0.7152, 0.0722]
    return np.where(luminance <= 216 / 24389, luminance * 24389 / 27, 116 * np.cbrt(luminance) - 16)


def test_there_are_enough_palettes_and_their_names_are_plain_words():
    assert len(PALETTES) >= 8
    assert all(name.isalpha() and name.islower() and row.name == name for name, row in PALETTES.items())
    assert sum("deuteranopia" in row.safe_for for row in PALETTES.values()) >= 4
    assert all(row.note for row in PALETTES.values())


@pytest.mark.parametrize("name", PALETTES)
def test_stops_change_lightness_by_nearly_equal_steps(name):
    row = palette(name)
    heights = [lightness(stop) for stop in row.stops]
    steps = np.diff(heights) * np.sign(heights[-1] - heights[0])
    assert steps.min() > 0.7 * steps.mean()
    assert steps.max() < 1.3 * steps.mean()
    assert abs(heights[0] - row.first) < 1
    assert abs(heights[-1] - row.last) < 6 if name == "grey" else abs(heights[-1] - row.last) < 1


@pytest.mark.parametrize("name", PALETTES)
def test_every_shade_differs_in_lightness_from_the_one_before(name):
    heights = [lightness(tuple(map(int, row))) for row in colour_table(name)[1 : LEVELS + 1]]
    steps = np.diff(heights) * np.sign(heights[-1] - heights[0])
    assert steps.min() > 0
    assert abs(heights[-1] - heights[0]) > 60


@pytest.mark.parametrize("name", PALETTES)
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
    ("name", "kind"), [(row.name, kind) for row in PALETTES.values() for kind in row.safe_for]
)
def test_palettes_called_safe_stay_monotone_for_colour_blind_eyes(name, kind):
    heights = seen(palette(name).stops, kind)
    steps = np.diff(heights) * np.sign(heights[-1] - heights[0])
    assert steps.min() > 0
    assert steps.sum() > 60


def test_the_simulation_leaves_greys_alone():
    for kind in MACHADO:
        assert np.abs(np.array(MACHADO[kind]).sum(axis=1) - 1).max() < 2e-6


def test_grey_is_grey():
    table = colour_table("grey")
    assert (table == table[:, :1]).all()


def test_stops_are_colours_of_the_list_they_name():
    import colorcet

    for row in PALETTES.values():
        if isinstance(row.source, str):
            assert set(row.stops) <= set(colorcet.palette[row.source])
            assert len(set(row.stops)) == STOPS


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
