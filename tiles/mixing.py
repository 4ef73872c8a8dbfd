"""Colours mixed after shading: the mean of small pixels, and several densities printed over each other.

Both reckon in linear light (IEC 61966-2-1), in whole numbers of 16 bits, so that the result depends neither
on the order of what is mixed nor on a mathematics library, and a pixel of one colour keeps it to the byte.
"""

from __future__ import annotations

from collections.abc import Sequence
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from tiles.curve import LEVELS
from tiles.palette import colour, lightness

__all__ = ["INKS", "ink_table", "inked", "mixed", "swatch"]

Rgb = tuple[int, int, int]

INKS: tuple[Rgb, ...] = tuple(
    colour(code) for code in ("#0054c1", "#d86600", "#555555", "#008069", "#bc0049", "#8c54b1", "#8e7900")
)
"""Hues for densities in one picture, in this order; colour-blind eyes tell the first three apart."""

_FULL = 65535
_LIGHTEST, _DARKEST = 88.0, 28.0
_SWATCH = 2 * LEVELS // 3
_LINES = 64


def mixed(indices: NDArray[np.uint8], table: NDArray[np.uint8], factor: int) -> NDArray[np.uint8]:
    """Return the mean colour of blocks of small pixels, in linear light.

    Parameters
    ----------
    indices : ndarray of uint8, shape (lines * factor, pixels * factor)
        Palette indices; the colours are mixed, never the indices.
    table : ndarray of uint8, shape (colours, 3)
        The colour of every index.
    factor : int
        Small pixels along each side of a block.

    Returns
    -------
    ndarray of uint8, shape (lines, pixels, 3)

    Examples
    --------
    >>> import numpy as np
    >>> mixed(np.array([[0, 1], [1, 0]], np.uint8), np.array([[0, 0, 0], [255, 255, 255]], np.uint8), 2)
    array([[[188, 188, 188]]], dtype=uint8)
    """
    if factor < 1 or indices.shape[0] % factor or indices.shape[1] % factor:
        raise ValueError(f"an array of shape {indices.shape} has no blocks of {factor} by {factor}")
    light = _light()[table].astype(np.uint32)
    lines, pixels = indices.shape[0] // factor, indices.shape[1] // factor
    out = np.empty((lines, pixels, 3), np.uint8)
    for first in range(0, lines, _LINES):
        last = min(lines, first + _LINES)
        part = indices[first * factor : last * factor].reshape(last - first, factor, pixels, factor)
        total = np.zeros((last - first, pixels, 3), np.uint32)
        for down in range(factor):
            for along in range(factor):
                total += light[part[:, down, :, along]]
        out[first:last] = _written()[(total + factor * factor // 2) // (factor * factor)]
    return out


def inked(
    shades: Sequence[NDArray[np.uint8]],
    colours: Sequence[Rgb],
    *,
    background: Rgb = (255, 255, 255),
    missing: Rgb = (240, 240, 240),
) -> NDArray[np.uint8]:
    """Print several densities over each other, each in its own ink.

    Parameters
    ----------
    shades : sequence of ndarray of uint8, shape (lines, pixels)
        Palette indices of each density: 0 is empty, 1 to ``LEVELS`` are shades, above are no samples.
    colours : sequence of tuple of int
        The ink of each.
    background, missing : tuple of int
        Colours of a cell that is empty in all densities, and of one that none has sampled.

    Returns
    -------
    ndarray of uint8, shape (lines, pixels, 3)
        Where one density alone is not empty, its colour in :func:`ink_table`; where several are, the
        product of their colours as parts of white, as transparent inks give it, in whatever order.
    """
    if len(shades) != len(colours) or not shades:
        raise ValueError(f"{len(shades)} densities need as many inks, not {len(colours)}")
    parts = [np.minimum(each, LEVELS + 1) for each in shades]
    if len(parts) == 2:
        all_pairs = np.indices((LEVELS + 2, LEVELS + 2), np.uint8)
        return _printed(list(all_pairs), colours, background, missing)[parts[0], parts[1]]
    out = np.empty((*parts[0].shape, 3), np.uint8)
    for first in range(0, len(out), _LINES):
        block = slice(first, first + _LINES)
        out[block] = _printed([part[block] for part in parts], colours, background, missing)
    return out


def _printed(
    parts: Sequence[NDArray[np.uint8]], colours: Sequence[Rgb], background: Rgb, missing: Rgb
) -> NDArray[np.uint8]:
    """Return what :func:`inked` does for arrays of few cells."""
    tables = [_light()[ink_table(each)].astype(np.uint64) for each in colours]
    for table in tables:
        table[0] = table[LEVELS + 1] = _FULL
    each_light = [table[part] for part, table in zip(parts, tables, strict=True)]
    light, *others = np.sort(each_light, axis=0)  # the same rounding in whatever order they come
    for other in others:
        light = (light * other + _FULL // 2) // _FULL
    colour_of: NDArray[np.uint8] = _written()[light]
    colour_of[np.all([part % (LEVELS + 1) == 0 for part in parts], axis=0)] = background
    colour_of[np.all([part == LEVELS + 1 for part in parts], axis=0)] = missing
    return colour_of


def swatch(*inks: Rgb) -> Rgb:
    """Return the colour that stands in a legend for an ink, or for several where they meet."""
    shade = np.array([[_SWATCH]], np.uint8)
    red, green, blue = inked([shade] * len(inks), inks)[0, 0]
    return int(red), int(green), int(blue)


@lru_cache(maxsize=32)
def ink_table(ink: Rgb) -> NDArray[np.uint8]:
    """Return the shades of one ink, pale to dark at equal steps of lightness.

    Parameters
    ----------
    ink : tuple of int
        Red, green and blue, 0 to 255: the hue, whatever its lightness.

    Returns
    -------
    ndarray of uint8, shape (LEVELS + 2, 3)
        As `tiles.shading.colour_table` returns it, for the same indices.
    """
    own = _light()[np.array(ink, np.uint8)].astype(float) / _FULL
    share = np.linspace(0, 1, 4096)[:, None]
    path = np.concatenate([1 + (own - 1) * share, own * (1 - share)])
    colours = _written()[np.rint(path * _FULL).astype(np.intp)]
    heights = np.array([lightness((int(r), int(g), int(b))) for r, g, b in colours])
    heights = np.minimum.accumulate(heights)
    wanted = _LIGHTEST + (_DARKEST - _LIGHTEST) * np.arange(LEVELS) / (LEVELS - 1)
    shades = colours[np.searchsorted(-heights, -wanted)]
    table: NDArray[np.uint8] = np.concatenate([[(255, 255, 255)], shades, [(240, 240, 240)]]).astype(np.uint8)
    table.flags.writeable = False
    return table


@lru_cache(maxsize=1)
def _light() -> NDArray[np.uint16]:
    """Return the linear light of every byte."""
    part = np.arange(256) / 255
    light = np.where(part <= 0.04045, part / 12.92, ((part + 0.055) / 1.055) ** 2.4)
    whole: NDArray[np.uint16] = np.rint(light * _FULL).astype(np.uint16)
    return whole


@lru_cache(maxsize=1)
def _written() -> NDArray[np.uint8]:
    """Return the byte whose light is nearest, for every linear light."""
    light = _light().astype(np.int64)
    return np.searchsorted((light[:-1] + light[1:]) / 2, np.arange(_FULL + 1)).astype(np.uint8)
