"""The static folder shows exactly the counts of the index, and appears whole."""

import contextlib
import json
import os
import shutil
import signal
import sqlite3
import subprocess
import sys
from importlib import resources

import numpy as np
import pytest
from PIL import Image

from tests.tiles.sources import VIEW, Scene, mosaic
from tests.tiles.test_build import Interrupted, Stopped, Threads
from tiles.build import build
from tiles.errors import IndexRefused, OutputFailed
from tiles.grid import TILE, Address
from tiles.index import Index
from tiles.palette import PaletteRefused
from tiles.shading import colour_table, fit_counts, shade, shade_counts
from tiles.site import build_site, pixels
from tiles.tally import density

A, U = 2, 2


def indexed(folder, scene, name="index.sqlite", **more):
    path = folder / name
    build(
        path,
        VIEW,
        across_level=A,
        up_level=U,
        pairs="all",
        source=scene.source,
        header={"title": "made up", "formula": ["a", "b"], "plate": {"family": "none"}},
        **more,
    )
    return path


@pytest.fixture(scope="module")
def scene():
    return Scene(A, U)


@pytest.fixture(scope="module")
def index_path(tmp_path_factory, scene):
    return indexed(tmp_path_factory.mktemp("index"), scene)


@pytest.fixture(scope="module")
def site(tmp_path_factory, index_path):
    folder = tmp_path_factory.mktemp("out") / "site"
    build_site(index_path, folder, palette="blue")
    return folder


def files(folder):
    """Every file of a folder by its relative name."""
    return {str(path.relative_to(folder)): path.read_bytes() for path in folder.rglob("*") if path.is_file()}


def described(site):
    text = (site / "meta.js").read_text("ascii")
    return json.loads(text.removeprefix("window.ATLAS_META = ").removesuffix(";\n"))


def picture(site, address):
    a, u, column, row = address
    with Image.open(site / "tiles" / "density" / str(a) / str(u) / str(column) / f"{row}.png") as image:
        assert (image.mode, image.size) == ("P", (TILE, TILE))
        return np.asarray(image.convert("RGB"))


def test_pictures_joined_are_the_shaded_mosaic(site, index_path):
    """No seams: shading the whole level at once gives every pixel of every picture."""
    table = colour_table("blue")
    with Index.open(index_path) as index:
        fit = index.fit_from()
        for pair in index.pairs:
            counts, exposure = mosaic(index, pair), index.columns(pair[0])["exposure"]
            shades = shade(density(counts, exposure, VIEW.up.cell_size(TILE << pair[1])), fit)
            whole = table[shades.T[::-1]]
            for address in index.addresses(pair):
                left, top = address.column * TILE, (2**address.up_level - 1 - address.row) * TILE
                expected = whole[top : top + TILE, left : left + TILE]
                assert np.array_equal(picture(site, address), expected)
                assert np.array_equal(pixels(index, fit, table, address), expected)


def test_only_tiles_that_are_not_empty_have_a_picture(site, index_path):
    with Index.open(index_path) as index:
        stored = {address for pair in index.pairs for address in index.addresses(pair)}
    found = {
        Address(*(int(part) for part in path.relative_to(site / "tiles" / "density").with_suffix("").parts))
        for path in site.rglob("*.png")
    }
    assert found == stored
    assert len(found) < sum(2 ** (a + u) for a in range(A + 1) for u in range(U + 1))


def test_an_empty_tile_is_all_background(index_path):
    with Index.open(index_path) as index:
        empty = next(
            Address(A, U, column, row)
            for column in range(4)
            for row in range(4)
            if not index.has(Address(A, U, column, row))
        )
        found = pixels(index, index.fit_from(), colour_table("blue", background="#010203"), empty)
    assert found.shape == (TILE, TILE, 3)
    assert (found == [1, 2, 3]).all()


def test_present_lists_the_pictures(site):
    found = described(site)
    listed = set()
    for pair, columns in found["present"].items():
        for column, runs in columns.items():
            for run in runs.split(","):
                first, _, last = run.partition("-")
                listed.update(
                    f"tiles/density/{pair}/{column}/{row}.png"
                    for row in range(int(first), int(last or first) + 1)
                )
    assert listed == {name for name in files(site) if name.endswith(".png")}
    assert found["pairs"] == [[a, u] for a in range(A + 1) for u in range(U + 1)]


def test_the_description(site, scene):
    found = described(site)
    assert (found["title"], found["formula"]) == ("made up", ["a", "b"])
    assert found["plate"] == {"family": "none", "shading": "equalised", "palette": "blue"}
    assert found["axes"]["across"]["low"] == {"num": "14", "den": "5"}
    columns = set()
    for run in found["marks"][str(A)].split(","):
        first, _, last = run.partition("-")
        columns.update(range(int(first), int(last or first) + 1))
    assert columns == set(np.flatnonzero(scene.numbers[4]).tolist())
    assert len(columns) > 0


def test_the_page_comes_along(site):
    page = {
        file.name: file.read_bytes()
        for file in resources.files("tiles.page").iterdir()
        if file.name.endswith((".html", ".css", ".js"))
    }
    assert "index.html" in page
    found = files(site)
    assert {name: found[name] for name in page} == page
    assert {name for name in found if "/" not in name} == {*page, "meta.js"}


def test_columns_of_different_exposure_are_shaded_alike(tmp_path):
    uneven = Scene(A, U, seed=5)
    uneven.numbers[0] += np.arange(uneven.columns, dtype=np.uint64) * np.uint64(1000)
    uneven.numbers[1] += np.arange(uneven.columns, dtype=np.uint64) * np.uint64(1000)
    with Index.open(indexed(tmp_path, uneven)) as index:
        fit, table = index.fit_from(), colour_table("grey")
        exposure, height = index.columns(A)["exposure"], VIEW.up.cell_size(TILE << U)
        shades = shade_counts(uneven.counts, exposure, height, fit)
        address = next(index.addresses((A, U)))
        left, low = address.column * TILE, address.row * TILE
        expected = table[shades[left : left + TILE, low : low + TILE].T[::-1]]
        assert np.array_equal(pixels(index, fit, table, address), expected)


@pytest.mark.parametrize("shading", ["logarithmic", "linear", "ink"])
def test_the_middle_level_gives_the_fit_unless_one_is_stored(tmp_path, scene, index_path, shading):
    build_site(index_path, tmp_path / "fitted", shading=shading)
    assert described(tmp_path / "fitted")["key"]["shading"] == shading

    def finish(index):
        index.put_fit(fit_counts(np.array([[1, 2, 3]]), np.array([10]), 0.5, shading))

    build_site(indexed(tmp_path, scene, finish=finish), tmp_path / "stored", shading=shading)
    one, other = files(tmp_path / "fitted"), files(tmp_path / "stored")
    if shading != "ink":
        assert one["tiles/density/0/0/0/0.png"] != other["tiles/density/0/0/0/0.png"]
    del one["meta.js"], other["meta.js"]
    assert set(one) == set(other)


@pytest.mark.parametrize(("workers", "ahead"), [(1, 0), (7, 100)])
def test_any_number_of_workers_writes_the_same_folder(tmp_path, index_path, site, workers, ahead):
    build_site(index_path, tmp_path / "site", palette="blue", run=Threads(workers, ahead))
    assert files(tmp_path / "site") == files(site)


def test_an_interrupted_site_is_continued(tmp_path, index_path, site):
    for limit in (0, 3, 2):
        with pytest.raises(Interrupted):
            build_site(index_path, tmp_path / "site", palette="blue", run=Stopped(limit))
        assert os.listdir(tmp_path) == [".parts"]
    done = {path: path.stat().st_mtime_ns for path in (tmp_path / ".parts").rglob("*.png")}
    assert done
    build_site(index_path, tmp_path / "site", palette="blue")
    assert files(tmp_path / "site") == files(site)
    for path, time in done.items():
        final = tmp_path / "site" / path.relative_to(tmp_path / ".parts" / "site")
        assert final.stat().st_mtime_ns == time
    assert os.listdir(tmp_path / ".parts") == []


def test_an_interrupted_site_of_other_colours_is_not_continued(tmp_path, index_path, site):
    with pytest.raises(Interrupted):
        build_site(index_path, tmp_path / "site", palette="grey", run=Stopped(4))
    build_site(index_path, tmp_path / "site", palette="blue")
    assert files(tmp_path / "site") == files(site)


KILLED = """
import os, signal, sys
from pathlib import Path
from tiles.site import build_site
def run(tasks, done):
    for number, task in enumerate(tasks):
        if number == 5:
            os.kill(os.getpid(), signal.SIGKILL)
        done(task())
build_site(Path(sys.argv[1]), Path(sys.argv[2]), palette="blue", run=run)
"""


def test_a_killed_process_leaves_no_folder(tmp_path, index_path, site):
    folder = tmp_path / "site"
    ended = subprocess.run([sys.executable, "-c", KILLED, str(index_path), str(folder)], check=False)
    assert ended.returncode == -signal.SIGKILL
    assert not folder.exists()
    build_site(index_path, folder, palette="blue")
    assert files(folder) == files(site)


def test_an_old_folder_stays_until_the_new_one_is_complete(tmp_path, index_path, site):
    folder = tmp_path / "site"
    folder.mkdir()
    (folder / "old.txt").write_text("old")
    with pytest.raises(Interrupted):
        build_site(index_path, folder, palette="blue", run=Stopped(4))
    assert os.listdir(folder) == ["old.txt"]
    build_site(index_path, folder, palette="blue")
    assert files(folder) == files(site)
    assert os.listdir(tmp_path / ".parts") == []


def test_nothing_is_written_for_a_wrong_request(tmp_path, index_path):
    with pytest.raises(IndexRefused, match="no such index"):
        build_site(tmp_path / "missing.sqlite", tmp_path / "site")
    with pytest.raises(PaletteRefused):
        build_site(index_path, tmp_path / "site", palette="plaid")
    assert os.listdir(tmp_path) == []


FULL = """
import resource, sys
from pathlib import Path
from tiles.errors import OutputFailed
from tiles.site import build_site
resource.setrlimit(resource.RLIMIT_FSIZE, (5_000, 5_000))  # as if the disk were full
try:
    build_site(Path(sys.argv[1]), Path(sys.argv[2]), palette="blue")
except OutputFailed as problem:
    print(problem)
"""


def test_a_full_disk_is_reported(tmp_path, index_path, site):
    folder = tmp_path / "site"
    ended = subprocess.run(
        [sys.executable, "-c", FULL, str(index_path), str(folder)],
        check=True,
        text=True,
        stdout=subprocess.PIPE,
    )
    assert "cannot be written" in ended.stdout
    assert not folder.exists()
    build_site(index_path, folder, palette="blue")
    assert files(folder) == files(site)


def test_a_folder_that_cannot_be_made_is_reported(tmp_path, index_path):
    (tmp_path / "file").touch()
    with pytest.raises(OutputFailed, match="cannot be written"):
        build_site(index_path, tmp_path / "file" / "site")


@pytest.mark.parametrize("damage", ["pages", "header"])
def test_a_damaged_index_is_refused_in_one_sentence(tmp_path, index_path, damage):
    index = tmp_path / "damaged.sqlite"
    shutil.copy(index_path, index)
    if damage == "pages":
        data = bytearray(index.read_bytes())
        data[4096:] = b"\xff" * (len(data) - 4096)
        index.write_bytes(bytes(data))
    else:
        with contextlib.closing(sqlite3.connect(index)) as db, db:
            db.execute("UPDATE records SET json = '{}' WHERE name = 'header'")
    with pytest.raises(IndexRefused, match="is damaged or no tile index"):
        build_site(index, tmp_path / "site")
    assert not (tmp_path / "site").exists()
