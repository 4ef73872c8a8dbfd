"""From the words of the command line to a plate."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import click

from atlas.catalogue import family as catalogued
from atlas.config import Plate, load, plate_from_parts
from atlas.families import Family


def drawn_family(given: str) -> Family:
    """Return a family of the catalogue, or the only one that a config defines."""
    if not given.endswith((".yaml", ".yml")):
        return catalogued(given)
    own = load(Path(given)).families
    if len(own) != 1:
        raise click.UsageError(
            f"{given} defines {len(own)} families; atlas draw needs a config with exactly one"
        )
    return next(iter(own.values()))


def plate_of(
    family: Family,
    across: tuple[str, str, str] | None,
    up: tuple[str, str, str] | None,
    start: tuple[tuple[str, str], ...],
    **options: Any,
) -> Plate:
    """Return the plate that the options of ``atlas draw`` ask for; the family's own view fills what is left out."""
    for name, axis, own in (("--across", across, family.across), ("--up", up, family.up)):
        if axis is None and own is None:
            raise click.UsageError(f"{name}: the family '{family.name}' has no view of its own; give one")
    starts = [{name: value} for name, value in start] or None
    return plate_from_parts(
        family, across or family.across, up or family.up, starts=starts, name=family.name, **options
    )  # type: ignore[arg-type]
