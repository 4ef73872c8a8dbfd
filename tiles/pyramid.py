"""Coarser tiles from finer ones: counts of neighbouring cells are added, along one axis at a time."""

from __future__ import annotations

from collections.abc import Callable, Generator, Iterator
from typing import Any

import numpy as np
from numpy.typing import NDArray

from tiles.errors import TooLarge
from tiles.grid import TILE

Counts = NDArray[Any]
Rows = Callable[[int], Counts | None]


def halve_across(counts: Counts) -> Counts:
    """Add the cells of neighbouring columns.

    Parameters
    ----------
    counts : ndarray of an unsigned type, shape (2 n, rows)
        One column of cells is one row of the array.

    Returns
    -------
    ndarray of uint32 or uint64, shape (n, rows)
        ``counts[2 k] + counts[2 k + 1]``, as uint64 only where a sum exceeds uint32.

    Raises
    ------
    TooLarge
        When a sum exceeds uint64.
    """
    return _sums(counts[0::2], counts[1::2])


def halve_up(counts: Counts) -> Counts:
    """Add the cells of neighbouring rows; as :func:`halve_across` along the other axis.

    Parameters
    ----------
    counts : ndarray of an unsigned type, shape (columns, 2 n)

    Returns
    -------
    ndarray of uint32 or uint64, shape (columns, n)
    """
    return _sums(counts[:, 0::2], counts[:, 1::2])


def pair_sums(numbers: NDArray[np.uint64]) -> NDArray[np.uint64]:
    """Add neighbours along the last axis: per-column numbers of the columns of the next coarser level."""
    return _sums(numbers[..., 0::2], numbers[..., 1::2])


def join_across(left: Counts | None, right: Counts | None) -> Counts | None:
    """Return the tile made of two halves, each 128 x 256 or None for empty; None when both are."""
    return _join(left, right, (TILE // 2, TILE), 0)


def join_up(lower: Counts | None, upper: Counts | None) -> Counts | None:
    """Return the tile made of two halves, each 256 x 128 or None for empty; None when both are."""
    return _join(lower, upper, (TILE, TILE // 2), 1)


def tile_rows(counts: Counts) -> Rows:
    """Return a function that cuts a tile column, shape (256, 256 * n), into tiles; None for an empty one.

    The tiles are copies: rows of a column that lie a power of two apart share few places in a processor's
    cache, so each further pass over them in place would come from memory.
    """
    occupied = counts.reshape(TILE, -1, TILE).max(axis=2).any(axis=0)

    def cut(row: int) -> Counts | None:
        return counts[:, row * TILE : (row + 1) * TILE].copy() if occupied[row] else None

    return cut


def tiles_of_column(rows: Rows, deepest: int, coarsest: int) -> Iterator[tuple[int, int, Counts]]:
    """Yield the tiles of one tile column at every up level from the deepest to the coarsest.

    Parameters
    ----------
    rows : callable
        Returns a tile, shape (256, 256), of the deepest up level by its row, None when it is empty. It is
        called once a row, in ascending order.
    deepest, coarsest : int
        Up levels, both included.

    Yields
    ------
    (up level, row, counts)
        Non-empty tiles; those of one up level in ascending order. At most two a level are held at a time.
    """
    for row in range(2**coarsest):
        yield from _subtree(rows, deepest, coarsest, row)


def _subtree(
    rows: Rows, deepest: int, level: int, row: int
) -> Generator[tuple[int, int, Counts], None, Counts | None]:
    """Yield the tiles that lie in one tile, finest first, and that tile; return it."""
    if level == deepest:
        tile = rows(row)
    else:
        lower = yield from _subtree(rows, deepest, level + 1, 2 * row)
        lower = None if lower is None else halve_up(lower)
        upper = yield from _subtree(rows, deepest, level + 1, 2 * row + 1)
        tile = join_up(lower, None if upper is None else halve_up(upper))
    if tile is not None:
        yield level, row, tile
    return tile


def _sums(first: Counts, second: Counts) -> Counts:
    if first.dtype.itemsize < 4:
        first, second = first.astype(np.uint32), second.astype(np.uint32)
    total = np.add(first, second)
    if np.less(total, first).any():  # wrapped round
        if first.dtype.itemsize == 8:
            raise TooLarge("a coarse tile would hold more than 2**64 samples in a cell; build fewer levels")
        total = np.add(first, second, dtype=np.uint64)
    return total


def _join(first: Counts | None, second: Counts | None, shape: tuple[int, int], axis: int) -> Counts | None:
    given = [half for half in (first, second) if half is not None]
    if not given:
        return None
    kind = np.result_type(np.uint32, *given)
    empty = np.zeros(shape, kind) if len(given) == 1 else None
    halves = [empty if half is None else half for half in (first, second)]
    return np.concatenate(halves, axis=axis, dtype=kind)  # type: ignore[arg-type]
