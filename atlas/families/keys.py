"""The table of keys of a map family, shared by the reader, the editor schema and the documentation."""

from __future__ import annotations

from typing import Any

from atlas.families.kinds import NUMBER, Formula, Interval, Named, Positive, Prose
from atlas.reading.kinds import Text
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
)

PARAMETER_KEYS: tuple[Key[Any], ...] = (
    Key("default", NUMBER, None, "The value unless told otherwise.", required=True),
    Key("label", Text(), "", "What figures print beside the symbol."),
    Key("unit", Text(40), "", "The unit that figures print in brackets."),
)

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
        _sections("{default: 2.6}", 0, MOST_NAMES, PARAMETER_KEYS),
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
    Key("escape", Positive(), exact("1e6"), "Size at which an orbit has escaped."),
    Key("source", Prose(), "", "Where the family comes from."),
    Key("note", Prose(), "", "What to beware of."),
    Key("across", AxisKind(), None, "Horizontal axis of the default view."),
    Key("up", AxisKind(), None, "Vertical axis of the default view."),
)
