"""The catalogue: every row is complete, its derivative is right, and its default view shows something."""

from __future__ import annotations

import os
import subprocess
import sys

import mpmath
import numpy as np
import pytest

from atlas.errors import FamilyRefused
from atlas.families.catalogue import NAMES, ROWS, family
from atlas.families.reader import family_from_config
from atlas.formula.expression import evaluate, parse, to_mathtext
from tests.reference.formulas import slope, value

BY_HAND = {
    "logistic": "r*(1 - 2*x)",
    "ricker": "(1 - r*x)*exp(r*(1 - x))",
    "hassell": "growth*(1 + x - beta*x)/(1 + x)**(beta + 1)",
    "maynard_smith_slatkin": "growth*(1 + (1 - b)*x**b)/(1 + x**b)**2",
    "theta_ricker": "(1 - r*theta*x**theta)*exp(r*(1 - x**theta))",
    "cubic": "r*(1 - 3*x**2)",
    "sine": "pi*r*cos(pi*x)",
    "tent": "where(x < 1/2, mu, -mu)",
    "skew_tent": "where(x <= 0, a, b)",
    "gauss": "-2*alpha*x*exp(-alpha*x**2)",
    "quadratic": "2*x",
}
POINTS = ("0.05", "0.3712", "0.4999", "0.5001", "0.93", "1.75")


def symbols(name: str) -> dict[str, str]:
    return {parameter.name: str(parameter.default) for parameter in family(name).parameters}


def orbits(name: str, columns: int, transient: int, steps: int) -> np.ndarray:
    """Return the states after the transient, one column a parameter value of the default view."""
    given = family(name)
    assert given.across is not None
    (formula,) = given.inlined_step()
    state = given.states[0]
    found = np.empty((steps, columns))
    for column, number in enumerate(given.across.values(columns, 1)[:, 0]):
        values = {parameter.name: float(parameter.default) for parameter in given.parameters}
        values |= {given.across.name: float(number), state.name: float(state.start)}
        for step in range(-transient, steps):
            values[state.name] = evaluate(formula, values)
            if step >= 0:
                found[step, column] = values[state.name]
    return found


class TestRows:
    def test_the_eleven_families_of_one_variable(self):
        assert set(NAMES) == set(BY_HAND)

    @pytest.mark.parametrize("name", NAMES)
    def test_a_row_is_complete(self, name):
        row = family(name)
        assert row.name == name
        assert len(row.states) == 1
        assert row.source
        assert row.title.endswith("map") or "map" in row.title
        assert row.note
        assert all(parameter.label for parameter in row.parameters)
        assert row.states[0].label
        assert row.across is not None
        assert row.up is not None
        assert row.across.name in row.parameter_names
        assert row.up.name == row.states[0].name

    @pytest.mark.parametrize("name", NAMES)
    def test_the_config_of_a_row_makes_it_again(self, name):
        assert family_from_config(name, family(name).as_config(), where="again") == family(name)

    def test_families_are_read_once(self):
        assert family("tent") is family("tent")

    def test_an_unknown_name_gets_the_nearest(self):
        with pytest.raises(FamilyRefused, match="did you mean 'logistic'"):
            family("logistc")
        with pytest.raises(FamilyRefused, match="allowed: cubic"):
            family("../../etc/passwd")

    def test_rows_hold_texts_alone(self):
        def leaves(entry):
            if isinstance(entry, dict | list):
                inner = entry.values() if isinstance(entry, dict) else entry
                return [leaf for part in inner for leaf in leaves(part)]
            return [entry]

        assert all(isinstance(leaf, str) for leaf in leaves(dict(ROWS)))


class TestDerivatives:
    @pytest.mark.parametrize("name", NAMES)
    def test_equal_to_the_derivative_by_hand(self, name):
        row = family(name)
        ((found,),) = row.jacobian()
        by_hand = parse(BY_HAND[name], {*row.parameter_names, *row.state_names})
        for point in POINTS:
            at = {**symbols(name), "x": point}
            assert mpmath.almosteq(value(found, at), value(by_hand, at), rel_eps=mpmath.mpf(10) ** -45)

    @pytest.mark.parametrize("name", NAMES)
    def test_equal_to_a_difference_in_60_digits(self, name):
        row = family(name)
        ((found,),) = row.jacobian()
        for point in POINTS:
            at = {key: mpmath.mpf(text) for key, text in {**symbols(name), "x": point}.items()}
            expected = slope(row.step[0], "x", at)
            assert abs(value(found, at) - expected) < 1e-30 * (1 + abs(expected))

    @pytest.mark.parametrize("name", NAMES)
    def test_at_the_state_0_it_is_a_number(self, name):
        ((found,),) = family(name).jacobian()
        values = {key: float(text) for key, text in symbols(name).items()}
        assert np.isfinite(evaluate(found, {**values, "x": 0.0}))

    def test_the_same_text_in_every_process(self):
        program = (
            "from atlas.families.catalogue import *; from atlas.formula.expression import unparse;"
            "print([unparse(family(name).jacobian()[0][0]) for name in NAMES])"
        )
        told = {
            subprocess.run(
                [sys.executable, "-c", program],
                env={**os.environ, "PYTHONHASHSEED": salt},
                capture_output=True,
                text=True,
                check=True,
            ).stdout
            for salt in ("1", "20")
        }
        assert len(told) == 1


class TestViews:
    @pytest.mark.parametrize("name", NAMES)
    def test_every_column_of_the_default_view_has_its_attractor_inside(self, name):
        up = family(name).up
        assert up is not None
        found = orbits(name, columns=24, transient=200, steps=40)
        assert np.all((found >= float(up.low)) & (found <= float(up.high)))

    @pytest.mark.parametrize("name", NAMES)
    def test_the_picture_fills_its_frame_and_changes_across_it(self, name):
        up = family(name).up
        assert up is not None
        found = orbits(name, columns=24, transient=200, steps=40)
        assert np.ptp(found) > 0.6 * (float(up.high) - float(up.low))
        occupied = [len(np.unique(np.round(column, 6))) for column in found.T]
        assert min(occupied) <= 20
        assert max(occupied) >= 30

    @pytest.mark.parametrize("name", NAMES)
    def test_formulas_are_set_as_mathematics(self, name):
        from matplotlib.mathtext import MathTextParser

        assert MathTextParser("path").parse(f"${to_mathtext(family(name).step[0])}$").width > 0


class TestPublished:
    @pytest.mark.parametrize(
        ("name", "fixed", "at"),
        [
            ("logistic", "1 - 1/3.2", {"r": "3.2"}),  # exact algebra
            ("ricker", "1", {"r": "2.3"}),
            ("hassell", "64**(1/4) - 1", {"growth": "64", "beta": "4"}),
            ("maynard_smith_slatkin", "2**(1/6)", {"growth": "3", "b": "6"}),
            ("theta_ricker", "1", {"r": "1.4", "theta": "2"}),
            ("cubic", "sqrt(1 - 1/2.5)", {"r": "2.5"}),
            ("tent", "1.7/2.7", {"mu": "1.7"}),
            ("skew_tent", "1/3.5", {"a": "0.5", "b": "-2.5", "mu": "1"}),
            ("quadratic", "(1 - sqrt(1 + 4*1.8))/2", {"c": "-1.8"}),
        ],
    )
    def test_fixed_points(self, name, fixed, at):
        point = value(parse(fixed, ()), {})
        assert abs(value(family(name).step[0], {**at, "x": point}) - point) < 1e-50

    def test_the_first_flip_of_hassell_at_exponent_4_is_at_16(self):
        """At beta = 4 the first period doubling is at growth (4/2)**4 = 16 (exact algebra)."""
        ((found,),) = family("hassell").jacobian()
        assert abs(value(found, {"growth": 16, "beta": 4, "x": 1}) + 1) < 1e-50

    def test_the_start_one_half_is_lost_at_full_height(self):
        (formula,) = family("logistic").step
        first = evaluate(formula, {"r": 4.0, "x": 0.5})
        assert evaluate(formula, {"r": 4.0, "x": first}) == 0.0
        assert str(family("logistic").states[0].start) == "0.3"
