"""Formulas: read from text, checked against bounds, and everything that can be asked of them."""

from __future__ import annotations

import keyword
import re
from collections.abc import Collection

from atlas.errors import FormulaRefused, shown
from atlas.formula.differentiation import derivative
from atlas.formula.evaluation import evaluate, holds
from atlas.formula.formula_text import symbol_mathtext, to_mathtext, unparse
from atlas.formula.grammar import DEEPEST, LONGEST_TEXT, Parser
from atlas.formula.symbolic import from_sympy, to_sympy
from atlas.formula.tree import (
    FUNCTIONS,
    Binary,
    Call,
    Compare,
    Logic,
    Name,
    Node,
    Number,
    Pi,
    Size,
    Unary,
    children,
    free_names,
    is_condition,
    size,
    substitute,
)

__all__ = [
    "FUNCTIONS",
    "IDENTIFIER",
    "LONGEST_TEXT",
    "Binary",
    "Call",
    "Compare",
    "Logic",
    "Name",
    "Node",
    "Number",
    "Pi",
    "Size",
    "Unary",
    "check_powers",
    "children",
    "derivative",
    "evaluate",
    "free_names",
    "from_sympy",
    "holds",
    "is_condition",
    "is_identifier",
    "parse",
    "size",
    "substitute",
    "symbol_mathtext",
    "to_mathtext",
    "to_sympy",
    "unparse",
]

MOST_NODES = 500
LARGEST_EXPONENT = 64
IDENTIFIER = r"[A-Za-z][A-Za-z0-9_]{0,39}"


def is_identifier(text: str) -> bool:
    """Return whether a text can name a state variable, a parameter or a helper.

    Names are letters, digits and underscores, begin with a letter, have at most 40 characters, and are
    neither Python keywords nor functions of the language nor ``pi``.
    """
    return (
        re.fullmatch(IDENTIFIER, text) is not None
        and not keyword.iskeyword(text)
        and text not in FUNCTIONS
        and text != "pi"
    )


def parse(text: str, names: Collection[str], *, where: str = "") -> Node:
    """Read a formula.

    Parameters
    ----------
    text : str
        The formula, at most 2000 characters.
    names : collection of str
        The names it may use.
    where : str
        What a refusal begins with: the file and the key path.

    Returns
    -------
    Node
        A number (not a condition) of at most 500 nodes and 60 levels.

    Raises
    ------
    FormulaRefused
        With one sentence that says where, what was found and what is allowed.

    Examples
    --------
    >>> unparse(parse("r*x*(1-x)", {"r", "x"}))
    'r * x * (1 - x)'
    """
    try:
        node = Parser(text, names).formula()
        measured = size(node)
        if measured.nodes > MOST_NODES:
            raise FormulaRefused(
                f"the formula has {measured.nodes} parts; at most {MOST_NODES} are allowed, use helpers"
            )
        if measured.depth > DEEPEST:
            raise FormulaRefused(
                f"the formula is {measured.depth} levels deep; at most {DEEPEST} are allowed, use helpers"
            )
        check_powers(node)
    except FormulaRefused as problem:
        raise FormulaRefused(f"{where}: {problem}" if where else str(problem)) from None
    return node


def check_powers(node: Node) -> None:
    """Refuse exponents that no arithmetic should be asked for.

    A constant exponent is at most 64 in size; constant exponents of nested powers multiply, and their
    product is at most 64 too.

    Raises
    ------
    FormulaRefused
        With one sentence without its place.
    """
    _power_of(node)


def _power_of(node: Node) -> float:
    below = [_power_of(part) for part in children(node)]
    power = max(below, default=1.0)
    if isinstance(node, Binary) and node.op == "**" and not free_names(node.b):
        exponent = abs(evaluate(node.b, {}))
        if not exponent <= LARGEST_EXPONENT:
            raise FormulaRefused(
                f"the exponent {shown(unparse(node.b))} is too large; "
                f"at most {LARGEST_EXPONENT} in size is allowed"
            )
        power = max(1.0, exponent) * below[0]
        if power > LARGEST_EXPONENT:
            raise FormulaRefused(
                f"nested powers multiply to an exponent of {power:g}; at most {LARGEST_EXPONENT} is allowed"
            )
    return power
