"""``atlas families``: the catalogue."""

from __future__ import annotations

import click

from atlas.cli.options import Command


@click.command(cls=Command)
@click.argument("name", required=False)
def command(name: str | None) -> None:
    """List the families of the catalogue, or show one: formula, parameters, domain, source."""
    from atlas.cli.family_text import family_text
    from atlas.cli.tables import table
    from atlas.families.catalogue import NAMES, family

    if name is not None:
        click.echo(family_text(family(name)))
        return
    found = [family(one) for one in NAMES]
    rows = [(one.name, one.title, "; ".join(one.formula_lines())) for one in found]
    click.echo(table(("family", "", "step"), rows))
