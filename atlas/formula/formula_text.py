"""Formulas as text: the language itself, and the mathematics of figures."""

from __future__ import annotations

import re
from collections.abc import Mapping

from atlas.formula.tree import Binary, Call, Compare, Logic, Name, Node, Number, Pi, Unary

_OR, _AND, _NOT, _COMPARE, _SUM, _PRODUCT, _SIGN, _POWER, _ATOM = range(1, 10)
_RELATIONS = {"<": "<", "<=": r"\leq", ">": ">", ">=": r"\geq", "==": "=", "!=": r"\neq"}
_NAMED = {"log": r"\ln", "sign": r"\mathrm{sgn}"} | {
    name: rf"\{name}" for name in ("sin", "cos", "tan", "tanh", "min", "max")
}
_AROUND = {
    "exp": ("e^{", "}"),
    "sqrt": (r"\sqrt{", "}"),
    "abs": (r"\left|", r"\right|"),
    "floor": (r"\left\lfloor ", r"\right\rfloor "),
}
_GREEK = re.compile(
    "alpha|beta|[gG]amma|[dD]elta|epsilon|zeta|eta|[tT]heta|iota|kappa|[lL]ambda|mu|nu|[xX]i|pi|rho"
    "|[sS]igma|tau|[uU]psilon|[pP]hi|chi|[pP]si|[oO]mega"
)
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
    r"""Return a name as mathematics: letters italic, Greek ones as such, digits and tails as subscripts.

    Examples
    --------
    >>> symbol_mathtext("alpha"), symbol_mathtext("x1"), symbol_mathtext("growth_rate")
    ('\\alpha', 'x_{1}', '\\mathrm{growth}_{\\mathrm{rate}}')
    """
    head, *tails = [part for part in name.split("_") if part] or [name]
    letters = head.rstrip("0123456789")
    if letters and letters != head:
        tails.insert(0, head[len(letters) :])
        head = letters
    symbol = _upright(head)
    return f"{symbol}_{{{','.join(map(_upright, tails))}}}" if tails else symbol


def _upright(word: str) -> str:
    if _GREEK.fullmatch(word):
        return f"\\{word}"
    return word if len(word) == 1 or word.isdigit() else f"\\mathrm{{{word}}}"


def to_mathtext(node: Node, labels: Mapping[str, str] | None = None) -> str:
    r"""Return a formula as mathematics for a figure, without the dollar signs around it.

    Parameters
    ----------
    node : Node
        The formula.
    labels : mapping of str to str, optional
        The mathematics of names; others are written by :func:`symbol_mathtext`.

    Returns
    -------
    str
        In the part of TeX's notation that matplotlib sets.

    Examples
    --------
    >>> to_mathtext(Binary("/", Name("x"), Binary("+", Name("a"), Name("x"))))
    '\\frac{x}{a + x}'
    """
    return _Mathematics(labels or {}).text(node)


class _Mathematics:
    def __init__(self, labels: Mapping[str, str]) -> None:
        self.labels = labels

    def text(self, node: Node) -> str:
        match node:
            case Number(text, _):
                return _number_mathtext(text)
            case Pi():
                return r"\pi"
            case Name(name):
                return self.labels.get(name) or symbol_mathtext(name)
            case Unary("not", a):
                return rf"\mathrm{{not}}\ {self.within(a, _NOT)}"
            case Unary(op, a):
                return f"{op}{self.within(a, _SIGN)}"
            case Binary(op, a, b):
                return self.joined(op, a, b)
            case Compare(op, a, b):
                return f"{self.within(a, _SUM)} {_RELATIONS[op]} {self.within(b, _SUM)}"
            case Logic(op, args):
                level = _strength(node) + 1
                return rf"\ \mathrm{{{op}}}\ ".join(self.within(arg, level) for arg in args)
            case Call(function, args):
                return self.called(function, args)

    def joined(self, op: str, a: Node, b: Node) -> str:
        if op == "/":
            return rf"\frac{{{self.text(a)}}}{{{self.text(b)}}}"
        if op == "**":
            return f"{{{self.base(a)}}}^{{{self.text(b)}}}"
        if op != "*":
            return (
                f"{self.within(a, _SUM)} {op} {self.within(b, _POWER if isinstance(b, Unary) else _PRODUCT)}"
            )
        left, right = self.within(a, _PRODUCT), self.within(b, _SIGN if isinstance(b, Binary) else _POWER)
        return rf"{left} \cdot {right}" if right[0].isdigit() else rf"{left}\,{right}"

    def base(self, node: Node) -> str:
        is_plain = isinstance(node, Number | Pi | Name) and "^" not in self.text(node)
        return self.text(node) if is_plain else f"({self.text(node)})"

    def called(self, function: str, args: tuple[Node, ...]) -> str:
        texts = [self.text(arg) for arg in args]
        if function in _AROUND:
            before, after = _AROUND[function]
            return f"{before}{texts[0]}{after}"
        name = _NAMED.get(function, rf"\mathrm{{{function}}}")
        listed = r",\ ".join(texts)
        return f"{name}({listed})"

    def within(self, node: Node, level: int) -> str:
        text = self.text(node)
        is_fraction = isinstance(node, Binary) and node.op == "/"
        return text if is_fraction or _strength(node) >= level else f"({text})"


def _number_mathtext(text: str) -> str:
    digits, _, exponent = text.lower().partition("e")
    if not exponent:
        return digits
    power = f"10^{{{int(exponent)}}}"
    return power if digits == "1" else rf"{digits} \times {power}"
