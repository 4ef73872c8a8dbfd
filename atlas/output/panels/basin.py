"""Basin charts as panels: every start in the colour of the attractor that it reaches."""

from __future__ import annotations

import numpy as np

from atlas.attractors.basins import Basins, chart_basins
from atlas.attractors.registry import Attractor
from atlas.figure.legends import class_legend
from atlas.figure.pieces import LegendEntry, PanelText, Raster
from atlas.orbits.schedule import Schedule
from atlas.output.panel import Panel, Room, View, label_of
from atlas.output.panels.plane import finding_seconds, record_of
from atlas.output.remarks import remarks_on_basins
from atlas.output.reporter import PREPARING, Reporter
from atlas.planes.fates import FATES, class_name
from atlas.planes.searching import finder_of
from tiles.classes import class_shades, class_table
from tiles.mixing import mixed

BYTES_PER_PIXEL = 7
MOST_LISTED = 12


class BasinMaker:
    """Makes basin charts."""

    def room(self, view: View) -> Room:
        """Return what a view needs."""
        finder = finder_of(view.plate, view.columns, view.rows)
        starts = finder.columns * finder.rows
        raster = (3 if view.plate.supersampling > 1 else 1) * view.cells
        return Room(starts, BYTES_PER_PIXEL * starts, raster)

    def seconds(self, view: View) -> float:
        """Return the estimated time of one core."""
        return finding_seconds(finder_of(view.plate, view.columns, view.rows))

    def make(self, view: View, name: str, schedule: Schedule, reporter: Reporter) -> Panel:
        """Find the attractors of a view and colour their basins."""
        plate = view.plate
        reporter.begin(name, PREPARING, 0)
        finder = finder_of(plate, view.columns, view.rows)
        finder.warm()
        reporter.begin(name, "finding basins", finder.columns * finder.rows)
        basins = chart_basins(finder, schedule, reporter.advance)
        lines = np.ascontiguousarray(class_shades(basins.classes.T[::-1]))
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
            tuple(remarks_on_basins(view.name, basins.shares(), [told(one) for one in basins.attractors])),
        )


def legend_of_basins(basins: Basins) -> tuple[LegendEntry, ...]:
    """Return the legend of a chart: attractors by number, then what reaches none."""
    found = [int(number) for number in np.unique(basins.classes)]
    names = {one.number: f"{one.number}: {kind_of(one)}" for one in basins.attractors}
    if basins.further:
        names[len(basins.attractors) + 1] = f"{basins.further} further attractors"
    return class_legend(found, lambda number: names.get(number) or class_name(number))


def kind_of(attractor: Attractor) -> str:
    """Return what a legend calls an attractor."""
    return f"period {attractor.period}" if attractor.period > 1 else FATES[attractor.fate]


def told(attractor: Attractor) -> str:
    """Return a sentence's part about the share of an attractor's basin."""
    return (
        f"attractor {attractor.number} ({kind_of(attractor)}) {attractor.share:.2%} ± {attractor.error:.2%}"
    )


def attractor_record(attractor: Attractor) -> dict[str, object]:
    """Return what the certificate says of an attractor."""
    return {
        "number": attractor.number,
        "kind": kind_of(attractor),
        "share": attractor.share,
        "share_error": attractor.error,
        "mean": attractor.mean.tolist(),
    }
