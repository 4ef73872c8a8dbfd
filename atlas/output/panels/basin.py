"""Basin charts as panels: every start in the colour of the attractor that it reaches."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from atlas.attractors.basins import Basins, chart_basins
from atlas.attractors.ends import RECORDS
from atlas.attractors.registry import Attractor
from atlas.figure.legends import class_legend
from atlas.figure.pieces import LegendEntry, PanelText, Raster
from atlas.orbits.schedule import Schedule
from atlas.output.panel import Panel, Room, View, label_of
from atlas.output.panels.plane import (
    KERNELS_MEMORY,
    finding_seconds,
    record_of,
    step_seconds,
    worker_memory,
)
from atlas.output.remarks import remarks_on_basins
from atlas.output.reporter import PREPARING, Reporter
from atlas.planes.fates import CLASS_OF_FATE, FATES, class_name
from atlas.planes.finder import FateFinder
from atlas.planes.searching import finder_of
from tiles.classes import class_shades, class_table
from tiles.mixing import mixed

BYTES_PER_PIXEL, BYTES_OF_SIGHTINGS = 7, 4 << 20
"""Keys, classes and shades; and what regions that wait for their turn have seen, a thread."""
LINES_SHADED, MOST_LISTED = 64, 12


class BasinMaker:
    """Makes basin charts."""

    def room(self, view: View) -> Room:
        """Return what a view needs."""
        finder = finder_of(view.plate, view.columns, view.rows)
        starts = finder.columns * finder.rows
        raster = (3 if view.plate.supersampling > 1 else 1) * view.cells
        each_worker = worker_memory(finder) + BYTES_OF_SIGHTINGS
        return Room(starts, KERNELS_MEMORY + BYTES_PER_PIXEL * starts, raster, each_worker)

    def seconds(self, view: View) -> float:
        """Return the estimated time of one core."""
        return basin_seconds(finder_of(view.plate, view.columns, view.rows))

    def make(self, view: View, name: str, schedule: Schedule, reporter: Reporter) -> Panel:
        """Find the attractors of a view and colour their basins."""
        plate = view.plate
        reporter.begin(name, PREPARING, 0)
        finder = finder_of(plate, view.columns, view.rows)
        finder.warm()
        reporter.begin(name, "finding basins", finder.columns * finder.rows)
        basins = chart_basins(finder, schedule, reporter.advance)
        lines = _shades(basins.classes)
        table = class_table()
        if plate.supersampling == 1:
            raster = Raster(lines, table, plate.view)
        else:
            pixels = mixed(lines, table, plate.supersampling)
            raster = Raster(None, None, plate.view, pixels=pixels)
        legend = legend_of_basins(basins)
        sampled = record_of(finder, plate.supersampling)
        sampled["attractors"] = [attractor_record(one) for one in basins.attractors[:MOST_LISTED]]
        return Panel(
            raster,
            PanelText(label_of(plate, plate.across), label_of(plate, plate.up), legend=legend),
            basins.shares(),
            sampled,
            finder.columns * finder.rows,
            basins.digest(),
            tuple(remarks_on_basins(view.name, basins.shares(), told(basins))),
        )


def basin_seconds(finder: FateFinder) -> float:
    """Return the estimated time of one core for a chart, as if no orbit were on a cycle."""
    starts = finder.columns * finder.rows
    return finding_seconds(finder) + starts * 2 * RECORDS * step_seconds(finder)


def legend_of_basins(basins: Basins) -> tuple[LegendEntry, ...]:
    """Return the legend of a chart: attractors by number, then what reaches none."""
    found = [one.number for one in basins.attractors] + [CLASS_OF_FATE[fate] for fate in basins.fates]
    names = {one.number: f"{one.number}: {kind_of(one)}" for one in basins.attractors}
    if basins.further:
        found.append(len(basins.attractors) + 1)
        names[found[-1]] = f"{basins.further} further"
    return class_legend(found, lambda number: names.get(number) or class_name(number))


def _shades(classes: NDArray[np.uint16]) -> NDArray[np.uint8]:
    """Return palette indices, top line first, a few lines at once: the look-up takes its own room."""
    lines = np.empty(classes.shape[::-1], np.uint8)
    turned = classes.T[::-1]
    for first in range(0, len(lines), LINES_SHADED):
        some = slice(first, first + LINES_SHADED)
        lines[some] = class_shades(turned[some])
    return lines


def kind_of(attractor: Attractor) -> str:
    """Return what a legend calls an attractor."""
    return f"period {attractor.period}" if attractor.period > 1 else FATES[attractor.fate]


def told(basins: Basins) -> list[str]:
    """Return a sentence's parts about the shares of basins: the largest in order of number, then the rest."""
    largest = sorted(basins.attractors, key=lambda one: -one.share)
    listed = sorted(largest[:MOST_LISTED], key=lambda one: one.number)
    parts = [f"attractor {one.number} ({kind_of(one)}) {one.share:.4g} ± {one.error:.1g}" for one in listed]
    others = largest[MOST_LISTED:]
    if others:
        parts.append(f"{len(others)} smaller ones {sum(one.share for one in others):.4g} together")
    return parts


def attractor_record(attractor: Attractor) -> dict[str, object]:
    """Return what the certificate says of an attractor."""
    return {
        "number": attractor.number,
        "kind": kind_of(attractor),
        "share": attractor.share,
        "share_error": attractor.error,
        "mean": attractor.mean.tolist(),
    }
