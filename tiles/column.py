"""Tile columns as they come out of a source of counts: in one strip, or in strips narrower than a tile."""

from __future__ import annotations

import tempfile
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import BinaryIO, NamedTuple

import numpy as np
from numpy.typing import NDArray

from tiles.codec import narrow
from tiles.grid import TILE
from tiles.pyramid import Counts, Rows, occupied, tile_rows
from tiles.store import written
from tiles.strip import Strip, check_sums

_SAFE_TO_ADD = 2**32 // TILE

Source = Callable[[int, int], Strip]


class Column(NamedTuple):
    """A tile column of one level pair.

    Attributes
    ----------
    numbers : ndarray of uint64, shape (6, 256)
        Per-column numbers in the order of ``tiles.strip.PER_COLUMN``.
    rows : callable
        Returns a tile by its row, None when it is empty.
    """

    numbers: NDArray[np.uint64]
    rows: Rows


def strip_width(cells_per_strip: int, rows: int) -> int:
    """Return how many columns a strip has: a power of two, 1 to 256, of at most so many cells."""
    widest = max(1, min(TILE, cells_per_strip // rows))
    return 1 << widest.bit_length() - 1


@contextmanager
def computed(source: Source, rows: int, width: int, folder: Path, column: int) -> Iterator[Column]:
    """Compute a tile column by strips, and check afterwards that it accounts for every sample.

    Parameters
    ----------
    source : callable
        Returns the strip of columns ``first … last - 1`` at the deepest level pair.
    rows : int
        Cells along the up axis.
    width : int
        Columns of a strip, at most 256.
    folder : Path
        Where narrower strips wait until they make up a tile column, in a nameless file that vanishes with
        the process.
    column : int
        Number of the tile column.

    Yields
    ------
    Column
        To be read row by row, each row once.

    Raises
    ------
    AssertionError
        When the source returns another strip than asked for, or loses samples.
    """
    first, last = column * TILE, (column + 1) * TILE
    if width >= TILE:
        strip = _strip(source, first, last, rows)
        with _checked(first, Column(strip.numbers, tile_rows(strip.counts))) as whole:
            yield whole
        return
    numbers = []
    with tempfile.TemporaryFile(dir=folder) as file:
        pieces = _Pieces(file)
        for left in range(first, last, width):
            strip = _strip(source, left, left + width, rows)
            numbers.append(strip.numbers)
            with written(folder):
                pieces.add(left - first, strip.counts)
            del strip  # before the next one is computed
        with _checked(first, Column(np.concatenate(numbers, axis=1), pieces.tile)) as whole:
            yield whole


def _strip(source: Source, first: int, last: int, rows: int) -> Strip:
    strip = source(first, last)
    if strip.first != first or strip.counts.shape != (last - first, rows):
        raise AssertionError(
            f"columns {first} to {last - 1} of {rows} cells were asked for; "
            f"the source returned {strip.counts.shape} from column {strip.first}"
        )
    return strip


@contextmanager
def _checked(first: int, column: Column) -> Iterator[Column]:
    inside = np.zeros(TILE, np.uint64)

    def rows(row: int) -> Counts | None:
        tile = column.rows(row)
        if tile is not None:
            kind = np.uint32 if tile.max() < _SAFE_TO_ADD else np.uint64
            np.add(inside, tile.sum(axis=1, dtype=kind), out=inside)
        return tile

    yield Column(column.numbers, rows)
    check_sums(first, inside, column.numbers)


class _Pieces:
    """The non-empty parts of narrow strips, waiting in a file."""

    def __init__(self, file: BinaryIO) -> None:
        self._file = file
        self._size = 0
        self._found: dict[int, list[tuple[int, int, np.dtype[np.unsignedinteger], int]]] = {}

    def add(self, left: int, counts: NDArray[np.uint32]) -> None:
        """Keep a strip whose first column is number ``left`` of the tile column."""
        for row in np.flatnonzero(occupied(counts)).tolist():
            piece = narrow(counts[:, row * TILE : (row + 1) * TILE])
            assert piece is not None
            self._file.write(piece.data)
            self._found.setdefault(row, []).append((left, len(piece), piece.dtype, self._size))
            self._size += piece.nbytes

    def tile(self, row: int) -> Counts | None:
        """Return the tile of a row."""
        if row not in self._found:
            return None
        tile = np.zeros((TILE, TILE), np.uint32)
        for left, columns, kind, offset in self._found[row]:
            self._file.seek(offset)
            raw = self._file.read(columns * TILE * kind.itemsize)
            tile[left : left + columns] = np.frombuffer(raw, kind).reshape(columns, TILE)
        return tile
