"""``atlas show``: the record inside a file."""

from __future__ import annotations

import json
from pathlib import Path

import click

from atlas.cli.options import Command


@click.command(cls=Command)
@click.argument("file", type=click.Path(path_type=Path))
def command(file: Path) -> None:
    """Print the record of how FILE was made: config, versions, counts digest, shares.

    FILE is a plate (PNG, TIFF, PDF, SVG), the index of a tile set, or a saved Dataset (NetCDF).
    """
    from atlas.output.certificate import read

    click.echo(json.dumps(read(file), indent=2, ensure_ascii=False))
