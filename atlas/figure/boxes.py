"""The boxes of a laid-out page, in whole pixels, and the distances between them."""

from __future__ import annotations

from dataclasses import dataclass

from atlas.figure.lettering import text_width
from atlas.figure.ticks import Ticks
from tiles.window import View

TICK_FONT = 0.9  # size of tick labels and legends in font sizes


@dataclass(frozen=True)
class Box:
    """A rectangle of whole pixels; lines are counted from the top of the page."""

    left: int
    top: int
    width: int
    height: int

    @property
    def right(self) -> int:
        """First column right of the box."""
        return self.left + self.width

    @property
    def bottom(self) -> int:
        """First line below the box."""
        return self.top + self.height

    def grown(self, by: int) -> Box:
        """Return the box with a rim added on all four sides."""
        return Box(self.left - by, self.top - by, self.width + 2 * by, self.height + 2 * by)


@dataclass(frozen=True)
class Spacing:
    """Distances on the page in pixels, all from the font size (a sober style; common practice, no source)."""

    font_size: float
    dpi: float

    @property
    def em(self) -> float:
        """The font size."""
        return self.font_size / 72 * self.dpi

    @property
    def line(self) -> int:
        """Thickness of frames and ticks: 0.5 pt at 8 pt type."""
        return max(1, round(self.em / 16))

    @property
    def tick(self) -> int:
        """Length of labelled ticks."""
        return max(2, round(0.42 * self.em))

    @property
    def minor(self) -> int:
        """Length of unlabelled ticks."""
        return max(1, round(0.24 * self.em))

    @property
    def tick_font(self) -> float:
        """Font size of tick labels in points."""
        return TICK_FONT * self.font_size

    @property
    def digit(self) -> float:
        """Height of the digits of tick labels."""
        return 0.729 * TICK_FONT * self.em

    def ems(self, count: float) -> float:
        """Return a multiple of the font size."""
        return count * self.em

    def text(self, label: str) -> float:
        """Return the width of a tick label."""
        return text_width(label, self.tick_font) / 25.4 * self.dpi

    def millimetres(self, length: float) -> float:
        """Return pixels as millimetres."""
        return length / self.dpi * 25.4


@dataclass(frozen=True)
class InsetBox:
    """The magnified raster, and on the raster of the plate the window that it shows; page coordinates."""

    raster: Box
    window: Box
    view: View


@dataclass(frozen=True)
class PanelBox:
    """One panel: its raster, whose frame is drawn outside it, and what stands around it.

    Attributes
    ----------
    name : str
        Name of the plate.
    view : View
        Its axes.
    left, top, width, height : int
        The raster: as many columns and rows as must be counted.
    area : Box
        The panel with its margins; areas do not overlap.
    across_ticks, up_ticks : Ticks
        What stands along the axes.
    show_across_labels, show_up_labels : bool
        False for inner panels of shared axes.
    letter, title : str
        Empty where there is none.
    inset : InsetBox, optional
        Where a window is magnified.
    key : Box, optional
        The bar of the colour key, without its frame.
    legend : Box, optional
        Where the swatches and labels of a legend stand, beside the raster and as high.
    """

    name: str
    view: View
    left: int
    top: int
    width: int
    height: int
    area: Box
    across_ticks: Ticks
    up_ticks: Ticks
    show_across_labels: bool = True
    show_up_labels: bool = True
    letter: str = ""
    title: str = ""
    inset: InsetBox | None = None
    key: Box | None = None
    legend: Box | None = None

    @property
    def raster(self) -> Box:
        """The raster's box."""
        return Box(self.left, self.top, self.width, self.height)


@dataclass(frozen=True)
class Layout:
    """A page of whole pixels with one panel or several."""

    width: int
    height: int
    dpi: float
    font_size: float
    panels: tuple[PanelBox, ...]
    title: str = ""

    @property
    def spacing(self) -> Spacing:
        """Distances of this page."""
        return Spacing(self.font_size, self.dpi)
