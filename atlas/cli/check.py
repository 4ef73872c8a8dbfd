"""``atlas check``: validate a config without computing."""

from __future__ import annotations

from pathlib import Path

import click

from atlas.cli.options import workers_and_memory


@click.command()
@click.argument("config", type=click.Path(path_type=Path))
@workers_and_memory
def command(config: Path, workers: int | None, memory: str | None) -> None:
    """Validate CONFIG; print pixels, samples, estimated time and peak memory of every output.

    With samples: auto, a zoom into a part of the attractor may take more samples than printed.
    """
    from atlas.cli.tables import need_table
    from atlas.config.digests import normalised
    from atlas.config.load import load
    from atlas.orbits.schedule import default_workers
    from atlas.output.batch import check_need, select
    from atlas.output.forecast import need_of
    from atlas.plan import parse_memory

    budget = parse_memory(memory)
    needs = []
    for name, record in select(load(config), ()).items():
        need = need_of(record, workers or default_workers())
        check_need(name, need, budget)
        needs.append((name, str(normalised(record)["kind"]), need))
    click.echo(need_table(needs))
