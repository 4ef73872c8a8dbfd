"""Map families: what a config may say about them, what is refused, and what a family answers."""

from __future__ import annotations

import copy
import json
from fractions import Fraction
from typing import Any

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from atlas.families.reader import Family, family_from_config
from atlas.formula.expression import evaluate, parse, unparse
from tiles.errors import Refusal
from tiles.number import Exact, exact
from tiles.window import Axis

WHERE = "fishery.yaml: families.sound"
SOUND: dict[str, Any] = {
    "state": {"n": {"label": "stock", "unit": "kt", "start": "0.3", "domain": ["0", "5"]}},
    "parameters": {"r": {"default": "2.6", "label": "intrinsic growth rate"}, "h": {"default": "0.2"}},
    "helpers": {"s": "(1 - h) * n"},
    "step": {"n": "s * exp(r * (1 - s))"},
    "escape": "1e6",
}
PLANE: dict[str, Any] = {
    "title": "A plane map",
    "state": {"y": {"start": 0}, "x": {"start": "1/3"}},
    "parameters": {"a": {"default": "1.4"}, "b": {"default": "pi/10"}},
    "helpers": {"late": "early + 1", "early": "a * x**2"},
    "step": {"y": "b * x", "x": "2 - late + y"},
    "across": {"name": "a", "low": "0.1", "high": "10", "scale": "log"},
    "up": ["x", "-1.5", "1.5"],
    "note": "Two\n  lines.",
}


def changed(path: str, value: Any, base: dict[str, Any] = SOUND) -> dict[str, Any]:
    """Return a config with one entry set, or deleted where the value is None."""
    config = copy.deepcopy(base)
    *way, last = path.split("/")
    place = config
    for key in way:
        place = place[key]
    if value is None:
        del place[last]
    else:
        place[last] = value
    return config


def read(config: Any, name: str = "sound") -> Family:
    return family_from_config(name, config, where=WHERE)


class TestReading:
    def test_a_family_of_the_scenario(self):
        family = read(SOUND)
        assert (family.name, family.title) == ("sound", "sound")
        state = family.states[0]
        assert (state.name, state.label, state.unit) == ("n", "stock", "kt")
        assert state.start == exact("0.3")
        assert state.domain == (exact(0), exact(5))
        assert family.parameter_names == ("h", "r")
        assert [parameter.default for parameter in family.parameters] == [exact("0.2"), exact("2.6")]
        assert family.escape == exact(1_000_000)
        assert family.formula_lines() == ["s = (1 - h) * n", "n -> s * exp(r * (1 - s))"]

    def test_numbers_may_be_numbers_and_formulas_too(self):
        family = read({"state": {"x": {"start": 0.1}}, "step": {"x": 0.5}, "escape": 10})
        assert family.states[0].start == Exact(Fraction(1, 10))
        assert family.step == (parse("0.5", ()),)
        assert family.parameters == ()

    def test_the_escape_bound_has_a_default(self):
        assert read(changed("escape", None)).escape == exact("1e6")

    def test_order_means_nothing(self):
        family = read(PLANE)
        assert family.state_names == ("x", "y")
        assert [name for name, _ in family.helpers] == ["early", "late"]
        turned = {
            key: dict(reversed(value.items())) if isinstance(value, dict) else value
            for key, value in reversed(PLANE.items())
        }
        assert read(turned) == family
        assert read(turned).digest() == family.digest()

    def test_a_default_view_may_be_logarithmic(self):
        family = read(PLANE)
        assert family.across == Axis.make({"name": "a", "low": "0.1", "high": "10", "scale": "log"})
        assert family.up == Axis.make(("x", "-1.5", "1.5"))

    def test_up_to_three_state_variables(self):
        names = ("x", "y", "z")
        config = {"state": {name: {"start": 0} for name in names}, "step": dict.fromkeys(names, "x - y*z")}
        assert len(read(config).states) == 3

    @pytest.mark.parametrize("config", [SOUND, PLANE], ids=["line", "plane"])
    def test_the_config_of_a_family_makes_it_again(self, config):
        family = read(config)
        text = json.dumps(family.as_config(), sort_keys=True)
        again = read(json.loads(text))
        assert again == family
        assert again.digest() == family.digest()

    def test_notes_are_made_one_line(self):
        assert read(PLANE).note == "Two lines."

    def test_the_digest_tells_families_apart_and_leaves_the_name_aside(self):
        digests = {read(config).digest() for config in (SOUND, PLANE, changed("step/n", "s"))}
        assert len(digests) == 3
        assert read({**SOUND, "title": "A"}, "one").digest() == read({**SOUND, "title": "A"}, "two").digest()


class TestFormulas:
    def test_helpers_are_written_out(self):
        (step,) = read(SOUND).inlined_step()
        assert unparse(step) == "(1 - h) * n * exp(r * (1 - (1 - h) * n))"
        x, y = read(PLANE).inlined_step()
        assert (unparse(x), unparse(y)) == ("2 - (a * x ** 2 + 1) + y", "b * x")

    def test_the_jacobian_has_a_row_for_every_step(self):
        rows = read(PLANE).jacobian()
        assert [[unparse(entry) for entry in row] for row in rows] == [["-(2 * a * x)", "1"], ["b", "0"]]

    def test_the_jacobian_sees_through_helpers(self):
        ((entry,),) = read(SOUND).jacobian()
        at = {"n": 0.7, "r": 2.6, "h": 0.2}
        grown = 0.8 * 0.7
        expected = 0.8 * (1 - 2.6 * grown) * evaluate(parse("exp(2.6*(1 - 0.56))", ()), {})
        assert evaluate(entry, at) == pytest.approx(expected, rel=1e-12)


DOUBLING = {"h0": "n + n", **{f"h{k}": f"h{k - 1} + h{k - 1}" for k in range(1, 40)}}

REFUSED = [
    (changed("stat", {}), ": the key 'stat' is unknown; did you mean 'state'?"),
    (changed("state", None), ": the key 'state' is missing"),
    (changed("step", None), ": the key 'step' is missing"),
    (changed("state", "n"), ".state: 'n' stands where a mapping"),
    (changed("state", {}), ".state: 0 entries stand here; 1 to 3 are allowed"),
    (changed("state/n", "0.3"), ".state.n: '0.3' stands where a mapping"),
    (changed("state/n/start", None), ".state.n: the key 'start' is missing"),
    (changed("state/n/start", "soon"), ".state.n.start: 'soon' is not a number"),
    (changed("state/n/start", True), ".state.n.start: 'True' is not a number"),
    (changed("state/n/start", "nan"), ".state.n.start: 'nan' is not a number"),
    (changed("state/n/start", float("inf")), ".state.n.start: "),
    (changed("state/n/start", "1e400"), ".state.n.start: "),
    (changed("state/n/start", "-2"), ".state.n.start: -2 lies outside the domain from 0 to 5"),
    (changed("state/n/domain", ["5", "0"]), ".state.n.domain: the interval from 5 to 0 is empty or reversed"),
    (changed("state/n/domain", "0..5"), ".state.n.domain: '0..5' is not an interval; write [low, high]"),
    (changed("state/n/lable", "x"), ".state.n: the key 'lable' is unknown; did you mean 'label'?"),
    (changed("parameters/r/default", None), ".parameters.r: the key 'default' is missing"),
    (changed("parameters/r/default", "abc"), ".parameters.r.default: 'abc' is not a number"),
    (changed("parameters/r", "2.6"), ".parameters.r: '2.6' stands where a mapping"),
    (changed("escape", "0"), ".escape: 0 is not above 0; write a number above 0"),
    (changed("escape", "-1e6"), ".escape: -1000000 is not above 0"),
    (changed("escape", "0.2"), ".state.n.start: 0.3 is not below the escape bound 0.2"),
    (changed("step/n", "s * ex(r)"), ".step.n: 'ex' is not a function at character 5; did you mean 'exp'?"),
    (changed("step/n", "s * growth"), ".step.n: the name 'growth' is unknown at character 5"),
    (changed("step/n", "s.real"), ".step.n: '.' is not part of the formula language at character 2"),
    (changed("step/n", ["s"]), ".step.n: a list is not a formula"),
    (changed("step/n", ""), ".step.n: the key has no value"),
    (changed("step", {"m": "s"}), ".step: 'm' is no state variable"),
    (changed("state/m", {"start": 0}), ".step: the step of 'm' is missing"),
    (changed("helpers/s", "s + 1"), ".helpers.s: the helper uses itself"),
    (
        changed("helpers", {"s": "t", "t": "u + n", "u": "s"}),
        ".helpers.s: the helpers form a circle: s uses t",
    ),
    (changed("helpers/n", "r"), ".helpers: 'n' is a state variable already"),
    (changed("parameters/n", {"default": 1}), ".parameters: 'n' is a state variable already"),
    (changed("helpers/r", "1"), ".helpers: 'r' is a parameter already"),
    (changed("parameters/lambda", {"default": 1}), ".parameters: 'lambda' belongs to the formula language"),
    (changed("parameters/exp", {"default": 1}), ".parameters: 'exp' belongs to the formula language"),
    (changed("parameters/pi", {"default": 1}), ".parameters: 'pi' belongs to the formula language"),
    (changed("parameters/2r", {"default": 1}), ".parameters: '2r' cannot name a parameter"),
    (changed("parameters/_r", {"default": 1}), ".parameters: '_r' cannot name a parameter"),
    (changed("helpers/a b", "1"), ".helpers: 'a b' cannot name a helper"),
    (changed("parameters/density", {"default": 1}), ".parameters: 'density' is a variable of the results"),
    (changed("state", {name: {"start": 0} for name in "abcd"}), ".state: 4 entries stand here; 1 to 3"),
    (changed("across", ["q", "1", "2"]), ".across: 'q' is neither a parameter nor a state variable"),
    (changed("across", ["r", "1", "2"]), ": 'across' is given without 'up'"),
    ({**SOUND, "across": ["r", "2", "1"], "up": ["n", "0", "1"]}, ".across: "),
    ({**SOUND, "across": ["r", "1", "2"], "up": ["r", "0", "1"]}, ".up: 'r' stands on both axes"),
    ({**SOUND, "helpers": DOUBLING, "step": {"n": "h39"}}, ".helpers.h8: with its helpers written out"),
    (
        {**SOUND, "helpers": {"a": "n**40", "s": "a**40"}},
        ".step.n: nested powers multiply to an exponent of 1600",
    ),
    ({**SOUND, "helpers": {"s": "n", "e": "9**9"}, "step": {"n": "s**e"}}, ".step.n: the exponent '9 ** 9'"),
    ([], ": an empty list stands where a mapping"),
    (None, ": nothing stands where a mapping"),
    ({1: 2}, ": the key '1' is not text"),
]


class TestRefusals:
    @pytest.mark.parametrize(("config", "told"), REFUSED, ids=[told[:50] for _, told in REFUSED])
    def test_each_fault_is_told_in_one_sentence(self, config, told):
        with pytest.raises(Refusal) as refused:
            read(config)
        message = str(refused.value)
        assert message.startswith(WHERE + told)
        assert message.isprintable()
        assert len(message) < 400
        assert refused.value.exit_code == 2

    @pytest.mark.parametrize("name", ["", "../sound", "a/b", "a\\b", "a b", "-a", "ä", "x" * 41, 3, None])
    def test_names_of_families_are_words(self, name):
        with pytest.raises(Refusal, match="cannot name a family"):
            read(SOUND, name)

    @settings(derandomize=True, deadline=None, suppress_health_check=[HealthCheck.too_slow])
    @given(st.data())
    def test_any_config_gives_a_family_or_one_sentence(self, data):
        scalar = st.none() | st.booleans() | st.integers() | st.floats() | st.text(max_size=12)
        words = st.sampled_from([*SOUND, *PLANE, "n", "x", "label", "start", "default"])
        anything = st.recursive(
            scalar | words,
            lambda inner: st.lists(inner, max_size=3) | st.dictionaries(words | scalar, inner, max_size=3),
            max_leaves=6,
        )
        config = copy.deepcopy(SOUND)
        spot: Any = config
        key = data.draw(st.sampled_from(sorted(PLANE) + sorted(SOUND)))
        while isinstance(spot.get(key), dict) and data.draw(st.booleans()):
            spot = spot[key]
            key = data.draw(st.sampled_from(sorted(spot)))
        spot[key] = data.draw(anything)
        told = ""
        try:
            family = read(config)
        except Refusal as problem:
            told = str(problem)
        else:
            assert read(family.as_config()) == family
        assert not told or (told.isprintable() and told.startswith(WHERE) and len(told) < 600)
