"""What an output will need, said before any work: pixels, samples, time, memory.

The rates are those of one core of a 2.6 GHz server; an estimate of time is an estimate. The memory terms are
the arrays that are alive at the peak, over what the libraries take by themselves.
"""

from __future__ import annotations

from dataclasses import replace

from atlas.config.draws import PLANES
from atlas.config.jobs import Figure, Plate, TileSet
from atlas.orbits.histogram import block_width
from atlas.output.panels.plane import KERNELS_MEMORY
from atlas.output.plane_tiles import BYTES_PER_PLANE_TILE
from atlas.output.printing import maker_of, sheet_of
from atlas.output.tile_makers import samples_of, seconds_of
from atlas.output.tileset import CELLS_PER_STRIP, tile_counter
from atlas.output.whole_tiles import BYTES_PER_CELL
from atlas.plan import BASE_MEMORY, DEFAULT_MEMORY, Need
from tiles.column import strip_width
from tiles.grid import TILE, level_pairs

SECONDS_PER_PIXEL = {"png": 1.2e-8, "tiff": 3.5e-8, "pdf": 1.5e-8, "svg": 1.2e-8}
SECONDS_PER_TILE, SECONDS_PER_PLANE_TILE = 1.5e-3, 1.5e-2
OCCUPIED_TILES = 0.5
BYTES_PER_CELL_OF_DIAGONAL, BYTES_PER_CELL_OF_ALL_PAIRS, MOST_CELLS_WAITING = 0.5, 2.0, 1 << 24
BYTES_PER_PIECE, BYTES_PER_EDGE = 60, 16
"""Measured: what a task keeps of a tile column, above all its coarser halves (deep columns are mostly empty);
the list of pieces where strips are narrower than a tile; the edges of cells."""


def room_of(record: Plate | Figure | TileSet, workers: int, budget: int = DEFAULT_MEMORY) -> Need:
    """Return what an output needs, except the time, for which its formulas would have to be read closely.

    With ``samples: auto`` the samples are those of a view that holds the whole attractor; a zoom into a part
    of it takes more.

    Parameters
    ----------
    record : Plate, Figure or TileSet
    workers : int
        Threads that count side by side.
    budget : int
        Memory in bytes; where it is short, fewer columns of a tile set are built at once.

    Raises
    ------
    Refusal
        When the output cannot be laid out or counted at all.
    """
    if isinstance(record, TileSet):
        return _room_of_tile_set(record, workers, budget)
    sheet = sheet_of(record)
    samples = sum(maker_of(view.plate).room(view).samples for view in sheet.views)
    return Need(record.pixels, samples, 0.0, sheet.memory(workers))


def need_of(record: Plate | Figure | TileSet, workers: int, budget: int = DEFAULT_MEMORY) -> Need:
    """Return what an output needs: what :func:`room_of` says, and the time."""
    room = room_of(record, workers, budget)
    if isinstance(record, TileSet):
        pairs = level_pairs(record.levels.across, record.levels.up, record.pairs)
        tiles = sum(2 ** (across + up) for across, up in pairs)
        each = SECONDS_PER_PLANE_TILE if record.kind in PLANES else OCCUPIED_TILES * SECONDS_PER_TILE
        seconds = seconds_of(record) + tiles * each
        return replace(room, seconds=seconds / builders(record, workers, budget))
    width, height = record.pixels
    seconds = sum(maker_of(view.plate).seconds(view) for view in sheet_of(record).views) / workers
    seconds += sum(SECONDS_PER_PIXEL[form] for form in record.formats) * width * height
    return replace(room, seconds=seconds)


def _room_of_tile_set(record: TileSet, workers: int, budget: int) -> Need:
    samples = samples_of(record)
    memory = _fixed_memory(record) + builders(record, workers, budget) * _task_memory(record)
    return Need(record.cells, samples, 0.0, memory)


def builders(record: TileSet, workers: int, budget: int) -> int:
    """Return how many tasks of a tile set are under way side by side within a memory budget, 1 at least."""
    room = (budget - _fixed_memory(record)) // _task_memory(record)
    tasks = record.levels.across + (record.levels.up if record.kind in PLANES else 0)
    return max(1, min(workers, room, 1 << tasks))


def _fixed_memory(record: TileSet) -> int:
    columns, rows = record.cells
    edges = columns + rows if record.kind in PLANES else rows
    kernels = KERNELS_MEMORY if record.kind in PLANES else 0
    return (
        BASE_MEMORY + kernels + BYTES_PER_EDGE * edges + BYTES_PER_CELL.get(record.kind, 0) * columns * rows
    )


def _task_memory(record: TileSet) -> int:
    return BYTES_PER_PLANE_TILE if record.kind in PLANES else _column_memory_of(record)


def building_memory(rows: int, workers: int) -> int:
    """Return the estimated peak memory of the process in bytes while a tile set is built from other counts.

    Parameters
    ----------
    rows : int
        Cells along the up axis at the deepest level.
    workers : int
        Tile columns that are built side by side.
    """
    return BASE_MEMORY + workers * _column_memory(rows, 0, BYTES_PER_CELL_OF_ALL_PAIRS)


def _column_memory_of(record: TileSet) -> int:
    waiting = BYTES_PER_CELL_OF_DIAGONAL if record.pairs == "diagonal" else BYTES_PER_CELL_OF_ALL_PAIRS
    rows = record.cells[1]
    block = block_width(tile_counter(record)) if record.kind == "histogram" else 0
    return _column_memory(rows, block, waiting)


def _column_memory(rows: int, block: int, waiting: float) -> int:
    """Return the memory of a tile column: its strip, the counts of a block, what waits to be stored."""
    strip = strip_width(CELLS_PER_STRIP, rows)
    pieces = rows // strip if strip < TILE else 0
    kept = int(waiting * min(TILE * rows, MOST_CELLS_WAITING)) + BYTES_PER_PIECE * pieces
    return 4 * rows * (strip + min(strip, block) + 1) + kept
