"""Formulas as text: the language itself, and the mathematics of figures."""

from __future__ import annotations

from collections.abc import Mapping

from atlas.tree import Binary, Call, Compare, Logic, Name, Node, Number, Pi, Unary, is_condition

_OR, _AND, _NOT, _COMPARE, _SUM, _PRODUCT, _SIGN, _POWER, _ATOM = range(1, 10)
_BINARY = {"+": _SUM, "-": _SUM, "*": _PRODUCT, "/": _PRODUCT, "**": _POWER}


def unparse(node: Node) -> str:
    """Return the text of a formula, with no more brackets than it needs.

    Reading the text back gives the same tree.

    Examples
    --------
    >>> unparse(Binary("*", Name("r"), Binary("-", Name("x"), Name("y"))))
    'r * (x - y)'
    """
    match node:
        case Number(text, _):
            return text
        case Pi():
            return "pi"
        case Name(name):
            return name
        case Unary("not", a):
            return f"not {_bracketed(a, _NOT)}"
        case Unary(op, a):
            return f"{op}{_bracketed(a, _SIGN)}"
        case Binary("**", a, b):
            return f"{_bracketed(a, _ATOM)} ** {_bracketed(b, _SIGN)}"
        case Binary(op, a, b):
            level = _BINARY[op]
            return f"{_bracketed(a, level)} {op} {_bracketed(b, level + 1)}"
        case Compare(op, a, b):
            return f"{_bracketed(a, _SUM)} {op} {_bracketed(b, _SUM)}"
        case Logic(op, args):
            level = _OR if op == "or" else _AND
            return f" {op} ".join(_bracketed(arg, level + 1) for arg in args)
        case Call(function, args):
            return f"{function}({', '.join(map(unparse, args))})"


def _strength(node: Node) -> int:
    match node:
        case Unary("not", _):
            return _NOT
        case Unary():
            return _SIGN
        case Binary(op, _, _):
            return _BINARY[op]
        case Compare():
            return _COMPARE
        case Logic(op, _):
            return _OR if op == "or" else _AND
        case _:
            return _ATOM


def _bracketed(node: Node, level: int) -> str:
    text = unparse(node)
    return text if _strength(node) >= level else f"({text})"


def symbol_mathtext(name: str) -> str:
    raise NotImplementedError


def to_mathtext(node: Node, labels: Mapping[str, str] | None = None) -> str:
    raise NotImplementedError


__all__ = ["is_condition", "symbol_mathtext", "to_mathtext", "unparse"]
