"""An orbit histogram drawn into axes that the caller already has, for notebooks."""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from atlas.figure.lettering import axis_text
from tiles.number import exact
from tiles.palette import Palette
from tiles.shading import colour_table, fit_counts, line_density, shade_counts


def draw_axes(
    axes: Any,
    dataset: Any,
    *,
    shading: str = "equalised",
    palette: Palette | str = "blue",
    background: str | None = None,
) -> Any:
    """Draw an orbit histogram into axes of matplotlib, for notebooks.

    Parameters
    ----------
    axes : matplotlib.axes.Axes
        Its scales become those of the Dataset, its labels too where it has none.
    dataset : xarray.Dataset
        As :func:`atlas.orbit_counts` returns it: ``counts`` with dimensions (up, across), ``exposure``.
    shading : str
        One of `tiles.shading.SHADINGS`.
    palette : Palette or str
        Colours of the shades.
    background : str, optional
        Colour of empty cells, ``#rrggbb``; by default the palette's.

    Returns
    -------
    matplotlib.image.AxesImage
        One cell is one cell of the image, never smoothed.
    """
    up, across = (dataset[name] for name in dataset["counts"].dims)
    left, right = _ends(across)
    bottom, top = _ends(up)
    counts = np.ascontiguousarray(dataset["counts"].to_numpy().T)
    exposure = dataset["exposure"].to_numpy()
    height = (math.log(top / bottom) if _is_log(up) else top - bottom) / up.size
    line = line_density(height) if "family" in dataset.attrs else None
    shades = shade_counts(counts, exposure, height, fit_counts(counts, exposure, height, shading, line=line))
    colours = colour_table(palette, background=background, shading=shading)[shades.T]
    axes.set_xscale("log" if _is_log(across) else "linear")
    axes.set_yscale("log" if _is_log(up) else "linear")
    axes.set(xlim=(left, right), ylim=(bottom, top))
    image = axes.imshow(
        colours,
        extent=(*_scaled(across), *_scaled(up)),
        transform=axes.transLimits + axes.transAxes,  # cells are equal on the scaled axes, not in the values
        origin="lower",
        aspect="auto",
        interpolation="nearest",
    )
    axes.set_xlabel(axes.get_xlabel() or _text(across))
    axes.set_ylabel(axes.get_ylabel() or _text(up))
    return image


def _is_log(coordinate: Any) -> bool:
    return bool(coordinate.attrs.get("scale", "linear") == "log")


def _ends(coordinate: Any) -> tuple[float, float]:
    """Return the ends of an axis: as its attributes give them, else half a cell beyond the outer centres."""
    attributes = coordinate.attrs
    if "low" in attributes and "high" in attributes:
        return float(exact(attributes["low"])), float(exact(attributes["high"]))
    centres = coordinate.to_numpy().astype(float)
    if _is_log(coordinate):
        half = (centres[-1] / centres[0]) ** (0.5 / (centres.size - 1))
        return float(centres[0] / half), float(centres[-1] * half)
    half = 0.5 * (centres[-1] - centres[0]) / (centres.size - 1)
    return float(centres[0] - half), float(centres[-1] + half)


def _scaled(coordinate: Any) -> tuple[float, float]:
    low, high = _ends(coordinate)
    return (math.log10(low), math.log10(high)) if _is_log(coordinate) else (low, high)


def _text(coordinate: Any) -> str:
    attributes = coordinate.attrs
    return axis_text(str(coordinate.name), attributes.get("long_name"), attributes.get("units"))
