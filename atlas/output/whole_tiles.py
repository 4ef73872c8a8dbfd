"""Tile sets of views that are computed as a whole: phase portraits, followed attractors, basin charts.

Their numbers stand in memory at the deepest level pair before the first tile is built, so that the memory
budget bounds their depth; a run that was interrupted computes them again, but builds only the tiles that are
missing.
"""

from __future__ import annotations

import os
from collections.abc import Mapping
from functools import partial
from typing import Any

import numpy as np
from numpy.typing import NDArray

from atlas.attractors.basins import Basins, chart_basins
from atlas.config.digests import counting_digest, normalised
from atlas.config.jobs import TileSet
from atlas.errors import PlanRefused
from atlas.orbits.counting import counter_of, portrait_of, resolved, resolved_portrait
from atlas.orbits.follow import count_followed
from atlas.orbits.orbit import OrbitCounter
from atlas.orbits.portrait import Portrait, PortraitCounter
from atlas.orbits.portrait_counts import count_portrait
from atlas.orbits.portrait_dataset import sampled_of
from atlas.orbits.schedule import Schedule
from atlas.output.certificate import certificate
from atlas.output.colouring import key_caption
from atlas.output.panels.basin import attractor_record, kind_of, told
from atlas.output.panels.histogram import sampled_of as columns_sampled
from atlas.output.panels.plane import record_of
from atlas.output.panels.portrait import KEY_CAPTION, ROOMS
from atlas.output.printing import Made
from atlas.output.remarks import remarks_on, remarks_on_basins, remarks_on_portrait
from atlas.output.reporter import PREPARING, Reporter
from atlas.output.tiled import Places, colours_of, header_of, make_site, tile_columns
from atlas.output.tileset import build_tile_set
from atlas.planes.fates import CLASS_NAMES
from atlas.planes.searching import finder_of
from tiles.grid import TILE, Address
from tiles.index import Index
from tiles.plane import PlaneTile
from tiles.plane_build import build_planes
from tiles.plane_index import PlaneIndex
from tiles.store import written
from tiles.strip import Strip

BYTES_PER_CELL = {"portrait": 4 + 8 * ROOMS, "follow": 4, "basin": 7}
"""What is alive at the peak: counts and the rooms they were counted in; counts; classes with their keys."""
MOST_LISTED = 64


def portrait_counter(job: TileSet) -> PortraitCounter:
    """Return the counter of the deepest level pair of a phase portrait."""
    return portrait_of(job, *job.cells)


def follow_counter(job: TileSet) -> OrbitCounter:
    """Return the counter of the deepest level pair of a followed attractor.

    Raises
    ------
    PlanRefused
        For both sweeps at once: a tile set has one density.
    """
    if job.follow == "both":
        raise PlanRefused(
            f"{job.name}: a tile set follows one sweep; make one set with follow: up and another with down"
        )
    return counter_of(job, *job.cells)


def make_portrait_tiles(
    job: TileSet, places: Places, opened: Schedule, reporter: Reporter, at_once: int | None = None
) -> Made:
    """Count a phase portrait, build its index and its static folder."""
    reporter.begin(job.name, PREPARING, 0)
    counter = resolved_portrait(job, portrait_counter(job), opened)
    counter.warm()
    reporter.begin(job.name, "counting", counter.exposure)
    portrait = count_portrait(counter, opened, reporter.advance, at_once=ROOMS)
    shares = portrait.shares()
    record = certificate(
        "tile set", job.name, normalised(job), portrait.digest(), shares, sampled_of(counter, portrait)
    )
    header = {
        **header_of(job),
        "caption": KEY_CAPTION,
        "lines": False,
        "counting": counting_digest(job, *job.cells, samples=portrait.samples),
    }
    source = partial(_portrait_strip, portrait)
    _build(job, places, source, header, record, opened, reporter, at_once)
    return Made(portrait.totals["exposure"], record, tuple(remarks_on_portrait(job.name, shares)))


def _portrait_strip(portrait: Portrait, first: int, last: int) -> Strip:
    """Return some columns of a portrait: each had all samples, and what lies elsewhere lies above it."""
    counts = portrait.counts[first:last]
    exposure = np.full(last - first, portrait.totals["exposure"], np.uint64)
    none = np.zeros(last - first, np.uint64)
    elsewhere = exposure - counts.sum(axis=1, dtype=np.uint64)
    return Strip(first, counts, exposure, none, elsewhere, none, none, none)


def make_follow_tiles(
    job: TileSet, places: Places, opened: Schedule, reporter: Reporter, at_once: int | None = None
) -> Made:
    """Follow an attractor along the whole view, build its index and its static folder."""
    reporter.begin(job.name, PREPARING, 0)
    counter = resolved(job, follow_counter(job), opened)
    counter.warm()
    total = counter.columns * counter.exposure
    reporter.begin(job.name, "following", total)
    assert job.follow is not None
    sweep = count_followed(counter, job.follow, opened, reporter.advance)[job.follow]
    shares = sweep.shares()
    sampled = columns_sampled(counter, sweep).record()
    record = certificate("tile set", job.name, normalised(job), sweep.digest(), shares, sampled)
    header = {
        **header_of(job),
        "caption": key_caption(job.up, job.family.label_and_unit(job.up.name)[1]),
        "lines": True,
        "counting": counting_digest(job, *job.cells, samples=counter.rules.samples),
    }
    _build(job, places, partial(_part, sweep.strip), header, record, opened, reporter, at_once)
    return Made(total, record, tuple(remarks_on(job.name, shares)))


def _part(whole: Strip, first: int, last: int) -> Strip:
    at = slice(first, last)
    return Strip(
        first,
        whole.counts[at],
        whole.exposure[at],
        whole.below[at],
        whole.above[at],
        whole.escaped[at],
        whole.unsettled[at],
        whole.collapsed[at],
    )


def _build(
    job: TileSet,
    places: Places,
    source: Any,
    header: Mapping[str, Any],
    record: Mapping[str, Any],
    opened: Schedule,
    reporter: Reporter,
    at_once: int | None,
) -> None:
    def certified(_: Index) -> Mapping[str, Any]:
        return record

    reporter.begin(job.name, "building", 0)
    build_tile_set(job, places, source, header, certified, opened, reporter, at_once)


def make_basin_tiles(
    job: TileSet, places: Places, opened: Schedule, reporter: Reporter, at_once: int | None = None
) -> Made:
    """Find the attractors of a plane of starts, build its index and its static folder."""
    reporter.begin(job.name, PREPARING, 0)
    finder = finder_of(job, *job.cells)
    finder.warm()
    starts = finder.columns * finder.rows
    reporter.begin(job.name, "finding basins", starts)
    basins = chart_basins(finder, opened, reporter.advance)
    shares, sampled = basins.shares(), record_of(finder)
    sampled["attractors"] = [attractor_record(one) for one in basins.attractors[:MOST_LISTED]]
    record = certificate("tile set", job.name, normalised(job), basins.digest(), shares, sampled)
    reporter.begin(job.name, "building", 0)
    build_planes(
        places.growing_index,
        job.view,
        across_level=job.levels.across,
        up_level=job.levels.up,
        pairs=job.pairs,
        source=partial(_basin_tile, basins.classes),
        header={
            **header_of(job),
            "class_layer": "basin",
            "class_label": "attractor",
            "class_names": _basin_names(basins),
            "value_layers": [],
            "counting": counting_digest(job, *job.cells),
        },
        run=partial(opened.run, at_once=at_once),
        unfinished=places.growing_index,
        finish=lambda index: _certify(index, record),
    )
    reporter.begin(job.name, "tiles", tile_columns(places.growing_index))
    make_site(places.growing_index, places.site, colours_of(job), opened, reporter, places.growing_site)
    with written(places.index):
        os.replace(places.growing_index, places.index)
    return Made(starts, record, tuple(remarks_on_basins(job.name, shares, told(basins))))


def _certify(index: PlaneIndex, record: Mapping[str, Any]) -> None:
    index.put_certificate(record)


def _basin_tile(classes: NDArray[np.uint16], address: Address) -> PlaneTile:
    left, low = address.column * TILE, address.row * TILE
    return PlaneTile(np.ascontiguousarray(classes[left : left + TILE, low : low + TILE]), {})


def _basin_names(basins: Basins) -> dict[str, str]:
    names = {str(number): name for number, name in CLASS_NAMES.items() if number >= 60_000}
    names |= {str(one.number): f"{one.number}: {kind_of(one)}" for one in basins.attractors}
    if basins.further:
        names[str(len(basins.attractors) + 1)] = f"{basins.further} further"
    return names | {"period": "attractor {}"}
