"""A tile of a plane: one class a pixel and any number of values; coarser ones hold counts and sums."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from tiles.grid import TILE, Address, Pair
from tiles.pyramid import Counts, halve_across, halve_up, join_across, join_up

Floats = NDArray[np.float64]
_SHAPE = (TILE, TILE)


@dataclass(frozen=True)
class PlaneTile:
    """What a source hands over for a tile of the deepest level pair.

    Attributes
    ----------
    classes : ndarray of uint16, shape (256, 256)
        The class of every pixel; one column of pixels is one row of the array, index 0 is the lowest.
    values : mapping of str to ndarray of float64, shape (256, 256)
        By layer; a value that is not finite is none.
    """

    classes: NDArray[np.uint16]
    values: Mapping[str, Floats]


class ValueSums(NamedTuple):
    """Sums of the finite values of one layer, and how many they are, of each cell.

    Attributes
    ----------
    sums : ndarray of float64, shape (columns, rows)
        0 where a cell has no finite value.
    numbers : ndarray of an unsigned type, shape (columns, rows)
    """

    sums: Floats
    numbers: Counts

    def mean(self) -> Floats:
        """Return the mean of the finite values of each cell, not a number where there is none."""
        none = self.numbers == 0
        return np.where(none, np.nan, self.sums / np.where(none, 1, self.numbers))


@dataclass(frozen=True)
class PlaneSums:
    """A tile of any level pair.

    Attributes
    ----------
    classes : dict of int to ndarray of an unsigned type, shape (256, 256)
        How many pixels of each cell have a class, by class, ascending; only classes that occur.
    values : dict of str to ValueSums
        By layer; only layers that have a finite value somewhere in the tile.
    """

    classes: dict[int, Counts]
    values: dict[str, ValueSums]

    @classmethod
    def of(cls, tile: PlaneTile) -> PlaneSums:
        """Return a tile of the deepest pair, whose cells hold one pixel each.

        Raises
        ------
        AssertionError
            When an array has another shape or type: its source is wrong.
        """
        _check("classes", tile.classes, np.uint16)
        found = np.flatnonzero(np.bincount(tile.classes.reshape(-1)))
        classes = {number: (tile.classes == number).view(np.uint8) for number in found.tolist()}
        values = {}
        for name, given in tile.values.items():
            _check(name, given, np.float64)
            finite = np.isfinite(given)
            if finite.any():
                values[name] = ValueSums(np.where(finite, given, 0.0), finite.view(np.uint8))
        return cls(classes, values)

    def majority(self) -> NDArray[np.uint16]:
        """Return the class of most pixels of each cell; of equally frequent ones the smallest.

        Returns
        -------
        ndarray of uint16, shape (256, 256)
        """
        leading = np.zeros(_SHAPE, np.uint16)
        most = np.zeros(_SHAPE, np.result_type(*self.classes.values()))
        for number, counts in self.classes.items():
            ahead = counts > most
            leading[ahead] = number
            np.copyto(most, counts, where=ahead)
        return leading

    def means(self, name: str) -> Floats:
        """Return the mean values of a layer, shape (256, 256); not a number where a cell has none."""
        found = self.values.get(name)
        return np.full(_SHAPE, np.nan) if found is None else found.mean()


def next_finer(pair: Pair, deepest: Pair) -> Pair:
    """Return the level pair that a coarser one is made from.

    Sums of floating-point numbers depend on their order, so every pair has one way down: both axes together,
    across first, as long as both are still to be halved, then the remaining axis alone.

    Examples
    --------
    >>> next_finer((1, 1), (3, 3)), next_finer((0, 2), (3, 3)), next_finer((2, 0), (3, 3))
    ((2, 2), (1, 2), (2, 1))
    """
    across, up = deepest[0] - pair[0], deepest[1] - pair[1]
    return pair[0] + (across >= up), pair[1] + (up >= across)


def gathered(address: Address, leaf: Pair, deepest: Pair, read: Callable[[Address], PlaneSums]) -> PlaneSums:
    """Return a tile made from tiles of a finer level pair, always halved across, then up.

    Parameters
    ----------
    address : Address
        Of the tile.
    leaf : (int, int)
        Level pair that is read; it lies on the way that :func:`next_finer` describes.
    deepest : (int, int)
        The deepest level pair of the set.
    read : callable
        Returns a tile of ``leaf``. At most three halves a level are held beside what it returns.
    """
    if address.pair == leaf:
        return read(address)
    finer = next_finer(address.pair, deepest)
    if finer[1] == address.up_level:
        return _across(address, leaf, deepest, read)
    if finer[0] == address.across_level:
        lower, upper = (halved_up(gathered(part, leaf, deepest, read)) for part in address.children_up())
    else:
        lower, upper = (halved_up(_across(part, leaf, deepest, read)) for part in address.children_up())
    return joined_up(lower, upper)


def halved_across(plane: PlaneSums) -> PlaneSums:
    """Add the cells of neighbouring columns: a tile becomes 128 columns wide."""
    values = {
        name: ValueSums(found.sums[0::2] + found.sums[1::2], halve_across(found.numbers))
        for name, found in plane.values.items()
    }
    return PlaneSums({number: halve_across(counts) for number, counts in plane.classes.items()}, values)


def halved_up(plane: PlaneSums) -> PlaneSums:
    """Add the cells of neighbouring rows: a tile becomes 128 rows high."""
    values = {
        name: ValueSums(found.sums[:, 0::2] + found.sums[:, 1::2], halve_up(found.numbers))
        for name, found in plane.values.items()
    }
    return PlaneSums({number: halve_up(counts) for number, counts in plane.classes.items()}, values)


def joined_across(left: PlaneSums, right: PlaneSums) -> PlaneSums:
    """Return the tile made of two halves of 128 x 256 cells."""
    return _joined(left, right, join_across, 0)


def joined_up(lower: PlaneSums, upper: PlaneSums) -> PlaneSums:
    """Return the tile made of two halves of 256 x 128 cells."""
    return _joined(lower, upper, join_up, 1)


def _across(address: Address, leaf: Pair, deepest: Pair, read: Callable[[Address], PlaneSums]) -> PlaneSums:
    left, right = (halved_across(gathered(part, leaf, deepest, read)) for part in address.children_across())
    return joined_across(left, right)


def _joined(
    first: PlaneSums,
    second: PlaneSums,
    join: Callable[[Counts | None, Counts | None], Counts | None],
    axis: int,
) -> PlaneSums:
    classes = {}
    for number in sorted({*first.classes, *second.classes}):
        counts = join(first.classes.get(number), second.classes.get(number))
        assert counts is not None
        classes[number] = counts
    values = {}
    for name in sorted({*first.values, *second.values}):
        halves = first.values.get(name), second.values.get(name)
        numbers = join(*(None if half is None else half.numbers for half in halves))
        assert numbers is not None
        empty = np.zeros((TILE // 2, TILE) if axis == 0 else (TILE, TILE // 2))
        sums = [empty if half is None else half.sums for half in halves]
        values[name] = ValueSums(np.concatenate(sums, axis=axis), numbers)
    return PlaneSums(classes, values)


def _check(name: str, given: NDArray[np.generic], kind: type[np.generic]) -> None:
    if given.shape != _SHAPE or given.dtype != kind:
        raise AssertionError(f"{name} of a tile are {given.dtype}{given.shape}, not {np.dtype(kind)}{_SHAPE}")
