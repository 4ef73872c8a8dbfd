"""Multipliers of fixed points and cycles by the slow road: exact Jacobians, evaluated and multiplied."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from functools import cache

import numpy as np
from numpy.typing import NDArray

from atlas.families.map_family import Family
from atlas.formula.evaluation import evaluate
from atlas.formula.tree import Node

Values = Mapping[str, float]
Matrix = NDArray[np.float64]


def stepped(family: Family, values: Values, steps: int = 1) -> dict[str, float]:
    """Return the state after some steps of the lifted map; ``values`` holds states and parameters."""
    now = dict(values)
    for _ in range(steps):
        now |= {
            name: evaluate(node, now)
            for name, node in zip(family.state_names, family.inlined_step(), strict=True)
        }
    return {name: now[name] for name in family.state_names}


def matrix(family: Family, values: Values) -> Matrix:
    """Return the Jacobian of one step at a state."""
    return np.array([[evaluate(entry, values) for entry in row] for row in _jacobian(family)])


@cache
def _jacobian(family: Family) -> tuple[tuple[Node, ...], ...]:
    return family.jacobian()


def cycle_matrix(family: Family, values: Values, period: int) -> Matrix:
    """Return the Jacobian of several steps from a state on, after checking that they lead back to it."""
    product, now = np.eye(len(family.states)), dict(values)
    for _ in range(period):
        product = matrix(family, now) @ product
        now |= stepped(family, now)
    for name in family.state_names:
        assert math.isclose(now[name], values[name], rel_tol=1e-9, abs_tol=1e-9), name
    return product


def multipliers(product: Matrix) -> NDArray[np.complex128]:
    """Return the eigenvalues, the largest in size first."""
    found = np.linalg.eigvals(product).astype(np.complex128)
    return found[np.argsort(-abs(found))]


def jury(product: Matrix) -> tuple[float, ...]:
    """Return the quantities of the Jury conditions: all are positive exactly where all multipliers are small.

    For two states the values of the characteristic polynomial at 1 and -1 and 1 - det; for three its value
    at 1, its negative value at -1, 1 - \\|c\\| and 1 - c**2 - \\|b - a c\\| for the polynomial
    z**3 + a z**2 + b z + c. Source: E. I. Jury 1964, Theory and Application of the z-Transform Method
    (citation from memory).
    """
    if len(product) == 2:
        trace, det = float(np.trace(product)), float(np.linalg.det(product))
        return 1 - trace + det, 1 + trace + det, 1 - det
    minors = sum(
        product[i, i] * product[j, j] - product[i, j] * product[j, i] for i in range(3) for j in range(i)
    )
    a, b, c = -float(np.trace(product)), float(minors), -float(np.linalg.det(product))
    return 1 + a + b + c, 1 - a + b - c, 1 - abs(c), 1 - c**2 - abs(b - a * c)


def is_stable(product: Matrix) -> bool:
    """Return whether the Jury conditions hold, after checking that the multipliers say the same."""
    holds = min(jury(product)) > 0
    assert holds == (abs(multipliers(product)[0]) < 1)
    return holds


def root(function: Callable[[float], float], low: float, high: float) -> float:
    """Return where a function changes its sign, by bisection to the last bit."""
    rising = function(high) > 0
    assert (function(low) > 0) != rising
    while low < (middle := (low + high) / 2) < high:
        low, high = (low, middle) if (function(middle) > 0) == rising else (middle, high)
    return low
