"""Options and value types that several commands share."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, TypeVar

import click

F = TypeVar("F", bound=Callable[..., Any])


class Interval(click.ParamType[Any]):
    """``name=low:high``, for instance ``r=2.8:4``; the axis form of the command line."""

    name = "NAME=LOW:HIGH"

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> Any:
        if not isinstance(value, str):
            return value
        name, equals, ends = value.partition("=")
        low, colon, high = ends.partition(":")
        if not (name.strip() and equals and colon):
            self.fail(f"'{value}' is no axis; write NAME=LOW:HIGH, for instance r=2.8:4", param, ctx)
        return (name.strip(), low.strip(), high.strip())


class Setting(click.ParamType[Any]):
    """``name=value``."""

    name = "NAME=VALUE"

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> Any:
        if not isinstance(value, str):
            return value
        name, equals, number = value.partition("=")
        if not (name.strip() and equals and number.strip()):
            self.fail(f"'{value}' sets nothing; write NAME=VALUE, for instance beta=6", param, ctx)
        return (name.strip(), number.strip())


def workers_and_memory(function: F) -> F:
    """Add ``--workers`` and ``--memory``."""
    workers = click.option(
        "--workers", type=click.IntRange(1, 1024), help="Threads; by default one a processor."
    )
    memory = click.option(
        "--memory", metavar="SIZE", help="Budget of the process, such as 2GiB (the default)."
    )
    return workers(memory(function))


def settings_of(pairs: tuple[tuple[str, str], ...], option: str) -> dict[str, str]:
    """Return ``NAME=VALUE`` pairs as a dictionary; a name given twice is refused."""
    found: dict[str, str] = {}
    for name, value in pairs:
        if name in found:
            raise click.UsageError(f"{option}: '{name}' is given twice; give it once")
        found[name] = value
    return found
