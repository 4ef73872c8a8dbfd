"""``atlas bin``: measured or simulated points from a table, as a plate or a tile set."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import click

from atlas.cli.colour_options import colour_options
from atlas.cli.options import Command, workers_and_memory


class Column(click.ParamType[Any]):
    """``column`` or ``column=low:high``; either end may be left out."""

    name = "COLUMN[=LOW:HIGH]"

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> Any:
        if not isinstance(value, str):
            return value
        name, equals, ends = value.rpartition("=")
        low, colon, high = ends.partition(":")
        if not (equals and colon):
            return {"name": value.strip()}
        ends_given = {"low": low.strip(), "high": high.strip()}
        return {"name": name.strip(), **{key: end for key, end in ends_given.items() if end}}


@click.command(cls=Command)
@click.argument("points", type=click.Path(path_type=Path))
@click.option("--across", type=Column(), required=True, help="Column and interval, such as dose=0:10.")
@click.option("--up", type=Column(), required=True, help="Column and interval, such as response=0:1.")
@click.option("--scale-across", metavar="NAME", help="linear or log.")
@click.option("--scale-up", metavar="NAME", help="linear or log.")
@click.option("--label-across", metavar="TEXT", help="What the figure prints instead of the column's name.")
@click.option("--label-up", metavar="TEXT", help="What the figure prints instead of the column's name.")
@click.option("--levels", metavar="N|N,N", help="Make a tile set down to this level (across,up).")
@click.option("--pairs", metavar="NAME", help="Level pairs of the tile set: diagonal or all.")
@click.option("--name", metavar="NAME", help="Name of the output; by default that of the file of points.")
@click.option("--size", metavar="SIZE", help="180x110 (mm) or 1200x800px.")
@click.option("--dpi", metavar="N", help="Pixels per inch.")
@click.option("--key", is_flag=True, default=None, help="Colour key beside the picture.")
@colour_options(densities_only=True)
@click.option("--background", metavar="#RRGGBB", help="Colour of empty cells.")
@click.option("--title", metavar="TEXT", help="Title above the frame, or of the page.")
@workers_and_memory
@click.option(
    "--out", "out", type=click.Path(path_type=Path), metavar="FILE|FOLDER", multiple=True, required=True,
    help="File to write: .png, .tif, .pdf or .svg; may be given several times. With --levels, the folder.",
)  # fmt: skip
def command(points: Path, out: tuple[Path, ...], **given: Any) -> None:
    """Draw the points of a table, POINTS.csv or POINTS.parquet, by their density in each column of pixels.

    An interval that is left out, or an end of it (dose=0:), is that of the data: the points are then read
    twice, and the end is moved outwards to a readable decimal. Cells are half-open, the last one
    closed. Points outside the intervals and rows that lack a number are counted and reported.

    With --levels a zoomable tile set is made instead of a picture: FOLDER/NAME/index.sqlite and
    FOLDER/NAME/site.
    """
    from atlas.cli.point_requests import picture_of_points, tile_set_of_points
    from atlas.cli.progress import Bar

    make = picture_of_points if given["levels"] is None else tile_set_of_points
    with Bar() as bar:
        paths, left_out = make(points, out, bar, **given)
    if left_out:
        click.echo(f"atlas: {left_out}", err=True)
    for path in paths:
        click.echo(str(path))
