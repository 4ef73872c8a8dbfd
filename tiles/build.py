"""Building an index: the deepest level pair from a source of counts, the coarser ones by adding cells."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterable, Iterator, Mapping
from contextlib import AbstractContextManager, contextmanager
from dataclasses import dataclass, field
from functools import partial
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from tiles.codec import Encoded, encode, narrow
from tiles.column import Column, Source, computed, strip_width
from tiles.errors import IndexRefused
from tiles.grid import TILE, Address, Pair, level_pairs
from tiles.index import Index
from tiles.pyramid import Counts, halve_across, join_across, pair_sums, tiles_of_column
from tiles.stages import Stage, stages
from tiles.store import Readers, written
from tiles.tasks import Run, serially
from tiles.unfinished import continued, geometry
from tiles.window import View

Leaf = Callable[[int], AbstractContextManager[Column]]


def build(
    path: Path,
    view: View,
    *,
    across_level: int,
    up_level: int,
    pairs: str | Iterable[Pair],
    source: Source,
    header: Mapping[str, Any],
    run: Run = serially,
    cells_per_strip: int = 1 << 24,
    unfinished: Path | None = None,
    finish: Callable[[Index], None] | None = None,
) -> None:
    """Build the index of a tile set; it appears under its name when it is complete.

    The result does not depend on the width of the strips, on the scheduler, nor on interruptions: a second
    call with the same arguments goes on from the tile columns that the first one had finished.

    Parameters
    ----------
    path : Path
        The index. One that is there already is replaced at the end.
    view : View
        What is cut into tiles.
    across_level, up_level : int
        The deepest levels: 256 * 2**level cells along each axis.
    pairs : {"diagonal", "all"} or iterable of (int, int)
        Which level pairs are built, see :func:`tiles.grid.level_pairs`.
    source : callable
        ``source(first, last)`` returns the :class:`tiles.strip.Strip` of columns ``first … last - 1`` at the
        deepest pair. It is called in the threads of ``run``.
    header : mapping
        JSON-able; kept in the index, see INDEX.md. An unfinished index with another header is not continued.
    run : callable
        Scheduler of the tasks. Each holds one strip and compressed tiles, and stores its tiles.
    cells_per_strip : int
        At most so many cells (of 4 bytes) are asked of the source at once, but at least one column.
    unfinished : Path, optional
        Where the index grows, in a folder of the same file system; default ``.parts/`` beside ``path``.
    finish : callable, optional
        Gets the complete index before it appears, to store fits and a certificate.

    Raises
    ------
    OutputFailed
        When the disk is full or the folder is closed.
    AssertionError
        When the source loses samples.
    """
    chosen = level_pairs(across_level, up_level, pairs)
    unfinished = path.parent / ".parts" / path.name if unfinished is None else unfinished
    stored = {**header, **geometry(view, chosen)}
    rows = TILE << up_level
    folder = unfinished.parent
    leaf = partial(computed, source, rows, strip_width(cells_per_strip, rows), folder)
    with written(unfinished):
        folder.mkdir(parents=True, exist_ok=True)
        path.parent.mkdir(parents=True, exist_ok=True)
    with continued(Index, unfinished, stored) as index:
        for stage in stages(chosen):
            if stage.first:
                _run_stage(stage, index, run, leaf)
            else:
                with Readers(Index, unfinished, finished=False) as readers:
                    _run_stage(stage, index, run, partial(_read, readers, stage.leaf))
        with written(unfinished):
            if finish is not None:
                finish(index)
            index.finish()
    with written(path):
        os.replace(unfinished, path)


@dataclass
class _Harvest:
    """What a task makes: encoded tiles and per-column numbers."""

    tiles: list[tuple[Address, Encoded]] = field(default_factory=list)
    columns: list[tuple[int, int, NDArray[np.uint64]]] = field(default_factory=list)


def _run_stage(stage: Stage, index: Index, run: Run, leaf: Leaf) -> None:
    built = {column for column, _ in index.built_columns(stage.top)}
    missing = (column for column in range(2**stage.top) if column not in built)
    run((partial(_build_column, stage, index, leaf, column) for column in missing), lambda _: None)


def _build_column(stage: Stage, index: Index, leaf: Leaf, column: int) -> None:
    """Build one tile column of the coarsest level of a stage, and store it with all finer ones in it.

    The tiles are stored here and not by the caller of the scheduler: what is finished is safe at once, and
    no results wait in memory.
    """
    harvest = _Harvest()
    _grow(stage, leaf, stage.top, column, harvest)
    with written(index.path), index.transaction():
        index.put_encoded(harvest.tiles)
        for level, at, numbers in harvest.columns:
            index.put_columns(level, at, numbers)


def _grow(
    stage: Stage, leaf: Leaf, level: int, column: int, harvest: _Harvest
) -> tuple[NDArray[np.uint64], dict[int, Counts]]:
    """Build a tile column and all finer ones in it; return its numbers and halved tiles for its parent."""
    if level == stage.leaf[0]:
        with leaf(column) as found:
            return found.numbers, _store(stage, level, column, stage.leaf[1], found, harvest)
    numbers, left = _grow(stage, leaf, level + 1, 2 * column, harvest)
    more_numbers, right = _grow(stage, leaf, level + 1, 2 * column + 1, harvest)
    joined = Column(
        np.concatenate([pair_sums(numbers), pair_sums(more_numbers)], axis=1),
        lambda row: join_across(left.pop(row, None), right.pop(row, None)),
    )
    return joined.numbers, _store(stage, level, column, stage.carried(level + 1), joined, harvest)


def _store(
    stage: Stage, level: int, column: int, deepest: int, found: Column, harvest: _Harvest
) -> dict[int, Counts]:
    """Encode the tiles of a column that the stage stores; return halves of those that it hands on."""
    ups = stage.ups.get(level, ())
    carried = stage.carried(level) if level > stage.top else None
    coarsest = min(up for up in (*ups, carried) if up is not None)
    halves: dict[int, Counts] = {}
    for up, row, counts in tiles_of_column(found.rows, deepest, coarsest):
        if up == carried and (half := narrow(halve_across(counts))) is not None:
            halves[row] = half
        if up in ups and (tile := encode(counts)) is not None:
            harvest.tiles.append((Address(level, up, column, row), tile))
    if ups:
        harvest.columns.append((level, column, found.numbers))
    return halves


@contextmanager
def _read(readers: Readers[Index], pair: Pair, column: int) -> Iterator[Column]:
    """Read a tile column that was stored before."""
    with readers.one() as index:
        numbers = index.column_numbers(pair[0], column)
        if numbers is None:
            raise IndexRefused(
                f"{index.path}: tile column {column} at level {pair[0]} is missing; build it again"
            )
        yield Column(numbers, lambda row: index.get(Address(*pair, column, row)))
