"""Round numbers along a ramp of shades, for the colour key of a plate or a page."""

from __future__ import annotations

import math
from decimal import Decimal

import numpy as np
from numpy.typing import NDArray

_SUPERSCRIPT = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")
_SPACING = 0.15
_ENOUGH = 4
_DECADES = 18


def ramp_labels(thresholds: NDArray[np.float64]) -> list[tuple[float, str]]:
    """Choose a few round numbers between the first and the last threshold.

    Parameters
    ----------
    thresholds : ndarray of float64, shape (levels - 1,)
        Ascending values at which one shade ends and the next begins.

    Returns
    -------
    list of (float, str)
        Position along the ramp, from 0 (lowest) to 1 (highest), and number of one or two significant
        digits; ascending, at least 0.15 apart. Empty when the thresholds are all 0. When they are so
        close that no such number lies between them, the last one, rounded to two digits, at position 1.
    """
    low, high = float(thresholds[0]), float(thresholds[-1])
    if high <= 0:
        return []
    places = np.arange(1, thresholds.size + 1) / (thresholds.size + 1)
    chosen: dict[Decimal, float] = {}
    for tier in _tiers(low, high) if low < high else []:
        for number in tier:
            place = float(np.interp(float(number), thresholds, places))
            if all(abs(place - other) >= _SPACING for other in chosen.values()):
                chosen[number] = place
        if len(chosen) >= _ENOUGH:
            break
    if not chosen:
        return [(1.0, number_text(Decimal(f"{high:.1e}")))]
    return [(chosen[number], number_text(number)) for number in sorted(chosen)]


def number_text(number: Decimal) -> str:
    """Write a positive number of few digits: plainly from 0.001 to 9999, else as ``2×10⁻⁵``."""
    exponent = number.adjusted()
    if -3 <= exponent <= 3:
        text = f"{number:f}"
        return text.rstrip("0").rstrip(".") if "." in text else text
    factor = f"{number.scaleb(-exponent).normalize():f}"
    power = "10" + str(exponent).translate(_SUPERSCRIPT)
    return power if factor == "1" else f"{factor}×{power}"


def _tiers(low: float, high: float) -> list[list[Decimal]]:
    """Return the numbers of one or two digits from low to high, the roundest first: 1, 5, 2, the rest."""
    last = math.floor(math.log10(high))
    first = max(last - _DECADES, math.floor(math.log10(low)) if low > 0 else last - _DECADES)
    tiers = []
    for mantissas in ((10,), (50,), (20,), range(10, 100, 10), range(10, 100, 5), range(10, 100)):
        numbers = [
            Decimal(f"{mantissa}e{exponent - 1}").normalize()
            for exponent in range(first, last + 1)
            for mantissa in mantissas
        ]
        tiers.append([number for number in numbers if low <= number <= high])
    return tiers
