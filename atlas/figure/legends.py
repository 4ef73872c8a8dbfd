"""Legends: swatches with labels to the right of a frame, from its top."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from atlas.figure import margins
from atlas.figure.boxes import Box, Spacing
from atlas.figure.lettering import plain
from atlas.figure.pieces import Block, LegendEntry, Piece, Words, frame


def legend_pieces(box: Box, entries: Sequence[LegendEntry], spacing: Spacing) -> Iterator[Piece]:
    """Yield what a legend is painted from.

    Where more entries are given than lines fit beside the frame, the last line says how many are left out.

    Parameters
    ----------
    box : Box
        Where it stands.
    entries : sequence of LegendEntry
        From the top.
    spacing : Spacing
        Distances of the page.
    """
    height, width = round(spacing.ems(margins.SWATCH_HEIGHT)), round(spacing.ems(margins.SWATCH_WIDTH))
    pitch = spacing.ems(margins.LEGEND_LINE)
    lines = 1 + int((box.height - height) / pitch)
    shown = entries if len(entries) <= lines else entries[: lines - 1]
    left = box.left + width + spacing.ems(margins.SWATCH_GAP)
    for number, entry in enumerate(shown):
        swatch = Box(box.left, box.top + round(number * pitch), width, height)
        inside = swatch.grown(-spacing.line)
        yield Block(inside, entry.colour)
        yield from frame(inside, spacing.line)
        yield _label(entry.label, left, swatch, box, spacing)
    if len(shown) < len(entries):
        last = Box(box.left, box.top + round(len(shown) * pitch), 0, height)
        yield _label(f"and {len(entries) - len(shown)} more", box.left, last, box, spacing)


def _label(text: str, left: float, line: Box, box: Box, spacing: Spacing) -> Words:
    y = line.top + (line.height + spacing.digit) / 2
    return Words(plain(text), left, y, spacing.tick_font, box.right - left, "left")
