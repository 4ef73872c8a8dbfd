"""``atlas render``: every output of a config."""

from __future__ import annotations

from pathlib import Path

import click

from atlas.cli.options import Command, workers_and_memory


@click.command(cls=Command)
@click.argument("config", type=click.Path(path_type=Path))
@click.option("--only", multiple=True, metavar="NAME", help="Only this output; may be given several times.")
@click.option(
    "--out", type=click.Path(path_type=Path), metavar="DIR", default=Path("out"), show_default=True,
    help="Folder of the outputs.",
)  # fmt: skip
@workers_and_memory
@click.option("--force", is_flag=True, help="Make again what is unchanged.")
def command(
    config: Path, only: tuple[str, ...], out: Path, workers: int | None, memory: str | None, force: bool
) -> int:
    """Render every plate, figure and tile set of CONFIG.

    Finished outputs whose request and files are unchanged are skipped. One failing output does not stop the
    others. Exit code: 0 done, 1 an output failed, 2 the request is wrong, 130 interrupted.
    """
    from atlas.cli.progress import Bar
    from atlas.cli.tables import outcome_table
    from atlas.config.load import load
    from atlas.output.batch import render

    with Bar() as bar:
        outcomes = render(
            load(config), out, only=only, workers=workers, memory=memory, force=force, reporter=bar
        )
    click.echo(outcome_table(outcomes))
    for outcome in outcomes:
        for remark in outcome.remarks:
            click.echo(f"atlas: {remark}", err=True)
        if outcome.status == "failed":
            click.echo(f"atlas: {outcome.message}", err=True)
    return 1 if any(outcome.status == "failed" for outcome in outcomes) else 0
