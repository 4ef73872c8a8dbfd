"""Slow evaluation of a formula in Python floats, with the results that IEEE 754 prescribes."""

from __future__ import annotations

import math
import operator
from collections.abc import Callable, Mapping

from atlas.formula.tree import Binary, Call, Compare, Logic, Name, Node, Number, Pi, Unary
from tiles.number import float_of

_ORDER: Mapping[str, Callable[[float, float], bool]] = {
    "<": operator.lt,
    "<=": operator.le,
    ">": operator.gt,
    ">=": operator.ge,
    "==": operator.eq,
    "!=": operator.ne,
}


def evaluate(node: Node, values: Mapping[str, float]) -> float:
    """Return the value of a formula, computed operation by operation in float64.

    Nothing is raised for arguments outside a function's domain: ``log(0)`` is -inf, ``sqrt(-1)`` and
    ``0 / 0`` are NaN, ``exp(1000)`` is inf. ``mod(a, m)`` takes the sign of m, ``sign(0)`` is 0, and
    ``min`` and ``max`` keep the earlier of equal arguments.

    Parameters
    ----------
    node : Node
        A formula that is a number.
    values : mapping of str to float
        The value of every free name.

    Returns
    -------
    float

    Raises
    ------
    KeyError
        When a name has no value.

    Examples
    --------
    >>> from fractions import Fraction
    >>> evaluate(Binary("/", Name("x"), Number("4", Fraction(4))), {"x": 1.0})
    0.25
    """
    match node:
        case Number(_, value):
            return float_of(value)
        case Pi():
            return math.pi
        case Name(name):
            return float(values[name])
        case Unary("-", a):
            return -evaluate(a, values)
        case Unary(_, a):
            return evaluate(a, values)
        case Binary(op, a, b):
            return _ARITHMETIC[op](evaluate(a, values), evaluate(b, values))
        case Call("where", (condition, a, b)):
            return evaluate(a if holds(condition, values) else b, values)
        case Call(function, args):
            return _FUNCTIONS[function](*(evaluate(arg, values) for arg in args))
        case _:
            raise TypeError("a condition has no value; ask whether it holds")


def holds(node: Node, values: Mapping[str, float]) -> bool:
    """Return whether a condition is true; every comparison with NaN but ``!=`` is false."""
    match node:
        case Compare(op, a, b):
            return _ORDER[op](evaluate(a, values), evaluate(b, values))
        case Logic("and", args):
            return all(holds(arg, values) for arg in args)
        case Logic(_, args):
            return any(holds(arg, values) for arg in args)
        case Unary("not", a):
            return not holds(a, values)
        case _:
            raise TypeError("a number is neither true nor false")


def _quotient(a: float, b: float) -> float:
    if b != 0.0:
        return a / b
    return math.nan if a == 0.0 or math.isnan(a) else math.copysign(math.inf, a) * math.copysign(1.0, b)


def _power(a: float, b: float) -> float:
    try:
        return math.pow(a, b)
    except OverflowError:
        return -math.inf if a < 0.0 and b % 2.0 == 1.0 else math.inf
    except ValueError:  # zero to a negative power, or a negative number to a broken one
        if a != 0.0:
            return math.nan
        return math.copysign(math.inf, a) if b % 2.0 == 1.0 else math.inf


def _exp(a: float) -> float:
    try:
        return math.exp(a)
    except OverflowError:
        return math.inf


def _log(a: float) -> float:
    if a == 0.0:
        return -math.inf
    return math.nan if a < 0.0 else math.log(a)


def _finite(function: Callable[[float], float]) -> Callable[[float], float]:
    return lambda a: math.nan if math.isinf(a) else function(a)


def _floor(a: float) -> float:
    return float(math.floor(a)) if math.isfinite(a) and a != 0.0 else a


def _mod(a: float, m: float) -> float:
    return a - m * _floor(_quotient(a, m))


def _sign(a: float) -> float:
    return float((a > 0.0) - (a < 0.0)) if not math.isnan(a) else a


def _min(*args: float) -> float:
    least = args[0]
    for arg in args[1:]:
        least = arg if arg < least else least
    return least


def _max(*args: float) -> float:
    most = args[0]
    for arg in args[1:]:
        most = arg if arg > most else most
    return most


_ARITHMETIC: Mapping[str, Callable[[float, float], float]] = {
    "+": operator.add,
    "-": operator.sub,
    "*": operator.mul,
    "/": _quotient,
    "**": _power,
}
_FUNCTIONS: Mapping[str, Callable[..., float]] = {
    "exp": _exp,
    "log": _log,
    "sqrt": lambda a: math.sqrt(a) if a >= 0.0 else math.nan,
    "sin": _finite(math.sin),
    "cos": _finite(math.cos),
    "tan": _finite(math.tan),
    "tanh": math.tanh,
    "atan2": math.atan2,
    "abs": math.fabs,
    "min": _min,
    "max": _max,
    "floor": _floor,
    "mod": _mod,
    "sign": _sign,
}
