"""The checked tree of a formula: its nodes, and what can be asked of them without arithmetic."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from fractions import Fraction
from typing import NamedTuple, TypeAlias

from atlas.errors import FormulaRefused
from tiles.number import fraction_text

LONGEST_DECIMAL = 40
MOST_BITS = 1023
FUNCTIONS: Mapping[str, tuple[int, int | None]] = {
    "exp": (1, 1),
    "log": (1, 1),
    "sqrt": (1, 1),
    "sin": (1, 1),
    "cos": (1, 1),
    "tan": (1, 1),
    "tanh": (1, 1),
    "atan2": (2, 2),
    "abs": (1, 1),
    "min": (2, None),
    "max": (2, None),
    "floor": (1, 1),
    "mod": (2, 2),
    "sign": (1, 1),
    "where": (3, 3),
}
"""Every function of the language with its least and greatest number of arguments."""


@dataclass(frozen=True, slots=True)
class Number:
    """A decimal literal, kept exactly; two literals of equal value are equal whatever their text.

    Attributes
    ----------
    text : str
        As it was written; always a text that the parser reads back.
    value : Fraction
        Never negative: a sign is a :class:`Unary` around the number.
    """

    text: str = field(compare=False)
    value: Fraction


@dataclass(frozen=True, slots=True)
class Pi:
    """The constant pi."""


@dataclass(frozen=True, slots=True)
class Name:
    """A state variable, a parameter or a helper."""

    name: str


@dataclass(frozen=True, slots=True)
class Unary:
    """A sign (``-``, ``+``) before a number, or ``not`` before a condition."""

    op: str
    a: Node


@dataclass(frozen=True, slots=True)
class Binary:
    """Two numbers joined by ``+``, ``-``, ``*``, ``/`` or ``**``."""

    op: str
    a: Node
    b: Node


@dataclass(frozen=True, slots=True)
class Compare:
    """The condition that two numbers stand in the order ``<``, ``<=``, ``>``, ``>=``, ``==`` or ``!=``."""

    op: str
    a: Node
    b: Node


@dataclass(frozen=True, slots=True)
class Logic:
    """Two or more conditions joined by ``and`` or by ``or``."""

    op: str
    args: tuple[Node, ...]


@dataclass(frozen=True, slots=True)
class Call:
    """A function of :data:`FUNCTIONS` with its arguments; the first of ``where`` is a condition."""

    function: str
    args: tuple[Node, ...]


Node: TypeAlias = Number | Pi | Name | Unary | Binary | Compare | Logic | Call


class Size(NamedTuple):
    """How large a tree is.

    Attributes
    ----------
    nodes, depth : int
        Number of nodes, and of nodes on the longest way from the root to a leaf.
    """

    nodes: int
    depth: int


def children(node: Node) -> tuple[Node, ...]:
    """Return the nodes directly below one."""
    match node:
        case Unary(_, a):
            return (a,)
        case Binary(_, a, b) | Compare(_, a, b):
            return (a, b)
        case Logic(_, args) | Call(_, args):
            return args
        case _:
            return ()


def rebuilt(node: Node, parts: tuple[Node, ...]) -> Node:
    """Return a node of the same kind above other children, given in the order of :func:`children`."""
    match node:
        case Unary(op, _):
            return Unary(op, *parts)
        case Binary(op, _, _):
            return Binary(op, *parts)
        case Compare(op, _, _):
            return Compare(op, *parts)
        case Logic(op, _):
            return Logic(op, parts)
        case Call(function, _):
            return Call(function, parts)
        case _:
            return node


def is_condition(node: Node) -> bool:
    """Return whether a node is true or false rather than a number."""
    return isinstance(node, Compare | Logic) or (isinstance(node, Unary) and node.op == "not")


def free_names(node: Node) -> frozenset[str]:
    """Return every name that occurs in a formula."""
    if isinstance(node, Name):
        return frozenset((node.name,))
    return frozenset[str]().union(*map(free_names, children(node)))


def substitute(node: Node, mapping: Mapping[str, Node]) -> Node:
    """Return the formula with names replaced by formulas, all at once.

    Parameters
    ----------
    node : Node
        The formula.
    mapping : mapping of str to Node
        What stands in for each name; names that are not in it stay.

    Returns
    -------
    Node
    """
    if isinstance(node, Name):
        return mapping.get(node.name, node)
    parts = children(node)
    return rebuilt(node, tuple(substitute(part, mapping) for part in parts)) if parts else node


def size(node: Node, names: Mapping[str, Size] | None = None) -> Size:
    """Return how large a formula is, or would be with names replaced by formulas of given sizes."""
    if isinstance(node, Name) and names and node.name in names:
        return names[node.name]
    below = [size(part, names) for part in children(node)]
    return Size(
        1 + sum(part.nodes for part in below),
        1 + max((part.depth for part in below), default=0),
    )


def whole(value: int) -> Number:
    """Return a whole number from 0 up as a literal."""
    return Number(str(value), Fraction(value))


def rational(value: Fraction) -> Node:
    """Return a rational as a literal where a short decimal holds it, else as a quotient of literals.

    Raises
    ------
    FormulaRefused
        When numerator or denominator is beyond float64.
    """
    if value < 0:
        return Unary("-", rational(-value))
    if max(value.numerator.bit_length(), value.denominator.bit_length()) > MOST_BITS:
        raise FormulaRefused("a constant is beyond float64; write the formula with smaller numbers or powers")
    text = fraction_text(value)
    if "/" in text or (len(text) > LONGEST_DECIMAL and value.denominator != 1):
        return Binary("/", whole(value.numerator), whole(value.denominator))
    return Number(text, value)
