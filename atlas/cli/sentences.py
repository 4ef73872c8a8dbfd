"""What is wrong with a command line, in one sentence of our own instead of a block of usage."""

from __future__ import annotations

from collections.abc import Iterable

import click

from atlas.errors import shown
from tiles.errors import nearest


def sentence(problem: click.ClickException) -> str:
    """Return what a failed reading of the command line tells the user: place, what was found, remedy."""
    context = getattr(problem, "ctx", None)
    if not isinstance(problem, click.UsageError) or context is None:
        return _clause(problem.format_message())
    if isinstance(problem, click.NoSuchOption):
        name = problem.option_name
        known = [word for one in _options(context) for word in one.opts if word.startswith("--")]
        hint = nearest(name, known)
        return f"{context.command_path} has no option {shown(name)}{hint}"
    if isinstance(problem, click.MissingParameter) and problem.param is not None:
        return _missing(problem.param, context)
    if isinstance(problem, click.BadParameter) and problem.param is not None:
        return f"{_name(problem.param)}: {problem.message}"
    if isinstance(problem, click.BadOptionUsage):
        return _unused(problem.option_name, context)
    return f"{_clause(problem.message)}; {context.command_path} --help shows what is allowed"


def unknown_command(given: str, known: Iterable[str]) -> str:
    """Return the sentence for a command that does not exist."""
    return f"there is no command {shown(given)}{nearest(given, known)}"


def no_command(known: Iterable[str]) -> str:
    """Return the sentence for a bare ``atlas``."""
    return f"a command is missing; write one of {', '.join(known)}, or atlas --help"


def _missing(param: click.Parameter, context: click.Context) -> str:
    if isinstance(param, click.Option):
        return f"{_name(param)} is missing; write {_name(param)} {_value(param)}"
    return f"{_name(param)} is missing; write {context.command_path} {_name(param)}"


def _unused(option: str, context: click.Context) -> str:
    for one in _options(context):
        if option in one.opts:
            if one.is_flag:
                return f"{option}: it takes no value; write it alone"
            return f"{option}: the value is missing; write {option} {_value(one)}"
    return f"{shown(option)} cannot be used so; {context.command_path} --help shows what is allowed"


def _options(context: click.Context) -> list[click.Option]:
    return [one for one in context.command.get_params(context) if isinstance(one, click.Option)]


def _name(param: click.Parameter) -> str:
    return param.opts[0] if isinstance(param, click.Option) else (param.name or "").upper()


def _value(option: click.Option) -> str:
    return option.metavar or option.type.name.upper()


def _clause(message: str) -> str:
    text = shown(" ".join(message.split()), 200)[1:-1].rstrip(".")
    return text[:1].lower() + text[1:]
