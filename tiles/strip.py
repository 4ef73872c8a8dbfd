"""What a source of counts hands over: a strip of whole columns of the view, with nothing dropped."""

from __future__ import annotations

import itertools
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

PER_COLUMN = ("exposure", "below", "above", "escaped", "unsettled", "collapsed")


@dataclass(frozen=True)
class Strip:
    """Counts of neighbouring columns of a view, over all its rows.

    In every column, in samples: ``counts.sum() + below + above + escaped + unsettled == exposure``.
    The density of a cell is ``counts / (exposure * cell height of up)``.

    Attributes
    ----------
    first : int
        Number of the first column, at the resolution that was asked for.
    counts : ndarray of uint32, shape (columns, rows)
        C order: one column of the view is one row of the array; index 0 is the lowest cell of ``up``.
    exposure : ndarray of uint64, shape (columns,)
        How many samples the column received.
    below, above : ndarray of uint64, shape (columns,)
        Samples that fell outside the interval of ``up``.
    escaped, unsettled : ndarray of uint64, shape (columns,)
        Samples of orbits that escaped, and of orbits whose transient had not died out.
    collapsed : ndarray of uint64, shape (columns,)
        Orbits that rounding dropped onto a repelling cycle; orbits, not samples, so outside the sum.
    """

    first: int
    counts: NDArray[np.uint32]
    exposure: NDArray[np.uint64]
    below: NDArray[np.uint64]
    above: NDArray[np.uint64]
    escaped: NDArray[np.uint64]
    unsettled: NDArray[np.uint64]
    collapsed: NDArray[np.uint64]

    @property
    def last(self) -> int:
        """Number of the column after the last one."""
        return self.first + len(self.counts)

    @property
    def numbers(self) -> NDArray[np.uint64]:
        """The per-column arrays as rows of one, in the order of ``PER_COLUMN``, shape (6, columns)."""
        return np.stack([getattr(self, name) for name in PER_COLUMN])

    def check(self) -> None:
        """Check the shapes, the types and that nothing was dropped.

        Raises
        ------
        AssertionError
            When the strip is inconsistent: its source is wrong.
        """
        columns = len(self.counts)
        if self.counts.dtype != np.uint32 or self.counts.ndim != 2:
            raise AssertionError(
                f"counts are {self.counts.dtype}{self.counts.shape}, not uint32 columns x rows"
            )
        for name in PER_COLUMN:
            array = getattr(self, name)
            if array.dtype != np.uint64 or array.shape != (columns,):
                raise AssertionError(f"{name} is {array.dtype}{array.shape}, not uint64({columns},)")
        check_sums(self.first, self.counts.sum(axis=1, dtype=np.uint64), self.numbers)


def check_sums(first: int, inside: NDArray[np.uint64], numbers: NDArray[np.uint64]) -> None:
    """Check that columns account for all their samples.

    Parameters
    ----------
    first : int
        Number of the first column, for the message.
    inside : ndarray of uint64, shape (columns,)
        Samples counted in the cells.
    numbers : ndarray of uint64, shape (6, columns)
        As :attr:`Strip.numbers`.

    Raises
    ------
    AssertionError
        When ``inside + below + above + escaped + unsettled`` differs from the exposure.
    """
    total = inside + numbers[1:5].sum(axis=0)
    wrong = np.flatnonzero(total != numbers[0])
    if wrong.size:
        at = int(wrong[0])
        raise AssertionError(f"column {first + at} accounts for {total[at]} of {numbers[0, at]} samples")


def join(strips: Sequence[Strip]) -> Strip:
    """Return one strip from neighbouring ones.

    Parameters
    ----------
    strips : sequence of Strip
        In order, each starting where the one before ends.

    Returns
    -------
    Strip

    Raises
    ------
    ValueError
        When the strips leave a gap or overlap.
    """
    for left, right in itertools.pairwise(strips):
        if left.last != right.first:
            raise ValueError(
                f"a strip that ends at {left.last} is followed by one that starts at {right.first}"
            )
    arrays = {name: np.concatenate([getattr(strip, name) for strip in strips]) for name in PER_COLUMN}
    return Strip(strips[0].first, np.concatenate([strip.counts for strip in strips]), **arrays)
