"""Shading of values: a pure look-up, each sign with its own scale, cycles closed, labels in their place."""

from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from tiles.curve import LEVELS, SHADINGS
from tiles.values import KINDS, ValueFit, ValuesRefused, fit_values, shade_values, value_key_labels

ANY = st.floats(-1e6, 1e6) | st.sampled_from([np.nan, np.inf, -np.inf, 0.0, -0.0])
PLANES = arrays(np.float64, st.tuples(st.integers(1, 12), st.integers(1, 12)), elements=ANY)


def slow_shade(value, fit):
    """Count the thresholds one by one."""
    if not np.isfinite(value):
        return 0
    if fit.kind == "cyclic":
        value = value - np.floor(value)
        value = 0.0 if value >= 1 - 0.5 / LEVELS else value
    return 1 + sum(bool(threshold <= value) for threshold in fit.thresholds)


@given(PLANES, st.sampled_from(KINDS), st.sampled_from(SHADINGS))
def test_shades_are_those_of_the_slow_twin_and_a_mosaic_of_shades(values, kind, shading):
    fit = fit_values(values, kind=kind, shading=shading)
    shades = shade_values(values, fit)
    assert shades.dtype == np.uint8
    assert shades.tolist() == [[slow_shade(value, fit) for value in row] for row in values]
    halves = np.array_split(values, 2)
    assert np.array_equal(np.concatenate([shade_values(half, fit) for half in halves]), shades)


@given(PLANES, st.sampled_from(KINDS), st.sampled_from(SHADINGS))
def test_a_fit_survives_json_and_cannot_be_changed(values, kind, shading):
    fit = fit_values(values, kind=kind, shading=shading)
    again = ValueFit.from_json(fit.to_json())
    assert again == fit
    assert hash(again) == hash(fit)
    with pytest.raises(ValueError, match="read-only"):
        fit.thresholds[0] = 1
    assert (np.diff(fit.thresholds) >= 0).all()
    assert fit.low <= fit.thresholds[0]
    assert fit.thresholds[-1] <= fit.high


@given(PLANES)
def test_order_of_the_cells_and_cells_without_value_do_not_matter(values):
    for kind in KINDS:
        fit = fit_values(values, kind=kind)
        assert fit_values(values[::-1].T, kind=kind) == fit
        assert fit_values(np.append(values, [np.nan, np.inf, -np.inf]), kind=kind) == fit


@given(PLANES)
def test_the_sign_of_a_value_decides_on_which_side_of_a_diverging_ramp_it_lies(values):
    shades = shade_values(values, fit_values(values, kind="diverging"))
    finite = np.isfinite(values)
    assert (shades[finite & (values < 0)] <= LEVELS // 2).all()
    assert (shades[finite & (values >= 0)] > LEVELS // 2).all()
    assert (shades[~finite] == 0).all()


def test_each_side_of_a_diverging_ramp_reaches_to_its_own_99_percent():
    rng = np.random.default_rng(5)
    deep, low = -rng.exponential(2.0, 4000), rng.uniform(0, 0.4, 3000)
    values = rng.permutation(np.concatenate([deep, low]))
    fit = fit_values(values, kind="diverging")
    assert fit.low == np.sort(deep)[40]
    assert fit.high == np.sort(low)[2969]
    assert fit.centre == 0
    shades = shade_values(values, fit)
    assert np.count_nonzero(shades == 1) >= 40
    assert np.count_nonzero(shades == LEVELS) >= 30


@pytest.mark.parametrize(
    ("values", "low", "high"),
    [([-3.0, -1.0], -3.0, 3.0), ([0.5, 0.0], -0.5, 0.5), ([0.0], -1.0, 1.0), ([], -1.0, 1.0)],
)
def test_a_side_without_values_is_as_long_as_the_other(values, low, high):
    fit = fit_values(np.array(values), kind="diverging")
    assert (fit.low, fit.high) == (low, high)


def test_simple_fractions_of_a_turn_do_not_flicker():
    fit = fit_values(np.zeros(0), kind="cyclic")
    for denominator in (1, 2, 3, 4, 6, 8, 9):
        for numerator in range(denominator):
            near = numerator / denominator + np.array([-1e-4, -1e-12, 0, 1e-12, 1e-4, 7, -3])
            assert len(set(shade_values(near, fit).tolist())) == 1
    assert shade_values(np.linspace(0, 1, LEVELS, endpoint=False), fit).tolist() == [*range(1, LEVELS + 1)]


def test_equalised_values_use_every_shade_equally():
    values = np.random.default_rng(1).lognormal(3, 1, 21600)
    shades = shade_values(values, fit_values(values, kind="sequential"))
    assert np.abs(np.bincount(shades)[1:] - 100).max() <= 1


def test_linear_values_run_from_one_percent_to_99():
    values = np.arange(-5000.0, 5001.0)
    fit = fit_values(values, kind="sequential", shading="linear")
    assert (fit.low, fit.high) == (-4900.0, 4900.0)
    assert np.allclose(np.diff(fit.thresholds), 9800 / LEVELS)


def test_logarithmic_values_pass_over_what_has_no_logarithm():
    values = np.array([-2.0, 0.0, 1.0, 10.0, 100.0])
    fit = fit_values(values, kind="sequential", shading="logarithmic")
    assert (fit.low, fit.high) == (1.0, 100.0)
    assert shade_values(values, fit).tolist() == [1, 1, 1, LEVELS // 2 + 1, LEVELS]


@given(PLANES, st.sampled_from(KINDS), st.sampled_from(SHADINGS))
def test_labels_are_few_apart_and_ascending(values, kind, shading):
    labels = value_key_labels(fit_values(values, kind=kind, shading=shading))
    places = [place for place, _ in labels]
    assert len(labels) <= 8
    assert all(0 <= place <= 1 for place in places)
    assert all(high - low >= 0.14 for low, high in pairwise(places))
    assert len({text for _, text in labels}) == len(labels)


@given(st.floats(1e-6, 1e6), st.floats(1e-6, 1e6))
def test_a_diverging_key_labels_zero_and_equal_steps(low, high):
    fit = fit_values(np.array([-low, high]), kind="diverging")
    labels = value_key_labels(fit)
    assert (0.5, "0") in labels
    below = [text for place, text in labels if place < 0.5]
    above = [text for place, text in labels if place > 0.5]
    assert 1 <= len(below) <= 3
    assert 1 <= len(above) <= 3
    assert all(text.startswith("−") for text in below)
    for place, text in labels:
        if "×" not in text and "10" not in text:
            value = float(text.replace("−", "-"))
            assert place == pytest.approx(0.5 + 0.5 * value / (fit.high if value > 0 else -fit.low))


def test_a_side_of_a_diverging_ramp_is_a_32nd_of_the_other_at_least():
    """Exponents that scatter around zero are pale, however deep the cycles beside them are."""
    values = np.concatenate([np.full(100, -3.2), np.full(100, 1e-3)])
    fit = fit_values(values, kind="diverging")
    assert (fit.low, fit.high) == (-3.2, 0.1)
    assert set(shade_values(values, fit).tolist()) == {1, LEVELS // 2 + 2}


def test_keys_of_the_other_kinds():
    turns = value_key_labels(fit_values(np.zeros(1), kind="cyclic"))
    assert [text for _, text in turns] == ["0", "0.25", "0.5", "0.75", "1"]
    steps = fit_values(np.linspace(1, 60, 1000), kind="sequential")
    assert [text for _, text in value_key_labels(steps)] == ["10", "20", "30", "40", "50"]
    signed = value_key_labels(fit_values(np.linspace(-50, 50, 1001), kind="sequential"))
    assert [text for _, text in signed] == ["−40", "−20", "0", "20", "40"]
    assert value_key_labels(fit_values(np.zeros(0), kind="sequential")) == []


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("", "needs a kind"),
        ("[]", "needs a kind"),
        ('{"kind": "cyclic", "low": 0, "high": 1}', "needs a kind"),
        ('{"kind": "cyclic", "low": 0, "high": 1, "thresholds": [1, 2]}', "215 finite thresholds"),
        ('{"kind": "cyclic", "low": 0, "high": NaN, "thresholds": [1, 2]}', "215 finite thresholds"),
        ('{"kind": "round", "low": 0, "high": 1, "thresholds": []}', "'round' are unknown"),
        (
            f'{{"kind": "cyclic", "low": 2, "high": 1, "thresholds": {[1.0] * 215}}}',
            "ascending thresholds from low to high",
        ),
    ],
)
def test_other_records_are_refused(text, message):
    with pytest.raises(ValuesRefused, match=message):
        ValueFit.from_json(text)


def test_unknown_kinds_and_shadings_are_refused():
    with pytest.raises(ValuesRefused, match="did you mean 'cyclic'"):
        fit_values(np.zeros(1), kind="cyclical")
    with pytest.raises(ValuesRefused, match="did you mean 'linear'"):
        fit_values(np.zeros(1), kind="sequential", shading="liner")
