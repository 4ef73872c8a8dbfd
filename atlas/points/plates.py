"""Plates of points: counted at the pixels of the raster, shaded, set and written as those of orbits are."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import Any

from atlas.figure.layout import layout
from atlas.figure.pieces import PanelText
from atlas.figure.typeset import check_characters
from atlas.output.colouring import shaded
from atlas.output.folders import check_files, check_folder
from atlas.output.printing import files_by_format, sheet_memory
from atlas.output.reporter import Reporter, Silence
from atlas.plan import check_fits, parse_memory
from atlas.points.cells import Grid
from atlas.points.counting import Reading, count_points
from atlas.points.intervals import AskedAxis, AxisGiven, view_of
from atlas.points.jobs import (
    PLATE_OPTIONS,
    PointsPlate,
    axis_label,
    caption,
    name_of,
    options_of,
    settings_of,
)
from atlas.points.opening import table_of
from atlas.points.record import Binned, binned
from atlas.points.tables import ROWS_PER_CHUNK
from atlas.reading.place import REQUEST, Place
from tiles.shading import Fit, key_labels

READING_MEMORY = 64 << 20
"""A chunk of points with its cells, and the reader of files."""


def draw_points(
    points: Any,
    across: AxisGiven,
    up: AxisGiven,
    out: Sequence[Path | str],
    *,
    name: str | None = None,
    memory: str | int | None = None,
    reporter: Reporter | None = None,
    place: Place = REQUEST,
    **options: Any,
) -> Binned:
    """Draw measured or simulated points as a plate.

    Parameters
    ----------
    points : path, DataFrame, mapping of arrays, structured array or iterable of such chunks
        As for `atlas.bin_points`.
    across, up : Axis, column, (column, low, high) or mapping
        The axes; open ends are those of the points.
    out : sequence of path
        Files that end in .png, .tif, .tiff, .pdf or .svg, each format once.
    name : str, optional
        Of the plate in its certificate; by default that of the file of points.
    memory : str or int, optional
        Budget of the process, ``"2GiB"`` by default.
    reporter : Reporter, optional
        Hears of the progress.
    place : Place
        How a refusal calls the parts.
    **options
        Keys of a plate in a config that say how it looks: size, dpi, font_size, shading, palette, background,
        missing, title, key, letter; None means not given.

    Returns
    -------
    Binned
        The certificate, and a sentence about points that no cell holds.

    Raises
    ------
    Refusal
        When the request is wrong; nothing is written then.
    OutputFailed
        When a file cannot be written.
    """
    reporter = reporter or Silence()
    asked = AskedAxis.read(across, place.at("across")), AskedAxis.read(up, place.at("up"))
    chosen = options_of(PLATE_OPTIONS, options, place)
    files = files_by_format([Path(path) for path in out])
    budget = parse_memory(memory)
    table = table_of(points)
    name = name_of(name, table, place)
    pixels = chosen["size"].pixels(chosen["dpi"])
    most = READING_MEMORY + sheet_memory(pixels, tuple(files), [pixels[0] * pixels[1]])
    check_fits(name, pixels, most, budget)
    reporter.begin(name, "looking at the points", 0)
    plate = PointsPlate(name=name, view=view_of(table, *asked, ROWS_PER_CHUNK, place), **chosen)
    page = layout(plate.request())
    labels = axis_label(plate.view.across), axis_label(plate.view.up)
    check_characters([plate.title or "", plate.letter or "", *labels])
    panel = page.panels[0]
    grid = Grid.of(plate.view, panel.width, panel.height)
    for path in files.values():
        check_folder(path.parent)
    check_files(files.values())
    reading = Reading(table, grid, ROWS_PER_CHUNK, reporter)
    reporter.begin(name, "counting", table.rows())
    histogram = count_points(reading)
    fit, raster = shaded(plate, plate.view, histogram.strip, branches=False)
    made = binned(name, settings_of(plate), reading, histogram.digest())
    from atlas.figure.plate import draw

    reporter.begin(name, "drawing", 0)
    draw(page, {panel.name: raster}, {panel.name: _text(plate, labels, fit)}, files, made.record)
    return made


def _text(plate: PointsPlate, labels: tuple[str, str], fit: Fit) -> PanelText:
    if not plate.key:
        return PanelText(*labels)
    return PanelText(*labels, key_labels(fit), caption(plate.view.up))
