"""Populations in planes: insects in three stages, hosts and parasitoids, two coupled logistic maps."""

from __future__ import annotations

import math
from fractions import Fraction
from typing import Any

import numpy as np
import pytest

import atlas
from atlas.planes.fates import CHAOTIC, ESCAPES, EXTINCT, FIXED_POINT, PERIODIC, QUASI_PERIODIC
from tests.reference.published import published
from tests.world.planes import corners, pixel, plane
from tests.world.test_insect_stages import PARAMETERS, at_equilibrium, growth, jury

LAYERS = ("fate", "period", "lyapunov")
BOTH = (*LAYERS, "lyapunov_2")


@pytest.fixture(scope="module")
def insects() -> Any:
    """Return a plane of the cannibalism of pupae and the larvae an adult leaves."""
    return plane("insect_stages", ("cpa", "0.001", "0.061"), ("b", "0.5", "20.5"), (12, 40), LAYERS)


@pytest.fixture(scope="module")
def coupled() -> Any:
    """Return a plane of synchronised starts, which stay so to the last bit."""
    start = [{"x": "0.3", "y": "0.3"}]
    return plane("coupled_logistic", ("r", "2.8", "3.98"), ("eps", 0, 1), (59, 10), BOTH, starts=start)


class TestInsects:
    """lpa.*: B. Dennis et al. 1995, R. F. Costantino et al. 1997 (citations and parameters from memory)."""

    def test_the_equilibrium_attracts_where_the_jury_conditions_hold(self, insects: Any) -> None:
        """Where they fail all over a pixel it is never seen; where they hold another may attract too."""
        cpa, b = corners(insects)
        worst = np.full(cpa.shape, np.nan)
        for place in np.ndindex(cpa.shape):
            given = {"cpa": float(cpa[place]), "b": float(b[place])}
            if growth({**PARAMETERS, **given}) > 1.05:
                worst[place] = min(jury(at_equilibrium(**given)))
        holds, fails = (worst > 0).all(axis=0), (worst < 0).all(axis=0)
        steady = insects.fate.values == FIXED_POINT
        assert holds.sum() > 15
        assert fails.sum() > 100
        assert not steady[fails].any()
        assert steady[holds].mean() > 0.9

    def test_they_die_out_below_a_growth_of_1(self, insects: Any) -> None:
        """lpa.R0: b (1 - mul) / mua = 1; exact algebra."""
        assert published("lpa.R0").number() == 1
        edge = PARAMETERS["mua"] / (1 - PARAMETERS["mul"])
        b = corners(insects)[1]
        below, above = (b < edge).all(axis=0), (b > edge + 0.1).all(axis=0)
        assert below.any()
        assert (insects.fate.values[below] == EXTINCT).all()
        assert not (insects.fate.values[above] == EXTINCT).any()

    @pytest.mark.parametrize("cpa", ["0", "0.05", "0.1", "0.25", "0.35", "1.0"])
    def test_the_published_sequence(self, cpa: str) -> None:
        """lpa97.seq: equilibrium, 8-cycle, loop, chaos, chaos, 3-cycle."""
        record = published("lpa97.seq")
        told = record.value[cpa]
        found = pixel("insect_stages", {"cpa": cpa, "b": "6.598"}, LAYERS, transient=20_000, steps=100_000)
        if told == "quasiperiodic":
            assert found["fate"] == QUASI_PERIODIC
        elif "." in told:
            assert found["fate"] == CHAOTIC
            assert found["lyapunov"] == pytest.approx(float(told), abs=3e-3)
        else:
            assert found["fate"] == (FIXED_POINT if told == "1" else PERIODIC)
            assert found["period"] == int(told)
            if told != "1":
                printed = {"8": "-0.02571", "3": "-0.18708"}[told]
                assert printed in record.quantity
                assert found["lyapunov"] == pytest.approx(float(printed), abs=1e-5)


class TestHostsAndParasitoids:
    def test_nicholson_and_bailey_have_no_attractor(self) -> None:
        """nb.R2: A. J. Nicholson and V. A. Bailey 1935 (from memory); unstable for R > 1, exact algebra."""
        assert "unstable for every R>1" in published("nb.R2").quantity
        view = atlas.View(("N", "0.1", "5"), ("P", "0.1", "5"))
        for rate in ("1.2", "2", "4"):
            chart = atlas.basins(atlas.family("nicholson_bailey"), view, size=(15, 15), set={"R": rate})
            assert chart.sizes["number"] == 0
            assert np.isin(chart.fate.values, (EXTINCT, ESCAPES)).all()
            assert (chart.fate.values == EXTINCT).mean() > 0.5


class TestCoupledLogisticMaps:
    """cl.*: H. Fujisaka and T. Yamada 1983 (citation from memory); exact algebra."""

    def test_the_exponent_across_is_that_along_and_the_logarithm_of_the_coupling(self, coupled: Any) -> None:
        """cl.formula: exponents lambda and lambda + ln|1 - 2 eps|, whatever the attractor."""
        assert "lambda+ln|1-2eps|" in published("cl.formula").quantity
        lost = np.log(abs(1 - 2 * coupled.eps.values))[:, np.newaxis]
        along, across = coupled.lyapunov.values, coupled.lyapunov_2.values
        assert (coupled.fate.values == CHAOTIC).sum() > 100
        known = np.isfinite(along) & np.isfinite(across)
        assert known.mean() > 0.95
        slack = np.where(coupled.period.values > 0, 1e-6, 2 * math.log(2) / 2000)
        assert (abs(across - along - lost) < slack)[known].all()

    def test_the_exponent_along_is_that_of_one_map(self, coupled: Any) -> None:
        for k in (1, 20, 30, 40, 52):
            twin = atlas.lyapunov_spectrum(
                atlas.family("logistic"), {"r": Fraction(float(coupled.r[k]))}, steps=2000
            )
            error = 1e-6 if twin.period[0] else 0.03
            np.testing.assert_allclose(coupled.lyapunov.values[:, k], float(twin.lyapunov[0, 0]), atol=error)

    def test_synchronised_chaos_at_full_height_attracts_between_a_quarter_and_three_quarters(self) -> None:
        """cl.thr4: 1/4 < eps < 3/4; starts off the diagonal end on it there and not elsewhere.

        At the edges bursts take long to die, so columns within 0.03 of them are left out.
        """
        assert published("cl.thr4").value == "1/4 < eps < 3/4"
        made = atlas.orbit_counts(
            atlas.family("coupled_logistic"),
            atlas.View(("eps", "0.1", "0.9"), ("difference", "-1.01", "1.01")),
            size=(40, 101),
            set={"r": "3.9999999"},
            transient=20_000,
            samples=2000,
            values_per_column=1,
        )
        eps, together = made.eps.values, made.counts.values[50] / np.maximum(made.counts.sum("difference"), 1)
        assert (together.values[abs(eps - 0.5) < 0.22] == 1).all()
        assert (together.values[abs(eps - 0.5) > 0.28] < 0.9).all()
