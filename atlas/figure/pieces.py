"""What a page is painted from: rasters, rectangles of whole pixels and words."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from atlas.figure.boxes import Box
from tiles.window import View

Colour = tuple[int, int, int]
BLACK: Colour = (0, 0, 0)
WHITE: Colour = (255, 255, 255)


@dataclass(frozen=True)
class Raster:
    """The shaded counts, classes or values of one panel or inset: palette indices, or mixed colours.

    Attributes
    ----------
    indices : ndarray of uint8, shape (rows, columns), or None
        Palette indices; row 0 is the top line. None where there are ``pixels``.
    table : ndarray of uint8, shape (colours, 3), or None
        The colour of every index. Beside ``pixels`` it serves the colour key alone and may be None.
    view : View
        What the raster shows.
    unsettled : ndarray of bool, shape (columns,), optional
        Columns that get a mark at the frame.
    pixels : ndarray of uint8, shape (rows, columns, 3), optional
        Red, green and blue in place of indices, for colours mixed after shading.
    """

    indices: NDArray[np.uint8] | None
    table: NDArray[np.uint8] | None
    view: View
    unsettled: NDArray[np.bool_] | None = None
    pixels: NDArray[np.uint8] | None = None

    def __post_init__(self) -> None:
        if (self.indices is None) == (self.pixels is None) or (self.pixels is None and self.table is None):
            raise ValueError("a raster has either indices and their table or pixels")

    def picture(self, box: Box) -> Picture:
        """Return the raster in its box on the page."""
        if self.pixels is not None:
            return Picture(box, self.pixels, None)
        assert self.indices is not None
        return Picture(box, self.indices, self.table)


@dataclass(frozen=True)
class LegendEntry:
    """One line of a legend.

    Attributes
    ----------
    label : str
        Plain text.
    colour : tuple of int
        Red, green and blue of its swatch, 0 to 255.
    kept : bool
        Whether it stands there even where others are left out for want of lines.
    """

    label: str
    colour: Colour
    kept: bool = False


@dataclass(frozen=True)
class PanelText:
    """What is written around one panel.

    Attributes
    ----------
    across_label, up_label : str
        Axis labels, mathematics between dollar signs; see :func:`atlas.figure.lettering.axis_text`.
    key_labels : sequence of (float, str)
        Positions along the colour key, 0 to 1, and densities in ascending order.
    key_caption : str
        What the key shows, plain text.
    legend : sequence of LegendEntry
        Colours and what they mean, from the top; drawn where the layout has room for a legend.
    """

    across_label: str
    up_label: str
    key_labels: Sequence[tuple[float, str]] = ()
    key_caption: str = ""
    legend: Sequence[LegendEntry] = ()


@dataclass(frozen=True)
class Picture:
    """A raster in its box: palette indices with their table, or colours where there is no table.

    Attributes
    ----------
    box : Box
        Where it stands, one element of the raster a pixel.
    pixels : ndarray of uint8, shape (height, width) or (height, width, 3)
        Palette indices, or red, green and blue.
    table : ndarray of uint8, shape (colours, 3), or None
        The colour of every index.
    """

    box: Box
    pixels: NDArray[np.uint8]
    table: NDArray[np.uint8] | None

    @property
    def grey(self) -> bool:
        """Whether no colour that can occur is other than a grey."""
        found = self.pixels if self.table is None else self.table
        return all(bool((part == part[..., :1]).all()) for part in found)

    @property
    def bilevel(self) -> bool:
        """Whether it is line art: its table has black, and no used colour is other than black and white."""
        if self.table is None:
            return False
        black, white = (self.table == BLACK).all(axis=1), (self.table == WHITE).all(axis=1)
        either = black | white
        return bool(black.any()) and all(bool(either[line].all()) for line in self.pixels)


@dataclass(frozen=True)
class Block:
    """A filled rectangle of whole pixels."""

    box: Box
    colour: Colour = BLACK


@dataclass(frozen=True)
class Words:
    """A line of black text.

    Attributes
    ----------
    text : str
        Mathematics between dollar signs.
    x, y : float
        Where its baseline is anchored, in pixels from the page's left and top.
    points : float
        Font size; smaller where the line would exceed ``room``.
    room : float
        Longest line in pixels.
    align : {"left", "center", "right"}
        Which part of the line stands at the anchor.
    turned : bool
        Whether the line runs upwards.
    bold : bool
        Whether it is set bold.
    """

    text: str
    x: float
    y: float
    points: float
    room: float
    align: Literal["left", "center", "right"] = "center"
    turned: bool = False
    bold: bool = False


Piece = Picture | Block | Words


def frame(box: Box, line: int, colour: Colour = BLACK) -> Iterator[Block]:
    """Yield the four sides of a frame around a box, none of it inside."""
    outer = box.grown(line)
    yield Block(Box(outer.left, outer.top, outer.width, line), colour)
    yield Block(Box(outer.left, box.bottom, outer.width, line), colour)
    yield Block(Box(outer.left, box.top, line, box.height), colour)
    yield Block(Box(box.right, box.top, line, box.height), colour)
