"""Margins of a panel: the room that ticks, labels, title, letter and colour key take around its raster."""

from __future__ import annotations

import math
from dataclasses import dataclass

from atlas.figure.boxes import Spacing
from atlas.figure.panels import Panel
from atlas.figure.ticks import Ticks

# Distances in font sizes. Baselines and edges, from the raster outwards; see also Spacing.
PAD = 0.5
LABEL_GAP = 0.3
AXIS_LABEL = 1.4  # from the baseline of the tick labels to that of the axis label
OFFSET_LINE = 1.25
DESCENT = 0.3
UP_LABEL = 0.65  # from the longest tick label to the baseline of the turned axis label
ASCENT = 0.8
TITLE_GAP = 0.65
OFFSET_GAP = 0.45
KEY_GAP = 1.3
KEY_WIDTH = 1.0
KEY_LABELS = 3.4
KEY_CAPTION = 1.5
LEGEND_GAP = 1.0
SWATCH_WIDTH = 1.25
SWATCH_HEIGHT = 0.85
SWATCH_GAP = 0.45
LEGEND_LINE = 1.45  # from swatch to swatch


@dataclass(frozen=True)
class Sides:
    """Room around a raster, in pixels."""

    left: int = 0
    right: int = 0
    top: int = 0
    bottom: int = 0

    def at_least(self, other: Sides) -> Sides:
        """Return the larger of both on every side."""
        return Sides(
            max(self.left, other.left),
            max(self.right, other.right),
            max(self.top, other.top),
            max(self.bottom, other.bottom),
        )


def sides(panel: Panel, across: Ticks, up: Ticks, width: int, spacing: Spacing) -> Sides:
    """Return the margins that a panel needs.

    Parameters
    ----------
    panel : Panel
        Which labels it carries.
    across, up : Ticks
        What stands along its axes.
    width : int
        Width of its raster in pixels.
    spacing : Spacing
        Distances of the page.

    Returns
    -------
    Sides
        Whole pixels, rounded up.
    """
    before, after = _overhang(across, width, spacing) if panel.across_labels else (0.0, 0.0)
    pad = spacing.ems(PAD)
    left = spacing.line + spacing.tick + pad
    if panel.up_labels:
        longest = max((spacing.text(label) for label in up.labels), default=0.0)
        left += spacing.ems(LABEL_GAP) + longest + spacing.ems(UP_LABEL + ASCENT)
    right = spacing.line + pad
    if panel.plate.legend_width:
        right = legend_right(panel.plate.legend_width, spacing)
    elif panel.plate.has_key:
        right = key_right(spacing)
    return Sides(
        math.ceil(max(left, before + pad)),
        math.ceil(max(right, after + pad)),
        math.ceil(_top(panel, up, spacing)),
        math.ceil(_bottom(panel, across, spacing)),
    )


def key_right(spacing: Spacing) -> float:
    """Return the width of the margin that holds a colour key."""
    ems = KEY_GAP + KEY_WIDTH + LABEL_GAP + KEY_LABELS + KEY_CAPTION + PAD
    return 3 * spacing.line + spacing.minor + spacing.ems(ems)


def legend_right(width: float, spacing: Spacing) -> float:
    """Return the width of the margin that holds a legend, whose longest label has a width in font sizes."""
    return 3 * spacing.line + spacing.ems(LEGEND_GAP + SWATCH_WIDTH + SWATCH_GAP + width + PAD)


def _overhang(across: Ticks, width: int, spacing: Spacing) -> tuple[float, float]:
    """Return how far the first and the last label reach beyond the raster."""
    if not across.labels:
        return 0.0, 0.0
    first = 0.5 * spacing.text(across.labels[0]) - across.positions[0] * width
    last = 0.5 * spacing.text(across.labels[-1]) - (1 - across.positions[-1]) * width
    return max(0.0, first), max(0.0, last)


def _top(panel: Panel, up: Ticks, spacing: Spacing) -> float:
    height = spacing.line + spacing.ems(PAD)
    half_label = 0.5 * spacing.digit + spacing.ems(PAD) if panel.up_labels else 0.0
    offset = panel.up_labels and bool(up.offset)
    if offset:
        height += spacing.ems(OFFSET_GAP + ASCENT)
    if panel.plate.title or panel.letter:
        height += spacing.ems((0.3 if offset else TITLE_GAP) + ASCENT)
    return max(height, half_label)


def _bottom(panel: Panel, across: Ticks, spacing: Spacing) -> float:
    if not panel.across_labels:
        return spacing.line + spacing.tick + spacing.ems(PAD)
    height = tick_baseline(spacing) + spacing.ems(AXIS_LABEL + DESCENT + PAD)
    return height + (spacing.ems(OFFSET_LINE) if across.offset else 0.0)


def tick_baseline(spacing: Spacing) -> float:
    """Return the distance of the across labels' baseline below the raster."""
    return spacing.line + spacing.tick + spacing.ems(LABEL_GAP) + spacing.digit
