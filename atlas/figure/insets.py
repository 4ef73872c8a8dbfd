"""Insets: where a magnified window stands in its plate, and which pixels of the plate it shows."""

from __future__ import annotations

import math

from atlas.figure.boxes import Box, InsetBox, Spacing
from atlas.figure.panels import LayoutRefused, PlateRequest
from atlas.figure.ticks import position
from atlas.reading.sheet import CORNERS, Inset
from tiles.errors import nearest

LEAST_INSET = 1.5  # font sizes


def inset_box(plate: PlateRequest, raster: Box, spacing: Spacing) -> InsetBox | None:
    """Place a plate's inset in its corner, and find the pixels of the window that it shows.

    Parameters
    ----------
    plate : PlateRequest
        The plate and its inset.
    raster : Box
        The raster of the plate.
    spacing : Spacing
        Distances of the page.

    Returns
    -------
    InsetBox or None
        Both boxes in page coordinates; None where the plate has no inset.

    Raises
    ------
    LayoutRefused
        When the corner is unknown, the inset does not fit or its window lies outside the plate.
    """
    inset = plate.inset
    if inset is None:
        return None
    if inset.corner not in CORNERS:
        raise LayoutRefused(
            f"plate '{plate.name}': an inset has no corner '{inset.corner}'{nearest(inset.corner, CORNERS)}"
        )
    width, height = round(inset.width * raster.width), round(inset.width * raster.height)
    gap = round(spacing.ems(0.7)) + 2 * spacing.line
    least = math.ceil(spacing.ems(LEAST_INSET))
    if min(width, height) < least or width + 2 * gap > raster.width or height + 2 * gap > raster.height:
        raise LayoutRefused(
            f"plate '{plate.name}': an inset of {inset.width:g} of the frame does not fit into "
            f"{raster.width}x{raster.height}px; choose its width between 0.1 and 0.9 or enlarge the plate"
        )
    upper, left = inset.corner.startswith("upper"), inset.corner.endswith("left")
    box = Box(
        raster.left + gap if left else raster.right - gap - width,
        raster.top + gap if upper else raster.bottom - gap - height,
        width,
        height,
    )
    return InsetBox(box, _window(plate, inset, raster), inset.view)


def _window(plate: PlateRequest, inset: Inset, raster: Box) -> Box:
    """Return the pixels of the plate that an inset magnifies, none cut."""
    ends = []
    for axis, part in ((plate.view.across, inset.view.across), (plate.view.up, inset.view.up)):
        if axis.name != part.name or axis.scale != part.scale or part.low < axis.low or axis.high < part.high:
            raise LayoutRefused(
                f"plate '{plate.name}': its inset shows {part.name} from {part.low} to {part.high} "
                f"({part.scale}), which is not inside the plate's {axis.name} "
                f"from {axis.low} to {axis.high} ({axis.scale})"
            )
        ends.append((position(axis, part.low), position(axis, part.high)))
    (left, right), (low, high) = ends
    first, last = math.floor(left * raster.width), math.ceil(right * raster.width)
    bottom, top = math.floor(low * raster.height), math.ceil(high * raster.height)
    return Box(raster.left + first, raster.bottom - top, last - first, top - bottom)
