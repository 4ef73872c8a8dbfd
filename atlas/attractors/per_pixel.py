"""How many different attractors several starts reach, pixel by pixel of a parameter plane."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from atlas.attractors.ends import Ends, Grid, Sorter, Visits, Whole
from atlas.attractors.kernels import attractor_module
from atlas.planes.finder import FateFinder, Region

ORBITS_AT_ONCE = 1 << 16
SIDES = {1: 1024, 2: 48, 3: 13}
"""Cells along each axis of the grid of a pixel, by the number of state variables."""
MOST_CYCLES = 256
"""Cycles of one pixel that are told apart; the others are not counted."""
PIXELS_JOINED = 64


def sorter_of(finder: FateFinder, stop: NDArray[np.uint8] | None = None) -> Sorter:
    """Return what tells apart the attractors that a finder's orbits reach."""
    kernels = attractor_module(finder.source, finder.lanes)
    axes = [axis for axis in (finder.view.across, finder.view.up) if axis.name in finder.family.state_names]
    ends = [abs(float(end)) for axis in axes for end in (axis.low, axis.high)]
    reach = max(float(np.abs(finder.setting.starts).max()), *ends, 0.0)
    return Sorter(kernels, reach, finder.rules.transient + finder.rules.steps, stop)


@dataclass(frozen=True)
class Sorted:
    """The attractors of groups of orbits that share their parameters.

    Attributes
    ----------
    number : ndarray of int64, shape (groups, orbits of a group)
        Of the attractor within the group, from 0 in the order of its first orbit; -1 of orbits that reach
        none.
    different : ndarray of int64, shape (groups,)
        Attractors of each group.
    """

    number: Whole
    different: Whole


def sort_groups(sorter: Sorter, ends: Ends, groups: int) -> Sorted:
    """Tell apart the attractors of groups of orbits.

    Parameters
    ----------
    sorter : Sorter
    ends : Ends
        Orbit by orbit of the first group, then of the second, and so on; all groups have as many.
    groups : int
    """
    each = ends.fate.size // groups
    group = np.repeat(np.arange(groups), each)
    visits, stayed = sorter.visits(ends, np.flatnonzero(ends.others))
    cyclic = np.flatnonzero(ends.on_cycles)
    order = np.concatenate([cyclic, stayed])
    order = order[np.argsort(group[order], kind="stable")]
    own = sorter.cycles(ends, visits.end, order, group, min(MOST_CYCLES, each)).own
    label = np.maximum(own, -1)
    rest = stayed[own[stayed] < 0]
    label[rest] = each + _joined_in_groups(sorter, ends, visits, rest, group)
    return _numbered(label.reshape(groups, each))


def _joined_in_groups(sorter: Sorter, ends: Ends, visits: Visits, orbits: Whole, group: Whole) -> Whole:
    """Return the lowest cell of its group's grid that each of some orbits is joined to."""
    side = SIDES[len(ends.x)]
    cells = side ** len(ends.x)
    found = np.zeros(orbits.size, np.int64)
    _, first, often = np.unique(group[orbits], return_index=True, return_counts=True)
    edges = np.append(first, orbits.size)
    chosen = np.flatnonzero(often > 1)
    for start in range(0, chosen.size, PIXELS_JOINED):
        some = chosen[start : start + PIXELS_JOINED]
        at = np.concatenate([np.arange(edges[one], edges[one + 1]) for one in some])
        order = orbits[at]
        begins = np.concatenate([[0], np.cumsum(often[some])[:-1]])
        low = np.minimum.reduceat(visits.low[:, order], begins, axis=1)
        high = np.maximum.reduceat(visits.high[:, order], begins, axis=1)
        place = np.repeat(np.arange(some.size), often[some])
        parent = np.arange(some.size * cells)
        part = ends.taken(order)
        joined = sorter.joined(part, np.arange(order.size), Grid.over(low, high, side), place, parent)
        found[at] = joined % cells
    return found


def _numbered(label: Whole) -> Sorted:
    """Number labels that are not negative from 0, in every row in the order of their first occurrence."""
    number = np.full(label.shape, -1)
    different = np.zeros(len(label), np.int64)
    for column in range(label.shape[1]):
        fresh = (label[:, column] >= 0) & (number[:, column] < 0)
        rows = np.flatnonzero(fresh)
        if rows.size:
            same = label[rows] == label[rows, column][:, None]
            number[rows] = np.where(same, different[rows][:, None], number[rows])
            different[rows] += 1
    return Sorted(number, different)


def attractor_counts(
    finder: FateFinder, region: Region, stop: NDArray[np.uint8] | None = None
) -> NDArray[np.uint16]:
    """Return how many different attractors the starts of a finder reach, pixel by pixel.

    Escapes, extinct and unsettled orbits reach none. Cycles and other attractors are told apart as
    `atlas.attractors.ends` says, the latter on a grid over the box that a pixel's own orbits visit.

    Parameters
    ----------
    finder : FateFinder
        Of a parameter plane.
    region : Region
    stop : ndarray of uint8, shape (1,), optional
        When another thread sets it, the work ends early.

    Returns
    -------
    ndarray of uint16, shape (columns, rows) of the region

    Raises
    ------
    Stopped
        When ``stop`` was set.
    """
    sorter = sorter_of(finder, stop)
    starts = len(finder.setting.starts)
    columns, rows = region.shape
    counts = np.zeros((columns, rows), np.uint16)
    height = min(rows, max(finder.lanes, ORBITS_AT_ONCE // starts))
    width = max(1, min(columns, ORBITS_AT_ONCE // starts // height))
    for left in range(region.left, region.right, width):
        for low in range(region.low, region.high, height):
            part = Region(left, min(left + width, region.right), low, min(low + height, region.high))
            counted = _counted(finder, part, sorter, stop).reshape(part.shape)
            place = (left - region.left, low - region.low)
            counts[place[0] : place[0] + counted.shape[0], place[1] : place[1] + counted.shape[1]] = counted
    return counts


def _counted(finder: FateFinder, region: Region, sorter: Sorter, stop: NDArray[np.uint8] | None) -> Whole:
    pixels = region.shape[0] * region.shape[1]
    starts = len(finder.setting.starts)
    parts = [Ends.of(finder.find(region, start=k, stop=stop)) for k in range(starts)]
    if starts == 1:
        return (parts[0].on_cycles | parts[0].others).astype(np.int64)
    turned = np.arange(starts * pixels).reshape(starts, pixels).T.reshape(-1)
    return sort_groups(sorter, Ends.together(parts).taken(turned), pixels).different
