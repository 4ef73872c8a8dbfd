"""A made-up plane for tests, and obviously right twins of what is built from it."""

import threading

import numpy as np

from tiles.grid import TILE
from tiles.plane import PlaneTile
from tiles.window import View

VIEW = View(across=("a", "2", "4"), up=("b", "1", "4"))
HEADER = {
    "title": "made up",
    "class_layer": "fate",
    "class_names": {"1": "fixed point", "period": "period {}", "60002": "chaotic", "60003": "escapes"},
    "value_layers": [
        {"name": "lyapunov", "label": "largest exponent", "palette_kind": "diverging"},
        {"name": "rotation", "label": "rotation number", "palette_kind": "cyclic"},
    ],
}


class Plane:
    """Classes and values of a whole view, known in advance: bands, single pixels, cells without values."""

    def __init__(self, across_level, up_level, seed=0):
        self.deepest = across_level, up_level
        shape = TILE << across_level, TILE << up_level
        rng = np.random.default_rng(seed)
        x, y = (np.arange(size)[:, None] / size for size in shape)
        band = np.floor(8 * (x + 0.3 * np.sin(5 * y.T))).astype(int) % 7
        classes = np.array([1, 2, 4, 3, 60002, 60003, 60000], np.uint16)[band]
        rare = rng.random(shape) < 0.02
        classes[rare] = rng.integers(1, 9, rare.sum())
        exponents = rng.normal(-0.2, 1, shape) * 10.0 ** rng.integers(-3, 3, shape)
        exponents[classes == 60003] = np.nan
        exponents[rng.random(shape) < 1e-4] = -np.inf
        rotation = np.broadcast_to(x, shape).copy()
        rotation[:, : shape[1] // 2] = np.nan  # whole tiles without any value
        self.classes, self.values = classes, {"lyapunov": exponents, "rotation": rotation}
        self.asked, self.threads = [], set()

    def source(self, address):
        """Return a tile, and remember that it was asked for."""
        self.asked.append(address)
        self.threads.add(threading.get_ident())
        columns = slice(address.column * TILE, (address.column + 1) * TILE)
        rows = slice(address.row * TILE, (address.row + 1) * TILE)
        values = {name: each[columns, rows].copy() for name, each in self.values.items()}
        return PlaneTile(self.classes[columns, rows].copy(), values)

    def counts(self, pair, number):
        """Return how many pixels of each cell of a level pair have a class, summed in one go."""
        return _blocks(self.classes == number, pair).sum(axis=(1, 3), dtype=np.uint64)

    def numbers(self, pair, layer):
        """Return how many pixels of each cell have a finite value."""
        return _blocks(np.isfinite(self.values[layer]), pair).sum(axis=(1, 3), dtype=np.uint64)

    def sums(self, pair, layer):
        """Return the sums of finite values: rounds of across, then up; then what is left along one axis."""
        found = np.where(np.isfinite(self.values[layer]), self.values[layer], 0.0)
        across, up = self.deepest[0] - pair[0], self.deepest[1] - pair[1]
        rounds = min(across, up)
        for axis in [0, 1] * rounds + [0] * (across - rounds) + [1] * (up - rounds):
            pairs = np.moveaxis(found, axis, 0)
            found = np.moveaxis(pairs[0::2] + pairs[1::2], 0, axis)
        return found

    def majority(self, pair):
        """Return the most frequent class of each cell, the smallest of equally frequent ones."""
        numbers = np.unique(self.classes)
        counts = np.stack([self.counts(pair, number) for number in numbers])
        return numbers[counts.argmax(axis=0)]

    def means(self, pair, layer):
        """Return the mean value of each cell, not a number where it has none."""
        numbers = self.numbers(pair, layer)
        return np.where(numbers > 0, self.sums(pair, layer) / np.maximum(numbers, 1), np.nan)


def _blocks(flags, pair):
    columns, rows = TILE << pair[0], TILE << pair[1]
    return flags.reshape(columns, flags.shape[0] // columns, rows, flags.shape[1] // rows)


def whole(tiles, part, kind=np.float64):
    """Return what a function of a tile gives, of all tiles of a level pair as one array."""
    columns, rows = (1 + max(address[k] for address in tiles) for k in (2, 3))
    array = np.zeros((TILE * columns, TILE * rows), kind)
    for address, tile in tiles.items():
        column, row = address.column * TILE, address.row * TILE
        array[column : column + TILE, row : row + TILE] = part(tile)
    return array
