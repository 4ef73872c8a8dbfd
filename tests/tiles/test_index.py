"""The index keeps counts, numbers and records, and refuses files that are none."""

import sqlite3
import struct
import zlib
from importlib import resources

import numpy as np
import pytest

from tests.tiles.sources import VIEW
from tiles.errors import IndexRefused, OutputFailed
from tiles.grid import TILE, Address
from tiles.index import Index
from tiles.shading import fit_counts
from tiles.store import written
from tiles.strip import PER_COLUMN

HEADER = {
    "title": "test",
    "view": {
        "across": {"name": "r", "low": "2.8", "high": "4", "scale": "linear", "label": None},
        "up": {"name": "x", "low": "0", "high": "1", "scale": "linear", "label": "share"},
    },
    "levels": {"across": 2, "up": 2},
    "pairs": [[0, 0], [1, 1], [2, 2]],
    "tile": TILE,
}


def a_tile(seed=0, largest=900):
    return np.random.default_rng(seed).integers(0, largest, (TILE, TILE)).astype(np.uint32)


@pytest.fixture
def index(tmp_path):
    with Index.create(tmp_path / "index.sqlite", HEADER) as made:
        yield made


def test_tiles_come_back(index):
    address = Address(2, 2, 3, 1)
    index.put(address, a_tile())
    found = index.get(address)
    assert found.dtype == np.uint32
    assert np.array_equal(found, a_tile())
    assert index.has(address)
    assert index.get(Address(2, 2, 3, 2)) is None
    assert not index.has(Address(2, 2, 3, 2))


def test_small_counts_come_back_writable_as_uint32(index):
    address = Address(0, 0, 0, 0)
    index.put(address, a_tile(largest=9))
    found = index.get(address)
    found += 1
    assert found.dtype == np.uint32


def test_empty_tiles_are_not_stored_and_remove_what_was_there(index):
    address = Address(1, 1, 0, 0)
    index.put(address, np.zeros((TILE, TILE), np.uint32))
    assert not index.has(address)
    index.put(address, a_tile())
    index.put(address, np.zeros((TILE, TILE), np.uint32))
    assert not index.has(address)


def test_counts_add(index):
    address = Address(2, 2, 0, 0)
    index.add(address, a_tile(1))
    index.add(address, a_tile(2))
    assert np.array_equal(index.get(address), a_tile(1) + a_tile(2))
    huge = np.full((TILE, TILE), 2**32 - 1, np.uint32)
    index.add(address, huge)
    assert np.array_equal(index.get(address), huge + (a_tile(1) + a_tile(2)).astype(np.uint64))


def test_addresses_come_in_order_at_any_depth(index):
    addresses = [Address(70, 1, column, row) for column in (2**70 - 1, 255, 256, 2**64, 0) for row in (1, 0)]
    for address in addresses:
        index.put(address, a_tile())
    assert list(index.addresses((70, 1))) == sorted(addresses)
    assert list(index.addresses((70, 2))) == []
    assert index.present((70, 1))[2**70 - 1] == [(0, 1)]


def test_present_rows_as_runs(index):
    for row in (0, 1, 2, 5, 7, 8):
        index.put(Address(3, 4, 6, row), a_tile())
    index.put(Address(3, 4, 0, 15), a_tile())
    assert index.present((3, 4)) == {0: [(15, 15)], 6: [(0, 2), (5, 5), (7, 8)]}


def test_a_column_of_tiles_comes_upwards(index):
    for row in (300, 2, 255):
        index.put(Address(1, 9, 1, row), a_tile(row))
    found = dict(index.tiles_of_column((1, 9), 1))
    assert list(found) == [2, 255, 300]
    assert np.array_equal(found[255], a_tile(255))


def filled(path, order):
    with Index.create(path, HEADER) as index:
        for row in order:
            index.put(Address(2, 2, row % 2, row), a_tile(row))
        return index.counts_digest()


def test_the_digest_does_not_depend_on_the_order_of_writing(tmp_path):
    assert filled(tmp_path / "a", [0, 1, 2, 3]) == filled(tmp_path / "b", [3, 1, 0, 2])
    assert filled(tmp_path / "c", [0, 1, 2]) != filled(tmp_path / "d", [0, 1, 2, 3])


def test_the_digest_depends_on_counts_and_addresses_alone(index):
    address = Address(2, 2, 1, 1)
    index.put(address, a_tile())
    before = index.counts_digest()
    packed = zlib.compress(zlib.decompress(index._db.execute("SELECT counts FROM tiles").fetchone()[0]), 9)
    index._db.execute("UPDATE tiles SET counts = ?", (packed,))
    index.put(Address(1, 1, 0, 0), a_tile(3))  # of another pair
    assert index.counts_digest() == before
    assert np.array_equal(index.get(address), a_tile())
    index._db.execute("DELETE FROM tiles")
    index.put(Address(2, 2, 1, 2), a_tile())
    assert index.counts_digest() != before


def test_columns_of_a_level(index):
    numbers = np.arange(6 * TILE, dtype=np.uint64).reshape(6, TILE)
    numbers[0, 0] = 2**64 - 1
    index.put_columns(1, 1, numbers)
    found = index.columns(1)
    assert list(found) == list(PER_COLUMN)
    assert all(array.dtype == np.uint64 and array.shape == (2 * TILE,) for array in found.values())
    for name, row in zip(PER_COLUMN, numbers, strict=True):
        assert np.array_equal(found[name][TILE:], row)
        assert not found[name][:TILE].any()
    assert index.column_numbers(1, 0) is None


def test_totals_beyond_64_bits(index):
    numbers = np.zeros((6, TILE), np.uint64)
    numbers[0, 0] = 2**64 - 1
    numbers[4] = 1
    for column in range(4):
        index.put_columns(2, column, numbers)
    index.put_columns(1, 0, numbers)  # coarser levels count the same samples
    assert index.totals()["exposure"] == 4 * (2**64 - 1)
    assert index.totals()["unsettled"] == 4 * TILE
    assert index.totals()["collapsed"] == 0


@pytest.mark.parametrize("shading", ["equalised", "logarithmic", "linear", "ink"])
def test_fits_come_back_bit_for_bit(index, shading):
    counts = a_tile()
    exposure = np.full(TILE, 77_777, np.uint64)
    made = fit_counts(counts, exposure, 1 / 512, shading)
    index.put_fit(made)
    assert index.fit(shading) == made
    assert index.fit("none such") is None


def test_the_fit_of_a_level_equals_that_of_its_mosaic(index):
    numbers = np.full((6, TILE), 50_000, np.uint64)
    numbers[0, 100:] += np.uint64(1)  # two exposures
    whole = np.zeros((2 * TILE, 2 * TILE), np.uint32)
    for column in (0, 1):
        index.put_columns(1, column, numbers)
        for row in (0, 1):
            counts = a_tile(2 * column + row, 70_000 if row else 40)
            index.put(Address(1, 1, column, row), counts)
            whole[column * TILE : (column + 1) * TILE, row * TILE : (row + 1) * TILE] = counts
    exposure = np.tile(numbers[0], 2)
    made = fit_counts(whole, exposure, VIEW.up.cell_size(512), "equalised")
    assert index.fit_from((1, 1)) == made
    assert index.fit_from() == made  # the middle of three pairs


def test_records(index):
    assert index.header == HEADER
    assert index.view.up.label == "share"
    assert (index.view.across.name, str(index.view.across.low)) == ("r", "2.8")
    assert index.pairs == ((0, 0), (1, 1), (2, 2))
    assert index.certificate is None
    index.put_certificate({"kind": "tile set", "shares": {"unsettled": "0"}})
    assert index.certificate == {"kind": "tile set", "shares": {"unsettled": "0"}}


def test_a_finished_index_is_one_file(tmp_path):
    path = tmp_path / "a folder?" / "index%20#1.sqlite"
    path.parent.mkdir()
    with Index.create(path, HEADER) as index:
        index.put(Address(0, 0, 0, 0), a_tile())
        assert path.with_name(path.name + "-wal").exists()
        with pytest.raises(IndexRefused, match="unfinished"):
            Index.open(path)
        index.finish()
    assert [file.name for file in path.parent.iterdir()] == [path.name]
    with Index.open(path) as index:
        assert np.array_equal(index.get(Address(0, 0, 0, 0)), a_tile())
        with pytest.raises(sqlite3.OperationalError, match="readonly"):
            index.put_record("more", 1)


def test_a_transaction_is_whole_or_not_at_all(index):
    def interrupted():
        with index.transaction():
            index.put(Address(0, 0, 0, 0), a_tile())
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        interrupted()
    assert not index.has(Address(0, 0, 0, 0))


def test_files_that_are_no_index_are_refused(tmp_path):
    with pytest.raises(IndexRefused, match="no such index"):
        Index.open(tmp_path / "missing.sqlite")
    with pytest.raises(IndexRefused, match="no such index"):
        Index.open(tmp_path)
    text = tmp_path / "text.sqlite"
    text.write_text("not a database, but long enough to be read as the header of one" * 20)
    with pytest.raises(IndexRefused, match="is not a tile index"):
        Index.open(text)
    (tmp_path / "empty.sqlite").touch()
    with pytest.raises(IndexRefused, match="is not a tile index"):
        Index.open(tmp_path / "empty.sqlite")
    other = sqlite3.connect(tmp_path / "other.sqlite")
    other.execute("CREATE TABLE tiles (number)")
    other.close()
    with pytest.raises(IndexRefused, match="is not a tile index"):
        Index.open(tmp_path / "other.sqlite")


def test_a_later_version_is_refused(index):
    index.finish()
    index._db.execute("PRAGMA user_version = 3")
    with pytest.raises(IndexRefused, match="version 3; this program reads versions 1 and 2"):
        Index.open(index.path)


def test_the_version_before_is_read(index):
    index.put(Address(1, 1, 0, 0), a_tile())
    index.finish()
    index._db.executescript("DROP TABLE classes; DROP TABLE sums; PRAGMA user_version = 1")
    with Index.open(index.path) as old:
        assert np.array_equal(old.get(Address(1, 1, 0, 0)), a_tile())
        assert old.present((1, 1)) == {0: [(0, 0)]}
        assert len(old.counts_digest()) == 64


def test_a_damaged_tile_is_named(index):
    index.put(Address(1, 0, 1, 0), a_tile())
    index._db.execute("UPDATE tiles SET counts = ?", (b"nonsense",))
    with pytest.raises(IndexRefused, match=r"\(1, 0, 1, 0\) is damaged"):
        index.get(Address(1, 0, 1, 0))


def test_a_closed_folder_is_reported(tmp_path):
    with pytest.raises(OutputFailed, match="cannot be written"):
        Index.create(tmp_path / "missing" / "index.sqlite", HEADER)


def test_the_written_description_suffices_to_read_a_tile(index):
    """Every step is one of INDEX.md, without our own readers."""
    counts = a_tile(4)
    counts[1:] = np.minimum(counts[1:], 255)  # its high bytes are listed, its low ones are not
    index.put(Address(2, 2, 3, 0), counts)
    index.put_columns(2, 3, np.arange(6 * TILE, dtype=np.uint64).reshape(6, TILE))
    with sqlite3.connect(index.path) as plain:
        row = plain.execute(
            "SELECT counts FROM tiles WHERE across_level = 2 AND up_level = 2"
            " AND tile_column = x'0103' AND tile_row = x'00'"
        ).fetchone()
        columns = plain.execute("SELECT numbers FROM columns WHERE tile_column = x'0103'").fetchone()
        numbers = [
            plain.execute(f"PRAGMA {name}").fetchone()[0] for name in ("application_id", "user_version")
        ]
    plain.close()
    text = (resources.files("tiles") / "INDEX.md").read_text("utf-8")
    assert f"`PRAGMA application_id` is {numbers[0]} (" in text
    assert f"# The index of a tile set, version {numbers[1]}\n" in text
    raw = zlib.decompress(row[0])
    found = np.zeros((256, 256), object)
    at = 1
    for k in range(raw[0]):
        (n,) = struct.unpack_from("<I", raw, at)
        at += 4
        if n == 65536:
            found += np.frombuffer(raw, np.uint8, n, at).reshape(256, 256).astype(object) << 8 * k
            at += n
        else:
            for place in range(at, at + n):
                found[raw[place], raw[place + n]] += raw[place + 2 * n] << 8 * k
            at += 3 * n
    assert at == len(raw)
    assert np.array_equal(found, counts)
    numbers = np.frombuffer(zlib.decompress(columns[0]), "<u8").reshape(6, 256)
    assert numbers[1, 0] == 256


def test_the_lock_of_another_run_is_reported_as_such(index, monkeypatch):
    monkeypatch.setattr("tiles.store.PATIENCE", 0.05)
    with Index.open(index.path, write=True, finished=False) as late:
        with index.transaction(), pytest.raises(OutputFailed) as told, written(late.path), late.transaction():
            pass
        assert str(told.value) == (
            f"{index.path} is being written by another run; wait for it or give another folder"
        )
        with pytest.raises(OutputFailed, match="another run"), written(late.path):
            late.finish()
        with written(late.path), late.transaction():
            late.put_record("free", 1)
