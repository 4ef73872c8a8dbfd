"""Legends: swatches with labels to the right of a frame, from its top."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Sequence

from atlas.figure import margins
from atlas.figure.boxes import Box, Spacing
from atlas.figure.lettering import plain
from atlas.figure.pieces import Block, LegendEntry, Piece, Words, frame
from tiles.classes import FIRST_OWN, class_colours


def legend_pieces(box: Box, entries: Sequence[LegendEntry], spacing: Spacing) -> Iterator[Piece]:
    """Yield what a legend is painted from.

    Where more entries are given than lines fit beside the frame, the last of those that need not be kept are
    left out, and a line in their place says how many.

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
    left = box.left + width + spacing.ems(margins.SWATCH_GAP)
    for number, entry in enumerate(fitted(entries, 1 + int((box.height - height) / pitch))):
        line = Box(box.left, box.top + round(number * pitch), width, height)
        if isinstance(entry, int):
            yield _label(f"and {entry} more", box.left, line, box, spacing)
            continue
        swatch = line.grown(-spacing.line)
        yield Block(swatch, entry.colour)
        yield from frame(swatch, spacing.line)
        yield _label(entry.label, left, line, box, spacing)


def fitted(entries: Sequence[LegendEntry], lines: int) -> list[LegendEntry | int]:
    """Return the entries that stand on some lines and, where others are left out, how many those are.

    Examples
    --------
    >>> entries = [LegendEntry(word, (0, 0, 0), word == "d") for word in "abcd"]
    >>> [line if isinstance(line, int) else line.label for line in fitted(entries, 3)]
    ['a', 2, 'd']
    """
    if len(entries) <= lines:
        return list(entries)
    kept = [number for number, entry in enumerate(entries) if entry.kept][: lines - 1]
    free = [number for number in range(len(entries)) if number not in kept]
    shown = {*kept, *free[: lines - 1 - len(kept)]}
    out = [number for number in range(len(entries)) if number not in shown]
    found: list[LegendEntry | int] = [entries[number] for number in sorted(shown)]
    found.insert(sum(number < out[0] for number in shown), len(out))
    return found


def class_legend(classes: Iterable[int], name: Callable[[int], str]) -> tuple[LegendEntry, ...]:
    """Return the legend of a picture of classes, see `tiles.classes`.

    Parameters
    ----------
    classes : iterable of int
        Those that are present, in any order.
    name : callable
        What a class is called.

    Returns
    -------
    tuple of LegendEntry
        Numbered classes in ascending order, then those with a colour of their own, which are kept.
    """
    codes = sorted({int(code) for code in classes})
    colours = class_colours(codes)
    return tuple(
        LegendEntry(name(code), rgb, code >= FIRST_OWN) for code, rgb in zip(codes, colours, strict=True)
    )


def _label(text: str, left: float, line: Box, box: Box, spacing: Spacing) -> Words:
    y = line.top + (line.height + spacing.digit) / 2
    return Words(plain(text), left, y, spacing.tick_font, box.right - left, "left")
