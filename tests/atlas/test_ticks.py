"""Ticks: round values, exact labels, no label touching another."""

from __future__ import annotations

import itertools
import math
import re
from fractions import Fraction

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from atlas.figure.lettering import MM_PER_POINT, text_width
from atlas.figure.ticks import Along, Ticks, position, ticks
from tiles.number import Exact, exact
from tiles.window import Axis

_RAISED = str.maketrans("⁻⁰¹²³⁴⁵⁶⁷⁸⁹−", "-0123456789-")
_POWER = r"10([⁻⁰¹²³⁴⁵⁶⁷⁸⁹]+)"


def axis(low: str, high: str, scale: str = "linear") -> Axis:
    return Axis.make({"name": "r", "low": low, "high": high, "scale": scale})


def value_of(label: str, offset: str) -> Fraction:
    """Read a printed label and its offset back, as a reader would; multiples of pi as ratios."""
    offset = offset.strip("()π ").replace(") π", "")
    base, factor = Fraction(0), Fraction(1)
    if power := re.search(rf"× {_POWER}", offset):
        factor = Fraction(10) ** int(power[1].translate(_RAISED))
    if "+" in offset:
        base = Fraction(offset.split("+")[0].strip().translate(_RAISED))
    if power := re.fullmatch(_POWER, label):
        return Fraction(10) ** int(power[1].translate(_RAISED))
    if "π" in label:
        sign, top, bottom = re.fullmatch(r"(−?)([\d.]*)π(?:/(\d+))?", label).groups()  # type: ignore[union-attr]
        return Fraction(f"{sign.translate(_RAISED)}{top or 1}") / int(bottom or 1)
    return base + factor * Fraction(label.translate(_RAISED))


def check(found: Ticks, drawn: Axis, length: float, points: float, along: Along) -> None:
    """Assert everything that ticks promise."""
    assert len(found.values) == len(found.labels) == len(found.positions)
    for value, label, at in zip(found.values, found.labels, found.positions, strict=True):
        assert not value < drawn.low
        assert not drawn.high < value
        assert value_of(label, found.offset) == value.value
        assert at == pytest.approx(position(drawn, value), abs=1e-12)
        assert 0 <= at <= 1
    assert all(0 <= at <= 1 for at in found.minor)
    assert not set(found.minor) & set(found.positions)
    em = points * MM_PER_POINT
    for k, (one, two) in enumerate(itertools.pairwise(found.positions)):
        apart = (two - one) * length
        if along == "across":
            widths = [text_width(label, points) for label in found.labels[k : k + 2]]
            assert apart >= sum(widths) / 2 + 0.39 * em
        else:
            assert apart >= 1.1 * em


@pytest.mark.parametrize(
    ("low", "high", "scale", "length", "labels", "offset"),
    [
        ("2.8", "4", "linear", 70, "2.8 3.0 3.2 3.4 3.6 3.8 4.0", ""),
        ("0", "3.5", "linear", 70, "0 0.5 1.0 1.5 2.0 2.5 3.0 3.5", ""),
        ("-0.3", "0.7", "linear", 70, "−0.2 0 0.2 0.4 0.6", ""),
        ("2.8", "4", "linear", 20, "3.0 3.5 4.0", ""),
        ("3.5699456", "3.5699457", "linear", 70, "0 0.2 0.4 0.6 0.8 1.0", "3.5699456 + … × 10⁻⁷"),
        (
            "-1.40115518910",
            "-1.40115518909",
            "linear",
            40,
            "0 0.25 0.50 0.75 1.00",
            "−1.40115518910 + … × 10⁻¹¹",
        ),
        ("0", "1e-7", "linear", 70, "0 0.2 0.4 0.6 0.8 1.0", "× 10⁻⁷"),
        ("0", "7e10", "linear", 70, "0 1 2 3 4 5 6 7", "× 10¹⁰"),
        ("0", "2*pi", "linear", 70, "0 π/2 π 3π/2 2π", ""),
        ("-pi", "pi", "linear", 30, "−π 0 π", ""),
        ("0", "100*pi", "linear", 70, "0 20π 40π 60π 80π 100π", ""),
        ("0.01", "100", "log", 70, "0.01 0.1 1 10 100", ""),
        ("3", "900", "log", 100, "5 10 20 50 100 200 500", ""),
        ("1e-9", "1e9", "log", 70, "10⁻⁹ 10⁻⁶ 10⁻³ 10⁰ 10³ 10⁶ 10⁹", ""),
        ("3", "4", "log", 70, "3.0 3.2 3.4 3.6 3.8 4.0", ""),
    ],
)
def test_labels_as_a_journal_sets_them(
    low: str, high: str, scale: str, length: float, labels: str, offset: str
) -> None:
    found = ticks(axis(low, high, scale), length, 7.0, "across")
    assert (" ".join(found.labels), found.offset) == (labels, offset)


def test_a_deep_zoom_stays_exact_beyond_float64() -> None:
    base = "3.569945671870944901842005"
    found = ticks(axis(base, base + "0000000001"), 70, 7.0, "across")
    assert found.offset.startswith(base)
    assert found.positions == (0.0, 0.2, 0.4, 0.6, 0.8, 1.0)
    assert [value_of(label, found.offset) for label in found.labels] == [v.value for v in found.values]


def test_log_positions_are_equal_for_equal_ratios() -> None:
    drawn = axis("0.01", "100", "log")
    assert [position(drawn, exact(v)) for v in ("0.01", "0.1", "1", "10", "100")] == [0, 0.25, 0.5, 0.75, 1]
    assert position(drawn, exact(2)) == pytest.approx(0.5 + math.log10(2) / 4, abs=1e-15)
    minor = ticks(drawn, 100, 7.0, "across").minor
    assert len(minor) == 32
    assert position(drawn, exact(2)) in minor


numbers = st.builds(
    lambda digits, exponent: Fraction(digits) * Fraction(10) ** exponent,
    st.integers(-(10**9), 10**9),
    st.integers(-14, 8),
)
spans = st.builds(
    lambda digits, exponent: Fraction(digits) * Fraction(10) ** exponent,
    st.integers(1, 999),
    st.integers(-25, 9),
)
lengths = st.floats(8, 1000)
fonts = st.sampled_from([5.0, 7.0, 8.0, 12.5, 30.0])
directions = st.sampled_from(["across", "up"])


@settings(deadline=None)
@given(low=numbers, span=spans, length=lengths, points=fonts, along=directions, of_pi=st.booleans())
def test_linear_labels_are_exact_and_apart(
    low: Fraction, span: Fraction, length: float, points: float, along: Along, of_pi: bool
) -> None:
    drawn = Axis("r", Exact(low, of_pi), Exact(low + span, of_pi))
    found = ticks(drawn, length, points, along)
    check(found, drawn, length, points, along)
    if length > 12 * points:
        assert len(found.labels) >= 2
    assert len(found.labels) <= 11


@settings(deadline=None)
@given(
    low=st.integers(-30, 30),
    digits=st.integers(1, 99),
    decades=st.fractions(Fraction(1, 1000), 40, max_denominator=1000),
    length=lengths,
    points=fonts,
    along=directions,
)
def test_log_labels_are_exact_and_apart(
    low: int, digits: int, decades: Fraction, length: float, points: float, along: Along
) -> None:
    start = Fraction(digits) * Fraction(10) ** low
    end = start * Fraction(10) ** int(decades) * (1 + 9 * (decades - int(decades)))
    drawn = Axis("r", Exact(start), Exact(end), "log")
    check(ticks(drawn, length, points, along), drawn, length, points, along)


def test_a_larger_page_never_loses_labels() -> None:
    counts = [
        len(ticks(axis("2.8", "4"), length, 8.0, "across").labels) for length in (20, 40, 80, 160, 1000)
    ]
    assert counts == sorted(counts)
