"""Published values, with where they come from; the records stand in ``published_values.json``."""

from __future__ import annotations

import json
from dataclasses import dataclass
from fractions import Fraction
from functools import cache
from pathlib import Path
from typing import Any


@dataclass(frozen=True)
class Published:
    """One record.

    Attributes
    ----------
    id, family, formula, quantity : str
    parameters : dict
    value : str, list or dict
        Numbers are texts with as many digits as were verified.
    tolerance, source, how_verified, source_citation, note : str
        ``source_citation`` says whether the citation was looked up or written from memory.
    from_memory : bool
        Whether only the leading digits were confirmed.
    """

    id: str
    family: str
    formula: str
    parameters: dict[str, Any]
    quantity: str
    value: Any
    tolerance: str
    source: str
    how_verified: str
    from_memory: bool
    source_citation: str
    note: str

    def number(self, *path: str | int) -> Fraction:
        """Return the value, or the part of it at a path of keys and places, exactly as printed."""
        part = self.value
        for step in path:
            part = part[step]
        return Fraction(part)


@cache
def _records() -> dict[str, Published]:
    text = (Path(__file__).parent / "published_values.json").read_text(encoding="ascii")
    return {record["id"]: Published(**record) for record in json.loads(text)}


def published(name: str) -> Published:
    """Return the record of an id such as ``log.pd.1``."""
    return _records()[name]


def ids(prefix: str) -> list[str]:
    """Return the ids that begin with a prefix, in the order of the file."""
    return [name for name in _records() if name.startswith(prefix)]
