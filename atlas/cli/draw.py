"""``atlas draw``: one plate without a config."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import click

from atlas.cli.colour_options import colour_options
from atlas.cli.options import Command, Interval, Setting, settings_of, workers_and_memory


@click.command(cls=Command)
@click.argument("family")
@click.option("--across", type=Interval(), help="Parameter and interval, such as r=2.8:4.")
@click.option("--up", type=Interval(), help="State variable and interval, such as x=0:1.")
@click.option("--set", "set_", type=Setting("beta=6"), multiple=True, help="Value of another parameter.")
@click.option(
    "--start", type=Setting("x=0.3"), multiple=True, help="Where orbits start; repeat for several starts."
)
@click.option("--transient", metavar="N", help="Steps left out before sampling.")
@click.option("--samples", metavar="N|auto", help="Samples of each orbit.")
@click.option("--size", metavar="SIZE", help="180x110 (mm) or 1200x800px.")
@click.option("--dpi", metavar="N", help="Pixels per inch.")
@colour_options()
@click.option("--title", metavar="TEXT", help="Title above the frame.")
@click.option("--key", is_flag=True, default=None, help="Colour key beside the picture.")
@workers_and_memory
@click.option(
    "--out", "out", type=click.Path(path_type=Path), metavar="FILE", multiple=True, required=True,
    help="File to write: .png, .tif, .pdf or .svg; may be given several times.",
)  # fmt: skip
def command(family: str, out: tuple[Path, ...], **given: Any) -> None:
    """Draw FAMILY, a name of the catalogue or a config with one family, without writing a config.

    Without --across or --up the family's own view is drawn.
    """
    from atlas.cli.progress import Bar
    from atlas.cli.requests import drawn_family, plate_of
    from atlas.output.printing import draw_plate

    workers, memory = given.pop("workers"), given.pop("memory")
    given["set"] = settings_of(given.pop("set_"), "--set")
    plate = plate_of(drawn_family(family), **given)
    with Bar() as bar:
        made = draw_plate(plate, out, workers=workers, memory=memory, reporter=bar)
    for path in out:
        click.echo(str(path))
    for remark in made.remarks:
        click.echo(f"atlas: {remark}", err=True)
