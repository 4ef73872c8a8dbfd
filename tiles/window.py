"""Axes and views: exact intervals whose cell edges are computed from integers, never accumulated."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from decimal import Decimal, localcontext
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from tiles.errors import NumberRefused, WindowRefused, nearest
from tiles.number import PI, Exact, exact

Scale = Literal["linear", "log"]
_DIGITS = 60
_AXIS_KEYS = ("name", "low", "high", "scale", "label")


@dataclass(frozen=True)
class Axis:
    """A named interval, linear or logarithmic, that can be cut into any number of equal cells.

    Attributes
    ----------
    name : str
        The parameter, state variable or data column that runs along it.
    low, high : Exact
        Ends of the interval, ``low < high``; both positive on a logarithmic axis.
    scale : {"linear", "log"}
        Cells are equal in the value or in its logarithm.
    label : str, optional
        What a figure prints instead of the name.
    """

    name: str
    low: Exact
    high: Exact
    scale: Scale = "linear"
    label: str | None = None

    def __post_init__(self) -> None:
        if self.scale not in ("linear", "log"):
            hint = nearest(str(self.scale), ("linear", "log"))
            raise WindowRefused(f"axis '{self.name}': scale '{self.scale}' is unknown{hint}")
        if not self.low < self.high:
            raise WindowRefused(
                f"axis '{self.name}': the interval from {self.low} to {self.high} is empty or reversed; "
                "give the lower end first"
            )
        if self.scale == "log" and self.low.value <= 0:
            raise WindowRefused(
                f"axis '{self.name}': a log axis cannot start at {self.low}; give a low end above 0"
            )
        if self.low.of_pi != self.high.of_pi and 0 not in (self.low.value, self.high.value):
            raise WindowRefused(
                f"axis '{self.name}': {self.low} and {self.high} mix multiples of pi with plain numbers; "
                "write both ends in one way"
            )
        if not np.all(np.isfinite([float(self.low), float(self.high)])):
            raise WindowRefused(f"axis '{self.name}': {self.low} to {self.high} is beyond float64")

    @classmethod
    def make(cls, given: Axis | Sequence[Any] | Mapping[str, Any]) -> Axis:
        """Read an axis from ``(name, low, high)`` or a mapping of name, low, high, scale, label."""
        if isinstance(given, Axis):
            return given
        if isinstance(given, Mapping):
            return cls._from_mapping(given)
        if isinstance(given, str) or not isinstance(given, Sequence) or len(given) != 3:
            raise WindowRefused(f"an axis is written [name, low, high], not {given!r}")
        name, low, high = given
        return cls(str(name), _end(name, low), _end(name, high))

    @classmethod
    def _from_mapping(cls, given: Mapping[str, Any]) -> Axis:
        for key in given:
            if key not in _AXIS_KEYS:
                raise WindowRefused(f"an axis has no key '{key}'{nearest(str(key), _AXIS_KEYS)}")
        for key in ("name", "low", "high"):
            if key not in given:
                raise WindowRefused(f"an axis needs the key '{key}'")
        name = str(given["name"])
        return cls(
            name,
            _end(name, given["low"]),
            _end(name, given["high"]),
            given.get("scale", "linear"),
            given.get("label"),
        )

    @property
    def of_pi(self) -> bool:
        """Whether the ends are multiples of pi."""
        return self.low.of_pi or self.high.of_pi

    def edges(self, cells: int, first: int = 0, last: int | None = None) -> NDArray[np.float64]:
        """Return edges ``first … last`` of the axis cut into equal cells, each exact and rounded once.

        Parameters
        ----------
        cells : int
            Into how many cells the whole axis is cut.
        first, last : int
            Range of edges, both included; the default is all ``cells + 1`` of them.

        Returns
        -------
        ndarray of float64, shape (last - first + 1,)
        """
        last = cells if last is None else last
        return self._points(first, 1, last - first + 1, cells)

    def centres(self, cells: int, first: int = 0, last: int | None = None) -> NDArray[np.float64]:
        """Return the centres of cells ``first … last - 1``; on a log axis, centres in the exponent."""
        last = cells if last is None else last
        return self._points(2 * first + 1, 2, last - first, 2 * cells)

    def values(
        self, cells: int, per_cell: int, first: int = 0, last: int | None = None
    ) -> NDArray[np.float64]:
        """Return ``per_cell`` evenly spread values inside each of the cells ``first … last - 1``.

        Value s of cell c is ``low + (c + (s + 1/2) / per_cell) * width``, exact and rounded once.

        Returns
        -------
        ndarray of float64, shape (last - first, per_cell)
        """
        last = cells if last is None else last
        count = (last - first) * per_cell
        flat = self._points(2 * first * per_cell + 1, 2, count, 2 * cells * per_cell)
        return flat.reshape(last - first, per_cell)

    def cell_size(self, cells: int) -> float:
        """Return the size of one cell: in the axis' units, or in natural log units on a log axis."""
        if self.scale == "log":
            with localcontext() as context:
                context.prec = _DIGITS
                return float((self.high.as_decimal() / self.low.as_decimal()).ln() / cells)
        size = (self.high.value - self.low.value) / cells
        return float(Exact(size, self.of_pi))

    def _points(self, start: int, step: int, count: int, parts: int) -> NDArray[np.float64]:
        parts = int(parts)  # a NumPy integer would overflow below
        indices = range(start, start + step * count, step)
        if self.scale == "log":
            return np.fromiter(self._log_points(indices, parts), np.float64, count)
        low, width = self.low.value, self.high.value - self.low.value
        bottom = low.denominator * width.denominator * parts
        base = low.numerator * width.denominator * parts
        stride = width.numerator * low.denominator
        if self.of_pi:
            with localcontext() as context:
                context.prec = 80
                return np.fromiter((float(PI * (base + stride * k) / bottom) for k in indices), float, count)
        return np.fromiter(((base + stride * k) / bottom for k in indices), np.float64, count)

    def _log_points(self, indices: range, parts: int) -> list[float]:
        coarse = 1024
        with localcontext() as context:
            context.prec = _DIGITS
            low = self.low.as_decimal()
            unit = (self.high.as_decimal() / low).ln() / parts
            fine: dict[int, Decimal] = {}
            large: dict[int, Decimal] = {}
            points = []
            for index in indices:
                block, rest = divmod(index, coarse)
                if rest not in fine:
                    fine[rest] = (unit * rest).exp()
                if block not in large:
                    large[block] = low * (unit * (block * coarse)).exp()
                points.append(float(large[block] * fine[rest]))
        if indices and indices[0] == 0:
            points[0] = float(self.low)
        if indices and indices[-1] == parts:
            points[-1] = float(self.high)
        return points


@dataclass(frozen=True, init=False)
class View:
    """Two axes with their intervals: what is drawn, or cut into tiles.

    Parameters
    ----------
    across, up : Axis, (name, low, high) or mapping
        The horizontal and the vertical axis.

    Raises
    ------
    WindowRefused
        When an axis is malformed or both carry the same name.

    Examples
    --------
    >>> View(across=("r", "2.8", "4"), up=("x", 0, 1)).across.cell_size(12)
    0.1
    """

    across: Axis
    up: Axis

    def __init__(
        self,
        across: Axis | Sequence[Any] | Mapping[str, Any],
        up: Axis | Sequence[Any] | Mapping[str, Any],
    ) -> None:
        object.__setattr__(self, "across", Axis.make(across))
        object.__setattr__(self, "up", Axis.make(up))
        if self.across.name == self.up.name:
            raise WindowRefused(f"'{self.across.name}' stands on both axes; a view needs two different ones")


def _end(name: Any, given: Any) -> Exact:
    try:
        return exact(given)
    except NumberRefused as problem:
        raise WindowRefused(f"axis '{name}': {problem}") from None
