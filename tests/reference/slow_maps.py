"""Maps in plain Python floats: one operation after the other, as the formulas of a family say."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from itertools import combinations
from typing import Any

import mpmath
import numpy as np
from numba import njit

from atlas.arithmetic import functions
from atlas.families.map_family import Family
from atlas.formula.evaluation import evaluate
from atlas.formula.tree import Binary, Call, Compare, Logic, Name, Node, Number, Pi, Unary

State = tuple[float, ...]
Formula = Callable[[Mapping[str, float]], float]


def _callable(function: Any, arguments: int) -> Any:
    if arguments == 1:
        return njit(lambda x: function(x))
    return njit(lambda x, y: function(x, y))


EXP, LOG, SIN, COS, TAN, TANH = (
    _callable(getattr(functions, name), 1) for name in ("exp", "log", "sin", "cos", "tan", "tanh")
)
ATAN2, POWER = _callable(functions.atan2, 2), _callable(functions.power, 2)
OF_ONE: Mapping[str, Callable[[float], float]] = {
    "exp": EXP,
    "log": LOG,
    "sin": SIN,
    "cos": COS,
    "tan": TAN,
    "tanh": TANH,
    "abs": abs,
    "sqrt": lambda x: math.sqrt(x) if x >= 0.0 else math.nan,
    "floor": lambda x: float(np.floor(x)),
    "sign": lambda x: 1.0 if x > 0.0 else (-1.0 if x < 0.0 else x + 0.0),
}


def quotient(a: float, b: float) -> float:
    """Return a / b as IEEE 754 prescribes."""
    return evaluate(Binary("/", Name("a"), Name("b")), {"a": a, "b": b}) if b == 0.0 else a / b


def plain(node: Node) -> Formula:
    """Return a formula as a function of the values of its names.

    The elementary functions are the polynomials of `atlas.arithmetic.functions`; whole powers are products by
    halves of the exponent, as the formula language says.
    """
    match node:
        case Number() | Pi():
            number = evaluate(node, {})
            return lambda values: number
        case Name(name):
            return lambda values: values[name]
        case Unary("-", a):
            inner = plain(a)
            return lambda values: -inner(values)
        case Unary(_, a):
            return plain(a)
        case Binary("**", a, b):
            return _power(a, b)
        case Binary(op, a, b):
            left, right = plain(a), plain(b)
            return {
                "+": lambda values: left(values) + right(values),
                "-": lambda values: left(values) - right(values),
                "*": lambda values: left(values) * right(values),
                "/": lambda values: quotient(left(values), right(values)),
            }[op]
        case Call("where", (condition, a, b)):
            test, left, right = _condition(condition), plain(a), plain(b)
            return lambda values: left(values) if test(values) else right(values)
        case Call(function, args):
            return _call(function, [plain(arg) for arg in args])
    raise TypeError(node)


def _power(a: Node, b: Node) -> Formula:
    base, negative = plain(a), False
    exponent = b
    while isinstance(exponent, Unary):
        negative ^= exponent.op == "-"
        exponent = exponent.a
    if not (isinstance(exponent, Number) and exponent.value.denominator == 1):
        other = plain(b)
        return lambda values: float(POWER(base(values), other(values)))
    times = int(exponent.value)

    def whole(x: float, n: int) -> float:
        if n < 2:
            return x if n else 1.0
        half = whole(x, n // 2)
        return half * half * x if n % 2 else half * half

    if negative:
        return lambda values: quotient(1.0, whole(base(values), times))
    return lambda values: whole(base(values), times)


def _call(function: str, args: Sequence[Formula]) -> Formula:
    if function in OF_ONE:
        one = OF_ONE[function]
        return lambda values: float(one(args[0](values)))
    if function == "mod":
        return lambda values: _mod(args[0](values), args[1](values))
    if function == "atan2":
        return lambda values: float(ATAN2(args[0](values), args[1](values)))
    return lambda values: {"min": min, "max": max}[function](arg(values) for arg in args)


def _mod(a: float, m: float) -> float:
    return a - m * float(np.floor(quotient(a, m)))


def _condition(node: Node) -> Callable[[Mapping[str, float]], bool]:
    match node:
        case Compare(op, a, b):
            left, right = plain(a), plain(b)
            return {
                "<": lambda values: left(values) < right(values),
                "<=": lambda values: left(values) <= right(values),
                ">": lambda values: left(values) > right(values),
                ">=": lambda values: left(values) >= right(values),
                "==": lambda values: left(values) == right(values),
                "!=": lambda values: left(values) != right(values),
            }[op]
        case Logic(op, args):
            parts = [_condition(arg) for arg in args]
            every = all if op == "and" else any
            return lambda values: every(part(values) for part in parts)
        case Unary("not", a):
            inner = _condition(a)
            return lambda values: not inner(values)
    raise TypeError(node)


class SlowMap:
    """A family whose parameters have values.

    Parameters
    ----------
    family : Family
    values : mapping of str to float
        Parameters that differ from the family's defaults.
    """

    def __init__(self, family: Family, values: Mapping[str, float]) -> None:
        self.names = family.state_names
        plainly = {one.name: float(one.default) for one in family.parameters} | dict(values)
        self.word = [
            plainly
            | {
                name: plainly[entry] if isinstance(entry, str) else float(entry)
                for name, entry in setting.items()
            }
            for setting in family.word()
        ]
        self.bound = float(family.escape)
        self.widths = [float(s.wrap[1]) - float(s.wrap[0]) if s.wrap else 0.0 for s in family.states]
        self._step = [plain(node) for node in family.wrapped_step()]
        self._lift = [plain(node) for node in family.inlined_step()]
        self._jacobian = [[plain(entry) for entry in row] for row in family.jacobian()]
        self._observables = {name: plain(family.inlined_observable(name)) for name in family.observable_names}

    def _values(self, x: State, time: int) -> dict[str, float]:
        return self.word[time % len(self.word)] | dict(zip(self.names, x, strict=True))

    def step(self, x: State, time: int) -> State:
        """Return the state after the one at that time."""
        values = self._values(x, time)
        return tuple(formula(values) for formula in self._step)

    def lift(self, x: State, time: int) -> State:
        """Return the same before periodic variables are brought back."""
        values = self._values(x, time)
        return tuple(formula(values) for formula in self._lift)

    def jacobian(self, x: State, time: int) -> list[list[float]]:
        """Return the derivative of the step at a state."""
        values = self._values(x, time)
        return [[formula(values) for formula in row] for row in self._jacobian]

    def shown(self, name: str, x: State) -> float:
        """Return a state variable or observable."""
        values = self._values(x, 0)
        return self._observables[name](values) if name in self._observables else values[name]

    def distance(self, x: State, y: State) -> float:
        """Return the largest difference of a state variable, the short way round where it is periodic."""
        return max(apart(x[k], y[k], width) for k, width in enumerate(self.widths))


def apart(a: float, b: float, width: float) -> float:
    """Return the difference of two numbers, on a circle of a width unless it is 0."""
    return min(abs(a - b), width - abs(a - b)) if width else abs(a - b)


def exponents_of_cycle(moved: Any, x: State, time: int, steps: int) -> State:
    """Return the Lyapunov exponents of a cycle, largest first: eigenvalues of the exact product, 50 digits.

    Parameters
    ----------
    moved : SlowMap
        Or anything that has its ``step`` and ``jacobian``.
    x : tuple of float
    time, steps : int
        When the state holds, and after how many steps it comes back.
    """
    with mpmath.workdps(50):
        whole = mpmath.eye(len(x))
        for n in range(time, time + steps):
            whole = mpmath.matrix(moved.jacobian(x, n)) * whole
            x = moved.step(x, n)
        values, _ = mpmath.eig(whole)
        sizes = sorted((abs(value) for value in values), reverse=True)
        return tuple(float(mpmath.log(size) / steps) if size > 0 else -math.inf for size in sizes)


def compound(matrix: Sequence[Sequence[float]], order: int) -> list[list[float]]:
    """Return the matrix of the minors of an order."""
    chosen = list(combinations(range(len(matrix)), order))
    return [
        [determinant([[matrix[i][j] for j in columns] for i in rows]) for columns in chosen]
        for rows in chosen
    ]


def determinant(matrix: Sequence[Sequence[float]]) -> float:
    """Return the determinant, expanded along the first row."""
    if len(matrix) == 1:
        return matrix[0][0]
    terms = [
        entry * determinant([[*row[:column], *row[column + 1 :]] for row in matrix[1:]])
        for column, entry in enumerate(matrix[0])
    ]
    return terms[0] - terms[1] if len(terms) == 2 else terms[0] - terms[1] + terms[2]
