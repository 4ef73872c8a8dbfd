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
        ``counts[2 k] + counts[2 k + 1]``, as uint64 only where a sum might exceed uint32.

    Raises
    ------
    TooLarge
        When a sum might exceed uint64.
    """
    return _sums(counts, counts[0::2], counts[1::2])


def halve_up(counts: Counts) -> Counts:
    """Add the cells of neighbouring rows; as :func:`halve_across` along the other axis.

    Parameters
    ----------
    counts : ndarray of an unsigned type, shape (columns, 2 n)

    Returns
    -------
    ndarray of uint32 or uint64, shape (columns, n)
    """
    return _sums(counts, counts[:, 0::2], counts[:, 1::2])


def pair_sums(numbers: NDArray[np.uint64]) -> NDArray[np.uint64]:
    """Add neighbours along the last axis: per-column numbers of the columns of the next coarser level."""
    if numbers.max(initial=0) >= 2**63:
        raise TooLarge("a coarse column might hold 2**64 samples; build fewer levels")
    return np.add(numbers[..., 0::2], numbers[..., 1::2])


def join_across(left: Counts | None, right: Counts | None) -> Counts | None:
    """Return the tile made of two halves, each 128 x 256 or None for empty; None when both are."""
    return _join(left, right, np.s_[: TILE // 2], np.s_[TILE // 2 :])


def join_up(lower: Counts | None, upper: Counts | None) -> Counts | None:
    """Return the tile made of two halves, each 256 x 128 or None for empty; None when both are."""
    return _join(lower, upper, np.s_[:, : TILE // 2], np.s_[:, TILE // 2 :])


def occupied(counts: Counts) -> NDArray[np.bool_]:
    """Return for each row of tiles whether some count of columns, shape (columns, 256 * n), is not 0."""
    filled: NDArray[np.bool_] = counts.reshape(len(counts), -1, TILE).max(axis=2).any(axis=0)
    return filled


def tile_rows(counts: Counts) -> Rows:
    """Return a function that cuts a tile column, shape (256, 256 * n), into tiles; None for an empty one.

    The tiles are copies: rows of a column that lie a power of two apart share few places in a processor's
    cache, so each further pass over them in place would come from memory.
    """
    full = occupied(counts)

    def cut(row: int) -> Counts | None:
        return counts[:, row * TILE : (row + 1) * TILE].copy() if full[row] else None

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
        yield from _subtree(rows, deepest, coarsest, row, False)


def _subtree(
    rows: Rows, deepest: int, level: int, row: int, inner: bool
) -> Generator[tuple[int, int, Counts], None, Counts | None]:
    """Yield the tiles that lie in one tile, finest first, and that tile; return it halved if inner.

    It is halved before it is yielded, while it is in the processor's cache.
    """
    if level == deepest:
        tile = rows(row)
    else:
        lower = yield from _subtree(rows, deepest, level + 1, 2 * row, True)
        upper = yield from _subtree(rows, deepest, level + 1, 2 * row + 1, True)
        tile = join_up(lower, upper)
    if tile is None:
        return None
    half = halve_up(tile) if inner else None
    yield level, row, tile
    return half


def _join(first: Counts | None, second: Counts | None, left: Any, right: Any) -> Counts | None:
    given = [half for half in (first, second) if half is not None]
    if not given:
        return None
    tile = np.zeros((TILE, TILE), np.result_type(np.uint32, *given))
    if first is not None:
        tile[left] = first
    if second is not None:
        tile[right] = second
    return tile


def _sums(counts: Counts, first: Counts, second: Counts) -> Counts:
    kind = _wide_enough(counts)
    total: Counts = np.add(first.astype(kind, copy=False), second.astype(kind, copy=False))
    return total


def _wide_enough(counts: Counts) -> type[np.uint32] | type[np.uint64]:
    """Return the type that holds the sum of any two counts: uint32 unless it might not."""
    top = 0 if counts.dtype.itemsize < 4 else int(counts.max())
    if top >= 2**63:
        raise TooLarge("a coarse tile might hold 2**64 samples in a cell; build fewer levels")
    return np.uint32 if top < 2**31 else np.uint64
