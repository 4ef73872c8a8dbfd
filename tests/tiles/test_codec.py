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


def test_a_stream_of_another_size_is_no_tile():
    with pytest.raises(ValueError, match="not 3"):
        decode(zlib.compress(bytes(3 * TILE * TILE)))
    with pytest.raises(ValueError, match="reshape"):
        decode(zlib.compress(bytes(100)))
