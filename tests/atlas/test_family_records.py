"""Periodic variables, patterns, observables and thresholds of a family: read, answered and refused."""

from __future__ import annotations

import copy
import json
import math
from typing import Any

import jsonschema
import pytest
from hypothesis import HealthCheck, assume, given, settings
from hypothesis import strategies as st

from atlas.config.schema import schema
from atlas.families.catalogue import NAMES
from atlas.families.catalogue import family as catalogued
from atlas.families.patterns import LONGEST_PATTERN, LONGEST_WORD
from atlas.families.reader import Family, Observable, Pattern, family_from_config
from atlas.formula.expression import Name, evaluate, free_names, parse, unparse
from tests.atlas.test_families import DOUBLING, WHERE, changed
from tiles.errors import Refusal
from tiles.number import Exact, exact

REEF: dict[str, Any] = {
    "state": {
        "phase": {"start": "1/4", "wrap": ["0", "1"], "label": "season"},
        "n": {"start": "0.3", "label": "stock"},
    },
    "parameters": {
        "a": {"default": "2.6"},
        "b": {"default": "3.1"},
        "q": {"default": "0.1"},
        "r": {"pattern": ["a", "b", "b"], "label": "growth rate", "unit": "1/yr"},
        "h": {"pattern": ["0.1", "q"]},
    },
    "helpers": {"kept": "(1 - h) * n", "share": "q * n", "grown": "kept * 2"},
    "step": {"n": "kept * exp(r * (1 - kept))", "phase": "phase + q"},
    "observables": {
        "catch": {"formula": "share * 2", "label": "yield", "unit": "kt"},
        "turned": "1 - phase",
    },
    "extinct": {"n": "1e-6"},
    "across": ["a", "2", "3"],
    "up": ["catch", "0", "2"],
}


def read(config: Any) -> Family:
    return family_from_config("sound", config, where=WHERE)


class TestReading:
    def test_patterns_stand_apart_from_plain_parameters(self):
        family = read(REEF)
        assert family.parameter_names == ("a", "b", "q")
        assert family.pattern_names == ("h", "r")
        assert family.patterns == (
            Pattern("h", (exact("0.1"), "q")),
            Pattern("r", ("a", "b", "b"), "growth rate", "1/yr"),
        )

    def test_observables_and_thresholds(self):
        family = read(REEF)
        assert family.observable_names == ("catch", "turned")
        node = parse("share * 2", {"share"})
        assert family.observables[0] == Observable("catch", node, "yield", "kt")
        assert family.extinct == (("n", exact("1e-6")),)
        assert unparse(family.inlined_observable("catch")) == "q * n * 2"
        assert unparse(family.inlined_observable("turned")) == "1 - phase"
        with pytest.raises(KeyError):
            family.inlined_observable("total")

    def test_labels_of_everything_that_has_a_name(self):
        family = read(REEF)
        assert family.label_and_unit("r") == ("growth rate", "1/yr")
        assert family.label_and_unit("catch") == ("yield", "kt")
        assert family.label_and_unit("phase") == ("season", "")
        assert family.label_and_unit("turned") == family.label_and_unit("nothing") == ("", "")

    def test_a_family_without_them_is_written_as_before(self):
        config = catalogued("logistic").as_config()
        assert config.keys() == {
            *("title", "state", "parameters", "step", "escape", "source", "note", "across", "up")
        }
        assert catalogued("logistic").word() == ({},)
        assert catalogued("logistic").wrapped_step() == catalogued("logistic").inlined_step()

    def test_the_config_of_a_family_makes_it_again(self):
        family = read(REEF)
        text = json.dumps(family.as_config(), sort_keys=True)
        again = read(json.loads(text))
        assert again == family
        assert again.digest() == family.digest()

    @pytest.mark.parametrize(
        ("path", "value"),
        [
            ("state/phase/wrap", ["0", "2"]),
            ("parameters/r/pattern", ["b", "a", "b"]),
            ("parameters/r/label", "rate"),
            ("observables/turned", "phase"),
            ("observables/catch/unit", None),
            ("extinct/n", "1e-7"),
            ("extinct", None),
        ],
    )
    def test_the_digest_tells_each_apart(self, path, value):
        assert read(changed(path, value, REEF)).digest() != read(REEF).digest()

    def test_numbers_may_be_numbers(self):
        config = changed("parameters/r/pattern", [3, 0.1, "pi", " a "], REEF)
        found = {one.name: one.entries for one in read(config).patterns}["r"]
        assert found == (exact(3), exact("1/10"), exact("pi"), "a")
        assert read(read(config).as_config()) == read(config)
        assert read(changed("extinct/n", 1e-6, REEF)).extinct == read(REEF).extinct
        assert read(changed("observables/turned", 2, REEF)).inlined_observable("turned") == parse("2", ())

    def test_an_observable_may_use_helpers_without_patterns_and_no_state_at_all(self):
        assert read(changed("observables/turned", "share + q", REEF)).observable_names == ("catch", "turned")

    def test_the_jacobian_is_that_of_the_lift(self):
        family = read(REEF)
        rows = family.jacobian()
        assert [unparse(entry) for entry in rows[1]] == ["0", "1"]
        assert all("mod" not in unparse(entry) for row in rows for entry in row)
        assert {"r", "h"} <= free_names(rows[0][0])


ENTRIES = st.lists(st.sampled_from(["a", "b", "0.5", "1/3"]), min_size=1, max_size=12)
ALL = st.dictionaries(st.sampled_from(["r", "s", "w"]), ENTRIES, max_size=3)


def patterned(patterns: dict[str, list[str]]) -> Family:
    plain = {"a": {"default": "1"}, "b": {"default": "2"}}
    config = {
        "state": {"x": {"start": "0"}},
        "parameters": plain | {name: {"pattern": entries} for name, entries in patterns.items()},
        "step": {"x": " + ".join(["x", *patterns])},
    }
    return read(config)


class TestWords:
    @given(ALL)
    @settings(deadline=None)
    def test_every_time_has_the_entries_of_that_time(self, patterns):
        word = patterned(patterns).word()
        assert len(word) == math.lcm(*map(len, patterns.values()))
        for time in range(2 * len(word) + 3):
            letters = word[time % len(word)]
            assert letters.keys() == patterns.keys()
            for name, entries in patterns.items():
                assert str(letters[name]) == str(entries[time % len(entries)])

    @given(ALL)
    @settings(deadline=None)
    def test_words_survive_the_round_trip(self, patterns):
        family = patterned(patterns)
        assert read(family.as_config()).word() == family.word()

    @given(ALL.filter(bool), st.data())
    @settings(deadline=None)
    def test_other_entries_make_the_family_that_they_would_have_made(self, patterns, data):
        name = data.draw(st.sampled_from(sorted(patterns)))
        entries = data.draw(ENTRIES)
        given = [entry if entry in ("a", "b") else exact(entry) for entry in entries]
        made = patterned(patterns).with_patterns({name: given})
        assert made == patterned({**patterns, name: entries})

    def test_one_pattern_by_hand(self):
        family = catalogued("forced_logistic")
        assert family.word() == ({"r": "a"}, {"r": "b"})
        longer = family.with_patterns({"r": ["a", "a", exact("3.5")]})
        assert longer.word() == ({"r": "a"}, {"r": "a"}, {"r": exact("3.5")})
        assert longer.digest() != family.digest()
        assert longer.name == family.name
        assert family.word() == ({"r": "a"}, {"r": "b"})

    def test_two_patterns_by_hand(self):
        letters = [
            (word["r"], word["s"]) for word in patterned({"r": ["a", "b"], "s": ["b", "a", "a"]}).word()
        ]
        assert letters == [("a", "b"), ("b", "a"), ("a", "a"), ("b", "b"), ("a", "a"), ("b", "a")]

    def test_what_is_no_pattern_cannot_be_given_one(self):
        with pytest.raises(KeyError, match="x"):
            catalogued("forced_logistic").with_patterns({"x": ["a"]})
        with pytest.raises(KeyError, match="a"):
            catalogued("forced_logistic").with_patterns({"a": ["b"]})

    def test_the_longest_word(self):
        assert len(patterned({"r": ["a"] * 64, "s": ["b"] * 64}).word()) == 64
        assert len(patterned({"r": ["a"] * 64, "s": ["b"] * 63}).word()) == 4032 <= LONGEST_WORD
        with pytest.raises(Refusal, match=r"repeat together only after 5952 steps; at most 4096 are allowed"):
            patterned({"r": ["a"] * 64, "s": ["b"] * 62, "w": ["a"] * 3})


ENDS = st.fractions(-8, 8, max_denominator=12).map(Exact)


class TestWraps:
    def test_the_forms_by_hand(self):
        def form(low: str, high: str) -> str:
            config = {"state": {"x": {"start": low, "wrap": [low, high]}}, "step": {"x": "x + 3"}}
            return unparse(read(config).wrapped_step()[0])

        assert form("0", "1") == "mod(x + 3, 1)"
        assert form("0", "2*pi") == "mod(x + 3, 2 * pi)"
        assert form("0", "pi/3") == "mod(x + 3, pi / 3)"
        assert form("0", "1/3") == "mod(x + 3, 1 / 3)"
        assert form("1", "3") == "1 + mod(x + 3 - 1, 2)"
        assert form("-0.5", "0.5") == "-0.5 + mod(x + 3 + 0.5, 1)"
        assert form("-pi", "pi") == "-pi + mod(x + 3 + pi, 2 * pi)"
        assert form("-pi", "0") == "-pi + mod(x + 3 + pi, pi)"
        assert form("1", "pi") == "1 + mod(x + 3 - 1, pi - 1)"

    @given(ENDS, ENDS, st.floats(-50, 50))
    @settings(deadline=None)
    def test_the_wrapped_value_is_inside_and_a_whole_number_of_turns_away(self, low, high, next_value):
        assume(low < high)
        config = {
            "state": {"x": {"start": str(low), "wrap": [str(low), str(high)]}},
            "parameters": {"c": {"default": "0"}},
            "step": {"x": "c"},
        }
        family = read(config)
        (step,) = family.wrapped_step()
        found = evaluate(step, {"c": next_value})
        turns = (next_value - found) / (float(high) - float(low))
        assert float(low) - 1e-12 <= found <= float(high) + 1e-12
        assert turns == pytest.approx(round(turns), abs=1e-9)
        assert family.inlined_step() == (Name("c"),)

    def test_only_periodic_variables_are_wrapped(self):
        n, phase = read(REEF).wrapped_step()
        assert "mod" not in unparse(n)
        assert unparse(phase) == "mod(phase + q, 1)"


DOUBLED = {name: text for name, text in DOUBLING.items() if len(name) == 2 and name < "h8"}
LONG = ["a"] * (LONGEST_PATTERN + 1)

REFUSED = [
    (
        changed("state/phase/wrap", ["1", "0"], REEF),
        ".state.phase.wrap: the interval from 1 to 0 is empty or",
    ),
    (
        changed("state/phase/wrap", ["1", "1"], REEF),
        ".state.phase.wrap: the interval from 1 to 1 is empty or",
    ),
    (changed("state/phase/wrap", "1", REEF), ".state.phase.wrap: '1' is not an interval; write [low, high]"),
    (changed("state/phase/start", "1", REEF), ".state.phase.start: 1 lies outside the periodic interval; "),
    (changed("state/phase/start", "-0.1", REEF), ".state.phase.start: -0.1 lies outside the periodic"),
    (changed("state/phase/domain", ["0", "1"], REEF), ".state.phase.wrap: a periodic variable has no other"),
    (changed("state/phase/wrap", ["0", "2e6"], REEF), ".state.phase.wrap: the interval from 0 to 2000000"),
    (changed("parameters/r/default", "1", REEF), ".parameters.r: a parameter has a default or follows a"),
    (changed("parameters/r", {}, REEF), ".parameters.r: the key 'default' is missing"),
    (
        changed("parameters/r/pattern", [], REEF),
        ".parameters.r.pattern: a pattern of 0 entries is not a list",
    ),
    (changed("parameters/r/pattern", LONG, REEF), ".parameters.r.pattern: a pattern of 65 entries is not"),
    (changed("parameters/r/pattern", "a, b", REEF), ".parameters.r.pattern: 'a, b' is not a list of 1 to 64"),
    (
        changed("parameters/r/pattern", ["a", "c"], REEF),
        ".parameters.r.pattern[2]: there is no parameter 'c'",
    ),
    (changed("parameters/r/pattern", ["n"], REEF), ".parameters.r.pattern[1]: there is no parameter 'n'"),
    (changed("parameters/r/pattern", ["h"], REEF), ".parameters.r.pattern[1]: 'h' follows a pattern itself"),
    (changed("parameters/r/pattern", ["r"], REEF), ".parameters.r.pattern[1]: 'r' follows a pattern itself"),
    (changed("parameters/r/pattern", ["2 a"], REEF), ".parameters.r.pattern[1]: '2 a' is not a number"),
    (changed("parameters/r/pattern", [["a"]], REEF), ".parameters.r.pattern[1]: a list is not a number"),
    (changed("parameters/r/pattern", ["nan"], REEF), ".parameters.r.pattern[1]: there is no parameter 'nan'"),
    (changed("parameters/r/patern", ["a"], REEF), ".parameters.r: the key 'patern' is unknown; did you mean"),
    (changed("observables/catch", "m", REEF), ".observables.catch: the name 'm' is unknown"),
    (changed("observables/catch/formula", "m", REEF), ".observables.catch: the name 'm' is unknown"),
    (changed("observables/catch/formula", None, REEF), ".observables.catch: the key 'formula' is missing"),
    (
        changed("observables/catch/lable", "m", REEF),
        ".observables.catch: the key 'lable' is unknown; did you",
    ),
    (changed("observables/catch", ["n"], REEF), ".observables.catch: a list is not a formula"),
    (changed("observables/catch", "", REEF), ".observables.catch: the key has no value"),
    (changed("observables/catch", "turned", REEF), ".observables.catch: the name 'turned' is unknown"),
    (changed("step/phase", "turned", REEF), ".step.phase: the name 'turned' is unknown"),
    (changed("observables/turned", "r * n", REEF), ".observables.turned: 'r' follows a pattern in time"),
    (changed("observables/turned", "kept", REEF), ".observables.turned: 'kept' follows a pattern in time"),
    (changed("observables/turned", "grown", REEF), ".observables.turned: 'grown' follows a pattern in time"),
    (changed("observables/n", "1", REEF), ".observables: 'n' is a state variable already"),
    (changed("observables/r", "1", REEF), ".observables: 'r' is a parameter already"),
    (changed("observables/kept", "1", REEF), ".observables: 'kept' is a helper already"),
    (changed("observables/period", "1", REEF), ".observables: 'period' is a variable of the results"),
    (changed("observables/pi", "1", REEF), ".observables: 'pi' belongs to the formula language"),
    (changed("observables/a b", "1", REEF), ".observables: 'a b' cannot name an observable"),
    (changed("observables/turned", "n**99", REEF), ".observables.turned: the exponent '99' is too large"),
    (
        {**REEF, "helpers": {**REEF["helpers"], "high": "n**40"}, "observables": {"catch": "high**40"}},
        ".observables.catch: nested powers multiply to an exponent of 1600",
    ),
    (
        {**REEF, "helpers": {**REEF["helpers"], **DOUBLED}, "observables": {"catch": "h7 + h7"}},
        ".observables.catch: with its helpers written out the formula has 1023 parts",
    ),
    (changed("extinct/m", "1", REEF), ".extinct: 'm' is no state variable; allowed: n, phase"),
    (changed("extinct/n", "0", REEF), ".extinct.n: 0 is not above 0; write a number above 0"),
    (changed("extinct/n", "1e6", REEF), ".extinct.n: 1000000 is not below the escape bound 1000000"),
    (changed("extinct/n", "few", REEF), ".extinct.n: 'few' is not a number"),
    (changed("extinct", "1e-6", REEF), ".extinct: '1e-6' stands where a mapping"),
    (
        changed("across", ["r", "1", "2"], REEF),
        ".across: 'r' follows a pattern in time and is no axis; name one",
    ),
    (
        changed("across", ["h", "1", "2"], REEF),
        ".across: 'h' follows a pattern in time and is no axis; name one",
    ),
    (changed("across", ["share", "1", "2"], REEF), ".across: 'share' is neither a parameter nor a state"),
    (
        changed("up", ["phase", "0", "2"], REEF),
        ".up: the axis from 0 to 2 reaches beyond the periodic interval",
    ),
    (
        changed("up", {"name": "phase", "low": "0.1", "high": "1", "scale": "log"}, REEF),
        ".up: 'phase' is periodic and has no logarithmic axis",
    ),
    *(
        (changed(f"observables/{name}", "1", REEF), f".observables: '{name}' is a variable of the results")
        for name in ("lyapunov", "lyapunov_2", "lyapunov_error", "rotation", "escape", "attractors")
    ),
    *(
        (changed(f"parameters/{name}", {"default": "1"}, REEF), f".parameters: '{name}' is a variable of the")
        for name in ("basin", "attractor")
    ),
]


class TestSchema:
    validator = jsonschema.Draft202012Validator(schema())

    def test_editors_accept_what_the_reader_accepts(self):
        for tree in (REEF, read(REEF).as_config(), *(catalogued(name).as_config() for name in NAMES)):
            self.validator.validate({"families": {"reef": tree}})

    @pytest.mark.parametrize(
        ("path", "value"),
        [
            ("parameters/r/default", "1"),
            ("parameters/r", {}),
            ("parameters/r/pattern", []),
            ("parameters/r/pattern", LONG),
            ("parameters/r/pattern", "a"),
            ("state/phase/wrap", ["0"]),
            ("observables/catch/formula", None),
            ("observables/catch", ["n"]),
            ("observables/catch/lable", "x"),
            ("extinct/n", ["1"]),
            ("extinct", "1e-6"),
        ],
    )
    def test_editors_refuse_wrong_forms(self, path, value):
        assert not self.validator.is_valid({"families": {"reef": changed(path, value, REEF)}})


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

    @settings(derandomize=True, deadline=None, suppress_health_check=[HealthCheck.too_slow])
    @given(st.data())
    def test_any_config_gives_a_family_or_one_sentence(self, data):
        scalar = st.none() | st.booleans() | st.integers() | st.floats() | st.text(max_size=12)
        words = st.sampled_from([*REEF, "a", "r", "n", "wrap", "pattern", "formula", "0", "1e-6", "2*pi"])
        anything = st.recursive(
            scalar | words,
            lambda inner: st.lists(inner, max_size=3) | st.dictionaries(words | scalar, inner, max_size=3),
            max_leaves=6,
        )
        config = copy.deepcopy(REEF)
        spot: Any = config
        key = data.draw(st.sampled_from(sorted(REEF)))
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
