"""Period doublings appear in the column where the published value lies.

Each view has nine columns, of which the fifth holds the value, with one parameter value a column. On one side
of it every column shows as many branches as the cycle has points before the doubling, on the other side as
many as after it. Where the branches are too many to be told apart over the whole attractor, the view shows
a few of them, and these double.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from fractions import Fraction

import numpy as np
import pytest

from tests.reference.published import published
from tests.world.views import Interval, around, branches, counted

MIDDLE = 4
DELTA = published("univ.delta").number()


@dataclass(frozen=True)
class Doubling:
    """Where a published doubling is looked for.

    Attributes
    ----------
    family, parameter : str
    value : Fraction
    left, right : int
        Branches on either side of it.
    width : Fraction
        Of a column.
    up : (name, low, high)
    set : dict
        Other parameters.
    start : str
    """

    family: str
    parameter: str
    value: Fraction
    left: int
    right: int
    width: Fraction
    up: Interval
    set: dict[str, str] = field(default_factory=dict)
    start: str = "0.3"

    def __str__(self) -> str:
        """Return the name of the test."""
        others = "".join(f"-{name}={value}" for name, value in self.set.items())
        return f"{self.family}-{self.parameter}={float(self.value):.7f}{others}"


def numbers(record: str, *path: str) -> list[Fraction]:
    """Return the numbers of a list in a record."""
    part = published(record)
    place = part.value
    for step in path:
        place = place[step]
    return [part.number(*path, k) for k in range(len(place))]


def cascade(
    family: str,
    parameter: str,
    values: list[Fraction],
    up: Interval,
    *,
    first: int = 0,
    most: int = 5,
    **other: str,
) -> list[Doubling]:
    """Return the doublings 2^k -> 2^(k+1) of a cascade that starts at k = 0.

    A column is 1/16 of the distance to the next doubling wide; after the last value that distance follows
    from the one before and Feigenbaum's number.
    """
    made = []
    for k, value in enumerate(values[: first + most]):
        following = values[k + 1] - value if k + 1 < len(values) else (value - values[k - 1]) / DELTA
        made.append(Doubling(family, parameter, value, 2**k, 2 ** (k + 1), abs(following) / 16, up, other))
    mirrored = values[1] < values[0]
    return [
        Doubling(d.family, d.parameter, d.value, d.right, d.left, d.width, d.up, d.set) if mirrored else d
        for d in made[first:]
    ]


# Sources: exact algebra for r_1 and r_2; Feigenbaum 1978 and May 1976 (looked up for r_3, r_4, else citation
# from memory); May 1974 and May & Oster 1976 for Ricker (looked up, but for the accumulation); Feigenbaum
# 1978 for the sine family, Hassell 1975, Hassell, Lawton & May 1976, Maynard Smith & Slatkin 1973, Rogers &
# Whitley 1983 and Hilborn 2000 for their families (citations from memory). Names stand for the first digits;
# all further digits are roots computed to 40 and more, and the later values of Gauss have no source.
LOGISTIC = [published(f"log.pd.{k}").number() for k in range(1, 9)]
RICKER = [published(f"ric.pd.{k}").number() for k in range(1, 8)]
SINE = [published(f"sin.pd.{k}").number() for k in range(1, 7)]
MYRBERG = [r / 2 - r**2 / 4 for r in LOGISTIC]  # record quad.conj, exact algebra
HASSELL = {beta: numbers(f"has.pd.b{beta}", "pd") for beta in ("4", "6", "10")}
SLATKIN = [Fraction(float(growth) ** (1 / 6)) for growth in HASSELL["6"]]  # record mss.conj, exact algebra

CASES = [
    *cascade("logistic", "r", LOGISTIC, ("x", 0, 1)),
    *cascade("ricker", "r", RICKER, ("x", 0, 4), most=4),
    *cascade("sine", "r", SINE, ("x", 0, 1)),
    *cascade("theta_ricker", "r", numbers("thr.pd2.theta2"), ("x", 0, 2), theta="2"),
    *cascade("theta_ricker", "r", [2 * r for r in RICKER], ("x", 0, 16), theta="1/2", most=4),
    *cascade("hassell", "growth", HASSELL["4"], ("x", 0, 14), beta="4", most=4),
    *cascade("hassell", "growth", HASSELL["6"], ("x", 0, 4), beta="6", most=4),
    *cascade("hassell", "growth", HASSELL["10"], ("x", 0, 2), beta="10", most=4),
    *cascade("maynard_smith_slatkin", "growth", SLATKIN, ("x", 0, 2), b="6", most=4),
    *cascade("cubic", "r", numbers("cub.pd"), ("x", 0, "1.2")),
    *cascade("quadratic", "c", MYRBERG, ("x", -2, 2)),
    Doubling("maynard_smith_slatkin", "b", Fraction(3), 1, 2, Fraction(1, 100), ("x", 0, 2)),  # b/(b - 2) = 3
]
for alpha in ("4.9", "6.2"):
    for k, (record, path) in enumerate((("pd1", ()), ("pd24", ("pd2",)), ("pd24", ("pd4",)))):
        forward, reverse = numbers(f"gau.{record}.{alpha}", *path)
        common = (Fraction(1, 1000 * 3**k), ("x", "-1.2", "1.2"), {"alpha": alpha}, "0")
        CASES += [
            Doubling("gauss", "beta", forward, 2**k, 2 ** (k + 1), *common),
            Doubling("gauss", "beta", reverse, 2 ** (k + 1), 2**k, *common),
        ]
PARTS = [
    *cascade("logistic", "r", LOGISTIC, ("x", "0.44", "0.58"), first=4, most=3),
    *cascade("logistic", "r", LOGISTIC, ("x", "0.48", "0.52"), first=7, most=1),
    *cascade("ricker", "r", RICKER, ("x", "0.3", "0.4"), first=4, most=3),
    *cascade("sine", "r", SINE, ("x", "0.44", "0.58"), first=4, most=2),
]


def seen(case: Doubling) -> list[int]:
    """Return the branches of the nine columns; only the middle one may be left unsettled."""
    made = counted(
        case.family,
        around(case.parameter, case.value, case.width),
        up=case.up,
        size=(9, 1 << 16),
        set=case.set,
        starts=[case.start],
        values_per_column=1,
        transient=20_000,
        samples=1024,
        longest_period=256,
    )
    assert not made.escaped.any()
    assert not np.delete(made.unsettled.values, MIDDLE).any()
    return branches(made.counts.values)


@pytest.mark.parametrize("case", CASES, ids=str)
def test_the_branches_double_in_the_column_of_the_published_value(case: Doubling) -> None:
    found = seen(case)
    assert found[:MIDDLE] == [case.left] * MIDDLE
    assert found[MIDDLE + 1 :] == [case.right] * MIDDLE
    assert min(case.left, case.right) <= found[MIDDLE] <= max(case.left, case.right)


@pytest.mark.parametrize("case", PARTS, ids=str)
def test_a_part_of_many_branches_doubles_in_the_column_of_the_published_value(case: Doubling) -> None:
    found = seen(case)
    left, right = found[0], found[-1]
    assert right == 2 * left > 2
    assert found[:MIDDLE] == [left] * MIDDLE
    assert found[MIDDLE + 1 :] == [right] * MIDDLE
