"""Which tile sets are made in which way."""

from __future__ import annotations

from collections.abc import Callable

from atlas.config.draws import KINDS
from atlas.config.jobs import TileSet
from atlas.errors import PlanRefused
from atlas.orbits.schedule import Schedule
from atlas.output.plane_tiles import make_plane_tiles
from atlas.output.printing import Made
from atlas.output.reporter import Reporter
from atlas.output.tiled import Places
from atlas.output.tileset import make_tile_set

TileSetMaker = Callable[[TileSet, Places, Schedule, Reporter, int | None], Made]
TILE_SET_MAKERS: dict[str, TileSetMaker] = {"histogram": make_tile_set, "plane": make_plane_tiles}


def tile_set_maker(job: TileSet) -> TileSetMaker:
    """Return what makes a tile set.

    Raises
    ------
    PlanRefused
        When tile sets of its kind are not made.
    """
    if job.kind not in TILE_SET_MAKERS:
        raise PlanRefused(f"{job.name}: {KINDS[job.kind]} cannot be a tile set yet; draw it as a plate")
    return TILE_SET_MAKERS[job.kind]
