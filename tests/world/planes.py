"""Planes for the checks: what a formula says of every pixel, and single pixels put on published values."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from fractions import Fraction
from typing import Any

import numpy as np
from numpy.typing import NDArray

import atlas
from atlas.families.map_family import Family
from atlas.planes.fates import CLASS_UNSETTLED
from atlas.planes.layers import classes_of

Number = str | int | Fraction
Interval = tuple[str, Any, Any]
Says = Callable[[NDArray[np.float64], NDArray[np.float64]], NDArray[Any]]
BASIC = ("fate", "period", "lyapunov")


def plane(
    family: str | Family,
    across: Interval,
    up: Interval,
    size: tuple[int, int],
    layers: Sequence[str] = BASIC,
    **options: Any,
) -> Any:
    """Look at a plane; a family of the catalogue goes by its name."""
    found = atlas.family(family) if isinstance(family, str) else family
    return atlas.parameter_plane(found, atlas.View(across, up), size=size, layers=layers, **options)


def classes(made: Any) -> NDArray[np.uint16]:
    """Return the class of every pixel, shape (rows, columns)."""
    return classes_of(made.fate.values, made.period.values)


def centred(name: str, value: Number, half_width: Number = Fraction(1, 64)) -> Interval:
    """Return an axis whose middle is a value, to the last bit."""
    return name, Fraction(value) - Fraction(half_width), Fraction(value) + Fraction(half_width)


def pixel(
    family: str | Family, at: Mapping[str, Number], layers: Sequence[str] = BASIC, **options: Any
) -> dict[str, float]:
    """Return the layers of one pixel whose centre is the point given, across first."""
    axes = [centred(name, value) for name, value in at.items()]
    made = plane(family, axes[0], axes[1], (1, 1), layers, **options)
    for name, value in at.items():
        assert float(made[name][0]) == float(Fraction(value))
    return {name: made[name].values[0, 0].item() for name in layers}


def corners(made: Any) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return the coordinates across and up of the centre and four corners of each pixel.

    Returns
    -------
    (ndarray, ndarray)
        Of shape (5, rows, columns), the centre first.
    """
    up, across = made.fate.dims
    x, y = np.meshgrid(made[across].values, made[up].values)
    wide, high = (
        (float(Fraction(made[name].attrs["high"])) - float(Fraction(made[name].attrs["low"])))
        / made.sizes[name]
        / 2
        for name in (across, up)
    )
    return (
        np.stack([x, *(x + side * wide for side in (-1, 1, -1, 1))]),
        np.stack([y, *(y + side * high for side in (-1, -1, 1, 1))]),
    )


def agreed(made: Any, says: Says) -> NDArray[Any]:
    """Return what a formula says of the pixels: where it does not say the same all over one, 0."""
    told = says(*corners(made))
    same = (told == told[0]).all(axis=0)
    return np.where(same, told[0], 0)


def wrong(made: Any, says: Says) -> list[tuple[float, float, int, int]]:
    """Return the pixels that are not what a formula says: their centres, what it says, what they are.

    Parameters
    ----------
    made : xarray.Dataset
    says : callable of (across, up)
        Returns classes; 0 where it says nothing. Pixels cut by a border must be of a class that a corner
        has, or unsettled, unless the formula is silent at a corner.
    """
    told, found = says(*corners(made)), classes(made)
    silent = (told == 0).any(axis=0)
    whole = (told == told[0]).all(axis=0)
    fits = (told == found).any(axis=0) | (~whole & (found == CLASS_UNSETTLED))
    up, across = made.fate.dims
    return [
        (
            float(made[across][column]),
            float(made[up][row]),
            int(told[0, row, column]),
            int(found[row, column]),
        )
        for row, column in np.argwhere(~silent & ~fits)
    ]


def shares(made: Any, says: Says) -> dict[int, int]:
    """Return how many whole pixels a formula speaks of, by class."""
    numbers, often = np.unique(agreed(made, says), return_counts=True)
    return {int(number): int(pixels) for number, pixels in zip(numbers, often, strict=True) if number}
