"""Rotation numbers: how many turns an orbit makes per step.

Of a periodic state variable the turns of the lift are counted; of a map of two other variables those about
the mean of the orbit, without regard to their sense. On a cycle the number is exact: whole turns by steps.
Elsewhere it is a mean with the weights exp(-1 / (t (1 - t))), which on a quasi-periodic orbit converges
faster than any power of the steps (Das, Saiki, Sander & Yorke 2017, Nonlinearity 30, 4111; citation from
memory).
"""

from __future__ import annotations

from collections.abc import Sequence
from functools import lru_cache
from math import exp

import numpy as np
from numpy.typing import NDArray

from atlas.planes.fates import CHAOTIC, FIXED_POINT, PERIODIC, QUASI_PERIODIC
from atlas.planes.pixels import Pixels

Floats = NDArray[np.float64]


def winding_number(widths: Sequence[float]) -> int | None:
    """Return the number of the state variable whose turns are counted: the last periodic one, if any."""
    periodic = [number for number, width in enumerate(widths) if width]
    return periodic[-1] if periodic else None


@lru_cache(maxsize=8)
def weights(steps: int) -> Floats:
    """Return weights of that many steps, of sum 1, that vanish smoothly at both ends."""
    times = [(step + 0.5) / steps for step in range(steps)]
    raw = np.array([exp(-1.0 / (time * (1.0 - time))) for time in times])
    found: Floats = raw / raw.sum()
    return found


def rotation(found: Pixels, winding: int | None) -> Floats:
    """Return the rotation number of every orbit; NaN where there is none.

    Parameters
    ----------
    found : Pixels
        Whose fates are known.
    winding : int or None
        The periodic state variable; without one, turns about the mean are counted.

    Returns
    -------
    ndarray of float64, shape (orbits,)
        Turns per step; about a mean from 0 to 1/2, and none for a fixed point.
    """
    turns = np.full(found.fate.size, np.nan)
    cyclic = (found.fate == PERIODIC) | ((found.fate == FIXED_POINT) & (winding is not None))
    for steps in np.unique(found.turn[cyclic]):
        order = np.flatnonzero(cyclic & (found.turn == steps))
        once = np.ones(int(steps))
        turns[order] = np.rint(_total(found, order, once, winding))[order] / steps
    order = np.flatnonzero((found.fate == QUASI_PERIODIC) | (found.fate == CHAOTIC))
    if order.size:
        turns[order] = _total(found, order, weights(found.rules.steps), winding)[order]
    size = np.abs(turns)
    return turns if winding is not None else np.minimum(size, 1.0 - size)


def _total(found: Pixels, order: NDArray[np.int64], each: Floats, winding: int | None) -> Floats:
    mean, total = np.zeros_like(found.x), np.zeros(found.fate.size)
    if winding is None:
        found.kernels.mean_state(found.x, *found.map, order, 0, each.size, mean)
    found.kernels.turning(found.x, *found.map, order, 0, each, mean, total)
    return total
