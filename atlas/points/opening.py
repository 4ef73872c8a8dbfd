"""From what the caller calls points to a table that is read in chunks."""

from __future__ import annotations

import os
from collections.abc import Iterable
from pathlib import Path
from typing import Any

from atlas.errors import PointsRefused
from atlas.points.files import file_table
from atlas.points.tables import MemoryTable, StreamTable, Table, labels_of
from atlas.reading.place import brief


def table_of(points: Any) -> Table:
    """Return a table of points.

    Parameters
    ----------
    points : path, DataFrame, mapping of arrays, structured array or iterable of such
        A path ends in .csv or .parquet.

    Raises
    ------
    PointsRefused
        For anything else, and for a file that is not there.
    """
    if isinstance(points, str | os.PathLike):
        return file_table(Path(points))
    if labels_of(points) is not None:
        return MemoryTable(points)
    if isinstance(points, Iterable) and not isinstance(points, bytes):
        return StreamTable(points)
    raise PointsRefused(
        f"points: a value of type {brief(type(points).__name__)} holds no points; give a path, a DataFrame, "
        "a dict of arrays or an iterable of such"
    )
