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
from tests.reference.rows import WITHOUT_ATTRACTOR, bifurcation_rows

TURN = "(0.4 - 6/(1 + x**2 + y**2))"
RATE = "(12/(1 + x**2 + y**2)**2)"

BY_HAND: dict[str, tuple[str, ...]] = {
    "logistic": ("r*(1 - 2*x)",),
    "ricker": ("(1 - r*x)*exp(r*(1 - x))",),
    "hassell": ("growth*(1 + x - beta*x)/(1 + x)**(beta + 1)",),
    "maynard_smith_slatkin": ("growth*(1 + (1 - b)*x**b)/(1 + x**b)**2",),
    "theta_ricker": ("(1 - r*theta*x**theta)*exp(r*(1 - x**theta))",),
    "cubic": ("r*(1 - 3*x**2)",),
    "sine": ("pi*r*cos(pi*x)",),
    "tent": ("where(x < 1/2, mu, -mu)",),
    "skew_tent": ("where(x <= 0, a, b)",),
    "gauss": ("-2*alpha*x*exp(-alpha*x**2)",),
    "quadratic": ("2*x",),
    "circle": ("1 - K*cos(2*pi*theta)",),
    "forced_logistic": ("r*(1 - 2*x)",),
    "henon": ("-2*a*x", "1", "b", "0"),
    "lozi": ("where(x < 0, a, -a)", "1", "b", "0"),
    "ikeda": (
        f"u*(cos({TURN}) + {RATE}*x*(-x*sin({TURN}) - y*cos({TURN})))",
        f"u*(-sin({TURN}) + {RATE}*y*(-x*sin({TURN}) - y*cos({TURN})))",
        f"u*(sin({TURN}) + {RATE}*x*(x*cos({TURN}) - y*sin({TURN})))",
        f"u*(cos({TURN}) + {RATE}*y*(x*cos({TURN}) - y*sin({TURN})))",
    ),
    "standard": ("1", "K*cos(theta)", "1", "1 + K*cos(theta)"),
    "delayed_logistic": ("r*(1 - y)", "-r*x", "1", "0"),
    "coupled_logistic": (
        "(1 - eps)*r*(1 - 2*x)",
        "eps*r*(1 - 2*y)",
        "eps*r*(1 - 2*x)",
        "(1 - eps)*r*(1 - 2*y)",
    ),
    "nicholson_bailey": ("R*exp(-P)", "-R*N*exp(-P)", "1 - exp(-P)", "N*exp(-P)"),
    "beddington": (
        "(1 - r*N/K)*exp(r*(1 - N/K) - P)",
        "-N*exp(r*(1 - N/K) - P)",
        "1 - exp(-P)",
        "N*exp(-P)",
    ),
    "burgers": ("a", "-2*y", "y", "b + x"),
    "border_collision_plane": (
        "where(x <= 0, tau_left, tau_right)",
        "1",
        "where(x <= 0, -delta_left, -delta_right)",
        "0",
    ),
    "complex_quadratic": ("2*re", "2*im", "-2*im", "2*re"),
    "insect_stages": (
        *("1 - mua - cpa*pupae*exp(-cpa*adults)", "0", "exp(-cpa*adults)"),
        "b*(1 - cea*adults)*exp(-cel*larvae - cea*adults)",
        *("-cel*b*adults*exp(-cel*larvae - cea*adults)", "0"),
        *("0", "1 - mul", "0"),
    ),
    "predator_prey": ("a*(1 - 2*x) - y", "-x", "d*y", "d*x"),
}
"""Derivatives row by row: of the next value of each state with respect to each, in alphabetical order."""

POINTS = ("0.05", "0.3712", "0.4999", "0.5001", "0.93", "1.75")
DRAWN = tuple(name for name in bifurcation_rows() if name not in WITHOUT_ATTRACTOR)


def numbers(name: str) -> dict[str, str]:
    """Return the defaults of all parameters; a pattern has its second entry."""
    own = family(name)
    defaults = {parameter.name: str(parameter.default) for parameter in own.parameters}
    return defaults | {pattern.name: defaults[str(pattern.entries[1])] for pattern in own.patterns}


def states_at(name: str, number: int) -> dict[str, str]:
    """Return a state whose variables are points of the list, each the next but one of the one before."""
    names = family(name).state_names
    return {state: POINTS[(number + 2 * k) % len(POINTS)] for k, state in enumerate(names)}


def orbits(name: str, columns: int, transient: int, steps: int) -> np.ndarray:
    """Return what the vertical axis shows after the transient, a column a value of the horizontal one."""
    given = family(name)
    assert given.across is not None
    assert given.up is not None
    formulas = dict(zip(given.state_names, given.wrapped_step(), strict=True))
    found = np.empty((steps, columns))
    for column, number in enumerate(given.across.values(columns, 1)[:, 0]):
        values = {key: float(text) for key, text in numbers(name).items()} | {
            given.across.name: float(number)
        }
        values |= {state.name: float(state.start) for state in given.states}
        for step in range(-transient, steps):
            values |= {state: evaluate(formula, values) for state, formula in formulas.items()}
            if step >= 0:
                found[step, column] = values[given.up.name]
    return found


class TestRows:
    def test_the_families_of_the_contract(self):
        assert set(NAMES) == set(BY_HAND)
        assert len(NAMES) == 26

    @pytest.mark.parametrize("name", NAMES)
    def test_a_row_is_complete(self, name):
        row = family(name)
        assert row.name == name
        assert row.source
        assert "map" in row.title
        assert row.note
        assert all(one.label for one in (*row.states, *row.parameters, *row.patterns, *row.observables))
        assert row.across is not None
        assert row.up is not None

    @pytest.mark.parametrize("name", NAMES)
    def test_the_default_view_is_a_bifurcation_view_with_four_exceptions(self, name):
        row = family(name)
        assert row.across is not None
        assert row.up is not None
        axes = (row.across.name, row.up.name)
        planes = {
            "circle": ("Omega", "K"),
            "complex_quadratic": ("c_re", "c_im"),
            "forced_logistic": ("a", "b"),
        }
        if name in planes:
            assert axes == planes[name]
        elif name == "standard":
            assert axes == ("theta", "p")
        else:
            assert axes[0] in row.parameter_names
            assert axes[1] in row.state_names

    @pytest.mark.parametrize("name", NAMES)
    def test_the_config_of_a_row_makes_it_again(self, name):
        assert family_from_config(name, family(name).as_config(), where="again") == family(name)

    def test_families_are_read_once(self):
        assert family("tent") is family("tent")

    def test_an_unknown_name_gets_the_nearest(self):
        with pytest.raises(FamilyRefused, match="did you mean 'logistic'"):
            family("logistc")
        with pytest.raises(FamilyRefused, match="allowed: beddington"):
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
        known = {*row.parameter_names, *row.pattern_names, *row.state_names}
        by_hand = [parse(text, known) for text in BY_HAND[name]]
        found = [entry for line in row.jacobian() for entry in line]
        for number in range(len(POINTS)):
            at = {**numbers(name), **states_at(name, number)}
            for entry, expected in zip(found, by_hand, strict=True):
                wanted = value(expected, at)
                assert abs(value(entry, at) - wanted) < mpmath.mpf(10) ** -45 * max(1, abs(wanted))

    @pytest.mark.parametrize("name", NAMES)
    def test_equal_to_a_difference_in_60_digits(self, name):
        row = family(name)
        for number in range(len(POINTS)):
            given = {**numbers(name), **states_at(name, number)}
            at = {key: mpmath.mpf(text) for key, text in given.items()}
            for formula, line in zip(row.inlined_step(), row.jacobian(), strict=True):
                for state, entry in zip(row.state_names, line, strict=True):
                    expected = slope(formula, state, at)
                    assert abs(value(entry, at) - expected) < 1e-30 * (1 + abs(expected))

    @pytest.mark.parametrize("name", NAMES)
    def test_at_the_state_0_it_is_a_number(self, name):
        row = family(name)
        values = {key: float(text) for key, text in numbers(name).items()}
        values |= dict.fromkeys(row.state_names, 0.0)
        assert all(np.isfinite(evaluate(entry, values)) for line in row.jacobian() for entry in line)

    def test_the_same_text_in_every_process(self):
        program = (
            "from atlas.families.catalogue import *; from atlas.formula.expression import unparse;"
            "print([unparse(entry) for name in NAMES for line in family(name).jacobian() for entry in line])"
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
    @pytest.mark.parametrize("name", DRAWN)
    def test_the_picture_fills_its_frame_and_changes_across_it(self, name):
        """Every column has its attractor inside; some show few values, some many."""
        up = family(name).up
        assert up is not None
        found = orbits(name, columns=24, transient=200, steps=40)
        assert np.all((found >= float(up.low)) & (found <= float(up.high)))
        assert np.ptp(found) > 0.6 * (float(up.high) - float(up.low))
        occupied = [len(np.unique(np.round(column, 6))) for column in found.T]
        assert min(occupied) <= 20
        assert max(occupied) >= 30

    def test_one_start_of_the_standard_map_visits_a_zone_of_the_whole_torus(self):
        found = orbits("standard", columns=1, transient=0, steps=4000)
        assert 0 <= found.min() < 0.3
        assert 6 < found.max() < 2 * np.pi

    def test_the_nicholson_bailey_orbit_is_lost(self):
        found = orbits("nicholson_bailey", columns=24, transient=1000, steps=1)
        assert np.all((found == 0) | (found > 1e6) | np.isnan(found))

    @pytest.mark.parametrize("name", NAMES)
    def test_formulas_are_set_as_mathematics(self, name):
        from matplotlib.mathtext import MathTextParser

        parser, row = MathTextParser("path"), family(name)
        for node in (*row.step, *(one.node for one in row.observables)):
            assert parser.parse(f"${to_mathtext(node)}$").width > 0


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
