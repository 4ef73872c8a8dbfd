"""Several densities in one raster, each in an ink of its own, shaded alike."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from atlas.figure.pieces import LegendEntry, Raster
from atlas.output.colouring import CELLS_SHADED_AT_ONCE, Colours
from tiles.mixing import INKS, ink_table, inked
from tiles.palette import colour
from tiles.shading import LEVELS, fit_counts, line_density, shade_counts
from tiles.strip import Strip
from tiles.window import View

LEGEND_SHADE = (2 * LEVELS) // 3


def overprinted(
    colours: Colours, view: View, strips: Sequence[Strip], names: Sequence[str]
) -> tuple[Raster, tuple[LegendEntry, ...]]:
    """Print the densities of several strips of one view over each other.

    Parameters
    ----------
    colours : Colours
        Shading and background; inks take the place of the palette.
    view : View
    strips : sequence of Strip
        Of all columns; at most as many as there are inks.
    names : sequence of str
        What the legend calls each.

    Returns
    -------
    (Raster, tuple of LegendEntry)
    """
    columns, rows = strips[0].counts.shape
    height = view.up.cell_size(rows)
    fit = fit_counts(
        np.concatenate([strip.counts for strip in strips]),
        np.concatenate([strip.exposure for strip in strips]),
        height,
        colours.shading,
        line=line_density(height),
    )
    inks = INKS[: len(strips)]
    pixels = np.empty((rows, columns, 3), np.uint8)
    ground = {"background": colour(colours.background)} if colours.background else {}
    ground |= {"missing": colour(colours.missing)} if colours.missing else {}
    width = max(1, CELLS_SHADED_AT_ONCE // rows)
    for first in range(0, columns, width):
        at = slice(first, first + width)
        shades = [
            np.ascontiguousarray(shade_counts(strip.counts[at], strip.exposure[at], height, fit).T[::-1])
            for strip in strips
        ]
        pixels[:, at] = inked(shades, inks, **ground)
    unsettled = np.any([strip.unsettled > 0 for strip in strips], axis=0)
    legend = []
    for name, ink in zip(names, inks, strict=True):
        red, green, blue = ink_table(ink)[LEGEND_SHADE].tolist()
        legend.append(LegendEntry(name, (red, green, blue)))
    return Raster(None, None, view, unsettled, pixels), tuple(legend)
