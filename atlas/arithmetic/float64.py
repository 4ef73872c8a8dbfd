"""The float64 back end: formula trees become straight-line source over float64 lanes."""

from __future__ import annotations

from collections.abc import Iterable, Mapping

from atlas.formula.tree import (
    Binary,
    Call,
    Compare,
    Logic,
    Name,
    Node,
    Number,
    Pi,
    Unary,
    children,
    free_names,
    is_condition,
    rebuilt,
)
from tiles.number import float_of

POLYNOMIALS = ("exp", "log", "sin", "cos", "tan", "tanh", "atan2", "power")
"""What generated source imports from :mod:`atlas.arithmetic.functions`."""


class StraightLine:
    """Writes formula trees as one assignment a line; equal subtrees are computed once.

    Parameters
    ----------
    names : mapping of str to str
        The identifier in the source that stands for each name in the trees.

    Attributes
    ----------
    lines : list of str
        The assignments so far.
    slow_calls : int
        How many of them call a polynomial function; decides how far a loop is unrolled.
    """

    def __init__(self, names: Mapping[str, str]) -> None:
        self.names = names
        self.lines: list[str] = []
        self.slow_calls = 0
        self._known: dict[Node, str] = {}

    def value(self, node: Node) -> str:
        """Return the identifier or literal that holds a tree's value, after writing what it needs."""
        if node not in self._known:
            self._known[node] = self._write(node)
        return self._known[node]

    def _write(self, node: Node) -> str:
        match node:
            case Number():
                return repr(float_of(node.value))
            case Pi():
                return "3.141592653589793"
            case Name():
                return self.names[node.name]
            case Unary(op="not"):
                return self._assign(f"not {self.value(node.a)}")
            case Unary():
                return self._assign(f"{node.op}{self.value(node.a)}")
            case Binary(op="**"):
                return self._power(node)
            case Binary() | Compare():
                return self._assign(f"{self.value(node.a)} {node.op} {self.value(node.b)}")
            case Logic():
                sign = " & " if node.op == "and" else " | "
                return self._assign(sign.join(self.value(part) for part in node.args))
            case Call():
                return self._call(node)
        raise AssertionError(f"no source for {node!r}")

    def _assign(self, source: str) -> str:
        name = f"t{len(self.lines)}"
        self.lines.append(f"{name} = {source}")
        return name

    def _power(self, node: Binary) -> str:
        base, exponent = node.a, node.b
        sign = 1
        while isinstance(exponent, Unary) and exponent.op in "+-":
            sign = -sign if exponent.op == "-" else sign
            exponent = exponent.a
        if isinstance(exponent, Number) and exponent.value.denominator == 1:
            whole = self._whole_power(self.value(base), int(exponent.value))
            return whole if sign > 0 else self._assign(f"1.0 / {whole}")
        self.slow_calls += 2
        return self._assign(f"power({self.value(base)}, {self.value(node.b)})")

    def _whole_power(self, base: str, exponent: int) -> str:
        if exponent == 0:
            return "1.0"
        if exponent == 1:
            return base
        half = self._whole_power(base, exponent // 2)
        square = self._assign(f"{half} * {half}")
        return self._assign(f"{square} * {base}") if exponent % 2 else square

    def _call(self, node: Call) -> str:
        values = [self.value(argument) for argument in node.args]
        function = node.function
        if function in POLYNOMIALS:
            self.slow_calls += 1
            return self._assign(f"{function}({', '.join(values)})")
        if function == "where":
            return self._assign(f"{values[1]} if {values[0]} else {values[2]}")
        if function == "mod":
            ratio = self._assign(f"np.floor({values[0]} / {values[1]})")
            product = self._assign(f"{values[1]} * {ratio}")
            return self._assign(f"{values[0]} - {product}")
        if function == "sign":
            rest = f"-1.0 if {values[0]} < 0.0 else {values[0]} + 0.0"
            return self._assign(f"1.0 if {values[0]} > 0.0 else ({rest})")
        if function in ("min", "max"):
            sign = "<" if function == "min" else ">"
            best = values[0]
            for other in values[1:]:
                best = self._assign(f"{other} if {other} {sign} {best} else {best}")
            return best
        prefix = {"sqrt": "np.sqrt", "floor": "np.floor", "abs": "abs"}[function]
        return self._assign(f"{prefix}({values[0]})")


def hoist(trees: Iterable[Node], states: Iterable[str]) -> tuple[list[Node], list[Node]]:
    """Take numbers that depend on parameters alone out of trees, to be computed once per parameter value.

    Parameters
    ----------
    trees : iterable of Node
        Formulas of state variables and parameters, helpers already written out.
    states : iterable of str
        Names of the state variables.

    Returns
    -------
    trees : list of Node
        The trees with names ``coefficient 0``, ``coefficient 1`` … in place of what was taken out.
    coefficients : list of Node
        What these names stand for, in order.
    """
    moving = frozenset(states)
    coefficients: dict[Node, Name] = {}

    def visit(node: Node) -> Node:
        names = free_names(node)
        if not names:
            return node
        if not names & moving and not is_condition(node):
            return coefficients.setdefault(node, Name(f"coefficient {len(coefficients)}"))
        return rebuilt(node, tuple(visit(part) for part in children(node)))

    return [visit(tree) for tree in trees], list(coefficients)
