"""The Henon map in planes, portraits and charts of starts; sources stand in the records."""

from __future__ import annotations

import math
from fractions import Fraction
from typing import Any

import numpy as np
import pytest

import atlas
from atlas.planes.fates import CHAOTIC, CLASS_ESCAPES, ESCAPES, PERIODIC
from tests.reference.published import published
from tests.world.planes import centred, classes, pixel, plane, shares, wrong

LAYERS = ("fate", "period", "lyapunov", "lyapunov_2", "lyapunov_error")
B = Fraction("0.3")
DOUBLINGS = [
    Fraction("0.3675"),
    Fraction("0.9125"),
    *(published(f"hen.pd.{k}").number() for k in range(3, 8)),
]


def said(a: np.ndarray, b: np.ndarray) -> np.ndarray:
    """Return the class by the curves of record hen.exist: M. Henon 1976 (from memory); exact algebra."""
    fold, first = -((1 - b) ** 2) / 4, 3 * (1 - b) ** 2 / 4
    second = (1 - b) ** 2 + (1 + b) ** 2 / 4
    return np.select([a < fold, a < first, a < second], [CLASS_ESCAPES, 1, 2], 0)


@pytest.fixture(scope="module")
def near_0() -> Any:
    """Return a plane from the fold to beyond the second doubling, where the start lies in the basin."""
    return plane("henon", ("a", "-0.4", "1.3"), ("b", "-0.15", "0.45"), (170, 31), LAYERS)


def test_fold_and_two_doublings_border_the_fates_to_a_pixel(near_0: Any) -> None:
    assert "a1 = 3(1-b)^2/4" in published("hen.exist").value
    assert wrong(near_0, said) == []
    spoken = shares(near_0, said)
    assert spoken[CLASS_ESCAPES] > 500
    assert spoken[1] > 1500
    assert spoken[2] > 1000


def test_both_exponents_add_up_to_the_logarithm_of_the_area(near_0: Any) -> None:
    """hen.det: every step multiplies areas by b, on cycles as in chaos."""
    assert "det = -b" in published("hen.det").value
    total = near_0.lyapunov + near_0.lyapunov_2 - np.log(abs(near_0.b))
    stays = near_0.fate != ESCAPES
    assert int((near_0.fate == CHAOTIC).sum()) > 50
    assert abs(total.values[stays.values]).max() < 1e-12


@pytest.mark.parametrize("number", range(3, 8))
def test_later_doublings_lie_in_their_column(number: int) -> None:
    """hen.pd: B. Derrida, A. Gervois and Y. Pomeau 1979, J. Phys. A 12, 269 (citation from memory)."""
    at, before = DOUBLINGS[number - 1], DOUBLINGS[number - 2]
    period = published(f"hen.pd.{number}").parameters["period_before"]
    column = (at - before) / 200
    across = ("a", at - 5 * column + column / 3, at + 4 * column + column / 3)
    made = plane("henon", across, centred("b", B), (9, 1), LAYERS, longest_period=256, transient=20_000)
    assert classes(made)[0, :4].tolist() == [period] * 4
    assert classes(made)[0, 5:].tolist() == [2 * period] * 4


def test_the_window_of_period_7() -> None:
    record = published("hen.1.3")
    found = pixel("henon", {"a": "1.3", "b": B}, LAYERS)
    assert found["fate"] == PERIODIC
    assert found["period"] == record.value["period"]
    assert found["lyapunov"] == pytest.approx(float(record.value["lyapunov"]), abs=1e-6)


@pytest.mark.parametrize(("a", "name"), [("1.4", "hen.lyap"), ("1.2", "hen.lyapnum.1.2")])
def test_exponents_in_chaos_within_their_stated_error(a: str, name: str) -> None:
    """hen.lyap: J. C. Sprott 2003 (from memory); hen.lyapnum.1.2: common practice, no source."""
    found = pixel("henon", {"a": a, "b": B}, LAYERS, steps=400_000)
    assert found["fate"] == CHAOTIC
    off = abs(found["lyapunov"] - float(published(name).value))
    assert off < 4 * found["lyapunov_error"] + 5e-5
    assert off < 2e-3
    assert found["lyapunov"] + found["lyapunov_2"] == pytest.approx(math.log(0.3), abs=1e-12)


def test_the_extent_of_the_attractor() -> None:
    """hen.extent: common practice, no source; the other state variable is b times the state before."""
    view = atlas.View(("x", "-1.5", "1.5"), ("y", "-0.45", "0.45"))
    made = atlas.phase_portrait(atlas.family("henon"), view, size=(3000, 3000), samples=4_000_000)
    low, high = (float(published("hen.extent").number(k)) for k in (0, 1))
    for axis, factor, cell in (("x", 1, 1e-3), ("y", 0.3, 3e-4)):
        other = "y" if axis == "x" else "x"
        there = made[axis].values[np.flatnonzero(made.counts.sum(other))]
        assert factor * low - cell < there[0] < factor * low + 2 * cell
        assert factor * high - 2 * cell < there[-1] < factor * high + cell
    assert int(made.counts.sum()) == int(made.exposure)


def test_at_1_and_a_half_there_is_no_attractor() -> None:
    """hen.diverge: exact algebra."""
    record = published("hen.diverge")
    at = {"a": str(record.parameters["a"]), "b": str(record.parameters["b"])}
    assert record.value == "divergent"
    found = pixel("henon", at, ("fate", "lyapunov", "escape"))
    assert found["fate"] == ESCAPES
    assert math.isnan(found["lyapunov"])
    assert 5 < found["escape"] < 50
    view = atlas.View(("x", -2, 2), ("y", -2, 2))
    chart = atlas.basins(atlas.family("henon"), view, size=(40, 40), set=at)
    assert (chart.fate == ESCAPES).all()
    assert chart.sizes["number"] == 0


@pytest.mark.parametrize("rate", ["2.8", "3.2", "3.5", "3.83", "3.9"])
def test_without_contraction_it_is_the_logistic_map(rate: str) -> None:
    """hen.orient: a = r**2 / 4 - r / 2; exact algebra."""
    assert "a = r^2/4 - r/2" in published("hen.orient").quantity
    r = Fraction(rate)
    found = pixel("henon", {"a": r * r / 4 - r / 2, "b": 0}, LAYERS, steps=100_000, starts=[{"y": 0}])
    twin = atlas.lyapunov_spectrum(atlas.family("logistic"), {"r": r})
    assert found["fate"] == twin.fate[0]
    assert found["period"] == twin.period[0]
    error = 3 * (found["lyapunov_error"] + float(twin.error[0, 0])) if twin.error[0, 0] else 1e-6
    assert found["lyapunov"] == pytest.approx(float(twin.lyapunov[0, 0]), abs=error)
    assert found["lyapunov_2"] == -math.inf or math.isnan(found["lyapunov_2"])
