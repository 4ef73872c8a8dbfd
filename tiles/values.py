"""From values such as exponents to palette indices: ranges are fitted once, then shading is a pure look-up.

As with densities a cell is one byte: 0 is a cell without a value, 1 to ``LEVELS`` are the shades. Which value
gets which shade stands in a `ValueFit`, ``LEVELS - 1`` ascending values, and nothing else decides: a mosaic
of shaded tiles equals the shaded mosaic. There are three kinds, one for each kind of palette:

- ``diverging``: zero lies in the middle of the ramp. Each side is scaled on its own, in equal steps from 0 to
  the value that 99 % of the cells on that side do not exceed in size, so that both colours are used where one
  sign is much larger than the other; but to 1/32 of the other side at least, so that what scatters around
  zero stays pale.
- ``cyclic``: the fractional part, in equal steps. Shade 1 is centred on 0, so that halves, thirds, quarters,
  sixths, eighths and ninths stand in the middle of a shade: what scatters around them does not flicker.
- ``sequential``: by the shadings known from densities. ``equalised``, the default, gives every shade an equal
  share of the cells; ``logarithmic`` equal ratios of the positive values; ``linear`` equal steps between the
  values that 1 % and 99 % of the cells do not exceed; with ``ink`` every value has the highest shade.
"""

from __future__ import annotations

import json
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from tiles.curve import LEVELS, SHADINGS, thresholds
from tiles.errors import Refusal, nearest
from tiles.key import fraction_labels, signed_labels, value_labels
from tiles.tally import Floats

__all__ = ["KINDS", "ValueFit", "ValuesRefused", "fit_values", "shade_values", "value_key_labels"]

KINDS = ("sequential", "diverging", "cyclic")
_HALF = LEVELS // 2
_FEW, _NEARLY_ALL = 0.01, 0.99
_LEAST_SIDE = 32.0
_BLOCK = 1 << 17


class ValuesRefused(Refusal):
    """An unknown kind of values, or a record of a fit that is none."""


@dataclass(frozen=True, eq=False)
class ValueFit:
    """The values at which one shade ends and the next begins.

    Attributes
    ----------
    kind : {"sequential", "diverging", "cyclic"}
    low, high : float
        Values at the ends of the ramp; what lies beyond has the shade of the end.
    thresholds : ndarray of float64, shape (LEVELS - 1,)
        Ascending; a cell has shade 1 + the number of thresholds at or below its value.
    """

    kind: str
    low: float
    high: float
    thresholds: Floats

    def __post_init__(self) -> None:
        _known(self.kind)
        held = np.array(self.thresholds, dtype=np.float64)
        held.flags.writeable = False
        object.__setattr__(self, "thresholds", held)

    def __eq__(self, other: object) -> bool:
        return isinstance(other, ValueFit) and self.to_json() == other.to_json()

    def __hash__(self) -> int:
        return hash((self.kind, self.thresholds.tobytes()))

    @property
    def centre(self) -> float | None:
        """The value in the middle of a diverging ramp."""
        return 0.0 if self.kind == "diverging" else None

    def to_json(self) -> str:
        """Return the fit as ASCII JSON; :meth:`from_json` gives the same bits back."""
        record = {"kind": self.kind, "low": self.low, "high": self.high}
        return json.dumps({**record, "thresholds": self.thresholds.tolist()}, sort_keys=True)

    @classmethod
    def from_json(cls, text: str) -> ValueFit:
        """Read what :meth:`to_json` wrote.

        Raises
        ------
        ValuesRefused
            When the text is no such record.
        """
        try:
            record: Any = json.loads(text)
            ends = float(record["low"]), float(record["high"])
            found = cls(str(record["kind"]), *ends, np.array(record["thresholds"], dtype=np.float64))
        except (KeyError, OverflowError, RecursionError, TypeError, ValueError):
            raise ValuesRefused(
                "the record of a fit of values needs a kind, low, high and a list of thresholds"
            ) from None
        kept = np.concatenate([[found.low], found.thresholds.reshape(-1), [found.high]])
        if found.thresholds.shape != (LEVELS - 1,) or not np.isfinite(kept).all():
            raise ValuesRefused(f"the record of a fit of values needs {LEVELS - 1} finite thresholds")
        if (np.diff(kept) < 0).any():
            raise ValuesRefused("the record of a fit of values needs ascending thresholds from low to high")
        return found


def fit_values(values: NDArray[Any], *, kind: str, shading: str = "equalised") -> ValueFit:
    """Fit a ramp to values.

    Parameters
    ----------
    values : ndarray of float, any shape
        Those that are not finite are passed over. For cyclic values they do not matter.
    kind : {"sequential", "diverging", "cyclic"}
    shading : str
        One of `tiles.shading.SHADINGS`, for sequential values only.

    Returns
    -------
    ValueFit

    Raises
    ------
    ValuesRefused
        When the kind or the shading is unknown.

    Examples
    --------
    >>> import numpy as np
    >>> found = fit_values(np.array([-2.0, -1.0, 0.25, 0.5]), kind="diverging")
    >>> shade_values(np.array([-2.0, -1.0, 0.0, 0.25, np.nan]), found).tolist()
    [1, 55, 109, 163, 0]
    """
    _known(kind)
    if shading not in SHADINGS:
        raise ValuesRefused(f"shading '{shading}' is unknown{nearest(str(shading), SHADINGS)}")
    if kind == "cyclic":
        return ValueFit(kind, 0.0, 1.0, (np.arange(1, LEVELS) - 0.5) / LEVELS)
    finite = np.asarray(values, dtype=np.float64).reshape(-1)
    finite = np.sort(finite[np.isfinite(finite)]) + 0.0  # without a sign of zero
    return _diverging(finite) if kind == "diverging" else _sequential(finite, shading)


def shade_values(values: NDArray[Any], fit: ValueFit) -> NDArray[np.uint8]:
    """Turn values into palette indices; a pure function of each value and the fit.

    Parameters
    ----------
    values : ndarray of float, any shape
        What is not finite is no value.
    fit : ValueFit

    Returns
    -------
    ndarray of uint8, same shape
        0, or 1 + the number of thresholds at or below the value.
    """
    flat = np.asarray(values, dtype=np.float64).reshape(-1)
    shades = np.zeros(flat.size, np.uint8)
    for start in range(0, flat.size, _BLOCK):
        part = flat[start : start + _BLOCK]
        there = np.isfinite(part)
        found = part[there]
        if fit.kind == "cyclic":
            found = found - np.floor(found)
            found[found >= 1 - 0.5 / LEVELS] = 0.0
        shades[start : start + _BLOCK][there] = np.searchsorted(fit.thresholds, found, side="right") + 1
    return shades.reshape(np.shape(values))


def value_key_labels(fit: ValueFit) -> list[tuple[float, str]]:
    """Return a few round values and where they stand along the ramp, from 0 (lowest) to 1 (highest)."""
    if fit.kind == "cyclic":
        return fraction_labels(LEVELS)
    if fit.kind == "diverging":
        return signed_labels(fit.low, fit.high)
    return value_labels(fit.low, fit.thresholds, fit.high)


def _known(kind: str) -> None:
    if kind not in KINDS:
        raise ValuesRefused(f"values of kind '{kind}' are unknown{nearest(str(kind), KINDS)}")


def _diverging(ordered: Floats) -> ValueFit:
    low = _share(-ordered[ordered < 0][::-1], _NEARLY_ALL)
    high = _share(ordered[ordered > 0], _NEARLY_ALL)
    low, high = low or high or 1.0, high or low or 1.0
    low, high = max(low, high / _LEAST_SIDE), max(high, low / _LEAST_SIDE)
    steps = np.arange(_HALF + 1) / _HALF
    return ValueFit("diverging", -low, high, np.concatenate([-low * steps[-2:0:-1], high * steps[:-1]]))


def _sequential(ordered: Floats, shading: str) -> ValueFit:
    if shading == "logarithmic":
        ordered = ordered[ordered > 0]
    if ordered.size == 0:
        return ValueFit("sequential", 0.0, 0.0, np.zeros(LEVELS - 1))
    low, high = float(ordered[0]), float(ordered[-1])
    if shading == "ink":
        return ValueFit("sequential", low, high, np.full(LEVELS - 1, low))
    if shading == "linear":
        low, high = _share(ordered, _FEW), _share(ordered, _NEARLY_ALL)
        return ValueFit("sequential", low, high, np.linspace(low, high, LEVELS + 1)[1:-1])
    starts = np.flatnonzero(np.diff(ordered, prepend=-np.inf))
    often = np.diff(starts, append=ordered.size).astype(np.uint64)
    return ValueFit("sequential", low, high, thresholds(ordered[starts], often, shading))


def _share(ordered: Floats, share: float) -> float:
    """Return the smallest of ascending values that a share of them does not exceed; 0 if there is none."""
    return float(ordered[int(np.ceil(share * ordered.size)) - 1]) if ordered.size else 0.0
