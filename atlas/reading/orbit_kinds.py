"""Kinds of value that say how orbits are run: numbers by name, intervals, what is recorded."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, NamedTuple

from atlas.reading.kinds import NUMBER_SCHEMA, Kind, Number, Schema, Whole
from atlas.reading.place import Place, shown
from atlas.reading.section import Key, read_section, section_schema, text_keys
from tiles.number import Exact

LONGEST_STRIDE = 1_000_000
NUMBER = Number()


@dataclass(frozen=True)
class NumbersKind(Kind[dict[str, Exact]]):
    """A mapping of names to numbers."""

    of: str
    above_zero: bool = False

    @property
    def allowed(self) -> str:
        return f"a mapping of {self.of} to numbers{' above 0' if self.above_zero else ''}"

    def read(self, given: Any, place: Place) -> dict[str, Exact]:
        return {name: self._number(given[name], place.at(name)) for name in text_keys(given, place)}

    def _number(self, given: Any, place: Place) -> Exact:
        number = NUMBER.read(given, place)
        if self.above_zero and number.value <= 0:
            raise place.refusal(f"{number} is not above 0; write a number above 0 such as 1e-6")
        return number

    def schema(self) -> Schema:
        return {"type": "object", "additionalProperties": dict(NUMBER_SCHEMA)}

    def write(self, value: dict[str, Exact]) -> Any:
        return {name: NUMBER.write(number) for name, number in sorted(value.items())}


@dataclass(frozen=True)
class Interval(Kind[tuple[Exact, Exact]]):
    """``[low, high]``, the lower end first."""

    @property
    def allowed(self) -> str:
        return "[low, high] with the lower end first"

    def read(self, given: Any, place: Place) -> tuple[Exact, Exact]:
        if not isinstance(given, list | tuple) or len(given) != 2:
            raise place.refusal(f"{shown(given)} is not an interval; write {self.allowed}")
        low, high = (NUMBER.read(end, place) for end in given)
        if not low < high:
            raise place.refusal(
                f"the interval from {low} to {high} is empty or reversed; write {self.allowed}"
            )
        return low, high

    def schema(self) -> Schema:
        return {"type": "array", "items": NUMBER.schema(), "minItems": 2, "maxItems": 2}


class Record(NamedTuple):
    """Which states of an orbit are counted: those after n steps where n mod ``every`` is ``phase``."""

    every: int
    phase: int


RECORD_KEYS: tuple[Key[Any], ...] = (
    Key("every", Whole(1, LONGEST_STRIDE), None, "Steps from one counted state to the next.", True),
    Key(
        "phase",
        Whole(0, LONGEST_STRIDE - 1),
        0,
        "Steps after the start, modulo every, at which a state is counted.",
    ),
)


@dataclass(frozen=True)
class RecordKind(Kind[Record]):
    """A mapping of the stride and the phase."""

    @property
    def allowed(self) -> str:
        return "a mapping such as {every: 12, phase: 3}"

    def read(self, given: Any, place: Place) -> Record:
        given = given._asdict() if isinstance(given, Record) else given
        record = Record(**read_section(RECORD_KEYS, given, place))
        if record.phase >= record.every:
            raise place.at("phase").refusal(
                f"the phase {record.phase} is not below the stride {record.every}; "
                f"write {record.phase % record.every}"
            )
        return record

    def schema(self) -> Schema:
        return section_schema(RECORD_KEYS)

    def write(self, value: Record) -> Any:
        return value._asdict()
