"""Axes as they are asked for, with or without ends; ends left out come from a first pass over the points."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace
from decimal import Decimal
from fractions import Fraction
from typing import Any, cast

import numpy as np
from numpy.typing import NDArray

from atlas.errors import PointsRefused, shown
from atlas.points.tables import Table
from atlas.reading.place import REQUEST as REQUEST
from atlas.reading.place import Place
from atlas.reading.section import read_section
from atlas.reading.view_kinds import AXIS_KEYS
from tiles.errors import WindowRefused
from tiles.number import Exact, exact
from tiles.window import Axis, Scale, View

_KEYS = tuple(replace(key, required=key.name == "name") for key in AXIS_KEYS)
_DIGITS = 2

AxisGiven = Axis | str | Iterable[Any] | Mapping[str, Any]


@dataclass(frozen=True)
class AskedAxis:
    """An axis whose ends may be left open.

    Attributes
    ----------
    name : str
        The column that runs along it.
    low, high : Exact or None
        None is the end of the data.
    scale : str
        ``linear`` or ``log``.
    label : str or None
        What a figure prints instead of the name.
    """

    name: str
    low: Exact | None
    high: Exact | None
    scale: str
    label: str | None

    @classmethod
    def read(cls, given: AxisGiven, place: Place) -> AskedAxis:
        """Read ``"name"``, ``("name", low, high)``, an `Axis` or a mapping; an end that is None is open.

        Raises
        ------
        ConfigRefused
            For anything else.
        """
        if isinstance(given, Axis):
            return cls(given.name, given.low, given.high, given.scale, given.label)
        if isinstance(given, str):
            given = {"name": given}
        if not isinstance(given, Mapping):
            if not isinstance(given, list | tuple) or len(given) != 3:
                raise place.refusal(f"{shown(given)} is no axis; write a column or (column, low, high)")
            given = dict(zip(("name", "low", "high"), given, strict=True))
        values = read_section(_KEYS, {key: end for key, end in given.items() if end is not None}, place)
        asked = cls(**values)
        if asked.low is not None and asked.high is not None:
            asked.between(asked.low, asked.high, place)
        elif asked.low is not None and asked.scale == "log" and asked.low.value <= 0:
            raise place.refusal(f"a log axis cannot start at {asked.low}; give a low end above 0")
        return asked

    @property
    def open(self) -> bool:
        """Whether an end is left to the data."""
        return self.low is None or self.high is None

    def between(self, low: Exact, high: Exact, place: Place) -> Axis:
        """Return the axis with these ends where its own are open.

        Raises
        ------
        ConfigRefused
            When it is empty, reversed, or reaches 0 on a log axis.
        """
        ends = (low if self.low is None else self.low, high if self.high is None else self.high)
        try:
            return Axis(self.name, *ends, cast(Scale, self.scale), self.label)
        except WindowRefused as problem:
            raise place.refusal(str(problem)) from None


class Extent:
    """The smallest and the largest of finite values seen, and the smallest above 0.

    Attributes
    ----------
    low, high, positive : float
        Infinite as long as there are none.
    """

    def __init__(self) -> None:
        self.low, self.high, self.positive = math.inf, -math.inf, math.inf

    def add(self, values: NDArray[np.float64]) -> None:
        """See some finite values, at least one."""
        self.low, self.high = min(self.low, float(values.min())), max(self.high, float(values.max()))
        self.positive = min(self.positive, float(values.min(where=values > 0, initial=math.inf)))


def view_of(table: Table, across: AskedAxis, up: AskedAxis, rows: int, place: Place) -> View:
    """Return the view, its open ends taken from the points.

    Parameters
    ----------
    table : Table
        Read once where an end is open.
    across, up : AskedAxis
    rows : int
        Points read at a time.
    place : Place
        Where ``across`` and ``up`` were asked for.

    Raises
    ------
    ConfigRefused
        When both axes are the same column, or an interval is empty.
    PointsRefused
        When the table does not have the columns, or has no finite point.
    """
    if across.name == up.name:
        raise place.at("up").refusal(
            f"{shown(up.name)} stands on both axes; a view needs two different columns"
        )
    table.check((across.name, up.name))
    extents = Extent(), Extent()
    if across.open or up.open:
        if table.once:
            raise PointsRefused(
                f"{table.where}: these chunks can be read only once, so both axes need their ends, "
                f"for instance ({shown(across.name)}, 0, 1)"
            )
        _look(table, across.name, up.name, rows, extents)
    return View(
        _closed(across, extents[0], place.at("across")),
        _closed(up, extents[1], place.at("up")),
    )


def _look(table: Table, across: str, up: str, rows: int, extents: tuple[Extent, Extent]) -> None:
    for chunk in table.chunks(across, up, rows):
        finite = np.isfinite(chunk[0]) & np.isfinite(chunk[1])
        if finite.any():
            for extent, values in zip(extents, chunk, strict=True):
                extent.add(values[finite])
    if extents[0].low > extents[0].high:
        raise no_points(table, across, up)


def no_points(table: Table, across: str, up: str) -> PointsRefused:
    """Return the refusal of a table without a single point."""
    return PointsRefused(
        f"{table.where}: there is no row in which both {shown(across)} and {shown(up)} are finite numbers"
    )


def _closed(asked: AskedAxis, extent: Extent, place: Place) -> Axis:
    if asked.low is not None and asked.high is not None:
        return asked.between(asked.low, asked.high, place)
    if asked.scale == "log" and asked.low is None and extent.low <= 0:
        least = "" if math.isinf(extent.positive) else f"; the smallest value above 0 is {extent.positive!r}"
        raise place.refusal(
            f"the column {shown(asked.name)} goes down to {extent.low!r}, which a log axis cannot show; "
            f"give the low end{least}"
        )
    return asked.between(*readable(extent.low, extent.high, logarithmic=asked.scale == "log"), place)


def readable(low: float, high: float, *, logarithmic: bool = False) -> tuple[Exact, Exact]:
    """Return an interval that holds another one, with ends of few digits.

    Each end moves outwards to a multiple of a power of ten, which is between 1/1000 and 1/100 of the
    interval; on a log axis of that end itself where it is smaller.

    Parameters
    ----------
    low, high : float
        Finite. Equal ends are moved apart by the smallest such power, 1 around 0.
    logarithmic : bool
        Whether both ends are above 0 and must stay so.

    Examples
    --------
    >>> [str(end) for end in readable(0.0123, 9.987)]
    ['0.01', '9.99']
    """
    ends = exact(low).value, exact(high).value
    span = ends[1] - ends[0] or abs(ends[0]) or Fraction(100)
    steps = [_power_below(min(span, abs(end)) if logarithmic else span) for end in ends]
    first, last = math.floor(ends[0] / steps[0]), math.ceil(ends[1] / steps[1])
    if ends[0] == ends[1]:
        first, last = first - 1, last + 1
    return Exact(first * steps[0]), Exact(last * steps[1])


def _power_below(size: Fraction) -> Fraction:
    magnitude = (Decimal(size.numerator) / size.denominator).adjusted()
    return Fraction(10) ** (magnitude - _DIGITS)
