"""Where orbits begin to turn: Neimark-Sacker curves in planes, and rotation numbers beyond them."""

from __future__ import annotations

import math
from fractions import Fraction
from typing import Any

import numpy as np
import pytest

from atlas.families.catalogue import family
from atlas.families.reader import family_from_config
from atlas.planes.fates import CLASS_QUASI_PERIODIC, ESCAPES, FIXED_POINT, QUASI_PERIODIC
from tests.reference.multipliers import matrix, multipliers
from tests.reference.published import ids, published
from tests.world.planes import agreed, centred, classes, pixel, plane

LAYERS = ("fate", "period", "lyapunov", "lyapunov_2", "rotation")
DELAYED = family_from_config(
    "delayed_logistic_of_a_size",
    {
        "state": {"x": {"start": "0.5"}, "y": {"start": "0.4"}},
        "parameters": {"r": {"default": "2.1"}, "size": {"default": "1"}},
        "step": {"x": "r * x * (1 - y/size)", "y": "x"},
    },
)
BOGDANOV = family_from_config(
    "bogdanov",
    {
        "state": {"x": {"start": "0.01"}, "y": {"start": "0.01"}},
        "parameters": {"eps": {"default": "0"}, "k": {"default": "1.2"}, "mu": {"default": "-0.1"}},
        "helpers": {"moved": "y + eps*y + k*x*(x - 1) + mu*x*y"},
        "step": {"x": "x + moved", "y": "moved"},
    },
)


@pytest.fixture(scope="module")
def delayed() -> Any:
    """Return a plane of the growth rate and a size that changes nothing but the scale."""
    return plane(DELAYED, ("r", "1.05", "2.15"), ("size", "0.95", "1.05"), (55, 5), LAYERS)


@pytest.fixture(scope="module")
def hunted() -> Any:
    """Return a plane of predators and prey."""
    return plane("predator_prey", ("d", "1.2", "3.6"), ("a", "1.2", "4"), (96, 56), LAYERS)


class TestDelayedLogistic:
    """dl.*: J. Maynard Smith 1968; D. G. Aronson et al. 1982 (citations from memory).

    Rotation numbers: common practice, no source, weighted means of long runs.
    """

    def test_orbits_begin_to_turn_at_2_to_a_pixel(self, delayed: Any) -> None:
        for row in classes(delayed):
            np.testing.assert_array_equal(row[:47], 1)
            assert (row[48:] == CLASS_QUASI_PERIODIC).all()

    def test_both_exponents_before(self, delayed: Any) -> None:
        """dl.lyap.below: ln(r - 1) / 2 where the multipliers are complex, r > 5/4; exact algebra."""
        r = delayed.r.values
        before = (r > 1.26) & (r < 1.99)
        for layer in (delayed.lyapunov, delayed.lyapunov_2):
            told = np.broadcast_to(np.log(r[before] - 1) / 2, (5, before.sum()))
            np.testing.assert_allclose(layer.values[:, before], told, atol=1e-6)
        record = published("dl.lyap.below")
        found = pixel(DELAYED, {"r": str(record.parameters["r"]), "size": 1}, LAYERS)
        assert found["lyapunov"] == pytest.approx(float(record.number()), abs=1e-6)

    def test_its_size_changes_nothing(self, delayed: Any) -> None:
        assert (delayed.fate == delayed.fate[2]).all()
        np.testing.assert_allclose(delayed.lyapunov.values, delayed.lyapunov.values[[2] * 5], atol=3e-3)
        turns = delayed.rotation.values[:, -5:]
        np.testing.assert_allclose(turns, turns[[2] * 5], atol=1e-7)

    @pytest.mark.parametrize("name", ids("dl.rot."))
    def test_published_rotation_numbers(self, name: str) -> None:
        record = published(name)
        at = {"r": str(record.parameters["r"]), "size": 1}
        found = pixel(DELAYED, at, LAYERS, transient=5000, steps=20_000)
        assert found["fate"] == QUASI_PERIODIC
        assert found["rotation"] == pytest.approx(float(record.number()), abs=1e-12)
        assert abs(found["lyapunov"]) < 1e-3
        assert found["lyapunov_2"] < -5e-3

    def test_a_sixth_of_a_turn_at_the_onset(self) -> None:
        """dl.ns: the rotation number tends to 1/6 in proportion to r - 2."""
        assert published("dl.ns").value.endswith("rotation number 1/6")
        off = [
            1 / 6 - pixel(DELAYED, {"r": r, "size": 1}, LAYERS, transient=50_000)["rotation"]
            for r in ("2.002", "2.004")
        ]
        assert off[0] < 3e-4
        assert off[1] / off[0] == pytest.approx(2, rel=0.02)


class TestPredatorPrey:
    """pp.*: exact algebra; rotation numbers: common practice, no source."""

    @staticmethod
    def said(d: np.ndarray, a: np.ndarray) -> np.ndarray:
        """Return 1 where predators die out beside steady prey, 2 where both are steady, 3 where they turn.

        The doubling is subcritical in places, so that beside it a cycle may attract too.
        """
        entry, turning, doubling = a / (a - 1), 2 * a / (a - 1), 3 * a / (a + 3)
        alone, both = (a < 3) & (d < entry), (d > np.maximum(entry, doubling + 0.05)) & (d < turning)
        return np.select([alone, both, (d > turning) & (d < turning + 0.1)], [1, 2, 3], 0)

    def test_the_fixed_point_ends_on_the_published_curve_to_a_pixel(self, hunted: Any) -> None:
        assert "Neimark-Sacker a = d/(d-2) (d = 2a/(a-1))" in published("pp.curves").quantity
        told = agreed(hunted, self.said)
        assert [np.count_nonzero(told == k) > least for k, least in ((1, 1000), (2, 1500), (3, 50))] == [
            True
        ] * 3
        assert (hunted.fate.values[np.isin(told, (1, 2))] == FIXED_POINT).all()
        assert not np.isin(hunted.fate.values[told == 3], (FIXED_POINT, ESCAPES)).any()

    def test_which_fixed_point_it_is_shows_in_the_exponents(self, hunted: Any) -> None:
        """The multipliers are 2 - a and d (1 - 1/a) without predators, those of the Jacobian with them."""
        told = agreed(hunted, self.said)
        own, checked = family("predator_prey"), 0
        for row, column in np.argwhere(np.isin(told, (1, 2)))[::17]:
            a, d = float(hunted.a[row]), float(hunted.d[column])
            if told[row, column] == 1:
                sizes = sorted((abs(2 - a), d * (1 - 1 / a)), reverse=True)
            else:
                state = {"x": 1 / d, "y": a * (1 - 1 / d) - 1}
                sizes = abs(multipliers(matrix(own, {"a": a, "d": d, **state}))).tolist()
            for layer, size in zip(("lyapunov", "lyapunov_2"), sizes, strict=True):
                if size > 0.01:
                    found = float(hunted[layer][row, column])
                    assert found == pytest.approx(math.log(size), abs=1e-4), (a, d, layer)
                    checked += 1
        assert checked > 200

    @pytest.mark.parametrize("name", ids("pp.rot."))
    def test_published_rotation_numbers(self, name: str) -> None:
        record = published(name)
        at = {key: str(record.parameters[key]) for key in ("d", "a")}
        found = pixel("predator_prey", at, LAYERS, transient=5000, steps=20_000)
        assert found["fate"] == QUASI_PERIODIC
        assert found["rotation"] == pytest.approx(float(record.number()), abs=1e-12)

    @pytest.mark.parametrize("name", ["1:5", "1:6", "1:7", "1:8"])
    def test_resonances_on_the_curve(self, name: str) -> None:
        """pp.res: just beyond these points orbits turn by 1/5 to 1/8."""
        d, a = (published("pp.res").number(name, k) for k in (0, 1))
        at = {"d": d + Fraction(1, 500), "a": a}
        found = pixel("predator_prey", at, LAYERS, transient=20_000, steps=20_000)
        assert found["rotation"] == pytest.approx(1 / int(name[-1]), abs=2e-4)


class TestBogdanov:
    """bog: D. K. Arrowsmith, J. H. E. Cartwright and others 1993 (citation from memory); exact algebra."""

    def test_the_origin_attracts_below_0_and_with_its_exact_exponents(self) -> None:
        """The determinant is 1 + eps; the trace 2 - k + eps makes a complex pair.

        A slow spiral may not be seen to near the origin; it must not pass for another cycle.
        """
        made = plane(BOGDANOV, ("eps", "-0.1", "0.1"), ("k", "0.2", "2.6"), (20, 12), LAYERS)
        assert (made.fate.values[:, 10:] != FIXED_POINT).all()
        met = made.fate.values[:, :10] == FIXED_POINT
        assert met.sum() >= 119
        assert (made.period.values[:, :10][~met] == 0).all()
        told = np.broadcast_to(np.log(1 + made.eps.values[:10]) / 2, (12, 10))
        np.testing.assert_allclose(made.lyapunov.values[:, :10][met], told[met], atol=1e-6)
        np.testing.assert_allclose(made.lyapunov_2.values[:, :10][met], told[met], atol=1e-6)

    def test_its_rotation_at_the_onset(self) -> None:
        told = published("bog").value.rpartition(" ")[2]
        assert math.cos(2 * math.pi * float(told)) == pytest.approx(1 - 1.2 / 2, abs=1e-10)
        at = {"eps": "0.0001", "k": "1.2"}
        found = pixel(BOGDANOV, at, LAYERS, set={"mu": "-1"}, transient=200_000)
        assert found["fate"] == QUASI_PERIODIC
        assert found["rotation"] == pytest.approx(float(told), abs=2e-4)


class TestBeddington:
    """bed.ns: J. R. Beddington, C. A. Free and J. H. Lawton 1975 (from memory), values computed anew."""

    @pytest.mark.parametrize("name", ids("bed.ns."))
    def test_hosts_and_parasitoids_turn_beyond_the_published_points(self, name: str) -> None:
        """Along r at the K of that point; the equilibrium attracts above it, slowly in the nearest pixel."""
        record = published(name)
        q, onset = float(record.parameters["q"]), record.number(0)
        attack = float(onset) * (1 - q)
        capacity = Fraction(attack / (1 - math.exp(-attack)) / q)
        cell = onset / 20
        across = ("r", onset - Fraction(9, 2) * cell, onset + Fraction(9, 2) * cell)
        start = [{"N": Fraction(str(round(attack / (1 - math.exp(-attack)), 2))), "P": str(round(attack, 2))}]
        made = plane(
            "beddington", across, centred("K", capacity), (9, 1), LAYERS, starts=start, transient=200_000
        )
        steady = made.fate.values[0] == FIXED_POINT
        assert not steady[:4].any()
        assert steady[6:].all()
        assert (made.period.values[0, 5:] <= 1).all()
        assert (made.lyapunov.values[0, 5:] < 1e-3).all()
        turning = made.rotation.values[0, 3]
        assert turning == pytest.approx(float(record.number(1)), abs=0.01)
