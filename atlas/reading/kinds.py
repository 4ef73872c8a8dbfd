"""Kinds of value that a config may hold: how each is read, written back and described to an editor."""

from __future__ import annotations

from abc import ABC, abstractmethod
from dataclasses import dataclass
from decimal import Decimal
from numbers import Real
from typing import Any, Generic, TypeVar

from atlas.reading.place import Place, shown
from tiles.errors import NumberRefused, nearest
from tiles.number import Exact, exact
from tiles.palette import PaletteRefused, colour

T = TypeVar("T")
Schema = dict[str, Any]

NUMBER_SCHEMA: Schema = {
    "anyOf": [
        {"type": "number"},
        {"type": "string", "pattern": r"^[0-9.eE+*/pi\s-]*[0-9i][0-9.eE+*/pi\s-]*$"},
    ]
}
LONGEST_TEXT = 200


class Kind(ABC, Generic[T]):
    """One kind of value.

    ``read`` and ``write`` are inverse: what ``write`` returns holds only JSON values, numbers as text,
    and is read back as an equal value.
    """

    @property
    @abstractmethod
    def allowed(self) -> str:
        """What may be written, as it ends a sentence: ``a whole number from 1 to 9``."""

    @abstractmethod
    def read(self, given: Any, place: Place) -> T:
        """Return the value, or raise :class:`~atlas.reading.place.ConfigRefused` naming the place."""

    @abstractmethod
    def schema(self) -> Schema:
        """Return the JSON Schema of what may be written."""

    def write(self, value: T) -> Any:
        """Return the value as JSON holds it."""
        return value


@dataclass(frozen=True)
class Text(Kind[str]):
    """A line of text."""

    longest: int = LONGEST_TEXT
    what: str = "a line of text"

    @property
    def allowed(self) -> str:
        return f"{self.what} of at most {self.longest} characters"

    def read(self, given: Any, place: Place) -> str:
        text = given.strip() if isinstance(given, str) else ""
        if not text or len(text) > self.longest or not text.isprintable():
            raise place.refusal(f"{shown(given)} is not {self.allowed}")
        return text

    def schema(self) -> Schema:
        return {"type": ["string", "number", "boolean"]}


@dataclass(frozen=True)
class Word(Kind[str]):
    """One word of a closed list."""

    choices: tuple[str, ...]

    @property
    def allowed(self) -> str:
        return f"one of {', '.join(self.choices)}"

    def read(self, given: Any, place: Place) -> str:
        word = given if isinstance(given, str) else ""
        if word not in self.choices:
            hint = nearest(word, self.choices) if word else f"; allowed: {', '.join(self.choices)}"
            raise place.refusal(f"{shown(given)} is unknown{hint}")
        return word

    def schema(self) -> Schema:
        return {"enum": list(self.choices)}


@dataclass(frozen=True)
class Words(Kind[tuple[str, ...]]):
    """A list of different words of a closed list; a single word is a list of one.

    ``synonyms`` are pairs of another word and the one of the list that it is read as.
    """

    choices: tuple[str, ...]
    fewest: int = 1
    synonyms: tuple[tuple[str, str], ...] = ()

    @property
    def allowed(self) -> str:
        return f"a list of {', '.join(self.choices)}"

    def read(self, given: Any, place: Place) -> tuple[str, ...]:
        entries = [given] if isinstance(given, str) else given
        if not isinstance(entries, list | tuple) or len(entries) < self.fewest:
            raise place.refusal(f"{shown(given)} is not {self.allowed}")
        one, meant = Word(self.choices), dict(self.synonyms)
        entries = [meant.get(entry, entry) if isinstance(entry, str) else entry for entry in entries]
        words = tuple(one.read(entry, place.at(number)) for number, entry in enumerate(entries, 1))
        if len(set(words)) < len(words):
            raise place.refusal("a word is listed twice; list each word once")
        return words

    def schema(self) -> Schema:
        entry = {"enum": [*self.choices, *(word for word, _ in self.synonyms)]}
        many = {"type": "array", "items": entry, "minItems": self.fewest, "uniqueItems": True}
        return {"anyOf": [entry, many]}

    def write(self, value: tuple[str, ...]) -> Any:
        return list(value)


@dataclass(frozen=True)
class Truth(Kind[bool]):
    """``true`` or ``false``, and nothing else."""

    @property
    def allowed(self) -> str:
        return "true or false"

    def read(self, given: Any, place: Place) -> bool:
        if isinstance(given, bool):
            return given
        if isinstance(given, str) and given in ("true", "false"):
            return given == "true"
        raise place.refusal(f"{shown(given)} is not {self.allowed}")

    def schema(self) -> Schema:
        return {"enum": [True, False, "true", "false"]}


@dataclass(frozen=True)
class Whole(Kind[int]):
    """A whole number between two bounds, both included."""

    low: int
    high: int

    @property
    def allowed(self) -> str:
        return f"a whole number from {self.low} to {self.high}"

    def read(self, given: Any, place: Place) -> int:
        number = _exact(given)
        if number is None or number.of_pi or number.value.denominator != 1:
            raise place.refusal(f"{shown(given)} is not {self.allowed}")
        if not self.low <= number.value <= self.high:
            raise place.refusal(f"{shown(given)} is out of range; write {self.allowed}")
        return int(number.value)

    def schema(self) -> Schema:
        bounds = {"type": "integer", "minimum": self.low, "maximum": self.high}
        return {"anyOf": [bounds, {"type": "string", "pattern": r"^\s*[+-]?[0-9.][0-9.eE+/\s-]*$"}]}


@dataclass(frozen=True)
class Number(Kind[Exact]):
    """An exact number that float64 can hold: a decimal, ``p/q`` or a multiple of pi."""

    @property
    def allowed(self) -> str:
        return "a number: a decimal, p/q or a multiple of pi"

    def read(self, given: Any, place: Place) -> Exact:
        number = _exact(given)
        if number is None:
            raise place.refusal(_fault(given) or f"{shown(given)} is not {self.allowed}")
        size = abs(float(number))
        if size == float("inf") or (size == 0 and number.value != 0):
            raise place.refusal(f"{shown(given)} is out of range; write 0 or a size from 1e-300 to 1e300")
        return number

    def schema(self) -> Schema:
        return dict(NUMBER_SCHEMA)

    def write(self, value: Exact) -> Any:
        return str(value)


@dataclass(frozen=True)
class Measure(Kind[float]):
    """A number between two bounds, both included, of which only the float64 value matters."""

    low: float
    high: float

    @property
    def allowed(self) -> str:
        return f"a number from {self.low:g} to {self.high:g}"

    def read(self, given: Any, place: Place) -> float:
        number = _exact(given)
        if number is None:
            raise place.refusal(f"{shown(given)} is not {self.allowed}")
        if not self.low <= float(number) <= self.high:
            raise place.refusal(f"{shown(given)} is out of range; write {self.allowed}")
        return float(number)

    def schema(self) -> Schema:
        number, text = NUMBER_SCHEMA["anyOf"]
        return {"anyOf": [{**number, "minimum": self.low, "maximum": self.high}, text]}

    def write(self, value: float) -> Any:
        return repr(value)


@dataclass(frozen=True)
class Colour(Kind[str]):
    """A colour: ``#rrggbb``, ``#rgb``, ``white`` or ``black``; kept as ``#rrggbb`` in lower case."""

    @property
    def allowed(self) -> str:
        return "white, black or a colour such as '#f0f0f0', in quotation marks because # starts a comment"

    def read(self, given: Any, place: Place) -> str:
        try:
            return "#{:02x}{:02x}{:02x}".format(*colour(given if isinstance(given, str) else ""))
        except PaletteRefused:
            raise place.refusal(f"{shown(given)} is not {self.allowed}") from None

    def schema(self) -> Schema:
        return {"type": "string", "pattern": "^(#[0-9a-fA-F]{3}|#[0-9a-fA-F]{6}|white|black)$"}


@dataclass(frozen=True)
class OrWord(Kind[Any]):
    """Another kind, or one word with a meaning of its own (``samples: auto``)."""

    word: str
    other: Kind[Any]

    @property
    def allowed(self) -> str:
        return f"{self.word}, or {self.other.allowed}"

    def read(self, given: Any, place: Place) -> Any:
        if isinstance(given, str):
            if given == self.word:
                return self.word
            if _exact(given) is None:
                raise place.refusal(f"{shown(given)} is not {self.allowed}")
        return self.other.read(given, place)

    def schema(self) -> Schema:
        return {"anyOf": [{"const": self.word}, self.other.schema()]}

    def write(self, value: Any) -> Any:
        return value if value == self.word else self.other.write(value)


def _exact(given: Any) -> Exact | None:
    """Return the number, or None where it is none."""
    if isinstance(given, bool) or not isinstance(given, str | Real | Decimal | Exact):
        return None
    if isinstance(given, str) and not given.isascii():
        return None
    try:
        if isinstance(given, Exact):
            return Exact(exact(given.value).value, given.of_pi)
        return exact(given)  # type: ignore[arg-type]
    except NumberRefused:
        return None


def _fault(given: Any) -> str:
    """Return what is wrong with a text that is no number, where that can be said more closely."""
    if not isinstance(given, str) or not given.isprintable():
        return ""
    try:
        exact(given)
    except NumberRefused as problem:
        return str(problem)
    return ""
