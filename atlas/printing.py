"""Making plates and figures: every panel counted at its own pixels, shaded, set and written."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from atlas.boxes import Layout
from atlas.certificate import certificate
from atlas.counting import Sampled, counter_of, resolved
from atlas.digests import normalised
from atlas.histogram import Histogram, count_histogram
from atlas.jobs import Figure, Job, Plate
from atlas.keys import FORMATS
from atlas.layout import layout
from atlas.lettering import axis_text, plain
from atlas.orbit import OrbitCounter
from atlas.panels import request_of
from atlas.pieces import PanelText, Raster
from atlas.reporter import Reporter
from atlas.schedule import Schedule
from tiles.shading import Fit, colour_table, fit_counts, key_labels, shade_counts
from tiles.window import Axis


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

    def files(self, out: Path) -> dict[str, Path]:
        """Return the file of each format in an output folder."""
        return {form: out / f"{self.record.name}{FORMATS[form]}" for form in self.record.formats}


@dataclass(frozen=True)
class Made:
    """What became of an output: its samples and its certificate."""

    samples: int
    record: dict[str, Any]


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
    rasters: dict[str, Raster] = {}
    texts: dict[str, PanelText] = {}
    shares, samples, digests = {}, {}, {}
    total = 0
    for view in sheet.views:
        counter = resolved(view.plate, view.counter())
        reporter.begin(sheet.record.name, "counting", counter.columns * counter.exposure)
        histogram = count_histogram(counter, schedule, reporter.advance)
        sampled = sampled_of(counter, histogram)
        total += sampled.total
        shares[view.name], samples[view.name] = histogram.shares(), sampled.record()
        digests[view.name] = histogram.digest()
        fit, rasters[view.name] = shaded(view.plate, counter, histogram)
        texts[view.name] = panel_text(view.plate, fit)
    record = certificate(
        "figure" if isinstance(sheet.record, Figure) else "plate",
        sheet.record.name,
        normalised(sheet.record),
        "+".join(digests.values()),
        shares,
        samples,
    )
    from atlas.plate import draw

    reporter.begin(sheet.record.name, "drawing", 0)
    draw(sheet.page, rasters, texts, files, record)
    return Made(total, record)


def sampled_of(counter: OrbitCounter, histogram: Histogram) -> Sampled:
    """Return what the certificate says of the samples."""
    return Sampled(
        counter.columns, counter.rows, histogram.samples, counter.exposure, histogram.filled
    )


def shaded(plate: Plate, counter: OrbitCounter, histogram: Histogram) -> tuple[Fit, Raster]:
    """Shade a histogram with a fit of its own; return the fit and the raster, top line first."""
    strip, height = histogram.strip, counter.view.up.cell_size(counter.rows)
    fit = fit_counts(strip.counts, strip.exposure, height, plate.shading)
    shades = shade_counts(strip.counts, strip.exposure, height, fit)
    table = colour_table(plate.palette, background=plate.background, missing=plate.missing)
    lines = np.ascontiguousarray(shades.T[::-1])
    return fit, Raster(lines, table, counter.view, strip.unsettled > 0)


def panel_text(plate: Plate, fit: Fit) -> PanelText:
    """Return what is written around a panel: labels from the family, the key's numbers and caption."""
    unit = unit_of(plate, plate.up.name)
    per = f" per {unit}" if unit else ""
    log = " of the logarithm" if plate.up.scale == "log" else ""
    return PanelText(
        label_of(plate, plate.across),
        label_of(plate, plate.up),
        key_labels(fit) if plate.key else (),
        f"density{per}{log}" if plate.key else "",
    )


def label_of(plate: Plate, axis: Axis) -> str:
    """Return an axis' label: the config's own, else the family's label, symbol and unit."""
    if axis.label:
        return plain(axis.label)
    for entry in (*plate.family.states, *plate.family.parameters):
        if entry.name == axis.name:
            return axis_text(entry.name, entry.label, entry.unit)
    return axis_text(axis.name)


def unit_of(job: Job, name: str) -> str:
    """Return the unit of a state variable or parameter, empty without one."""
    return next((one.unit for one in (*job.family.states, *job.family.parameters) if one.name == name), "")
