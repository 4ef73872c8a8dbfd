"""Ticks of an axis: round values with exact decimal labels that never touch, at any length and any zoom."""

from __future__ import annotations

import itertools
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from decimal import Decimal, localcontext
from fractions import Fraction
from functools import cached_property, lru_cache
from typing import Literal

from atlas.figure.lettering import MM_PER_POINT, text_width
from atlas.figure.tick_labels import exponent_of, tick_labels
from tiles.number import Exact
from tiles.window import Axis

Along = Literal["across", "up"]
MOST_LABELS = 10
MOST_DIGITS = 7
_DIGITS = 60
# (spacing of ticks in font sizes along across and up, least gap between labels, least number of labels)
_DENSITIES = ((4.0, 2.6, 1.5, 3), (3.0, 2.0, 0.8, 2), (0.0, 0.0, 0.4, 2), (0.0, 0.0, 0.4, 1))
_LINE = 1.0


@dataclass(frozen=True)
class Ticks:
    """What stands along an axis.

    Attributes
    ----------
    values : tuple of Exact
        Values of the labelled ticks, ascending.
    positions : tuple of float
        Where they stand, as fractions of the axis' length from its low end.
    labels : tuple of str
        One a value.
    minor : tuple of float
        Positions of the unlabelled ticks.
    offset : str
        What the labels leave out and the axis says once, such as ``3.5699456 + … × 10⁻⁹``; mostly empty.
    """

    values: tuple[Exact, ...] = ()
    positions: tuple[float, ...] = ()
    labels: tuple[str, ...] = ()
    minor: tuple[float, ...] = ()
    offset: str = ""


@dataclass(frozen=True)
class _Candidate:
    """Round values of one step, with the numbers of finer parts to try for minor ticks, finest first."""

    values: tuple[Fraction, ...]
    step: Fraction | None  # None: decades of a log axis
    finer: tuple[tuple[Fraction, ...], ...]


@lru_cache(maxsize=256)
def ticks(axis: Axis, length_mm: float, font_pt: float, along: Along) -> Ticks:
    """Choose the ticks of an axis.

    Steps are 1, 2, 2.5 and 5 times a power of ten (common practice, no source); on a log axis 1, 2 and 5
    in each decade or whole decades; on an axis in multiples of pi halves, quarters and eighths of pi too. The
    finest step is taken whose labels stand apart. Labels are exact.

    Parameters
    ----------
    axis : Axis
        The interval and its scale.
    length_mm : float
        Length on paper in millimetres.
    font_pt : float
        Font size of the labels in points.
    along : {"across", "up"}
        Labels along ``across`` stand side by side, along ``up`` one above another.

    Returns
    -------
    Ticks
        Labels do not overlap; on a very short axis there may be one or none.

    Examples
    --------
    >>> ticks(Axis.make(("r", "2.8", 4)), 70.0, 7.0, "across").labels
    ('2.8', '3.0', '3.2', '3.4', '3.6', '3.8', '4.0')
    """
    ruler = _Ruler(axis)
    em = font_pt * MM_PER_POINT
    candidates = list(_candidates(ruler, length_mm / em))
    for across_space, up_space, gap, least in _DENSITIES:
        space = across_space if along == "across" else up_space
        for candidate in candidates:
            count = len(candidate.values)
            if not least <= count <= MOST_LABELS + 1:
                continue
            positions = [ruler.position(value) for value in candidate.values]
            if _closest(positions) * length_mm < space * em:
                continue
            for most_digits in (MOST_DIGITS, 4):
                labels, offset = tick_labels(candidate.values, candidate.step, axis.of_pi, most_digits)
                if _apart(positions, labels, length_mm, font_pt, gap, along):
                    return Ticks(
                        tuple(Exact(value, axis.of_pi) for value in candidate.values),
                        tuple(positions),
                        labels,
                        _minor(ruler, candidate, positions, length_mm, em),
                        offset,
                    )
    return Ticks()


def position(axis: Axis, value: Exact) -> float:
    """Return where a value stands along an axis: 0 at the low end, 1 at the high end.

    Parameters
    ----------
    axis : Axis
        The axis; on a log axis equal ratios are equal distances.
    value : Exact
        A value in the axis' own kind of number (a multiple of pi where the axis is one); positive on a log
        axis. Values outside the interval give positions outside 0 … 1.
    """
    return _Ruler(axis).position(value.value)


@dataclass(frozen=True)
class _Ruler:
    """Exact ends of an axis as plain ratios (of pi where the axis is in pi), and positions along it."""

    axis: Axis

    @property
    def low(self) -> Fraction:
        return self.axis.low.value

    @property
    def high(self) -> Fraction:
        return self.axis.high.value

    @property
    def log(self) -> bool:
        return self.axis.scale == "log"

    @cached_property
    def decades(self) -> float:
        """Length in decades; of a log axis only."""
        return float(_log10(self.high / self.low))

    def position(self, value: Fraction) -> float:
        if not self.log:
            return float((value - self.low) / (self.high - self.low))
        with localcontext() as context:
            context.prec = _DIGITS
            return float(_log10(value / self.low) / _log10(self.high / self.low))

    def multiples(self, step: Fraction) -> tuple[Fraction, ...]:
        """Return the multiples of a step inside the interval, ends included."""
        first, last = -(-self.low // step), self.high // step
        return tuple(step * index for index in range(first, last + 1))


def _log10(value: Fraction) -> Decimal:
    with localcontext() as context:
        context.prec = _DIGITS
        return (Decimal(value.numerator) / Decimal(value.denominator)).log10()


def _candidates(ruler: _Ruler, length_em: float) -> Iterator[_Candidate]:
    """Yield the steps to try, finest first."""
    if ruler.log and ruler.decades >= 2:
        yield from _decades(ruler)
        return
    if ruler.log and ruler.decades >= 0.7:
        yield from _decades(ruler)
    span = ruler.high - ruler.low
    smallest = span / (2 * MOST_LABELS)
    for step, parts in _steps(exponent_of(span), ruler.axis.of_pi):
        if step >= smallest:
            finer = tuple(ruler.multiples(step / part) for part in parts if step / part >= span / 200)
            yield _Candidate(ruler.multiples(step), step, finer)


def _steps(exponent: int, of_pi: bool) -> list[tuple[Fraction, tuple[int, ...]]]:
    """Return steps around a power of ten, ascending, each with the numbers of parts for minor ticks."""
    rows = {Fraction(1): (5, 2), Fraction(2): (4, 2), Fraction(5, 2): (5,), Fraction(5): (5,)}
    if not of_pi:
        powers = [Fraction(10) ** k for k in range(exponent - 2, exponent + 2)]
        return [(factor * power, parts) for power in powers for factor, parts in rows.items()]
    small = [Fraction(10) ** k for k in range(exponent - 2, exponent + 2) if k <= -2]
    fine = [(factor * power, parts) for power in small for factor, parts in rows.items()]
    parts_of_pi = [(Fraction(1, bottom), (4, 2)) for bottom in (8, 4, 2)]
    whole = [
        (factor * Fraction(10) ** k, parts)
        for k in range(max(0, exponent - 2), max(0, exponent + 2))
        for factor, parts in ((Fraction(1), (4, 2)), (Fraction(2), (4, 2)), (Fraction(5), (5,)))
    ]
    return [row for row in fine if row[0] < Fraction(1, 8)] + parts_of_pi + whole


def _decades(ruler: _Ruler) -> Iterator[_Candidate]:
    """Yield 1-2-5 where decades are few, then every decade, every second one and so on."""
    low, high = exponent_of(ruler.low), exponent_of(ruler.high)

    def inside(values: Iterable[Fraction]) -> tuple[Fraction, ...]:
        return tuple(value for value in values if ruler.low <= value <= ruler.high)

    every = inside(digit * Fraction(10) ** k for k in range(low, high + 1) for digit in range(1, 10))
    if ruler.decades < 3:
        some = inside(digit * Fraction(10) ** k for k in range(low, high + 1) for digit in (1, 2, 5))
        yield _Candidate(some, None, (every,))
    powers = inside(Fraction(10) ** k for k in range(low, high + 1))
    yield _Candidate(powers, None, (every,))
    for stride in (2, 3, 5, 10, 20, 50, 100):
        first = -(-low // stride) * stride
        some = inside(Fraction(10) ** k for k in range(first, high + 1, stride))
        yield _Candidate(some, None, (powers,))


def _closest(positions: list[float]) -> float:
    return min((b - a for a, b in itertools.pairwise(positions)), default=1.0)


def _apart(
    positions: list[float],
    labels: tuple[str, ...],
    length_mm: float,
    font_pt: float,
    gap: float,
    along: Along,
) -> bool:
    """Whether neighbouring labels keep a gap, given in font sizes."""
    em = font_pt * MM_PER_POINT
    if along == "up":
        return _closest(positions) * length_mm >= (_LINE + 0.5 * gap) * em
    widths = [text_width(label, font_pt) for label in labels]
    return all(
        (positions[k + 1] - positions[k]) * length_mm >= 0.5 * (widths[k] + widths[k + 1]) + gap * em
        for k in range(len(labels) - 1)
    )


def _minor(
    ruler: _Ruler, candidate: _Candidate, positions: list[float], length_mm: float, em: float
) -> tuple[float, ...]:
    """Return the finest minor ticks that stand apart; those of a log axis may crowd towards a decade."""
    labelled = set(candidate.values)
    least = (0.17 if candidate.step is None else 0.3) * em
    for values in candidate.finer:
        every = [ruler.position(value) for value in values]
        if _closest(sorted({*every, *positions})) * length_mm >= least:
            return tuple(p for p, value in zip(every, values, strict=True) if value not in labelled)
    return ()
