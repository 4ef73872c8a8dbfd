"""A built index holds exactly the counts of its source, however and how often it was built."""

import dataclasses
import os
import signal
import subprocess
import sys
from concurrent.futures import ThreadPoolExecutor

import numpy as np
import pytest

from tests.tiles.sources import VIEW, Scene, mosaic
from tiles.build import build
from tiles.column import strip_width
from tiles.errors import OutputFailed
from tiles.grid import TILE, Address, level_pairs
from tiles.index import Index
from tiles.strip import PER_COLUMN

A, U = 3, 2
HEADER = {"title": "test", "formula": ("r * x * (1 - x)",)}


@pytest.fixture(scope="module")
def scene():
    return Scene(A, U)


def built(folder, scene, *, levels=(A, U), pairs="diagonal", header=HEADER, **more):
    path = folder / "index.sqlite"
    build(
        path,
        VIEW,
        across_level=levels[0],
        up_level=levels[1],
        pairs=pairs,
        source=more.pop("source", scene.source),
        header=header,
        **more,
    )
    return path


def contents(path):
    """All that an index says: every tile, number and record."""
    with Index.open(path) as index:
        tables = [
            index._db.execute(f"SELECT * FROM {name} ORDER BY 1, 2, 3").fetchall()
            for name in ("tiles", "columns")
        ]
        return tables, index._db.execute("SELECT * FROM records ORDER BY 1").fetchall(), index.counts_digest()


@pytest.fixture(scope="module")
def reference(tmp_path_factory, scene):
    return contents(built(tmp_path_factory.mktemp("reference"), scene, pairs="all"))


@pytest.mark.parametrize("pairs", ["diagonal", "all", [(3, 0), (1, 1), (0, 2)], []])
def test_every_level_equals_sums_over_the_source(tmp_path, scene, pairs):
    with Index.open(built(tmp_path, scene, pairs=pairs)) as index:
        assert index.pairs == level_pairs(A, U, pairs)
        for pair in index.pairs:
            counts, numbers = scene.at(pair, (A, U))
            assert np.array_equal(mosaic(index, pair), counts)
            columns = index.columns(pair[0])
            assert all(np.array_equal(columns[name], numbers[k]) for k, name in enumerate(PER_COLUMN))
        stored = {address for pair in index.pairs for address in index.addresses(pair)}
        assert all(index.get(address).any() for address in stored)


@pytest.mark.parametrize("levels", [(0, 0), (0, 3), (2, 0), (5, 0), (6, 0)])
def test_lopsided_sets(tmp_path, levels):
    scene = Scene(*levels)
    with Index.open(built(tmp_path, scene, levels=levels)) as index:
        for pair in level_pairs(*levels):
            assert np.array_equal(mosaic(index, pair), scene.at(pair, levels)[0])


def test_counts_beyond_32_bits_are_kept(tmp_path):
    scene = Scene(2, 1)
    scene.counts[:, 7] = 2**32 - 1
    scene.numbers[0] = scene.counts.sum(axis=1, dtype=np.uint64) + scene.numbers[1:5].sum(axis=0)
    with Index.open(built(tmp_path, scene, levels=(2, 1))) as index:
        for pair in index.pairs:
            assert np.array_equal(mosaic(index, pair), scene.at(pair, (2, 1))[0])
        assert index.get(Address(0, 0, 0, 0)).dtype == np.uint64
        assert index.get(Address(2, 1, 0, 0)).dtype == np.uint32


@pytest.mark.parametrize("width", [1, 8, 64, 128, 256])
def test_narrow_strips_make_the_same_index(tmp_path, scene, reference, width):
    rows = TILE << U
    scene.asked.clear()
    path = built(tmp_path, scene, pairs="all", cells_per_strip=width * rows + rows - 1)
    assert {last - first for first, last in scene.asked} == {width}
    assert contents(path) == reference
    assert not list((tmp_path / ".parts").iterdir())


def test_strips_are_powers_of_two_and_never_empty():
    assert [strip_width(cells, 100) for cells in (1, 100, 399, 400, 1000, 10**9)] == [1, 1, 2, 4, 8, 256]


class Threads:
    """Runs tasks in threads, some ahead, and hands on the results in order."""

    def __init__(self, workers, ahead):
        self.workers, self.ahead = workers, ahead

    def __call__(self, tasks, done):
        with ThreadPoolExecutor(self.workers) as pool:
            waiting = []
            for task in tasks:
                waiting.append(pool.submit(task))
                if len(waiting) > self.ahead:
                    done(waiting.pop(0).result())
            for result in waiting:
                done(result.result())


@pytest.mark.parametrize(("workers", "ahead"), [(1, 0), (4, 5), (7, 100)])
def test_any_number_of_workers_makes_the_same_index(tmp_path, scene, reference, workers, ahead):
    path = built(tmp_path, scene, pairs="all", run=Threads(workers, ahead), cells_per_strip=64 * (TILE << U))
    assert contents(path) == reference


class Interrupted(Exception):
    pass


def stopping(scene, after):
    """A source that fails once it was asked so many times."""
    left = [after]

    def source(first, last):
        if left[0] == 0:
            raise Interrupted
        left[0] -= 1
        return scene.source(first, last)

    return source


@pytest.mark.parametrize("after", [0, 1, 3, 7])
def test_a_second_run_goes_on_from_the_finished_tile_columns(tmp_path, scene, reference, after):
    with pytest.raises(Interrupted):
        built(tmp_path, scene, pairs="all", source=stopping(scene, after))
    assert not (tmp_path / "index.sqlite").exists()
    scene.asked.clear()
    path = built(tmp_path, scene, pairs="all")
    assert scene.asked == [(column * TILE, (column + 1) * TILE) for column in range(after, 2**A)]
    assert contents(path) == reference


class Stopped:
    """Runs so many tasks, then is interrupted."""

    def __init__(self, limit):
        self.left = limit

    def __call__(self, tasks, done):
        for task in tasks:
            if self.left == 0:
                raise Interrupted
            self.left -= 1
            done(task())


def test_interruptions_among_the_coarser_levels(tmp_path, scene, reference):
    for limit in (2**A + 1, 1, 2):
        run = Stopped(limit)
        with pytest.raises(Interrupted):
            built(tmp_path, scene, pairs="all", run=run)
    scene.asked.clear()
    assert contents(built(tmp_path, scene, pairs="all")) == reference
    assert not scene.asked


def test_other_strips_may_go_on_where_the_first_ones_stopped(tmp_path, scene, reference):
    with pytest.raises(Interrupted):
        built(tmp_path, scene, pairs="all", source=stopping(scene, 9), cells_per_strip=64 * (TILE << U))
    scene.asked.clear()
    assert contents(built(tmp_path, scene, pairs="all")) == reference
    assert scene.asked[0] == (2 * TILE, 3 * TILE)


@pytest.mark.parametrize("change", ["header", "pairs", "levels"])
def test_an_unfinished_index_of_another_job_is_not_continued(tmp_path, scene, change):
    with pytest.raises(Interrupted):
        built(tmp_path, scene, source=stopping(scene, 3))
    other = {
        "header": {"header": {**HEADER, "title": "other"}},
        "pairs": {"pairs": "all"},
        "levels": {"levels": (A - 1, U)},
    }[change]
    small = Scene(A - 1, U) if change == "levels" else scene
    small.asked.clear()
    built(tmp_path, small, **other)
    assert small.asked[0] == (0, TILE)


@pytest.mark.parametrize("torn", [b"", b"nonsense" * 1000])
def test_a_torn_unfinished_index_is_built_again(tmp_path, scene, reference, torn):
    parts = tmp_path / ".parts"
    parts.mkdir()
    (parts / "index.sqlite").write_bytes(torn)
    assert contents(built(tmp_path, scene, pairs="all")) == reference


KILLED = """
import os, signal, sys
from pathlib import Path
from tests.tiles.sources import Scene
from tests.tiles.test_build import built
scene = Scene(3, 2)
left = int(sys.argv[2])
def source(first, last):
    global left
    if left == 0:
        os.kill(os.getpid(), signal.SIGKILL)
    left -= 1
    return scene.source(first, last)
built(Path(sys.argv[1]), scene, pairs="all", source=source)
"""


def test_a_killed_process_leaves_nothing_under_the_final_name(tmp_path, scene, reference):
    final = tmp_path / "index.sqlite"
    ended = subprocess.run([sys.executable, "-c", KILLED, str(tmp_path), "5"], check=False)
    assert ended.returncode == -signal.SIGKILL
    assert not final.exists()
    assert os.listdir(tmp_path) == [".parts"]
    scene.asked.clear()
    assert contents(built(tmp_path, scene, pairs="all")) == reference
    assert scene.asked == [(column * TILE, (column + 1) * TILE) for column in range(5, 2**A)]


def test_an_index_that_is_there_stays_until_the_new_one_is_complete(tmp_path, scene):
    path = built(tmp_path, scene)
    before = path.read_bytes()
    with pytest.raises(Interrupted):
        built(tmp_path, scene, pairs="all", source=stopping(scene, 3))
    assert path.read_bytes() == before
    built(tmp_path, scene, pairs="all")
    with Index.open(path) as index:
        assert len(index.pairs) == 12


def test_fit_and_certificate_are_stored_before_the_index_appears(tmp_path, scene):
    path = tmp_path / "index.sqlite"

    def finish(index):
        assert not path.exists()
        index.put_fit(index.fit_from(shading="linear"))
        index.put_certificate({"counts_digest": index.counts_digest()})

    built(tmp_path, scene, finish=finish)
    with Index.open(path) as index:
        assert index.fit("linear") == index.fit_from(shading="linear")
        assert index.certificate == {"counts_digest": index.counts_digest()}


def test_the_unfinished_index_may_stand_elsewhere(tmp_path, scene):
    place = tmp_path / "parts" / "name.sqlite"
    with pytest.raises(Interrupted):
        built(tmp_path / "out", scene, source=stopping(scene, 3), unfinished=place)
    assert place.exists()
    built(tmp_path / "out", scene, unfinished=place)
    assert os.listdir(tmp_path / "out") == ["index.sqlite"]
    assert os.listdir(tmp_path / "parts") == []


@pytest.mark.parametrize("cells", [1 << 24, 64 * (TILE << U)])
def test_a_source_that_loses_samples_is_found_out(tmp_path, scene, cells):
    def source(first, last):
        strip = scene.source(first, last)
        strip.counts[-1, 5] += 1
        return strip

    with pytest.raises(AssertionError, match="accounts for"):
        built(tmp_path, scene, source=source, cells_per_strip=cells)
    assert not (tmp_path / "index.sqlite").exists()


def test_a_source_that_returns_other_columns_is_found_out(tmp_path, scene):
    def source(first, last):
        return dataclasses.replace(scene.source(first, last), first=first + 1)

    with pytest.raises(AssertionError, match="were asked for"):
        built(tmp_path, scene, source=source)


FULL = """
import resource, sys
from pathlib import Path
from tests.tiles.sources import Scene
from tests.tiles.test_build import built
from tiles.errors import OutputFailed
resource.setrlimit(resource.RLIMIT_FSIZE, (400_000, 400_000))  # as if the disk were full
try:
    built(Path(sys.argv[1]), Scene(3, 2), pairs="all", cells_per_strip=int(sys.argv[2]))
except OutputFailed as problem:
    print(problem)
"""


@pytest.mark.parametrize("cells", [1 << 24, 1 << 16])
def test_a_full_disk_is_reported_and_nothing_is_lost(tmp_path, scene, reference, cells):
    ended = subprocess.run(
        [sys.executable, "-c", FULL, str(tmp_path), str(cells)], check=True, text=True, stdout=subprocess.PIPE
    )
    assert ended.stdout.count("\n") == 1
    assert "cannot be written" in ended.stdout
    assert "free some space" in ended.stdout
    assert not (tmp_path / "index.sqlite").exists()
    assert contents(built(tmp_path, scene, pairs="all")) == reference


def test_a_folder_that_cannot_be_made_is_reported(tmp_path, scene):
    (tmp_path / "file").touch()
    with pytest.raises(OutputFailed, match="cannot be written"):
        built(tmp_path / "file", scene)
