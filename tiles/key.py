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


def signed_labels(low: float, high: float) -> list[tuple[float, str]]:
    """Return 0 in the middle of a diverging ramp and equal round steps to either side.

    Parameters
    ----------
    low, high : float
        Values at the ends, below and above 0.

    Returns
    -------
    list of (float, str)
        Position along the ramp and number with a true minus sign, ascending.
    """
    found = [(0.5, "0")]
    for end in (low, high):
        step = _round_step(abs(end), _SPACING)
        for count in range(1, math.floor(abs(end) / float(step) * (1 + 1e-12)) + 1):
            place = 0.5 + math.copysign(0.5 * min(1.0, float(count * step) / abs(end)), end)
            found.append((place, _signed(math.copysign(1, end), count * step)))
    return sorted(found)


def fraction_labels(shades: int) -> list[tuple[float, str]]:
    """Return the quarters of a cycle along a ramp whose first shade is centred on 0.

    Parameters
    ----------
    shades : int
        How many there are.
    """
    return [(min(1.0, quarter / 4 + 0.5 / shades), f"{quarter / 4:g}") for quarter in range(5)]


def value_labels(low: float, thresholds: NDArray[np.float64], high: float) -> list[tuple[float, str]]:
    """Choose a few round numbers between the ends of a ramp of values, which may be negative.

    Parameters
    ----------
    low, high : float
        Values at the ends.
    thresholds : ndarray of float64, shape (levels - 1,)
        Ascending values at which one shade ends and the next begins.

    Returns
    -------
    list of (float, str)
        As :func:`ramp_labels` returns them.
    """
    if low >= 0 or high <= low:
        return ramp_labels(thresholds)
    places = np.arange(thresholds.size + 2) / (thresholds.size + 1)
    values = np.concatenate([[low], thresholds, [high]])
    step = _round_step(high - low, _SPACING / 2)
    found: list[tuple[float, str]] = []
    for count in range(math.ceil(low / float(step)), math.floor(high / float(step)) + 1):
        place = float(np.interp(float(count * step), values, places))
        if not found or place - found[-1][0] >= _SPACING:
            found.append((place, _signed(count, abs(count) * step)))
    return found


def _round_step(extent: float, share: float) -> Decimal:
    """Return the least of 1, 2, 5, 10 … that is no smaller than a share of twice an extent."""
    wanted = 2 * share * extent
    exponent = math.floor(math.log10(wanted))
    steps = (Decimal(f"{digit}e{exponent + more}") for more in (0, 1) for digit in (1, 2, 5))
    return next(step for step in steps if float(step) >= wanted * (1 - 1e-12))


def _signed(sign: float, number: Decimal) -> str:
    if number == 0:
        return "0"
    return ("−" if sign < 0 else "") + number_text(number)
