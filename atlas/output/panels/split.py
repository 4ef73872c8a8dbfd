"""Densities split by attractor as panels, each attractor in an ink of its own."""

from __future__ import annotations

from hashlib import blake2b

import numpy as np
from numpy.typing import NDArray

from atlas.attractors.by_start import orbits_sorted_at_once
from atlas.attractors.split_counts import SplitCounts, split_histogram, split_portrait
from atlas.config.jobs import Job
from atlas.figure.pieces import PanelText
from atlas.orbits.counting import counter_of, portrait_of, resolved, resolved_portrait
from atlas.orbits.portrait_counts import room_memory
from atlas.orbits.schedule import Schedule
from atlas.output.inking import Layered, overprinted
from atlas.output.panel import Panel, Room, View, label_of
from atlas.output.panels.histogram import BYTES_PER_COUNT, counting_seconds
from atlas.output.panels.plane import KERNELS_MEMORY, orbit_memory
from atlas.output.panels.portrait import portrait_seconds
from atlas.output.remarks import remarks_on
from atlas.output.reporter import PREPARING, Reporter
from atlas.planes.pixels import FateRules
from tiles.mixing import INKS

MOST = len(INKS) - 1
LEAST_SHARE = 1e-3
OTHERS = "others"


class SplitMaker:
    """Makes orbit histograms and phase portraits with one colour an attractor."""

    def room(self, view: View) -> Room:
        """Return what a view needs."""
        plate = view.plate
        if plate.kind == "portrait":
            samples = portrait_of(plate, view.columns, view.rows).exposure
            each_worker = room_memory(view.columns, view.rows)
        else:
            counter = counter_of(plate, view.columns, view.rows)
            samples = counter.columns * counter.exposure
            orbits = orbits_sorted_at_once(len(plate.starts))
            each_worker = orbits * orbit_memory(len(plate.family.states))
        working = KERNELS_MEMORY + BYTES_PER_COUNT * (MOST + 2) * view.cells
        return Room(samples, working, 3 * view.cells, each_worker)

    def seconds(self, view: View) -> float:
        """Return the estimated time of one core."""
        if view.plate.kind == "portrait":
            return portrait_seconds(portrait_of(view.plate, view.columns, view.rows))
        return counting_seconds(counter_of(view.plate, view.columns, view.rows))

    def make(self, view: View, name: str, schedule: Schedule, reporter: Reporter) -> Panel:
        """Count a view by attractor and ink it."""
        plate = view.plate
        reporter.begin(name, PREPARING, 0)
        if plate.kind == "portrait":
            split, cell, exposure = _portrait(view, name, schedule, reporter)
        else:
            split, cell, exposure = _histogram(view, name, schedule, reporter)
        digest = _digest(split)
        counts, names = told_apart(split.layers)
        layered = Layered(counts, np.full(view.columns, exposure, np.uint64), cell, names)
        raster, legend = overprinted(plate, plate.view, layered, branches=plate.kind == "histogram")
        shares = _shares(split)
        sampled = {
            "columns": view.columns,
            "rows": view.rows,
            "starts": len(plate.starts),
            "exposure": split.exposure,
            "attractors": len(split.present),
        }
        return Panel(
            raster,
            PanelText(label_of(plate, plate.across), label_of(plate, plate.up), legend=legend),
            shares,
            sampled,
            split.exposure,
            digest,
            tuple(remarks_on(view.name, shares)),
        )


def told_apart(layers: NDArray[np.uint32]) -> tuple[NDArray[np.uint32], list[str]]:
    """Return the densities that get an ink each, and what the legend calls them.

    Attractors with less than a thousandth of the counts, mostly such as were not recognised at a few values
    of the parameter, are joined with what reaches no attractor; the others are numbered anew.

    Parameters
    ----------
    layers : ndarray of uint32, shape (most + 1, columns, rows)
        As `atlas.attractors.split_counts` returns them; overwritten, for there is no room for a second copy.
    """
    sums = [int(layer.sum(dtype=np.uint64)) for layer in layers]
    large = [number for number in range(1, len(layers)) if sums[number] >= max(1, LEAST_SHARE * sum(sums))]
    rest = [number for number in range(len(layers)) if number not in large and sums[number]]
    names = [f"attractor {number}" for number in range(1, len(large) + 1)]
    for number in rest:
        if number:
            layers[0] += layers[number]
    others = layers[0].copy()
    for place, number in enumerate(large):
        layers[place] = layers[number]
    if large and not rest:
        return layers[: len(large)], names
    layers[len(large)] = others
    return layers[: len(large) + 1], [*names, OTHERS]


def _histogram(
    view: View, name: str, schedule: Schedule, reporter: Reporter
) -> tuple[SplitCounts, float, int]:
    counter = counter_of(view.plate, view.columns, view.rows)
    counter = resolved(view.plate, counter, schedule)
    counter.warm()
    reporter.begin(name, "counting", counter.columns * counter.exposure)
    split = split_histogram(counter, _rules(view.plate), schedule, reporter.advance, most=MOST)
    return split, view.plate.up.cell_size(view.rows), counter.exposure


def _portrait(
    view: View, name: str, schedule: Schedule, reporter: Reporter
) -> tuple[SplitCounts, float, int]:
    counter = portrait_of(view.plate, view.columns, view.rows)
    counter = resolved_portrait(view.plate, counter, schedule)
    counter.warm()
    reporter.begin(name, "counting", counter.exposure)
    split = split_portrait(counter, _rules(view.plate), schedule, reporter.advance, most=MOST)
    area = view.plate.across.cell_size(view.columns) * view.plate.up.cell_size(view.rows)
    return split, area, counter.exposure


def _rules(job: Job) -> FateRules:
    return FateRules(job.transient, job.steps, job.transient_limit, job.longest_period)


def _shares(split: SplitCounts) -> dict[str, float]:
    return {
        "below": split.outside / split.exposure,
        "above": 0.0,
        "escaped": split.escaped / split.exposure,
        "unsettled": split.unsettled / split.exposure,
    }


def _digest(split: SplitCounts) -> str:
    return blake2b(np.ascontiguousarray(split.layers, "<u4").data, digest_size=16).hexdigest()
