"""Orbit histograms as panels: counted at the raster's own pixels, then shaded."""

from __future__ import annotations

from atlas.config.jobs import Plate
from atlas.figure.pieces import PanelText
from atlas.orbits.counting import Sampled, counter_of, resolved
from atlas.orbits.histogram import Histogram, count_histogram
from atlas.orbits.orbit import OrbitCounter
from atlas.orbits.sampling import counts_reached
from atlas.orbits.schedule import Schedule
from atlas.orbits.step import step_source
from atlas.output.colouring import key_caption, shaded
from atlas.output.panel import Panel, Room, View, label_of
from atlas.output.remarks import remark_on_samples, remarks_on
from atlas.output.reporter import PREPARING, Reporter
from tiles.shading import Fit, key_labels

SECONDS_PER_SAMPLE = 1.2e-9
SECONDS_PER_SLOW_CALL = 0.6e-9
BYTES_PER_COUNT = 4


class HistogramMaker:
    """Makes orbit histograms: a parameter across, a state variable or observable up."""

    def room(self, view: View) -> Room:
        """Return what a view needs."""
        counter = _counter(view)
        return Room(counter.columns * counter.exposure, BYTES_PER_COUNT * view.cells, view.cells)

    def seconds(self, view: View) -> float:
        """Return the estimated time of one core."""
        return counting_seconds(_counter(view))

    def make(self, view: View, name: str, schedule: Schedule, reporter: Reporter) -> Panel:
        """Count and shade a view."""
        reporter.begin(name, PREPARING, 0)
        counter = resolved(view.plate, _counter(view), schedule)
        counter.warm()
        reporter.begin(name, "counting", counter.columns * counter.exposure)
        histogram = count_histogram(counter, schedule, reporter.advance)
        fit, raster = shaded(view.plate, counter.view, histogram.strip)
        shares = histogram.shares()
        remarks = remarks_on(view.name, shares)
        if view.plate.samples == "auto":
            remarks += remark_on_samples(view.name, histogram.samples, counts_reached(histogram.strip))
        sampled = sampled_of(counter, histogram)
        return Panel(
            raster,
            panel_text(view.plate, fit),
            shares,
            sampled.record(),
            sampled.total,
            histogram.digest(),
            tuple(remarks),
        )


def counting_seconds(counter: OrbitCounter) -> float:
    """Return the estimated time of one core for the orbits of a counter."""
    slow = step_source(counter.family).slow_calls
    orbits = counter.columns * counter.orbits_per_column
    each = 0.1e-9 + SECONDS_PER_SLOW_CALL * slow
    return orbits * (counter.rules.transient * each + counter.rules.samples * (SECONDS_PER_SAMPLE + each))


def sampled_of(counter: OrbitCounter, histogram: Histogram) -> Sampled:
    """Return what the certificate says of the samples."""
    return Sampled(counter.columns, counter.rows, histogram.samples, counter.exposure, histogram.filled)


def panel_text(plate: Plate, fit: Fit) -> PanelText:
    """Return what is written around a panel: labels from the family, the key's numbers and caption."""
    _, unit = plate.family.label_and_unit(plate.up.name)
    return PanelText(
        label_of(plate, plate.across),
        label_of(plate, plate.up),
        key_labels(fit) if plate.key else (),
        key_caption(plate.up, unit) if plate.key else "",
    )


def _counter(view: View) -> OrbitCounter:
    return counter_of(view.plate, view.columns, view.rows)
