"""Patterns: how a repeating list of parameters in time is read and checked."""

from __future__ import annotations

from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass
from math import lcm
from typing import Any

from atlas.formula.expression import is_identifier
from atlas.reading.kinds import Kind, Number, Schema
from atlas.reading.place import Place, shown
from tiles.errors import nearest
from tiles.number import Exact

LONGEST_PATTERN = 64
LONGEST_WORD = 4096

Entries = tuple[str | Exact, ...]


@dataclass(frozen=True)
class PatternKind(Kind[Entries]):
    """A list of names of parameters and of numbers."""

    @property
    def allowed(self) -> str:
        return f"a list of 1 to {LONGEST_PATTERN} parameters or numbers such as [a, a, b]"

    def read(self, given: Any, place: Place) -> Entries:
        if not isinstance(given, list | tuple):
            raise place.refusal(f"{shown(given)} is not {self.allowed}")
        if not 1 <= len(given) <= LONGEST_PATTERN:
            raise place.refusal(f"a pattern of {len(given)} entries is not {self.allowed}")
        return tuple(_entry(entry, place.at(number)) for number, entry in enumerate(given, 1))

    def schema(self) -> Schema:
        entry = {"anyOf": [Number().schema(), {"type": "string"}]}
        return {"type": "array", "items": entry, "minItems": 1, "maxItems": LONGEST_PATTERN}

    def write(self, value: Entries) -> Any:
        return [str(entry) for entry in value]


def _entry(given: Any, place: Place) -> str | Exact:
    if isinstance(given, str) and is_identifier(given.strip()):
        return given.strip()
    return Number().read(given, place)


def check_patterns(
    patterns: Mapping[str, Sequence[str | Exact]], parameters: Collection[str], place: Place
) -> None:
    """Refuse entries that are no plain parameters, and patterns that together repeat too late.

    Parameters
    ----------
    patterns : mapping of str to sequence
        The entries of every pattern of a family.
    parameters : collection of str
        The names of its plain parameters.
    place : Place
        Where the patterns stand, by name.

    Raises
    ------
    ConfigRefused
        With one sentence.
    """
    for name, entries in patterns.items():
        for number, entry in enumerate(entries, 1):
            if isinstance(entry, Exact) or entry in parameters:
                continue
            spot = place.at(name).at("pattern").at(number)
            if entry in patterns:
                raise spot.refusal(
                    f"{shown(entry)} follows a pattern itself; write parameters with a default, or numbers"
                )
            raise spot.refusal(f"there is no parameter {shown(entry)}{nearest(entry, parameters)}")
    length = lcm(*map(len, patterns.values()))
    if length > LONGEST_WORD:
        told = ", ".join(f"{name} of {len(entries)}" for name, entries in patterns.items())
        raise place.refusal(
            f"the patterns ({told} entries) repeat together only after {length} steps; "
            f"at most {LONGEST_WORD} are allowed"
        )
