"""Tile sets made from configs: levels agree with each other and with a direct count."""

from __future__ import annotations

import numpy as np
import pytest

from atlas.config.load import parse_config
from atlas.orbits.counting import resolved
from atlas.orbits.histogram import count_histogram
from atlas.orbits.schedule import schedule
from atlas.output.reporter import Silence
from atlas.output.tileset import Places, make_tile_set, tile_counter
from tiles.grid import TILE, Address
from tiles.index import Index
from tiles.shading import LEVELS, shade_counts


@pytest.fixture(scope="module")
def job():
    settings = {
        "family": "logistic",
        "across": ["r", "3.4", "4"],
        "up": ["x", "0", "1"],
        "levels": "3",
        "pairs": "all",
    }
    return parse_config({"tile_sets": {"set": settings}}).tile_sets["set"]


@pytest.fixture(scope="module")
def places(job, tmp_path_factory):
    out = tmp_path_factory.mktemp("set")
    with schedule(2) as opened:
        make_tile_set(job, Places.of(out, "set"), opened, Silence())
    return Places.of(out, "set")


def mosaic(index, pair):
    """Return counts[columns, rows] of a whole level pair."""
    across, up = pair
    whole = np.zeros((TILE << across, TILE << up), np.uint32)
    for address in index.addresses(pair):
        left, low = address.column * TILE, address.row * TILE
        whole[left : left + TILE, low : low + TILE] = index.get(address)
    return whole


def test_the_deepest_pair_is_the_histogram_of_the_view(job, places):
    with schedule(1) as opened:
        histogram = count_histogram(resolved(job, tile_counter(job), opened), opened)
    with Index.open(places.index) as index:
        np.testing.assert_array_equal(mosaic(index, (3, 3)), histogram.strip.counts)
        columns = index.columns(3)
        for name in ("exposure", "below", "above", "escaped", "unsettled", "collapsed"):
            np.testing.assert_array_equal(columns[name], getattr(histogram.strip, name))


def test_coarser_pairs_are_sums(places):
    with Index.open(places.index) as index:
        deepest = mosaic(index, (3, 3)).astype(np.uint64)
        for across, up in index.pairs:
            a, u = 1 << (3 - across), 1 << (3 - up)
            shape = (TILE << across, a, TILE << up, u)
            np.testing.assert_array_equal(
                mosaic(index, (across, up)), deepest.reshape(shape).sum(axis=(1, 3))
            )


@pytest.mark.parametrize("region", [((0.75, 1.0), (0.25, 0.75)), ((0.5, 0.625), (0.375, 0.625))])
def test_the_mean_shade_of_a_region_is_the_same_at_every_level(places, region):
    """Asked: less than 10 % apart; the mean goes over occupied cells, since those are what is shaded."""
    (left, right), (low, high) = region
    means = []
    with Index.open(places.index) as index:
        fit = index.fit("equalised")
        for level in range(4):
            counts, exposure = mosaic(index, (level, level)), index.columns(level)["exposure"]
            height = index.view.up.cell_size(TILE << level)
            shades = shade_counts(counts, exposure, height, fit)
            size = TILE << level
            part = shades[int(left * size) : int(right * size), int(low * size) : int(high * size)]
            means.append(float(part[(part > 0) & (part <= LEVELS)].mean()))
    assert max(means) / min(means) < 1.10, means


def test_automatic_samples_give_eight_counts_in_each_occupied_cell(places):
    """The promise of ``samples: auto``: mean counts over the occupied range of every chaotic column."""
    with Index.open(places.index) as index:
        counts = mosaic(index, (3, 3))
    for column in counts[:: TILE // 4]:
        occupied = np.flatnonzero(column)
        span = occupied[-1] - occupied[0] + 1
        assert column.sum() / span >= 8


def test_the_site_lists_what_it_holds(job, places):
    page = (places.site / "meta.js").read_text("ascii")
    assert page.startswith("window.ATLAS_META =")
    with Index.open(places.index) as index:
        stored = {address for pair in index.pairs for address in index.addresses(pair)}
    files = {
        Address(*(int(part) for part in path.with_suffix("").parts[-4:]))
        for path in (places.site / "tiles" / "density").rglob("*.png")
    }
    assert files == stored
