"""Rotation numbers: how many turns an orbit makes per step.

Of a periodic state variable the turns of the lift are counted; of a map of two other variables those about
the mean of the orbit, without regard to their sense. On a cycle the number is exact: whole turns by steps.
Elsewhere it is a mean with the weights exp(-1 / (t (1 - t))), which on a quasi-periodic orbit converges
faster than any power of the steps (Das, Saiki, Sander & Yorke 2017, Nonlinearity 30, 4111; citation from
memory).
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence

import numpy as np
from numpy.typing import NDArray

from atlas.orbits.block import STEPS_AT_ONCE
from atlas.planes.fates import CHAOTIC, FIXED_POINT, PERIODIC, QUASI_PERIODIC
from atlas.planes.pixels import Order, Pixels

Floats = NDArray[np.float64]


def winding_number(widths: Sequence[float]) -> int | None:
    """Return the number of the state variable whose turns are counted: the last periodic one, if any."""
    periodic = [number for number, width in enumerate(widths) if width]
    return periodic[-1] if periodic else None


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
        Turns per step; about a mean from 0 to 1/2, and none for a fixed point. Worth nothing once ``stop``
        of the orbits is set: the work ends early then.
    """
    turns = np.full(found.fate.size, np.nan)
    cyclic = (found.fate == PERIODIC) | ((found.fate == FIXED_POINT) & (winding is not None))
    for steps in np.unique(found.turn[cyclic]):
        order = np.flatnonzero(cyclic & (found.turn == steps))
        turns[order] = np.rint(_turns(found, order, int(steps), winding, weighted=False)) / steps
    order = np.flatnonzero((found.fate == QUASI_PERIODIC) | (found.fate == CHAOTIC))
    if order.size:
        turns[order] = _turns(found, order, found.rules.steps, winding, weighted=True)
    size = np.abs(turns)
    return turns if winding is not None else np.minimum(size, 1.0 - size)


def _turns(found: Pixels, order: Order, steps: int, winding: int | None, *, weighted: bool) -> Floats:
    """Return the turns of the next steps of some orbits: their sum, or their weighted mean."""
    mean, total = np.zeros_like(found.x), np.zeros(found.fate.size)
    if winding is None:
        x = found.x.copy()
        for first, last in _slices(found, order, steps):
            found.kernels.state_sums(x, *found.map, order, first, last - first, mean)
        mean[:, order] /= steps
    x, weights = found.x.copy(), np.zeros(1)
    whole = steps if weighted else 0
    for first, last in _slices(found, order, steps):
        found.kernels.turning(x, *found.map, order, first, last - first, whole, mean, total, weights)
    return total[order] / weights[0] if weighted and not found.stop[0] else total[order]


def _slices(found: Pixels, order: Order, steps: int) -> Iterator[tuple[int, int]]:
    """Yield the steps of one call of a kernel after the other; where they part says nothing."""
    each = max(1, STEPS_AT_ONCE // order.size)
    for first in range(0, steps, each):
        if found.stop[0]:
            return
        yield first, min(first + each, steps)
