"""From counted strips to rasters, in the colours that a job asks for."""

from __future__ import annotations

from typing import Protocol

import numpy as np

from atlas.figure.pieces import Raster
from tiles.shading import Fit, colour_table, fit_counts, line_density, shade_counts
from tiles.strip import Strip
from tiles.window import Axis, View

CELLS_SHADED_AT_ONCE = 1 << 20


class Colours(Protocol):
    """How densities become colours."""

    @property
    def shading(self) -> str:
        """One of `tiles.shading.SHADINGS`."""

    @property
    def palette(self) -> str:
        """One of `tiles.palette.PALETTES`."""

    @property
    def background(self) -> str | None:
        """Colour of empty cells."""

    @property
    def missing(self) -> str | None:
        """Colour of cells without samples."""


def shaded(colours: Colours, view: View, strip: Strip, *, branches: bool = True) -> tuple[Fit, Raster]:
    """Shade the counts of a view with a fit of its own; return the fit and the raster, top line first.

    With ``branches``, branches of cycles get the highest shade, see :func:`tiles.shading.line_density`.
    """
    height = view.up.cell_size(strip.counts.shape[1])
    line = line_density(height) if branches else None
    fit = fit_counts(strip.counts, strip.exposure, height, colours.shading, line=line)
    table = colour_table(
        colours.palette, background=colours.background, missing=colours.missing, shading=colours.shading
    )
    columns, rows = strip.counts.shape
    lines = np.empty((rows, columns), np.uint8)
    width = max(1, CELLS_SHADED_AT_ONCE // rows)
    for first in range(0, columns, width):
        block = slice(first, first + width)
        lines[::-1, block] = shade_counts(strip.counts[block], strip.exposure[block], height, fit).T
    return fit, Raster(lines, table, view, strip.unsettled > 0)


def key_caption(up: Axis, unit: str = "") -> str:
    """Return the caption of a plate's colour key."""
    if up.scale == "log":
        return f"density (share of samples per unit of ln {up.name})"
    return f"density (share of samples per {unit or f'unit of {up.name}'})"
