"""Maps of one fold or border, whose regions exact formulas give: skew tent, Lozi, cubic cusp."""

from __future__ import annotations

import math
from fractions import Fraction
from typing import Any

import numpy as np
import pytest

from atlas.families.reader import family_from_config
from atlas.planes.fates import CHAOTIC, ESCAPES, FIXED_POINT
from tests.reference.published import ids, published
from tests.world.planes import agreed, centred, classes, corners, pixel, plane, shares, wrong

SKEW = ("fate", "period", "lyapunov")
LOZI = ("fate", "period", "lyapunov", "lyapunov_2")
CUSP = family_from_config(
    "cusp",
    {
        "state": {"x": {"start": "0"}},
        "parameters": {"a": {"default": "0"}, "b": {"default": "1"}},
        "step": {"x": "a + b*x - x**3"},
    },
)


@pytest.fixture(scope="module")
def skew() -> Any:
    """Return a plane of the slopes; near border collisions chaos lasts long before it settles."""
    return plane("skew_tent", ("a", "0.05", "0.95"), ("b", "-9", "0.9"), (90, 99), SKEW, transient=50_000)


@pytest.fixture(scope="module")
def lozi() -> Any:
    return plane("lozi", ("a", "0.1", "1.9"), ("b", "0.05", "0.85"), (90, 40), LOZI)


@pytest.fixture(scope="module")
def cusp() -> Any:
    grid = {"grid": [16], "box": {"x": ["-0.9", "0.9"]}}
    layers = ("fate", "period", "lyapunov", "attractors")
    return plane(CUSP, ("a", "-0.5", "0.5"), ("b", "0.1", "1.9"), (50, 90), layers, starts=grid)


class TestSkewTent:
    """Regions of record bc.period_n: H. E. Nusse and J. A. Yorke 1992 and others (citations from memory)."""

    @staticmethod
    def said(a: np.ndarray, b: np.ndarray) -> np.ndarray:
        regions = [abs(b) < 1]
        for n in range(2, 5):
            low, high = -(a ** -(n - 1.0)), -(1 - a ** (n - 1)) / ((1 - a) * a ** (n - 2.0))
            regions.append((low < b) & (b < high))
        return np.select(regions, list(range(1, 5)), 0)

    def test_the_regions_of_the_periods_to_a_pixel(self, skew: Any) -> None:
        assert published("bc.period_n").value.startswith("-a^{-(n-1)} < b")
        assert wrong(skew, self.said) == []
        spoken = shares(skew, self.said)
        assert set(spoken) == set(range(1, 5))
        assert min(spoken.values()) > 20

    def test_the_exponent_of_a_cycle_is_that_of_its_slopes(self, skew: Any) -> None:
        """(1/n) ln|a**(n-1) b|; bc.lyap at a = 1/2, b = -7/2."""
        n = agreed(skew, self.said).astype(float)
        a, b = np.meshgrid(skew.a.values, skew.b.values)
        told = n > 0
        exact = np.log(abs(a ** (n - 1) * b))[told] / n[told]
        np.testing.assert_allclose(skew.lyapunov.values[told], exact, rtol=0, atol=1e-12)
        found = pixel("skew_tent", {"a": "0.5", "b": "-3.5"}, SKEW, transient=5000)
        assert found["period"] == 3
        assert found["lyapunov"] == pytest.approx(float(published("bc.lyap").number()), abs=1e-9)

    def test_outside_the_regions_is_chaos_without_windows(self, skew: Any) -> None:
        """Robust chaos: where no cycle of one point above the border is stable, none is (from memory)."""
        x, y = corners(skew)
        none = np.ones(x.shape, bool)
        for n in range(2, 12):
            low, high = -(x ** -(n - 1.0)), -(1 - x ** (n - 1)) / ((1 - x) * x ** (n - 2.0))
            none &= ~((low - 0.05 < y) & (y < high + 0.05))
        chaos = (none & (y < -1.05)).all(axis=0)
        assert chaos.sum() > 1000
        assert (skew.fate.values[chaos] == CHAOTIC).all()
        assert (skew.lyapunov.values[chaos] > 0).all()

    @pytest.mark.parametrize("name", [name for name in ids("bc.a0") if "n2" not in name])
    def test_published_intervals(self, name: str) -> None:
        """Exact algebra; at the lower end the multiplier is -1 or 1, at the upper the border is met."""
        record, cell = published(name), Fraction(1, 200)
        at = centred("a", str(record.parameters["a"]))
        for edge, order in ((record.number(0), 1), (record.number(1), -1)):
            up = ("b", edge - Fraction(9, 2) * cell, edge + Fraction(9, 2) * cell)
            made = plane("skew_tent", at, up, (1, 9), SKEW, transient=200_000)
            found = made.period.values[::order, 0]
            assert found[5:].tolist() == [record.parameters["n"]] * 4
            assert (found[:4] != record.parameters["n"]).all()

    def test_chaos_between_periods_2_and_3(self) -> None:
        """bc.chaos.a: common practice, no source."""
        record = published("bc.chaos.a")
        at = {key: str(record.parameters[key]) for key in "ab"}
        layers = (*SKEW, "lyapunov_error")
        found = pixel("skew_tent", at, layers, steps=400_000)
        assert found["fate"] == CHAOTIC
        assert abs(found["lyapunov"] - float(record.number())) < 4 * found["lyapunov_error"] + 1e-4


class TestLozi:
    """Regions of loz.fixed and loz.2cycle: R. Lozi 1978 (citation from memory); exact algebra."""

    @staticmethod
    def said(a: np.ndarray, b: np.ndarray) -> np.ndarray:
        return np.select([a < 1 - b, a < 1 + b], [1, 2], 0)

    def test_fixed_point_and_cycle_of_2_to_a_pixel(self, lozi: Any) -> None:
        assert published("loz.2cycle").value == "1-b<a<1+b"
        assert wrong(lozi, self.said) == []
        assert min(shares(lozi, self.said)[n] for n in (1, 2)) > 800

    def test_beyond_there_is_neither(self, lozi: Any) -> None:
        beyond = (corners(lozi)[0] > 1 + corners(lozi)[1]).all(axis=0)
        assert beyond.sum() > 400
        assert not np.isin(classes(lozi)[beyond], (1, 2)).any()

    def test_exponents_of_the_cycle(self, lozi: Any) -> None:
        """Its two steps have the trace 2 b - a**2 and the determinant b**2."""
        two = agreed(lozi, self.said) == 2
        a, b = (values[two] for values in np.meshgrid(lozi.a.values, lozi.b.values))
        trace, det = 2 * b - a**2, b**2
        root = np.sqrt((trace**2 - 4 * det).astype(complex))
        sizes = np.sort(abs(np.stack([trace + root, trace - root]) / 2), axis=0)
        np.testing.assert_allclose(lozi.lyapunov.values[two], np.log(sizes[1]) / 2, atol=1e-9)
        np.testing.assert_allclose(lozi.lyapunov_2.values[two], np.log(sizes[0]) / 2, atol=1e-9)

    def test_exponents_add_up_to_the_logarithm_of_the_area(self, lozi: Any) -> None:
        stays = lozi.fate.values != ESCAPES
        total = (lozi.lyapunov + lozi.lyapunov_2 - np.log(lozi.b)).values
        assert abs(total[stays & ~np.isnan(total)]).max() < 1e-12


class TestCusp:
    """x -> a + b x - x**3: fold, flip and superstable curves (cus.fold, cus.flip, cus.super; exact algebra).

    A start for each critical point finds every attractor, because the Schwarzian derivative is negative
    (D. Singer 1978, SIAM J. Appl. Math. 35, 260; from memory); the grid of starts is denser than needed and
    in the basin, which ends about |x| = (1 + b)**0.5.
    """

    @staticmethod
    def stable(a: np.ndarray, b: np.ndarray) -> np.ndarray:
        """Return how many fixed points are stable: roots of x**3 + (1 - b) x - a with slopes within 1."""
        found = np.zeros(a.shape, int)
        for place in np.ndindex(a.shape):
            roots = np.roots([1, 0, 1 - b[place], -a[place]])
            real = roots[abs(roots.imag) < 1e-9].real
            found[place] = (abs(b[place] - 3 * real**2) < 1).sum()
        return found

    def test_the_fixed_points_lose_stability_on_the_published_curves(self) -> None:
        """Where the formula of a curve holds, a fixed point has the multiplier 1, -1 or 0."""
        for b in (1.2, 1.5, 1.9):
            for text, squared, slope in (
                ("27 a^2 = 4 (b-1)^3", 4 * (b - 1) ** 3 / 27, 1),
                ("27 a^2 = 4 (b+1) (b-2)^2", 4 * (b + 1) * (b - 2) ** 2 / 27, -1),
                ("27 a^2 = b (3-2b)^2", b * (3 - 2 * b) ** 2 / 27, 0),
            ):
                assert text in {published(f"cus.{name}").value for name in ("fold", "flip", "super")}
                roots = np.roots([1, 0, 1 - b, -math.sqrt(squared)])
                assert min(abs(b - 3 * roots**2 - slope)) < 1e-6

    def test_one_or_two_attracting_fixed_points_to_a_pixel(self, cusp: Any) -> None:
        """Up to b = 1.6 no other cycle is stable beside them."""
        a, b = corners(cusp)
        told = self.stable(a, b)
        same = ((told == told[0]) & (b < 1.6)).all(axis=0)
        for number in (1, 2):
            there = same & (told[0] == number)
            assert there.sum() > 150
            assert (cusp.attractors.values[there] == number).all()
            assert (cusp.fate.values[there] == FIXED_POINT).all()

    def test_inside_the_cusp_alone_there_are_two(self, cusp: Any) -> None:
        a, b = corners(cusp)
        outside = ((27 * a**2 > 4 * np.maximum(b - 1, 0) ** 3) & (b < 1.75)).all(axis=0)
        inside = (27 * a**2 < 4 * np.maximum(b - 1, 0) ** 3).all(axis=0)
        assert (cusp.attractors.values[outside] == 1).all()
        assert (cusp.attractors.values[inside] == 2).all()
