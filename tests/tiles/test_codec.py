"""A tile of counts survives its encoding; its digest depends on the counts alone."""

import zlib

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as some

from tiles.codec import decode, encode, narrow
from tiles.grid import TILE


def a_tile(largest, kind=np.uint64, seed=0):
    rng = np.random.default_rng(seed)
    counts = rng.integers(0, largest, (TILE, TILE), dtype=np.uint64, endpoint=True)
    counts[7, 9] = largest
    return counts.astype(kind)


@given(some.integers(1, 2**64 - 1))
def test_counts_come_back_in_the_smallest_type(largest):
    counts = a_tile(largest)
    back = decode(encode(counts).blob)
    assert np.array_equal(back, counts)
    assert back.dtype.itemsize == min(size for size in (1, 2, 4, 8) if largest < 2 ** (8 * size))


@pytest.mark.parametrize("largest", [255, 256, 65535, 65536, 2**32 - 1, 2**32])
def test_the_edges_of_the_types(largest):
    counts = a_tile(largest)
    assert np.array_equal(decode(encode(counts).blob), counts)
    assert np.array_equal(narrow(counts), counts)


def test_an_empty_tile_is_nothing():
    empty = np.zeros((TILE, TILE), np.uint32)
    assert encode(empty) is None
    assert narrow(empty) is None


def test_strided_and_narrow_arrays_encode_alike():
    wide = np.zeros((TILE, 3 * TILE), np.uint32)
    wide[:, TILE : 2 * TILE] = a_tile(900)
    assert encode(wide[:, TILE : 2 * TILE]) == encode(a_tile(900, np.uint16)) == encode(a_tile(900))


def test_one_count_changes_the_digest():
    counts = a_tile(900)
    other = counts.copy()
    other[200, 3] += 1
    assert encode(counts).digest != encode(other).digest


def sparse(cells, largest, seed=0):
    rng = np.random.default_rng(seed)
    counts = np.zeros(TILE * TILE, np.uint64)
    counts[rng.choice(TILE * TILE, cells, replace=False)] = rng.integers(
        1, largest, cells, dtype=np.uint64, endpoint=True
    )
    return counts.reshape(TILE, TILE)


@pytest.mark.parametrize("cells", [1, 700, 8191, 8192, 8193, 20_000])
@pytest.mark.parametrize("largest", [1, 255, 70_000, 2**40])
def test_tiles_with_few_occupied_cells(cells, largest):
    counts = sparse(cells, largest)
    assert np.array_equal(decode(encode(counts).blob), counts)


def test_few_large_counts_among_many_small_ones():
    counts = sparse(30_000, 200) + sparse(50, 2**30, seed=1)
    assert np.array_equal(decode(encode(counts).blob), counts)


def test_a_plane_of_few_bytes_is_listed():
    raw = zlib.decompress(encode(sparse(8192, 255)).blob)
    assert len(raw) == 1 + 4 + 3 * 8192
    raw = zlib.decompress(encode(sparse(8193, 255)).blob)
    assert len(raw) == 1 + 4 + TILE * TILE
    counts = np.zeros((TILE, TILE), np.uint32)
    counts[3, 7], counts[200, 255] = 258, 2
    assert zlib.decompress(encode(counts).blob) == bytes(
        [2, 2, 0, 0, 0, 3, 200, 7, 255, 2, 2, 1, 0, 0, 0, 3, 7, 1]
    )


@pytest.mark.parametrize("raw", [b"", b"\x03", b"\x01\x05\x00\x00\x00abc", b"\x01\x00\x00\x01\x00short"])
def test_other_streams_are_no_tiles(raw):
    with pytest.raises(ValueError, match=r"starts with|buffer"):
        decode(zlib.compress(raw))
