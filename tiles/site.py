"""The static folder of a tile set: a picture of every tile that is not empty, the page, its description."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from functools import partial
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from tiles import png, site_folder
from tiles.errors import IndexRefused
from tiles.grid import TILE, Address, Pair
from tiles.index import Index
from tiles.meta import LAYER, meta, runs_where, script
from tiles.page_files import page_files
from tiles.plane_site import fill_planes
from tiles.pyramid import Counts
from tiles.shading import Fit, colour_table, shade_counts
from tiles.store import Readers, intact, written
from tiles.strip import PER_COLUMN
from tiles.tasks import Run, serially

DENSITY_PALETTE = "blue"
_SHORTEST_TABLE, _LONGEST_TABLE = 1 << 16, 1 << 20


def build_site(
    index_path: Path,
    out_dir: Path,
    *,
    shading: str = "equalised",
    palette: str | None = None,
    background: str | None = None,
    missing: str | None = None,
    run: Run = serially,
    unfinished: Path | None = None,
) -> None:
    """Write the folder of a finished index: ``index.html`` opens from any host, or from the disk.

    The folder appears under its name when it is complete; one that is there already is replaced then. A
    second call with the same arguments goes on from the tile columns that an interrupted one had finished.

    Parameters
    ----------
    index_path : Path
    out_dir : Path
        The folder.
    shading : str
        Its fit is taken from the index, or fitted to the middle level pair. Of planes, that of sequential
        values.
    palette, background, missing : str
        See :func:`tiles.shading.colour_table`; the default palette is ``blue``. Of planes, the palette of
        those layers of values whose kind it fits; the others keep their own, and classes have one palette
        always.
    run : callable
        Scheduler of the tasks; each writes one tile column of a level pair.
    unfinished : Path, optional
        Where the folder grows, on the same file system; default ``.parts/`` beside ``out_dir``.

    Raises
    ------
    IndexRefused
        When there is no finished index.
    OutputFailed
        When the disk is full or the folder is closed.
    """
    site = out_dir.parent / ".parts" / out_dir.name if unfinished is None else unfinished
    with intact(index_path), Index.open(index_path) as index:
        planes = index.header.get("kind") == "plane"
    if planes:
        fill_planes(index_path, site, shading=shading, chosen=palette, background=background, run=run)
    else:
        colours = {
            "shading": shading,
            "palette": palette or DENSITY_PALETTE,
            "background": background,
            "missing": missing,
        }
        _fill(index_path, site, shading, colours, run)
    with written(out_dir):
        site_folder.name(site, out_dir)


def _fill(index_path: Path, site: Path, shading: str, colours: dict[str, Any], run: Run) -> None:
    """Fill an unfinished folder of a tile set of densities."""
    table = colour_table(
        colours["palette"], background=colours["background"], missing=colours["missing"], shading=shading
    )
    with intact(index_path), Index.open(index_path) as index:
        fit = index.fit(shading) or index.fit_from(shading=shading)
        present = {pair: index.present(pair) for pair in index.pairs}
        shades = {up: Shades(fit, index.view.up.cell_size(TILE << up)) for _, up in index.pairs}
        made_from = {"counts": index.counts_digest(), "fit": fit.to_json(), "table": table.tolist()}
        with written(site):
            site_folder.begin(site, made_from)
            _write_page(site, index, present, fit, table, colours)
    with Readers(Index, index_path) as readers:
        tasks = (
            partial(_write_column, readers, site, shades[pair[1]], table, pair, column)
            for pair, columns in present.items()
            for column in columns
        )
        run(tasks, lambda _: None)


def pixels(index: Index, fit: Fit, table: NDArray[np.uint8], address: Address) -> NDArray[np.uint8]:
    """Return the picture of a tile.

    Returns
    -------
    ndarray of uint8, shape (256, 256, 3)
        Red, green and blue; line 0 is the top, that is the highest row of cells. All background where the
        tile is empty.
    """
    shades = Shades(fit, index.view.up.cell_size(TILE << address.up_level))
    return np.take(table, shades.lines(index, address), axis=0)


@dataclass
class Shades:
    """Shades tiles of one up level, by a table look-up where all columns of a tile had the same exposure.

    Attributes
    ----------
    fit : Fit
    cell_height : float
        Of the up level, in units of the axis.
    """

    fit: Fit
    cell_height: float
    _tables: dict[int, NDArray[np.uint8]] = field(default_factory=dict)

    def lines(self, index: Index, address: Address) -> NDArray[np.uint8]:
        """Return the palette indices of a tile, shape (256, 256), line 0 at the top; 0 where it is empty."""
        counts = index.get_narrow(address)
        if counts is None:
            return np.zeros((TILE, TILE), np.uint8)
        return self.of_columns(_exposure(index, address.across_level, address.column))(counts).T[::-1]

    def of_columns(self, exposure: NDArray[np.uint64]) -> Callable[[Counts], NDArray[np.uint8]]:
        """Return a function of counts, shape (256, 256), whose columns had a given exposure.

        It returns ``tiles.shading.shade_counts(counts, exposure, cell_height, fit)``.
        """
        table = self._table(int(exposure[0])) if exposure.min() == exposure.max() else None
        if table is not None:
            return partial(_look_up, table)
        return partial(shade_counts, exposure=exposure, cell_height=self.cell_height, fit=self.fit)

    def _table(self, exposure: int) -> NDArray[np.uint8] | None:
        """Return the shades of the counts from 0 to one that has the highest shade; None if that is far."""
        top = float(self.fit.thresholds[-1]) * exposure * self.cell_height
        if top > _LONGEST_TABLE:
            return None
        if exposure not in self._tables:
            counts = np.arange(max(int(top) + 3, _SHORTEST_TABLE), dtype=np.uint32)[None]
            self._tables[exposure] = shade_counts(counts, [exposure], self.cell_height, self.fit)[0]
        return self._tables[exposure]


def _look_up(table: NDArray[np.uint8], counts: Counts) -> NDArray[np.uint8]:
    if counts.dtype.itemsize > 2:
        counts = np.minimum(counts, np.uint32(table.size - 1)).astype(np.intp)
    return np.take(table, counts)


def _write_column(
    readers: Readers[Index],
    site: Path,
    shades: Shades,
    table: NDArray[np.uint8],
    pair: Pair,
    column: int,
) -> None:
    """Write the pictures of one tile column; their folder gets its name when all are there."""
    folder = site / "tiles" / LAYER / str(pair[0]) / str(pair[1]) / str(column)
    if folder.is_dir():
        return
    growing = folder.with_name(f".{column}")
    with readers.one() as index, written(site):
        growing.mkdir(parents=True, exist_ok=True)
        shade = shades.of_columns(_exposure(index, pair[0], column))
        for row, counts in index.tiles_of_column(pair, column):
            picture = png.encode(shade(counts).T[::-1], table)
            with open(f"{growing}/{row}.png", "wb") as file:
                file.write(picture)
        growing.rename(folder)


def _exposure(index: Index, across_level: int, column: int) -> NDArray[np.uint64]:
    numbers = index.column_numbers(across_level, column)
    if numbers is None:
        raise IndexRefused(
            f"{index.path}: tile column {column} at level {across_level} is missing; build it again"
        )
    exposure: NDArray[np.uint64] = numbers[PER_COLUMN.index("exposure")]
    return exposure


def _write_page(
    site: Path,
    index: Index,
    present: dict[Pair, Any],
    fit: Fit,
    table: NDArray[np.uint8],
    colours: dict[str, Any],
) -> None:
    """Write the page and its description, whose plate has the colours of this folder."""
    for name, content in page_files().items():
        (site / name).write_bytes(content)
    level = index.pairs[-1][0]
    marks = level, runs_where(_unsettled(index, level))
    plate = {**(index.header.get("plate") or {}), **colours}
    header = {**index.header, "plate": {key: value for key, value in plate.items() if value is not None}}
    found = meta(header, index.view, present, fit, table, marks=marks, certificate=index.certificate)
    (site / "meta.js").write_text(script(found), "ascii")


def _unsettled(index: Index, level: int) -> Iterator[tuple[int, NDArray[np.bool_]]]:
    for column, numbers in index.built_columns(level):
        yield column * TILE, numbers[PER_COLUMN.index("unsettled")] > 0
