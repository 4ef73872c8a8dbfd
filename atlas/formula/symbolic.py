"""The bridge between checked trees and sympy; the only module that imports sympy, when first asked."""

from __future__ import annotations

import operator
from collections.abc import Callable, Mapping
from fractions import Fraction
from typing import Any

from atlas.errors import FormulaRefused, shown
from atlas.formula.tree import Binary, Call, Compare, Logic, Name, Node, Number, Pi, Unary, rational, whole

_SAME = ("exp", "log", "sqrt", "sin", "cos", "tan", "tanh", "atan2", "floor", "sign")
_RENAMED = {"abs": "Abs", "min": "Min", "max": "Max", "mod": "Mod"}
_OURS = {**{name: name for name in _SAME}, **{name: ours for ours, name in _RENAMED.items()}}
_RELATIONS = {"<": "Lt", "<=": "Le", ">": "Gt", ">=": "Ge", "==": "Eq", "!=": "Ne"}
_LARGEST_POWER = 64
_NOT_REAL = "the formula divides by something that is always 0, or leaves the real numbers; rewrite that part"
_OPERATORS: Mapping[str, Callable[[Any, Any], Any]] = {
    "+": operator.add,
    "-": operator.sub,
    "*": operator.mul,
    "/": operator.truediv,
    "**": operator.pow,
}


def to_sympy(node: Node, keep: Callable[[Node], Any] | None = None) -> Any:
    """Return a formula as a sympy expression over real symbols, with exact rationals for literals.

    Parameters
    ----------
    node : Node
        A number or a condition.
    keep : callable, optional
        Asked for every node below which sympy should not look: returns the symbol that stands for it,
        or None to go on.

    Returns
    -------
    sympy.Basic

    Raises
    ------
    FormulaRefused
        When the formula divides by what is 0 identically, or is imaginary.
    """
    import sympy

    try:
        expression = _to_sympy(node, keep or (lambda _: None))
    except (TypeError, ValueError, ZeroDivisionError):  # comparisons of what sympy knows not to be real
        expression = sympy.nan
    if expression.has(sympy.zoo, sympy.oo, -sympy.oo, sympy.nan, sympy.I):
        raise FormulaRefused(_NOT_REAL)
    return expression


def _to_sympy(node: Node, keep: Callable[[Node], Any]) -> Any:
    import sympy

    kept = keep(node)
    if kept is not None:
        return kept
    match node:
        case Number(_, value):
            return sympy.Rational(value.numerator, value.denominator)
        case Pi():
            return sympy.pi
        case Name(name):
            return symbol(name)
        case Unary(op, a):
            inner = _to_sympy(a, keep)
            return {"-": operator.neg, "+": operator.pos, "not": sympy.Not}[op](inner)
        case Binary(op, a, b):
            return _OPERATORS[op](_to_sympy(a, keep), _to_sympy(b, keep))
        case Compare(op, a, b):
            return getattr(sympy, _RELATIONS[op])(_to_sympy(a, keep), _to_sympy(b, keep))
        case Logic(op, args):
            return getattr(sympy, op.title())(*(_to_sympy(arg, keep) for arg in args))
        case Call("where", (condition, a, b)):
            first = (_to_sympy(a, keep), _to_sympy(condition, keep))
            return sympy.Piecewise(first, (_to_sympy(b, keep), True))
        case Call(function, args):
            return getattr(sympy, _RENAMED.get(function, function))(*(_to_sympy(arg, keep) for arg in args))


def symbol(name: str) -> Any:
    """Return the real sympy symbol of a name."""
    import sympy

    return sympy.Symbol(name, real=True)


def gathered(expression: Any) -> Any:
    """Return a sympy expression with the powers of equal bases joined."""
    import sympy

    return sympy.powsimp(expression, combine="exp")


def from_sympy(expression: Any, parts: Mapping[Any, Node] | None = None) -> Node:
    """Return a sympy expression as a formula.

    Parameters
    ----------
    expression : sympy.Basic
        Built from what :func:`to_sympy` produces, and what sympy makes of it.
    parts : mapping of sympy.Symbol to Node, optional
        The formulas that symbols stand for; other symbols become names.

    Returns
    -------
    Node

    Raises
    ------
    FormulaRefused
        For floats, infinities, imaginary numbers and functions outside the language.
    """
    return _Reader(parts or {}).node(expression)


class _Reader:
    """Reads sympy expressions; equal subexpressions become one node."""

    def __init__(self, parts: Mapping[Any, Node]) -> None:
        self.known: dict[Any, Node] = dict(parts)

    def node(self, expression: Any) -> Node:
        if expression not in self.known:
            self.known[expression] = self.read(expression)
        return self.known[expression]

    def read(self, expression: Any) -> Node:
        import sympy

        if expression.is_Symbol:
            return Name(expression.name)
        if expression.is_Rational:
            return rational(Fraction(int(expression.p), int(expression.q)))
        if expression in (sympy.I, sympy.nan, sympy.zoo, sympy.oo, -sympy.oo):
            raise FormulaRefused(_NOT_REAL)
        if expression is sympy.pi:
            return Pi()
        if expression is sympy.E:
            return Call("exp", (whole(1),))
        if expression in (sympy.true, sympy.false):
            return Compare("==" if expression else "!=", whole(0), whole(0))
        if expression.is_Add:
            return self.sum(expression)
        if expression.is_Mul:
            return self.product(expression)
        if expression.is_Pow:
            return self.power(*expression.as_base_exp())
        if expression.is_Relational:
            return Compare(expression.rel_op, self.node(expression.lhs), self.node(expression.rhs))
        return self.function(expression)

    def function(self, expression: Any) -> Node:
        import sympy

        kind = type(expression).__name__
        if isinstance(expression, sympy.Piecewise):
            return self.branches(expression)
        if kind in ("And", "Or"):
            args = sorted(expression.args, key=sympy.default_sort_key)
            return Logic(kind.lower(), tuple(map(self.node, args)))
        if kind == "atan":
            return Call("atan2", (self.node(expression.args[0]), whole(1)))
        if kind == "Not":
            return Unary("not", self.node(expression.args[0]))
        if kind not in _OURS:
            raise FormulaRefused(f"{shown(str(expression))} has no place in the formula language")
        args = expression.args
        if kind in ("Min", "Max"):
            args = sorted(args, key=sympy.default_sort_key)
        return Call(_OURS[kind], tuple(map(self.node, args)))

    def branches(self, expression: Any) -> Node:
        import sympy

        *pairs, (last, otherwise) = expression.args
        if otherwise is not sympy.true:
            raise FormulaRefused(f"{shown(str(expression))} is not defined everywhere")
        node = self.node(last)
        for value, condition in reversed(pairs):
            node = Call("where", (self.node(condition), self.node(value), node))
        return node

    def sum(self, expression: Any) -> Node:
        terms = expression.as_ordered_terms()
        signed = [(term, _is_negative(term)) for term in terms]
        lead = next((index for index, (_, negative) in enumerate(signed) if not negative), 0)
        signed.insert(0, signed.pop(lead))
        total = self.node(signed[0][0])
        for term, negative in signed[1:]:
            total = Binary("-" if negative else "+", total, self.node(-term if negative else term))
        return total

    def product(self, expression: Any) -> Node:
        coefficient, rest = expression.as_coeff_Mul()
        if not coefficient.is_Rational:
            raise FormulaRefused(f"{shown(str(expression))} has no place in the formula language")
        value = Fraction(int(coefficient.p), int(coefficient.q))
        above: list[Node] = []
        below: list[Node] = []
        for factor in rest.as_ordered_factors():
            base, exponent = factor.as_base_exp() if factor.is_Pow else (factor, None)
            if exponent is not None and _is_negative(exponent):
                below.append(self.power(base, -exponent))
            else:
                above.append(self.node(factor))
        size = rational(abs(value))
        if size != whole(1):
            if isinstance(size, Binary):
                below.insert(0, size.b)
                size = size.a
            if size != whole(1) or not above:
                above.insert(0, size)
        node = _times(above)
        if below:
            node = Binary("/", node, _times(below))
        return Unary("-", node) if value < 0 else node

    def power(self, base: Any, exponent: Any) -> Node:
        import sympy

        if base is sympy.E:
            return Call("exp", (self.node(exponent),))
        if _is_negative(exponent):
            return Binary("/", whole(1), self.power(base, -exponent))
        if exponent == 1:
            return self.node(base)
        if exponent == sympy.S.Half:
            return Call("sqrt", (self.node(base),))
        if not exponent.is_Integer or exponent <= _LARGEST_POWER:
            return Binary("**", self.node(base), self.node(exponent))
        count, rest = divmod(int(exponent), _LARGEST_POWER)
        factors = [self.power(base, sympy.Integer(_LARGEST_POWER))] * count
        return _times(factors + [self.power(base, sympy.Integer(rest))] * (rest > 0))


def _times(factors: list[Node]) -> Node:
    product = factors[0] if factors else whole(1)
    for factor in factors[1:]:
        product = Binary("*", product, factor)
    return product


def _is_negative(expression: Any) -> bool:
    """Return whether an expression is written with a minus sign, every term of it if it is a sum."""
    if expression.is_Add:
        return all(_is_negative(term) for term in expression.args)
    coefficient = expression.as_coeff_Mul()[0]
    return bool(coefficient.is_Rational and coefficient < 0)
