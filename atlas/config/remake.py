"""Making the record of an output again from its normalised form."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

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
    config = parse_config(_as_config(given, Place(where)), where)
    return config.outputs()[str(given["name"])]


def _as_config(given: Mapping[str, Any], place: Place) -> dict[str, Any]:
    sections = {"plate": "plates", "tile set": "tile_sets", "figure": "figures"}
    try:
        section, name = sections[given["kind"]], str(given["name"])
        settings = {key: value for key, value in given["settings"].items() if value is not None}
        parts = [_as_config(plate, place) for plate in given.get("plates", {}).values()]
        config: dict[str, Any] = {"families": {}, "plates": {}, "tile_sets": {}, "figures": {}}
        if section != "figures":
            config["families"][settings["family"]] = {
                key: value for key, value in given["family"].items() if key != "name"
            }
    except (KeyError, TypeError, AttributeError):
        raise place.refusal("this is no complete record of a plate, a tile set or a figure") from None
    for part in parts:
        config["families"] |= part["families"]
        config["plates"] |= part["plates"]
    config[section][name] = settings
    return config
