"""Sums and products of formulas without the terms that are 0 and the factors that are 1."""

from __future__ import annotations

from collections.abc import Iterable

from atlas.formula.tree import Binary, Node, Unary, whole

ZERO: Node = whole(0)
ONE: Node = whole(1)


def negative(node: Node) -> Node:
    """Return a formula with the opposite sign."""
    if node == ZERO:
        return node
    return node.a if isinstance(node, Unary) and node.op == "-" else Unary("-", node)


def product(a: Node, b: Node) -> Node:
    """Return the product of two formulas."""
    if ZERO in (a, b):
        return ZERO
    if a == ONE:
        return b
    return a if b == ONE else Binary("*", a, b)


def difference(a: Node, b: Node) -> Node:
    """Return the difference of two formulas."""
    if b == ZERO:
        return a
    return negative(b) if a == ZERO else Binary("-", a, b)


def total(terms: Iterable[Node]) -> Node:
    """Return the sum of formulas; 0 of none."""
    left = [term for term in terms if term != ZERO]
    if not left:
        return ZERO
    found = left[0]
    for term in left[1:]:
        minus = isinstance(term, Unary) and term.op == "-"
        found = difference(found, negative(term)) if minus else Binary("+", found, term)
    return found
