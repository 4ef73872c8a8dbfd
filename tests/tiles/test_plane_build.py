"""A built index of planes holds exactly the class counts and sums of its source, however it was built."""

import contextlib
import hashlib
import math
import os
import signal
import sqlite3
import subprocess
import sys
import threading
import zlib

import numpy as np
import pytest

from tests.tiles.planes import HEADER, VIEW, Plane, whole
from tests.tiles.test_build import Interrupted, Stopped, Threads
from tiles.errors import IndexRefused, OutputFailed
from tiles.grid import TILE, Address, level_pairs
from tiles.index import Index
from tiles.plane import PlaneTile, next_finer
from tiles.plane_build import build_planes
from tiles.plane_index import PlaneIndex
from tiles.values import fit_values

A, U = 2, 2


@pytest.fixture(scope="module")
def plane():
    return Plane(A, U)


def built(folder, plane, *, pairs="diagonal", header=HEADER, **more):
    path = folder / "index.sqlite"
    build_planes(
        path,
        VIEW,
        across_level=plane.deepest[0],
        up_level=plane.deepest[1],
        pairs=pairs,
        source=more.pop("source", plane.source),
        header=header,
        **more,
    )
    return path


def contents(path):
    """All that an index says: every tile and record."""
    with PlaneIndex.open(path) as index:
        tables = [
            index._db.execute(f"SELECT * FROM {name} ORDER BY 1, 2, 3, 4, 5").fetchall()
            for name in ("classes", "sums")
        ]
        return tables, index._db.execute("SELECT * FROM records ORDER BY 1").fetchall(), index.counts_digest()


@pytest.fixture(scope="module")
def reference(tmp_path_factory, plane):
    return contents(built(tmp_path_factory.mktemp("reference"), plane, pairs="all"))


def check_pair(index, plane, pair):
    """Compare everything of a level pair with the twin, bit for bit."""
    tiles = {address: index.plane(address) for address in list(index.addresses(pair))}
    for number in np.unique(plane.classes).tolist():
        found = whole(tiles, lambda tile, number=number: tile.classes.get(number, 0), np.uint64)
        assert np.array_equal(found, plane.counts(pair, number))
    assert np.array_equal(whole(tiles, lambda tile: tile.majority(), np.uint16), plane.majority(pair))
    for name in plane.values:
        means = whole(tiles, lambda tile, name=name: tile.means(name))
        assert means.tobytes() == plane.means(pair, name).tobytes()


@pytest.mark.parametrize("pairs", ["diagonal", "all", [(2, 0), (0, 2)], [(0, 0)], []])
def test_every_level_equals_the_twin(tmp_path, plane, pairs):
    with PlaneIndex.open(built(tmp_path, plane, pairs=pairs)) as index:
        assert index.pairs == level_pairs(A, U, pairs)
        for pair in index.pairs:
            assert index.present(pair) == {column: [(0, 2 ** pair[1] - 1)] for column in range(2 ** pair[0])}
            check_pair(index, plane, pair)


@pytest.mark.parametrize("levels", [(0, 0), (0, 2), (2, 0), (3, 1)])
def test_lopsided_sets(tmp_path, levels):
    plane = Plane(*levels)
    with PlaneIndex.open(built(tmp_path, plane)) as index:
        for pair in index.pairs:
            check_pair(index, plane, pair)


def test_sums_are_near_the_exact_ones(tmp_path, plane):
    with PlaneIndex.open(built(tmp_path, plane)) as index:
        found = index.plane(Address(0, 0, 0, 0)).values["lyapunov"].sums
    for column, row in [(0, 0), (17, 200), (255, 255)]:
        part = plane.values["lyapunov"][4 * column : 4 * column + 4, 4 * row : 4 * row + 4]
        finite = part[np.isfinite(part)]
        assert found[column, row] == pytest.approx(math.fsum(finite), rel=1e-12, abs=1e-9)


def test_every_coarser_pair_has_one_way_down():
    deepest = (5, 3)
    for a in range(6):
        for u in range(4):
            pair, steps = (a, u), []
            while pair != deepest:
                finer = next_finer(pair, deepest)
                steps.append((finer[0] - pair[0], finer[1] - pair[1]))
                pair = finer
            assert steps == sorted(steps, key=lambda step: step == (1, 1))
            assert len({step for step in steps if step != (1, 1)}) <= 1


def test_a_tile_is_asked_for_once_in_the_threads_of_the_scheduler(tmp_path):
    plane = Plane(1, 1)
    built(tmp_path, plane, run=Threads(3, 5))
    assert sorted(plane.asked) == [Address(1, 1, column, row) for column in (0, 1) for row in (0, 1)]
    assert threading.get_ident() not in plane.threads


@pytest.mark.parametrize(("workers", "ahead"), [(1, 0), (4, 5), (7, 100)])
def test_any_number_of_workers_makes_the_same_index(tmp_path, plane, reference, workers, ahead):
    assert contents(built(tmp_path, plane, pairs="all", run=Threads(workers, ahead))) == reference


def stopping(plane, after):
    """A source that fails once it was asked so many times."""
    left = [after]

    def source(address):
        if left[0] == 0:
            raise Interrupted
        left[0] -= 1
        return plane.source(address)

    return source


@pytest.mark.parametrize("after", [0, 1, 5, 15])
def test_a_second_run_goes_on_from_the_finished_tiles(tmp_path, plane, reference, after):
    with pytest.raises(Interrupted):
        built(tmp_path, plane, pairs="all", source=stopping(plane, after))
    assert not (tmp_path / "index.sqlite").exists()
    plane.asked.clear()
    assert contents(built(tmp_path, plane, pairs="all")) == reference
    assert plane.asked == [Address(A, U, k // 4, k % 4) for k in range(after, 16)]


def test_interruptions_among_the_coarser_levels(tmp_path, plane, reference):
    for limit in (16 + 3, 1, 9):
        with pytest.raises(Interrupted):
            built(tmp_path, plane, pairs="all", run=Stopped(limit))
    plane.asked.clear()
    assert contents(built(tmp_path, plane, pairs="all")) == reference
    assert not plane.asked


def test_an_unfinished_index_of_another_job_is_not_continued(tmp_path, plane, reference):
    with pytest.raises(Interrupted):
        built(tmp_path, plane, source=stopping(plane, 3), header={**HEADER, "title": "other"})
    assert contents(built(tmp_path, plane, pairs="all")) == reference


KILLED = """
import os, signal, sys
from pathlib import Path
from tests.tiles.planes import Plane
from tests.tiles.test_plane_build import built
plane = Plane(2, 2)
left = int(sys.argv[2])
def source(address):
    global left
    if left == 0:
        os.kill(os.getpid(), signal.SIGKILL)
    left -= 1
    return plane.source(address)
built(Path(sys.argv[1]), plane, pairs="all", source=source)
"""


def test_a_killed_process_leaves_nothing_under_the_final_name(tmp_path, plane, reference):
    ended = subprocess.run([sys.executable, "-c", KILLED, str(tmp_path), "5"], check=False)
    assert ended.returncode == -signal.SIGKILL
    assert os.listdir(tmp_path) == [".parts"]
    plane.asked.clear()
    assert contents(built(tmp_path, plane, pairs="all")) == reference
    assert len(plane.asked) == 11


FULL = """
import resource, sys
from pathlib import Path
from tests.tiles.planes import Plane
from tests.tiles.test_plane_build import built
from tiles.errors import OutputFailed
resource.setrlimit(resource.RLIMIT_FSIZE, (2_000_000, 2_000_000))  # as if the disk were full
try:
    built(Path(sys.argv[1]), Plane(2, 2), pairs="all")
except OutputFailed as problem:
    print(problem)
"""


def test_a_full_disk_is_reported_and_nothing_is_lost(tmp_path, plane, reference):
    ended = subprocess.run(
        [sys.executable, "-c", FULL, str(tmp_path)], check=True, text=True, stdout=subprocess.PIPE
    )
    assert ended.stdout.count("\n") == 1
    assert "cannot be written" in ended.stdout
    assert contents(built(tmp_path, plane, pairs="all")) == reference


def test_a_folder_that_cannot_be_made_is_reported(tmp_path, plane):
    (tmp_path / "file").touch()
    with pytest.raises(OutputFailed, match="cannot be written"):
        built(tmp_path / "file", plane)


def test_wrong_tiles_of_a_source_are_found_out(tmp_path, plane):
    def source(address):
        tile = plane.source(address)
        return PlaneTile(tile.classes, {"lyapunov": tile.values["lyapunov"]})

    with pytest.raises(AssertionError, match=r"returned the layers \['lyapunov'\]"):
        built(tmp_path, plane, source=source)
    for wrong in (
        PlaneTile(np.zeros((TILE, TILE), np.int64), dict(plane.source(Address(A, U, 0, 0)).values)),
        PlaneTile(np.ones((TILE, TILE), np.uint16), dict.fromkeys(plane.values, np.zeros((TILE, 1)))),
    ):
        with pytest.raises(AssertionError, match="of a tile are"):
            built(tmp_path, plane, source=lambda _, wrong=wrong: wrong)
    assert not (tmp_path / "index.sqlite").exists()


def test_planes_without_values(tmp_path):
    plane = Plane(1, 1)
    plane.values = {}
    with PlaneIndex.open(built(tmp_path, plane, header={**HEADER, "value_layers": []})) as index:
        check_pair(index, plane, (0, 0))
        assert index.value_layers == ()


def test_the_digest_depends_on_classes_values_and_addresses(tmp_path, plane, reference):
    other = Plane(A, U)
    other.classes[5, 5] = 77
    one = contents(built(tmp_path / "classes", other))[2]
    other = Plane(A, U)
    other.values["lyapunov"][5, 5] = 0.125
    two = contents(built(tmp_path / "values", other))[2]
    other.values["lyapunov"][5, 5] = np.nan
    three = contents(built(tmp_path / "missing", other))[2]
    diagonal = contents(built(tmp_path / "same", plane))[2]
    assert diagonal == reference[2]
    assert len({one, two, three, diagonal}) == 4


def test_the_written_description_suffices_to_read_a_tile(tmp_path, plane):
    """Every step is one of INDEX.md, without our own readers; sums are read in the tests of their codec."""
    path, deepest = built(tmp_path, plane), "WHERE across_level = 2 AND up_level = 2"
    at = f"{deepest} AND tile_column = x'0103' AND tile_row = x'0101'"
    with contextlib.closing(sqlite3.connect(path)) as plain:
        found = np.zeros((256, 256), int)
        for number, blob in plain.execute(f"SELECT class, counts FROM classes {at}"):
            raw = zlib.decompress(blob)
            size = int.from_bytes(raw[1:5], "little")
            assert raw[0] == 1
            if size == 65536:
                found[np.frombuffer(raw, np.uint8, size, 5).reshape(256, 256) == 1] = number
            else:
                found[list(raw[5 : 5 + size]), list(raw[5 + size : 5 + 2 * size])] = number
        digest = hashlib.sha256()
        order = f"{deepest} ORDER BY tile_column, tile_row"
        for row in plain.execute(f"SELECT tile_column, tile_row, class, digest FROM classes {order}, class"):
            digest.update(row[0] + row[1] + row[2].to_bytes(2, "big") + row[3])
        for row in plain.execute(f"SELECT tile_column, tile_row, layer, digest FROM sums {order}, layer"):
            digest.update(row[0] + row[1] + row[2].encode() + b"\0" + row[3])
    assert np.array_equal(found, plane.classes[768:1024, 256:512])
    assert digest.hexdigest() == contents(path)[2]


def test_what_the_index_says_of_its_planes(tmp_path, plane):
    def finish(index):
        index.put_value_fit("lyapunov", index.value_fit_from("lyapunov", "diverging"))
        index.put_certificate({"counts_digest": index.counts_digest()})

    with PlaneIndex.open(built(tmp_path, plane, finish=finish)) as index:
        numbers, counts = np.unique(plane.classes, return_counts=True)
        assert index.class_totals() == dict(zip(numbers.tolist(), counts.tolist(), strict=True))
        means = plane.means((1, 1), "lyapunov")
        assert index.value_fit("lyapunov") == fit_values(means, kind="diverging")
        assert index.value_fit("rotation") is None
        assert index.class_layer == "fate"
        assert [layer["name"] for layer in index.value_layers] == ["lyapunov", "rotation"]
        assert index.header["kind"] == "plane"
        assert index.certificate == {"counts_digest": index.counts_digest()}


def test_a_large_pair_is_fitted_to_every_second_cell(tmp_path, plane, monkeypatch):
    monkeypatch.setattr("tiles.plane_index._FITTED_CELLS", 1 << 17)
    with PlaneIndex.open(built(tmp_path, plane)) as index:
        wanted = fit_values(plane.means((1, 1), "lyapunov")[::2, ::2], kind="diverging")
        assert index.value_fit_from("lyapunov", "diverging") == wanted


def test_a_missing_and_a_damaged_tile_are_named(tmp_path, plane):
    with PlaneIndex.open(built(tmp_path, plane), write=True) as index:
        index._db.execute("UPDATE sums SET sums = ? WHERE up_level = 0", (b"nonsense",))
        with pytest.raises(IndexRefused, match=r"\(0, 0, 0, 0\) is damaged"):
            index.plane(Address(0, 0, 0, 0))
        with pytest.raises(IndexRefused, match=r"\(1, 0, 0, 0\) is missing"):
            index.plane(Address(1, 0, 0, 0))


def test_an_index_of_planes_is_an_index(tmp_path, plane):
    with Index.open(built(tmp_path, plane)) as index:
        assert index.view == VIEW
        assert index.header["class_layer"] == "fate"
