"""The closed grammar: a formula's tokens and its operator-precedence parser, with a position for each fault.

The grammar, weakest first; every level joins to the left, but ``**`` to the right as in Python::

    condition or condition     condition and condition     not condition
    number < number            (also <= > >= == !=, and chains such as 0 < x <= 1)
    number + number  number - number
    number * number  number / number
    - number  + number
    number ** number
    literal   pi   name   function(number, ...)   where(condition, number, number)   ( ... )
"""

from __future__ import annotations

import re
from collections.abc import Collection
from fractions import Fraction
from typing import NamedTuple, NoReturn

from atlas.errors import FormulaRefused, shown
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
    Unary,
    is_condition,
)
from tiles.errors import nearest
from tiles.number import float_of

LONGEST_TEXT = 2000
LONGEST_LITERAL = 100
DEEPEST = 60

_TOKEN = re.compile(
    r"(?P<number>(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?)|(?P<word>[A-Za-z_][A-Za-z0-9_]*)"
    r"|(?P<sign>\*\*|//|<=|>=|==|!=|[-+*/<>(),])"
)
_SPACE = re.compile(r"[ \t\r\n]*")
_COMPARISONS = ("<", "<=", ">", ">=", "==", "!=")
_OR, _AND, _NOT, _COMPARE, _SUM, _PRODUCT, _SIGN, _POWER = range(1, 9)
_STRENGTH = {"or": _OR, "and": _AND, **dict.fromkeys(_COMPARISONS, _COMPARE)}
_STRENGTH |= {"+": _SUM, "-": _SUM, "*": _PRODUCT, "/": _PRODUCT, "**": _POWER}
_REMEDIES = {
    "^": "write ** for a power",
    "%": "write mod(a, m)",
    "//": "write floor(a / b)",
    "=": "write == to compare",
    "&": "write and",
    "|": "write or, or abs(...)",
    "!": "write not",
    "if": "write where(condition, a, b)",
    "else": "write where(condition, a, b)",
}


class _Token(NamedTuple):
    kind: str
    text: str
    at: int


class Parser:
    """One pass over the tokens of a formula, by operator precedence."""

    def __init__(self, text: str, names: Collection[str]) -> None:
        self.names = frozenset(names)
        self.tokens = _tokens(text)
        self.next = 0
        self.nesting = 0

    def formula(self) -> Node:
        node = self.number(_OR)
        if self.here.kind != "end":
            self.unexpected()
        return node

    @property
    def here(self) -> _Token:
        return self.tokens[self.next]

    def take(self) -> _Token:
        self.next += 1
        return self.tokens[self.next - 1]

    def unexpected(self) -> NoReturn:
        token = self.here
        if token.kind == "end":
            raise FormulaRefused("the formula ends too early; a number, a name or a bracket is missing")
        remedy = f"; {_REMEDIES[token.text]}" if token.text in _REMEDIES else ""
        if token.kind in ("number", "word") and token.text not in ("and", "or", "not") and not remedy:
            remedy = "; an operator such as * is missing before it, or a comma or bracket too much"
        _refuse(token, f"{shown(token.text)} is not expected", remedy)

    def number(self, level: int) -> Node:
        at = self.here
        node = self.expression(level)
        if is_condition(node):
            _refuse(at, "a condition stands where a number is expected", "; write where(condition, a, b)")
        return node

    def condition(self, level: int) -> Node:
        at = self.here
        node = self.expression(level)
        if not is_condition(node):
            _refuse(at, "a number stands where a condition such as x > 0 is expected")
        return node

    def expression(self, level: int) -> Node:
        self.nesting += 1
        if self.nesting > DEEPEST:
            _refuse(self.here, f"the formula is nested deeper than {DEEPEST} levels", "; use helpers")
        at = self.here
        left = self.prefix()
        while _STRENGTH.get(self.here.text, 0) >= level:
            left = self.joined(at, left, self.take())
        self.nesting -= 1
        return left

    def joined(self, at: _Token, left: Node, sign: _Token) -> Node:
        strength = _STRENGTH[sign.text]
        if strength in (_OR, _AND):
            if not is_condition(left):
                _refuse(
                    at, f"a number stands before '{sign.text}'", "; a condition such as x > 0 is expected"
                )
            args = [left, self.condition(strength + 1)]
            while self.here.text == sign.text:
                self.take()
                args.append(self.condition(strength + 1))
            return Logic(sign.text, tuple(args))
        if is_condition(left):
            _refuse(sign, f"a condition stands before '{sign.text}'", "; a number is expected")
        if strength == _COMPARE:
            return self.comparison(left, sign)
        return Binary(sign.text, left, self.number(_SIGN if strength == _POWER else strength + 1))

    def comparison(self, left: Node, sign: _Token) -> Node:
        links: list[Node] = []
        right = self.number(_SUM)
        links.append(Compare(sign.text, left, right))
        while self.here.text in _COMPARISONS:
            sign, left = self.take(), right
            right = self.number(_SUM)
            links.append(Compare(sign.text, left, right))
        return links[0] if len(links) == 1 else Logic("and", tuple(links))

    def prefix(self) -> Node:
        token = self.here
        if token.text in ("-", "+"):
            self.take()
            return Unary(token.text, self.number(_SIGN))
        if token.text == "not":
            self.take()
            return Unary("not", self.condition(_NOT))
        if token.text == "(":
            self.take()
            node = self.expression(_OR)
            self.closing(token)
            return node
        if token.kind == "number":
            return _literal(self.take())
        if token.kind == "word" and token.text not in ("and", "or"):
            return self.word(self.take())
        self.unexpected()

    def closing(self, opened: _Token) -> None:
        if self.here.kind == "end":
            _refuse(opened, "the bracket is not closed", "; a ')' is missing")
        if self.here.text != ")":
            self.unexpected()
        self.take()

    def word(self, token: _Token) -> Node:
        called = self.here.text == "("
        if token.text in FUNCTIONS:
            if not called:
                _refuse(token, f"the function {token.text} needs its arguments in brackets")
            return self.call(token)
        known = token.text in self.names or token.text == "pi"
        if called:
            remedy = "; write * to multiply" if known else nearest(token.text, FUNCTIONS)
            _refuse(token, f"{shown(token.text)} is not a function", remedy)
        if not known:
            hint = nearest(token.text, {*self.names, *FUNCTIONS, "pi"})
            hint = f"; {_REMEDIES[token.text]}" if token.text in _REMEDIES else hint
            _refuse(token, f"the name {shown(token.text)} is unknown", hint)
        return Pi() if token.text == "pi" else Name(token.text)

    def call(self, token: _Token) -> Node:
        opened = self.take()
        args: list[Node] = []
        while not args or self.here.text == ",":
            if args:
                self.take()
            is_first_of_where = token.text == "where" and not args
            args.append(self.condition(_OR) if is_first_of_where else self.number(_OR))
        self.closing(opened)
        least, most = FUNCTIONS[token.text]
        if len(args) < least or (most is not None and len(args) > most):
            needed = f"at least {least}" if most is None else f"exactly {least}"
            _refuse(token, f"{token.text} has {needed} argument{'s'[: least - 1]}, not {len(args)},")
        return Call(token.text, tuple(args))


def _tokens(text: str) -> list[_Token]:
    if len(text) > LONGEST_TEXT:
        raise FormulaRefused(
            f"the formula has {len(text)} characters; at most {LONGEST_TEXT} are allowed, use helpers"
        )
    tokens: list[_Token] = []
    at = _space(text, 0)
    while at < len(text):
        found = _TOKEN.match(text, at)
        if found is None:
            sign = text[at]
            remedy = f"; {_REMEDIES[sign]}" if sign in _REMEDIES else ""
            _refuse(_Token("", sign, at), f"{shown(sign)} is not part of the formula language", remedy)
        tokens.append(_Token(str(found.lastgroup), found[0], at))
        at = _space(text, found.end())
    if not tokens:
        raise FormulaRefused("the formula is empty")
    return [*tokens, _Token("end", "", at)]


def _space(text: str, at: int) -> int:
    found = _SPACE.match(text, at)
    return found.end() if found else at


def _literal(token: _Token) -> Node:
    digits, _, exponent = token.text.lower().partition("e")
    if len(token.text) > LONGEST_LITERAL:
        _refuse(
            token, f"a number of {len(token.text)} characters is too long", f"; at most {LONGEST_LITERAL}"
        )
    if len(exponent) > 5 or abs(int(exponent or "0")) > 400:
        _refuse(token, f"the number {shown(token.text)} is beyond float64")
    value = Fraction(digits) * Fraction(10) ** int(exponent or "0")
    nearest_float = float_of(value)
    if nearest_float == float("inf") or (nearest_float == 0.0 and value != 0):
        _refuse(token, f"the number {shown(token.text)} is beyond float64")
    return Number(token.text, value)


def _refuse(token: _Token, found: str, remedy: str = "") -> NoReturn:
    raise FormulaRefused(f"{found} at character {token.at + 1}{remedy}")
