"""The orbit kernels against their slow twin, bit for bit, and against what theory says."""

from __future__ import annotations

import numpy as np
import pytest
from numba import njit

from atlas.arithmetic import functions
from atlas.families.catalogue import family
from atlas.orbits.orbit import OrbitCounter, Rules
from tests.reference.orbits import Twin
from tiles.number import exact
from tiles.window import View


@njit
def _exp(x):
    return functions.exp(x)


def _logistic(x, r):
    return r * x * (1.0 - x)


KINDS = ("below", "above", "escaped", "unsettled", "collapsed")
MAPS = {
    "logistic": (_logistic, lambda x, r: r * (1.0 - 2.0 * x)),
    "ricker": (lambda x, r: x * _exp(r * (1.0 - x)), lambda x, r: _exp(r * (1.0 - x)) * (1.0 - r * x)),
    "tent": (lambda x, mu: mu * min(x, 1.0 - x), lambda x, mu: mu if x < 1.0 - x else -mu),
    "quadratic": (lambda x, c: x * x + c, lambda x, c: 2.0 * x),
}
CASES = {
    "cascade": ("logistic", ("r", "2.9", "4"), ("x", 0, 1), Rules(200, 4000, 700, 3, 16), (0.3, 0.7)),
    "slow at 3": ("logistic", ("r", "2.99", "3.01"), ("x", "0.6", "0.7"), Rules(99, 3000, 64, 1, 8), (0.3,)),
    "escapes": ("logistic", ("r", "3.9", "4.3"), ("x", 0, 1), Rules(20, 500, 1500, 2, 16), (0.3,)),
    "full height": ("logistic", ("r", "3.99999", "4.00001"), ("x", 0, 1), Rules(50, 500, 600, 3, 16), (0.5,)),
    "repelling start": ("logistic", ("r", "3", "4"), ("x", 0, 1), Rules(50, 500, 100, 2, 16), (0.0, 0.3)),
    "above and below": ("logistic", ("r", "3.5", "4"), ("x", "0.3", "0.6"), Rules(50, 500, 99, 2, 9), (0.3,)),
    "collapse": ("tent", ("mu", "1.9", "2"), ("x", 0, 1), Rules(100, 1000, 700, 2, 16), (0.3,)),
    "collapse at the end": ("tent", ("mu", "1.45", "2.55"), ("x", 0, 1), Rules(0, 500, 300, 1, 8), (0.3,)),
    "slow extinction": ("logistic", ("r", "0.9", "1.1"), ("x", 0, "0.2"), Rules(99, 3000, 64, 2, 8), (0.3,)),
    "no transient": ("logistic", ("r", "3.5", "3.6"), ("x", 0, 1), Rules(0, 500, 33, 2, 16), (0.3,)),
    "exponential": ("ricker", ("r", "1.5", "4"), ("x", 0, 4), Rules(150, 2000, 400, 2, 16), (0.3,)),
    "collapse late": ("quadratic", ("c", "-2", "-1.9"), ("x", -2, 2), Rules(0, 500, 900, 3, 16), (0.5,)),
    "log axis": (
        "ricker",
        ("r", "1.5", "4"),
        {"name": "x", "low": "1e-3", "high": 10, "scale": "log"},
        Rules(150, 2000, 400, 2, 16),
        (0.3,),
    ),
}


@pytest.mark.parametrize("lanes", [1, 7, 32])
@pytest.mark.parametrize("case", CASES)
def test_kernels_equal_the_slow_twin(case, lanes):
    name, across, up, rules, starts = CASES[case]
    view = View(across, up)
    columns, rows = 11, 37
    map_family = family(name)
    state = map_family.states[0].name
    counter = OrbitCounter(
        map_family, view, columns, rows, rules, starts=[{state: exact(x)} for x in starts], lanes=lanes
    )
    step, slope = MAPS[name]
    twin = Twin(
        step,
        slope,
        float(map_family.escape),
        view.up.edges(rows),
        0.5 * view.up.cell_size(rows),
        view.up.scale == "log",
    )
    values = view.across.values(columns, rules.values_per_column)
    for first, last in ((0, 4), (4, 11)):
        strip = counter.count(first, last).strip
        strip.check()
        for at in range(first, last):
            expected = twin.column(at, values[at].tolist(), starts, rules)
            got = strip.counts[at - first]
            cells = np.zeros(rows, np.uint32)
            for cell, number in expected.cells.items():
                cells[cell] = number
            np.testing.assert_array_equal(got, cells, err_msg=f"column {at}")
            for kind in KINDS:
                assert getattr(strip, kind)[at - first] == getattr(expected, kind), (at, kind)


def test_the_cases_meet_every_decision():
    met = set()
    for name, across, up, rules, starts in CASES.values():
        map_family = family(name)
        state = map_family.states[0].name
        counter = OrbitCounter(
            map_family, View(across, up), 11, 37, rules, starts=[{state: exact(x)} for x in starts], lanes=32
        )
        counted = counter.count(0, 11)
        met |= {kind for kind in KINDS if getattr(counted.strip, kind).any()}
        met |= {"filled"} if counted.filled else set()
        met |= {"on repelling"} if counted.on_repelling else set()
    assert met == {*KINDS, "filled", "on repelling"}
