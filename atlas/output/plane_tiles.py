"""Tile sets of parameter planes: fates and values of every tile, index and static folder."""

from __future__ import annotations

import os
from collections.abc import Mapping
from functools import partial
from typing import Any

import numpy as np

from atlas.config.digests import counting_digest, normalised
from atlas.config.draws import DRAWS
from atlas.config.jobs import TileSet
from atlas.orbits.schedule import Schedule
from atlas.output.certificate import certificate
from atlas.output.panels.plane import CAPTIONS, record_of
from atlas.output.printing import Made
from atlas.output.remarks import remarks_on_fates
from atlas.output.reporter import PREPARING, Reporter
from atlas.output.tiled import Places, colours_of, header_of, make_site, tile_columns
from atlas.planes.fates import CLASS_NAMES, CLASS_NONE
from atlas.planes.finder import FateFinder, Region
from atlas.planes.layers import classes_of
from atlas.planes.searching import finder_of
from atlas.planes.survey import PIXELS_AT_ONCE, Tally, layers_of
from tiles.grid import TILE, Address
from tiles.plane import PlaneTile
from tiles.plane_build import build_planes
from tiles.plane_index import PlaneIndex
from tiles.store import written

BYTES_PER_PLANE_TILE = 16 << 20
"""What a task holds: a tile's orbits, its classes and sums, and those that a coarser tile is made from."""


class PlaneSource:
    """Finds the fates of the deepest tiles of a plane when the index asks for them.

    Values are rounded to 24 bits: exponents are not known better, and the index is half as large.
    """

    def __init__(self, job: TileSet, finder: FateFinder, schedule: Schedule, reporter: Reporter) -> None:
        self.finder, self.schedule, self.reporter = finder, schedule, reporter
        self.counted, self.periods = job.draw == "attractors", job.draw == "period"
        self.values = value_names(job)

    def __call__(self, address: Address) -> PlaneTile:
        """Return the tile of an address of the deepest level pair; called in worker threads."""
        classes = np.empty((TILE, TILE), np.uint16)
        values = {name: np.empty((TILE, TILE)) for name in self.values}
        names = (*(("attractors",) if self.counted else ("fate", "period")), *self.values)
        low, width = address.row * TILE, PIXELS_AT_ONCE // TILE
        for first in range(0, TILE, width):
            left = address.column * TILE + first
            region = Region(left, left + width, low, low + TILE)
            layers, _ = layers_of(self.finder, region, names, self.schedule.stop)
            at = slice(first, first + width)
            if self.counted:
                number = layers["attractors"]
                classes[at] = np.where(number == 0, CLASS_NONE, number)
            else:
                classes[at] = classes_of(layers["fate"], layers["period"])
                if self.periods:
                    classes[at][layers["period"] == 0] = CLASS_NONE
            for name, array in values.items():
                array[at] = layers[name].astype(np.float32)
            self.reporter.advance(width * TILE)
        return PlaneTile(classes, values)


def value_names(job: TileSet) -> tuple[str, ...]:
    """Return the layers of values of a tile set: the exponent always, and what is drawn."""
    drawn = (job.draw,) if job.draw in CAPTIONS and job.draw != "lyapunov" else ()
    return ("lyapunov", *drawn)


def plane_finder(job: TileSet) -> FateFinder:
    """Return the finder of a tile set's deepest level pair."""
    return finder_of(job, *job.cells)


def make_plane_tiles(
    job: TileSet, places: Places, opened: Schedule, reporter: Reporter, at_once: int | None = None
) -> Made:
    """Find the fates of a tile set, build its index and its static folder; an interrupted run is continued.

    Parameters
    ----------
    job : TileSet
        Of the kind ``plane``.
    places : Places
    opened : Schedule
    reporter : Reporter
    at_once : int, optional
        Most tiles that may be made side by side, where memory is short.

    Raises
    ------
    OutputFailed
        When the disk is full or the folder is closed.
    """
    reporter.begin(job.name, PREPARING, 0)
    finder = plane_finder(job)
    finder.warm()
    made: list[Made] = []

    def finish(index: PlaneIndex) -> None:
        for layer in index.value_layers:
            kind = str(layer["palette_kind"])
            fit = index.value_fit_from(layer["name"], kind, shading=job.shading)
            if kind != "sequential" or job.shading == "equalised":
                index.put_value_fit(layer["name"], fit)
        made.append(_made(job, finder, index))
        index.put_certificate(made[0].record)

    reporter.begin(job.name, "finding fates", finder.columns * finder.rows)
    build_planes(
        places.growing_index,
        job.view,
        across_level=job.levels.across,
        up_level=job.levels.up,
        pairs=job.pairs,
        source=PlaneSource(job, finder, opened, reporter),
        header=plane_header(job),
        run=partial(opened.run, at_once=at_once),
        unfinished=places.growing_index,
        finish=finish,
    )
    reporter.begin(job.name, "tiles", tile_columns(places.growing_index))
    make_site(places.growing_index, places.site, colours_of(job), opened, reporter, places.growing_site)
    with written(places.index):
        os.replace(places.growing_index, places.index)
    return made[0]


def plane_header(job: TileSet) -> dict[str, Any]:
    """Return what the index of a plane keeps beside its geometry."""
    if job.draw == "attractors":
        names = {str(CLASS_NONE): "none", "period": "{} attractors", "1": "1 attractor"}
        layer, label = "attractors", "attractors"
    else:
        names = {str(number): name for number, name in CLASS_NAMES.items()} | {"period": "period {}"}
        layer = label = "period" if job.draw == "period" else "fate"
    return {
        **header_of(job),
        "class_layer": layer,
        "class_label": label,
        "class_names": names,
        "value_layers": [
            {
                "name": name,
                "label": CAPTIONS[name],
                "palette_kind": DRAWS[name].palette_kind,
                "palette": job.palette if name == job.draw else DRAWS[name].palette,
            }
            for name in value_names(job)
        ],
        "counting": counting_digest(job, *job.cells),
    }


def _made(job: TileSet, finder: FateFinder, index: PlaneIndex) -> Made:
    shares = tile_shares(job, index.class_totals())
    record = certificate(
        "tile set", job.name, normalised(job), index.counts_digest(), shares, record_of(finder)
    )
    remarks = remarks_on_fates(job.name, shares) if "escaped" in shares else ()
    return Made(finder.columns * finder.rows, record, tuple(remarks))


def tile_shares(job: TileSet, totals: Mapping[int, int]) -> dict[str, float | int]:
    """Return the shares of pixels that a certificate names, as the classes of a complete index tell them.

    How many orbits were run again is not among them: a run that goes on from finished tiles does not know.
    """
    if job.draw == "attractors":
        return {"without_attractor": totals.get(CLASS_NONE, 0) / sum(totals.values())}
    if job.draw == "period":
        return {"without_cycle": totals.get(CLASS_NONE, 0) / sum(totals.values())}
    shares = Tally(dict(totals)).shares()
    return {name: shares[name] for name in ("escaped", "extinct", "unsettled")}
