"""Sections of a config: one table of keys serves the reader, the editor schema and the documentation."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any, Generic, TypeVar

from atlas.reading.kinds import Kind, Schema
from atlas.reading.place import Place, shown
from tiles.errors import nearest

T = TypeVar("T")


@dataclass(frozen=True)
class Key(Generic[T]):
    """One key of a section: a row of the table that reader, editor schema and documentation share.

    Attributes
    ----------
    name : str
        The key.
    kind : Kind
        What it may hold.
    default : value of that kind, or None
        What holds when the key is absent.
    meaning : str
        One sentence for the documentation.
    required : bool
        Whether the key must be given; its default is then never used.
    shared : bool
        Whether ``defaults:`` may hold it for every output.
    counts : bool
        Whether it changes the counts, and not only how they are drawn.
    only_for : tuple of str
        Kinds of view that it belongs to; empty where it belongs to all.
    """

    name: str
    kind: Kind[T]
    default: T | None
    meaning: str
    required: bool = False
    shared: bool = False
    counts: bool = False
    only_for: tuple[str, ...] = ()

    def read(self, given: Any, place: Place) -> T:
        """Return the value given at ``place``, which is that of the key itself."""
        if given is None or (isinstance(given, str) and not given.strip()):
            raise place.refusal(f"the key has no value; write {self.kind.allowed}")
        return self.kind.read(given, place)

    def write(self, value: T | None) -> Any:
        """Return the value as JSON holds it; absent values are None."""
        return None if value is None else self.kind.write(value)


def read_section(
    keys: Sequence[Key[Any]], given: Any, place: Place, defaults: Mapping[str, Any] | None = None
) -> dict[str, Any]:
    """Read a mapping by a table of keys.

    Parameters
    ----------
    keys : sequence of Key
        The table.
    given : mapping
        What was found.
    place : Place
        Where.
    defaults : mapping, optional
        Values, already read, that go before the defaults of the table.

    Returns
    -------
    dict
        A value for every key of the table, in its order.

    Raises
    ------
    ConfigRefused
        When ``given`` is no mapping, holds an unknown key, lacks a required one or holds a wrong value.
    """
    table = {key.name: key for key in keys}
    for word in text_keys(given, place):
        if word not in table:
            raise place.refusal(f"the key {shown(word)} is unknown{nearest(word, table)}")
    values: dict[str, Any] = {}
    for name, key in table.items():
        if name in given:
            values[name] = key.read(given[name], place.at(name))
        elif key.required:
            raise place.refusal(f"the key '{name}' is missing; write {key.kind.allowed}")
        else:
            values[name] = (defaults or {}).get(name, key.default)
    return values


def text_keys(given: Any, place: Place) -> tuple[str, ...]:
    """Return the keys of a mapping, refusing what is no mapping and keys that are not text."""
    if not isinstance(given, Mapping):
        raise place.refusal(f"{shown(given)} stands where a mapping of keys belongs")
    for key in given:
        if not isinstance(key, str):
            raise place.refusal(f"the key {shown(key)} is not text; put it in quotation marks")
    return tuple(given)


def section_schema(keys: Sequence[Key[Any]]) -> Schema:
    """Return the JSON Schema of a mapping with these keys."""
    schema: Schema = {"type": "object", "additionalProperties": False, "properties": {}}
    for key in keys:
        entry = {**key.kind.schema(), "description": key.meaning}
        if key.default is not None and not key.required:
            entry["default"] = key.write(key.default)
        schema["properties"][key.name] = entry
    if required := [key.name for key in keys if key.required]:
        schema["required"] = required
    return schema
