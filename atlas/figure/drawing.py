"""A page as a list of pieces in the order they are painted: everything but the painting itself."""

from __future__ import annotations

from collections.abc import Iterator, Mapping

import numpy as np
from numpy.typing import NDArray

from atlas.figure import margins
from atlas.figure.boxes import Box, InsetBox, Layout, PanelBox, Spacing
from atlas.figure.legends import legend_pieces
from atlas.figure.lettering import plain
from atlas.figure.pieces import BLACK, WHITE, Block, Colour, PanelText, Picture, Piece, Raster, Words, frame

MARK: Colour = (200, 62, 10)
GREY_MARK: Colour = (110, 110, 110)
MARK_HEIGHT, MARK_WIDTH = 0.2, 0.1  # font sizes


def pieces(layout: Layout, rasters: Mapping[str, Raster], texts: Mapping[str, PanelText]) -> list[Piece]:
    """Return everything that is painted on a page, in painting order.

    Parameters
    ----------
    layout : Layout
        Where everything stands.
    rasters : mapping of str to Raster
        By panel name, and by ``name/inset``; each of exactly the size of its box.
    texts : mapping of str to PanelText
        By panel name.

    Returns
    -------
    list of Piece

    Raises
    ------
    ValueError
        When a raster has another size than its box.
    """
    spacing = layout.spacing
    found: list[Piece] = []
    if layout.title:
        y = spacing.ems(margins.PAD + 0.9)
        room = layout.width - 2 * spacing.ems(margins.PAD)
        found.append(Words(plain(layout.title), layout.width / 2, y, 1.2 * layout.font_size, room))
    for panel in layout.panels:
        found += _panel(panel, rasters, texts[panel.name], spacing)
    return found


def _panel(
    panel: PanelBox, rasters: Mapping[str, Raster], text: PanelText, spacing: Spacing
) -> Iterator[Piece]:
    raster = rasters[panel.name]
    picture = _picture(panel.name, panel.raster, raster)
    yield picture
    yield from _marks(panel, raster.unsettled, picture, spacing)
    yield from frame(panel.raster, spacing.line)
    yield from _tick_blocks(panel, spacing)
    if panel.inset:
        yield from _inset(panel.inset, panel.name, rasters, spacing)
    if panel.key and raster.table is not None:
        yield from _key(panel.key, raster.table, text, spacing)
    if panel.legend:
        yield from legend_pieces(panel.legend, text.legend, spacing)
    yield from _tick_words(panel, spacing)
    yield from _axis_words(panel, text, spacing)
    yield from _head(panel, spacing)


def _picture(name: str, box: Box, raster: Raster) -> Picture:
    picture = raster.picture(box)
    if picture.pixels.shape[:2] != (box.height, box.width):
        raise ValueError(f"raster '{name}' is {picture.pixels.shape}, its box is {box.height} x {box.width}")
    return picture


def _marks(
    panel: PanelBox, unsettled: NDArray[np.bool_] | None, picture: Picture, spacing: Spacing
) -> Iterator[Block]:
    """Yield marks above and below the columns whose orbits had not settled, outside the frame."""
    if unsettled is None or not unsettled.any():
        return
    colour = BLACK if picture.bilevel else GREY_MARK if picture.grey else MARK
    height, least = round(spacing.ems(MARK_HEIGHT)) + 1, round(spacing.ems(MARK_WIDTH)) + 1
    for first, last in _runs(unsettled, least):
        width = max(least, last - first)
        left = panel.left + min(max(0, (first + last - width) // 2), panel.width - width)
        for top in (panel.top - spacing.line - height, panel.raster.bottom + spacing.line):
            yield Block(Box(left, top, width, height), colour)


def _runs(flags: NDArray[np.bool_], gap: int) -> list[tuple[int, int]]:
    """Return the runs of true columns as (first, last + 1); runs closer than a gap become one."""
    columns = np.flatnonzero(flags)
    breaks = np.flatnonzero(np.diff(columns) > gap)
    firsts, lasts = columns[np.r_[0, breaks + 1]], columns[np.r_[breaks, columns.size - 1]]
    return [(int(first), int(last) + 1) for first, last in zip(firsts, lasts, strict=True)]


def _tick_blocks(panel: PanelBox, spacing: Spacing) -> Iterator[Block]:
    line, box = spacing.line, panel.raster
    for ticks, across in ((panel.across_ticks, True), (panel.up_ticks, False)):
        for positions, length in ((ticks.positions, spacing.tick), (ticks.minor, spacing.minor)):
            for at in positions:
                if across:
                    left = _beside(at, box.left, box.width, line)
                    yield Block(Box(left, box.bottom + line, line, length))
                else:
                    top = _beside(1 - at, box.top, box.height, line)
                    yield Block(Box(box.left - line - length, top, length, line))


def _beside(at: float, start: int, length: int, line: int) -> int:
    """Return where a tick begins: centred on its value, but continuing the frame at either end."""
    if at <= 0:
        return start - line
    if at >= 1:
        return start + length
    return round(start + at * length - line / 2)


def _tick_words(panel: PanelBox, spacing: Spacing) -> Iterator[Words]:
    box, points = panel.raster, spacing.tick_font
    if panel.show_across_labels:
        y = box.bottom + margins.tick_baseline(spacing)
        for at, label in zip(panel.across_ticks.positions, panel.across_ticks.labels, strict=True):
            yield Words(label, box.left + at * box.width, y, points, box.width)
    if panel.show_up_labels:
        x = box.left - spacing.line - spacing.tick - spacing.ems(margins.LABEL_GAP)
        for at, label in zip(panel.up_ticks.positions, panel.up_ticks.labels, strict=True):
            y = box.bottom - at * box.height + spacing.digit / 2
            yield Words(label, x, y, points, box.width, "right")


def _axis_words(panel: PanelBox, text: PanelText, spacing: Spacing) -> Iterator[Words]:
    box, points = panel.raster, spacing.font_size
    if panel.show_across_labels:
        if panel.across_ticks.offset:
            y = box.bottom + margins.tick_baseline(spacing) + spacing.ems(margins.OFFSET_LINE)
            yield Words(panel.across_ticks.offset, box.right, y, spacing.tick_font, box.width, "right")
        y = panel.area.bottom - spacing.ems(margins.PAD + margins.DESCENT)
        yield Words(text.across_label, box.left + box.width / 2, y, points, panel.area.width)
    if panel.show_up_labels:
        x = panel.area.left + spacing.ems(margins.PAD + margins.ASCENT)
        y = box.top + box.height / 2
        yield Words(text.up_label, x, y, points, panel.area.height, turned=True)
        if panel.up_ticks.offset:
            left, top = box.left - spacing.line, box.top - spacing.line - spacing.ems(margins.OFFSET_GAP)
            yield Words(panel.up_ticks.offset, left, top, spacing.tick_font, box.width, "left")


def _head(panel: PanelBox, spacing: Spacing) -> Iterator[Words]:
    """Yield panel letter and title, on one line at the top; panels of a row have theirs at one height."""
    box = panel.raster
    y = panel.area.top + spacing.ems(margins.PAD + margins.ASCENT)
    left = panel.area.left + spacing.ems(margins.PAD)
    if panel.letter:
        room = box.left - left + spacing.ems(2.5)
        yield Words(plain(panel.letter), left, y, 1.2 * spacing.font_size, room, "left", bold=True)
    if panel.title:
        room = box.width - (spacing.ems(4.0) if panel.letter else 0)
        yield Words(plain(panel.title), box.left + box.width / 2, y, 1.1 * spacing.font_size, room)


def _inset(inset: InsetBox, name: str, rasters: Mapping[str, Raster], spacing: Spacing) -> Iterator[Piece]:
    """Yield the window's outline on the plate, then the magnified raster in a frame with a white halo."""
    thin = max(1, spacing.line // 2)
    yield from frame(inset.window.grown(thin), thin, WHITE)
    yield from frame(inset.window, thin)
    yield Block(inset.raster.grown(3 * spacing.line), WHITE)
    yield from frame(inset.raster, spacing.line)
    yield _picture(f"{name}/inset", inset.raster, rasters[f"{name}/inset"])


def _key(box: Box, table: NDArray[np.uint8], text: PanelText, spacing: Spacing) -> Iterator[Piece]:
    """Yield the colour key: all shades without background and missing colour, lowest at the bottom."""
    shades = len(table) - 2
    ramp = 1 + np.arange(box.height - 1, -1, -1) * shades // box.height
    yield Picture(box, np.repeat(ramp.astype(np.uint8)[:, None], box.width, axis=1), table)
    yield from frame(box, spacing.line)
    outer = box.right + spacing.line
    x = outer + spacing.minor + spacing.ems(margins.LABEL_GAP)
    room = spacing.ems(margins.KEY_LABELS)
    free = box.bottom + 1.2 * spacing.em
    for at, label in text.key_labels:
        y = box.bottom - at * box.height
        if free - y < 1.1 * spacing.em:
            continue
        free = y
        yield Block(
            Box(outer, _beside(1 - at, box.top, box.height, spacing.line), spacing.minor, spacing.line)
        )
        yield Words(label, x, y + spacing.digit / 2, spacing.tick_font, room, "left")
    if text.key_caption:
        widest = max((spacing.text(label) for _, label in text.key_labels), default=0.0)
        x += min(room, widest) + spacing.ems(margins.KEY_CAPTION - 0.4)
        y = box.top + box.height / 2
        yield Words(plain(text.key_caption), x, y, spacing.tick_font, box.height, turned=True)
