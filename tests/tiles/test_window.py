"""Axes and views: edges exact and rounded once, bit-equal between refinements, refusals."""

from fractions import Fraction

import mpmath
import numpy as np
import pytest
from hypothesis import assume, example, given
from hypothesis import strategies as st

from tiles.errors import WindowRefused
from tiles.number import Exact, exact
from tiles.window import Axis, View

PLAIN = st.builds(Fraction, st.integers(-(10**20), 10**20), st.integers(1, 10**20))
POSITIVE = st.builds(Fraction, st.integers(1, 10**20), st.integers(1, 10**20))


def axis(low, high, kind):
    """Return an axis of a kind: linear, of multiples of pi, or logarithmic."""
    of_pi = kind == "pi"
    return Axis("r", Exact(low, of_pi), Exact(high, of_pi), "log" if kind == "log" else "linear")


@st.composite
def axes(draw, kinds=("linear", "pi", "log")):
    kind = draw(st.sampled_from(kinds))
    ends = POSITIVE if kind == "log" else PLAIN
    low, high = sorted([draw(ends), draw(ends)])
    assume(low < high)
    return axis(low, high, kind)


def slow_point(given_axis, top, bottom):
    """Return low + (high - low) * top / bottom of an axis, in the exponent on a log axis, to 300 digits."""
    with mpmath.workdps(300):
        low, high = (
            mpmath.mpf(end.value.numerator) / end.value.denominator * (mpmath.pi if end.of_pi else 1)
            for end in (given_axis.low, given_axis.high)
        )
        share = mpmath.mpf(top) / bottom
        if given_axis.scale == "log":
            return float(low * mpmath.exp(mpmath.log(high / low) * share))
        return float(low + (high - low) * share)


@given(axes(), st.integers(1, 60), st.integers(1, 5), st.data())
def test_edges_centres_and_values_are_correctly_rounded(found, cells, per_cell, data):
    first = data.draw(st.integers(0, cells - 1))
    last = data.draw(st.integers(first + 1, cells))
    edges = found.edges(cells, first, last)
    assert edges.tolist() == [slow_point(found, k, cells) for k in range(first, last + 1)]
    assert found.centres(cells, first, last).tolist() == [
        slow_point(found, 2 * k + 1, 2 * cells) for k in range(first, last)
    ]
    assert found.values(cells, per_cell, first, last).tolist() == [
        [slow_point(found, 2 * (k * per_cell + s) + 1, 2 * cells * per_cell) for s in range(per_cell)]
        for k in range(first, last)
    ]


@given(axes(("linear", "pi")), st.integers(1, 300), st.data())
def test_linear_edges_equal_the_exact_rational(found, cells, data):
    k = data.draw(st.integers(0, cells))
    value = found.low.value + (found.high.value - found.low.value) * Fraction(k, cells)
    assert found.edges(cells, k, k)[0] == float(Exact(value, found.of_pi))


@given(axes(), st.integers(0, 90), st.integers(1, 6), st.data())
@example(axis(Fraction(1), Fraction(4), "log"), 3, 1, None)
def test_edges_are_bit_equal_at_every_level_of_refinement(found, level, deeper, data):
    cells = 2**level
    first = data.draw(st.integers(0, cells)) if data else 0
    last = min(cells, first + 9)
    coarse = found.edges(cells, first, last)
    fine = found.edges(cells << deeper, first << deeper, last << deeper)
    assert fine[:: 1 << deeper].tobytes() == coarse.tobytes()


@given(axes(), st.integers(0, 70), st.data())
def test_neighbours_share_their_edge_and_a_strip_is_a_part_of_the_whole(found, level, data):
    cells = 2**level
    middle = data.draw(st.integers(0, cells))
    left, right = max(0, middle - 4), min(cells, middle + 4)
    whole = found.edges(cells, left, right)
    parts = found.edges(cells, left, middle), found.edges(cells, middle, right)
    assert parts[0][-1].tobytes() == parts[1][0].tobytes()
    assert np.concatenate([parts[0], parts[1][1:]]).tobytes() == whole.tobytes()
    assert (np.diff(whole) >= 0).all()
    if left < right:
        values = found.values(cells, 3, left, right)
        assert (values >= whole[:-1, None]).all()
        assert (values <= whole[1:, None]).all()
        assert (
            found.values(cells, 1, left, right)[:, 0].tobytes() == found.centres(cells, left, right).tobytes()
        )


@given(axes(), st.integers(1, 120))
def test_the_ends_are_the_ends(found, cells):
    edges = found.edges(cells)
    assert edges.shape == (cells + 1,)
    assert edges.dtype == np.float64
    assert edges[0] == float(found.low)
    assert edges[-1] == float(found.high)
    assert found.centres(cells).shape == (cells,)
    assert found.values(cells, 4).shape == (cells, 4)


@given(axes(), st.integers(1, 10**6))
def test_the_size_of_a_cell_is_correctly_rounded(found, cells):
    with mpmath.workdps(200):
        low, high = (
            mpmath.mpf(end.value.numerator) / end.value.denominator * (mpmath.pi if end.of_pi else 1)
            for end in (found.low, found.high)
        )
        whole = mpmath.log(high / low) if found.scale == "log" else high - low
        assert found.cell_size(cells) == float(whole / cells)


def test_many_cells_of_a_log_axis_agree_with_single_ones():
    found = axis(Fraction(1, 10), Fraction(100), "log")
    edges = found.edges(5000)
    assert (np.diff(edges) > 0).all()
    for k in (0, 1, 1023, 1024, 1025, 2048, 3071, 4999, 5000):
        assert edges[k] == found.edges(5000, k, k)[0] == slow_point(found, k, 5000)


def test_whole_numbers_of_numpy_do_not_overflow():
    found = Axis.make(("r", "2.81234567890123456789", "3.99999999999999999999"))
    plain = found.values(4252, 4, 10, 12)
    assert found.values(np.int64(4252), np.int64(4), np.int64(10), np.int64(12)).tobytes() == plain.tobytes()
    assert (
        found.edges(np.int32(4252), np.int16(3), np.int16(5)).tobytes() == found.edges(4252, 3, 5).tobytes()
    )


def test_axes_are_read_from_lists_and_mappings():
    plain = Axis("r", exact("2.8"), exact("4"))
    assert Axis.make(("r", "2.8", 4)) == Axis.make(["r", 2.8, "4"]) == plain
    assert Axis.make({"name": "r", "low": "2.8", "high": 4}) == Axis.make(plain) == plain
    full = Axis.make({"name": "a", "low": 1, "high": 10, "scale": "log", "label": "growth"})
    assert (full.scale, full.label, full.of_pi) == ("log", "growth", False)
    assert Axis.make(("theta", 0, "2*pi")).of_pi
    assert Axis.make(("theta", "-pi", 0)).of_pi


@pytest.mark.parametrize(
    ("bad", "said"),
    [
        (("r", 4, 2.8), "empty or reversed"),
        (("r", 4, 4), "empty or reversed"),
        (("r", 0, "x"), "'x' is not a number"),
        (("r", "nan", 1), "'nan' is not a number"),
        (("r", 0, "1e9999"), "too large"),
        (("r", 0, "1e310"), "beyond float64"),
        (("r", "-1e310", 0), "beyond float64"),
        (("r", 1, "2*pi"), "mix multiples of pi"),
        (("r", 1), r"\[name, low, high\]"),
        ("r", r"\[name, low, high\]"),
        (7, r"\[name, low, high\]"),
        ({"name": "r", "low": 0}, "needs the key 'high'"),
        ({"name": "r", "low": 0, "hihg": 1}, "did you mean 'high'"),
        ({"name": "r", "low": 0, "high": 1, "scale": "log"}, "cannot start at 0"),
        ({"name": "r", "low": -1, "high": 1, "scale": "log"}, "cannot start at -1"),
        ({"name": "r", "low": 1, "high": 2, "scale": "lin"}, "did you mean 'linear'"),
        ({"name": "r", "low": 1, "high": 2, "scale": []}, "allowed: linear, log"),
    ],
)
def test_other_axes_are_refused_in_one_sentence(bad, said):
    with pytest.raises(WindowRefused, match=said) as refused:
        Axis.make(bad)
    assert refused.value.exit_code == 2
    assert "\n" not in str(refused.value)


def test_a_view_has_two_different_axes():
    view = View(across=("r", "2.8", "4"), up={"name": "x", "low": 0, "high": 1})
    assert view.across.cell_size(12) == 0.1
    assert view.up.name == "x"
    assert view == View(view.across, view.up)
    assert hash(view) == hash(View(view.across, view.up))
    with pytest.raises(WindowRefused, match="both axes"):
        View(("x", 0, 1), ("x", 0, 2))
    with pytest.raises(AttributeError):
        view.up = view.across
