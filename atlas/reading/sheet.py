"""The size of a printed sheet, and the magnified window set into one of its corners."""

from __future__ import annotations

import re
from dataclasses import dataclass
from fractions import Fraction
from typing import Literal

from tiles.errors import Refusal
from tiles.number import fraction_text
from tiles.window import Axis, View

Unit = Literal["mm", "px"]
Corner = Literal["upper left", "upper right", "lower left", "lower right"]
CORNERS: tuple[Corner, ...] = ("upper left", "upper right", "lower left", "lower right")
_SIDE = r"([0-9]{1,9}(?:\.[0-9]{1,6})?)"
SIZE_PATTERN = rf"\s*{_SIDE}\s*[x×]\s*{_SIDE}\s*(mm|px)?\s*"
MILLIMETRES_PER_INCH = Fraction("25.4")


@dataclass(frozen=True)
class Size:
    """Width and height of a sheet, exact, in millimetres or in pixels.

    Attributes
    ----------
    width, height : Fraction
        Both above 0; whole numbers when the unit is pixels.
    unit : {"mm", "px"}
        Millimetres, or pixels whatever the resolution.

    Examples
    --------
    >>> Size.parse("180x110").pixels(600)
    (4252, 2598)
    >>> Size.parse("1200x800px").pixels(600)
    (1200, 800)
    """

    width: Fraction
    height: Fraction
    unit: Unit = "mm"

    @classmethod
    def parse(cls, text: str) -> Size:
        """Read ``180x110`` or ``180x110mm`` (millimetres), or ``1200x800px``.

        Raises
        ------
        Refusal
            When the text is no size, a side is 0, or a number of pixels is not whole.
        """
        found = re.fullmatch(SIZE_PATTERN, text)
        if not found:
            raise Refusal("a size is written 180x110 (millimetres) or 1200x800px")
        width, height = (Fraction(side) for side in found.group(1, 2))
        unit: Unit = "px" if found[3] == "px" else "mm"
        if not (width and height):
            raise Refusal("both sides of a size must be above 0")
        if unit == "px" and not (width.denominator == height.denominator == 1):
            raise Refusal("pixels are counted in whole numbers")
        return cls(width, height, unit)

    def pixels(self, dpi: int) -> tuple[int, int]:
        """Return width and height in pixels: millimetres / 25.4 * dpi, rounded to the nearest."""
        if self.unit == "px":
            return int(self.width), int(self.height)
        return _pixels(self.width, dpi), _pixels(self.height, dpi)

    def millimetres(self, dpi: int) -> tuple[float, float]:
        """Return width and height of the printed sheet in millimetres."""
        if self.unit == "mm":
            return float(self.width), float(self.height)
        scale = MILLIMETRES_PER_INCH / dpi
        return float(self.width * scale), float(self.height * scale)

    def __str__(self) -> str:
        """Return the text that :meth:`parse` reads back as the same size."""
        ending = "px" if self.unit == "px" else ""
        return f"{fraction_text(self.width)}x{fraction_text(self.height)}{ending}"


@dataclass(frozen=True)
class Inset:
    """A part of a plate's window, magnified and drawn over one corner of the plate.

    Attributes
    ----------
    across, up : Axis
        The part, inside the window of the plate, with the names and scales of its axes.
    corner : {"upper left", "upper right", "lower left", "lower right"}
        Where it is drawn.
    width : float
        Its width as a share of the width of the plate's frame.
    """

    across: Axis
    up: Axis
    corner: Corner = "upper right"
    width: float = 0.4

    @property
    def view(self) -> View:
        """The part as a view of its own."""
        return View(self.across, self.up)


def _pixels(millimetres: Fraction, dpi: int) -> int:
    exact_pixels = millimetres * dpi / MILLIMETRES_PER_INCH
    return int(exact_pixels + Fraction(1, 2))
