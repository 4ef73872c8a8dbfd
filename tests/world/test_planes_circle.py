"""The sine circle map: tongues, rotation numbers, the staircase.

Tongues: V. I. Arnold 1965 (citation from memory), edges computed anew in the records; rotation numbers:
common practice, no source, weighted means of long runs.
"""

from __future__ import annotations

import math
from fractions import Fraction
from typing import Any

import numpy as np
import pytest

from atlas.planes.fates import CLASS_QUASI_PERIODIC, CLASS_UNSETTLED, FIXED_POINT, QUASI_PERIODIC
from tests.reference.published import ids, published
from tests.world.planes import agreed, centred, classes, pixel, plane

LAYERS = ("fate", "period", "lyapunov", "rotation")


@pytest.fixture(scope="module")
def about_0() -> Any:
    return plane("circle", ("Omega", "-0.25", "0.25"), ("K", "0", "1.2"), (100, 60), LAYERS)


@pytest.fixture(scope="module")
def staircase() -> Any:
    whole = {"steps": 4000, "longest_period": 256}
    return plane("circle", ("Omega", 0, 1), centred("K", 1), (4000, 1), LAYERS, **whole)


def inside(omega: np.ndarray, k: np.ndarray) -> np.ndarray:
    return np.where(abs(omega) < k / (2 * math.pi), 1, 2)


def test_the_edge_of_the_tongue_of_rotation_0_to_a_pixel(about_0: Any) -> None:
    """cir.01: |Omega| = K / 2 pi; exact algebra."""
    assert published("cir.01").value == "|Omega| <= K/(2 pi)"
    told = agreed(about_0, inside)
    assert (told == 1).sum() > 2000
    assert (about_0.fate.values[told == 1] == FIXED_POINT).all()
    assert (about_0.rotation.values[told == 1] == 0).all()
    assert (about_0.fate.values[told == 2] != FIXED_POINT).all()
    turns = about_0.rotation.values[told == 2]
    assert np.nanmin(abs(turns)) > 1e-3
    assert np.isnan(turns).sum() < 10


def test_turning_backwards_is_the_mirror_image(about_0: Any) -> None:
    """Up to K = 1 no start matters, and Omega -> -Omega turns the rotation number round."""
    below = about_0.rotation.sel(K=slice(0, 1)).values
    np.testing.assert_allclose(below, -below[:, ::-1], atol=2e-5)


def test_the_exponent_of_the_fixed_point(about_0: Any) -> None:
    """ln(1 - K cos 2 pi theta) with sin 2 pi theta = 2 pi Omega / K; exact algebra (cir.lyap at 0)."""
    told = agreed(about_0, inside)
    omega, k = np.meshgrid(about_0.Omega.values, about_0.K.values)
    with np.errstate(invalid="ignore", divide="ignore"):
        exact = np.log(abs(1 - np.sqrt(k**2 - (2 * math.pi * omega) ** 2)))
    np.testing.assert_allclose(about_0.lyapunov.values[told == 1], exact[told == 1], rtol=1e-4, atol=1e-6)
    record = published("cir.lyap")
    found = pixel("circle", {"Omega": 0, "K": "0.5"}, LAYERS)
    assert found["lyapunov"] == pytest.approx(float(record.number()), abs=1e-9)


@pytest.mark.parametrize("name", ids("cir.tongue."))
def test_tongues_begin_and_end_in_the_right_pixel(name: str) -> None:
    record = published(name)
    turns = Fraction(record.parameters["rotation"])
    edges = [record.number(k) for k in (0, 1)]
    cell = (edges[1] - edges[0]) / 100
    for edge, order in zip(edges, (1, -1), strict=True):
        across = ("Omega", edge - Fraction(9, 2) * cell, edge + Fraction(9, 2) * cell)
        strength = centred("K", Fraction(str(record.parameters["K"])))
        made = plane("circle", across, strength, (9, 1), LAYERS)
        period, rotation = made.period.values[0, ::order], made.rotation.values[0, ::order]
        assert period[5:].tolist() == [turns.denominator] * 4
        assert rotation[5:].tolist() == [float(turns)] * 4
        assert (period[:4] != turns.denominator).all()
        known = rotation[:4][~np.isnan(rotation[:4])]
        assert known.size >= 2
        assert (order * (known - float(turns)) < -1e-6).all()


def test_the_tongue_of_a_half_while_weak() -> None:
    """cir.12series: 1/2 -+ K**2 / 8 pi + O(K**4); exact algebra. Seen where K is 0.1."""
    assert "K^2/(8 pi)" in published("cir.12series").value
    half = 0.1**2 / (8 * math.pi)
    across = ("Omega", "0.4994", "0.5006")
    made = plane("circle", across, centred("K", "0.1"), (60, 1), LAYERS, transient=20_000)
    locked = made.period.values[0] == 2
    cell = 1.2e-3 / 60
    assert locked.sum() * cell == pytest.approx(2 * half, abs=2 * cell)
    assert abs(made.Omega.values[locked] - 0.5).max() < half + cell


@pytest.mark.parametrize("name", ["cir.rot.a", "cir.rot.b"])
@pytest.mark.parametrize(("steps", "digits"), [(2000, 1e-9), (20_000, 1e-13)])
def test_rotation_numbers_between_tongues(name: str, steps: int, digits: float) -> None:
    record = published(name)
    at = {key: str(value) for key, value in record.parameters.items()}
    found = pixel("circle", at, LAYERS, steps=steps)
    assert found["fate"] == QUASI_PERIODIC
    assert found["rotation"] == pytest.approx(float(record.number()), abs=digits)


def test_inside_a_tongue_nothing_turns() -> None:
    record = published("cir.rot.lock")
    found = pixel("circle", {key: str(value) for key, value in record.parameters.items()}, LAYERS)
    assert found["rotation"] == float(record.number()) == 0


def test_without_coupling_it_turns_by_the_bare_rotation() -> None:
    """K = 0: exact algebra; 1/2 is a neutral cycle, and 97 is too long for one."""
    made = plane("circle", ("Omega", 0, 1), ("K", -1, 1), (97, 3), LAYERS)
    assert made.K[1] == 0
    np.testing.assert_allclose(made.rotation[1], made.Omega, atol=1e-13)
    expected = np.full(97, CLASS_QUASI_PERIODIC)
    expected[48] = 2
    np.testing.assert_array_equal(classes(made)[1], expected)


def test_the_staircase_never_goes_down(staircase: Any) -> None:
    """K = 1: the rotation number grows with Omega (M. H. Jensen, P. Bak and T. Bohr 1984)."""
    turns = staircase.rotation.values[0]
    known = turns[~np.isnan(turns)]
    assert known.size > 0.98 * turns.size
    assert (np.diff(known) > -1e-12).all()
    assert known[0] == 0
    assert known[-1] == 1
    assert (classes(staircase)[0][np.isnan(turns)] == CLASS_UNSETTLED).all()


def test_the_staircase_is_its_own_mirror_image(staircase: Any) -> None:
    """rotation(1 - Omega) = 1 - rotation(Omega), on steps to the last bit."""
    turns, period = staircase.rotation.values[0], staircase.period.values[0]
    steps = (period > 0) & (period[::-1] > 0)
    assert steps.sum() > 3000
    np.testing.assert_allclose(turns[steps], 1 - turns[::-1][steps], atol=1e-15)
    known = ~np.isnan(turns + turns[::-1])
    assert known.sum() > 3900
    np.testing.assert_allclose(turns[known], 1 - turns[::-1][known], atol=1e-5)


def test_the_steps_are_as_wide_as_published(staircase: Any) -> None:
    period, rotation = staircase.period.values[0], staircase.rotation.values[0]
    for name in ids("cir.tongue."):
        record = published(name)
        if record.parameters["K"] == 1.0:
            turns = Fraction(record.parameters["rotation"])
            on = (period == turns.denominator) & (rotation == float(turns))
            width = float(record.number(1) - record.number(0))
            assert on.sum() / 4000 == pytest.approx(width, abs=1.5 / 4000)


def test_what_lies_between_the_steps_has_the_published_dimension(staircase: Any) -> None:
    """cir.staircase: 0.870 (M. H. Jensen, P. Bak and T. Bohr 1984; leading digits from memory).

    Counted are intervals of a width over which the rotation number changes: their number grows like the
    width to minus the dimension. Between the widths 1/500 and 1/4000 that is known to 0.03.
    """
    turns = staircase.rotation.values[0]
    edges = [turns[::8][np.newaxis], turns[np.newaxis]]
    fine, coarse = (np.count_nonzero(abs(np.diff(values)) > 1e-9) for values in (edges[1], edges[0]))
    assert math.log(fine / coarse) / math.log(8) == pytest.approx(
        float(published("cir.staircase").number()), abs=0.03
    )
