"""In which cells of a view points lie, decided by the exact edges of both axes."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from atlas.errors import PlanRefused, shown
from atlas.points.tables import Chunk
from tiles.window import Axis, View

LEAST_STEPS = 8.0
Codes = NDArray[np.int64]


class Cells:
    """An axis cut into equal cells, half-open, the last one closed.

    Parameters
    ----------
    axis : Axis
    count : int
        Number of cells.

    Raises
    ------
    PlanRefused
        When a cell spans less than 8 steps of float64: it is finer than numbers resolve.
    """

    def __init__(self, axis: Axis, count: int) -> None:
        edges = axis.edges(count)
        if not (_steps(edges) >= LEAST_STEPS).all():
            raise PlanRefused(
                f"the axis {shown(axis.name)} from {axis.low} to {axis.high} cannot be cut into {count} "
                "cells that float64 can tell apart; widen the interval or use fewer cells"
            )
        self.count, self._log = count, axis.scale == "log"
        self._last = edges[-1]
        self._edges = np.concatenate([[-np.inf], edges, [np.nan]])
        self._start, stop = self._scaled(edges[[0, -1]])
        with np.errstate(over="ignore"):
            self._rate = count / (stop - self._start)

    def codes(self, values: NDArray[np.float64]) -> Codes:
        """Return the cell of each value: 0 below the axis, 1 to ``count`` inside, ``count + 1`` above.

        Arithmetic guesses the cell; comparisons with the edges decide.

        Parameters
        ----------
        values : ndarray of float64
            Not NaN.
        """
        with np.errstate(all="ignore"):
            guess = (self._scaled(values) - self._start) * self._rate + 1
        code: Codes = np.clip(np.nan_to_num(guess, nan=0.0), 0, self.count + 1).astype(np.int64)
        code -= values < self._edges[code]
        code += values >= self._edges[code + 1]
        wrong = (values < self._edges[code]) | (values >= self._edges[code + 1])
        if wrong.any():
            code[wrong] = np.searchsorted(self._edges[1:-1], values[wrong], side="right")
        code[values == self._last] = self.count
        return code

    def _scaled(self, values: NDArray[np.float64]) -> NDArray[np.float64]:
        return np.asarray(np.log(values), np.float64) if self._log else values


def _steps(edges: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return how many steps of float64 each cell spans."""
    with np.errstate(all="ignore"):
        return np.diff(edges) / np.spacing(np.maximum(np.abs(edges[1:]), np.abs(edges[:-1])))


@dataclass(frozen=True)
class Grid:
    """A view cut into columns and rows of cells.

    Attributes
    ----------
    view : View
    across, up : Cells
    """

    view: View
    across: Cells
    up: Cells

    @classmethod
    def of(cls, view: View, columns: int, rows: int) -> Grid:
        """Return the grid of a view.

        Raises
        ------
        PlanRefused
            When its cells are finer than float64 resolves.
        """
        return cls(view, Cells(view.across, columns), Cells(view.up, rows))


class Account:
    """What became of every point, so that none is dropped silently.

    Attributes
    ----------
    points : int
        Rows read.
    finite : int
        Those with two finite numbers.
    missing : int
        Those that lack a number.
    before, beyond : int
        Those below and above the ends of the across axis.
    below, above : int
        Those inside the across axis, below and above the ends of the up axis.
    """

    def __init__(self) -> None:
        self.points = self.finite = self.missing = self.before = self.beyond = self.below = self.above = 0

    def placed(self, chunk: Chunk, grid: Grid) -> tuple[Codes, Codes]:
        """Return column numbers and up codes of the points that lie within the across axis.

        Parameters
        ----------
        chunk : (ndarray of float64, ndarray of float64)
            Values across and up, NaN where missing.
        grid : Grid

        Returns
        -------
        columns : ndarray of int64
            From 0.
        codes : ndarray of int64
            As `Cells.codes` of the up axis.
        """
        across, up = chunk
        self.points += across.size
        self.finite += int(np.count_nonzero(np.isfinite(across) & np.isfinite(up)))
        known = ~(np.isnan(across) | np.isnan(up))
        across, up = across[known], up[known]
        self.missing += known.size - across.size
        columns = grid.across.codes(across)
        inside = (columns > 0) & (columns <= grid.across.count)
        self.before += int(np.count_nonzero(columns == 0))
        self.beyond += int(np.count_nonzero(columns > grid.across.count))
        codes = grid.up.codes(up[inside])
        self.below += int(np.count_nonzero(codes == 0))
        self.above += int(np.count_nonzero(codes > grid.up.count))
        return columns[inside] - 1, codes

    @property
    def within(self) -> int:
        """Points within the across axis: the exposures of all columns together."""
        return self.points - self.missing - self.before - self.beyond
