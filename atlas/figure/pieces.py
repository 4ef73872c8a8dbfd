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
    """The shaded counts of one panel or inset.

    Attributes
    ----------
    indices : ndarray of uint8, shape (rows, columns)
        Palette indices; row 0 is the top line.
    table : ndarray of uint8, shape (colours, 3)
        The colour of every index.
    view : View
        What the raster shows.
    unsettled : ndarray of bool, shape (columns,), optional
        Columns that get a mark at the frame.
    """

    indices: NDArray[np.uint8]
    table: NDArray[np.uint8]
    view: View
    unsettled: NDArray[np.bool_] | None = None

    @property
    def bilevel(self) -> bool:
        """Whether it is line art, see :func:`is_bilevel`."""
        return is_bilevel(self.indices, self.table)


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
    """

    across_label: str
    up_label: str
    key_labels: Sequence[tuple[float, str]] = ()
    key_caption: str = ""


@dataclass(frozen=True)
class Picture:
    """A raster, one index a pixel of its box."""

    box: Box
    indices: NDArray[np.uint8]
    table: NDArray[np.uint8]

    @property
    def bilevel(self) -> bool:
        """Whether it is line art, see :func:`is_bilevel`."""
        return is_bilevel(self.indices, self.table)


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


def is_bilevel(indices: NDArray[np.uint8], table: NDArray[np.uint8]) -> bool:
    """Return whether a table has black and no used colour is another than black and white."""
    black, white = (table == BLACK).all(axis=1), (table == WHITE).all(axis=1)
    either = black | white
    return bool(black.any()) and all(bool(either[line].all()) for line in indices)


def frame(box: Box, line: int, colour: Colour = BLACK) -> Iterator[Block]:
    """Yield the four sides of a frame around a box, none of it inside."""
    outer = box.grown(line)
    yield Block(Box(outer.left, outer.top, outer.width, line), colour)
    yield Block(Box(outer.left, box.bottom, outer.width, line), colour)
    yield Block(Box(outer.left, box.top, line, box.height), colour)
    yield Block(Box(box.right, box.top, line, box.height), colour)
