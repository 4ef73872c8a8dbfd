"""``atlas check``: validate a config without computing."""

from __future__ import annotations

from pathlib import Path

import click

from atlas.cli.options import Command, workers_and_memory


@click.command(cls=Command)
@click.argument("config", type=click.Path(path_type=Path))
@workers_and_memory
def command(config: Path, workers: int | None, memory: str | None) -> None:
    """Validate CONFIG; print pixels, samples, estimated time and peak memory of every output.

    With samples: auto, a zoom into a part of the attractor may take more samples than printed. A map that is
    used for the first time takes some seconds more.
    """
    from atlas.cli.tables import need_table
    from atlas.config.digests import normalised
    from atlas.config.load import load
    from atlas.output.batch import needs

    rows = [
        (record.name, str(normalised(record)["kind"]), need)
        for record, need in needs(load(config), workers=workers, memory=memory)
    ]
    click.echo(need_table(rows))
