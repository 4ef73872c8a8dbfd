"""Labels of a colour key: round, few, apart, and where the densities stand."""

from decimal import Decimal
from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tiles.key import number_text, ramp_labels
from tiles.shading import LEVELS, SHADINGS, fit, key_labels


def test_a_linear_key_counts_in_equal_steps():
    labels = ramp_labels(50.0 * np.arange(1, LEVELS) / LEVELS)
    assert [text for _, text in labels] == ["1", "10", "20", "30", "40"]
    assert [place for place, _ in labels[1:]] == pytest.approx([0.2, 0.4, 0.6, 0.8])


def test_a_logarithmic_key_counts_in_decades():
    labels = ramp_labels(10.0 ** (-2 + 4 * np.arange(1, LEVELS) / LEVELS))
    assert [text for _, text in labels][:3] == ["0.1", "1", "10"]
    assert [place for place, _ in labels][:3] == pytest.approx([0.25, 0.5, 0.75])


def test_ink_has_no_key():
    assert key_labels(fit(np.array([1.0, 2.0]), "ink")) == []


def test_a_single_density_has_one_label():
    assert key_labels(fit(np.array([1.234, 1.234]))) == [(1.0, "1.2")]
    assert key_labels(fit(np.array([2.0]))) == [(1.0, "2")]


def test_a_narrow_range_has_one_label():
    assert ramp_labels(np.linspace(1.2301, 1.2302, LEVELS - 1)) == [(1.0, "1.2")]


@pytest.mark.parametrize(
    ("number", "text"),
    [
        ("1", "1"),
        ("0.001", "0.001"),
        ("1.0e-3", "0.001"),
        ("0.0025", "0.0025"),
        ("9000", "9000"),
        ("9e3", "9000"),
        ("120", "120"),
        ("1e4", "10⁴"),
        ("2.5e12", "2.5×10¹²"),
        ("2.0e-5", "2×10⁻⁵"),
        ("1e-10", "10⁻¹⁰"),
    ],
)
def test_numbers_are_written_plainly_or_with_a_power_of_ten(number, text):
    assert number_text(Decimal(number)) == text


@given(
    st.lists(st.floats(1e-12, 1e12), min_size=1, max_size=40),
    st.sampled_from(SHADINGS),
)
def test_labels_are_few_apart_and_in_place(densities, shading):
    found = fit(np.array(densities), shading)
    labels = key_labels(found)
    places = [place for place, _ in labels]
    assert len(labels) <= 7
    assert all(0 < place <= 1 for place in places)
    assert all(high - low >= 0.15 - 1e-12 for low, high in pairwise(places))
    assert len({text for _, text in labels}) == len(labels)
    assert shading == "ink" or labels


@given(st.lists(st.integers(2, 9000), min_size=3, max_size=60, unique=True))
def test_the_shade_at_a_label_is_the_shade_of_its_density(counts):
    found = fit(np.array(counts, dtype=float))
    for place, text in key_labels(found):
        index = np.searchsorted(found.thresholds, float(text), side="right")
        assert abs(place * LEVELS - index) <= 1 or place == 1.0
