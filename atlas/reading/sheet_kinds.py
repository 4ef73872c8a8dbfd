"""Kinds of value that say how a sheet is laid out: its size, its inset and its panels."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from atlas.reading.kinds import Kind, Measure, Schema, Whole, Word
from atlas.reading.place import Place, shown
from atlas.reading.section import Key, read_section, section_schema
from atlas.reading.sheet import CORNERS, SIZE_PATTERN, Inset, Size
from atlas.reading.view_kinds import AXIS_KEYS, AxisKind
from tiles.errors import Refusal

MOST_PANELS = 26

INSET_AXIS = AxisKind(AXIS_KEYS[:3])
INSET_KEYS: tuple[Key[Any], ...] = (
    Key("across", INSET_AXIS, None, "The part of the plate's across axis that is magnified.", required=True),
    Key("up", INSET_AXIS, None, "The part of the plate's up axis that is magnified.", required=True),
    Key("corner", Word(CORNERS), "upper right", "The corner of the frame in which the inset stands."),
    Key("width", Measure(0.1, 0.9), 0.4, "Width of the inset as a share of the width of the frame."),
)


@dataclass(frozen=True)
class InsetKind(Kind[Inset]):
    """A mapping of the two intervals, the corner and the width; scales are those of the plate."""

    @property
    def allowed(self) -> str:
        return "a mapping with across and up"

    def read(self, given: Any, place: Place) -> Inset:
        return Inset(**read_section(INSET_KEYS, given, place))

    def schema(self) -> Schema:
        return section_schema(INSET_KEYS)

    def write(self, value: Inset) -> Any:
        return {key.name: key.write(getattr(value, key.name)) for key in INSET_KEYS}


@dataclass(frozen=True)
class SizeKind(Kind[Size]):
    """Millimetres or pixels."""

    @property
    def allowed(self) -> str:
        return "a size such as 180x110 (millimetres) or 1200x800px"

    def read(self, given: Any, place: Place) -> Size:
        if isinstance(given, Size):
            return given
        if not isinstance(given, str):
            raise place.refusal(f"{shown(given)} is not {self.allowed}")
        try:
            return Size.parse(given)
        except Refusal as problem:
            raise place.refusal(f"{shown(given)} cannot be used: {problem}") from None

    def schema(self) -> Schema:
        return {"type": "string", "pattern": f"^{SIZE_PATTERN}$"}

    def write(self, value: Size) -> Any:
        return str(value)


@dataclass(frozen=True)
class FactorKind(Kind[int]):
    """One whole number of a short list."""

    choices: tuple[int, ...]

    @property
    def allowed(self) -> str:
        return f"one of {', '.join(map(str, self.choices))}"

    def read(self, given: Any, place: Place) -> int:
        number = Whole(min(self.choices), max(self.choices)).read(given, place)
        if number not in self.choices:
            raise place.refusal(f"{shown(given)} is not {self.allowed}")
        return number

    def schema(self) -> Schema:
        return {"enum": [*self.choices, *map(str, self.choices)]}


Panels = tuple[tuple[str, ...], ...]


@dataclass(frozen=True)
class PanelsKind(Kind[Panels]):
    """Names of plates: one list for a row, or a list of rows."""

    @property
    def allowed(self) -> str:
        return "a list of plates such as [growth, harvest], or a list of such rows from the top down"

    def read(self, given: Any, place: Place) -> Panels:
        if not isinstance(given, list | tuple) or not given:
            raise place.refusal(f"{shown(given)} is not {self.allowed}")
        rows = given if all(isinstance(row, list | tuple) for row in given) else [given]
        panels = tuple(self._row(row, place) for row in rows)
        names = [name for row in panels for name in row]
        if len(names) > MOST_PANELS:
            raise place.refusal(f"{len(names)} panels are too many; at most {MOST_PANELS} are allowed")
        for name in names:
            if names.count(name) > 1:
                raise place.refusal(f"the plate {shown(name)} stands in two panels; list each plate once")
        return panels

    def _row(self, row: Any, place: Place) -> tuple[str, ...]:
        if not row or not all(isinstance(name, str) and name for name in row):
            raise place.refusal(f"a row is not {self.allowed}")
        return tuple(row)

    def schema(self) -> Schema:
        row = {"type": "array", "items": {"type": ["string", "number"]}, "minItems": 1}
        return {"anyOf": [row, {"type": "array", "items": row, "minItems": 1}]}

    def write(self, value: Panels) -> Any:
        return [list(row) for row in value]
