"""Exact numbers: what a config writes as a decimal, a fraction or a multiple of pi stays a rational."""

from __future__ import annotations

import re
from dataclasses import dataclass
from decimal import Decimal, localcontext
from fractions import Fraction
from functools import total_ordering

from tiles.errors import NumberRefused

PI = Decimal("3.14159265358979323846264338327950288419716939937510582097494459230781640628620899863")
LONGEST_NUMBER = 400
_BITS = 1300  # of numerator and denominator together: as p/q such a number has at most 400 characters
_DECIMAL = r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d{1,4})?"
_FRACTION = re.compile(rf"\s*({_DECIMAL})\s*(?:/\s*({_DECIMAL}))?\s*", re.ASCII)
_OF_PI = re.compile(rf"\s*(?:([+-])|({_DECIMAL})\s*\*)?\s*pi\s*(?:/\s*({_DECIMAL}))?\s*", re.ASCII)


@total_ordering
@dataclass(frozen=True)
class Exact:
    """A rational number, or a rational multiple of pi.

    Attributes
    ----------
    value : Fraction
        The number, or its ratio to pi.
    of_pi : bool
        Whether the number is ``value * pi``. Zero is never stored so.
    """

    value: Fraction
    of_pi: bool = False

    def __post_init__(self) -> None:
        if self.of_pi and self.value == 0:
            object.__setattr__(self, "of_pi", False)

    def __float__(self) -> float:
        """Return the nearest float64."""
        if not self.of_pi:
            return float_of(self.value)
        with localcontext() as context:
            context.prec = 80
            product = PI * self.value.numerator / self.value.denominator
        return float(product)

    def __lt__(self, other: Exact) -> bool:
        if self.of_pi == other.of_pi:
            return self.value < other.value
        return self.as_decimal() < other.as_decimal()

    def as_decimal(self) -> Decimal:
        """Return the value to 80 digits."""
        with localcontext() as context:
            context.prec = 80
            ratio = Decimal(self.value.numerator) / self.value.denominator
            return ratio * PI if self.of_pi else ratio

    def __str__(self) -> str:
        """Return a short text that :func:`exact` reads back as the same number."""
        text = fraction_text(self.value)
        if not self.of_pi:
            return text
        top, bottom = self.value.numerator, self.value.denominator
        return f"{top}*pi" if bottom == 1 else f"{top}*pi/{bottom}"


def float_of(value: Fraction) -> float:
    """Return the float64 nearest to a rational, infinite where it is out of range."""
    try:
        return value.numerator / value.denominator
    except OverflowError:
        return float("inf") if value > 0 else float("-inf")


def fraction_text(value: Fraction) -> str:
    """Return a rational as a terminating decimal where it is one, else as ``p/q``."""
    top, bottom = value.numerator, value.denominator
    twos = fives = 0
    rest = bottom
    while rest % 2 == 0:
        rest //= 2
        twos += 1
    while rest % 5 == 0:
        rest //= 5
        fives += 1
    places = max(twos, fives)
    ratio = f"{top}/{bottom}"
    if rest != 1 or places > LONGEST_NUMBER:
        return ratio
    if places == 0:
        digits = str(top)
        if len(digits) > 18 and digits.endswith("000000"):
            stripped = digits.rstrip("0")
            return f"{stripped}e{len(digits) - len(stripped)}"
        return digits
    scaled = abs(top) * 10**places // bottom
    sign = "-" if top < 0 else ""
    if places > 18:
        decimal = f"{sign}{scaled}e-{places}"
        return decimal if len(decimal) <= LONGEST_NUMBER else ratio
    digits = str(scaled).rjust(places + 1, "0")
    return f"{sign}{digits[:-places]}.{digits[-places:]}"


def exact(given: str | int | float | Fraction | Decimal | Exact) -> Exact:
    """Read a number and keep it exactly.

    Parameters
    ----------
    given : str, int, float, Fraction, Decimal or Exact
        Texts are decimals (``3.57``, ``1e-3``), fractions (``1/3``) and multiples of pi (``2*pi``,
        ``-pi/4``). A float means its shortest repr, so 0.1 is exactly 1/10.

    Returns
    -------
    Exact
        The number.

    Raises
    ------
    NumberRefused
        For anything else, for a number that is not finite and for one that takes over 390 digits.

    Examples
    --------
    >>> exact("0.1").value
    Fraction(1, 10)
    >>> str(exact("2*pi/6"))
    '1*pi/3'
    """
    if isinstance(given, Exact):
        return given
    if isinstance(given, bool):
        raise NumberRefused(f"'{given}' is not a number; write a decimal, p/q or a multiple of pi")
    if isinstance(given, int | Fraction):
        return Exact(_bounded(Fraction(given)))
    text = repr(float(given)) if isinstance(given, float) else str(given)
    if len(text) > LONGEST_NUMBER:
        raise NumberRefused(f"a number of {len(text)} characters is too long; at most {LONGEST_NUMBER}")
    if whole := _FRACTION.fullmatch(text):
        return Exact(_ratio(whole[1], whole[2], text))
    if whole := _OF_PI.fullmatch(text):
        top = whole[2] or f"{whole[1] or ''}1"
        return Exact(_ratio(top, whole[3], text), of_pi=True)
    raise NumberRefused(f"'{text}' is not a number; write a decimal, p/q or a multiple of pi such as 2*pi/3")


def _ratio(top: str, bottom: str | None, text: str) -> Fraction:
    below = Fraction(bottom) if bottom else Fraction(1)
    if below == 0:
        raise NumberRefused(f"'{text}' divides by zero")
    return _bounded(Fraction(top) / below)


def _bounded(value: Fraction) -> Fraction:
    if value.numerator.bit_length() + value.denominator.bit_length() > _BITS:
        raise NumberRefused("a number of more than 390 digits is too large or too fine; write a shorter one")
    return value
