"""Tiles of planes: majorities, means, and how many tiles are held while a coarse one is gathered."""

import weakref

import numpy as np
import pytest

from tiles.errors import TooLarge
from tiles.grid import TILE, Address
from tiles.plane import PlaneSums, PlaneTile, ValueSums, gathered, halved_across, halved_up

SHAPE = (TILE, TILE)


def counts(**cells):
    """Return a tile of counts with some cells at the left edge filled: cell0=3 is the lowest one."""
    array = np.zeros(SHAPE, np.uint32)
    for name, number in cells.items():
        array[0, int(name.removeprefix("cell"))] = number
    return array


def test_of_equally_frequent_classes_the_smallest_leads():
    plane = PlaneSums(
        {
            2: counts(cell0=2, cell1=1, cell3=1),
            60002: counts(cell0=2, cell1=3, cell3=2),
            60003: counts(cell1=3, cell2=1, cell3=1),
        },
        {},
    )
    assert plane.majority()[0, :4].tolist() == [2, 60002, 60003, 60002]
    assert plane.majority().dtype == np.uint16


def test_means_are_over_finite_values():
    values = np.full(SHAPE, np.nan)
    values[:2, :2] = [[1.0, np.inf], [-np.inf, 2.0]]
    plane = PlaneSums.of(PlaneTile(np.ones(SHAPE, np.uint16), {"lyapunov": values}))
    coarse = halved_up(halved_across(plane))
    assert coarse.classes[1].tolist() == np.full((128, 128), 4).tolist()
    sums = coarse.values["lyapunov"]
    assert (sums.sums[0, 0], sums.numbers[0, 0], sums.mean()[0, 0]) == (3.0, 2, 1.5)
    assert np.isnan(sums.mean()[1:]).all()
    assert np.isnan(plane.means("rotation")).all()


def test_a_layer_without_any_value_is_left_out():
    tile = PlaneTile(np.ones(SHAPE, np.uint16), {"lyapunov": np.full(SHAPE, np.nan)})
    assert PlaneSums.of(tile).values == {}


def test_counts_beyond_64_bits_are_refused():
    plane = PlaneSums({1: np.full(SHAPE, 2**63, np.uint64)}, {})
    with pytest.raises(TooLarge, match="fewer levels"):
        halved_across(plane)


@pytest.mark.parametrize(("address", "deepest"), [((0, 0, 0, 0), (4, 4)), ((0, 2, 0, 3), (6, 3))])
def test_few_tiles_are_held_while_a_coarse_one_is_gathered(address, deepest):
    alive, most, read = weakref.WeakSet(), 0, []

    class Held(PlaneSums):
        __hash__ = object.__hash__

    def leaf(at):
        nonlocal most
        ones = np.ones(SHAPE, np.uint8)
        made = Held({1: ones}, {"lyapunov": ValueSums(np.full(SHAPE, float(at.column)), ones)})
        alive.add(made)
        read.append(at)
        most = max(most, len(alive))
        return made

    levels = deepest[0] - address[0], deepest[1] - address[1]
    found = gathered(Address(*address), deepest, deepest, leaf)
    assert len(read) == len(set(read)) == 2 ** sum(levels)
    assert most <= 2
    assert (found.classes[1] == 2 ** sum(levels)).all()
    columns = (np.arange(TILE << levels[0]) // TILE).reshape(TILE, -1).mean(axis=1)
    assert np.allclose(found.means("lyapunov"), columns[:, None])
