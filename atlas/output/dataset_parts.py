"""What the Datasets for notebooks share: the resolution asked for, and what coordinates say of their axes."""

from __future__ import annotations

from decimal import Decimal
from fractions import Fraction
from typing import Any

from atlas.reading.kinds import Whole
from atlas.reading.place import Place, shown
from tiles.number import Exact
from tiles.window import Axis

Number = str | int | float | Fraction | Decimal | Exact
KIND = "dataset"
_CELLS = Whole(1, 1 << 31)


def cells_of(size: Any, place: Place) -> tuple[int, int]:
    """Return a resolution, refused where it is none."""
    if not isinstance(size, tuple | list) or len(size) != 2:
        raise place.refusal(f"{shown(size)} is no resolution; write (columns, rows)")
    across, up = (_CELLS.read(cells, place.at(number)) for number, cells in enumerate(size, 1))
    return across, up


def axis_attributes(axis: Axis, label: str, unit: str) -> dict[str, Any]:
    """Return what a coordinate says of its axis."""
    return {
        "long_name": axis.label or label or axis.name,
        "units": unit,
        "scale": axis.scale,
        "low": str(axis.low),
        "high": str(axis.high),
    }
