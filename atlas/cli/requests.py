"""From the words of the command line to a plate."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from atlas.config.load import Plate, load, plate_from_parts
from atlas.errors import ConfigRefused, shown
from atlas.families.catalogue import family as catalogued
from atlas.families.reader import Family
from atlas.reading.place import COMMAND_LINE


def drawn_family(given: str) -> Family:
    """Return a family of the catalogue, or the only one that a config defines."""
    if not given.endswith((".yaml", ".yml")):
        return catalogued(given)
    own = load(Path(given)).families
    if len(own) != 1:
        raise ConfigRefused(
            f"{shown(given)[1:-1]} defines {len(own)} families; atlas draw needs a config with exactly one"
        )
    return next(iter(own.values()))


def plate_of(
    family: Family,
    across: tuple[str, str, str] | None,
    up: tuple[str, str, str] | None,
    start: tuple[dict[str, str], ...],
    **options: Any,
) -> Plate:
    """Return the plate that ``atlas draw`` is asked for; the family's own view fills what is left out."""
    settings = {name: _setting(value) for name, value in options.pop("set", {}).items()}
    left, right = across or family.across, up or family.up
    if left is None or right is None:
        raise ConfigRefused(_no_view(family, left is None, right is None))
    return plate_from_parts(
        family,
        left,
        right,
        set=settings,
        starts=start or None,
        name=family.name,
        place=COMMAND_LINE,
        **options,
    )


def _setting(value: str) -> Any:
    """Return a number as it is, and entries joined by commas as a pattern; one entry ends in a comma."""
    if "," not in value:
        return value
    return {"pattern": [entry.strip() for entry in value.removesuffix(",").split(",")]}


def _no_view(family: Family, across: bool, up: bool) -> str:
    """Return the sentence for axes that neither the command nor the family gives."""
    needed = {}
    if across:
        needed["--across"] = family.parameters[0].name if family.parameters else "NAME"
    if up:
        needed["--up"] = family.states[0].name
    forms = " ".join(f"{option} {name}=LOW:HIGH" for option, name in needed.items())
    options = " and ".join(needed)
    return f"{options}: the family '{family.name}' has no view of its own; write for instance {forms}"
