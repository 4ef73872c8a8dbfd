"""Making plates and figures: every panel made at its own pixels, set and written."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

from atlas.config.digests import normalised
from atlas.config.jobs import Figure, Plate
from atlas.config.keys import FORMATS
from atlas.errors import PlanRefused
from atlas.figure.boxes import Layout
from atlas.figure.layout import layout
from atlas.figure.panels import request_of
from atlas.figure.typeset import check_characters
from atlas.orbits.schedule import Schedule, schedule, threads
from atlas.output.certificate import certificate
from atlas.output.folders import check_files, check_folder
from atlas.output.panel import Maker, Panel, View, label_of
from atlas.output.panels.basin import BasinMaker
from atlas.output.panels.follow import FollowMaker
from atlas.output.panels.histogram import HistogramMaker
from atlas.output.panels.plane import PlaneMaker
from atlas.output.panels.portrait import PortraitMaker
from atlas.output.panels.split import SplitMaker
from atlas.output.reporter import Reporter, Silence
from atlas.plan import BASE_MEMORY, check_fits, parse_memory
from tiles.errors import nearest

BYTES_PER_COUNT, BYTES_PER_PIXEL, TIFF_BYTES_PER_PIXEL, DRAWING_MEMORY = 4, 1, 5, 15 << 20
"""What is alive at the peaks, measured: the counts of a raster, or the page with its encoder and its type."""
COLOURED_BYTES_PER_PIXEL = 4
"""Of a page whose rasters are colours, not palette indices: three and the encoder's."""

INSET = "/inset"

MAKERS: dict[str, Maker] = {
    "histogram": HistogramMaker(),
    "follow": FollowMaker(),
    "portrait": PortraitMaker(),
    "plane": PlaneMaker(),
    "basin": BasinMaker(),
}
SPLIT: Maker = SplitMaker()


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

    def memory(self, workers: int) -> int:
        """Return the estimated peak memory of the process in bytes while it is made."""
        rooms = [maker_of(view.plate).room(view) for view in self.views]
        width, height = self.record.pixels
        coloured = any(room.raster > view.cells for room, view in zip(rooms, self.views, strict=True))
        page = _page_memory(width * height, self.record.formats, coloured)
        working = [room.working + workers * room.each_worker for room in rooms]
        return _sheet_memory(page, [room.raster for room in rooms], working)

    def files(self, out: Path) -> dict[str, Path]:
        """Return the file of each format in an output folder."""
        return {form: out / f"{self.record.name}{FORMATS[form]}" for form in self.record.formats}


@dataclass(frozen=True)
class Made:
    """What became of an output: its samples, its certificate, and what its maker should be told."""

    samples: int
    record: dict[str, Any]
    remarks: tuple[str, ...] = ()


def maker_of(plate: Plate) -> Maker:
    """Return what makes the panel of a plate."""
    return SPLIT if plate.by_attractor else MAKERS[plate.kind]


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
            _check_inset(inset)
            views.append(View(panel.name + INSET, inset, box.width, box.height))
    return Sheet(record, page, tuple(views))


def _check_inset(inset: Plate) -> None:
    if inset.kind == "basin" or inset.by_attractor:
        raise PlanRefused(
            f"{inset.name}: attractors are numbered anew in every window, and would have other colours in "
            "the inset; draw it as a plate of its own"
        )


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
    page = _page_memory(pixels[0] * pixels[1], formats, False)
    return _sheet_memory(page, cells, [BYTES_PER_COUNT * each for each in cells])


def _page_memory(pixels: int, formats: Sequence[str], coloured: bool) -> int:
    each = TIFF_BYTES_PER_PIXEL if "tiff" in formats else BYTES_PER_PIXEL
    return max(each, COLOURED_BYTES_PER_PIXEL if coloured else 0) * pixels


def _sheet_memory(page: int, rasters: Sequence[int], working: Sequence[int]) -> int:
    return BASE_MEMORY + sum(rasters) + max(*working, page + DRAWING_MEMORY)


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
    panels: dict[str, Panel] = {}
    for view in sheet.views:
        magnified = panels.get(view.name.removesuffix(INSET))
        fit = magnified.fit if magnified else None
        maker = maker_of(view.plate)
        panels[view.name] = maker.make(replace(view, fit=fit), sheet.record.name, schedule, reporter)
    record = certificate(
        "figure" if isinstance(sheet.record, Figure) else "plate",
        sheet.record.name,
        normalised(sheet.record),
        "+".join(panel.digest for panel in panels.values()),
        {name: dict(panel.shares) for name, panel in panels.items()},
        {name: dict(panel.sampled) for name, panel in panels.items()},
    )
    from atlas.figure.plate import draw

    reporter.begin(sheet.record.name, "drawing", 0)
    rasters = {name: panel.raster for name, panel in panels.items()}
    draw(sheet.page, rasters, {name: panel.text for name, panel in panels.items()}, files, record)
    remarks = [remark for panel in panels.values() for remark in panel.remarks]
    return Made(sum(panel.samples for panel in panels.values()), record, tuple(remarks))


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
    needed = sheet.memory(threads(workers))
    check_fits(sheet.record.name, sheet.record.pixels, needed, parse_memory(memory))
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
