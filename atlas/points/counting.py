"""Counting points: into the strip of a whole view, with the account of what lies outside."""

from __future__ import annotations

from collections.abc import Iterator
from hashlib import blake2b

import numpy as np

from atlas.errors import PointsRefused
from atlas.orbits.histogram import Histogram
from atlas.output.reporter import Reporter
from atlas.points.cells import Account, Codes, Grid
from atlas.points.intervals import no_points
from atlas.points.tables import Chunk, Table
from tiles.strip import Strip

MOST = (1 << 32) - 1


class StripCounter:
    """Adds up the points of neighbouring columns.

    Parameters
    ----------
    first, columns, rows : int
        Number of the first column, how many there are, cells of each.
    """

    def __init__(self, first: int, columns: int, rows: int) -> None:
        self.first, self.columns, self.rows = first, columns, rows
        self._counts = np.zeros((columns, rows), np.uint32)
        self._exposure, self._below, self._above = np.zeros((3, columns), np.uint64)

    def add(self, columns: Codes, codes: Codes) -> None:
        """Add points.

        Parameters
        ----------
        columns : ndarray of int64
            Column of each point, counted from ``first``.
        codes : ndarray of int64
            0 below, 1 to ``rows`` inside, ``rows + 1`` above.

        Raises
        ------
        PointsRefused
            When a column gets more points than a count can hold.
        """
        self._exposure += self._often(columns)
        if self._exposure.max() > MOST:
            raise PointsRefused(f"a column gets more than {MOST} points; use more columns or fewer points")
        self._below += self._often(columns[codes == 0])
        self._above += self._often(columns[codes > self.rows])
        inside = (codes > 0) & (codes <= self.rows)
        cells = columns[inside] * self.rows + codes[inside] - 1
        np.add.at(self._counts.reshape(-1), cells, np.uint32(1))

    def strip(self) -> Strip:
        """Return what was counted; escaped, unsettled and collapsed are 0."""
        nothing = np.zeros((3, self.columns), np.uint64)
        return Strip(self.first, self._counts, self._exposure, self._below, self._above, *nothing)

    def _often(self, columns: Codes) -> np.ndarray[tuple[int], np.dtype[np.uint64]]:
        return np.bincount(columns, minlength=self.columns).astype(np.uint64)


class Reading:
    """One pass over a table: its points placed in a grid, chunk by chunk, and the account of all of them.

    Parameters
    ----------
    table : Table
    grid : Grid
    rows : int
        Points read at a time; the result does not depend on it.
    reporter : Reporter
        Hears of the points read.
    """

    def __init__(self, table: Table, grid: Grid, rows: int, reporter: Reporter) -> None:
        self.table, self.grid, self.rows, self.reporter = table, grid, rows, reporter
        self.account = Account()
        self._file_digest = table.digest()
        self._digest = blake2b(digest_size=16)

    def placed(self) -> Iterator[tuple[Codes, Codes]]:
        """Yield column numbers and up codes of the points within the across axis.

        Raises
        ------
        PointsRefused
            At the end, when there was no finite point.
        """
        view = self.grid.view
        for chunk in self.table.chunks(view.across.name, view.up.name, self.rows):
            if self._file_digest is None:
                self._digest.update(_bytes(chunk))
            yield self.account.placed(chunk, self.grid)
            self.reporter.advance(chunk[0].size)
        if not self.account.finite:
            raise no_points(self.table, view.across.name, view.up.name)

    @property
    def digest(self) -> str:
        """Digest of the file's bytes, else of the numbers read, row by row; 32 hexadecimal digits."""
        return self._file_digest or self._digest.hexdigest()


def count_points(reading: Reading) -> Histogram:
    """Return the counts of a whole view, held in memory."""
    grid = reading.grid
    counter = StripCounter(0, grid.across.count, grid.up.count)
    for columns, codes in reading.placed():
        counter.add(columns, codes)
    return Histogram(counter.strip(), samples=1, filled=0, on_repelling=0)


def _bytes(chunk: Chunk) -> bytes:
    rows = np.stack(chunk, axis=1).astype("<f8")
    rows[np.isnan(rows)] = np.nan
    return rows.tobytes()
