"""The JSON Schema of a config, for editors, and its keys as text for people."""

from __future__ import annotations

from typing import Any, NamedTuple

from atlas.config.keys import CONFIG_KEYS, DEFAULT_KEYS, SECTIONS
from atlas.config.names import NAME_PATTERN
from atlas.families.keys import FAMILY_KEYS
from atlas.formula.expression import IDENTIFIER as FAMILY_NAME
from atlas.reading.kinds import Schema, Text
from atlas.reading.section import section_schema

DRAFT = "https://json-schema.org/draft/2020-12/schema"


class KeyRow(NamedTuple):
    """One key of a config as the documentation lists it."""

    section: str
    name: str
    allowed: str
    default: str
    meaning: str


def schema() -> dict[str, Any]:
    """Return the JSON Schema (draft 2020-12) of a config file.

    Scalars may be of the type that an editor's YAML reader gives them, or texts. What only shows when the
    parts are put together (names of families, order of intervals) is checked by `atlas.config.load` alone.

    Returns
    -------
    dict
        To be written as JSON.
    """
    sections: dict[str, Schema] = {
        "title": Text().schema(),
        "families": _named(section_schema(FAMILY_KEYS), FAMILY_NAME),
        "defaults": section_schema(DEFAULT_KEYS),
        **{section: _named(section_schema(keys), NAME_PATTERN) for section, keys in SECTIONS.items()},
    }
    properties = {
        name: {"anyOf": [entry, {"enum": [None, ""]}], "description": CONFIG_KEYS[name]}
        for name, entry in sections.items()
    }
    return {
        "$schema": DRAFT,
        "title": "Config of plates, tile sets and figures of iterated maps",
        "type": "object",
        "additionalProperties": False,
        "properties": properties,
    }


def key_rows() -> tuple[KeyRow, ...]:
    """Return every key of families, plates, tile sets and figures, in the order of the tables."""
    rows = []
    for section, keys in {"families": FAMILY_KEYS, **SECTIONS}.items():
        for key in keys:
            default = "required" if key.required else _default_text(key.write(key.default))
            rows.append(KeyRow(section, key.name, key.kind.allowed, default, key.meaning))
    return tuple(rows)


def _named(entry: Schema, pattern: str) -> Schema:
    return {"type": "object", "additionalProperties": False, "patternProperties": {f"^{pattern}$": entry}}


def _default_text(written: Any) -> str:
    if written in (None, {}, [], ""):
        return "none"
    if isinstance(written, list):
        return ", ".join(str(entry) for entry in written)
    if isinstance(written, dict):
        return ", ".join(f"{name} {value}" for name, value in written.items())
    return str(written).lower() if isinstance(written, bool) else str(written)
