"""Fixed points of the populations in the catalogue, their multipliers, and where they lose their stability.

Values with an id are published records; ``exact algebra`` where no source is named. Citations are from memory
where the record says so.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest

from atlas.families.catalogue import family
from tests.reference.multipliers import cycle_matrix, is_stable, jury, matrix, multipliers, root, stepped
from tests.reference.published import ids, published


def near(value: Any, size: float = 1e-10) -> Any:
    return pytest.approx(value, rel=size, abs=size)


def angle(product: np.ndarray) -> float:
    """Return the rotation number of a pair of multipliers, from 0 to 1/2."""
    return float(abs(np.angle(multipliers(product)[0]))) / (2 * math.pi)


class TestDelayedLogistic:
    own = family("delayed_logistic")

    def fixed(self, r: float) -> np.ndarray:
        return cycle_matrix(self.own, {"r": r, "x": 1 - 1 / r, "y": 1 - 1 / r}, 1)

    def test_neimark_sacker_at_2_with_a_sixth_of_a_turn(self) -> None:
        """dl.ns: D. G. Aronson et al. 1982, Commun. Math. Phys. 83, 303 (citation from memory)."""
        assert published("dl.ns").value == "r=2; multipliers exp(+-i pi/3); rotation number 1/6"
        assert [is_stable(self.fixed(r)) for r in (1.2, 1.99, 2.01, 2.2)] == [True, True, False, False]
        assert root(lambda r: jury(self.fixed(r))[2], 1.5, 2.4) == near(2)
        assert abs(multipliers(self.fixed(2.0))).tolist() == [near(1), near(1)]
        assert angle(self.fixed(2.0)) == near(1 / 6)

    def test_both_exponents_below_it(self) -> None:
        """dl.lyap.below: ln(r - 1) / 2."""
        record = published("dl.lyap.below")
        found = np.log(abs(multipliers(self.fixed(float(record.parameters["r"])))))
        assert found.tolist() == [near(float(record.number()))] * 2


class TestBurgers:
    own = family("burgers")

    def fixed(self, a: float, b: float, side: float = 1) -> np.ndarray:
        y = side * math.sqrt((1 - a) * (b - 1))
        return cycle_matrix(self.own, {"a": a, "b": b, "x": 1 - b, "y": y}, 1)

    @pytest.mark.parametrize("a", [0.2, 0.75, 0.95])
    def test_pitchfork_at_1_and_neimark_sacker_at_three_halves(self, a: float) -> None:
        """bur.ns: exact algebra; trace 1 + a, determinant a + 2 (1 - a)(b - 1)."""
        origin = multipliers(matrix(self.own, {"a": a, "b": 1.0, "x": 0.0, "y": 0.0}))
        assert sorted(origin.real) == [near(a), near(1)]
        for side in (1, -1):
            assert is_stable(self.fixed(a, 1.49, side))
            assert not is_stable(self.fixed(a, 1.51, side))
        assert root(lambda b: jury(self.fixed(a, b))[2], 1.1, 1.9) == near(1.5)
        assert math.cos(2 * math.pi * angle(self.fixed(a, 1.5))) == near((1 + a) / 2)

    def test_rotation_at_the_onset(self) -> None:
        told = published("bur.ns").value.rpartition(" ")[2]
        assert angle(self.fixed(0.75, 1.5)) == near(float(told))


class TestPredatorPrey:
    own = family("predator_prey")

    def fixed(self, a: float, d: float) -> np.ndarray:
        return cycle_matrix(self.own, {"a": a, "d": d, "x": 1 / d, "y": a * (1 - 1 / d) - 1}, 1)

    def test_boundaries_of_coexistence(self) -> None:
        """pp.curves: exact algebra."""
        text = published("pp.curves").quantity
        assert all(part in text for part in ("a > d/(d-1)", "d = 2a/(a-1)", "d = 3a/(a+3)"))
        for a in (2.0, 3.0, 3.6, 5.0):
            assert root(lambda d, a=a: jury(self.fixed(a, d))[0], 1.01, 2 * a / (a - 1)) == near(a / (a - 1))
            assert root(lambda d, a=a: jury(self.fixed(a, d))[2], 1.01, 12) == near(2 * a / (a - 1))
        for a in (5.5, 7.0):
            assert root(lambda d, a=a: jury(self.fixed(a, d))[1], 1.3, 4) == near(3 * a / (a + 3))

    @pytest.mark.parametrize("name", ["1:5", "1:6", "1:7", "1:8"])
    def test_resonances_on_the_neimark_sacker_curve(self, name: str) -> None:
        """pp.res: exact algebra."""
        d, a = (float(published("pp.res").number(name, k)) for k in (0, 1))
        assert a == near(d / (d - 2))
        assert abs(multipliers(self.fixed(a, d))[0]) == near(1)
        assert angle(self.fixed(a, d)) == near(1 / int(name[-1]))

    def test_the_predators_die_out_where_they_cannot_enter(self) -> None:
        for a, d in ((2.0, 1.9), (2.8, 1.5)):
            prey_alone = matrix(self.own, {"a": a, "d": d, "x": 1 - 1 / a, "y": 0.0})
            assert is_stable(prey_alone) == (d < a / (a - 1))


class TestCoupledLogistic:
    own = family("coupled_logistic")

    @pytest.mark.parametrize("x", [0.1, 0.3, 0.62, 0.9])
    def test_the_transverse_multiplier_of_synchronised_states(self, x: float) -> None:
        """cl.formula: along x = y the slope of one map, across it that times 1 - 2 eps."""
        assert "lambda+ln|1-2eps|" in published("cl.formula").quantity
        for r, eps in ((3.8, 0.05), (4.0, 0.3), (2.9, 0.6)):
            found = matrix(self.own, {"r": r, "eps": eps, "x": x, "y": x})
            slope = r * (1 - 2 * x)
            assert found @ [1, 1] == near([slope, slope])
            assert found @ [1, -1] == near([slope * (1 - 2 * eps), -slope * (1 - 2 * eps)])

    def test_synchronised_chaos_at_full_height_attracts_between_a_quarter_and_three_quarters(self) -> None:
        """cl.thr4: H. Fujisaka and T. Yamada 1983, Prog. Theor. Phys. 69, 32 (citation from memory).

        The exponent of the logistic map at r = 4 is ln 2.
        """
        assert published("cl.thr4").value == "1/4 < eps < 3/4"
        for eps, attracts in ((0.24, False), (0.26, True), (0.74, True), (0.76, False)):
            found = matrix(self.own, {"r": 4.0, "eps": eps, "x": 0.3, "y": 0.3})
            across = (found @ [1, -1])[0] / (found @ [1, 1])[0]
            assert (math.log(2) + math.log(abs(across)) < 0) == attracts

    @pytest.mark.parametrize("eps", [0.02, 0.05, 0.1, 0.2])
    def test_antiphase_doubling_of_the_fixed_point(self, eps: float) -> None:
        """cl.anti: r = 2 + 1 / (1 - 2 eps)."""
        assert published("cl.anti").value == "r = 2 + 1/(1-2 eps)"
        r = 2 + 1 / (1 - 2 * eps)
        found = multipliers(cycle_matrix(self.own, {"r": r, "eps": eps, "x": 1 - 1 / r, "y": 1 - 1 / r}, 1))
        assert min(abs(found + 1)) < 1e-10
        assert min(abs(found - (2 - r))) < 1e-10

    def test_synchronised_states_stay_so_to_the_last_bit(self) -> None:
        now = {"r": 3.8, "eps": 0.05, "x": 0.3, "y": 0.3}
        for _ in range(200):
            now |= stepped(self.own, now)
            assert now["x"] == now["y"]


class TestHostsAndParasitoids:
    def test_the_nicholson_bailey_equilibrium(self) -> None:
        """nb.R2: A. J. Nicholson and V. A. Bailey 1935 (citation from memory); exact algebra."""
        record = published("nb.R2")
        at = {"R": 2.0, "N": float(record.number("N")), "P": float(record.number("P"))}
        found = cycle_matrix(family("nicholson_bailey"), at, 1)
        assert np.linalg.det(found) == near(float(record.number("det")))
        assert np.trace(found) == near(float(record.number("trace")))

    @pytest.mark.parametrize("growth", [1.01, 1.5, 4.0, 20.0])
    def test_that_equilibrium_is_never_stable(self, growth: float) -> None:
        log = math.log(growth)
        at = {"R": growth, "N": growth * log / (growth - 1), "P": log}
        found = cycle_matrix(family("nicholson_bailey"), at, 1)
        assert np.linalg.det(found) == near(growth * log / (growth - 1))
        assert not is_stable(found)

    def beddington(self, q: float, r: float) -> np.ndarray:
        """Return the Jacobian at the equilibrium with q = N / K."""
        attack = r * (1 - q)
        hosts = attack / (1 - math.exp(-attack))
        return cycle_matrix(family("beddington"), {"r": r, "K": hosts / q, "N": hosts, "P": attack}, 1)

    @pytest.mark.parametrize("q", [0.2, 0.35, 0.5, 0.8])
    def test_trace_and_determinant_of_beddington(self, q: float) -> None:
        """bed.det: J. R. Beddington et al. 1975, Nature 255, 58 (citation from memory); exact algebra."""
        assert "trace = 1-rq+g; det = (1-rq) g + A" in published("bed.det").value
        for r in (0.3, 1.0, 2.5):
            attack = r * (1 - q)
            g = attack * math.exp(-attack) / (1 - math.exp(-attack))
            found = self.beddington(q, r)
            assert np.trace(found) == near(1 - r * q + g)
            assert np.linalg.det(found) == near((1 - r * q) * g + attack)

    @pytest.mark.parametrize("name", ids("bed.ns."))
    def test_where_beddington_turns(self, name: str) -> None:
        """bed.ns: the boundary of Beddington et al. 1975 (citation from memory), values computed anew."""
        record = published(name)
        q, onset = float(record.parameters["q"]), float(record.number(0))
        assert abs(multipliers(self.beddington(q, onset))[0]) == near(1, 1e-9)
        assert angle(self.beddington(q, onset)) == near(float(record.number(1)), 1e-9)
        assert is_stable(self.beddington(q, onset * 1.001)) != is_stable(self.beddington(q, onset * 0.999))

    def test_without_parasitoids_the_hosts_are_a_ricker_map(self) -> None:
        """N / K follows it; the parasitoids enter where N = K is above 1."""
        found = stepped(family("beddington"), {"r": 2.1, "K": 4.0, "N": 1.2, "P": 0.0})
        assert found["N"] / 4 == near(stepped(family("ricker"), {"r": 2.1, "x": 0.3})["x"])
        for capacity in (0.9, 1.1):
            at = {"r": 1.5, "K": capacity, "N": capacity, "P": 0.0}
            assert is_stable(cycle_matrix(family("beddington"), at, 1)) == (capacity < 1)
