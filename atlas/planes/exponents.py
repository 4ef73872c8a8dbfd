"""All Lyapunov exponents of some orbits with standard errors, their sum, and the dimension they give."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from atlas.families.map_family import Family
from atlas.orbits.block import Orbits
from atlas.orbits.orbit import LANES
from atlas.orbits.setting import Setting, hashed
from atlas.orbits.step import load_module, step_source
from atlas.planes.fates import ESCAPES, UNSETTLED
from atlas.planes.pixels import BATCHES, FateRules, Floats, Order, Pixels
from atlas.planes.plane_source import plane_source
from atlas.planes.turns import winding_number
from tiles.number import Exact


class Spectra(Pixels):
    """Orbits from several starts at one setting of the parameters, and all their exponents.

    Fates are decided as `atlas.planes.fates` says; no orbit counts as extinct.

    Attributes
    ----------
    errors : ndarray of float64, shape (states, orbits)
        Standard error of every exponent by the means of 16 batches; 0 on a cycle.
    sums : ndarray of float64, shape (orbits,)
        Of all exponents: the mean logarithm of the size of the Jacobian's determinant.

    Parameters
    ----------
    family : Family
    rules : FateRules
    set : mapping of str to Exact, optional
        Parameters that differ from the family's defaults.
    starts : sequence of mappings of str to Exact, optional
        Initial conditions; variables left out start where the family says.
    lanes : int
        Orbits that advance together; changes nothing but speed.
    """

    def __init__(
        self,
        family: Family,
        rules: FateRules,
        *,
        set: Mapping[str, Exact] | None = None,
        starts: Sequence[Mapping[str, Exact]] = (),
        lanes: int = LANES,
    ) -> None:
        source = step_source(family, family.state_names)
        winding = winding_number(source.widths)
        module = load_module(plane_source(source, lanes=lanes, mortal=[], winding=winding))
        setting = Setting(family, set, starts)
        keys = hashed(hashed(np.arange(len(setting.starts), dtype=np.uint64)))
        orbits: Orbits = setting.orbits(module, source, setting.starts.T, keys, {})
        super().__init__(module, rules, orbits, np.zeros(len(family.states)), np.zeros(1, np.uint8))
        self.errors = np.full(self.exponents.shape, np.nan)
        self.sums = np.full(self.error.shape, np.nan)
        self.measured = 0

    def run(self) -> None:
        """Find fates and exponents."""
        super().run()
        met = self.period > 0
        self.errors[:, met] = 0.0
        self.sums[met] = self.exponents[:, met].sum(axis=0)

    def _decide(self, order: Order, growth: Floats, steps: int) -> None:
        super()._decide(order, growth, steps)
        if not order.size:
            return
        self.measured = steps * BATCHES
        with np.errstate(invalid="ignore"):
            rates = np.diff(growth[:, :, order], axis=1, prepend=0.0) / steps
            errors = rates.std(axis=0, ddof=1) / np.sqrt(BATCHES)
            sums = growth[:, -1, order].sum(axis=0) / self.measured
        self.errors[:, order] = np.where(np.isfinite(errors), errors, np.nan)
        self.sums[order] = sums
        self._sort(order)

    def _sort(self, order: Order) -> None:
        """Put the largest exponent first where tangent vectors never left an invariant direction."""
        ranks = np.argsort(-self.exponents[:, order], axis=0, kind="stable")
        for values in (self.exponents, self.errors):
            values[:, order] = np.take_along_axis(values[:, order], ranks, axis=0)

    def dimensions(self) -> Floats:
        """Return the Kaplan-Yorke dimension of every orbit; NaN where it escapes or is unsettled."""
        return np.array(
            [
                np.nan if fate in (ESCAPES, UNSETTLED) else kaplan_yorke(self._clear(orbit))
                for orbit, fate in enumerate(self.fate)
            ]
        )

    def _clear(self, orbit: int) -> Floats:
        """Return the exponents of an orbit, those that cannot be told from 0 as 0."""
        exponents: Floats = np.nan_to_num(self.exponents[:, orbit], nan=-np.inf, neginf=-np.inf)
        if self.period[orbit]:
            return exponents
        tolerance = 3.0 * self.errors[:, orbit] + np.log(self.measured) / self.measured
        clear: Floats = np.where(np.abs(exponents) <= tolerance, 0.0, exponents)
        return clear


def kaplan_yorke(exponents: Sequence[float] | NDArray[np.float64]) -> float:
    """Return the dimension that Lyapunov exponents give an attractor.

    It is k + (L1 + … + Lk) / |Lk+1| with k the largest number for which the sum is not negative; 0 when L1
    is negative, and the number of exponents when no sum is (J. L. Kaplan and J. A. Yorke 1979, in Functional
    Differential Equations and Approximation of Fixed Points, ed. H.-O. Peitgen and H.-O. Walther, Springer,
    204-227; citation from memory).

    Parameters
    ----------
    exponents : sequence of float
        Largest first; -inf for a direction that is lost in one step.

    Examples
    --------
    >>> kaplan_yorke([0.5, -1.0]), kaplan_yorke([-0.1, -0.2]), kaplan_yorke([0.3, -0.3])
    (1.5, 0.0, 2.0)
    """
    total = 0.0
    for number, exponent in enumerate(exponents):
        if total + exponent < 0.0:
            return number + total / abs(float(exponent))
        total += float(exponent)
    return float(len(exponents))
