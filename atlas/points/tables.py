"""Tables of points that are read in chunks: two columns of numbers, wherever they come from."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

from atlas.errors import PointsRefused, shown
from atlas.reading.place import brief
from tiles.errors import nearest

ROWS_PER_CHUNK = 1 << 18
_MOST_NAMES = 12
_KINDS = {"b": "truth values", "M": "dates", "m": "time spans", "c": "complex numbers", "V": "records"}
_TEXT = "texts"

Chunk = tuple[NDArray[np.float64], NDArray[np.float64]]


class Table(Protocol):
    """Points as rows of a table with named columns.

    Attributes
    ----------
    where : str
        How a sentence calls it.
    file : str or None
        Name of the file, without its folder.
    once : bool
        Whether it can be read one time only.
    """

    @property
    def where(self) -> str:
        """How a sentence calls the table."""

    @property
    def file(self) -> str | None:
        """Name of the file, without its folder; None when the points come from the caller's memory."""

    @property
    def once(self) -> bool:
        """Whether the table can be read one time only."""

    def rows(self) -> int:
        """Return how many rows there are, 0 when that is not known before reading."""

    def digest(self) -> str | None:
        """Return a digest of the file's bytes, None where there is no file."""

    def check(self, columns: Iterable[str]) -> None:
        """Refuse columns that the table does not have, as far as that is known before reading."""

    def chunks(self, across: str, up: str, rows: int) -> Iterator[Chunk]:
        """Yield the values of two columns, at most ``rows`` at a time; a missing value is NaN."""


class MemoryTable:
    """A DataFrame, a mapping of arrays or a structured array."""

    file = None
    once = False

    def __init__(self, held: Any, where: str = "points") -> None:
        self.held, self.where = held, where

    def rows(self) -> int:
        """Return 0: columns may still turn out to differ in length."""
        return 0

    def digest(self) -> str | None:
        """Return None: there is no file."""
        return None

    def check(self, columns: Iterable[str]) -> None:
        """Refuse columns that the table does not have."""
        labels = labels_of(self.held)
        if labels is None:
            raise PointsRefused(f"{self.where}: columns have no names; give a DataFrame or a dict of arrays")
        for column in columns:
            check_column(column, [str(label) for label in labels], self.where)

    def chunks(self, across: str, up: str, rows: int) -> Iterator[Chunk]:
        """Yield the values of two columns, at most ``rows`` at a time."""
        self.check((across, up))
        both = {name: self._column(name) for name in (across, up)}
        length, other = (len(column) for column in both.values())
        if length != other:
            raise PointsRefused(
                f"{self.where}: {shown(across)} holds {length} values and {shown(up)} {other}; "
                "the columns must be equally long"
            )
        for first in range(0, length, rows):
            at = slice(first, first + rows)
            parts = (_numbers(column, at, name, self.where) for name, column in both.items())
            yield next(parts), next(parts)

    def _column(self, name: str) -> Any:
        labels = labels_of(self.held) or ()
        column = self.held[next(label for label in labels if str(label) == name)]
        return column if hasattr(column, "__array__") else np.asarray(column)


class StreamTable:
    """An iterable of chunks, each a DataFrame, a mapping of arrays or a structured array."""

    file = None
    where = "points"

    def __init__(self, held: Iterable[Any]) -> None:
        self.held = held
        self.once = iter(held) is held

    def rows(self) -> int:
        """Return 0: the number of rows is not known before reading."""
        return 0

    def digest(self) -> str | None:
        """Return None: there is no file."""
        return None

    def check(self, columns: Iterable[str]) -> None:
        """Do nothing: the columns are known chunk by chunk."""

    def chunks(self, across: str, up: str, rows: int) -> Iterator[Chunk]:
        """Yield the values of two columns, at most ``rows`` at a time."""
        for number, chunk in enumerate(self.held, 1):
            yield from MemoryTable(chunk, f"points, chunk {number}").chunks(across, up, rows)


def check_column(column: str, names: list[str], where: str) -> None:
    """Refuse a column that a table does not have, or has twice."""
    if column not in names:
        raise PointsRefused(f"{where}: there is no column {shown(column)}{_hint(column, names)}")
    if names.count(column) > 1:
        raise PointsRefused(f"{where}: two columns are called {shown(column)}; rename one")


def not_numbers(column: str, where: str, what: str) -> PointsRefused:
    """Return the refusal of a column that holds something else than numbers."""
    return PointsRefused(f"{where}: the column {shown(column)} holds {what}, not numbers; choose another")


def _hint(column: str, names: list[str]) -> str:
    listed = [brief(name) for name in names]
    hint = nearest(column, listed)
    if hint.startswith("; allowed") and len(names) > _MOST_NAMES:
        return f"; among its {len(names)} columns are {', '.join(listed[:_MOST_NAMES])}"
    return hint


def labels_of(held: Any) -> list[Any] | None:
    """Return what the columns of a value are called, None where it has none with names."""
    if isinstance(held, Mapping):
        return list(held)
    found = getattr(held, "columns", None)
    if found is None:
        found = getattr(getattr(held, "dtype", None), "names", None)
    return None if found is None else list(found)


def _numbers(column: Any, at: slice, name: str, where: str) -> NDArray[np.float64]:
    """Return a part of a column as float64, NaN where a value is missing."""
    part = column.iloc[at] if hasattr(column, "iloc") else column[at]
    kind = getattr(part.dtype, "kind", "O")
    if kind in _KINDS or kind in "SU":
        raise not_numbers(name, where, _KINDS.get(kind, _TEXT))
    try:
        if hasattr(part, "iloc"):
            found = part.to_numpy(dtype=np.float64, na_value=np.nan)
        else:
            found = np.ma.filled(np.ma.asarray(part, dtype=np.float64), np.nan)
    except (TypeError, ValueError):
        raise not_numbers(name, where, f"{_TEXT} or other values") from None
    if found.ndim != 1:
        raise PointsRefused(f"{where}: the column {shown(name)} has {found.ndim} dimensions; give one")
    return np.asarray(found, dtype=np.float64)
