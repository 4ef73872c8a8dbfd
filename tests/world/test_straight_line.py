"""The straight-line source of the float64 back end against the slow evaluation of the same tree."""

from __future__ import annotations

import math
from collections.abc import Mapping

import mpmath
import numpy as np
import pytest
from hypothesis import assume, example, given, settings
from hypothesis import strategies as st

from atlas.arithmetic import functions
from atlas.arithmetic.float64 import POLYNOMIALS, StraightLine, hoist
from atlas.families.catalogue import NAMES as FAMILIES
from atlas.families.catalogue import family
from atlas.formula.evaluation import evaluate
from atlas.formula.expression import parse
from atlas.formula.tree import (
    Binary,
    Call,
    Compare,
    Logic,
    Name,
    Node,
    Number,
    Unary,
    free_names,
    is_condition,
)
from tests.reference.formulas import NAMES, value

SPACE = {"np": np, **{name: getattr(functions, name) for name in POLYNOMIALS}}


def straight(tree: Node, values: Mapping[str, float]) -> float:
    """Return what the lines that the back end writes give, run one after the other."""
    body = StraightLine({name: name for name in values})
    result = body.value(tree)
    space = {**SPACE, **{name: np.float64(number) for name, number in values.items()}}
    with np.errstate(all="ignore"):
        exec("\n".join([*body.lines, f"result = {result}"]), space)
    return float(space["result"])


def conditions(numbers: st.SearchStrategy[Node]) -> st.SearchStrategy[Node]:
    """Return comparisons, and what joins or negates them."""
    signs = st.sampled_from(["<", "<=", ">", ">=", "==", "!="])
    compare: st.SearchStrategy[Node] = st.builds(Compare, signs, numbers, numbers)
    negated = compare | st.builds(Unary, st.just("not"), compare)
    pairs = st.lists(negated, min_size=2, max_size=3).map(tuple)
    return negated | st.builds(Logic, st.sampled_from(["and", "or"]), pairs)


def larger(numbers: st.SearchStrategy[Node]) -> st.SearchStrategy[Node]:
    """Return operations that float64 does in one way only."""
    several = st.lists(numbers, min_size=2, max_size=3).map(tuple)
    return (
        st.builds(Unary, st.sampled_from("+-"), numbers)
        | st.builds(Binary, st.sampled_from("+-*/"), numbers, numbers)
        | st.builds(Call, st.sampled_from(["abs", "floor", "sign", "sqrt"]), st.tuples(numbers))
        | st.builds(Call, st.sampled_from(["min", "max"]), several)
        | st.builds(Call, st.just("mod"), st.tuples(numbers, numbers))
        | st.builds(Call, st.just("where"), st.tuples(conditions(numbers), numbers, numbers))
    )


def plain(leaves: int = 10) -> st.SearchStrategy[Node]:
    """Return trees of plain arithmetic over the names x, r and b_1."""
    literals = st.sampled_from(["0", "1", "2", "0.3", "1e-3", "17", "pi"]).map(lambda text: parse(text, ()))
    leaf: st.SearchStrategy[Node] = st.sampled_from(NAMES).map(Name) | literals
    return st.recursive(leaf, larger, max_leaves=leaves)


NUMBERS = st.sampled_from([0.0, -0.0, 1.0, -1.0, 0.5, 2.0, 3.0, math.inf, -math.inf, math.nan]) | st.floats(
    -1e3, 1e3, allow_subnormal=False
)
VALUES = st.fixed_dictionaries(dict.fromkeys(NAMES, NUMBERS))


@given(plain(), VALUES)
@settings(max_examples=400)
@example(parse("min(x, r)", NAMES), {"x": math.nan, "r": 1.0, "b_1": 0.0})
@example(parse("1 / max(x, r)", NAMES), {"x": 0.0, "r": -0.0, "b_1": 0.0})
@example(parse("sign(x)", NAMES), {"x": math.nan, "r": 1.0, "b_1": 0.0})
@example(parse("mod(x, r)", NAMES), {"x": -0.5, "r": 1.0, "b_1": 0.0})
@example(parse("floor(x) + where(x < r and not x == 1, x, r)", NAMES), {"x": -2.5, "r": 1.0, "b_1": 0.0})
def test_plain_arithmetic_is_the_same_to_the_last_bit(tree: Node, values: dict[str, float]) -> None:
    try:
        found = straight(tree, values)
    except ZeroDivisionError:  # of two literals: Python refuses what compiled code makes infinite
        assume(False)
    wanted = evaluate(tree, values)
    np.testing.assert_equal(np.float64(found), np.float64(wanted))


@given(st.sampled_from(["exp", "log", "sin", "cos", "tan", "tanh"]), plain(6), VALUES)
@settings(max_examples=300)
def test_one_function_of_plain_arithmetic_is_a_few_units_off(
    function: str, inner: Node, values: dict[str, float]
) -> None:
    """The argument is the same to the last bit, so that only the function differs."""
    argument = evaluate(inner, values)
    assume(function not in ("sin", "cos", "tan") or not 1e6 < abs(argument) < math.inf)
    assume(argument != 0 or math.copysign(1.0, argument) > 0)  # the sine of -0 is 0 in the back end
    assume(function != "exp" or not -746 < argument < -708)  # the back end flushes what is not normal to 0
    tree = Call(function, (inner,))
    assert_near(tree, values, 4)


@given(plain(4), plain(4), VALUES)
@settings(max_examples=200)
def test_the_angle_of_a_point_is_a_few_units_off(y: Node, x: Node, values: dict[str, float]) -> None:
    up, across = evaluate(y, values), evaluate(x, values)
    assume(not (math.isinf(up) and math.isinf(across)))  # a corner at infinity has no angle in the back end
    assume(math.copysign(1.0, up) > 0 or up != 0)  # the back end knows no negative zero: on the cut it is +pi
    assume(across != 0 or up != 0)
    assert_near(Call("atan2", (y, x)), values, 4)


@given(plain(4), plain(3), VALUES)
@settings(max_examples=200)
def test_a_power_is_off_by_units_that_grow_with_its_logarithm(
    base: Node, exponent: Node, values: dict[str, float]
) -> None:
    x, y = evaluate(base, values), evaluate(exponent, values)
    assume(math.isfinite(x) and math.isfinite(y) and not (x == 0 and math.copysign(1, x) < 0))
    growth = abs(y * math.log(abs(x))) if x else 0.0
    assume(growth < 700)
    tree = Binary("**", base, exponent)
    assert_near(tree, values, 4 + 2 * growth + (abs(y) if is_whole(exponent) else 0))


def is_whole(node: Node) -> bool:
    """Return whether an exponent is written as a whole number, so that the power becomes products."""
    while isinstance(node, Unary):
        node = node.a
    return isinstance(node, Number) and node.value.denominator == 1


def assert_near(tree: Node, values: Mapping[str, float], units: float) -> None:
    """Compare both ways to evaluate a tree, in units in the last place."""
    try:
        found = straight(tree, values)
    except ZeroDivisionError:
        assume(False)
    wanted = evaluate(tree, values)
    if math.isnan(wanted) or math.isinf(wanted) or wanted == 0.0:
        np.testing.assert_equal(found, wanted)
    else:
        assert abs(found - wanted) <= units * max(math.ulp(wanted), math.ulp(2.0**-1022))


@given(plain(12), VALUES)
@settings(max_examples=200)
@example(parse("where(r > 3 and x < 0.5, r * x, 0.4)", NAMES), {"x": 0.3, "r": 3.5, "b_1": 0.0})
def test_what_is_computed_once_for_each_parameter_changes_nothing(
    tree: Node, values: dict[str, float]
) -> None:
    """The tree with its coefficients taken out, and these computed apart, gives the same bits."""
    (rest,), coefficients = hoist([tree], ["x"])
    for one in coefficients:
        assert free_names(one)
        assert "x" not in free_names(one)
        assert not is_condition(one)  # a condition kept as a number could not be joined to others
    known = {f"coefficient {k}": evaluate(one, values) for k, one in enumerate(coefficients)}
    assert free_names(rest) <= {"x", *known}
    wanted = evaluate(tree, values)
    np.testing.assert_equal(evaluate(rest, {"x": values["x"], **known}), wanted)
    body = StraightLine({"x": "x", **{name: f"c{k}" for k, name in enumerate(known)}})
    assert "coefficient" not in "".join([*body.lines, body.value(rest)])


def test_equal_parts_are_computed_once() -> None:
    body = StraightLine({"x": "x", "r": "r"})
    body.value(parse("exp(r * x) + x * exp(r * x) / (1 + exp(r * x))", ("x", "r")))
    assert sum("exp(" in line for line in body.lines) == 1
    assert body.slow_calls == 1


@pytest.mark.parametrize("name", FAMILIES)
def test_steps_of_the_catalogue_agree_with_sixty_digits(name: str) -> None:
    """Where the step is of the size of its state it is right to a few units of 2^-52."""
    own = family(name)
    fixed = {parameter.name: float(parameter.default) for parameter in own.parameters}
    fixed |= {pattern.name: fixed[str(pattern.entries[0])] for pattern in own.patterns}
    for point in np.random.default_rng(1).uniform(0.01, 0.99, (50, len(own.states))).tolist():
        values = {**fixed, **dict(zip(own.state_names, point, strict=True))}
        for step in own.inlined_step():
            exact = value(step, {key: mpmath.mpf(number) for key, number in values.items()})
            size = max(abs(float(exact)), *point, 1.0 if len(point) > 1 else 0.0)
            assert straight(step, values) == pytest.approx(float(exact), rel=0, abs=40 * 2.0**-52 * size)
