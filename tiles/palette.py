"""Palettes as rows of data: where their colours come from and between which lightnesses they run.

There are four kinds. A *sequential* palette is strictly monotone in lightness. A *diverging* one is light at
the centre and grows equally dark to both sides. A *cyclic* one returns to its first colour. A *categorical*
one is a list of colours that are told apart; it has no order.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from functools import lru_cache
from typing import Literal

from tiles.errors import Refusal, nearest

STOPS = 25  # of a sequential and of a cyclic palette
KINDS = ("sequential", "diverging", "cyclic", "categorical")
_SIDE = 13  # stops on each side of a diverging palette
_SHADES = 216  # of a ramp, see tiles.curve.LEVELS
_HEX = re.compile(r"#(?:[0-9a-fA-F]{3}|[0-9a-fA-F]{6})")
_WORDS = {"white": "#ffffff", "black": "#000000"}


class PaletteRefused(Refusal):
    """A palette or a colour that does not exist."""


@dataclass(frozen=True)
class Palette:
    """A ramp of colours from the lowest to the highest density or value, or a list of colours.

    Attributes
    ----------
    name : str
        What a config calls it.
    source : str or tuple of str
        Name of a list of colours in colorcet, or the stops themselves as ``#rrggbb``.
    first, last : float
        CIE lightness of the lowest and of the highest shade, 0 to 100. Cut out of a colorcet list, a ramp
        for print starts near 90, so that the lightest occupied cell still stands out from white paper. A
        diverging palette runs from ``last`` to ``first`` at its centre and back; cyclic and categorical ones
        are taken as they are.
    background, missing : str
        Colours of an empty cell and of a cell without any sample, ``#rrggbb``.
    safe_for : tuple of str
        Kinds of colour blindness under which the ramp keeps its order of lightness and its contrast.
    note : str
        One line for the list of palettes.
    kind : {"sequential", "diverging", "cyclic", "categorical"}
        What it is fit for.
    """

    name: str
    source: str | tuple[str, ...]
    first: float = 90.0
    last: float = 8.0
    background: str = "#ffffff"
    missing: str = "#f0f0f0"
    safe_for: tuple[str, ...] = ()
    note: str = ""
    kind: Literal["sequential", "diverging", "cyclic", "categorical"] = "sequential"

    @property
    def stops(self) -> tuple[str, ...]:
        """Colours ``#rrggbb``, lowest density first: at equal steps of lightness, or around the cycle."""
        if not isinstance(self.source, str):
            return self.source
        return _CUTS[self.kind](self.source, self.first, self.last)


_RED_GREEN = ("protanopia", "deuteranopia")
_ALL = (*_RED_GREEN, "tritanopia")


def _on_dark(name: str, source: str, note: str, safe_for: tuple[str, ...] = ()) -> Palette:
    return Palette(name, source, 20.0, 94.0, "#050505", "#1a1a1a", safe_for, note)


PALETTES = {
    row.name: row
    for row in (
        Palette("grey", ("#e2e2e2", "#080808"), safe_for=_ALL, note="plain greys, for print in black"),
        Palette("blue", "linear_blue_5_95_c73", safe_for=_ALL, note="cyan to navy"),
        Palette(
            "slate",
            "linear_protanopic_deuteranopic_kbw_5_98_c40",
            safe_for=_RED_GREEN,
            note="sand and blue to black, the same to eyes that do not tell red from green",
        ),
        Palette(
            "umber",
            "linear_protanopic_deuteranopic_kyw_5_95_c49",
            last=7.0,
            safe_for=_RED_GREEN,
            note="straw to brown-black, the same to eyes that do not tell red from green",
        ),
        Palette(
            "teal",
            "linear_tritanopic_kcw_5_95_c22",
            safe_for=_ALL,
            note="pale to black through blue-green, the same to eyes that do not tell blue from green",
        ),
        Palette(
            "brick",
            "linear_tritanopic_krw_5_95_c46",
            safe_for=_ALL,
            note="pale to black through brick red, the same to eyes that do not tell blue from green",
        ),
        Palette("forest", "linear_kbgyw_5_98_c62", note="straw to green, blue and black"),
        Palette("meadow", "linear_bgyw_20_98_c66", last=21.0, note="straw to green to strong blue"),
        Palette("ember", "linear_kryw_5_100_c67", last=11.0, note="yellow to red to black"),
        Palette("violet", "linear_bmw_5_95_c86", note="pink to magenta to navy"),
        Palette("dusk", "linear_bmy_10_95_c71", last=12.0, note="yellow to magenta to navy"),
        _on_dark("night", "linear_blue_5_95_c73", "blue to cyan on a dark ground", _ALL),
        _on_dark("glow", "linear_kryw_5_100_c67", "red to pale yellow on a dark ground"),
        Palette(
            "balance",
            "diverging_bwr_20_95_c54",
            last=22.0,
            safe_for=_ALL,
            note="navy to pale at zero to dark red, for signed values",
            kind="diverging",
        ),
        Palette(
            "wheel",
            "cyclic_wrkbw_10_90_c43",
            safe_for=_ALL,
            note="pale, red, black, blue and round to pale, for angles and rotation numbers",
            kind="cyclic",
        ),
        Palette(
            "kinds",
            (
                *("#7ecaff", "#d8a10a", "#bc0049", "#0054c1", "#aa7200", "#008069", "#5d90ff"),
                *("#8cb893", "#645474", "#854f01", "#8e8c5e", "#7e6ebc", "#c1a5c4"),
            ),
            safe_for=_ALL,
            note="separate colours for fates, periods, attractors and basins",
            kind="categorical",
        ),
    )
}


def palette(name: str) -> Palette:
    """Return a palette by its name.

    Raises
    ------
    PaletteRefused
        When there is none of that name.

    Examples
    --------
    >>> palette("grey").background
    '#ffffff'
    """
    if name not in PALETTES:
        raise PaletteRefused(f"palette '{name}' is unknown{nearest(str(name), PALETTES)}")
    return PALETTES[name]


def colour(text: str) -> tuple[int, int, int]:
    """Read a colour: ``#rrggbb``, ``#rgb``, ``white`` or ``black``.

    Returns
    -------
    tuple of int
        Red, green and blue, 0 to 255 each.

    Raises
    ------
    PaletteRefused
        For any other text.
    """
    code = _WORDS.get(str(text), str(text))
    if not _HEX.fullmatch(code):
        raise PaletteRefused(f"'{text}' is not a colour; write #rrggbb, #rgb, white or black")
    digits = code[1:] if len(code) == 7 else "".join(digit * 2 for digit in code[1:])
    return int(digits[0:2], 16), int(digits[2:4], 16), int(digits[4:6], 16)


def lightness(given: str | tuple[int, int, int]) -> float:
    """Return the lightness L* of a colour, from 0 (black) to 100 (white).

    Parameters
    ----------
    given : str or tuple of int
        A colour as :func:`colour` reads it, or its red, green and blue from 0 to 255, in sRGB.

    Returns
    -------
    float

    References
    ----------
    CIE 15:2004, *Colorimetry*, 8.2.1 (L* with the constants 216/24389 and 24389/27); luminance of an sRGB
    colour by IEC 61966-2-1:1999.
    """
    red, green, blue = (_linear(part / 255) for part in (colour(given) if isinstance(given, str) else given))
    luminance = 0.2126 * red + 0.7152 * green + 0.0722 * blue
    if luminance <= 216 / 24389:
        return luminance * 24389 / 27
    return float(116 * luminance ** (1 / 3) - 16)


def _linear(part: float) -> float:
    return part / 12.92 if part <= 0.04045 else float(((part + 0.055) / 1.055) ** 2.4)


@lru_cache(maxsize=32)
def _cut(source: str, first: float, last: float) -> tuple[str, ...]:
    import colorcet  # here, because it imports matplotlib

    colours: list[str] = list(colorcet.palette[source])
    heights = [lightness(each) for each in colours]
    targets = (first + (last - first) * step / (STOPS - 1) for step in range(STOPS))
    return tuple(_nearest(colours, heights, target) for target in targets)


@lru_cache(maxsize=32)
def _cut_both(source: str, centre: float, ends: float) -> tuple[str, ...]:
    """Return stops of equal lightness on both sides; the two innermost differ, so that signs do."""
    import colorcet

    colours: list[str] = list(colorcet.palette[source])
    half = len(colours) // 2
    sides = colours[:half], colours[half:]
    low, high = (
        [_nearest(side, [lightness(each) for each in side], target) for target in _steps(ends, centre)]
        for side in sides
    )
    return (*low, *reversed(high))


@lru_cache(maxsize=32)
def _around(source: str, first: float, last: float) -> tuple[str, ...]:
    """Return stops at equal steps around a cycle, the last one shade before the first."""
    import colorcet

    colours: list[str] = list(colorcet.palette[source])
    return tuple(
        colours[round(step / (STOPS - 1) * (1 - 1 / _SHADES) * len(colours)) % len(colours)]
        for step in range(STOPS)
    )


def _steps(first: float, last: float) -> list[float]:
    return [first + (last - first) * step / (_SIDE - 1) for step in range(_SIDE)]


def _nearest(colours: list[str], heights: list[float], target: float) -> str:
    return colours[min(range(len(colours)), key=lambda at: abs(heights[at] - target))]


_CUTS = {"sequential": _cut, "diverging": _cut_both, "cyclic": _around}
