"""Colours of classes: a pure function of the class code, so that a class looks the same in every picture.

Codes are whole numbers below 65536. What they mean is the caller's; the colours suit this use:

=====================  ====================================================  ==========================
codes                  used for                                              colour
=====================  ====================================================  ==========================
0                      no class at all                                       white
1 … 59999              cycles by period (1: fixed point), attractors by      palette ``kinds``, see below
                       number
60000                  undecided                                             light grey
60001                  quasi-periodic                                        grey-blue
60002                  chaotic                                               near black
60003                  leaves every bound                                    white, as paper
60004                  dies out                                              sand
60005                  none of what is counted                               white, as paper
=====================  ====================================================  ==========================

Classes 1 to 13 have the colours of the palette ``kinds``. Every further thirteen repeat them lighter,
darker or greyer, so that the classes 1 to 65 all differ; then the sequence begins anew at 14. Thirteen is a
prime: a class and its double, which border in cascades of period doublings, have one base colour only where
13 divides the class. There are fewer colours in all than a palette image holds, so that pictures of classes
are such images.
"""

from __future__ import annotations

from collections.abc import Iterable
from functools import lru_cache

import numpy as np
from numpy.typing import ArrayLike, NDArray

from tiles.errors import Refusal
from tiles.palette import PALETTES, colour

__all__ = ["COLOURS", "FIRST_OWN", "class_colours", "class_shades", "class_table"]

Rgb = tuple[int, int, int]

_BASE = PALETTES["kinds"].stops
_TONES = ((255, 0.45), (0, 0.3), (128, 0.55), (255, 0.7))  # towards white, black or grey, and how far
_OWN = {
    60000: "#c4c4c4",
    60001: "#7486a0",
    60002: "#181818",
    60003: "#ffffff",
    60004: "#e6d08e",
    60005: "#ffffff",
}
FIRST_OWN = min(_OWN)
"""The least class with a colour of its own; those below are numbered."""
_NUMBERED = len(_BASE) * (1 + len(_TONES))
_CODES = 1 << 16
COLOURS = 1 + _NUMBERED + len(_OWN)


class ClassRefused(Refusal):
    """A number that is no class code."""


def class_colours(classes: Iterable[int]) -> list[Rgb]:
    """Return the colour of each class.

    Parameters
    ----------
    classes : iterable of int
        Class codes, 0 to 65535.

    Returns
    -------
    list of tuple of int
        Red, green and blue, 0 to 255.

    Raises
    ------
    ClassRefused
        When a code is out of range.

    Examples
    --------
    >>> class_colours([1, 60002])
    [(126, 202, 255), (24, 24, 24)]
    """
    table = class_table()
    return [(int(r), int(g), int(b)) for r, g, b in (table[_slot(int(code))] for code in classes)]


def class_shades(classes: ArrayLike) -> NDArray[np.uint8]:
    """Return palette indices of classes: ``class_table()[class_shades(classes)]`` are their colours.

    Parameters
    ----------
    classes : array_like of uint16, any shape

    Returns
    -------
    ndarray of uint8, same shape
        Below ``COLOURS``.
    """
    shades: NDArray[np.uint8] = np.take(_slots(), np.asarray(classes))
    return shades


def class_table() -> NDArray[np.uint8]:
    """Return the colour of every palette index that :func:`class_shades` gives, shape (COLOURS, 3)."""
    base = np.array([colour(stop) for stop in _BASE], float)
    rounds = [base, *(base + (end - base) * share for end, share in _TONES)]
    own = np.array([colour(code) for code in _OWN.values()], float)
    table: NDArray[np.uint8] = np.rint(np.concatenate([np.full((1, 3), 255.0), *rounds, own])).astype(
        np.uint8
    )
    return table


def _slot(code: int) -> int:
    if not 0 <= code < _CODES:
        raise ClassRefused(f"{code} is no class code; allowed: 0 to {_CODES - 1}")
    return int(_slots()[code])


@lru_cache(maxsize=1)
def _slots() -> NDArray[np.uint8]:
    """Return the palette index of every class code."""
    first = len(_BASE)
    codes = np.arange(_CODES)
    repeated = 1 + first + (codes - first - 1) % (_NUMBERED - first)
    slots = np.where(codes <= first, codes, repeated).astype(np.uint8)
    slots[FIRST_OWN:] = 0
    for place, code in enumerate(_OWN):
        slots[code] = 1 + _NUMBERED + place
    slots.flags.writeable = False
    return slots
