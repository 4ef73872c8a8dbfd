"""Phase portraits as panels: the density of the orbits in two state variables."""

from __future__ import annotations

import numpy as np

from atlas.figure.pieces import PanelText, Raster
from atlas.orbits.counting import portrait_of, resolved_portrait
from atlas.orbits.portrait import Portrait, PortraitCounter
from atlas.orbits.portrait_counts import count_portrait, result_memory, room_memory
from atlas.orbits.portrait_dataset import sampled_of
from atlas.orbits.schedule import Schedule
from atlas.orbits.step import step_source
from atlas.output.panel import Panel, Room, View, label_of
from atlas.output.remarks import remarks_on_portrait
from atlas.output.reporter import PREPARING, Reporter
from tiles.shading import colour_table, fit_counts, key_labels, shade_counts

SECONDS_PER_SAMPLE, SECONDS_PER_SLOW_CALL = 4e-9, 0.6e-9
ROOMS = 2
"""Arrays that are counted into side by side."""
KEY_CAPTION = "density (share of samples per unit of area)"


class PortraitMaker:
    """Makes phase portraits."""

    def room(self, view: View) -> Room:
        """Return what a view needs."""
        counter = _counter(view)
        rooms = ROOMS * room_memory(view.columns, view.rows)
        working = rooms + result_memory(view.columns, view.rows)
        return Room(counter.exposure, working, view.cells)

    def seconds(self, view: View) -> float:
        """Return the estimated time of one core."""
        return portrait_seconds(_counter(view))

    def make(self, view: View, name: str, schedule: Schedule, reporter: Reporter) -> Panel:
        """Count and shade a view."""
        plate = view.plate
        reporter.begin(name, PREPARING, 0)
        counter = resolved_portrait(plate, _counter(view), schedule)
        counter.warm()
        reporter.begin(name, "counting", counter.exposure)
        portrait = count_portrait(counter, schedule, reporter.advance, at_once=ROOMS)
        shares = portrait.shares()
        raster, text = _shaded(view, portrait)
        return Panel(
            raster,
            text,
            shares,
            sampled_of(counter, portrait),
            portrait.totals["exposure"],
            portrait.digest(),
            tuple(remarks_on_portrait(view.name, shares)),
        )


def portrait_seconds(counter: PortraitCounter) -> float:
    """Return the estimated time of one core for the orbits of a portrait."""
    slow = SECONDS_PER_SLOW_CALL * step_source(counter.family).slow_calls
    return counter.exposure * (SECONDS_PER_SAMPLE + slow)


def _shaded(view: View, portrait: Portrait) -> tuple[Raster, PanelText]:
    """Shade the counts by one fit; every column had the same exposure, that of the whole portrait."""
    plate = view.plate
    columns, rows = portrait.counts.shape
    area = plate.across.cell_size(columns) * plate.up.cell_size(rows)
    exposure = np.full(columns, portrait.totals["exposure"], np.uint64)
    fit = fit_counts(portrait.counts, exposure, area, plate.shading)
    table = colour_table(
        plate.palette, background=plate.background, missing=plate.missing, shading=plate.shading
    )
    lines = np.ascontiguousarray(shade_counts(portrait.counts, exposure, area, fit).T[::-1])
    text = PanelText(
        label_of(plate, plate.across),
        label_of(plate, plate.up),
        key_labels(fit) if plate.key else (),
        KEY_CAPTION if plate.key else "",
    )
    return Raster(lines, table, plate.view), text


def _counter(view: View) -> PortraitCounter:
    return portrait_of(view.plate, view.columns, view.rows)
