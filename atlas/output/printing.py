"""Making plates and figures: every panel counted at its own pixels, shaded, set and written."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any, Protocol

import numpy as np

from atlas.config.digests import normalised
from atlas.config.jobs import Figure, Plate
from atlas.config.keys import FORMATS
from atlas.errors import PlanRefused
from atlas.figure.boxes import Layout
from atlas.figure.layout import layout
from atlas.figure.lettering import axis_text, plain
from atlas.figure.panels import request_of
from atlas.figure.pieces import PanelText, Raster
from atlas.figure.typeset import check_characters
from atlas.orbits.counting import Sampled, counter_of, resolved
from atlas.orbits.histogram import Histogram, count_histogram
from atlas.orbits.orbit import OrbitCounter
from atlas.orbits.sampling import counts_reached
from atlas.orbits.schedule import Schedule, schedule
from atlas.output.certificate import certificate
from atlas.output.folders import check_files, check_folder
from atlas.output.remarks import remark_on_samples, remarks_on
from atlas.output.reporter import PREPARING, Reporter, Silence
from atlas.plan import BASE_MEMORY, check_fits, parse_memory
from tiles.errors import nearest
from tiles.shading import Fit, colour_table, fit_counts, key_labels, line_density, shade_counts
from tiles.strip import Strip
from tiles.window import Axis
from tiles.window import View as Window

CELLS_SHADED_AT_ONCE = 1 << 20
BYTES_PER_COUNT, BYTES_PER_PIXEL, TIFF_BYTES_PER_PIXEL, DRAWING_MEMORY = 4, 1, 5, 15 << 20
"""What is alive at the peaks, measured: the counts of a raster, or the page with its encoder and its type."""


class Colours(Protocol):
    """How densities become colours."""

    @property
    def shading(self) -> str:
        """One of `tiles.shading.SHADINGS`."""

    @property
    def palette(self) -> str:
        """One of `tiles.palette.PALETTES`."""

    @property
    def background(self) -> str | None:
        """Colour of empty cells."""

    @property
    def missing(self) -> str | None:
        """Colour of cells without samples."""


@dataclass(frozen=True)
class View:
    """One raster to be counted: its name on the page, its plate, its pixels."""

    name: str
    plate: Plate
    columns: int
    rows: int

    def counter(self) -> OrbitCounter:
        """Return the counter of its orbits."""
        return counter_of(self.plate, self.columns, self.rows)


@dataclass(frozen=True)
class Sheet:
    """A plate or figure laid out: what must be counted for it and where it goes.

    Attributes
    ----------
    record : Plate or Figure
    page : Layout
    views : tuple of View
        Panels in reading order, each followed by its inset.
    """

    record: Plate | Figure
    page: Layout
    views: tuple[View, ...]

    @property
    def memory(self) -> int:
        """Estimated peak memory of the process in bytes while it is made."""
        cells = [view.columns * view.rows for view in self.views]
        return sheet_memory(self.record.pixels, self.record.formats, cells)

    def files(self, out: Path) -> dict[str, Path]:
        """Return the file of each format in an output folder."""
        return {form: out / f"{self.record.name}{FORMATS[form]}" for form in self.record.formats}


@dataclass(frozen=True)
class Made:
    """What became of an output: its samples, its certificate, and what its maker should be told."""

    samples: int
    record: dict[str, Any]
    remarks: tuple[str, ...] = ()


def sheet_of(record: Plate | Figure) -> Sheet:
    """Lay a plate or a figure out.

    Raises
    ------
    Refusal
        When its size leaves no room for a raster.
    """
    page = layout(request_of(record))
    plates = record.plates if isinstance(record, Figure) else {record.name: record}
    views = []
    for panel in page.panels:
        plate = plates[panel.name]
        views.append(View(panel.name, plate, panel.width, panel.height))
        inset = plate.inset_plate()
        if inset is not None and panel.inset is not None:
            box = panel.inset.raster
            views.append(View(f"{panel.name}/inset", inset, box.width, box.height))
    return Sheet(record, page, tuple(views))


def check_lettering(sheet: Sheet) -> None:
    """Refuse titles, letters, labels and units with characters that the font lacks.

    Raises
    ------
    LetteringRefused
    """
    words = [sheet.page.title]
    for panel in sheet.page.panels:
        words += [panel.title, panel.letter]
    for view in sheet.views:
        plate = view.plate
        words += [label_of(plate, plate.across), label_of(plate, plate.up)]
        words.append(plate.family.label_and_unit(plate.up.name)[1])
    check_characters(words)


def sheet_memory(pixels: tuple[int, int], formats: Sequence[str], cells: Sequence[int]) -> int:
    """Return the estimated peak memory of the process in bytes while a sheet is made.

    Parameters
    ----------
    pixels : (int, int)
        Width and height of the sheet.
    formats : sequence of str
        Files that are written.
    cells : sequence of int
        Cells of every raster.
    """
    shades = sum(cells)
    page = (TIFF_BYTES_PER_PIXEL if "tiff" in formats else BYTES_PER_PIXEL) * pixels[0] * pixels[1]
    return BASE_MEMORY + shades + max(BYTES_PER_COUNT * max(cells), page + DRAWING_MEMORY)


def make_sheet(sheet: Sheet, files: dict[str, Path], schedule: Schedule, reporter: Reporter) -> Made:
    """Count, shade, set and write a plate or a figure.

    Parameters
    ----------
    sheet : Sheet
    files : dict of str to Path
        Where each format goes.
    schedule : Schedule
    reporter : Reporter

    Returns
    -------
    Made

    Raises
    ------
    OutputFailed
        When a file cannot be written.
    """
    panels = {view.name: _panel(sheet, view, schedule, reporter) for view in sheet.views}
    record = certificate(
        "figure" if isinstance(sheet.record, Figure) else "plate",
        sheet.record.name,
        normalised(sheet.record),
        "+".join(panel.digest for panel in panels.values()),
        {name: panel.shares for name, panel in panels.items()},
        {name: panel.sampled.record() for name, panel in panels.items()},
    )
    from atlas.figure.plate import draw

    reporter.begin(sheet.record.name, "drawing", 0)
    rasters = {name: panel.raster for name, panel in panels.items()}
    draw(sheet.page, rasters, {name: panel.text for name, panel in panels.items()}, files, record)
    remarks = [remark for panel in panels.values() for remark in panel.remarks]
    return Made(sum(panel.sampled.total for panel in panels.values()), record, tuple(remarks))


@dataclass(frozen=True)
class _Panel:
    """What remains of a view once its counts are shaded."""

    raster: Raster
    text: PanelText
    shares: dict[str, float | int]
    sampled: Sampled
    digest: str
    remarks: list[str]


def _panel(sheet: Sheet, view: View, schedule: Schedule, reporter: Reporter) -> _Panel:
    reporter.begin(sheet.record.name, PREPARING, 0)
    counter = resolved(view.plate, view.counter(), schedule)
    counter.warm()
    reporter.begin(sheet.record.name, "counting", counter.columns * counter.exposure)
    histogram = count_histogram(counter, schedule, reporter.advance)
    fit, raster = shaded(view.plate, counter.view, histogram.strip)
    shares = histogram.shares()
    remarks = remarks_on(view.name, shares)
    if view.plate.samples == "auto":
        remarks += remark_on_samples(view.name, histogram.samples, counts_reached(histogram.strip))
    return _Panel(
        raster,
        panel_text(view.plate, fit),
        shares,
        sampled_of(counter, histogram),
        histogram.digest(),
        remarks,
    )


def sampled_of(counter: OrbitCounter, histogram: Histogram) -> Sampled:
    """Return what the certificate says of the samples."""
    return Sampled(counter.columns, counter.rows, histogram.samples, counter.exposure, histogram.filled)


def shaded(colours: Colours, view: Window, strip: Strip, *, branches: bool = True) -> tuple[Fit, Raster]:
    """Shade the counts of a view with a fit of its own; return the fit and the raster, top line first.

    With ``branches``, branches of cycles get the highest shade, see :func:`tiles.shading.line_density`.
    """
    height = view.up.cell_size(strip.counts.shape[1])
    line = line_density(height) if branches else None
    fit = fit_counts(strip.counts, strip.exposure, height, colours.shading, line=line)
    table = colour_table(
        colours.palette, background=colours.background, missing=colours.missing, shading=colours.shading
    )
    columns, rows = strip.counts.shape
    lines = np.empty((rows, columns), np.uint8)
    width = max(1, CELLS_SHADED_AT_ONCE // rows)
    for first in range(0, columns, width):
        block = slice(first, first + width)
        lines[::-1, block] = shade_counts(strip.counts[block], strip.exposure[block], height, fit).T
    return fit, Raster(lines, table, view, strip.unsettled > 0)


def panel_text(plate: Plate, fit: Fit) -> PanelText:
    """Return what is written around a panel: labels from the family, the key's numbers and caption."""
    _, unit = plate.family.label_and_unit(plate.up.name)
    return PanelText(
        label_of(plate, plate.across),
        label_of(plate, plate.up),
        key_labels(fit) if plate.key else (),
        key_caption(plate.up, unit) if plate.key else "",
    )


def key_caption(up: Axis, unit: str = "") -> str:
    """Return the caption of a plate's colour key."""
    if up.scale == "log":
        return f"density (share of samples per unit of ln {up.name})"
    return f"density (share of samples per {unit or f'unit of {up.name}'})"


def label_of(plate: Plate, axis: Axis) -> str:
    """Return an axis' label: the config's own, else the family's label, symbol and unit."""
    if axis.label:
        return plain(axis.label)
    return axis_text(axis.name, *plate.family.label_and_unit(axis.name))


def draw_plate(
    plate: Plate,
    out: Sequence[Path | str],
    *,
    workers: int | None = None,
    memory: str | int | None = None,
    reporter: Reporter | None = None,
) -> Made:
    """Make one plate and write it to files; the suffix of each decides its format.

    Parameters
    ----------
    plate : Plate
        From `atlas.figure.plate` or a config.
    out : sequence of path
        Files that end in .png, .tif, .tiff, .pdf or .svg, each format once.
    workers : int, optional
        Threads.
    memory : str or int, optional
        Budget of the process, ``"2GiB"`` by default.
    reporter : Reporter, optional
        Hears of the progress.

    Raises
    ------
    Refusal
        When the request is wrong; nothing is written then.
    OutputFailed
        When a file cannot be written.
    """
    files = files_by_format([Path(path) for path in out])
    sheet = sheet_of(replace(plate, formats=tuple(files)))
    check_fits(sheet.record.name, sheet.record.pixels, sheet.memory, parse_memory(memory))
    check_lettering(sheet)
    for path in files.values():
        check_folder(path.parent)
    check_files(files.values())
    with schedule(workers) as opened:
        return make_sheet(sheet, files, opened, reporter or Silence())


def files_by_format(paths: Sequence[Path]) -> dict[str, Path]:
    """Return files by the format that their suffix names.

    Raises
    ------
    PlanRefused
        For another suffix, and for a format given twice.
    """
    formats = {suffix: form for form, suffix in FORMATS.items()} | {".tiff": "tiff"}
    files: dict[str, Path] = {}
    for path in paths:
        form = formats.get(path.suffix.lower())
        if form is None:
            raise PlanRefused(
                f"--out: '{path}' has no suffix of a picture{nearest(path.suffix.lower(), formats)}"
            )
        if form in files:
            raise PlanRefused(f"--out: '{files[form]}' and '{path}' are both {form}; give each format once")
        files[form] = path
    return files
