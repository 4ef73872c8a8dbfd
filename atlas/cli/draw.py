"""``atlas draw``: one plate without a config."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import click

from atlas.cli.colour_options import colour_options
from atlas.cli.options import Command, Interval, Setting, Settings, settings_of, workers_and_memory
from atlas.config.draws import DRAWS, FOLLOWED


@click.command(cls=Command)
@click.argument("family")
@click.option("--across", type=Interval(), help="Parameter or state variable and interval: r=2.8:4.")
@click.option(
    "--up", type=Interval(), help="State variable, observable or parameter and interval, such as x=0:1."
)
@click.option(
    "--draw",
    metavar="NAME",
    help=f"What is drawn: {', '.join(DRAWS)}; by default density, or fate over two parameters.",
)
@click.option(
    "--set",
    "set_",
    type=Setting("beta=6"),
    multiple=True,
    help="Value of another parameter, such as beta=6, or the entries of a pattern, such as r=a,a,b.",
)
@click.option(
    "--start",
    type=Settings("x=0.3"),
    multiple=True,
    help="Where orbits start, such as x=0.3 or x=0.1,y=0.2; repeat for several starts.",
)
@click.option(
    "--follow",
    metavar="|".join(FOLLOWED),
    help="Start each column where its neighbour ended, along the parameter.",
)
@click.option("--transient", metavar="N", help="Steps left out before sampling.")
@click.option("--steps", metavar="N", help="Steps looked at in parameter planes and basin charts.")
@click.option("--samples", metavar="N|auto", help="Samples of each orbit.")
@click.option(
    "--record",
    type=Settings("every=12,phase=3"),
    metavar="every=N,phase=N",
    help="Count only every so many steps, at a phase.",
)
@click.option(
    "--extinct",
    type=Setting("n=1e-6"),
    multiple=True,
    help="Size below which a state variable counts as extinct.",
)
@click.option(
    "--by-attractor", is_flag=True, default=None, help="A colour for the density of each attractor."
)
@click.option("--size", metavar="SIZE", help="180x110 (mm) or 1200x800px.")
@click.option("--dpi", metavar="N", help="Pixels per inch.")
@click.option(
    "--supersampling", metavar="1|2|4", help="Points along a pixel of parameter planes and basin charts."
)
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
    given["extinct"] = settings_of(given.pop("extinct"), "--extinct") or None
    plate = plate_of(drawn_family(family), **given)
    with Bar() as bar:
        made = draw_plate(plate, out, workers=workers, memory=memory, reporter=bar)
    for path in out:
        click.echo(str(path))
    for remark in made.remarks:
        click.echo(f"atlas: {remark}", err=True)
