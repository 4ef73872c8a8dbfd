"""The options ``--shading`` and ``--palette``, whose help lists what may be chosen.

A module of its own, because the lists come from modules that ``atlas --help`` does not load.
"""

from __future__ import annotations

from collections.abc import Callable

import click

from atlas.cli.options import F
from tiles.palette import PALETTES, Palette
from tiles.shading import SHADINGS

_USES = {
    "sequential": "of densities and steps",
    "diverging": "of exponents",
    "cyclic": "of rotation numbers",
    "categorical": "of fates, periods and attractors",
}
_MOST_KINDS = max(len(palette.safe_for) for palette in PALETTES.values())


def colour_options(default: str = "", *, densities_only: bool = False) -> Callable[[F], F]:
    """Return a decorator that adds ``--shading`` and ``--palette``.

    Parameters
    ----------
    default : str
        What the help says of the default, after a semicolon.
    densities_only : bool
        Whether nothing but densities is drawn, so that other palettes have no use.
    """
    kinds = ("sequential",) if densities_only else tuple(_USES)
    ending = f"; {default}." if default else "."
    shading = click.option(
        "--shading",
        metavar="NAME",
        help=f"How density becomes shade: {', '.join(SHADINGS)}{ending} Ink on grey is black and white.",
    )
    palette = click.option(
        "--palette", metavar="NAME", help=f"Colours{_listed(kinds)}{ending} {_safe(kinds)}"
    )
    return lambda function: shading(palette(function))


def _listed(kinds: tuple[str, ...]) -> str:
    """Return the palettes by what they are for."""
    by_kind: dict[str, list[str]] = {}
    for name, palette in PALETTES.items():
        by_kind.setdefault(palette.kind, []).append(name)
    return ";".join(f" {_USES[kind]}: {', '.join(by_kind[kind])}" for kind in kinds if kind in by_kind)


def _safe(kinds: tuple[str, ...]) -> str:
    """Return which palettes colour-blind readers tell apart, all of them and those blind to red and green."""

    def of(fewest: int, most: int) -> str:
        return _named(lambda row: row.kind in kinds and fewest <= len(row.safe_for) <= most)

    return (
        f"Safe for colour-blind readers: {of(_MOST_KINDS, _MOST_KINDS)}; "
        f"for those blind to red or green also: {of(1, _MOST_KINDS - 1)}."
    )


def _named(chosen: Callable[[Palette], bool]) -> str:
    return ", ".join(name for name, palette in PALETTES.items() if chosen(palette))
