"""Coarser tiles hold exactly the counts of the finer ones."""

import gc
import weakref

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as some
from hypothesis.extra.numpy import arrays

from tiles.errors import TooLarge
from tiles.grid import TILE
from tiles.pyramid import (
    halve_across,
    halve_up,
    join_across,
    join_up,
    pair_sums,
    tile_rows,
    tiles_of_column,
)

KINDS = some.sampled_from([np.uint8, np.uint16, np.uint32])


@given(KINDS.flatmap(lambda kind: arrays(kind, (6, 8))))
def test_halves_are_sums_of_neighbours(counts):
    wide = counts.astype(object)
    assert halve_across(counts).tolist() == (wide[0::2] + wide[1::2]).tolist()
    assert halve_up(counts).tolist() == (wide[:, 0::2] + wide[:, 1::2]).tolist()


def test_the_order_of_halving_does_not_matter():
    counts = np.random.default_rng(1).integers(0, 2**32, (8, 8), dtype=np.uint32)
    assert np.array_equal(halve_up(halve_across(counts)), halve_across(halve_up(counts)))


def test_sums_are_widened_before_they_overflow():
    counts = np.full((2, 2), 2**32 - 1, np.uint32)
    half = halve_across(counts)
    assert half.dtype == np.uint64
    assert halve_up(counts).tolist() == [[2**33 - 2]] * 2
    assert half.tolist() == [[2**33 - 2] * 2]
    assert halve_across(np.full((2, 2), 2**31 - 1, np.uint32)).dtype == np.uint32


def test_sums_beyond_64_bits_are_refused():
    with pytest.raises(TooLarge, match="fewer levels"):
        halve_up(np.full((1, 2), 2**63, np.uint64))
    with pytest.raises(TooLarge, match="fewer levels"):
        pair_sums(np.full((1, 2), 2**63, np.uint64))


def test_pair_sums_of_columns():
    assert pair_sums(np.array([[1, 2, 3, 4], [5, 6, 7, 8]], np.uint64)).tolist() == [[3, 7], [11, 15]]


def test_joined_halves():
    half = np.ones((TILE // 2, TILE), np.uint8)
    whole = join_across(None, half)
    assert whole.shape == (TILE, TILE)
    assert whole[:128].sum() == 0
    assert np.array_equal(whole[128:], half)
    assert join_across(half, 2**40 * half.astype(np.uint64)).dtype == np.uint64
    assert join_up(half.T, None)[:, :128].sum() == half.size
    assert join_up(None, half.T).dtype == np.uint32
    assert join_across(None, None) is join_up(None, None) is None


@pytest.mark.parametrize(("deepest", "coarsest"), [(3, 0), (3, 3), (2, 1), (0, 0)])
def test_tiles_of_a_column_equal_sums_of_the_whole_column(deepest, coarsest):
    rng = np.random.default_rng(2)
    counts = rng.integers(0, 2**32, (TILE, TILE << deepest), dtype=np.uint32)
    counts[:, : TILE << max(0, deepest - 1)] = 0  # some tiles are empty
    asked = []
    rows = tile_rows(counts)

    def watched(row):
        asked.append(row)
        return rows(row)

    found = {(level, row): tile for level, row, tile in tiles_of_column(watched, deepest, coarsest)}
    assert asked == list(range(2**deepest))
    for level in range(coarsest, deepest + 1):
        whole = counts.reshape(TILE, TILE << level, -1).sum(axis=2, dtype=np.uint64)
        for row in range(2**level):
            tile = whole[:, row * TILE : (row + 1) * TILE]
            if tile.any():
                assert np.array_equal(found.pop((level, row)), tile)
    assert not found


def test_a_column_is_released_without_the_garbage_collector():
    # a strip of a deep set holds hundreds of megabytes
    counts = np.ones((TILE, 4 * TILE), np.uint32)
    alive = weakref.ref(counts)
    gc.disable()
    try:
        assert len(list(tiles_of_column(tile_rows(counts), 2, 0))) == 7
        del counts
        assert alive() is None
    finally:
        gc.enable()
