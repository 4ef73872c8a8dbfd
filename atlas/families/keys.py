"""The table of keys of a map family, shared by the reader, the editor schema and the documentation."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from atlas.families.kinds import NUMBER, Formula, Named, Positive, Prose
from atlas.families.patterns import PatternKind
from atlas.reading.kinds import Schema, Text
from atlas.reading.orbit_kinds import Interval
from atlas.reading.place import Place
from atlas.reading.section import Key, read_section, section_schema
from atlas.reading.view_kinds import AxisKind
from tiles.number import exact

MOST_STATES = 3
MOST_NAMES = 60


def _sections(what: str, fewest: int, most: int, keys: tuple[Key[Any], ...]) -> Named:
    return Named(
        what,
        fewest,
        most,
        lambda given, place: read_section(keys, given, place),
        lambda: section_schema(keys),
    )


def _formulas(what: str, fewest: int, most: int) -> Named:
    formula = Key("formula", Formula(), None, "A formula.")
    return Named(what, fewest, most, formula.read, formula.kind.schema)


STATE_KEYS: tuple[Key[Any], ...] = (
    Key("start", NUMBER, None, "Where orbits start unless told otherwise.", required=True),
    Key("label", Text(), "", "What figures print beside the symbol."),
    Key("unit", Text(40), "", "The unit that figures print in brackets."),
    Key("domain", Interval(), None, "The interval in which the variable means something."),
    Key("wrap", Interval(), None, "The interval of a periodic variable, into which steps are brought back."),
)

PARAMETER_KEYS: tuple[Key[Any], ...] = (
    Key("default", NUMBER, None, "The value unless told otherwise."),
    Key("pattern", PatternKind(), None, "Parameters or numbers that it follows in time, repeating."),
    Key("label", Text(), "", "What figures print beside the symbol."),
    Key("unit", Text(40), "", "The unit that figures print in brackets."),
)

OBSERVABLE_KEYS: tuple[Key[Any], ...] = (
    Key("formula", Formula(), None, "A formula of state variables and parameters.", required=True),
    Key("label", Text(), "", "What figures print beside the symbol."),
    Key("unit", Text(40), "", "The unit that figures print in brackets."),
)


def _parameter(given: Any, place: Place) -> dict[str, Any]:
    values = read_section(PARAMETER_KEYS, given, place)
    if values["default"] is None and values["pattern"] is None:
        raise place.refusal("the key 'default' is missing; write a number there, or a list at 'pattern'")
    if values["default"] is not None and values["pattern"] is not None:
        raise place.refusal("a parameter has a default or follows a pattern; take one of the two keys out")
    return {key: value for key, value in values.items() if value is not None}


def _parameter_schema() -> Schema:
    one_of = [{"required": ["default"]}, {"required": ["pattern"]}]
    return {**section_schema(PARAMETER_KEYS), "oneOf": one_of}


def _observable(given: Any, place: Place) -> dict[str, Any]:
    if not isinstance(given, Mapping):
        return {"formula": OBSERVABLE_KEYS[0].read(given, place), "label": "", "unit": ""}
    return read_section(OBSERVABLE_KEYS, given, place)


def _observable_schema() -> Schema:
    return {"anyOf": [Formula().schema(), section_schema(OBSERVABLE_KEYS)]}


_THRESHOLD = Key("threshold", Positive(), None, "A number above 0.")

FAMILY_KEYS: tuple[Key[Any], ...] = (
    Key("title", Text(), None, "What the family is called in prose."),
    Key(
        "state",
        _sections("{start: 0.3}", 1, MOST_STATES, STATE_KEYS),
        None,
        "State variables.",
        required=True,
    ),
    Key(
        "parameters",
        Named("{default: 2.6} or {pattern: [a, a, b]}", 0, MOST_NAMES, _parameter, _parameter_schema),
        {},
        "Parameters.",
    ),
    Key("helpers", _formulas("formulas", 0, MOST_NAMES), {}, "Named formulas for use in other formulas."),
    Key(
        "step",
        _formulas("formulas", 1, MOST_STATES),
        None,
        "The next value of each state variable.",
        required=True,
    ),
    Key(
        "observables",
        Named("formulas", 0, MOST_NAMES, _observable, _observable_schema),
        {},
        "Quantities computed from the state that can be drawn like a state variable.",
    ),
    Key("escape", Positive(), exact("1e6"), "Size at which an orbit has escaped."),
    Key(
        "extinct",
        Named("numbers above 0", 0, MOST_STATES, _THRESHOLD.read, _THRESHOLD.kind.schema),
        {},
        "Size of a state variable below which it counts as extinct.",
    ),
    Key("source", Prose(), "", "Where the family comes from."),
    Key("note", Prose(), "", "What to beware of."),
    Key("across", AxisKind(), None, "Horizontal axis of the default view."),
    Key("up", AxisKind(), None, "Vertical axis of the default view."),
)
