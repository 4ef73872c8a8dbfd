"""From a section of a config to a checked record: families, views, settings, insets and panels together."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import replace
from typing import Any

from atlas.config.jobs import Figure, Plate, TileSet
from atlas.config.keys import FIGURE_KEYS, PLATE_KEYS, TILE_SET_KEYS
from atlas.config.names import checked_name
from atlas.config.view_rules import checked_set, checked_starts, drawn_view
from atlas.families.reader import Family
from atlas.reading.place import Place, shown
from atlas.reading.section import read_section
from atlas.reading.sheet import Inset
from atlas.reading.view_kinds import Levels, Pairs
from tiles.errors import nearest
from tiles.window import Axis, View

FamilyOf = Callable[[str, Place], Family]


def read_plate(
    name: str, given: Any, place: Place, family_of: FamilyOf, defaults: Mapping[str, Any] | None = None
) -> Plate:
    """Read one plate.

    Parameters
    ----------
    name : str
        Its name.
    given : mapping
        Its section, with the keys of `atlas.config.keys.PLATE_KEYS`.
    place : Place
        Where the section stands.
    family_of : callable
        Returns the family of a name, or refuses it at a place.
    defaults : mapping, optional
        Values, already read, that go before those of the table.

    Raises
    ------
    ConfigRefused
        With one sentence that names the place, what was found and what is allowed.
    """
    checked_name(name, place)
    values = read_section(PLATE_KEYS, given, place, defaults)
    limit_given = "transient_limit" in given or "transient_limit" in (defaults or {})
    job = _job(values, place, family_of, limit_given)
    if job["inset"] is not None:
        job["inset"] = _fitted(job["inset"], job["view"], place.at("inset"))
    return Plate(name=name, **job)


def read_tile_set(
    name: str, given: Any, place: Place, family_of: FamilyOf, defaults: Mapping[str, Any] | None = None
) -> TileSet:
    """Read one tile set; parameters and refusals are those of :func:`read_plate`."""
    checked_name(name, place)
    values = read_section(TILE_SET_KEYS, given, place, defaults)
    limit_given = "transient_limit" in given or "transient_limit" in (defaults or {})
    job = _job(values, place, family_of, limit_given)
    _check_pairs(job["pairs"], job["levels"], place.at("pairs"))
    return TileSet(name=name, **job)


def read_figure(
    name: str,
    given: Any,
    place: Place,
    plates: Mapping[str, Plate],
    defaults: Mapping[str, Any] | None = None,
) -> Figure:
    """Read one figure, whose panels are plates of the same config."""
    checked_name(name, place)
    values = read_section(FIGURE_KEYS, given, place, defaults)
    panels = values["panels"]
    for panel in (panel for row in panels for panel in row):
        if panel not in plates:
            hint = nearest(panel, plates) or "; the file has no plates"
            raise place.at("panels").refusal(f"there is no plate {shown(panel)}{hint}")
    if values["letters"] is None:
        values["letters"] = sum(map(len, panels)) > 1
    figure = Figure(name=name, plates={panel: plates[panel] for row in panels for panel in row}, **values)
    _check_shared(figure, place.at("share"))
    return figure


def _job(values: dict[str, Any], place: Place, family_of: FamilyOf, limit_given: bool) -> dict[str, Any]:
    job = dict(values)
    family = family_of(job["family"], place.at("family"))
    view = drawn_view(family, job.pop("across"), job.pop("up"), place)
    if job["transient_limit"] < job["transient"]:
        if limit_given:
            raise place.at("transient_limit").refusal(
                f"the limit {job['transient_limit']} is below the transient {job['transient']}; raise it"
            )
        job["transient_limit"] = job["transient"]
    return job | {
        "family": family,
        "view": view,
        "set": checked_set(family, job["set"], view, place.at("set")),
        "starts": checked_starts(family, job["starts"], place.at("starts")),
    }


def _fitted(inset: Inset, view: View, place: Place) -> Inset:
    across = _part_of(view.across, inset.across, place.at("across"))
    return replace(inset, across=across, up=_part_of(view.up, inset.up, place.at("up")))


def _part_of(whole: Axis, part: Axis, place: Place) -> Axis:
    if part.name != whole.name:
        raise place.refusal(f"{shown(part.name)} is not the axis that is magnified; write {whole.name}")
    if part.low < whole.low or whole.high < part.high:
        raise place.refusal(
            f"{part.low} to {part.high} does not lie inside the plate's {whole.low} to {whole.high}"
        )
    return replace(part, scale=whole.scale, label=whole.label)


def _check_pairs(pairs: str | Pairs, levels: Levels, place: Place) -> None:
    if isinstance(pairs, str):
        return
    for pair in pairs:
        if pair[0] > levels.across or pair[1] > levels.up:
            raise place.refusal(
                f"the level pair {list(pair)} is deeper than the levels; the deepest is {list(levels)}"
            )


def _check_shared(figure: Figure, place: Place) -> None:
    if "across" in figure.share:
        if len({len(row) for row in figure.panels}) > 1:
            raise place.refusal("the rows of panels differ in length; a shared across axis needs equal rows")
        for column in zip(*figure.panels, strict=True):
            _check_equal([(name, figure.plates[name].across) for name in column], "across", place)
    if "up" in figure.share:
        for row in figure.panels:
            _check_equal([(name, figure.plates[name].up) for name in row], "up", place)


def _check_equal(panels: list[tuple[str, Axis]], key: str, place: Place) -> None:
    first_name, first = panels[0]
    for name, axis in panels[1:]:
        if replace(axis, label=None) != replace(first, label=None):
            raise place.refusal(
                f"the panels {first_name} ({_described(first)}) and {name} ({_described(axis)}) cannot share "
                f"their {key} axis; give both plates the same interval"
            )


def _described(axis: Axis) -> str:
    return f"{axis.name} from {axis.low} to {axis.high}, {axis.scale}"
