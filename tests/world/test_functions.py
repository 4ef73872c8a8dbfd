"""The elementary functions of the float64 back end against mpmath, and their tables recomputed."""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Any

import mpmath
import numpy as np
import pytest
from numba import njit
from numpy.typing import NDArray

from atlas.arithmetic import functions
from tests.reference import polynomials

Floats = NDArray[np.float64]
BOUND = {"exp": 1.5, "log": 1.5, "sin": 1.5, "cos": 1.5, "tan": 3.0, "tanh": 3.0, "atan2": 3.0}
"""Units in the last place, as the module promises."""
TINY = 2.0**-1022


def lanes(function: Any, arguments: int = 1) -> Callable[..., Floats]:
    """Return a compiled function of whole arrays."""
    if arguments == 1:

        @njit(error_model="numpy")
        def each(x: Floats, out: Floats) -> None:
            for k in range(x.size):
                out[k] = function(x[k])

    else:

        @njit(error_model="numpy")
        def each(x: Floats, y: Floats, out: Floats) -> None:
            for k in range(x.size):
                out[k] = function(x[k], y[k])

    def run(*given: Any) -> Floats:
        arrays = [np.atleast_1d(np.asarray(one, np.float64)) for one in given]
        out = np.empty(arrays[0].size)
        each(*arrays, out)
        return out

    return run


LANES = {
    name: lanes(getattr(functions, name), 2 if name in ("atan2", "power") else 1)
    for name in ("exp", "log", "sin", "cos", "tan", "tanh", "atan2", "power")
}


def units_off(found: Floats, exact: list[Any]) -> Floats:
    """Return the errors in units in the last place of the exact values, as float64 would store them."""
    errors = []
    with mpmath.workdps(60):
        for got, wanted in zip(found.tolist(), exact, strict=True):
            unit = max(math.ulp(float(wanted)), math.ulp(TINY))
            errors.append(float(abs(mpmath.mpf(got) - wanted) / unit))
    return np.array(errors)


def both_signs(sizes: Floats) -> Floats:
    return np.concatenate([sizes, -sizes])


def spread(low: float, high: float, number: int, seed: int) -> Floats:
    """Return numbers spread evenly in the logarithm."""
    return np.exp(np.random.default_rng(seed).uniform(np.log(low), np.log(high), number))


def near(centres: Any, seed: int) -> Floats:
    """Return the centres, their neighbours among the float64 numbers, and some points around them."""
    middle = np.asarray(centres, np.float64)
    around = [middle * (1 + step) for step in np.random.default_rng(seed).uniform(-1e-9, 1e-9, 3)]
    return np.concatenate([middle, np.nextafter(middle, np.inf), np.nextafter(middle, -np.inf), *around])


def angles() -> Floats:
    """Return angles up to 1e6 in size, many of them next to multiples of pi/2 and pi/4."""
    turns = np.concatenate([np.arange(1, 200), np.random.default_rng(3).integers(200, 636_619, 300)])
    parts = [np.array([float(k * mpmath.pi / 4) for k in turns.tolist() if k * 0.79 < 1e6])]
    return both_signs(
        np.concatenate([near(parts[0], 4), spread(1e-12, 1e6, 2000, 5), spread(1e-300, 1, 300, 6)])
    )


POINTS = {
    "exp": np.concatenate(
        [
            np.random.default_rng(1).uniform(-708.3, 709.7, 2000),
            both_signs(spread(1e-20, 1, 1000, 2)),
            near((np.arange(1, 1020) + 0.5) * math.log(2), 7),
            -near((np.arange(1, 1020) + 0.5) * math.log(2), 7),
        ]
    ),
    "log": np.concatenate(
        [
            spread(1e-307, 1e308, 2000, 8),
            np.random.default_rng(9).uniform(0.5, 2, 2000),
            1 + both_signs(spread(1e-15, 0.3, 500, 10)),
            near(2.0 ** np.arange(-1000, 1000, 37) * math.sqrt(0.5), 11),
            spread(5e-324, 2e-308, 500, 12),
        ]
    ),
    "sin": angles(),
    "cos": angles(),
    "tan": angles(),
    "tanh": both_signs(
        np.concatenate([spread(1e-300, 25, 3000, 13), near([0.3, 0.15], 14), spread(0.1, 1, 1000, 15)])
    ),
}


@pytest.mark.parametrize("name", POINTS)
def test_errors_stay_within_what_the_module_promises(name: str) -> None:
    points = POINTS[name]
    if name == "exp":
        points = points[(points > -708.39) & (points < 709.78)]
    if name in ("sin", "cos", "tan"):
        points = points[np.abs(points) <= 1e6]
    found = LANES[name](points)
    with mpmath.workdps(60):
        exact = [getattr(mpmath, name)(mpmath.mpf(x)) for x in points.tolist()]
    errors = units_off(found, exact)
    worst = int(errors.argmax())
    assert errors[worst] <= BOUND[name], f"{name}({points[worst]!r}) is {errors[worst]:.2f} units off"


def test_angles_of_points_do_so_in_all_quadrants() -> None:
    generator = np.random.default_rng(16)
    turn = np.concatenate([generator.uniform(-np.pi, np.pi, 3000), near(np.arange(-8, 9) * np.pi / 8, 17)])
    radius = spread(1e-150, 1e150, turn.size, 18)
    y, x = radius * np.sin(turn), radius * np.cos(turn)
    y, x = np.append(y, [1.0, -1.0, 0.0, 1e-300, 1e300]), np.append(x, [0.0, 0.0, -2.0, 1e300, 1e-300])
    found = LANES["atan2"](y, x)
    with mpmath.workdps(60):
        exact = [
            mpmath.atan2(mpmath.mpf(b), mpmath.mpf(a)) for b, a in zip(y.tolist(), x.tolist(), strict=True)
        ]
    errors = units_off(found, exact)
    worst = int(errors.argmax())
    assert errors[worst] <= BOUND["atan2"], (
        f"atan2({y[worst]!r}, {x[worst]!r}) is {errors[worst]:.2f} units off"
    )


def test_the_error_of_a_power_grows_like_its_logarithm_and_no_faster() -> None:
    x, y = spread(1e-30, 1e30, 3000, 19), np.random.default_rng(20).uniform(-8, 8, 3000)
    found = LANES["power"](x, y)
    with mpmath.workdps(60):
        exact = [mpmath.mpf(a) ** mpmath.mpf(b) for a, b in zip(x.tolist(), y.tolist(), strict=True)]
    seen = [k for k, value in enumerate(exact) if 1e-300 < value < 1e300]
    errors = units_off(found[seen], [exact[k] for k in seen])
    assert np.all(errors <= 2 + 1.5 * np.abs(y * np.log(x))[seen])


INF, NAN = math.inf, math.nan


@pytest.mark.parametrize(
    ("name", "arguments", "value"),
    [
        ("exp", (INF,), INF),
        ("exp", (-INF,), 0.0),
        ("exp", (NAN,), NAN),
        ("exp", (0.0,), 1.0),
        ("exp", (-0.0,), 1.0),
        ("exp", (709.79,), INF),
        ("exp", (1e308,), INF),
        ("exp", (-1e308,), 0.0),
        ("exp", (-708.5,), 0.0),
        ("exp", (5e-324,), 1.0),
        ("log", (0.0,), -INF),
        ("log", (-0.0,), -INF),
        ("log", (-1.0,), NAN),
        ("log", (-5e-324,), NAN),
        ("log", (-INF,), NAN),
        ("log", (INF,), INF),
        ("log", (NAN,), NAN),
        ("log", (1.0,), 0.0),
        ("sin", (0.0,), 0.0),
        ("sin", (5e-324,), 5e-324),
        ("sin", (INF,), NAN),
        ("sin", (-INF,), NAN),
        ("sin", (NAN,), NAN),
        ("cos", (0.0,), 1.0),
        ("cos", (INF,), NAN),
        ("cos", (NAN,), NAN),
        ("tan", (0.0,), 0.0),
        ("tan", (5e-324,), 5e-324),
        ("tan", (-INF,), NAN),
        ("tan", (NAN,), NAN),
        ("tanh", (0.0,), 0.0),
        ("tanh", (5e-324,), 5e-324),
        ("tanh", (INF,), 1.0),
        ("tanh", (-INF,), -1.0),
        ("tanh", (1000.0,), 1.0),
        ("tanh", (NAN,), NAN),
        ("atan2", (0.0, 0.0), 0.0),
        ("atan2", (0.0, 1.0), 0.0),
        ("atan2", (0.0, -1.0), math.pi),
        ("atan2", (1.0, 0.0), math.pi / 2),
        ("atan2", (-1.0, 0.0), -math.pi / 2),
        ("atan2", (INF, 1.0), math.pi / 2),
        ("atan2", (1.0, INF), 0.0),
        ("atan2", (1.0, -INF), math.pi),
        ("atan2", (NAN, 1.0), NAN),
        ("atan2", (1.0, NAN), NAN),
        ("power", (0.0, 0.0), 1.0),
        ("power", (NAN, 0.0), 1.0),
        ("power", (0.0, 2.5), 0.0),
        ("power", (0.0, -0.5), INF),
        ("power", (INF, 0.5), INF),
        ("power", (INF, -0.5), 0.0),
        ("power", (1.0, 1e300), 1.0),
        ("power", (-2.0, 0.5), NAN),
        ("power", (-1.0, 2.0), 1.0),
        ("power", (-1.0, 3.0), -1.0),
        ("power", (-1.0, -5.0), -1.0),
        ("power", (-1.0, 1e300), 1.0),
        ("power", (-1.0, 0.0), 1.0),
        ("power", (NAN, 2.0), NAN),
        ("power", (2.0, NAN), NAN),
    ],
)
def test_special_values(name: str, arguments: tuple[float, ...], value: float) -> None:
    np.testing.assert_equal(LANES[name](*arguments)[0], value)


def test_sines_and_tangents_are_odd_and_cosines_even() -> None:
    points = angles()
    for name, sign in (("sin", -1), ("tan", -1), ("cos", 1)):
        np.testing.assert_array_equal(LANES[name](-points), sign * LANES[name](points))
    sizes = spread(1e-300, 30, 1000, 21)
    np.testing.assert_array_equal(LANES["tanh"](-sizes), -LANES["tanh"](sizes))


def test_one_number_at_a_time_gives_the_same_bits_as_many() -> None:
    points = POINTS["exp"][:200]
    together = LANES["exp"](points)
    assert [LANES["exp"](x)[0] for x in points] == together.tolist()


def test_the_tables_are_the_interpolants_that_they_are_said_to_be() -> None:
    """Recomputed at 60 digits; equal to the last bit."""
    for name, values in polynomials.tables().items():
        assert list(getattr(functions, name)) == values, name


def test_the_split_constants_are_what_they_are_said_to_be() -> None:
    with mpmath.workdps(60):
        assert float(1 / mpmath.log(2)) == functions.LOG2_E
        assert float(2 / mpmath.pi) == functions.TWO_OVER_PI
        assert float(mpmath.tan(mpmath.pi / 8)) == functions.TAN_EIGHTH
        parts = (functions.HALF_PI, functions.HALF_PI_LOW, functions.HALF_PI_REST)
        rest = mpmath.pi / 2
        for part in parts:
            assert part == float(rest)
            rest -= mpmath.mpf(part)
        left = mpmath.log(2) - mpmath.mpf(functions.LN2_HIGH) - mpmath.mpf(functions.LN2_LOW)
        assert abs(left) < mpmath.mpf(2) ** -84
    assert math.ldexp(round(math.ldexp(functions.LN2_HIGH, 33)), -33) == functions.LN2_HIGH
