"""Several densities in one raster, each in an ink of its own, shaded alike."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from atlas.figure.pieces import LegendEntry, Raster
from atlas.output.colouring import CELLS_SHADED_AT_ONCE, Colours
from tiles.mixing import INKS, inked, swatch
from tiles.palette import colour
from tiles.shading import fit_counts, line_density, shade_counts
from tiles.window import View


@dataclass(frozen=True)
class Layered:
    """Counts of several densities of one view.

    Attributes
    ----------
    counts : ndarray of uint32, shape (densities, columns, rows)
        At most as many densities as there are inks.
    exposure : ndarray of uint64, shape (columns,)
        Samples of every column.
    cell : float
        Height of a cell, or its area.
    names : sequence of str
        What the legend calls each density.
    unsettled : ndarray of bool, shape (columns,), optional
        Columns that get a mark at the frame.
    """

    counts: NDArray[np.uint32]
    exposure: NDArray[np.uint64]
    cell: float
    names: Sequence[str]
    unsettled: NDArray[np.bool_] | None = None


def overprinted(
    colours: Colours, view: View, layered: Layered, *, branches: bool = True
) -> tuple[Raster, tuple[LegendEntry, ...]]:
    """Print several densities over each other, all shaded by one fit.

    Parameters
    ----------
    colours : Colours
        Shading and background; inks take the place of the palette.
    view : View
    layered : Layered
    branches : bool
        Whether branches of cycles get the highest shade, see :func:`tiles.shading.line_density`.
    """
    counts, cell = layered.counts, layered.cell
    densities, columns, rows = counts.shape
    fit = fit_counts(
        counts.reshape(densities * columns, rows),
        np.tile(layered.exposure, densities),
        cell,
        colours.shading,
        line=line_density(cell) if branches else None,
    )
    inks = INKS[:densities]
    pixels = np.empty((rows, columns, 3), np.uint8)
    ground = {"background": colour(colours.background)} if colours.background else {}
    ground |= {"missing": colour(colours.missing)} if colours.missing else {}
    width = max(1, CELLS_SHADED_AT_ONCE // rows)
    for first in range(0, columns, width):
        at = slice(first, first + width)
        shades = [
            np.ascontiguousarray(shade_counts(each[at], layered.exposure[at], cell, fit).T[::-1])
            for each in counts
        ]
        pixels[:, at] = inked(shades, inks, **ground)
    legend = [LegendEntry(name, swatch(ink)) for name, ink in zip(layered.names, inks, strict=True)]
    if densities == 2:
        legend.append(LegendEntry("both", swatch(*inks)))
    return Raster(None, None, view, layered.unsettled, pixels), tuple(legend)
