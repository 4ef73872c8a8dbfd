"""What the formulas of the catalogue imply exactly: determinants, fixed points, multipliers, borders.

Values with an id are published records; ``exact algebra`` where no source is named. Citations are from memory
where the record says so.
"""

from __future__ import annotations

import cmath
import math
import re

import numpy as np
import pytest

from atlas.families.catalogue import family
from atlas.formula.evaluation import evaluate
from tests.reference.multipliers import cycle_matrix, is_stable, matrix, multipliers, root, stepped
from tests.reference.published import ids, published

SIDES = {"tau_left": 1.4, "tau_right": -2.0, "delta_left": 0.3, "delta_right": 0.7, "mu": 1.0}
POINTS = np.random.default_rng(8).uniform(-1.5, 1.5, (20, 2)).tolist()


def near(value: complex, size: float = 1e-11) -> object:
    return pytest.approx(value, rel=size, abs=size)


class TestAreas:
    """Determinants of the Jacobian, the same at every state."""

    @pytest.mark.parametrize(("x", "y"), POINTS)
    def test_they_are_constant(self, x: float, y: float) -> None:
        """hen.det: M. Henon 1976, Commun. Math. Phys. 50, 69; loz.sum, ike.sum, std.sum: exact algebra."""

        def area(name: str, **given: float) -> float:
            return float(np.linalg.det(matrix(family(name), given)))

        assert area("henon", x=x, y=y, a=1.4, b=0.3) == near(-0.3)
        assert area("lozi", x=x, y=y, a=1.7, b=0.5) == near(-0.5)
        assert area("ikeda", x=x, y=y, u=0.9) == near(0.81)
        assert area("standard", theta=x, p=y, K=1.2) == near(1)
        assert area("border_collision_plane", x=x, y=y, **SIDES) == near(0.3 if x <= 0 else 0.7)
        assert area("complex_quadratic", re=x, im=y, c_re=0.1, c_im=0.2) == near(4 * (x * x + y * y))

    def test_sums_of_exponents(self) -> None:
        assert float(published("loz.sum").number()) == near(math.log(0.5))
        told = published("ike.sum").value.rpartition(": ")[2]
        assert float(told) == near(2 * math.log(0.9))
        assert published("std.sum").number() == 0


class TestHenon:
    own = family("henon")

    def at(self, a: float, b: float, x: float) -> dict[str, float]:
        return {"a": a, "b": b, "x": x, "y": b * x}

    def test_fixed_point_and_multipliers(self) -> None:
        """hen.fp: exact algebra."""
        record = published("hen.fp")
        values = self.at(1.4, 0.3, float(record.number("x")))
        assert values["y"] == near(float(record.number("y")))
        found = multipliers(cycle_matrix(self.own, values, 1))
        assert found.tolist() == [near(float(record.number("mult", k))) for k in (0, 1)]

    @pytest.mark.parametrize("b", [-0.5, 0.1, 0.3, 0.8])
    def test_fold_and_doublings_lie_on_their_curves(self, b: float) -> None:
        """hen.exist: M. Henon 1976 (citation from memory); exact algebra."""
        fold, first, second = -((1 - b) ** 2) / 4, 3 * (1 - b) ** 2 / 4, (1 - b) ** 2 + (1 + b) ** 2 / 4
        if b == 0.3:
            numbers = re.search(r"b=0.3: ([^)]*)", published("hen.exist").value)
            assert numbers is not None
            assert [float(number) for number in numbers[1].split(", ")] == near([fold, first, second])
        meeting = self.at(fold, b, (b - 1) / (2 * fold))
        assert min(abs(multipliers(cycle_matrix(self.own, meeting, 1)) - 1)) < 1e-7
        fixed = self.at(first, b, (b - 1 + math.sqrt((1 - b) ** 2 + 4 * first)) / (2 * first))
        assert min(abs(multipliers(cycle_matrix(self.own, fixed, 1)) + 1)) < 1e-9
        x, after = (
            (1 - b + sign * math.sqrt(4 * second - 3 * (1 - b) ** 2)) / (2 * second) for sign in (1, -1)
        )
        two = {"a": second, "b": b, "x": x, "y": b * after}
        assert min(abs(multipliers(cycle_matrix(self.own, two, 2)) + 1)) < 1e-9


class TestLozi:
    own = family("lozi")

    @pytest.mark.parametrize("b", [0.1, 0.3, 0.5])
    def test_the_fixed_point_flips_where_the_cycle_of_two_begins_and_that_ends_at_1_plus_b(
        self, b: float
    ) -> None:
        """loz.fixed: R. Lozi 1978, J. Phys. Colloq. 39 C5, 9 (citation from memory); loz.2cycle."""
        assert published("loz.fixed").value == "a = 1-b"
        assert published("loz.2cycle").value == "1-b<a<1+b"
        for a in np.arange(0.05, 2, 0.1):
            given = {"a": float(a), "b": b}
            x = 1 / (1 + a - b)
            fixed = is_stable(cycle_matrix(self.own, {**given, "x": x, "y": b * x}, 1))
            assert fixed == (a < 1 - b)
            if a > 1 - b:
                scale = (1 - b) ** 2 + a**2
                x, before = (1 - b + a) / scale, (1 - b - a) / scale
                two = is_stable(cycle_matrix(self.own, {**given, "x": x, "y": b * before}, 2))
                assert two == (a < 1 + b)


class TestBorderCollision:
    own = family("border_collision_plane")

    @pytest.mark.parametrize("y", [-2.0, 0.0, 0.375])
    def test_it_is_continuous_at_the_border(self, y: float) -> None:
        left, on, right = (stepped(self.own, {**SIDES, "x": x, "y": y}) for x in (-1e-300, 0.0, 1e-300))
        assert on == {"x": y + 1, "y": 0}
        assert left["x"] == right["x"] == on["x"]
        assert abs(left["y"]) + abs(right["y"]) < 1e-299

    def test_either_side_has_its_trace_and_determinant(self) -> None:
        for side, x in (("left", -0.5), ("right", 0.5)):
            found = matrix(self.own, {**SIDES, "x": x, "y": 0.2})
            assert np.trace(found) == SIDES[f"tau_{side}"]
            assert np.linalg.det(found) == near(SIDES[f"delta_{side}"])

    @pytest.mark.parametrize(("x", "y"), POINTS)
    def test_the_lozi_map_is_one_of_them(self, x: float, y: float) -> None:
        """With y as b * x before: traces a and -a, determinants -b, offset 1."""
        given = {"tau_left": 1.7, "tau_right": -1.7, "delta_left": -0.5, "delta_right": -0.5, "mu": 1.0}
        found = stepped(self.own, {**given, "x": x, "y": y})
        assert found == near(stepped(family("lozi"), {"a": 1.7, "b": 0.5, "x": x, "y": y}))

    def test_states_grow_in_proportion_to_the_offset(self) -> None:
        for x, y in POINTS:
            one = stepped(self.own, {**SIDES, "x": x, "y": y})
            two = stepped(self.own, {**SIDES, "mu": 2.0, "x": 2 * x, "y": 2 * y})
            assert two == {name: 2 * number for name, number in one.items()}


class TestTorusAndCircle:
    @pytest.mark.parametrize(("theta", "p"), POINTS)
    def test_the_standard_map_is_the_same_on_the_torus(self, theta: float, p: float) -> None:
        own, values = family("standard"), {"theta": theta % 6, "p": p % 6, "K": 1.2}
        lifted = stepped(own, values)
        for name, node in zip(own.state_names, own.wrapped_step(), strict=True):
            found = evaluate(node, values)
            assert 0 <= found < 2 * math.pi
            turns = (lifted[name] - found) / (2 * math.pi)
            assert turns == near(round(turns))
        turned = {**values, "theta": values["theta"] + 2 * math.pi, "p": values["p"] - 2 * math.pi}
        assert stepped(own, turned)["theta"] == near(lifted["theta"])

    def test_the_elliptic_fixed_point_doubles_at_4(self) -> None:
        """std.fp: B. V. Chirikov 1979, Phys. Rep. 52, 263 (citation from memory); trace 2 - K."""
        own = family("standard")
        assert published("std.fp").value == "K=4"
        for strength in (0.5, 2.0, 4.0, 5.0):
            found = matrix(own, {"theta": math.pi, "p": 0.0, "K": strength})
            assert np.trace(found) == near(2 - strength)
            turning = abs(multipliers(found)[0]) < 1 + 1e-6
            assert turning == (strength <= 4)
        assert stepped(own, {"theta": math.pi, "p": 0.0, "K": 1.0}) == near({"theta": math.pi, "p": 0.0})

    @pytest.mark.parametrize("strength", [0.3, 1.0, 1.7])
    def test_the_edge_of_the_tongue_of_rotation_0(self, strength: float) -> None:
        """cir.01: |Omega| <= K / (2 pi), where a fixed point of the lifted map is."""
        own, edge = family("circle"), strength / (2 * math.pi)
        assert published("cir.01").value == "|Omega| <= K/(2 pi)"
        thetas = np.linspace(0, 1, 4001)
        for bare, expected in ((0.999 * edge, True), (1.001 * edge, False), (-0.999 * edge, True)):
            moved = [
                stepped(own, {"theta": theta, "Omega": bare, "K": strength})["theta"] - theta
                for theta in thetas.tolist()
            ]
            assert (min(moved) <= 0 <= max(moved)) == expected
        fold = {"theta": 0.25, "Omega": edge, "K": strength}
        assert stepped(own, fold)["theta"] == near(0.25)
        assert matrix(own, fold)[0, 0] == near(1)

    def test_the_exponent_of_the_fixed_point_at_0(self) -> None:
        """cir.lyap: ln(1 - K)."""
        given = {key: float(number) for key, number in published("cir.lyap").parameters.items()}
        slope = matrix(family("circle"), {**given, "theta": 0.0})[0, 0]
        assert math.log(slope) == near(float(published("cir.lyap").number()))

    def test_a_turn_of_the_circle_is_a_turn_of_the_lift(self) -> None:
        given = {"Omega": 0.3, "K": 0.9}
        for theta, _ in POINTS:
            once = stepped(family("circle"), {**given, "theta": theta})["theta"]
            assert stepped(family("circle"), {**given, "theta": theta + 1})["theta"] == near(once + 1)


class TestComplexQuadratic:
    own = family("complex_quadratic")

    def at(self, z: complex, c: complex) -> dict[str, float]:
        return {"re": z.real, "im": z.imag, "c_re": c.real, "c_im": c.imag}

    @pytest.mark.parametrize(("re", "im"), POINTS)
    def test_it_is_the_square_and_a_constant(self, re: float, im: float) -> None:
        z, c = complex(re, im), complex(-0.1, 0.7)
        found = stepped(self.own, self.at(z, c))
        assert complex(found["re"], found["im"]) == near(z * z + c)
        assert sorted(multipliers(matrix(self.own, self.at(z, c))), key=lambda m: m.imag) == [
            near(complex(2 * re, -2 * abs(im))),
            near(complex(2 * re, 2 * abs(im))),
        ]

    def test_on_the_real_axis_it_is_the_real_map(self) -> None:
        for x, c in POINTS:
            found = stepped(self.own, self.at(complex(x), complex(c)))
            assert found == {"re": stepped(family("quadratic"), {"x": x, "c": c})["x"], "im": 0}

    @pytest.mark.parametrize("size", [0.2, 0.9, 1.1])
    def test_cardioid_and_disc(self, size: float) -> None:
        """Multipliers m of the fixed point at c = m/2 - m**2/4, and of the cycle of two at c = m/4 - 1."""
        for turn in np.linspace(0.05, 0.95, 7):
            m = size * cmath.exp(2j * math.pi * turn)
            fixed = cycle_matrix(self.own, self.at(m / 2, m / 2 - m * m / 4), 1)
            c = m / 4 - 1
            two = cycle_matrix(self.own, self.at((-1 + cmath.sqrt(-3 - 4 * c)) / 2, c), 2)
            for product in (fixed, two):
                assert min(abs(multipliers(product) - m)) < 1e-9
                assert is_stable(product) == (size < 1)


class TestForcedLogistic:
    own = family("forced_logistic")

    def two_steps(self, x: float, a: float, b: float) -> tuple[float, float]:
        """Return the state after the word, and the multiplier of the word."""
        values, product = {"x": x, "a": a, "b": b}, 1.0
        for letters in self.own.word():
            now = {**values, "r": values[str(letters["r"])]}
            product *= float(matrix(self.own, now)[0, 0])
            values |= stepped(self.own, now)
        return values["x"], product

    @pytest.mark.parametrize("a", [1.3, 2.0, 3.2, 3.9])
    def test_superstable_curves(self, a: float) -> None:
        """mh.ss: b = 8 / (a (4 - a)) from 1/2 with the letter a first, and the mirror curve."""
        assert "b = 8/(a(4-a))" in published("mh.ss").value
        x, product = self.two_steps(0.5, a, 8 / (a * (4 - a)))
        assert (x, product) == (near(0.5), 0)
        x, product = self.two_steps(a / 4, 8 / (a * (4 - a)), a)
        assert (x, product) == (near(a / 4), near(0))

    @pytest.mark.parametrize("name", [*ids("mh.pd."), *ids("mh.fold.")])
    def test_doublings_and_folds_of_the_forced_cycle(self, name: str) -> None:
        """Where the multiplier of the word is -1 or 1, a fixed point of the word is."""
        record, wanted = published(name), -1.0 if ".pd." in name else 1.0
        a, grid = float(record.parameters["a"]), np.linspace(0.001, 0.999, 300).tolist()
        for number in range(len(record.value)):
            b = float(record.number(number))
            off = [self.two_steps(x, a, b)[1] - wanted for x in grid]
            brackets = [k for k in range(len(grid) - 1) if off[k] * off[k + 1] < 0]
            points = [
                root(lambda x, b=b: self.two_steps(x, a, b)[1] - wanted, grid[k], grid[k + 1])
                for k in brackets
            ]
            assert min(abs(self.two_steps(x, a, b)[0] - x) for x in points) < 1e-9

    def test_equal_letters_make_the_logistic_map(self) -> None:
        once = stepped(family("logistic"), {"x": 0.3, "r": 3.7}, 2)["x"]
        assert self.two_steps(0.3, 3.7, 3.7)[0] == once
