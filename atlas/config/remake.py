"""Making the record of an output again from its normalised form."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from atlas.config.assembly import read_figure
from atlas.config.jobs import Figure, Plate, TileSet
from atlas.config.load import parse_config
from atlas.reading.place import Place


def from_normalised(given: Mapping[str, Any], where: str = "record") -> Plate | TileSet | Figure:
    """Make a record again from what `normalised` returned.

    Parameters
    ----------
    given : mapping
        The result of `normalised`, perhaps after a way through JSON.
    where : str
        What a sentence calls it.

    Raises
    ------
    ConfigRefused, FamilyRefused, FormulaRefused
        When it is not such a result.
    """
    place = Place(where)
    try:
        kind, name, settings = given["kind"], str(given["name"]), given["settings"]
        settings = {key: value for key, value in settings.items() if value is not None}
        if kind == "figure":
            plates = {name: from_normalised(plate, where) for name, plate in given["plates"].items()}
            return read_figure(
                name, settings, place, {n: p for n, p in plates.items() if isinstance(p, Plate)}
            )
        section = {"plate": "plates", "tile set": "tile_sets"}[kind]
        family = {key: value for key, value in given["family"].items() if key != "name"}
        config = {"families": {settings["family"]: family}, section: {name: settings}}
    except (KeyError, TypeError, AttributeError):
        raise place.refusal("this is no complete record of a plate, a tile set or a figure") from None
    return parse_config(config, where).outputs()[name]
