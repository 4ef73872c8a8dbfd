"""Edges of periodic windows and mergers of bands appear in the column where the published value lies.

Each view has nine columns, of which the fifth holds the value, with one parameter value a column.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

import mpmath
import numpy as np
import pytest

from tests.reference.published import published
from tests.world.views import Interval, around, branches, counted, outside

MIDDLE = 4
MANY = 500


@dataclass(frozen=True)
class Window:
    """A published window: its family, its record, its period, and an interval with its attractors."""

    family: str
    parameter: str
    record: str
    period: int
    up: Interval

    def __str__(self) -> str:
        """Return the name of the test."""
        return self.record

    def value(self, event: str) -> Fraction:
        """Return where an event of the window lies."""
        return published(self.record).number(event)

    @property
    def width(self) -> Fraction:
        """Return 1/32 of the stable part of the window."""
        return (self.value("first_doubling") - self.value("saddle_node")) / 32

    def columns(self, event: str, rows: int, samples: int, up: Interval | None = None) -> Any:
        """Count nine columns around an event."""
        return counted(
            self.family,
            around(self.parameter, self.value(event), self.width),
            up=up or self.up,
            size=(9, rows),
            values_per_column=1,
            transient=20_000,
            samples=samples,
        )


# Sources: 1 + sqrt 8, where the first window opens, is exact algebra; Grebogi, Ott & Yorke 1983 for its
# crisis, May 1974 and May & Oster 1976 for Ricker's first (citations from memory); the others are common
# practice, no source. The digits are roots computed in arbitrary precision.
WINDOWS = [
    Window("logistic", "r", "log.win.p3.1", 3, ("x", 0, 1)),
    Window("logistic", "r", "log.win.p4.1", 4, ("x", 0, 1)),
    Window("logistic", "r", "log.win.p5.1", 5, ("x", 0, 1)),
    Window("logistic", "r", "log.win.p5.2", 5, ("x", 0, 1)),
    Window("logistic", "r", "log.win.p6.1", 6, ("x", 0, 1)),
    Window("ricker", "r", "ric.win.p3.1", 3, ("x", 0, 5)),
    Window("ricker", "r", "ric.win.p4.1", 4, ("x", 0, 5)),
    Window("ricker", "r", "ric.win.p5.1", 5, ("x", 0, 5)),
    Window("ricker", "r", "ric.win.p5.2", 5, ("x", 0, 5)),
    Window("ricker", "r", "ric.win.p6.1", 6, ("x", 0, 5)),
    Window("sine", "r", "sin.win.p3.1", 3, ("x", 0, 1)),
    Window("sine", "r", "sin.win.p4.1", 4, ("x", 0, 1)),
    Window("hassell", "growth", "has.win3.b6", 3, ("x", 0, 16)),
    Window("cubic", "r", "cub.win3", 3, ("x", 0, "1.2")),
]
each_window = pytest.mark.parametrize("window", WINDOWS, ids=str)


@each_window
def test_it_opens_out_of_chaos_in_the_column_of_the_published_value(window: Window) -> None:
    made = window.columns("saddle_node", 1 << 16, 4096)
    found = branches(made.counts.values)
    assert min(found[:MIDDLE]) > MANY
    assert found[MIDDLE + 1 :] == [window.period] * MIDDLE
    assert outside(made) == 0


@each_window
def test_its_branches_double_in_the_column_of_the_published_value(window: Window) -> None:
    """Branches nearer to 0 than a thousandth of the view are left out: their doubling is too fine for it."""
    name, _, high = window.up
    made = window.columns("first_doubling", 1 << 16, 4096, (name, Fraction(high) / 1000, high))
    found = branches(made.counts.values)
    branch_count = found[0]
    assert window.period - 1 <= branch_count <= window.period
    assert found[:MIDDLE] == [branch_count] * MIDDLE
    assert found[MIDDLE + 1 :] == [2 * branch_count] * MIDDLE


@each_window
def test_it_ends_in_a_crisis_in_the_column_of_the_published_value(window: Window) -> None:
    """The narrow bands of the window burst into the wide bands around them."""
    made = window.columns("crisis", 2000, 200_000)
    occupied = (made.counts.values > 0).mean(axis=0)
    assert 2 * occupied[:MIDDLE].max() < occupied[MIDDLE + 1 :].min()
    assert outside(made) == 0


def of_cascade(family: str, k: int, value: Fraction) -> tuple[str, Fraction, int, Fraction]:
    """Return the superstable cycle of period 2^k, looked for in columns that narrow like the cascade."""
    return family, value, 2**k, Fraction(1, 1000 * 4**k)


# Sources: exact algebra for k = 0 and 1, Feigenbaum 1978 and May 1976 for the others (citations from memory);
# the sine map and all windows: common practice, no source.
SUPERSTABLE = [
    *(of_cascade("logistic", k, published(f"log.ss.{k}").number()) for k in range(7)),
    *(of_cascade("sine", k, published("sin.ss").number(k)) for k in range(5)),
    *((w.family, w.value("superstable"), w.period, w.width) for w in WINDOWS if w.parameter == "r"),
    ("quadratic", published("quad.p3ss").number(), 3, Fraction("1e-4")),
]
CRITICAL: dict[str, Callable[[float], float]] = {
    "logistic": lambda r: 0.5,
    "sine": lambda r: 0.5,
    "quadratic": lambda c: 0.0,
    "cubic": lambda r: 3**-0.5,
    "ricker": lambda r: 1 / r,
}


@pytest.mark.parametrize(("family", "value", "period", "width"), SUPERSTABLE)
def test_a_branch_crosses_the_critical_point_in_the_column_of_the_published_value(
    family: str, value: Fraction, period: int, width: Fraction
) -> None:
    """A cycle is superstable where one of its points is the critical point of the map."""
    parameter = "c" if family == "quadratic" else "r"
    axis = around(parameter, value, width)
    middle, reach = Fraction(CRITICAL[family](float(value))), 400 * width
    made = counted(
        family,
        axis,
        up=("x", middle - reach, middle + reach),
        size=(9, 20_000),
        values_per_column=1,
        transient=20_000,
        samples=8 * period,
    )
    sides = []
    for column in range(9):
        away = made.x.values[made.counts.values[:, column] > 0] - CRITICAL[family](
            float(made[parameter][column])
        )
        sides.append(bool(away[np.abs(away).argmin()] > 0))
    assert sides[:MIDDLE] == [sides[0]] * MIDDLE
    assert sides[MIDDLE + 1 :] == [not sides[0]] * MIDDLE


# Sources: Grossmann & Thomae 1977 for the logistic map, Ito, Tanaka & Nakada 1979 for the tent map (citations
# from memory); common practice, no source, for Ricker.
MERGERS = [
    ("logistic", "r", published("log.bandmerge.1").number(), 1, "1e-4", ("x", 0, 1)),
    ("logistic", "r", published("log.bandmerge.2").number(), 2, "1e-4", ("x", 0, 1)),
    ("logistic", "r", published("log.bandmerge.3").number(), 4, "5e-5", ("x", 0, 1)),
    ("logistic", "r", published("log.bandmerge.4").number(), 8, "3e-5", ("x", 0, 1)),
    ("ricker", "r", published("ric.bandmerge.1").number(), 1, "1e-4", ("x", 0, 4)),
    ("ricker", "r", published("ric.bandmerge.2").number(), 2, "1e-4", ("x", 0, 4)),
    ("tent", "mu", published("tent.bands").number(0), 1, "1e-4", ("x", 0, 1)),
    ("tent", "mu", published("tent.bands").number(1), 2, "1e-3", ("x", 0, 1)),
    ("tent", "mu", published("tent.bands").number(2), 4, "7e-3", ("x", 0, 1)),
]


@pytest.mark.parametrize(("family", "parameter", "value", "merged", "width", "up"), MERGERS)
def test_bands_merge_in_the_column_of_the_published_value(
    family: str, parameter: str, value: Fraction, merged: int, width: str, up: Interval
) -> None:
    made = counted(
        family,
        around(parameter, value, width),
        up=up,
        size=(9, 32_000),
        values_per_column=1,
        transient=2000,
        samples=4_000_000,
    )
    found = branches(made.counts.values)
    assert found[:MIDDLE] == [2 * merged] * MIDDLE
    assert found[MIDDLE + 1 :] == [merged] * MIDDLE


def test_the_real_quadratic_map_has_its_window_from_minus_7_quarters_down() -> None:
    """Period 3 to the left of c = -7/4, chaos to the right; source: exact algebra."""
    axis = around("c", published("quad.p3sn").number() + Fraction(1, 10**5), Fraction(1, 10**4))
    made = counted("quadratic", axis, size=(9, 1 << 16), values_per_column=1, transient=20_000, samples=4096)
    found = branches(made.counts.values)
    assert found[:MIDDLE] == [3] * MIDDLE
    assert min(found[MIDDLE + 1 :]) > MANY


MERGE = Fraction(published("cub.merge").value.split("=")[-1].strip())


@pytest.mark.parametrize("start", ["0.3", "-0.3"])
def test_mirror_attractors_of_the_cubic_map_merge_at_the_published_value(start: str) -> None:
    """At r = 3 sqrt 3 / 2 the two attractors of either sign become one; source: exact algebra."""
    made = counted(
        "cubic",
        around("r", MERGE, "1e-4"),
        size=(9, 2000),
        starts=[start],
        values_per_column=1,
        samples=200_000,
    )
    other = made.counts.values[made.x.values < 0 if start == "0.3" else made.x.values > 0]
    assert not other[:, :MIDDLE].any()
    assert other[:, MIDDLE + 1 :].any(axis=0).all()


@pytest.mark.parametrize("alpha", ["4.9", "6.2"])
def test_the_lower_attractor_of_the_gauss_map_is_lost_at_the_published_fold(alpha: str) -> None:
    """Its fixed point is negative; beyond the fold orbits from there come to positive states.

    Source: common practice, no source; closed form.
    """
    fold = published(f"gau.sn1.{alpha}").number(1)
    made = counted(
        "gauss",
        around("beta", fold, "1e-4"),
        size=(9, 5000),
        set={"alpha": alpha},
        starts=["-0.8"],
        values_per_column=1,
        transient=20_000,
    )
    positive = made.counts.values[made.x.values > 0]
    assert branches(made.counts.values)[:MIDDLE] == [1] * MIDDLE
    assert not positive[:, :MIDDLE].any()
    assert positive[:, MIDDLE + 1 :].any(axis=0).all()


def test_records_of_closed_form_agree_with_it() -> None:
    """Source: exact algebra."""
    with mpmath.workdps(30):
        for name, value in {
            "log.pd.2": 1 + mpmath.sqrt(6),
            "log.ss.1": 1 + mpmath.sqrt(5),
            "log.bandmerge.1": mpmath.polyroots([1, -2, -4, -8])[0],
            "quad.pd1": mpmath.mpf(-3) / 4,
            "quad.pd2": mpmath.mpf(-5) / 4,
        }.items():
            number = published(name).number()
            assert abs(mpmath.mpf(number.numerator) / number.denominator - mpmath.re(value)) < 1e-20
