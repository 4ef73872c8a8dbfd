"""Kinds of value that say what is computed: axes and levels of a tile set."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, NamedTuple

from atlas.reading.kinds import NUMBER_SCHEMA, Kind, Number, Schema, Text, Whole, Word
from atlas.reading.place import Place, shown
from atlas.reading.section import Key, read_section, section_schema
from tiles.errors import WindowRefused
from tiles.window import Axis

DEEPEST_LEVEL = 200
NUMBER = Number()

AXIS_KEYS: tuple[Key[Any], ...] = (
    Key(
        "name",
        Text(what="a name"),
        None,
        "The parameter, state variable or observable that runs along the axis.",
        required=True,
    ),
    Key("low", NUMBER, None, "Lower end.", required=True),
    Key("high", NUMBER, None, "Upper end.", required=True),
    Key("scale", Word(("linear", "log")), "linear", "Cells equal in the value or in its logarithm."),
    Key("label", Text(), None, "What the figure prints instead of the label that the family gives."),
)


@dataclass(frozen=True)
class AxisKind(Kind[Axis]):
    """``[name, low, high]``, or a mapping with these keys and more."""

    keys: tuple[Key[Any], ...] = AXIS_KEYS

    @property
    def allowed(self) -> str:
        return "[name, low, high]"

    def read(self, given: Any, place: Place) -> Axis:
        if isinstance(given, Axis):
            given = {name: getattr(given, name) for name in ("name", "low", "high", "scale", "label")}
            given = {name: value for name, value in given.items() if value is not None}
        if not isinstance(given, Mapping):
            if not isinstance(given, list | tuple) or len(given) != 3:
                raise place.refusal(f"{shown(given)} is not an axis; write {self.allowed}")
            given = dict(zip(("name", "low", "high"), given, strict=True))
        if "wrap" in given:
            raise place.refusal(
                "an axis has no wrap; give wrap to the state variable of the family, if it is periodic"
            )
        values = read_section(self.keys, given, place)
        try:
            return Axis(**values)
        except WindowRefused as problem:
            raise place.refusal(str(problem)) from None

    def schema(self) -> Schema:
        entries = [{"type": ["string", "boolean"]}, dict(NUMBER_SCHEMA), dict(NUMBER_SCHEMA)]
        three = {"type": "array", "prefixItems": entries, "minItems": 3, "maxItems": 3}
        return {"anyOf": [three, section_schema(self.keys)]}

    def write(self, value: Axis) -> Any:
        written = {key.name: key.write(getattr(value, key.name)) for key in self.keys}
        return {name: text for name, text in written.items() if text is not None}


class Levels(NamedTuple):
    """The deepest level of a tile set along each axis."""

    across: int
    up: int


_LEVEL = Whole(0, DEEPEST_LEVEL)
LEVEL_KEYS: tuple[Key[Any], ...] = (
    Key("across", _LEVEL, None, "Deepest level across: 2**level tiles of 256 cells.", required=True),
    Key("up", _LEVEL, None, "Deepest level up: 2**level tiles of 256 cells.", required=True),
)


@dataclass(frozen=True)
class LevelsKind(Kind[Levels]):
    """One whole number for both axes, or one an axis."""

    @property
    def allowed(self) -> str:
        return f"{_LEVEL.allowed}, or a mapping with across and up"

    def read(self, given: Any, place: Place) -> Levels:
        if isinstance(given, Mapping):
            return Levels(**read_section(LEVEL_KEYS, given, place))
        level = _LEVEL.read(given, place)
        return Levels(level, level)

    def schema(self) -> Schema:
        return {"anyOf": [_LEVEL.schema(), section_schema(LEVEL_KEYS)]}

    def write(self, value: Levels) -> Any:
        return value._asdict()


Pairs = tuple[tuple[int, int], ...]


@dataclass(frozen=True)
class PairsKind(Kind[str | Pairs]):
    """``diagonal``, ``all``, or a list of level pairs."""

    words: tuple[str, ...]

    @property
    def allowed(self) -> str:
        return f"{', '.join(self.words)} or a list of level pairs such as [[0, 0], [2, 4]]"

    def read(self, given: Any, place: Place) -> str | Pairs:
        if isinstance(given, str):
            return Word(self.words).read(given, place)
        if not isinstance(given, list | tuple) or not given:
            raise place.refusal(f"{shown(given)} is not {self.allowed}")
        pairs = tuple(self._pair(entry, place.at(number)) for number, entry in enumerate(given, 1))
        if len(set(pairs)) < len(pairs):
            raise place.refusal("a level pair is listed twice; list each pair once")
        return tuple(sorted(pairs))

    def _pair(self, given: Any, place: Place) -> tuple[int, int]:
        if not isinstance(given, list | tuple) or len(given) != 2:
            raise place.refusal(f"{shown(given)} is not a level pair; write [level across, level up]")
        return _LEVEL.read(given[0], place.at(1)), _LEVEL.read(given[1], place.at(2))

    def schema(self) -> Schema:
        pair = {"type": "array", "items": _LEVEL.schema(), "minItems": 2, "maxItems": 2}
        return {"anyOf": [{"enum": list(self.words)}, {"type": "array", "items": pair, "minItems": 1}]}

    def write(self, value: str | Pairs) -> Any:
        return value if isinstance(value, str) else [list(pair) for pair in value]
