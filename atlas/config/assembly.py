"""From a section of a config to a checked record: families, views, settings, insets and panels together."""

from __future__ import annotations

from collections.abc import Callable, Collection, Mapping
from dataclasses import replace
from typing import Any

from atlas.config.draws import KINDS, PLANES, kind_of_view
from atlas.config.jobs import Figure, Plate, TileSet
from atlas.config.keys import FIGURE_KEYS, PLATE_KEYS, TILE_SET_KEYS
from atlas.config.names import checked_name
from atlas.config.view_kind import checked_draw, checked_palette, drawn_view
from atlas.config.view_rules import checked_extinct, checked_set, checked_starts, with_patterns
from atlas.families.reader import Family
from atlas.reading.place import Place, shown
from atlas.reading.section import Key, read_section
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
    job = _job(PLATE_KEYS, values, given, place, family_of, defaults or {})
    if job["inset"] is not None:
        job["inset"] = _fitted(job["inset"], job["view"], place.at("inset"))
    return Plate(name=name, **job)


def read_tile_set(
    name: str, given: Any, place: Place, family_of: FamilyOf, defaults: Mapping[str, Any] | None = None
) -> TileSet:
    """Read one tile set; parameters and refusals are those of :func:`read_plate`."""
    checked_name(name, place)
    values = read_section(TILE_SET_KEYS, given, place, defaults)
    job = _job(TILE_SET_KEYS, values, given, place, family_of, defaults or {})
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


def _job(
    keys: tuple[Key[Any], ...],
    values: dict[str, Any],
    given: Mapping[str, Any],
    place: Place,
    family_of: FamilyOf,
    defaults: Mapping[str, Any],
) -> dict[str, Any]:
    job = dict(values)
    family = with_patterns(family_of(job["family"], place.at("family")), job["set"], place.at("set"))
    view = drawn_view(family, job.pop("across"), job.pop("up"), place)
    draw = checked_draw(family, view, job["draw"], place.at("draw"))
    kind = kind_of_view(draw, view.across.name in family.parameter_names, job["follow"])
    job = _of_its_kind(keys, job, given, kind, place)
    limit_given = "transient_limit" in given or "transient_limit" in defaults
    job["transient_limit"] = _limit(job, limit_given, place.at("transient_limit"))
    if job["extinct"] is None:
        job["extinct"] = dict(family.extinct) if kind in PLANES else {}
    starts = checked_starts(family, job["starts"], place.at("starts"))
    if kind == "basin" and len(starts) > 1:
        raise place.at("starts").refusal(
            f"{len(starts)} starts are given and a basin chart starts from each of its cells; "
            "give one, for the state variables on no axis"
        )
    return job | {
        "family": family,
        "view": view,
        "draw": draw,
        "set": checked_set(family, job["set"], view, place.at("set")),
        "starts": starts,
        "extinct": checked_extinct(family, job["extinct"], place.at("extinct")),
        "palette": checked_palette(draw, job["palette"], "palette" in given, place.at("palette")),
    }


def _of_its_kind(
    keys: tuple[Key[Any], ...],
    job: dict[str, Any],
    given: Collection[str],
    kind: str,
    place: Place,
) -> dict[str, Any]:
    """Return the values with those that do not belong to the kind of view at their defaults.

    A value given for this very output is refused then, unless it says nothing; a common default is passed
    over.
    """
    job = dict(job)
    for key in keys:
        if not key.only_for or kind in key.only_for:
            continue
        value = job[key.name]
        if key.name in given and value != key.default and value not in ({}, None):
            *first, last = (KINDS[home] for home in key.only_for)
            homes = f"{', '.join(first)} or {last}"
            raise place.at(key.name).refusal(
                f"{_value_text(key, value)} belongs to {homes}, and this is {KINDS[kind]}; leave it away"
            )
        job[key.name] = key.default
    return job


def _value_text(key: Key[Any], value: Any) -> str:
    written = key.write(value)
    if isinstance(written, dict):
        return "'" + ", ".join(f"{name}: {entry}" for name, entry in written.items()) + "'"
    return f"'{str(written).lower() if isinstance(written, bool) else written}'"


def _limit(job: Mapping[str, Any], given: bool, place: Place) -> int:
    transient, limit = int(job["transient"]), int(job["transient_limit"])
    if limit < transient and given:
        raise place.refusal(f"the limit {limit} is below the transient {transient}; raise it")
    return max(transient, limit)


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
