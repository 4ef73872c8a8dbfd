"""Tile sets of points: sorted on disk by tile column, then built strip by strip as those of orbits are."""

from __future__ import annotations

import contextlib
import json
from collections.abc import Mapping
from hashlib import blake2b
from pathlib import Path
from typing import Any

from atlas.config.jobs import COUNTING_VERSION
from atlas.orbits.schedule import default_workers, schedule
from atlas.output.folders import check_files, check_folder, check_site
from atlas.output.forecast import building_memory
from atlas.output.reporter import Reporter, Silence
from atlas.output.tiled import Places
from atlas.output.tileset import build_tile_set
from atlas.plan import check_fits, parse_memory
from atlas.points.cells import Grid
from atlas.points.counting import Reading
from atlas.points.intervals import AskedAxis, AxisGiven, view_of
from atlas.points.jobs import TILE_SET_OPTIONS, PointsTileSet, caption, name_of, options_of, settings_of
from atlas.points.opening import table_of
from atlas.points.record import Binned, binned, points_config
from atlas.points.spool import Spool
from atlas.points.tables import ROWS_PER_CHUNK
from atlas.reading.place import REQUEST, Place
from atlas.reading.view_kinds import Levels
from tiles.index import Index

READING_MEMORY = 64 << 20
DEEPEST, DEEPEST_SUM = 14, 22
BYTES_PER_EDGE = 16


def tile_points(
    points: Any,
    across: AxisGiven,
    up: AxisGiven,
    out: Path | str,
    *,
    name: str | None = None,
    workers: int | None = None,
    memory: str | int | None = None,
    reporter: Reporter | None = None,
    place: Place = REQUEST,
    **options: Any,
) -> Binned:
    """Make a zoomable tile set of measured or simulated points.

    The points are read once, sorted into a nameless file of 8 bytes a point under ``OUT/.parts``, and counted
    from there. A run that was interrupted is continued where the points and the request are the same.

    Parameters
    ----------
    points : path, DataFrame, mapping of arrays, structured array or iterable of such chunks
        As for `atlas.bin_points`.
    across, up : Axis, column, (column, low, high) or mapping
        The axes; open ends are those of the points.
    out : path
        The folder in which NAME/index.sqlite and NAME/site appear.
    name : str, optional
        Of the tile set; by default that of the file of points.
    workers : int, optional
        Threads; the result does not depend on them.
    memory : str or int, optional
        Budget of the process, ``"2GiB"`` by default.
    reporter : Reporter, optional
        Hears of the progress.
    place : Place
        How a refusal calls the parts.
    **options
        Keys of a tile set in a config that say how it looks: levels, pairs, shading, palette, background,
        missing, title; None means not given.

    Returns
    -------
    Binned
        The certificate, and a sentence about points that no cell holds.

    Raises
    ------
    Refusal
        When the request is wrong; nothing is written then.
    OutputFailed
        When the disk is full or the folder is closed.
    """
    reporter = reporter or Silence()
    workers = workers or default_workers()
    asked = AskedAxis.read(across, place.at("across")), AskedAxis.read(up, place.at("up"))
    chosen = options_of(TILE_SET_OPTIONS, options, place)
    _check_levels(chosen["levels"], place)
    table = table_of(points)
    name = name_of(name, table, place)
    places = Places.of(Path(out), name)
    _check_memory(name, chosen["levels"], workers, parse_memory(memory))
    reporter.begin(name, "looking at the points", 0)
    job = PointsTileSet(name=name, view=view_of(table, *asked, ROWS_PER_CHUNK, place), **chosen)
    grid = Grid.of(job.view, *job.cells)
    check_folder(Path(out))
    check_files([places.index])
    check_site(places.site)
    check_folder(places.index.parent)
    check_folder(places.growing_index.parent)
    reading = Reading(table, grid, ROWS_PER_CHUNK, reporter)
    made: list[Binned] = []

    def certified(index: Index) -> Mapping[str, Any]:
        made.append(binned(name, settings_of(job), reading, index.counts_digest()))
        return made[0].record

    with Spool(places.growing_index.parent, *job.cells) as spool, schedule(workers) as opened:
        reporter.begin(name, "reading", table.rows())
        for columns, codes in reading.placed():
            spool.add(columns, codes)
        reporter.begin(name, "counting", 0)
        build_tile_set(job, places, spool.source, _header(job, reading), certified, opened, reporter)
    with contextlib.suppress(OSError):
        places.growing_index.parent.rmdir()  # kept as long as other unfinished parts live there
    return made[0]


def _check_levels(levels: Levels, place: Place) -> None:
    if max(levels) > DEEPEST or sum(levels) > DEEPEST_SUM:
        raise place.at("levels").refusal(
            f"{levels.across} across and {levels.up} up are too deep for points; each may be {DEEPEST} "
            f"at most and both together {DEEPEST_SUM}"
        )


def _check_memory(name: str, levels: Levels, workers: int, budget: int) -> None:
    columns, rows = 256 << levels.across, 256 << levels.up
    needed = READING_MEMORY + building_memory(rows, workers) + BYTES_PER_EDGE * (columns + rows)
    check_fits(name, (columns, rows), needed, budget)


def _header(job: PointsTileSet, reading: Reading) -> dict[str, Any]:
    """Return the header of the index; ``counting`` tells one set of counts from another."""
    view, table = job.view, reading.table
    settings = {
        key: value
        for key, value in settings_of(job).items()
        if key not in ("across", "up", "levels", "pairs", "title") and value is not None
    }
    decisive = {
        "points": points_config(job.name, {}, reading)["points"],
        "view": [[axis.name, str(axis.low), str(axis.high), axis.scale] for axis in (view.across, view.up)],
        "resolution": list(job.cells),
        "counting": COUNTING_VERSION,
    }
    text = json.dumps(decisive, sort_keys=True)
    number = f"{reading.account.points} points"
    return {
        "title": job.title or f"{view.up.name} across {view.across.name}",
        "family": "",
        "formula": [],
        "note": f"{number} of {table.file}" if table.file else number,
        "units": {},
        "caption": caption(view.up),
        "plate": {"points": table.file or job.name, **settings},
        "counting": blake2b(text.encode("ascii"), digest_size=16).hexdigest(),
    }
