"""Building the index of planes: the deepest level pair from a source of tiles, coarser ones from finer."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterable, Mapping
from functools import partial
from pathlib import Path
from typing import Any

from tiles.grid import Address, Pair, level_pairs
from tiles.plane import PlaneSums, PlaneTile, gathered, next_finer
from tiles.plane_index import PlaneIndex, encode_plane, missing
from tiles.store import Readers, written
from tiles.tasks import Run, serially
from tiles.unfinished import continued, geometry
from tiles.window import View

Source = Callable[[Address], PlaneTile]


def build_planes(
    path: Path,
    view: View,
    *,
    across_level: int,
    up_level: int,
    pairs: str | Iterable[Pair],
    source: Source,
    header: Mapping[str, Any],
    run: Run = serially,
    unfinished: Path | None = None,
    finish: Callable[[PlaneIndex], None] | None = None,
) -> None:
    """Build the index of a tile set of planes; it appears under its name when it is complete.

    The contents do not depend on the scheduler nor on interruptions: a second call with the same arguments
    goes on from the tiles that the first one had finished. A task holds one tile of the source and what it
    compresses to, or the tiles that a coarser one is gathered from, at most four a level.

    Parameters
    ----------
    path : Path
        The index. One that is there already is replaced at the end.
    view : View
        What is cut into tiles.
    across_level, up_level : int
        The deepest levels: 256 * 2**level pixels along each axis.
    pairs : {"diagonal", "all"} or iterable of (int, int)
        Which level pairs are built, see :func:`tiles.grid.level_pairs`.
    source : callable
        Returns the :class:`tiles.plane.PlaneTile` of an address of the deepest pair. It is called in the
        threads of ``run``, once a tile.
    header : mapping
        JSON-able; kept in the index, see INDEX.md: ``kind``, ``class_layer``, ``class_names`` and
        ``value_layers`` and what else the writer knows. An unfinished index with another header is not
        continued.
    run : callable
        Scheduler of the tasks, one a tile; each stores its tile.
    unfinished : Path, optional
        Where the index grows, in a folder of the same file system; default ``.parts/`` beside ``path``.
    finish : callable, optional
        Gets the complete index before it appears, to store fits and a certificate.

    Raises
    ------
    OutputFailed
        When the disk is full or the folder is closed.
    AssertionError
        When the source returns other layers than the header names, or arrays of another shape or type.
    """
    chosen = level_pairs(across_level, up_level, pairs)
    unfinished = path.parent / ".parts" / path.name if unfinished is None else unfinished
    stored = {**header, **geometry(view, chosen), "kind": "plane"}
    with written(unfinished):
        unfinished.parent.mkdir(parents=True, exist_ok=True)
        path.parent.mkdir(parents=True, exist_ok=True)
    with continued(PlaneIndex, unfinished, stored) as index:
        names = {str(layer["name"]) for layer in index.value_layers}
        for pair in reversed(chosen):
            if pair == chosen[-1]:
                _run_pair(index, run, pair, partial(_from_source, source, names))
            else:
                leaf = _leaf(pair, chosen)
                with Readers(PlaneIndex, unfinished, finished=False) as readers:
                    _run_pair(index, run, pair, partial(_from_finer, readers, leaf, chosen[-1]))
        with written(unfinished):
            if finish is not None:
                finish(index)
            index.finish()
    with written(path):
        os.replace(unfinished, path)


def _run_pair(index: PlaneIndex, run: Run, pair: Pair, made: Callable[[Address], PlaneSums]) -> None:
    tasks = (partial(_store, index, made, address) for address in missing(index, pair))
    run(tasks, lambda _: None)


def _store(index: PlaneIndex, made: Callable[[Address], PlaneSums], address: Address) -> None:
    """Make and store a tile: here and not by the caller of the scheduler, so that it is safe at once."""
    tile = encode_plane(made(address))
    with written(index.path), index.transaction():
        index.put_plane(address, tile)


def _from_source(source: Source, names: set[str], address: Address) -> PlaneSums:
    tile = source(address)
    if set(tile.values) != names:
        raise AssertionError(
            f"the source returned the layers {sorted(tile.values)}; the header names {sorted(names)}"
        )
    return PlaneSums.of(tile)


def _from_finer(readers: Readers[PlaneIndex], leaf: Pair, deepest: Pair, address: Address) -> PlaneSums:
    with readers.one() as index:
        return gathered(address, leaf, deepest, index.plane)


def _leaf(pair: Pair, chosen: tuple[Pair, ...]) -> Pair:
    """Return the first built pair on the way to the deepest one."""
    finer = next_finer(pair, chosen[-1])
    while finer not in chosen:
        finer = next_finer(finer, chosen[-1])
    return finer
