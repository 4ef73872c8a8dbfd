"""Options and value types that several commands share."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, TypeVar

import click

from atlas.errors import ConfigRefused, shown

MOST_WORKERS = 1024
F = TypeVar("F", bound=Callable[..., Any])


class Command(click.Command):
    """A command whose parser says in which command a word was wrong."""

    def parse_args(self, ctx: click.Context, args: list[str]) -> list[str]:
        try:
            return super().parse_args(ctx, args)
        except click.UsageError as problem:
            problem.ctx = problem.ctx or ctx
            raise


class Interval(click.ParamType[Any]):
    """``name=low:high``, for instance ``r=2.8:4``; the axis form of the command line."""

    name = "NAME=LOW:HIGH"

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> Any:
        if not isinstance(value, str):
            return value
        name, equals, ends = value.partition("=")
        low, colon, high = ends.partition(":")
        if not (name.strip() and equals and colon):
            self.fail(f"{shown(value)} is no axis; write NAME=LOW:HIGH, for instance r=2.8:4", param, ctx)
        return (name.strip(), low.strip(), high.strip())


class Setting(click.ParamType[Any]):
    """``name=value``.

    Parameters
    ----------
    example : str
        What a refusal shows.
    """

    name = "NAME=VALUE"

    def __init__(self, example: str) -> None:
        self.example = example

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> Any:
        if not isinstance(value, str):
            return value
        name, equals, number = value.partition("=")
        if not (name.strip() and equals and number.strip()):
            self.fail(
                f"{shown(value)} sets nothing; write NAME=VALUE, for instance {self.example}", param, ctx
            )
        return (name.strip(), number.strip())


class Settings(click.ParamType[Any]):
    """``name=value`` pairs joined by commas, of which each name stands once.

    Parameters
    ----------
    example : str
        What a refusal shows.
    """

    name = "NAME=VALUE,..."

    def __init__(self, example: str) -> None:
        self.example = example

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> Any:
        if not isinstance(value, str):
            return value
        one = Setting(self.example)
        found: dict[str, str] = {}
        for pair in value.split(","):
            name, number = one.convert(pair, param, ctx)
            if name in found:
                self.fail(f"{shown(name)} is given twice; give it once", param, ctx)
            found[name] = number
        return found


class Workers(click.ParamType[Any]):
    """A number of threads."""

    name = "N"

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> Any:
        text = str(value).strip()
        if not (text.isascii() and text.isdigit() and len(text) < 9 and 1 <= int(text) <= MOST_WORKERS):
            self.fail(f"{shown(value)} is not a whole number from 1 to {MOST_WORKERS}", param, ctx)
        return int(text)


def workers_option(function: F) -> F:
    """Add ``--workers``."""
    return click.option("--workers", type=Workers(), help="Threads; by default one a processor.")(function)


def workers_and_memory(function: F) -> F:
    """Add ``--workers`` and ``--memory``."""
    memory = click.option(
        "--memory", metavar="SIZE", help="Budget of the process, such as 2GiB (the default)."
    )
    return workers_option(memory(function))


def settings_of(pairs: tuple[tuple[str, str], ...], option: str) -> dict[str, str]:
    """Return ``NAME=VALUE`` pairs as a dictionary; a name given twice is refused."""
    found: dict[str, str] = {}
    for name, value in pairs:
        if name in found:
            raise ConfigRefused(f"{option}: {shown(name)} is given twice; give it once")
        found[name] = value
    return found
