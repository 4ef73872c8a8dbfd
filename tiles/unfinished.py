"""An index that is being built: its header, and going on with one that an interrupted run left."""

from __future__ import annotations

import json
import sqlite3
from collections.abc import Mapping
from pathlib import Path
from typing import Any, TypeVar

from tiles.errors import IndexRefused
from tiles.grid import TILE, Pair
from tiles.index import Index
from tiles.store import shared, written
from tiles.window import Axis, View

Kind = TypeVar("Kind", bound=Index)


def continued(kind: type[Kind], path: Path, header: Mapping[str, Any]) -> Kind:
    """Open an unfinished index of the same header, or start a new one.

    Parameters
    ----------
    kind : type
        ``Index`` or a class derived from it.
    path : Path
    header : mapping
        JSON-able.

    Raises
    ------
    OutputFailed
        When the file cannot be written or another run holds it.
    """
    index = _opened(kind, path)
    if index is not None:
        if index.header == json.loads(json.dumps(header)):
            return index
        index.close()
    with written(path):
        for name in (path.name, f"{path.name}-wal", f"{path.name}-shm", f"{path.name}-journal"):
            (path.parent / name).unlink(missing_ok=True)
    return kind.create(path, header)


def _opened(kind: type[Kind], path: Path) -> Kind | None:
    """Open an unfinished index; None where there is none, or only the torn beginning of one.

    One that another run holds is no torn one: it is reported, and stays.
    """
    try:
        index = kind.open(path, write=True, finished=False)
    except (IndexRefused, sqlite3.DatabaseError):
        return None
    try:
        with shared(path):
            index.record("header")
    except sqlite3.DatabaseError:
        index.close()
        return None
    except BaseException:
        index.close()
        raise
    return index


def geometry(view: View, pairs: tuple[Pair, ...]) -> dict[str, Any]:
    """Return the entries of a header that say what is cut into tiles and which level pairs are built."""
    return {
        "view": {"across": _axis(view.across), "up": _axis(view.up)},
        "levels": {"across": pairs[-1][0], "up": pairs[-1][1]},
        "pairs": [list(pair) for pair in pairs],
        "tile": TILE,
    }


def _axis(axis: Axis) -> dict[str, Any]:
    return {
        "name": axis.name,
        "low": str(axis.low),
        "high": str(axis.high),
        "scale": axis.scale,
        "label": axis.label,
    }
