"""The pictures of a tile set of planes: a folder a layer, and side-car scripts with what they show."""

from __future__ import annotations

import shutil
from collections.abc import Mapping, Sequence
from functools import partial
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from tiles import png, site_folder
from tiles.classes import class_shades
from tiles.grid import Address, Pair
from tiles.meta import Runs, hexadecimal, script
from tiles.page_files import page_files
from tiles.palette import palette
from tiles.plane_index import PlaneIndex
from tiles.plane_meta import ValueLayer, plane_meta
from tiles.shading import colour_table
from tiles.side_car import side_car
from tiles.store import Readers, intact, written
from tiles.tasks import Run
from tiles.values import shade_values

CLASS_PALETTE = "kinds"
PALETTE_OF_KIND = {"sequential": "blue", "diverging": "balance", "cyclic": "wheel"}
SIDE_CARS = "values"


def fill_planes(
    index_path: Path, site: Path, *, shading: str, chosen: str | None, background: str | None, run: Run
) -> None:
    """Fill an unfinished folder with the page, its description, the pictures and the side-car scripts.

    Parameters
    ----------
    index_path : Path
    site : Path
        The unfinished folder.
    shading : str
        Of sequential values; the fits of others have none.
    chosen : str, optional
        Name of a palette, which the layers get whose kind it fits. The others get that of the header, or
        the usual one of their kind.
    background : str, optional
        Colour of cells without a value.
    run : callable
        Scheduler of the tasks; each writes one tile column of a level pair.
    """
    if chosen is not None:
        palette(chosen)  # an unknown name is refused, even where no layer has use for it
    with intact(index_path), PlaneIndex.open(index_path) as index:
        layers = value_layers(index, shading=shading, chosen=chosen, background=background)
        classes = colour_table(CLASS_PALETTE, background=background)
        present = {pair: index.present(pair) for pair in index.pairs}
        made_from = {
            "counts": index.counts_digest(),
            "fits": {layer.name: layer.fit.to_json() for layer in layers},
            "tables": [classes.tolist(), *(layer.table.tolist() for layer in layers)],
        }
        found = plane_meta(
            index.header,
            index.view,
            present,
            index.class_totals(),
            layers,
            background=hexadecimal(classes[0].tolist()),
            certificate=index.certificate,
        )
        tables = {index.class_layer: classes, **{layer.name: layer.table for layer in layers}}
        with written(site):
            site_folder.begin(site, made_from)
            for name, content in page_files().items():
                (site / name).write_bytes(content)
            (site / "meta.js").write_text(script(found), "ascii")
    with Readers(PlaneIndex, index_path) as readers:
        tasks = (
            partial(_write_column, readers, site, tables, layers, pair, column, runs)
            for pair, columns in present.items()
            for column, runs in columns.items()
        )
        run(tasks, lambda _: None)


def value_layers(
    index: PlaneIndex, *, shading: str, chosen: str | None, background: str | None
) -> tuple[ValueLayer, ...]:
    """Return the layers of values of an index with their fits and colours, see :func:`fill_planes`."""
    return tuple(_value_layer(index, given, shading, chosen, background) for given in index.value_layers)


def _value_layer(
    index: PlaneIndex, given: Mapping[str, Any], shading: str, chosen: str | None, background: str | None
) -> ValueLayer:
    name, kind = str(given["name"]), str(given["palette_kind"])
    fit = index.value_fit(name) if kind != "sequential" or shading == "equalised" else None
    picked = given.get("palette") or PALETTE_OF_KIND[kind]
    if chosen is not None and palette(chosen).kind == kind:
        picked = chosen
    return ValueLayer(
        name,
        given.get("label") or name,
        given.get("unit") or "",
        fit or index.value_fit_from(name, kind, shading=shading),
        picked,
        colour_table(picked, background=background),
    )


def pictures(
    classes: NDArray[np.uint16], means: Sequence[NDArray[np.float64]], layers: Sequence[ValueLayer]
) -> list[NDArray[np.uint8]]:
    """Return the palette indices of a tile, shape (256, 256), line 0 at the top: classes, then values."""
    shades = [shade_values(each, layer.fit) for each, layer in zip(means, layers, strict=True)]
    return [each.T[::-1] for each in (class_shades(classes), *shades)]


def _write_column(
    readers: Readers[PlaneIndex],
    site: Path,
    tables: Mapping[str, NDArray[np.uint8]],
    layers: Sequence[ValueLayer],
    pair: Pair,
    column: int,
    runs: Runs,
) -> None:
    """Write all about one tile column; its folders get their names when all is there, side-cars last."""
    where = Path(str(pair[0]), str(pair[1]))
    folders = [*(site / "tiles" / name / where for name in tables), site / SIDE_CARS / where]
    if (folders[-1] / str(column)).is_dir():
        return
    growing = [folder / f".{column}" for folder in folders]
    with readers.one() as index, written(site):
        for folder in growing:
            folder.mkdir(parents=True, exist_ok=True)
        for row in (row for first, last in runs for row in range(first, last + 1)):
            address = Address(*pair, column, row)
            plane = index.plane(address)
            classes, means = plane.majority(), [plane.means(layer.name) for layer in layers]
            (growing[-1] / f"{row}.js").write_bytes(side_car(address, classes, means))
            shades = pictures(classes, means, layers)
            for folder, table, each in zip(growing[:-1], tables.values(), shades, strict=True):
                (folder / f"{row}.png").write_bytes(png.encode(each, table))
        for folder in growing:
            final = folder.with_name(str(column))
            if final.is_dir():  # an earlier run was interrupted between two names
                shutil.rmtree(final)
            folder.rename(final)
