"""The options ``--shading`` and ``--palette``, whose help lists what may be chosen.

A module of its own, because the lists come from modules that ``atlas --help`` does not load.
"""

from __future__ import annotations

from collections.abc import Callable

import click

from atlas.cli.options import F
from tiles.palette import PALETTES, Palette
from tiles.shading import SHADINGS

_MOST_KINDS = max(len(palette.safe_for) for palette in PALETTES.values())


def colour_options(default: str = "") -> Callable[[F], F]:
    """Return a decorator that adds ``--shading`` and ``--palette``.

    Parameters
    ----------
    default : str
        What the help says of the default, after a semicolon.
    """
    ending = f"; {default}." if default else "."
    shading = click.option(
        "--shading",
        metavar="NAME",
        help=f"How density becomes shade: {', '.join(SHADINGS)}{ending} Ink on grey is black and white.",
    )
    palette = click.option(
        "--palette", metavar="NAME", help=f"Colours of the shades: {', '.join(PALETTES)}{ending} {_safe()}"
    )
    return lambda function: shading(palette(function))


def _safe() -> str:
    """Return which palettes colour-blind readers tell apart, all of them and those blind to red and green."""
    for_all = _named(lambda row: len(row.safe_for) == _MOST_KINDS)
    for_some = _named(lambda row: 0 < len(row.safe_for) < _MOST_KINDS)
    return f"Safe for colour-blind readers: {for_all}; for those blind to red or green also: {for_some}."


def _named(chosen: Callable[[Palette], bool]) -> str:
    return ", ".join(name for name, palette in PALETTES.items() if chosen(palette))
