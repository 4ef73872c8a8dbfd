"""The kind of value that ``set`` holds: numbers for parameters, lists in time for patterns."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from atlas.families.patterns import Entries, PatternKind
from atlas.reading.kinds import NUMBER_SCHEMA, Kind, Number, Schema
from atlas.reading.place import Place
from atlas.reading.section import Key, read_section, section_schema, text_keys
from tiles.number import Exact

Setting = Exact | Entries
NUMBER, PATTERN = Number(), PatternKind()
PATTERN_KEYS: tuple[Key[Any], ...] = (
    Key("pattern", PATTERN, None, "Parameters or numbers in turn, from the first step on.", required=True),
)


@dataclass(frozen=True)
class SettingsKind(Kind[dict[str, Setting]]):
    """A mapping of parameters to numbers, and of patterns to ``{pattern: [a, a, b]}``."""

    @property
    def allowed(self) -> str:
        return "a mapping of parameters to numbers, and of patterns to {pattern: [a, a, b]} or the like"

    def read(self, given: Any, place: Place) -> dict[str, Setting]:
        return {name: _setting(given[name], place.at(name)) for name in text_keys(given, place)}

    def schema(self) -> Schema:
        entry = {"anyOf": [dict(NUMBER_SCHEMA), section_schema(PATTERN_KEYS)]}
        return {"type": "object", "additionalProperties": entry}

    def write(self, value: dict[str, Setting]) -> Any:
        return {name: _written(setting) for name, setting in sorted(value.items())}


def _setting(given: Any, place: Place) -> Setting:
    if isinstance(given, Mapping):
        entries: Entries = read_section(PATTERN_KEYS, given, place)["pattern"]
        return entries
    return NUMBER.read(given, place)


def _written(setting: Setting) -> Any:
    return NUMBER.write(setting) if isinstance(setting, Exact) else {"pattern": PATTERN.write(setting)}
