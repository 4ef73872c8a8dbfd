"""Formulas by the slow road: evaluation in 60 digits, differences for derivatives, random trees."""

from __future__ import annotations

import operator
from collections.abc import Mapping
from functools import reduce
from typing import Any

import mpmath
from hypothesis import strategies as st

from atlas.formula.expression import Binary, Call, Compare, Logic, Name, Node, Number, Pi, Unary, parse

DIGITS = 60
NAMES = ("x", "r", "b_1")
_LITERALS = ("0", "1", "2", "3", "17", "0.3", "2.50", ".5", "1e-3", "1E2", "0.12345678901234567890123")
_ONE = ("exp", "log", "sqrt", "sin", "cos", "tan", "tanh", "abs", "floor", "sign")


class NotReal(ArithmeticError):
    """A formula leaves the real numbers, or grows beyond use, at the values given."""


def value(node: Node, values: Mapping[str, Any]) -> Any:
    """Return the value of a number in 60 digits."""
    with mpmath.workdps(DIGITS):
        return _value(node, {name: mpmath.mpf(given) for name, given in values.items()})


def slope(node: Node, name: str, values: Mapping[str, Any]) -> Any:
    """Return the derivative by a central difference of fourth order, good to some 40 digits."""
    with mpmath.workdps(DIGITS):
        step = mpmath.mpf(10) ** -12
        near = [
            _value(node, {**{key: mpmath.mpf(v) for key, v in values.items()}, name: values[name] + k * step})
            for k in (-2, -1, 1, 2)
        ]
        return (near[0] - 8 * near[1] + 8 * near[2] - near[3]) / (12 * step)


def _value(node: Node, values: Mapping[str, Any]) -> Any:
    result = _unchecked(node, values)
    if isinstance(result, mpmath.mpc) or not mpmath.isfinite(result) or abs(result) > mpmath.mpf(10) ** 12:
        raise NotReal
    return result


def _unchecked(node: Node, values: Mapping[str, Any]) -> Any:
    match node:
        case Number(_, exact):
            return mpmath.mpf(exact.numerator) / exact.denominator
        case Pi():
            return +mpmath.pi
        case Name(name):
            return values[name]
        case Unary(op, a):
            return -_value(a, values) if op == "-" else _value(a, values)
        case Binary(op, a, b):
            return _joined(op, _value(a, values), _value(b, values))
        case Call("where", (condition, a, b)):
            return _value(a if _holds(condition, values) else b, values)
        case Call(function, args):
            return _called(function, [_value(arg, values) for arg in args])
    raise TypeError(node)


def _joined(op: str, a: Any, b: Any) -> Any:
    if (op == "/" and b == 0) or (op == "**" and a == 0 and b < 0):
        raise NotReal
    if op == "**" and abs(b) > 200:
        raise NotReal
    return {"+": operator.add, "-": operator.sub, "*": operator.mul, "/": operator.truediv}.get(op, pow)(a, b)


def _called(function: str, args: list[Any]) -> Any:
    first = args[0]
    if (function == "log" and first <= 0) or (function == "exp" and first > 50):
        raise NotReal
    match function:
        case "min" | "max":
            return {"min": min, "max": max}[function](args)
        case "mod":
            if args[1] == 0:
                raise NotReal
            return first - args[1] * mpmath.floor(_off_jump(first / args[1]))
        case "floor":
            return mpmath.floor(_off_jump(first))
        case "sign":
            return mpmath.sign(_off_jump(first))
        case _:
            return getattr(mpmath, {"abs": "fabs"}.get(function, function))(*args)


def _off_jump(number: Any) -> Any:
    if 0 < abs(number - mpmath.nint(number)) < mpmath.mpf(10) ** -30:
        raise NotReal  # 60 digits do not tell on which side of the jump it lies
    return number


def _holds(node: Node, values: Mapping[str, Any]) -> bool:
    match node:
        case Compare(op, a, b):
            left, right = _value(a, values), _value(b, values)
            _off_jump(left - right)
            order = {"<": left < right, ">": left > right, "==": left == right}
            return order[op] if op in order else not order[{"<=": ">", ">=": "<", "!=": "=="}[op]]
        case Logic(op, args):
            return reduce(
                operator.and_ if op == "and" else operator.or_, [_holds(arg, values) for arg in args]
            )
        case Unary(_, a):
            return not _holds(a, values)
    raise TypeError(node)


def _conditions(numbers: st.SearchStrategy[Node]) -> st.SearchStrategy[Node]:
    compare = st.builds(Compare, st.sampled_from(["<", "<=", ">", ">=", "==", "!="]), numbers, numbers)
    pairs = st.lists(compare, min_size=2, max_size=3).map(tuple)
    either: st.SearchStrategy[Node] = compare | st.builds(Logic, st.sampled_from(["and", "or"]), pairs)
    negated = either | st.builds(Unary, st.just("not"), either)
    return negated | st.builds(Logic, st.sampled_from(["and", "or"]), st.tuples(negated, negated))


def _larger(numbers: st.SearchStrategy[Node]) -> st.SearchStrategy[Node]:
    exponents = st.sampled_from(["2", "3", "0.5", "-1", "1/3", "r"]).map(lambda text: parse(text, NAMES))
    several = st.lists(numbers, min_size=2, max_size=3).map(tuple)
    return (
        st.builds(Unary, st.sampled_from("+-"), numbers)
        | st.builds(Binary, st.sampled_from("+-*/"), numbers, numbers)
        | st.builds(Binary, st.just("**"), numbers, exponents | numbers)
        | st.builds(Call, st.sampled_from(_ONE), st.tuples(numbers))
        | st.builds(Call, st.sampled_from(["min", "max"]), several)
        | st.builds(Call, st.sampled_from(["mod", "atan2"]), st.tuples(numbers, numbers))
        | st.builds(Call, st.just("where"), st.tuples(_conditions(numbers), numbers, numbers))
    )


def formulas(leaves: int = 10) -> st.SearchStrategy[Node]:
    """Return a strategy of numbers over the names x, r and b_1."""
    literals = st.sampled_from(_LITERALS).map(lambda text: parse(text, ()))
    plain: st.SearchStrategy[Node] = literals | st.just(Pi()) | st.sampled_from(NAMES).map(Name)
    return st.recursive(plain, _larger, max_leaves=leaves)
