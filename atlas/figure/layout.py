"""Where everything stands on a plate or a figure, in whole pixels; pure geometry, nothing is drawn here."""

from __future__ import annotations

import math
from dataclasses import dataclass

from atlas.figure import margins
from atlas.figure.boxes import Box, InsetBox, Layout, PanelBox, Spacing
from atlas.figure.insets import inset_box
from atlas.figure.margins import Sides
from atlas.figure.panels import FigureRequest, LayoutRefused, Panel, PlateRequest, panels_of_figure
from atlas.figure.ticks import Along, Ticks, ticks
from tiles.window import Axis

__all__ = [
    "Box",
    "FigureRequest",
    "InsetBox",
    "Layout",
    "LayoutRefused",
    "PanelBox",
    "PlateRequest",
    "Spacing",
    "default_font_size",
    "layout",
]

LEAST_FRAME = 3.0  # the least size of a raster, in font sizes
_ROUNDS = 8


def default_font_size(width_mm: float) -> float:
    """Return a font size in points for a page: 7 at 85 mm, 8 at 180 mm, about 24 on a metre-wide poster."""
    if width_mm <= 180:
        return round(max(6.0, 7 + (width_mm - 85) / 95), 1)
    return round(min(48.0, 8 * math.pow(width_mm / 180, 0.65)), 1)


def layout(request: PlateRequest | FigureRequest) -> Layout:
    """Lay a plate or a figure out.

    Frames of panels in one column are equally wide and those of all columns too; margins come from the font
    size and the tick labels, so that no two texts overlap.

    Parameters
    ----------
    request : PlateRequest or FigureRequest
        Size, axes and what stands around them.

    Returns
    -------
    Layout
        ``panels`` in reading order; a plate has one.

    Raises
    ------
    LayoutRefused
        When the size leaves no room for a raster, an inset lies outside its plate, or panels that should
        share an axis have different ones.

    Examples
    --------
    >>> from tiles.window import View
    >>> view = View(across=("r", "2.8", 4), up=("x", 0, 1))
    >>> page = layout(PlateRequest("logistic", view, 1004, 709))
    >>> page.panels[0].across_ticks.labels
    ('2.8', '3.0', '3.2', '3.4', '3.6', '3.8', '4.0')
    """
    if isinstance(request, PlateRequest):
        rows, title = [[Panel(request, request.letter or "", True, True)]], ""
    else:
        rows, title = panels_of_figure(request), request.title
    font = request.font_size or default_font_size(request.width / request.dpi * 25.4)
    spacing = Spacing(font, request.dpi)
    page = _Page(request, rows, spacing, math.ceil(spacing.ems(2.0)) if title else 0)
    return Layout(request.width, request.height, request.dpi, font, page.solved(), title)


@dataclass(frozen=True)
class _Span:
    """One column or row of panels: where its area starts, how long it is, where its rasters lie in it."""

    start: int
    length: int
    raster: int
    raster_length: int


_Grid = list[list[tuple[_Span, _Span]]]
_TickGrid = list[list[tuple[Ticks, Ticks]]]


@dataclass(frozen=True)
class _Page:
    """Finds margins and rasters that agree: ticks depend on the rasters, margins on the ticks' labels."""

    request: PlateRequest | FigureRequest
    rows: list[list[Panel]]
    spacing: Spacing
    head: int

    def solved(self) -> tuple[PanelBox, ...]:
        """Return the boxes; margins only grow from round to round, so the search ends."""
        one = Ticks(positions=(0.5,), labels=("0",))
        sides = [[margins.sides(panel, one, one, 0, self.spacing) for panel in row] for row in self.rows]
        for _ in range(_ROUNDS):
            grid = self._grid(sides)
            marks = self._ticks(grid)
            wanted = [
                [
                    sides[i][j].at_least(
                        margins.sides(panel, *marks[i][j], grid[i][j][0].raster_length, self.spacing)
                    )
                    for j, panel in enumerate(row)
                ]
                for i, row in enumerate(self.rows)
            ]
            if wanted == sides:
                break
            sides = wanted
        return tuple(
            _panel_box(panel, *grid[i][j], *marks[i][j], self.spacing)
            for i, row in enumerate(self.rows)
            for j, panel in enumerate(row)
        )

    def _grid(self, sides: list[list[Sides]]) -> _Grid:
        """Return the (column, row) span of every panel under given margins."""
        lines = self._spans(
            [(max(s.top for s in row), max(s.bottom for s in row)) for row in sides], self.head, "height"
        )
        if len({len(row) for row in sides}) == 1:
            stacks = list(zip(*sides, strict=True))
            shared = self._columns([list(stack) for stack in stacks])
            return [[(column, line) for column in shared] for line in lines]
        return [
            [(column, line) for column in self._columns([[s] for s in row])]
            for row, line in zip(sides, lines, strict=True)
        ]

    def _columns(self, stacks: list[list[Sides]]) -> list[_Span]:
        rims = [(max(s.left for s in stack), max(s.right for s in stack)) for stack in stacks]
        return self._spans(rims, 0, "width")

    def _spans(self, rims: list[tuple[int, int]], start: int, side: str) -> list[_Span]:
        """Share one side of the page out: equal rasters, what is left over goes to the last margin."""
        whole: int = getattr(self.request, side)
        used = start + sum(before + after for before, after in rims)
        each = (whole - used) // len(rims)
        least = math.ceil(self.spacing.ems(LEAST_FRAME))
        if each < least:
            self._refuse(side, used + least * len(rims))
        spans = []
        for before, after in rims:
            length = before + each + after
            spans.append(_Span(start, length, start + before, each))
            start += length
        return spans

    def _refuse(self, side: str, needed: int) -> None:
        page, dpi = self.request, self.request.dpi
        kind = "plate" if isinstance(page, PlateRequest) else "figure"
        across, up = (_millimetres(length, dpi) for length in (page.width, page.height))
        raise LayoutRefused(
            f"{kind} '{page.name}': a size of {across}x{up} mm ({page.width}x{page.height}px at {dpi:g} dpi) "
            f"leaves no room beside ticks and labels; make its {side} at least "
            f"{_millimetres(needed, dpi)} mm ({needed} px) or the font size smaller than "
            f"{self.spacing.font_size:g} pt"
        )

    def _ticks(self, grid: _Grid) -> _TickGrid:
        return [
            [
                (
                    self._ruled(panel.plate.view.across, column.raster_length, "across"),
                    self._ruled(panel.plate.view.up, line.raster_length, "up"),
                )
                for panel, (column, line) in zip(panels, spans, strict=True)
            ]
            for panels, spans in zip(self.rows, grid, strict=True)
        ]

    def _ruled(self, axis: Axis, length: int, along: Along) -> Ticks:
        return ticks(axis, self.spacing.millimetres(length), self.spacing.tick_font, along)


def _millimetres(length: int, dpi: float) -> int:
    return math.ceil(length / dpi * 25.4)


def _panel_box(
    panel: Panel, column: _Span, line: _Span, across: Ticks, up: Ticks, spacing: Spacing
) -> PanelBox:
    raster = Box(column.raster, line.raster, column.raster_length, line.raster_length)
    key, legend = None, None
    outer = raster.right + 2 * spacing.line
    if panel.plate.legend_width:
        left = outer + round(spacing.ems(margins.LEGEND_GAP))
        width = spacing.ems(margins.SWATCH_WIDTH + margins.SWATCH_GAP + panel.plate.legend_width)
        legend = Box(left, raster.top, math.floor(width), raster.height)
    elif panel.plate.has_key:
        left = outer + round(spacing.ems(margins.KEY_GAP))
        key = Box(left, raster.top, round(spacing.ems(margins.KEY_WIDTH)), raster.height)
    return PanelBox(
        panel.plate.name,
        panel.plate.view,
        raster.left,
        raster.top,
        raster.width,
        raster.height,
        Box(column.start, line.start, column.length, line.length),
        across,
        up,
        panel.across_labels,
        panel.up_labels,
        panel.letter,
        panel.plate.title,
        inset_box(panel.plate, raster, spacing),
        key,
        legend,
    )
