"""Views for the checks: a column put around a published value, and what is seen in it."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence
from fractions import Fraction
from typing import Any

import numpy as np
from numpy.typing import NDArray

import atlas
from tiles.number import exact

Number = str | int | Fraction
Interval = tuple[str, Any, Any]

UP: Mapping[str, Interval] = {
    "logistic": ("x", 0, 1),
    "ricker": ("x", 0, 5),
    "hassell": ("x", 0, 20),
    "maynard_smith_slatkin": ("x", 0, 4),
    "theta_ricker": ("x", 0, 2),
    "cubic": ("x", "-1.2", "1.2"),
    "sine": ("x", 0, 1),
    "tent": ("x", 0, 1),
    "skew_tent": ("x", -8, 2),
    "gauss": ("x", "-1.2", "1.2"),
    "quadratic": ("x", -2, 2),
}
"""Of each family, an interval that holds its attractors."""


def counted(
    name: str,
    across: Interval,
    *,
    size: tuple[int, int],
    up: Interval | None = None,
    starts: Iterable[Number] | None = None,
    **options: Any,
) -> Any:
    """Count a family of the catalogue; without ``up``, over all its attractors.

    Parameters
    ----------
    name : str
    across, up : (name, low, high)
    size : (int, int)
        Columns and rows.
    starts : iterable of numbers, optional
    **options
        As `atlas.orbit_counts`; four values a column unless another number is given.

    Returns
    -------
    xarray.Dataset
    """
    if starts is not None:
        options["starts"] = [{"x": start} for start in starts]
    options.setdefault("values_per_column", 4)
    view = atlas.View(across, up or UP[name])
    return atlas.orbit_counts(atlas.family(name), view, size=size, **options)


def at(name: str, parameter: str, value: Number, *, rows: int, **options: Any) -> Any:
    """Count one column whose only parameter value is the one given, to the last bit."""
    middle = Fraction(value)
    across = (parameter, middle - Fraction(1, 4), middle + Fraction(1, 4))
    made = counted(name, across, size=(1, rows), values_per_column=1, **options)
    assert float(made[parameter][0]) == float(middle)
    return made


def around(parameter: str, value: Number, width: Number, columns: int = 9) -> Interval:
    """Return an axis of columns of a round width, with a value somewhere in the middle one."""
    cell = Fraction(width)
    first = math.floor(Fraction(value) / cell) - columns // 2
    return parameter, first * cell, (first + columns) * cell


def cell_of(axis: Interval, cells: int, value: Fraction) -> int:
    """Return the cell of a linear axis that a value lies in; -1 below it, ``cells`` above.

    A value so near to an edge that float64 could not tell the side makes a check worthless, so it is not
    allowed.
    """
    low, high = exact(axis[1]).value, exact(axis[2]).value
    place = (value - low) * cells / (high - low)
    cell = math.floor(place)
    slack = 1e-13 * cells * float(max(abs(low), abs(high)) / (high - low))
    assert slack < place - cell < 1 - slack, f"{float(value)} lies on an edge"
    return min(max(cell, -1), cells)


def values_of(axis: Interval, columns: int, each: int) -> list[list[Fraction]]:
    """Return the exact parameter values of every column: low + (c + (s + 1/2) / S) width."""
    low, high = exact(axis[1]).value, exact(axis[2]).value
    width = (high - low) / columns
    return [[low + (c + Fraction(2 * s + 1, 2 * each)) * width for s in range(each)] for c in range(columns)]


def expected_counts(
    up: Interval, rows: int, points: Sequence[Sequence[Sequence[Fraction]]], samples: int
) -> tuple[NDArray[np.int64], NDArray[np.int64], NDArray[np.int64]]:
    """Return the counts, below and above that known cycles give.

    Parameters
    ----------
    up : (name, low, high)
    rows : int
    points : nested sequences
        Of each column, of each of its orbits, the points of the cycle.
    samples : int
        Of each orbit; shared equally by the points.
    """
    table = np.zeros((rows + 2, len(points)), np.int64)
    for column, orbits in enumerate(points):
        for cycle in orbits:
            for x in cycle:
                table[cell_of(up, rows, x) + 1, column] += samples // len(cycle)
    return table[1:-1], table[0], table[-1]


def branches(counts: NDArray[np.uint32]) -> list[int]:
    """Return how many runs of occupied cells each column has; counts has the shape (rows, columns)."""
    occupied = np.pad(counts > 0, ((1, 0), (0, 0))).astype(np.int8)
    return [int(number) for number in (np.diff(occupied, axis=0) == 1).sum(axis=0)]


def bands(counts: NDArray[np.uint32]) -> list[tuple[int, int]]:
    """Return the lowest and highest cell of each run of occupied cells of one column."""
    edge = np.diff(np.pad(counts > 0, 1).astype(np.int8))
    return list(
        zip(np.flatnonzero(edge == 1).tolist(), (np.flatnonzero(edge == -1) - 1).tolist(), strict=True)
    )


def outside(made: Any) -> int:
    """Return all samples that lie below or above the window, escaped or stayed unsettled."""
    return sum(int(made[name].sum()) for name in ("below", "above", "escaped", "unsettled"))
