"""``atlas site``: the static folder of an index."""

from __future__ import annotations

from pathlib import Path

import click

from atlas.cli.colour_options import colour_options
from atlas.cli.options import Command, workers_option


@click.command(cls=Command)
@click.argument("index", type=click.Path(path_type=Path))
@click.option("--out", type=click.Path(path_type=Path), metavar="DIR", required=True, help="Folder to write.")
@colour_options("by default as it was built")
@click.option("--background", metavar="#RRGGBB", help="Colour of empty cells.")
@workers_option
def command(
    index: Path,
    out: Path,
    shading: str | None,
    palette: str | None,
    background: str | None,
    workers: int | None,
) -> None:
    """Rebuild the static folder of a tile set from INDEX, in other colours if you like; no orbit is run."""
    from atlas.cli.progress import Bar
    from atlas.output.tileset import rebuild_site
    from atlas.reading.place import COMMAND_LINE

    with Bar() as bar:
        rebuild_site(
            index,
            out,
            shading=shading,
            palette=palette,
            background=background,
            workers=workers,
            reporter=bar,
            place=COMMAND_LINE,
        )
    click.echo(f"{out / 'index.html'}")
