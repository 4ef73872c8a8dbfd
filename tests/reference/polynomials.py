"""Recomputes the polynomial coefficients of the float64 functions with mpmath, at 60 digits."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import mpmath

DIGITS = 60


def interpolate(
    function: Callable[[mpmath.mpf], mpmath.mpf], low: Any, high: Any, degree: int
) -> list[float]:
    """Return the monomial coefficients of the interpolant at Chebyshev nodes of an interval."""
    with mpmath.workdps(DIGITS):
        low, high = mpmath.mpf(low), mpmath.mpf(high)
        count = degree + 1
        nodes = [
            (low + high) / 2 + (high - low) / 2 * mpmath.cos(mpmath.pi * (2 * k + 1) / (2 * count))
            for k in range(count)
        ]
        matrix = mpmath.matrix(count, count)
        right = mpmath.matrix(count, 1)
        for row, node in enumerate(nodes):
            right[row] = function(node)
            for column in range(count):
                matrix[row, column] = node**column
        return [float(value) for value in mpmath.lu_solve(matrix, right)]


def _series(terms: Callable[[int], mpmath.mpf]) -> Callable[[mpmath.mpf], mpmath.mpf]:
    def value(z: mpmath.mpf) -> mpmath.mpf:
        return mpmath.fsum(terms(k) * z**k for k in range(60))

    return value


def _odd_part(function: Callable[[mpmath.mpf], mpmath.mpf]) -> Callable[[mpmath.mpf], mpmath.mpf]:
    def value(z: mpmath.mpf) -> mpmath.mpf:
        root = mpmath.sqrt(z)
        return (function(root) / root - 1) / z

    return value


def tables() -> dict[str, list[float]]:
    """Return the tables that ``atlas.arithmetic.functions`` holds, by name."""
    with mpmath.workdps(DIGITS):
        half_log = mpmath.log(2) / 2 * mpmath.mpf("1.0001")
        quarter = (mpmath.pi / 4 * mpmath.mpf("1.0001")) ** 2
        s_top = ((mpmath.sqrt(2) - 1) / (mpmath.sqrt(2) + 1)) ** 2
        tangent = mpmath.tan(mpmath.pi / 8) ** 2
        exp = _series(lambda k: 1 / mpmath.factorial(k + 2))
        log = _series(lambda k: mpmath.mpf(2) / (2 * k + 3))
        sin = _series(lambda k: mpmath.mpf(-1) ** (k + 1) / mpmath.factorial(2 * k + 3))
        cos = _series(lambda k: mpmath.mpf(-1) ** k / mpmath.factorial(2 * k + 4))
        return {
            "EXP": interpolate(exp, -half_log, half_log, 10),
            "LOG": interpolate(log, 0, s_top, 6),
            "SIN": interpolate(sin, 0, quarter, 5),
            "COS": interpolate(cos, 0, quarter, 5),
            "ATAN": interpolate(_odd_part(mpmath.atan), 0, tangent, 10),
            "TANH": interpolate(_odd_part(mpmath.tanh), 0, "0.0901", 7),
        }


if __name__ == "__main__":
    for name, values in tables().items():
        print(f"{name} = (")
        for value in values:
            print(f"    {value!r},")
        print(")")
