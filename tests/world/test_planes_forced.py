"""The logistic map forced by a repeating word: M. Markus and B. Hess 1989 (citation from memory).

Values of single words: common practice, no source, multipliers of refined cycles. Exact algebra otherwise.
"""

from __future__ import annotations

import math
from fractions import Fraction
from typing import Any

import numpy as np
import pytest

import atlas
from atlas.planes.fates import CHAOTIC, FIXED_POINT, PERIODIC, UNSETTLED
from tests.reference.published import ids, published
from tests.world.planes import centred, classes, pixel, plane

NAME = "forced_logistic"
LAYERS = ("fate", "period", "lyapunov", "lyapunov_error")
HALF = [{"x": "0.5"}]
SIZE = 64


def turned(word: str) -> dict[str, Any]:
    """Return the setting of a word such as AAB."""
    return {"r": {"pattern": list(word.lower())}}


@pytest.fixture(scope="module")
def forced() -> Any:
    return plane(NAME, ("a", 2, 4), ("b", 2, 4), (SIZE, SIZE), LAYERS)


@pytest.fixture(scope="module")
def later() -> Any:
    """Return the same plane with the letter b in the first step."""
    return plane(NAME, ("a", 2, 4), ("b", 2, 4), (SIZE, SIZE), LAYERS, set=turned("BA"))


def test_equal_letters_make_the_logistic_map(forced: Any) -> None:
    """mh.diag: fate, period and exponent on the diagonal."""
    assert "plain logistic exponent" in published("mh.diag").quantity
    for k in range(0, SIZE, 3):
        own = forced.isel(a=k, b=k)
        twin = atlas.lyapunov_spectrum(atlas.family("logistic"), {"r": Fraction(float(own.a))}, steps=2000)
        assert own.fate == twin.fate[0]
        assert own.period == twin.period[0]
        slack = 4 * math.hypot(float(own.lyapunov_error), float(twin.error[0, 0])) + 1e-9
        assert float(own.lyapunov) == pytest.approx(float(twin.lyapunov[0, 0]), abs=slack)


def test_the_mirror_image_has_the_other_letter_first(forced: Any, later: Any) -> None:
    """mh.swap: a and b exchanged, word and plane, is the same map; to the last bit."""
    assert "symmetric under a<->b" in published("mh.swap").quantity
    for name in LAYERS:
        np.testing.assert_array_equal(forced[name].values, later[name].values.T)


def test_the_phase_matters_only_where_attractors_coexist(forced: Any, later: Any) -> None:
    """mh.swap: one start a step later on the same attractor has the same exponent, but for coexistence."""
    cycles = (forced.period > 0) & (later.period > 0)
    other = cycles.values & (abs(forced.lyapunov - later.lyapunov).values > 1e-3)
    assert 8 < other.sum() < 0.15 * cycles.values.sum()
    for row, column in np.argwhere(other)[::3]:
        a, b = (Fraction(float(made[k])) for made, k in ((forced.a, column), (forced.b, row)))
        grid = {"grid": [16], "box": {"x": [0, 1]}}
        found = pixel(NAME, {"a": a, "b": b}, ("attractors",), starts=grid)
        assert found["attractors"] == 2


@pytest.mark.parametrize("name", [name for name in ids("mh.lyap.") if "mh.lyap." in name])
def test_cycles_of_words(name: str) -> None:
    record = published(name)
    at = {key: str(record.parameters[key]) for key in "ab"}
    found = pixel(NAME, at, LAYERS, starts=HALF, set=turned(record.parameters["word"]))
    assert found["fate"] == PERIODIC
    assert found["period"] == record.value["period"]
    assert found["lyapunov"] == pytest.approx(float(record.value["lyapunov"]), abs=1e-6)
    assert found["lyapunov_error"] == 0


@pytest.mark.parametrize("name", ids("mh.lyapnum."))
def test_chaos_of_words_within_its_stated_error(name: str) -> None:
    record = published(name)
    at = {key: str(record.parameters[key]) for key in "ab"}
    word = turned(record.parameters["word"])
    found = pixel(NAME, at, LAYERS, starts=HALF, set=word, steps=400_000)
    assert found["fate"] == CHAOTIC
    assert abs(found["lyapunov"] - float(record.number())) < 4 * found["lyapunov_error"] + 1e-4
    assert found["lyapunov_error"] < 2e-3


@pytest.mark.parametrize(("word", "first"), [("AB", "A_first"), ("BA", "B_first")])
def test_which_of_two_attractors_the_first_letter_chooses(word: str, first: str) -> None:
    """mh.bistable: from x = 1/2."""
    record = published("mh.bistable.3.4_3.25")
    at = {key: str(record.parameters[key]) for key in "ab"}
    found = pixel(NAME, at, LAYERS, starts=HALF, set=turned(word))
    assert found["period"] == record.value[first]["period"]
    assert found["lyapunov"] == pytest.approx(float(record.value[first]["lyapunov"]), abs=1e-6)


def test_at_full_height_the_exponent_is_the_logarithm_of_2_within_its_error() -> None:
    for start in ("0.3", "0.123"):
        found = pixel(NAME, {"a": 4, "b": 4}, LAYERS, steps=200_000, starts=[{"x": start}])
        assert found["fate"] == CHAOTIC
        assert abs(found["lyapunov"] - math.log(2)) < 4 * found["lyapunov_error"]
        assert found["lyapunov_error"] < 1e-4


def test_a_poor_environment_on_the_whole_is_the_end() -> None:
    """mh.zero: for a b < 1 the exponent is ln(a b) / 2, though b is above 1."""
    record = published("mh.zero")
    found = pixel(NAME, {key: str(record.parameters[key]) for key in "ab"}, LAYERS)
    assert found["fate"] == FIXED_POINT
    assert found["lyapunov"] == pytest.approx(float(record.number()), abs=1e-7)
    made = plane(NAME, ("a", "0.1", "2"), ("b", "0.1", "2"), (38, 38), LAYERS)
    product = made.a.values * made.b.values[:, np.newaxis]
    gone = (product < 0.98) & (made.fate.values == FIXED_POINT)
    assert gone.sum() == (product < 0.98).sum() > 300
    np.testing.assert_allclose(made.lyapunov.values[gone], np.log(product[gone]) / 2, atol=1e-5)
    alive = product > 1.1
    assert (made.lyapunov.values[alive] < -0.01).all()
    assert (made.period.values[alive & (abs(made.a.values - made.b.values[:, np.newaxis]) > 0.01)] == 2).all()


@pytest.mark.parametrize("name", ids("mh.pd."))
def test_the_forced_cycle_doubles_in_the_right_pixel(name: str) -> None:
    """mh.pd: exact algebra, roots of a resultant. One start of two finds the cycle that doubles."""
    record, cell = published(name), Fraction(1, 2000)
    for place in range(len(record.value)):
        at = record.number(place)
        up = ("b", at - Fraction(9, 2) * cell, at + Fraction(9, 2) * cell)
        a = centred("a", str(record.parameters["a"]))
        found = [
            classes(plane(NAME, a, up, (1, 9), LAYERS, starts=[{"x": start}]))[:, 0].tolist()
            for start in ("0.3", "0.5")
        ]
        sides = [(column[:4], column[5:]) for column in found]
        assert ([2] * 4, [4] * 4) in sides or ([4] * 4, [2] * 4) in sides, found


@pytest.mark.parametrize(
    ("name", "place", "numbers"), [("mh.fold.3.2", 0, (1, 2)), ("mh.fold.3.2", 1, (2, 1))]
)
def test_a_second_attractor_is_born_and_dies_in_the_right_pixel(
    name: str, place: int, numbers: tuple[int, int]
) -> None:
    """mh.fold: exact algebra; b = 25/8 and 27/8 at a = 16/5."""
    record, cell = published(name), Fraction(1, 2000)
    at = record.number(place)
    up = ("b", at - Fraction(9, 2) * cell, at + Fraction(9, 2) * cell)
    a = centred("a", str(record.parameters["a"]))
    grid = {"grid": [8], "box": {"x": [0, 1]}}
    made = plane(NAME, a, up, (1, 9), ("fate", "period", "attractors"), starts=grid)
    assert made.attractors.values[:4, 0].tolist() == [numbers[0]] * 4
    assert made.attractors.values[5:, 0].tolist() == [numbers[1]] * 4
    assert (made.fate != UNSETTLED).all()


def test_chaos_ends_where_the_cycle_is_born_at_full_height() -> None:
    """mh.fold.4.0: b = 27/8 at a = 4, exact algebra."""
    at, cell = published("mh.fold.4.0").number(0), Fraction(1, 2000)
    assert at == Fraction(27, 8)
    up = ("b", at - Fraction(9, 2) * cell, at + Fraction(9, 2) * cell)
    made = plane(NAME, centred("a", 4), up, (1, 9), LAYERS, transient=20_000)
    assert (made.fate.values[:4, 0] == CHAOTIC).all()
    assert made.period.values[5:, 0].tolist() == [2] * 4


@pytest.mark.parametrize("a", ["3.1", "3.4", "3.7"])
def test_the_exponent_falls_without_end_on_the_superstable_curve(a: str) -> None:
    """mh.ss: b = 8 / (a (4 - a)); a tenth nearer to it, the exponent per step is ln 10 / 2 lower."""
    assert "b = 8/(a(4-a))" in published("mh.ss").value
    on = 8 / (Fraction(a) * (4 - Fraction(a)))
    assert pixel(NAME, {"a": a, "b": on}, LAYERS, starts=HALF)["lyapunov"] < -9
    beside = [
        pixel(NAME, {"a": a, "b": on + Fraction(1, far)}, LAYERS, starts=HALF)["lyapunov"]
        for far in (10**4, 10**5, 10**6)
    ]
    np.testing.assert_allclose(np.diff(beside), -math.log(10) / 2, atol=2e-3)
