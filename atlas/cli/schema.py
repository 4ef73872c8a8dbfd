"""``atlas schema``: the JSON Schema of the config."""

from __future__ import annotations

import json

import click

from atlas.cli.options import Command


@click.command(cls=Command)
def command() -> None:
    """Print the JSON Schema of the config, for editors that complete and check YAML."""
    from atlas.config.schema import schema

    click.echo(json.dumps(schema(), indent=2))
