"""The command ``atlas``: one module a command, imported when the command is called."""

from __future__ import annotations

import contextlib
import os
import sys
from importlib import import_module
from typing import Any, NoReturn

import click

from atlas.cli.sentences import no_command, sentence, unknown_command
from atlas.errors import INTERRUPTED, shown
from tiles.errors import Failure, Refusal

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
        if args and args[0] not in COMMANDS:
            raise Refusal(unknown_command(args[0], COMMANDS))
        return super().resolve_command(ctx, args)

    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        with formatter.section("Commands"):
            formatter.write_dl(list(COMMANDS.items()))


@click.command(
    cls=_Commands,
    invoke_without_command=True,
    no_args_is_help=False,
    context_settings={"help_option_names": ["-h", "--help"]},
)
@click.version_option(package_name="iterated-map-atlas", prog_name="atlas")
@click.pass_context
def atlas(ctx: click.Context) -> None:
    """Bifurcation diagrams, parameter planes, phase portraits and basin charts of iterated maps.

    Plates and zoomable tile sets from formulas in a YAML file.
    """
    if ctx.invoked_subcommand is None:
        raise Refusal(no_command(COMMANDS))


def main(arguments: list[str] | None = None) -> NoReturn:
    """Run the command line; every failure becomes one sentence and an exit code."""
    sys.exit(_run(arguments))


def _run(arguments: list[str] | None) -> int:
    for stream in (sys.stdout, sys.stderr):
        if hasattr(stream, "reconfigure"):
            stream.reconfigure(errors="backslashreplace")  # names of files need not be text
    try:
        code: Any = atlas.main(arguments, prog_name="atlas", standalone_mode=False)
        sys.stdout.flush()
        return code if isinstance(code, int) else 0
    except click.ClickException as problem:
        return _told(sentence(problem), problem.exit_code)
    except Failure as problem:
        return _told(str(problem), problem.exit_code)
    except MemoryError:
        return _told("memory ran out; ask for less or close other programs", 1)
    except (KeyboardInterrupt, click.Abort):
        return _told("interrupted; finished outputs are kept, a new run goes on from there", INTERRUPTED)
    except OSError as problem:
        _forget_output()
        place = shown(problem.filename) if problem.filename else "standard output"
        return _told(f"{place} cannot be used ({problem.strerror or problem})", 1)


def _told(message: str, code: int) -> int:
    line = "".join(mark if mark.isprintable() else ascii(mark)[1:-1] for mark in message)
    with contextlib.suppress(OSError):
        click.echo(f"atlas: {line}", err=True)
    return code


def _forget_output() -> None:
    """Let what is still buffered for a closed or full standard output go nowhere."""
    with contextlib.suppress(OSError, ValueError):
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
