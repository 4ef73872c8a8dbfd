"""Kinds of value that the entry of a map family holds: bounds, prose, formulas by name."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

from atlas.formula.expression import IDENTIFIER, LONGEST_TEXT
from atlas.reading.kinds import Kind, Number, Schema
from atlas.reading.place import Place, shown
from atlas.reading.section import text_keys
from tiles.number import Exact

LONGEST_NOTE = 2000
NUMBER = Number()


@dataclass(frozen=True)
class Positive(Kind[Exact]):
    """A number above 0."""

    @property
    def allowed(self) -> str:
        return "a number above 0"

    def read(self, given: Any, place: Place) -> Exact:
        number = NUMBER.read(given, place)
        if number.value <= 0:
            raise place.refusal(f"{number} is not above 0; write {self.allowed} such as 1e6")
        return number

    def schema(self) -> Schema:
        return NUMBER.schema()

    def write(self, value: Exact) -> Any:
        return str(value)


@dataclass(frozen=True)
class Prose(Kind[str]):
    """Text of any number of lines; white space is made single spaces."""

    @property
    def allowed(self) -> str:
        return f"a text of at most {LONGEST_NOTE} characters"

    def read(self, given: Any, place: Place) -> str:
        text = " ".join(given.split()) if isinstance(given, str) else ""
        if not text or len(text) > LONGEST_NOTE or not text.isprintable():
            raise place.refusal(f"{shown(given)} is not {self.allowed}")
        return text

    def schema(self) -> Schema:
        return {"type": "string", "maxLength": LONGEST_NOTE}


@dataclass(frozen=True)
class Formula(Kind[str]):
    """The text of a formula; whether it is one is found when the names that it may use are known."""

    @property
    def allowed(self) -> str:
        return "a formula such as r * x * (1 - x)"

    def read(self, given: Any, place: Place) -> str:
        if isinstance(given, bool) or not isinstance(given, str | int | float):
            raise place.refusal(f"{shown(given)} is not {self.allowed}")
        return given if isinstance(given, str) else str(NUMBER.read(given, place))

    def schema(self) -> Schema:
        return {"type": ["string", "number"], "maxLength": LONGEST_TEXT}


@dataclass(frozen=True)
class Named(Kind[dict[str, Any]]):
    """A mapping of names to entries of one sort, in the order of the alphabet."""

    what: str
    fewest: int
    most: int
    read_entry: Callable[[Any, Place], Any]
    entry_schema: Callable[[], Schema]

    @property
    def allowed(self) -> str:
        return f"a mapping of names to {self.what}"

    def read(self, given: Any, place: Place) -> dict[str, Any]:
        names = text_keys(given, place)
        if not self.fewest <= len(names) <= self.most:
            needed = f"{self.fewest} to {self.most}" if self.fewest else f"at most {self.most}"
            raise place.refusal(f"{len(names)} entries stand here; {needed} are allowed")
        return {name: self.read_entry(given[name], place.at(name)) for name in sorted(names)}

    def schema(self) -> Schema:
        return {
            "type": "object",
            "additionalProperties": False,
            "patternProperties": {f"^{IDENTIFIER}$": self.entry_schema()},
            "minProperties": self.fewest,
            "maxProperties": self.most,
        }
