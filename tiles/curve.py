"""The four curves from density to shade, each as the densities at which one shade ends and the next begins.

- ``equalised``: every shade covers an equal share of the occupied cells. The curve is the cumulative share of
  the distinct densities, from 0 at the smallest to 1 at the largest, straight between them. That is what
  datashader's ``eq_hist`` yields for whole numbers. For fractions ``eq_hist`` sorts into 65536 equal bins
  first, most of which a few cells on a periodic branch use up; the distinct densities are kept here instead,
  and the tests compare the result with datashader's own for both. Doing it here also saves every process
  that draws or builds tiles from importing datashader (1.4 s, 200 MB).
- ``logarithmic``: equal ratios from the smallest to the largest occupied density.
- ``linear``: equal steps from 0 to the density that 99 % of the occupied cells do not exceed.
- ``ink``: every occupied cell has the highest shade.

Beyond the densities that it was fitted to a curve stays at its ends, so it is monotone everywhere.
"""

from __future__ import annotations

from collections.abc import Callable
from decimal import Decimal, localcontext

import numpy as np

from tiles.tally import Floats, Weights

LEVELS = 216
_STEPS = np.arange(1, LEVELS)
_NEARLY_ALL = 99  # percent of the occupied cells


def thresholds(values: Floats, often: Weights, shading: str) -> Floats:
    """Return the thresholds of a curve.

    Parameters
    ----------
    values : ndarray of float64
        The occupied densities, ascending, each once; may be empty.
    often : ndarray of uint64, same shape
        In how many cells each occurs.
    shading : str
        One of ``SHADINGS``.

    Returns
    -------
    ndarray of float64, shape (LEVELS - 1,)
        Ascending; all 0 when no cell is occupied, all equal when only one density occurs (except linear).
    """
    if values.size == 0:
        return np.zeros(LEVELS - 1)
    return _CURVES[shading](values, np.cumsum(often).astype(np.float64))


def _equalised(values: Floats, upto: Floats) -> Floats:
    if values.size == 1:
        return np.full(LEVELS - 1, values[0])
    wanted = upto[0] + (upto[-1] - upto[0]) * _STEPS / LEVELS
    at = np.searchsorted(upto, wanted)
    share = (wanted - upto[at - 1]) / (upto[at] - upto[at - 1])
    between = values[at - 1] + (values[at] - values[at - 1]) * share
    return np.asarray(np.minimum(between, values[at]), dtype=np.float64)


def _logarithmic(values: Floats, upto: Floats) -> Floats:
    low, high = Decimal(float(values[0])), Decimal(float(values[-1]))
    with localcontext() as context:  # decimals, so that the bits do not depend on a mathematics library
        context.prec = 40
        ratio = (high / low).ln() / LEVELS
        return np.array([float(low * (ratio * step).exp()) for step in range(1, LEVELS)])


def _linear(values: Floats, upto: Floats) -> Floats:
    top = values[np.searchsorted(100 * upto, _NEARLY_ALL * upto[-1])]
    return np.asarray(top * _STEPS / LEVELS, dtype=np.float64)


def _ink(values: Floats, upto: Floats) -> Floats:
    return np.zeros(LEVELS - 1)


_CURVES: dict[str, Callable[[Floats, Floats], Floats]] = {
    "equalised": _equalised,
    "logarithmic": _logarithmic,
    "linear": _linear,
    "ink": _ink,
}
SHADINGS = tuple(_CURVES)
