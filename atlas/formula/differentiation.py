"""Exact derivatives of formulas, through sympy; symbols are built from the checked tree alone."""

from __future__ import annotations

from typing import Any

from atlas.formula.algebra import ONE, ZERO, difference, negative, product
from atlas.formula.symbolic import from_sympy, gathered, symbol, to_sympy
from atlas.formula.tree import Binary, Call, Compare, Name, Node, Number, Unary, free_names, whole

_SMOOTH = ("exp", "log", "sqrt", "sin", "cos", "tan", "tanh")
_PLAIN = 1000


def derivative(node: Node, name: str) -> Node:
    """Return the partial derivative of a formula, exact, as a formula.

    Smooth parts are differentiated by sympy. ``abs``, ``min``, ``max`` and ``where`` are differentiated
    branch by branch, and where branches meet the one that the formula itself takes counts; ``floor`` and
    ``sign`` have derivative 0, ``mod(a, m)`` that of ``a - m * floor(a / m)`` with the floor held fast.

    Parameters
    ----------
    node : Node
        A formula that is a number.
    name : str
        The name to differentiate with respect to.

    Returns
    -------
    Node

    Raises
    ------
    FormulaRefused
        When the derivative is no real number anywhere, as that of ``x / (y - y)``.

    Examples
    --------
    >>> from atlas.formula.formula_text import unparse
    >>> unparse(derivative(Call("sin", (Name("x"),)), "x"))
    'cos(x)'
    """
    if isinstance(node, Name):
        return ONE if node.name == name else ZERO
    if name not in free_names(node):
        return ZERO
    if isinstance(node, Call) and node.function not in _SMOOTH:
        return _of_branches(node, name)
    return _Smooth(name).derivative(node)


class _Smooth:
    """Hands a formula to sympy with a symbol in place of each part that sympy must leave alone.

    Those parts are what does not depend on the variable (so that no constant is ever worked out) and
    the functions that are not smooth; the derivative of the latter enters by the chain rule.
    """

    def __init__(self, name: str) -> None:
        self.name = name
        self.symbols: dict[Node, Any] = {}

    def derivative(self, node: Node) -> Node:
        expression = to_sympy(node, self.keep)
        total = expression.diff(symbol(self.name))
        for part, stand_in in list(self.symbols.items()):
            rate = derivative(part, self.name)
            if rate != ZERO:
                total += expression.diff(stand_in) * to_sympy(rate, self.keep)
        parts = {stand_in: part for part, stand_in in self.symbols.items()}
        return from_sympy(gathered(total), parts)

    def keep(self, node: Node) -> Any:
        """Return the symbol that stands for a part, or None where sympy may look inside."""
        match node:
            case Name() | Unary("-" | "+", _):
                return None
            case Number(_, value) if 0 < value.numerator <= _PLAIN and value.denominator <= _PLAIN:
                return None
            case Call(function, _) if function not in _SMOOTH:
                return self.stand_in(node)
            case _ if self.name not in free_names(node):
                return self.stand_in(node)
            case _:
                return None

    def stand_in(self, node: Node) -> Any:
        if node not in self.symbols:
            self.symbols[node] = symbol(f"_{len(self.symbols)}")
        return self.symbols[node]


def _of_branches(node: Call, name: str) -> Node:
    args = node.args
    match node.function:
        case "where":
            return _where(args[0], derivative(args[1], name), derivative(args[2], name))
        case "abs":
            slope = Call("where", (Compare("<", args[0], ZERO), negative(ONE), ONE))
            return product(slope, derivative(args[0], name))
        case "min" | "max":
            return _of_extreme(node, name)
        case "mod":
            rate, modulus = derivative(args[0], name), derivative(args[1], name)
            held = Call("floor", (Binary("/", args[0], args[1]),))
            return difference(rate, product(held, modulus))
        case "atan2":
            up, across = args
            turning = difference(product(across, derivative(up, name)), product(up, derivative(across, name)))
            radius = Binary("+", Binary("**", across, whole(2)), Binary("**", up, whole(2)))
            return ZERO if turning == ZERO else Binary("/", turning, radius)
        case _:
            return ZERO


def _of_extreme(node: Call, name: str) -> Node:
    order = "<" if node.function == "min" else ">"
    rate = derivative(node.args[0], name)
    for count in range(1, len(node.args)):
        before = node.args[0] if count == 1 else Call(node.function, node.args[:count])
        taken = node.args[count]
        rate = _where(Compare(order, taken, before), derivative(taken, name), rate)
    return rate


def _where(condition: Node, a: Node, b: Node) -> Node:
    return a if a == b else Call("where", (condition, a, b))
