"""Densities of counts, and how often each density occurs, gathered from arrays of any size in any order."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

Floats = NDArray[np.float64]
Weights = NDArray[np.uint64]
_BLOCK = 1 << 17
_LARGE = 1 << 16


def density(counts: NDArray[Any], exposure: ArrayLike, cell_height: float) -> Floats:
    """Return counts / (exposure * cell height): the share of a column's samples per unit of the up axis.

    Parameters
    ----------
    counts : ndarray of integers, shape (columns, rows)
    exposure : array_like of integers, shape (columns,), or one number
        Samples of each column. A column without samples has density 0.
    cell_height : float
        Size of a cell on the up axis, in its units.

    Returns
    -------
    ndarray of float64, shape (columns, rows)
    """
    scales = np.broadcast_to(np.asarray(exposure, dtype=np.float64) * cell_height, counts.shape[:1])
    return np.asarray(counts / np.where(scales > 0, scales, np.inf)[:, None], dtype=np.float64)


class Tally:
    """Distinct densities and how often each occurs; adding and merging in any order gives the same.

    Examples
    --------
    >>> import numpy as np
    >>> tally = Tally()
    >>> tally.add(np.array([[0, 2, 2, 4]], dtype=np.uint32), 8, 0.5)
    >>> [part.tolist() for part in tally.distinct()]
    [[0.5, 1.0], [2, 1]]
    """

    def __init__(self) -> None:
        self._values: list[Floats] = [np.zeros(0)]
        self._often: list[Weights] = [np.zeros(0, np.uint64)]
        self._limit = 1 << 20

    def add(self, counts: NDArray[Any], exposure: ArrayLike, cell_height: float) -> None:
        """Add the occupied cells of an array of counts; parameters as in :func:`density`."""
        for scale, columns in alike(counts, exposure, cell_height):
            numbers, often = _histogram(counts, columns)
            self._values.append(numbers / scale)
            self._often.append(often)
        self._compact()

    def merge(self, other: Tally) -> None:
        """Add all that another tally holds."""
        self._values.extend(other._values)
        self._often.extend(other._often)
        self._compact()

    def distinct(self) -> tuple[Floats, Weights]:
        """Return the occupied densities, ascending, each once, and in how many cells each occurs."""
        return distinct(np.concatenate(self._values), np.concatenate(self._often))

    def _compact(self) -> None:
        if sum(part.size for part in self._values) > self._limit:
            values, often = self.distinct()
            self._values, self._often = [values], [often]
            self._limit = max(self._limit, 2 * values.size)


def distinct(values: Floats, often: Weights) -> tuple[Floats, Weights]:
    """Merge equal densities: ascending, each once, with the sum of its weights.

    Densities that are not positive and finite, and those of weight 0, are left out.
    """
    kept = (values > 0) & np.isfinite(values) & (often > 0)
    values, often = values[kept], often[kept]
    if values.size == 0:
        return values, often
    order = np.argsort(values, kind="stable")
    values = values[order]
    starts = np.flatnonzero(np.concatenate([[True], values[1:] != values[:-1]]))
    return values[starts], np.add.reduceat(often[order], starts)


def alike(
    counts: NDArray[Any], exposure: ArrayLike, cell_height: float
) -> Iterator[tuple[float, NDArray[np.intp]]]:
    """Yield each distinct exposure * cell height above 0 and the numbers of the columns that have it."""
    scales = np.broadcast_to(np.asarray(exposure, dtype=np.float64) * cell_height, counts.shape[:1])
    order = np.argsort(scales, kind="stable")
    cuts = np.flatnonzero(np.diff(scales[order])) + 1
    for columns in np.split(order, cuts):
        if columns.size and scales[columns[0]] > 0:
            yield float(scales[columns[0]]), columns


def blocks(columns: NDArray[np.intp], rows: int) -> Iterator[slice | NDArray[np.intp]]:
    """Cut numbers of columns into pieces of about 10^5 cells, as slices where they are consecutive."""
    step = max(1, _BLOCK // max(1, rows))
    for start in range(0, columns.size, step):
        part = columns[start : start + step]
        first, last = int(part[0]), int(part[-1])
        yield slice(first, last + 1) if last - first + 1 == part.size else part


def _histogram(counts: NDArray[Any], columns: NDArray[np.intp]) -> tuple[NDArray[np.int64], Weights]:
    """Return the distinct counts of some columns and how often each occurs; a large one may come twice."""
    small = np.zeros(0, np.intp)
    numbers: list[NDArray[np.int64]] = []
    often: list[NDArray[np.intp]] = []
    for block in blocks(columns, counts.shape[1]):
        part = counts[block].reshape(-1)
        large = part >= _LARGE
        if large.any():
            found, times = np.unique(part[large], return_counts=True)
            numbers.append(found.astype(np.int64))
            often.append(times)
            part = np.where(large, 0, part)
        seen = np.bincount(part.astype(np.intp))
        if seen.size > small.size:
            small, seen = seen, small
        small[: seen.size] += seen
    numbers.append(np.flatnonzero(small).astype(np.int64))
    often.append(small[numbers[-1]])
    return np.concatenate(numbers), np.concatenate(often).astype(np.uint64)
