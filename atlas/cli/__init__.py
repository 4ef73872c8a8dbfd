"""The command ``atlas``: one module a command, imported when the command is called."""

from __future__ import annotations

import sys
from importlib import import_module
from typing import Any

import click

from tiles.errors import Failure

INTERRUPTED = 130

COMMANDS = {
    "render": "Render every plate, figure and tile set of a config.",
    "draw": "Draw one plate without a config.",
    "check": "Validate a config and say what it would take, without computing.",
    "families": "List the catalogue, or show one family.",
    "bin": "Draw measured or simulated points from a table.",
    "site": "Rebuild the static folder of a tile set from its index.",
    "show": "Print the record of how a file was made.",
    "schema": "Print the JSON Schema of the config, for editors.",
}


class _Commands(click.Group):
    """Knows every command's name and summary; loads a command's module when it is needed."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        return list(COMMANDS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        if cmd_name not in COMMANDS:
            return None
        command: click.Command = import_module(f"atlas.cli.{cmd_name}").command
        return command

    def resolve_command(
        self, ctx: click.Context, args: list[str]
    ) -> tuple[str | None, click.Command | None, list[str]]:
        if args and args[0] not in COMMANDS and not args[0].startswith("-"):
            from tiles.errors import nearest

            ctx.fail(f"there is no command '{args[0]}'{nearest(args[0], COMMANDS)}")
        return super().resolve_command(ctx, args)

    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        with formatter.section("Commands"):
            formatter.write_dl(list(COMMANDS.items()))


@click.command(cls=_Commands, context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(package_name="iterated-map-atlas", prog_name="atlas")
def atlas() -> None:
    """Bifurcation plates and zoomable tile sets of iterated maps, from formulas in a YAML file."""


def main(arguments: list[str] | None = None) -> Any:
    """Run the command line; every failure becomes one sentence and an exit code."""
    try:
        code = atlas.main(arguments, standalone_mode=False)
    except click.exceptions.Exit as end:
        code = end.exit_code
    except click.ClickException as problem:
        problem.show()
        code = problem.exit_code
    except Failure as problem:
        click.echo(f"atlas: {problem}", err=True)
        code = problem.exit_code
    except MemoryError:
        click.echo("atlas: memory ran out; ask for less or close other programs", err=True)
        code = 1
    except (KeyboardInterrupt, click.Abort):
        click.echo("atlas: interrupted; finished outputs are kept, a new run goes on from there", err=True)
        code = INTERRUPTED
    except BrokenPipeError:
        sys.stderr.close()
        code = 0
    sys.exit(code if isinstance(code, int) else 0)
