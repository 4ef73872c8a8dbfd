"""What an output will need, said before any work: pixels, samples, time, memory.

The rates are those of one core of a 2.6 GHz server; an estimate of time is an estimate. The memory terms are
the arrays that are alive at the peak, over what the libraries take by themselves.
"""

from __future__ import annotations

from atlas.config.jobs import Figure, Plate, TileSet
from atlas.orbits.orbit import OrbitCounter
from atlas.orbits.step import step_source
from atlas.output.printing import sheet_of
from atlas.output.tileset import CELLS_PER_STRIP, tile_counter
from atlas.plan import BASE_MEMORY, Need
from tiles.grid import TILE, level_pairs

SECONDS_PER_SAMPLE = 1.2e-9
SECONDS_PER_SLOW_CALL = 1.0e-9
SECONDS_PER_PIXEL = {"png": 3e-8, "tiff": 6e-8, "pdf": 4e-8, "svg": 4e-8}
SECONDS_PER_TILE = 4e-3
OCCUPIED_TILES = 0.5


def need_of(record: Plate | Figure | TileSet, workers: int) -> Need:
    """Return what an output needs.

    With ``samples: auto`` the samples are those of a view that holds the whole attractor; a zoom into a part
    of it takes more.

    Parameters
    ----------
    record : Plate, Figure or TileSet
    workers : int
        Threads that count side by side.

    Raises
    ------
    Refusal
        When the output cannot be laid out or counted at all.
    """
    if isinstance(record, TileSet):
        return _need_of_tile_set(record, workers)
    width, height = record.pixels
    sheet = sheet_of(record)
    samples, seconds = 0, 0.0
    for view in sheet.views:
        counter = view.counter()
        samples += counter.columns * counter.exposure
        seconds += _counting_seconds(counter) / workers
    seconds += sum(SECONDS_PER_PIXEL[form] for form in record.formats) * width * height
    return Need((width, height), samples, seconds, sheet.memory)


def _need_of_tile_set(record: TileSet, workers: int) -> Need:
    counter = tile_counter(record)
    tiles = sum(
        2 ** (across + up) for across, up in level_pairs(record.levels.across, record.levels.up, record.pairs)
    )
    seconds = _counting_seconds(counter) + OCCUPIED_TILES * tiles * SECONDS_PER_TILE
    memory = building_memory(counter.rows, workers)
    return Need(record.cells, counter.columns * counter.exposure, seconds / workers, memory)


def building_memory(rows: int, workers: int) -> int:
    """Return the estimated peak memory of the process in bytes while a tile set is built.

    Parameters
    ----------
    rows : int
        Cells along the up axis at the deepest level.
    workers : int
        Threads.
    """
    strip = 4 * max(CELLS_PER_STRIP, rows)
    return BASE_MEMORY + workers * (2 * strip + 8 * TILE * rows)


def _counting_seconds(counter: OrbitCounter) -> float:
    slow = step_source(counter.family).slow_calls
    orbits = counter.columns * counter.orbits_per_column
    each = 0.1e-9 + SECONDS_PER_SLOW_CALL * slow
    return orbits * (counter.rules.transient * each + counter.rules.samples * (SECONDS_PER_SAMPLE + each))
