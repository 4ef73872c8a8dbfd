"""Followed attractors as panels: a sweep up, a sweep down, or both in two colours."""

from __future__ import annotations

import numpy as np

from atlas.figure.pieces import PanelText
from atlas.orbits.counting import counter_of, resolved
from atlas.orbits.follow import SWEEPS, count_followed
from atlas.orbits.orbit import OrbitCounter
from atlas.orbits.schedule import Schedule
from atlas.output.colouring import shaded
from atlas.output.inking import Layered, overprinted
from atlas.output.panel import Panel, Room, View, label_of
from atlas.output.panels.histogram import BYTES_PER_COUNT, counting_seconds, panel_text, sampled_of
from atlas.output.remarks import remarks_on
from atlas.output.reporter import PREPARING, Reporter

NAMES = {"up": "upward", "down": "downward"}
BYTES_WHILE_INKED = 2 * BYTES_PER_COUNT
"""A cell of each sweep: its count, and that in the counts of all sweeps that the fit is made to."""
SLOWNESS = 4.0
"""Columns in series fill the lanes badly: measured against columns side by side."""


class FollowMaker:
    """Makes bifurcation diagrams whose columns start where their neighbours ended."""

    def room(self, view: View) -> Room:
        """Return what a view needs."""
        counter, sweeps = _counter(view), _sweeps(view)
        samples = sweeps * counter.columns * counter.exposure
        if sweeps == 1:
            return Room(samples, BYTES_PER_COUNT * view.cells, view.cells)
        return Room(samples, BYTES_WHILE_INKED * sweeps * view.cells, 3 * view.cells)

    def seconds(self, view: View) -> float:
        """Return the estimated time of one core."""
        return SLOWNESS * _sweeps(view) * counting_seconds(_counter(view))

    def make(self, view: View, name: str, schedule: Schedule, reporter: Reporter) -> Panel:
        """Count the sweeps and shade them."""
        plate = view.plate
        assert plate.follow is not None
        reporter.begin(name, PREPARING, 0)
        counter = resolved(plate, _counter(view), schedule)
        counter.warm()
        reporter.begin(name, "following", _sweeps(view) * counter.columns * counter.exposure)
        sweeps = count_followed(counter, plate.follow, schedule, reporter.advance)
        strips = [sweep.strip for sweep in sweeps.values()]
        if len(strips) == 1:
            fit, raster = shaded(plate, counter.view, strips[0])
            text = panel_text(plate, fit)
        else:
            layered = Layered(
                np.stack([strip.counts for strip in strips]),
                strips[0].exposure,
                counter.view.up.cell_size(counter.rows),
                [NAMES[one] for one in sweeps],
                np.any([strip.unsettled > 0 for strip in strips], axis=0),
            )
            raster, legend = overprinted(plate, counter.view, layered)
            text = PanelText(label_of(plate, plate.across), label_of(plate, plate.up), legend=legend)
        shares = {direction: sweep.shares() for direction, sweep in sweeps.items()}
        remarks = [
            remark
            for direction, own in shares.items()
            for remark in remarks_on(f"{view.name} ({NAMES[direction]})", own)
        ]
        sampled = {direction: sampled_of(counter, sweep).record() for direction, sweep in sweeps.items()}
        digest = "+".join(sweep.digest() for sweep in sweeps.values())
        total = len(sweeps) * counter.columns * counter.exposure
        return Panel(raster, text, shares, sampled, total, digest, tuple(remarks))


def _sweeps(view: View) -> int:
    assert view.plate.follow is not None
    return len(SWEEPS[view.plate.follow])


def _counter(view: View) -> OrbitCounter:
    return counter_of(view.plate, view.columns, view.rows)
