"""Which tile sets are made in which way, and what each needs."""

from __future__ import annotations

from collections.abc import Callable

from atlas.config.jobs import TileSet
from atlas.errors import PlanRefused
from atlas.orbits.schedule import Schedule
from atlas.output.panels.basin import basin_seconds
from atlas.output.panels.histogram import counting_seconds
from atlas.output.panels.plane import finding_seconds
from atlas.output.panels.portrait import portrait_seconds
from atlas.output.plane_tiles import make_plane_tiles, plane_finder
from atlas.output.printing import Made
from atlas.output.reporter import Reporter
from atlas.output.tiled import Places
from atlas.output.tileset import make_tile_set, tile_counter
from atlas.output.whole_tiles import (
    follow_counter,
    make_basin_tiles,
    make_follow_tiles,
    make_portrait_tiles,
    portrait_counter,
)

TileSetMaker = Callable[[TileSet, Places, Schedule, Reporter, int | None], Made]
TILE_SET_MAKERS: dict[str, TileSetMaker] = {
    "histogram": make_tile_set,
    "follow": make_follow_tiles,
    "portrait": make_portrait_tiles,
    "plane": make_plane_tiles,
    "basin": make_basin_tiles,
}


def samples_of(job: TileSet) -> int:
    """Return the samples or pixels of a tile set, at least; refuses what cannot be computed."""
    if job.by_attractor:
        raise PlanRefused(
            f"{job.name}: a density split by attractor cannot be a tile set; draw it as a plate"
        )
    if job.kind in ("plane", "basin"):
        finder = plane_finder(job)
        return finder.columns * finder.rows
    if job.kind == "portrait":
        return portrait_counter(job).exposure
    counter = follow_counter(job) if job.kind == "follow" else tile_counter(job)
    return counter.columns * counter.exposure


def seconds_of(job: TileSet) -> float:
    """Return the estimated time of one core for the numbers of a tile set."""
    if job.kind in ("plane", "basin"):
        finder = plane_finder(job)
        return basin_seconds(finder) if job.kind == "basin" else finding_seconds(finder)
    if job.kind == "portrait":
        return portrait_seconds(portrait_counter(job))
    return counting_seconds(follow_counter(job) if job.kind == "follow" else tile_counter(job))
