"""Tile sets made from configs: levels agree with each other and with a direct count."""

from __future__ import annotations

import contextlib
import json
import sqlite3

import numpy as np
import pytest

from atlas.cli import main
from atlas.config.load import parse_config
from atlas.families.reader import family_from_config
from atlas.orbits.counting import resolved
from atlas.orbits.histogram import count_histogram
from atlas.orbits.schedule import schedule
from atlas.output.reporter import Silence
from atlas.output.tiled import Places
from atlas.output.tileset import StripSource, make_tile_set, rebuild_site, tile_counter
from tiles.errors import OutputFailed
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


def described(site):
    """Return what a page is told."""
    return json.loads((site / "meta.js").read_text("ascii").removeprefix("window.ATLAS_META = ")[:-2])


def test_a_family_of_the_catalogue_is_not_spelled_out(places):
    with Index.open(places.index) as index:
        assert index.header["families"] == {}
    assert described(places.site)["families"] == {}


OWN = {"state": {"x": {"start": "0.3"}}, "parameters": {"r": {"default": "3.7"}}}
OWN |= {"helpers": {"left": "1 - x"}, "step": {"x": "r * x * left"}}


@pytest.mark.parametrize("name", ["own", "logistic"])
def test_a_family_of_the_config_stands_in_the_index_and_reads_back(tmp_path, name):
    """Also one that carries a name of the catalogue."""
    settings = {"family": name, "across": ["r", "3.4", "4"], "up": ["x", "0", "1"], "levels": "0"}
    config = parse_config({"families": {name: OWN}, "tile_sets": {"set": settings}})
    job, places = config.tile_sets["set"], Places.of(tmp_path, "set")
    with schedule(1) as opened:
        make_tile_set(job, places, opened, Silence())
    with Index.open(places.index) as index:
        families = index.header["families"]
    assert described(places.site)["families"] == families
    assert family_from_config(name, families[name]) == job.family


def test_a_site_in_other_colours_says_so(places, tmp_path):
    plain = described(places.site)["plate"]
    assert (plain["shading"], plain["palette"]) == ("equalised", "blue")
    assert "background" not in plain
    chosen = {"shading": "logarithmic", "palette": "ember", "background": "#fffdf8"}
    rebuild_site(places.index, tmp_path / "other", **chosen)
    again = described(tmp_path / "other")["plate"]
    assert again == {**plain, **chosen}
    rebuild_site(places.index, tmp_path / "same")
    assert described(tmp_path / "same")["plate"] == plain


def test_the_lock_of_another_run_is_no_full_disk(tmp_path, capsys, monkeypatch):
    monkeypatch.setattr("tiles.store.PATIENCE", 0.05)
    config, out = tmp_path / "config.yaml", tmp_path / "out"
    config.write_text(
        "tile_sets: {set: {family: logistic, across: [r, 3.4, 4], up: [x, 0, 1], levels: 1, samples: 50}}"
    )
    growing = Places.of(out, "set").growing_index

    def render():
        with pytest.raises(SystemExit) as ended:
            main(["render", str(config), "--out", str(out)])
        assert ended.value.code == 1
        return capsys.readouterr().err

    def broken(*_):
        raise OutputFailed("stopped")

    with monkeypatch.context() as stopped:
        stopped.setattr(StripSource, "__call__", broken)
        assert render() == "atlas: stopped\n"
    for begun in (True, False):
        if not begun:
            growing.unlink()
        with contextlib.closing(sqlite3.connect(growing, isolation_level=None)) as other:
            other.execute("BEGIN EXCLUSIVE")
            other.execute("CREATE TABLE work (done INTEGER)")
            told = f"{growing} is being written by another run; wait for it or give another folder"
            assert render() == f"atlas: {told}\n"
            other.execute("COMMIT")
