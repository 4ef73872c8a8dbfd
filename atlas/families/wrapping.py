"""Bringing the step of a periodic variable back into its interval."""

from __future__ import annotations

from fractions import Fraction

from atlas.formula.expression import Binary, Call, Node, Pi, Unary
from atlas.formula.tree import rational
from tiles.number import Exact


def wrapped(node: Node, interval: tuple[Exact, Exact]) -> Node:
    """Return ``low + mod(node - low, high - low)``, simply ``mod(node, high)`` where low is 0.

    Parameters
    ----------
    node : Node
        The next value of the variable.
    interval : pair of Exact
        Its interval [low, high).

    Returns
    -------
    Node
    """
    low, high = interval
    if low.value == 0:
        return Call("mod", (node, number_node(high)))
    width = Call("mod", (_moved(node, low), _difference(high, low)))
    return Binary("+", number_node(low), width)


def number_node(number: Exact) -> Node:
    """Return an exact number as a formula; a multiple of pi as ``p * pi / q``."""
    if not number.of_pi:
        return rational(number.value)
    if number.value < 0:
        return Unary("-", number_node(Exact(-number.value, of_pi=True)))
    top, bottom = number.value.numerator, number.value.denominator
    multiple: Node = Pi() if top == 1 else Binary("*", rational(Fraction(top)), Pi())
    return multiple if bottom == 1 else Binary("/", multiple, rational(Fraction(bottom)))


def _moved(node: Node, low: Exact) -> Node:
    if low.value < 0:
        return Binary("+", node, number_node(Exact(-low.value, low.of_pi)))
    return Binary("-", node, number_node(low))


def _difference(high: Exact, low: Exact) -> Node:
    if high.of_pi == low.of_pi or high.value == 0:
        return number_node(Exact(high.value - low.value, low.of_pi))
    return _moved(number_node(high), low)
