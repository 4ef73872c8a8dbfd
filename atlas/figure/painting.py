"""Painting a page into pixels: palette indices where 256 colours suffice, so that no colour is rounded.

A page whose pictures are line art is black and white throughout, its words too.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from atlas.figure.boxes import Box
from atlas.figure.pieces import BLACK, WHITE, Block, Picture, Piece, Words

LEAST_GREYS = 16
HALF = 128  # the grey from which type in line art is paper
Stamp = tuple[int, int, NDArray[np.uint8]]


@dataclass(frozen=True)
class Painted:
    """A page of pixels.

    Attributes
    ----------
    pixels : ndarray of uint8, shape (height, width) or (height, width, 3)
        Palette indices, or colours where the page holds more than 256 of them.
    table : ndarray of uint8, shape (colours, 3), or None
        The colour of every index.
    """

    pixels: NDArray[np.uint8]
    table: NDArray[np.uint8] | None

    @property
    def grey(self) -> bool:
        """Whether every colour of the palette is a grey."""
        return self.table is not None and bool((self.table == self.table[:, :1]).all())

    @property
    def bilevel(self) -> bool:
        """Whether the palette is black, then white."""
        return self.table is not None and self.table.tolist() == [[0, 0, 0], [255, 255, 255]]


def paint(width: int, height: int, page: Sequence[Piece], stamp: Callable[[Words], Stamp]) -> Painted:
    """Paint the pieces of a page in their order on white.

    Parameters
    ----------
    width, height : int
        Size of the page in pixels.
    page : sequence of Piece
        What is painted. Pictures with one colour table keep its indices as they are.
    stamp : callable
        Sets words: returns the column and the line of the upper left corner of a small grey picture on the
        page, and that picture (uint8, 255 is white paper).

    Returns
    -------
    Painted
        A crop of a picture's box, looked up in the table, is the picture byte for byte.
    """
    ink = _ink(page)
    canvas = np.empty((height, width, *ink.white.shape), np.uint8)
    canvas[:] = ink.white
    for piece in page:
        if isinstance(piece, Picture):
            ink.copy(piece, _region(canvas, piece.box))
        elif isinstance(piece, Block):
            _region(canvas, piece.box)[:] = ink.of(piece.colour)
        else:
            _print(canvas, stamp(piece), ink)
    return Painted(canvas, ink.table)


@dataclass(frozen=True)
class _Ink:
    """How colours and greys are written into the canvas: as indices into a table, or as they are."""

    table: NDArray[np.uint8] | None
    greys: NDArray[np.uint8]  # by grey level, shape (256,) or (256, 3)

    @property
    def white(self) -> NDArray[np.uint8]:
        return np.asarray(self.greys[255])

    def copy(self, piece: Picture, under: NDArray[np.uint8]) -> None:
        """Write a picture into its part of the canvas."""
        if piece.table is None or (self.table is not None and self.table is not _BILEVEL):
            under[:] = piece.pixels
            return
        colours = piece.table if self.table is None else (piece.table == WHITE).all(axis=1).astype(np.uint8)
        for line, indices in zip(under, piece.pixels, strict=True):
            line[:] = colours[indices]

    def of(self, colour: tuple[int, int, int]) -> NDArray[np.uint8]:
        """Return how a colour is written."""
        if self.table is None:
            return np.array(colour, np.uint8)
        same = (self.table == np.array(colour)).all(axis=1)
        return np.asarray(np.flatnonzero(same)[-1], np.uint8)


_BILEVEL = np.array([BLACK, WHITE], np.uint8)


def _ink(page: Sequence[Piece]) -> _Ink:
    """Put the pictures' table first, then other colours, then greys as far as a palette has room."""
    if _is_line_art(page):
        return _Ink(_BILEVEL, (np.arange(256) >= HALF).astype(np.uint8))
    pictures = [piece for piece in page if isinstance(piece, Picture)]
    tables = {piece.table.tobytes(): piece.table for piece in pictures if piece.table is not None}
    first = next(iter(tables.values()), np.empty((0, 3), np.uint8))
    held = {(int(red), int(green), int(blue)) for red, green, blue in first}
    extra = sorted({piece.colour for piece in page if isinstance(piece, Block)} - held)
    room = 256 - len(first) - len(extra)
    if len(tables) > 1 or room < LEAST_GREYS or any(piece.table is None for piece in pictures):
        return _Ink(None, np.repeat(np.arange(256, dtype=np.uint8)[:, None], 3, axis=1))
    count = min(room, 64)
    levels = np.round(np.linspace(0, 255, count)).astype(np.uint8)
    greys = np.repeat(levels[:, None], 3, axis=1)
    table = np.concatenate([first, np.array(extra, np.uint8).reshape(-1, 3), greys])
    nearest = np.round(np.arange(256) * (count - 1) / 255).astype(np.uint8)
    return _Ink(table, nearest + np.uint8(len(table) - count))


def _is_line_art(page: Sequence[Piece]) -> bool:
    """Return whether every picture and rectangle of a page is black and white."""
    pictures = [piece for piece in page if isinstance(piece, Picture)]
    colours = {piece.colour for piece in page if isinstance(piece, Block)}
    return bool(pictures) and colours <= {BLACK, WHITE} and all(piece.bilevel for piece in pictures)


def _region(canvas: NDArray[np.uint8], box: Box) -> NDArray[np.uint8]:
    return canvas[max(0, box.top) : box.bottom, max(0, box.left) : box.right]


def _print(canvas: NDArray[np.uint8], stamp: Stamp, ink: _Ink) -> None:
    """Print a small grey picture of words; what reaches beyond the page is lost."""
    left, top, grey = stamp
    grey = grey[max(0, -top) :, max(0, -left) :]
    under = canvas[max(0, top) :, max(0, left) :][: grey.shape[0], : grey.shape[1]]
    grey = grey[: under.shape[0], : under.shape[1]]
    printed = grey < 255
    under[printed] = ink.greys[grey[printed]]
