"""A made-up source of counts for tests, and obviously right twins of what is built from it."""

import numpy as np

from tiles.grid import TILE
from tiles.strip import PER_COLUMN, Strip
from tiles.window import View

VIEW = View(across=("r", "2.8", "4"), up=("x", 0, 1))


class Scene:
    """Counts of a whole view, known in advance: a dense block, large single cells, nothing above."""

    def __init__(self, across_level, up_level, seed=0, largest=70_000):
        self.columns, self.rows = TILE << across_level, TILE << up_level
        rng = np.random.default_rng(seed)
        counts = np.zeros((self.columns, self.rows), np.uint32)
        left, low = self.columns // 3, self.rows // 4
        block = counts[left : left + self.columns // 4, low : low + self.rows // 3]
        block[...] = rng.poisson(3, block.shape)
        for column in range(self.columns):
            counts[column, rng.integers(0, 3 * self.rows // 4, 2)] += rng.integers(1, largest, 2).astype(
                np.uint32
            )
        self.counts = counts
        lost = rng.integers(0, 100, (5, self.columns)).astype(np.uint64)
        lost[3] *= rng.random(self.columns) < 0.02
        inside = counts.sum(axis=1, dtype=np.uint64)
        # the same exposure everywhere: what is missing inside was below
        lost[0] = inside.max() + np.uint64(1000) - inside - lost[1:4].sum(axis=0)
        exposure = inside + lost[:4].sum(axis=0)
        self.numbers = np.concatenate([exposure[None], lost])
        self.asked = []

    def source(self, first, last):
        """Return the strip of some columns, and remember that it was asked for."""
        self.asked.append((first, last))
        arrays = {name: self.numbers[k, first:last].copy() for k, name in enumerate(PER_COLUMN)}
        return Strip(first, self.counts[first:last].copy(), **arrays)

    def at(self, pair, deepest):
        """Return counts and per-column numbers of the whole view at a level pair, summed in one go."""
        across, up = 2 ** (deepest[0] - pair[0]), 2 ** (deepest[1] - pair[1])
        columns, rows = self.columns // across, self.rows // up
        counts = self.counts.reshape(columns, across, rows, up).sum(axis=(1, 3), dtype=np.uint64)
        return counts, self.numbers.reshape(6, columns, across).sum(axis=2, dtype=np.uint64)


def mosaic(index, pair):
    """Return all tiles of a level pair of an index as one array."""
    whole = np.zeros((TILE << pair[0], TILE << pair[1]), np.uint64)
    for address in list(index.addresses(pair)):
        column, row = address.column * TILE, address.row * TILE
        whole[column : column + TILE, row : row + TILE] = index.get(address)
    return whole
