"""Shading: fit once and shade many, look-up equals definition, no seams, curves agree with datashader."""

import subprocess
import sys
from fractions import Fraction
from pathlib import Path

import numpy as np
import pytest
from hypothesis import example, given
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

import tiles.shading
import tiles.tally
from tests.tiles import make_colour_tables
from tiles.palette import PALETTES, Palette, PaletteRefused, palette
from tiles.shading import (
    LEVELS,
    MISSING,
    SHADINGS,
    Fit,
    ShadingRefused,
    colour_table,
    fit,
    fit_counts,
    shade,
    shade_counts,
)
from tiles.tally import density

HERE = Path(__file__).parents[2]
COUNTS = st.one_of(st.integers(0, 3), st.integers(0, 100), st.integers(0, 2**32 - 1), st.just(2**16))
HEIGHTS = st.sampled_from([1.0, 0.1, 1 / 3, 1e-9, 2598.0, 5e-7])


@st.composite
def strips(draw):
    """Counts of shape (columns, rows), an exposure a column or one for all, and a cell height."""
    columns, rows = draw(st.integers(1, 7)), draw(st.integers(1, 9))
    counts = draw(arrays(np.uint32, (columns, rows), elements=COUNTS))
    spread = st.lists(st.sampled_from([1, 3, 7, 1000, 4_000_000_000]), min_size=columns, max_size=columns)
    exposure = draw(st.one_of(st.integers(1, 10**6), spread.map(lambda each: np.array(each, np.uint64))))
    return counts, exposure, draw(HEIGHTS)


def orbit_like(seed, columns=60, rows=80, mean=20):
    """Counts with empty cells, a broad smooth part and a few cells that hold nearly everything."""
    random = np.random.default_rng(seed)
    counts = random.poisson(mean * random.gamma(2, 0.5, (columns, rows))).astype(np.uint32)
    counts[: columns // 3] = 0
    counts[: columns // 3, rows // 2] = mean * rows
    return counts


def slow_shade(value, thresholds):
    """Return the shade of one density by counting thresholds."""
    if np.isnan(value):
        return MISSING
    return 0 if value <= 0 else 1 + sum(1 for each in thresholds if each <= value)


# --- the curves -------------------------------------------------------------------------------------------


def test_equalised_shades_cover_equal_shares_of_the_cells():
    found = shade(np.arange(1.0, 10 * LEVELS + 2), fit(np.arange(1.0, 10 * LEVELS + 2)))
    assert np.bincount(found, minlength=LEVELS + 1)[1:LEVELS].tolist() == [10] * (LEVELS - 1)
    assert np.count_nonzero(found == LEVELS) == 11


@given(st.lists(st.integers(1, 60), min_size=2, max_size=50))
@example([1, 2])
@example([5, 5, 5, 6])
def test_equalised_agrees_with_a_slow_twin_in_fractions(numbers):
    shades = shade(np.array(numbers, dtype=float), fit(np.array(numbers, dtype=float)))
    upto = {value: sum(each <= value for each in numbers) for value in numbers}
    low, high = upto[min(numbers)], upto[max(numbers)]
    for value, index in zip(numbers, shades.tolist(), strict=True):
        share = Fraction(upto[value] - low, high - low) if high > low else Fraction(1)
        exact = share * LEVELS
        if exact.denominator == 1 or abs(exact - round(exact)) > Fraction(1, 10**9):
            assert index == min(LEVELS, 1 + int(exact))


def test_logarithmic_shades_cover_equal_ratios():
    found = fit(np.array([0.02, 0.3, 50.0]), "logarithmic").thresholds
    assert found == pytest.approx(np.geomspace(0.02, 50, LEVELS + 1)[1:-1], rel=1e-14)


def test_linear_runs_from_nothing_to_the_density_that_all_but_a_percent_reach():
    values = np.random.default_rng(5).gamma(2, 1, 5000)
    top = np.quantile(values, 0.99, method="inverted_cdf")
    assert fit(values, "linear").thresholds == pytest.approx(top * np.arange(1, LEVELS) / LEVELS, rel=1e-15)


def test_ink_draws_every_occupied_cell_darkest():
    cells = np.array([0, 1e-300, 1, 1e300, 0])
    assert shade(cells, fit(np.array([5.0, 7.0]), "ink")).tolist() == [0, LEVELS, LEVELS, LEVELS, 0]


@pytest.mark.parametrize("shading", SHADINGS)
def test_a_single_density_is_darkest_and_no_density_is_allowed(shading):
    for values in ([3.5], [3.5, 0, 3.5]):
        assert shade(np.array([0, 3.5]), fit(np.array(values), shading)).tolist() == [0, LEVELS]
    for empty in (np.zeros((4, 5)), np.zeros((0, 5)), np.full(3, np.nan)):
        found = fit(empty, shading)
        assert shade(np.zeros((4, 5)), found).tolist() == np.zeros((4, 5)).tolist()
        assert shade(np.array([1.0]), found).tolist() == [LEVELS]


@given(
    st.lists(st.floats(1e-300, 1e300), min_size=1, max_size=60),
    st.sampled_from(SHADINGS),
    st.lists(st.floats(0, 1e300), max_size=60),
)
def test_every_curve_is_monotone_also_beyond_what_it_was_fitted_to(values, shading, others):
    found = fit(np.array(values), shading)
    assert found.thresholds.shape == (LEVELS - 1,)
    assert np.isfinite(found.thresholds).all()
    assert (np.diff(found.thresholds) >= 0).all()
    shades = shade(np.sort(np.array([*values, *others])), found).astype(int)
    assert (np.diff(shades) >= 0).all()
    assert shade(np.array([max(values)]), found)[0] == LEVELS


@given(st.lists(st.tuples(st.integers(1, 30), st.integers(0, 5)), max_size=20), st.sampled_from(SHADINGS))
def test_weights_are_repetitions(pairs, shading):
    values, weights = np.array([v for v, _ in pairs], float), np.array([w for _, w in pairs], int)
    assert fit(values, shading, weights) == fit(np.repeat(values, weights), shading)


def test_an_unknown_shading_names_the_nearest():
    with pytest.raises(ShadingRefused, match="did you mean 'equalised'"):
        fit(np.ones(3), "equalized")
    with pytest.raises(ShadingRefused, match="allowed: equalised, ink, linear, logarithmic"):
        fit_counts(np.ones((3, 3), np.uint32), 1, 1.0, "xyz")


# --- compared with datashader -----------------------------------------------------------------------------


def datashader_shares(values, occupied):
    """Return datashader's equalised position of every cell, scaled to 0 … 1 as its ``shade`` does."""
    from datashader.transfer_functions import eq_hist

    curve, _ = eq_hist(values, ~occupied)
    low, high = np.nanmin(curve), np.nanmax(curve)
    return (curve[occupied] - low) / (high - low)


def test_equalised_counts_have_the_shade_that_datashader_gives_them():
    counts = orbit_like(1)
    shares = datashader_shares(counts, counts > 0)
    index = shade_counts(counts, 1, 1.0, fit_counts(counts, 1, 1.0))[counts > 0].astype(int) - 1
    assert (index <= shares * LEVELS + 1e-9).all()
    assert (index > np.minimum(shares * LEVELS, LEVELS - 1) - 1 - 1e-9).all()


def test_equalised_fractions_lie_within_one_shade_of_datashader():
    values = np.random.default_rng(2).gamma(3, 1, (300, 300))
    shares = datashader_shares(values, values > 0)
    index = shade(values, fit(values)).reshape(-1).astype(int) - 1
    assert (index <= shares * LEVELS + 0.1).all()
    assert (index > np.minimum(shares * LEVELS, LEVELS - 1) - 1.1).all()


@pytest.mark.parametrize("name", ["grey", "dusk", "night"])
def test_the_picture_is_the_one_datashader_would_draw(name):
    from datashader import transfer_functions

    counts = orbit_like(3)
    image = transfer_functions.shade(
        transfer_functions.Image(counts, dims=("up", "across")), list(palette(name).stops), how="eq_hist"
    )
    theirs = image.to_numpy().view(np.uint8).reshape(*counts.shape, 4).astype(int)
    table = colour_table(name).astype(int)
    ours = table[shade_counts(counts, 1, 1.0, fit_counts(counts, 1, 1.0))]
    assert ((theirs[..., 3] == 0) == (counts == 0)).all()
    step = np.abs(np.diff(table[1 : LEVELS + 1], axis=0)).max()
    assert np.abs(theirs[..., :3] - ours)[counts > 0].max() <= step + 1


def test_the_kept_colours_are_those_of_datashader():
    assert make_colour_tables.PATH.read_text(encoding="ascii") == make_colour_tables.text()


def test_a_palette_of_ones_own_goes_to_datashader():
    mine = Palette("grey", ("#ffffff", "#000000"), background="#102030")
    table = colour_table(mine, missing="#abc")
    ramp = (255 - 255 * np.arange(LEVELS) / (LEVELS - 1)).astype(int)
    assert np.abs(table[1:-1].astype(int) - ramp[:, None]).max() <= 1
    assert table[0].tolist() == [16, 32, 48]
    assert table[-1].tolist() == [170, 187, 204]


def test_background_and_missing_are_settable_and_the_shades_stay():
    plain, changed = colour_table("blue"), colour_table("blue", background="black", missing="#123456")
    assert plain.shape == (LEVELS + 2, 3)
    assert plain.dtype == np.uint8
    assert plain[0].tolist() == [255, 255, 255]
    assert changed[0].tolist() == [0, 0, 0]
    assert changed[MISSING].tolist() == [0x12, 0x34, 0x56]
    assert (plain[1:MISSING] == changed[1:MISSING]).all()
    with pytest.raises(PaletteRefused):
        colour_table("blue", background="blue")
    with pytest.raises(PaletteRefused):
        colour_table("bleu")


def test_ink_is_black_on_the_greys_and_the_palettes_own_elsewhere():
    table = colour_table("grey", shading="ink")
    assert table[0].tolist() == table[MISSING].tolist() == [255, 255, 255]
    assert not table[1:MISSING].any()
    paper = colour_table("grey", shading="ink", background="#fed", missing="#123456")
    assert paper[[0, MISSING]].tolist() == [[0xFF, 0xEE, 0xDD], [0x12, 0x34, 0x56]]
    assert colour_table("grey", shading="ink", background="#fed")[MISSING].tolist() == [0xFF, 0xEE, 0xDD]
    for name in PALETTES:
        if name != "grey":
            assert (colour_table(name, shading="ink") == colour_table(name)).all()
        assert (colour_table(name, shading="linear") == colour_table(name)).all()


def test_drawing_imports_neither_datashader_nor_colorcet():
    code = (
        "import sys, numpy as n; from tiles.shading import *; c = n.eye(9, dtype='u4');"
        f"[colour_table(p)[shade_counts(c, 9, .1, fit_counts(c, 9, .1, s))] for p in {list(PALETTES)}"
        " for s in SHADINGS];"
        "print({'datashader', 'xarray', 'colorcet', 'matplotlib', 'numba', 'pandas'} & set(sys.modules))"
    )
    run = subprocess.run([sys.executable, "-c", code], cwd=HERE, capture_output=True, text=True, check=True)
    assert run.stdout == "set()\n"


# --- look-up equals definition ----------------------------------------------------------------------------


@given(strips(), st.sampled_from(SHADINGS))
def test_fitting_counts_is_fitting_their_densities(strip, shading):
    assert fit_counts(*strip, shading) == fit(density(*strip), shading)


@given(strips(), strips(), st.sampled_from(SHADINGS))
def test_looking_counts_up_is_shading_their_densities(strip, other, shading):
    for found in (fit_counts(*strip, shading), fit_counts(*other, shading)):
        assert (shade_counts(*strip, found) == shade(density(*strip), found)).all()


@given(
    st.lists(st.one_of(st.floats(0, 1e6), st.just(float("nan")), st.just(float("inf"))), max_size=20),
    st.lists(st.floats(0, 1e6), min_size=1, max_size=20),
)
def test_shading_is_counting_thresholds(cells, fitted):
    found = fit(np.array(fitted))
    expected = [slow_shade(cell, found.thresholds) for cell in cells]
    assert shade(np.array(cells, dtype=float), found).tolist() == expected


@pytest.mark.parametrize("shading", SHADINGS)
@pytest.mark.parametrize("block", [1, 7, 100_000])
def test_small_tables_and_blocks_change_nothing(monkeypatch, shading, block):
    counts = orbit_like(4, mean=3000)
    exposure = np.where(np.arange(60) % 5 == 0, 0, 1 + np.arange(60) % 7)
    expected = fit_counts(counts, exposure, 0.3, shading)
    shades = shade_counts(counts, exposure, 0.3, expected)
    monkeypatch.setattr(tiles.shading, "_LONGEST_TABLE", 17)
    monkeypatch.setattr(tiles.shading, "_BLOCK", block)
    monkeypatch.setattr(tiles.tally, "_BLOCK", block)
    monkeypatch.setattr(tiles.tally, "_LARGE", 50)
    assert fit_counts(counts, exposure, 0.3, shading) == expected
    assert (shade_counts(counts, exposure, 0.3, expected) == shades).all()
    assert (shade(density(counts, exposure, 0.3), expected) == shades).all()
    assert len(np.unique(shades)) > 1


@pytest.mark.parametrize("dtype", [np.uint8, np.uint16, np.int64, np.uint64])
def test_any_kind_of_whole_numbers_is_shaded_alike(dtype):
    counts = np.random.default_rng(6).integers(0, 200, (20, 30)).astype(np.uint32)
    found = fit_counts(counts, 7, 0.1)
    assert fit_counts(counts.astype(dtype), 7, 0.1) == found
    assert (shade_counts(counts.astype(dtype), 7, 0.1, found) == shade_counts(counts, 7, 0.1, found)).all()


def test_views_and_reversed_arrays_are_shaded_alike():
    counts = orbit_like(7)
    found = fit_counts(counts, 11, 0.1)
    shades = shade_counts(counts, 11, 0.1, found)
    assert fit_counts(counts[::-1, ::-1], 11, 0.1) == found
    assert (shade_counts(counts[::-1, ::2], 11, 0.1, found) == shades[::-1, ::2]).all()


# --- no seams, the same shade at every level --------------------------------------------------------------


@pytest.mark.parametrize("shading", SHADINGS)
def test_shading_a_mosaic_is_the_mosaic_of_shaded_tiles(shading):
    counts = orbit_like(8, 64, 96)
    exposure = np.repeat([900, 1800], 32)
    found = fit_counts(counts, exposure, 1 / 96, shading)
    whole = shade_counts(counts, exposure, 1 / 96, found)
    for left in range(0, 64, 16):
        for low in range(0, 96, 16):
            tile = counts[left : left + 16, low : low + 16]
            shades = shade_counts(tile, exposure[left : left + 16], 1 / 96, found)
            assert shades.tobytes() == whole[left : left + 16, low : low + 16].tobytes()


def logistic_levels(cells, depth):
    """Return the counts of the chaotic logistic map, 8 a cell at the finest level, and of coarser levels."""
    growth = 3.6 + 0.4 * (np.arange(4 * cells) + 0.5) / (4 * cells)
    x, columns = np.full(growth.shape, 0.3), np.arange(4 * cells) // 4
    finest = np.zeros((cells, cells), np.uint32)
    for step in range(200 + 2 * cells):
        x = growth * x * (1 - x)
        if step >= 200:
            np.add.at(finest, (columns, (x * cells).astype(int)), 1)
    levels = [finest]
    for _ in range(depth):
        pairs = levels[-1][0::2] + levels[-1][1::2]
        levels.append(pairs[:, 0::2] + pairs[:, 1::2])
    return levels


@pytest.mark.parametrize("shading", ["equalised", "logarithmic"])
def test_the_mean_shade_of_a_region_hardly_depends_on_the_level(shading):
    levels = logistic_levels(512, 3)
    exposures = [8 * 512 * 2**step for step in range(4)]
    found = fit_counts(levels[1], exposures[1], 2 / 512, shading)
    shades = [
        shade_counts(counts, exposures[step], 2**step / 512, found) for step, counts in enumerate(levels)
    ]
    for left, right in ((0, 1), (0, 0.5), (0.5, 1)):
        parts = [each[int(left * len(each)) : int(right * len(each))] for each in shades]
        means = [part[part > 0].mean() for part in parts]
        assert max(means) / min(means) < 1.1


# --- the record of a fit ----------------------------------------------------------------------------------


@given(st.lists(st.floats(1e-300, 1e300), max_size=30), st.sampled_from(SHADINGS))
def test_a_fit_comes_back_from_its_record_bit_for_bit(values, shading):
    found = fit(np.array(values, dtype=float), shading)
    again = Fit.from_json(found.to_json())
    assert again == found
    assert hash(again) == hash(found)
    assert again.thresholds.tobytes() == found.thresholds.tobytes()
    assert found.to_json().isascii()


def test_fits_differ_by_shading_and_thresholds():
    one = fit(np.array([1.0, 2.0]))
    assert one != fit(np.array([1.0, 3.0]))
    assert one != Fit("linear", one.thresholds)
    assert one != 5
    with pytest.raises(ValueError, match="read-only"):
        one.thresholds[0] = 1


@pytest.mark.parametrize(
    "text",
    [
        "",
        "{}",
        "[]",
        "3",
        "null",
        "[" * 100_000,
        '{"shading": "ink"}',
        '{"shading": "ink", "thresholds": 1}',
        '{"shading": "ink", "thresholds": [1, 2]}',
        '{"shading": "ink", "thresholds": [1' + "0" * 400 + "]}",
        '{"shading": "other", "thresholds": []}',
        '{"shading": "linear", "thresholds": ' + str(list(range(LEVELS - 1, 0, -1))) + "}",
        '{"shading": "linear", "thresholds": [' + "NaN, " * (LEVELS - 2) + "NaN]}",
        '{"shading": "linear", "thresholds": [' + '"x", ' * (LEVELS - 2) + "1]}",
    ],
)
def test_another_text_is_no_record_of_a_fit(text):
    with pytest.raises(ShadingRefused):
        Fit.from_json(text)
