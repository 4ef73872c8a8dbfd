"""Exact numbers: what is read, what is refused, texts that come back, floats correctly rounded."""

import math
from contextlib import suppress
from decimal import Decimal
from fractions import Fraction

import mpmath
import numpy as np
import pytest
from hypothesis import example, given
from hypothesis import strategies as st

from tiles.errors import NumberRefused
from tiles.number import LONGEST_NUMBER, PI, Exact, exact, float_of, fraction_text

RATIOS = st.builds(Fraction, st.integers(-(10**30), 10**30), st.integers(1, 10**30))
SCALED = st.builds(lambda ratio, power: ratio * Fraction(10) ** power, RATIOS, st.integers(-300, 300))
DIGITS = st.text("0123456789", min_size=1, max_size=30)
WRITTEN = st.builds(
    lambda sign, whole, part, power: f"{sign}{whole}{part}{power}",
    st.sampled_from(["", "+", "-"]),
    DIGITS,
    st.one_of(st.just(""), st.just("."), DIGITS.map(lambda digits: "." + digits)),
    st.one_of(st.just(""), st.integers(-320, 320).map(lambda power: f"e{power}")),
)


@pytest.mark.parametrize(
    ("text", "value"),
    [
        ("3.57", Fraction(357, 100)),
        ("1e-3", Fraction(1, 1000)),
        ("1E+3", Fraction(1000)),
        (".5", Fraction(1, 2)),
        ("5.", Fraction(5)),
        ("-0", Fraction(0)),
        ("010", Fraction(10)),
        (" 1 / 3 ", Fraction(1, 3)),
        ("0.5/1e2", Fraction(1, 200)),
        ("-2/-4", Fraction(1, 2)),
        ("1e9999/1e9999", Fraction(1)),
    ],
)
def test_decimals_and_fractions_are_kept_exactly(text, value):
    assert exact(text) == Exact(value)


@pytest.mark.parametrize(
    ("text", "value"),
    [
        ("pi", Fraction(1)),
        ("-pi/4", Fraction(-1, 4)),
        ("+pi", Fraction(1)),
        ("2*pi", Fraction(2)),
        ("2 * pi / 6", Fraction(1, 3)),
        ("0.5*pi", Fraction(1, 2)),
    ],
)
def test_multiples_of_pi_are_kept_exactly(text, value):
    assert exact(text) == Exact(value, of_pi=True)


NO_NUMBERS = (
    *(
        "",
        " ",
        "nan",
        "inf",
        "-inf",
        "1_000",
        "1:30",
        "0x10",
        "1e",
        "e3",
        "1/0",
        "1/0.0",
        "pi/0",
        "2pi",
        "pi*2",
    ),
    *("1e99999", "1//2", "1/2/3", "--1", "1.2.3", "٣", "1" * 401, "1e9999", "1e-9999", "1e9999/1e-9999"),
    *("1e9999*pi", "1" * 396, True, False, None, math.nan, math.inf, Decimal("NaN"), b"1", [1], np.True_),
    *(10**5000, Fraction(1, 10**5000)),
)


@pytest.mark.parametrize("bad", NO_NUMBERS, ids=range(len(NO_NUMBERS)))
def test_anything_else_is_refused_in_one_sentence(bad):
    with pytest.raises(NumberRefused) as refused:
        exact(bad)
    assert refused.value.exit_code == 2
    assert "\n" not in str(refused.value)
    assert len(str(refused.value)) < LONGEST_NUMBER + 100


def test_zero_times_pi_is_zero():
    assert exact("0*pi") == exact("0")
    assert not exact("0*pi").of_pi


@pytest.mark.parametrize(
    "given_number",
    [7, Fraction(7), 7.0, Decimal(7), "7", np.int64(7), np.uint8(7), np.float64(7), Exact(Fraction(7))],
)
def test_every_kind_of_number_means_the_same(given_number):
    assert exact(given_number) == Exact(Fraction(7))


@given(st.floats(allow_nan=False, allow_infinity=False))
@example(5e-324)
@example(1.7976931348623157e308)
@example(0.1)
@example(1e22)
def test_a_float_means_its_shortest_decimal(number):
    assert exact(number).value == Fraction(repr(number))
    assert float(exact(number)) == number


@given(WRITTEN)
def test_a_decimal_becomes_its_correctly_rounded_float(text):
    assert float(exact(text)) == float(text)


@given(SCALED, st.booleans())
@example(Fraction(1, 2**1000), False)
@example(Fraction(3**400, 2**600), False)
@example(Fraction(1, 10**390), True)
@example(Fraction(10**18), False)
@example(Fraction(-(10**25)), False)
@example(Fraction(-1, 10**19), False)
@example(Fraction(2**918 + 1, 2**379), False)
def test_the_text_of_a_number_is_read_back_as_the_same_number(value, of_pi):
    number = Exact(value, of_pi)
    text = str(number)
    assert len(text) <= LONGEST_NUMBER
    assert exact(text) == number


@given(st.text(max_size=12), st.text("0123456789.eE+-/*pi ", max_size=14))
def test_any_text_is_a_number_that_can_be_written_or_is_refused(plain, likely):
    for text in (plain, likely):
        with suppress(NumberRefused):
            number = exact(text)
            assert exact(str(number)) == number
            assert not math.isnan(float(number))


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (Fraction(5, 2), "2.5"),
        (Fraction(-1, 8), "-0.125"),
        (Fraction(1, 3), "1/3"),
        (Fraction(7), "7"),
        (Fraction(1, 10**25), "1e-25"),
        (Fraction(3 * 10**25), "3e25"),
        (Fraction(0), "0"),
    ],
)
def test_numbers_are_written_as_people_write_them(value, text):
    assert fraction_text(value) == text


@given(SCALED)
@example(Fraction(1, 10**320))
@example(Fraction(10**400))
@example(Fraction(-(10**400)))
@example(Fraction(2**53 + 1))
def test_a_ratio_is_rounded_once(value):
    with mpmath.workprec(4000):
        expected = float(mpmath.mpf(value.numerator) / value.denominator)
    found = float_of(value)
    assert found == expected or (abs(found) < 1e-300 and abs(found - expected) <= 5e-324)
    assert float(Exact(value)) == found


@given(RATIOS)
@example(Fraction(1))
@example(Fraction(355, 113))
def test_a_multiple_of_pi_is_rounded_once(value):
    with mpmath.workdps(200):
        expected = float(mpmath.pi * value.numerator / value.denominator)
    assert float(Exact(value, of_pi=True)) == expected


def test_pi_is_pi():
    with mpmath.workdps(200):
        assert abs(mpmath.mpf(str(PI)) - mpmath.pi) < mpmath.mpf(10) ** -83
    assert float(exact("pi")) == math.pi
    assert float(exact("1e300*pi/1e-9")) == math.inf


@given(RATIOS, st.booleans(), RATIOS, st.booleans())
def test_numbers_are_ordered_by_value(one, one_pi, two, two_pi):
    left, right = Exact(one, one_pi), Exact(two, two_pi)
    with mpmath.workdps(150):
        sizes = [
            mpmath.mpf(each.numerator) / each.denominator * (mpmath.pi if of_pi else 1)
            for each, of_pi in ((one, one_pi), (two, two_pi))
        ]
    assert (left < right) == (sizes[0] < sizes[1])
    assert (left >= right) == (sizes[0] >= sizes[1])
    assert (left == right) == (sizes[0] == sizes[1])
    assert left != right or hash(left) == hash(right)
