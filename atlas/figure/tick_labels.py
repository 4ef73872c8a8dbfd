"""Labels of ticks: exact decimals, powers of ten, multiples of pi, and few digits however deep the zoom."""

from __future__ import annotations

from fractions import Fraction

from atlas.figure.lettering import decimal_text, pi_text, power_text


def exponent_of(value: Fraction) -> int:
    """Return k with 10**k <= |value| < 10**(k + 1)."""
    value = abs(value)
    guess = len(str(value.numerator)) - len(str(value.denominator))
    while Fraction(10) ** guess > value:
        guess -= 1
    while Fraction(10) ** (guess + 1) <= value:
        guess += 1
    return guess


def tick_labels(
    values: tuple[Fraction, ...], step: Fraction | None, of_pi: bool, most_digits: int
) -> tuple[tuple[str, ...], str]:
    """Return exact labels of round values, and what they leave to the axis to say once.

    Parameters
    ----------
    values : tuple of Fraction
        Ascending; multiples of ``step``, or round values of decades where that is None. Ratios to pi if
        ``of_pi``.
    step : Fraction or None
        Their common step.
    of_pi : bool
        Whether the values are multiples of pi.
    most_digits : int
        With more digits than these, labels count from a common base.

    Returns
    -------
    labels : tuple of str
        One a value.
    offset : str
        Such as ``3.5699456 + … × 10⁻⁹``; mostly empty.

    Examples
    --------
    >>> tick_labels((Fraction("1.20000001"), Fraction("1.20000002")), Fraction(1, 10**8), False, 7)
    (('0', '1'), '1.20000001 + … × 10⁻⁸')
    """
    if step is None and not of_pi:
        return _log_labels(values)
    unit = _unit(values) if step is None else step
    if of_pi and unit.denominator in (1, 2, 4, 8) and max(map(abs, values)) < 1000:
        return tuple(pi_text(value) for value in values), ""
    return _linear_labels(values, unit, "π" if of_pi else "", most_digits)


def _unit(values: tuple[Fraction, ...]) -> Fraction:
    return min(abs(value) for value in values)


def _log_labels(values: tuple[Fraction, ...]) -> tuple[tuple[str, ...], str]:
    low, high = exponent_of(values[0]), exponent_of(values[-1])
    if low >= -4 and high <= 4:
        return tuple(decimal_text(value, max(0, -exponent_of(value))) for value in values), ""
    if all(value == Fraction(10) ** exponent_of(value) for value in values):
        return tuple(power_text(exponent_of(value)) for value in values), ""
    scaled = [value / Fraction(10) ** low for value in values]
    return tuple(decimal_text(value, 0) for value in scaled), f"× {power_text(low)}"


def _linear_labels(
    values: tuple[Fraction, ...], step: Fraction, suffix: str, most_digits: int
) -> tuple[tuple[str, ...], str]:
    places = _places(step)
    largest = max(map(abs, values))
    top = exponent_of(largest) if largest else 0
    digits = top + places + 1
    if digits > most_digits:
        return _from_base(values, step, suffix)
    if top <= 5 and (top >= -4 or places <= 5):
        shown = max(0, places)
        return tuple(_with(suffix, decimal_text(value, shown)) for value in values), ""
    factor = Fraction(10) ** top
    scaled = [value / factor for value in values]
    shown = max(0, places + top)
    unit = f"× {power_text(top)}{f' {suffix}' if suffix else ''}"
    return tuple(decimal_text(value, shown) for value in scaled), unit


def _with(suffix: str, text: str) -> str:
    return text if text == "0" else text + suffix


def _from_base(values: tuple[Fraction, ...], step: Fraction, suffix: str) -> tuple[tuple[str, ...], str]:
    """Label what is left above a common base: deep zooms need only a few digits a label."""
    span = max(values[-1] - values[0], step)
    coarse = Fraction(10) ** exponent_of(span)
    base = values[0] // coarse * coarse
    left = [value - base for value in values]
    top = exponent_of(max(left)) if any(left) else exponent_of(step)
    shown = max(0, _places(step) + top)
    labels = tuple(decimal_text(value / Fraction(10) ** top, shown) for value in left)
    text = decimal_text(base, max(0, _places(coarse)))
    sum_text = f"{text} + …" if top == 0 else f"{text} + … × {power_text(top)}"
    return labels, f"({sum_text}) {suffix}" if suffix else sum_text


def _places(step: Fraction) -> int:
    """Return how many decimals a round step needs; negative for whole tens, hundreds and so on."""
    exponent = exponent_of(step)
    leading = step / Fraction(10) ** exponent
    more = 0
    while leading.denominator != 1:
        leading, more = leading * 10, more + 1
    return more - exponent
