"""Kinds of view: what follows from the axes, which keys belong to which kind, and what is refused."""

from __future__ import annotations

import copy
import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import atlas
from atlas.config.digests import counting_digest, decisive
from atlas.config.draws import DRAWS, KINDS, PLANE_DRAWS, kind_of_view
from atlas.config.keys import JOB_KEYS, PLATE_KEYS
from atlas.config.load import digest, normalised, parse_config, plate_from_parts
from atlas.config.remake import from_normalised
from atlas.config.view_kind import draws_of
from atlas.reading.orbit_kinds import Record
from atlas.reading.yaml_text import read_yaml
from tests.atlas.test_config import HOSTILE, answer, paths
from tiles.errors import Refusal
from tiles.number import exact
from tiles.palette import PALETTES

VIEWS = Path(__file__).with_name("views.yaml").read_text(encoding="utf-8")
TREE: Any = read_yaml(VIEWS, "views.yaml")
CONFIG = parse_config(VIEWS)
PLATES = CONFIG.plates
PATHS = paths(TREE)


def views() -> dict[str, Any]:
    return copy.deepcopy(TREE)


def changed(plate: str, **keys: Any) -> dict[str, Any]:
    """Return the config with other keys of a plate; None takes a key away."""
    tree = views()
    section = tree["plates"][plate]
    section.update(keys)
    for key in [key for key, value in section.items() if value is None]:
        del section[key]
    return tree


def refusal_of(tree: dict[str, Any]) -> str:
    with pytest.raises(Refusal) as caught:
        parse_config(tree, "views.yaml")
    assert caught.value.exit_code == 2
    assert "\n" not in str(caught.value)
    return str(caught.value)


class TestKinds:
    @pytest.mark.parametrize(
        ("name", "kind", "draw", "palette"),
        [
            ("yearly", "histogram", "density", "grey"),
            ("split", "histogram", "density", "grey"),
            ("both_ways", "follow", "density", "grey"),
            ("portrait", "portrait", "density", "grey"),
            ("angles", "histogram", "density", "grey"),
            ("fates", "plane", "fate", "kinds"),
            ("exponents", "plane", "lyapunov", "balance"),
            ("second", "plane", "lyapunov_2", "balance"),
            ("winding", "plane", "rotation", "wheel"),
            ("basins", "basin", "basin", "kinds"),
        ],
    )
    def test_the_axes_and_draw_decide_the_kind_and_the_palette(
        self, name: str, kind: str, draw: str, palette: str
    ):
        plate = PLATES[name]
        assert (plate.kind, plate.draw, plate.palette) == (kind, draw, palette)

    def test_a_tile_set_has_a_kind_too(self):
        tiles = CONFIG.tile_sets["fate_tiles"]
        assert (tiles.kind, tiles.palette, tiles.steps) == ("plane", "kinds", 4000)

    def test_every_kind_occurs_and_every_draw_has_one(self):
        assert {plate.kind for plate in PLATES.values()} == set(KINDS)
        assert [kind_of_view(draw, True) for draw in DRAWS] == ["histogram", *["plane"] * 7, "basin"]
        assert kind_of_view("density", True, "up") == "follow"
        assert kind_of_view("density", False, None) == "portrait"

    def test_the_palette_of_each_draw_is_of_its_kind(self):
        for draw in DRAWS.values():
            assert PALETTES[draw.palette].kind == draw.palette_kind

    def test_what_can_be_drawn_of_two_axes(self):
        plates = PLATES
        assert draws_of(plates["fates"].family, plates["fates"].view) == PLANE_DRAWS
        assert draws_of(plates["basins"].family, plates["basins"].view) == ("density", "basin")
        assert draws_of(plates["portrait"].family, plates["portrait"].view) == ("density",)
        assert draws_of(plates["yearly"].family, plates["yearly"].view) == ("density",)

    def test_two_observables_make_a_portrait(self):
        tree = changed("portrait", across=["share", 0, 1])
        tree["families"]["stages"]["observables"]["share"] = "adults / (adults + juveniles)"
        plate = parse_config(tree).plates["portrait"]
        assert (plate.kind, plate.across.name, plate.up.name) == ("portrait", "share", "total")

    @pytest.mark.parametrize("draw", PLANE_DRAWS)
    def test_every_plane_can_be_asked_for(self, draw: str):
        plate = parse_config(changed("fates", draw=draw)).plates["fates"]
        assert (plate.kind, plate.draw) == ("plane", draw)
        assert plate.palette == ("grey" if draw == "escape" else DRAWS[draw].palette)

    def test_one_variable_has_planes_without_second_exponent_or_rotation(self):
        axes = (("growth", 5, 100), ("beta", 2, 10))
        assert plate_from_parts("hassell", *axes).draw == "fate"
        assert plate_from_parts("hassell", *axes, draw="escape").palette == "blue"
        for draw, words in (
            (
                "lyapunov_2",
                "draw: 'lyapunov_2' needs two state variables, which the family 'hassell' lacks; ",
            ),
            ("rotation", "draw: 'rotation' needs a state variable with wrap, or two state variables, which"),
        ):
            with pytest.raises(Refusal) as caught:
                plate_from_parts("hassell", *axes, draw=draw)
            assert str(caught.value).startswith(words)
            assert str(caught.value).endswith("; allowed: fate, period, lyapunov, escape, attractors")


class TestValues:
    def test_what_is_given_is_kept(self):
        assert PLATES["yearly"].record == Record(2, 1)
        assert PLATES["split"].by_attractor is True
        assert PLATES["both_ways"].follow == "both"
        assert (PLATES["fates"].steps, PLATES["exponents"].steps) == (4000, 64)
        assert (PLATES["fates"].supersampling, PLATES["exponents"].supersampling) == (2, 4)

    def test_extinction_is_that_of_the_family_unless_given(self):
        assert PLATES["exponents"].extinct == {"adults": exact("1e-6")}
        assert PLATES["fates"].extinct == {"juveniles": exact("1e-5")}
        assert PLATES["basins"].extinct == {}
        assert PLATES["yearly"].extinct == {}

    def test_common_defaults_are_passed_over_where_they_do_not_belong(self):
        yearly, fates = PLATES["yearly"], PLATES["fates"]
        assert (yearly.shading, yearly.palette, yearly.steps, yearly.supersampling) == (
            "logarithmic",
            "grey",
            2000,
            1,
        )
        assert (fates.shading, fates.palette, fates.steps, fates.supersampling) == (
            "equalised",
            "kinds",
            4000,
            2,
        )

    @pytest.mark.parametrize("name", list(PLATES))
    def test_a_key_of_another_kind_holds_its_default(self, name: str):
        plate = PLATES[name]
        for key in PLATE_KEYS:
            if key.only_for and plate.kind not in key.only_for:
                assert getattr(plate, key.name) == ({} if key.name == "extinct" else key.default)

    @pytest.mark.parametrize("name", list(PLATES))
    def test_a_default_that_does_not_belong_changes_nothing(self, name: str):
        tree = views()
        of_planes = {"steps": "5000", "supersampling": "2"}
        of_densities = {"samples": "77", "values_per_column": "3", "shading": "ink"}
        tree["defaults"] |= of_densities if PLATES[name].kind in ("plane", "basin") else of_planes
        assert parse_config(tree).plates[name] == PLATES[name]
        assert digest(parse_config(tree).plates[name]) == digest(PLATES[name])

    def test_a_pattern_can_be_set(self):
        plate = PLATES["exponents"]
        assert plate.set == {"fecundity": exact(30)}
        assert [row["settlement"] for row in plate.family.word()] == ["good", "good", "poor"]
        assert [row["settlement"] for row in PLATES["fates"].family.word()] == ["good", "poor"]
        assert CONFIG.families["stages"] == PLATES["fates"].family
        numbers = parse_config(changed("fates", set={"settlement": {"pattern": ["1/3", "good", 2]}}))
        entries = numbers.plates["fates"].family.patterns[0].entries
        assert entries == (exact("1/3"), "good", exact(2))

    def test_parameters_of_a_plane_are_those_on_no_axis(self):
        assert PLATES["exponents"].parameters() == {"fecundity": exact(30), "survival": exact("0.5")}

    def test_starts_can_be_a_grid(self):
        starts = PLATES["split"].starts
        assert [(str(s["juveniles"]), str(s["adults"])) for s in starts] == [
            ("1.5", "0.5"),
            ("1.5", "1.5"),
            ("1.5", "2.5"),
            ("4.5", "0.5"),
            ("4.5", "1.5"),
            ("4.5", "2.5"),
        ]

    def test_starts_of_one_variable_are_completed_by_the_family(self):
        plate = parse_config(changed("split", starts={"grid": [2], "box": {"adults": [0, 2]}})).plates[
            "split"
        ]
        assert plate.starts == (
            {"adults": exact("0.5"), "juveniles": exact("0.2")},
            {"adults": exact("1.5"), "juveniles": exact("0.2")},
        )

    def test_python_takes_every_option(self):
        plate = atlas.plate(
            CONFIG.families["stages"],
            ("fecundity", 2, 60),
            ("total", 0, 12),
            set={"settlement": {"pattern": ("good", 0.5)}},
            starts={"grid": (2, 2), "box": {"adults": (0, 1), "juveniles": (0, 1)}},
            record={"every": 12, "phase": 3},
            by_attractor=True,
        )
        assert (plate.record, plate.by_attractor, len(plate.starts)) == (Record(12, 3), True, 4)
        assert plate.family.patterns[0].entries == ("good", exact("0.5"))
        plane = atlas.plate(
            CONFIG.families["stages"],
            ("good", 0, 1),
            ("poor", 0, 1),
            draw="attractors",
            extinct={"juveniles": 1e-6},
            steps=64,
            supersampling=2,
        )
        assert (plane.draw, plane.steps, plane.supersampling) == ("attractors", 64, 2)
        assert plane.extinct == {"juveniles": exact("1e-6")}
        again = atlas.plate(plane.family, plane.across, plane.up, record=None, draw=plane.draw)
        assert again.kind == "plane"


class TestRecords:
    @pytest.mark.parametrize("name", list(CONFIG.outputs()))
    def test_the_record_is_made_again_from_its_normalised_form(self, name: str):
        record = CONFIG.outputs()[name]
        form = json.loads(json.dumps(normalised(record)))
        again = from_normalised(form)
        assert again == record
        assert normalised(again) == form
        assert digest(again) == digest(record)

    def test_plates_of_one_family_with_other_patterns_share_a_figure(self):
        figure = from_normalised(normalised(CONFIG.figures["seasons"]))
        families = [plate.family for plate in figure.plates.values()]
        assert [len(family.word()) for family in families] == [2, 3]
        assert len({family.name for family in families}) == 1

    @pytest.mark.parametrize(
        ("name", "keys"),
        [
            ("yearly", {"record": {"every": 2, "phase": 0}}),
            ("yearly", {"record": None}),
            ("split", {"by_attractor": "false"}),
            ("split", {"starts": None}),
            ("both_ways", {"follow": "up"}),
            ("both_ways", {"follow": None}),
            ("fates", {"draw": "period"}),
            ("fates", {"extinct": None}),
            ("fates", {"steps": 100}),
            ("exponents", {"set": {"settlement": {"pattern": ["good", "poor", "good"]}, "fecundity": 30}}),
            ("basins", {"draw": "density", "extinct": None}),
        ],
    )
    def test_what_is_counted_changes_both_digests(self, name: str, keys: dict[str, Any]):
        before, after = PLATES[name], parse_config(changed(name, **keys)).plates[name]
        assert digest(before) != digest(after)
        assert counting_digest(before, 100, 50) != counting_digest(after, 100, 50)

    def test_colours_labels_and_supersampling_do_not_belong_to_the_counts(self):
        before = PLATES["fates"]
        tree = changed("fates", supersampling=1)
        total = tree["families"]["stages"]["observables"]["total"]
        total.update(label="everyone", formula="juveniles + 2 * adults")
        tree["families"]["stages"]["extinct"] = {"adults": 1}
        after = parse_config(tree).plates["fates"]
        assert digest(before) != digest(after)
        assert counting_digest(before, 9, 9) == counting_digest(after, 9, 9)
        assert counting_digest(PLATES["yearly"], 9, 9) != counting_digest(
            parse_config(tree).plates["yearly"], 9, 9
        )

    def test_wrapping_belongs_to_the_counts(self):
        tree = views()
        tree["families"]["tide"]["state"]["angle"]["wrap"] = [0, "4*pi"]
        after = parse_config(tree).plates["angles"]
        assert counting_digest(PLATES["angles"], 9, 9) != counting_digest(after, 9, 9)

    def test_what_decides_the_counts_is_written_as_a_config_writes_it(self):
        written = decisive(PLATES["exponents"])["settings"]
        assert set(written) == {key.name for key in JOB_KEYS if key.counts}
        assert (written["draw"], written["record"]) == ("lyapunov", None)
        assert decisive(PLATES["yearly"])["settings"]["record"] == {"every": 2, "phase": 1}


# Of which plate, with which keys, and what the sentence says.
WRONG: list[tuple[str, dict[str, Any], str]] = [
    (
        "yearly",
        {"up": ["totl", 0, 1]},
        "yearly.up: the family 'stages' has no parameter, state variable or obs",
    ),
    ("yearly", {"up": ["totl", 0, 1]}, "'totl'; did you mean 'total'?"),
    (
        "yearly",
        {"across": ["settlement", 0, 1]},
        "plates.yearly.across: 'settlement' is a pattern in time, which cannot be an axis; name one of its "
        "letters: good, poor",
    ),
    ("fates", {"up": ["settlement", 0, 1]}, "plates.fates.up: 'settlement' is a pattern in time"),
    (
        "yearly",
        {"across": ["adults", 0, 1], "up": ["good", 0, 1]},
        "plates.yearly.across: a state variable (adults) across and a parameter (good) up cannot be drawn; "
        "swap the axes",
    ),
    (
        "yearly",
        {"across": ["total", 0, 1], "up": ["good", 0, 1]},
        "an observable (total) across and a parameter (good) up cannot be drawn; swap the axes",
    ),
    ("fates", {"up": ["good", 0, 1]}, "plates.fates.up: 'good' stands on both axes; allowed are a parameter"),
    (
        "yearly",
        {"draw": "fate"},
        "plates.yearly.draw: 'fate' cannot be drawn of a parameter (fecundity) across and an observable "
        "(total) up; allowed: density",
    ),
    (
        "fates",
        {"draw": "density"},
        "(good) across and a parameter (poor) up; allowed: fate, period, lyapunov",
    ),
    ("basins", {"draw": "lyapunov"}, "and a state variable (adults) up; allowed: density, basin"),
    ("portrait", {"draw": "basin"}, "and an observable (total) up; allowed: density"),
    ("fates", {"draw": "fates"}, "plates.fates.draw: 'fates' is unknown; did you mean 'fate'?"),
    (
        "winding",
        {"draw": "lyapunov_2"},
        "'lyapunov_2' needs two state variables, which the family 'tide' lacks; allowed: f",
    ),
    (
        "yearly",
        {"up": {"name": "total", "low": 0, "high": 9, "wrap": [0, 9]}},
        "plates.yearly.up: an axis has no wrap; give wrap to the state variable of the family, if it is per",
    ),
    (
        "angles",
        {"up": {"name": "angle", "low": 1, "high": 2, "scale": "log"}},
        "plates.angles.up: 'angle' is wrapped to 0 to 2*pi and cannot have a log axis; write linear",
    ),
    (
        "angles",
        {"up": ["angle", "-pi", "pi"]},
        "plates.angles.up: -1*pi to 1*pi reaches beyond 0 to 2*pi, to which 'angle' is wrapped; stay inside",
    ),
    ("angles", {"up": ["angle", 0, 7]}, "0 to 7 reaches beyond 0 to 2*pi"),
    (
        "angles",
        {"starts": [{"angle": 0}, {"angle": "2*pi"}]},
        "angles.starts[2].angle: the start 2*pi lies out",
    ),
    ("angles", {"starts": [{"angle": -1}]}, "'angle' is wrapped; start at 0 or more and below 2*pi"),
    ("fates", {"follow": "up"}, "plates.fates.follow: 'up' belongs to an orbit histogram or a followed"),
    ("portrait", {"follow": "both"}, "and this is a phase portrait; leave it away"),
    ("both_ways", {"follow": "left"}, "plates.both_ways.follow: 'left' is unknown; allowed: both, down, up"),
    (
        "fates",
        {"record": {"every": 2}},
        "plates.fates.record: 'every: 2, phase: 0' belongs to an orbit histogram or a phase portrait, and "
        "this is a parameter plane; leave it away",
    ),
    ("both_ways", {"record": {"every": 2}}, "and this is a followed attractor; leave it away"),
    (
        "both_ways",
        {"by_attractor": True},
        "both_ways.by_attractor: 'true' belongs to an orbit histogram or a ph",
    ),
    ("basins", {"by_attractor": True}, "and this is a basin chart; leave it away"),
    (
        "yearly",
        {"extinct": {"adults": "1e-3"}},
        "yearly.extinct: 'adults: 0.001' belongs to a parameter plane",
    ),
    ("yearly", {"steps": 500}, "plates.yearly.steps: '500' belongs to a parameter plane or a basin chart"),
    ("yearly", {"supersampling": 2}, "plates.yearly.supersampling: '2' belongs to a parameter plane or a"),
    ("fates", {"samples": 500}, "plates.fates.samples: '500' belongs to an orbit histogram, a followed attr"),
    (
        "fates",
        {"values_per_column": 5},
        "plates.fates.values_per_column: '5' belongs to an orbit histogram or",
    ),
    ("fates", {"shading": "ink"}, "plates.fates.shading: 'ink' belongs to an orbit histogram, a followed"),
    ("fates", {"supersampling": 3}, "plates.fates.supersampling: '3' is not one of 1, 2, 4"),
    ("fates", {"supersampling": 8}, "plates.fates.supersampling: '8' is out of range"),
    ("fates", {"steps": 63}, "plates.fates.steps: '63' is out of range; write a whole number from 64"),
    (
        "fates",
        {"palette": "blue"},
        "palette: 'blue' is a sequential palette and fate needs a categorical one; all",
    ),
    ("exponents", {"palette": "grey"}, "and lyapunov needs a diverging one; allowed: balance"),
    (
        "yearly",
        {"palette": "wheel"},
        "'wheel' is a cyclic palette and density needs a sequential one; allowed: grey",
    ),
    ("yearly", {"record": {"phase": 3}}, "plates.yearly.record: the key 'every' is missing"),
    (
        "yearly",
        {"record": {"every": 3, "phase": 3}},
        "record.phase: the phase 3 is not below the stride 3; write 0",
    ),
    ("yearly", {"record": {"every": 0}}, "plates.yearly.record.every: '0' is out of range"),
    (
        "yearly",
        {"record": {"evry": 3}},
        "plates.yearly.record: the key 'evry' is unknown; did you mean 'every'?",
    ),
    ("yearly", {"record": 12}, "plates.yearly.record: '12' stands where a mapping of keys belongs"),
    (
        "fates",
        {"extinct": {"adlts": 1}},
        "fates.extinct: the family 'stages' has no state variable 'adlts'; did",
    ),
    ("fates", {"extinct": {"adults": 0}}, "fates.extinct.adults: 0 is not above 0; write a number above 0"),
    ("fates", {"extinct": {"adults": -1}}, "fates.extinct.adults: -1 is not above 0"),
    (
        "fates",
        {"extinct": {"adults": "1e7"}},
        "10000000 is not below the escape bound 1000000; write a size that",
    ),
    ("fates", {"extinct": 3}, "plates.fates.extinct: '3' stands where a mapping of keys belongs"),
    (
        "fates",
        {"set": {"settlement": 1}},
        "set.settlement: 'settlement' is the pattern [good, poor], which no",
    ),
    ("fates", {"set": {"settlement": 1}}, "set its letters, or write {pattern: [1]}"),
    (
        "fates",
        {"set": {"survival": {"pattern": [1]}}},
        "'survival' is a plain parameter, no pattern; write a n",
    ),
    (
        "fates",
        {"set": {"setlement": {"pattern": [1]}}},
        "has no pattern 'setlement'; did you mean 'settlement'?",
    ),
    (
        "winding",
        {"set": {"x": {"pattern": [1]}}},
        "the family 'tide' has no pattern 'x', and no pattern at all",
    ),
    (
        "fates",
        {"set": {"settlement": {"pattern": ["good", "bad"]}}},
        "plates.fates.set.settlement.pattern[2]: there is no parameter 'bad'",
    ),
    ("fates", {"set": {"settlement": {"pattern": ["settlement"]}}}, "'settlement' follows a pattern itself"),
    ("fates", {"set": {"settlement": {"pattern": []}}}, "a pattern of 0 entries is not a list of 1 to 64"),
    (
        "fates",
        {"set": {"settlement": {"patern": [1]}}},
        "the key 'patern' is unknown; did you mean 'pattern'?",
    ),
    ("fates", {"set": {"survival": [1]}}, "plates.fates.set.survival: a list is not a number"),
    ("split", {"starts": {"grid": [2]}}, "plates.split.starts: the key 'box' is missing"),
    (
        "split",
        {"starts": {"grid": [100, 100], "box": {"adults": [0, 1], "juveniles": [0, 1]}}},
        "a grid of 100 x 100 has 10000 starts",
    ),
    (
        "split",
        {"starts": {"grid": [100, 100], "box": {"adults": [0, 1], "juveniles": [0, 1]}}},
        "at most 4096 are",
    ),
    (
        "split",
        {"starts": {"grid": [2, 2], "box": {"adults": [0, 1]}}},
        "2 counts are given for the 1 sides of the box",
    ),
    (
        "split",
        {"starts": {"grid": [0], "box": {"adults": [0, 1]}}},
        "plates.split.starts.grid[1]: '0' is out of",
    ),
    (
        "split",
        {"starts": {"grid": 3, "box": {"adults": [0, 1]}}},
        "plates.split.starts.grid: '3' is not a list of",
    ),
    (
        "split",
        {"starts": {"grid": [2], "box": {"adults": [1, 0]}}},
        "starts.box.adults: the interval from 1 to 0 is",
    ),
    (
        "split",
        {"starts": {"grid": [2], "box": {"adults": [0]}}},
        "starts.box.adults: a list is not an interval",
    ),
    (
        "split",
        {"starts": {"grid": [2], "box": {"adults": [1, "2*pi"]}}},
        "mixes a plain number and a multiple of pi",
    ),
    ("split", {"starts": {"grid": [2], "box": {}}}, "starts.box: an empty mapping is not a mapping of state"),
    (
        "split",
        {"starts": {"grid": [2], "box": {"eggs": [0, 1]}}},
        "starts[1]: the family 'stages' has no state",
    ),
    ("split", {"starts": {"adults": 1}}, "plates.split.starts: a mapping is not a list of states"),
    (
        "basins",
        {"starts": [{}, {"adults": 1}]},
        "basins.starts: 2 starts are given and a basin chart starts from",
    ),
]


class TestRefusals:
    @pytest.mark.parametrize(("plate", "keys", "words"), WRONG, ids=[row[2][:60] for row in WRONG])
    def test_what_is_wrong_is_named_with_its_place(self, plate: str, keys: dict[str, Any], words: str):
        sentence = refusal_of(changed(plate, **keys))
        assert words in sentence
        assert sentence.startswith(f"views.yaml: plates.{plate}.")

    def test_a_pattern_of_numbers_has_no_letters_to_name(self):
        tree = changed("fates", across=["settlement", 0, 1])
        tree["families"]["stages"]["parameters"]["settlement"] = {"pattern": [1, 2]}
        assert "which cannot be an axis; it has no letters to name" in refusal_of(tree)

    def test_more_than_three_state_variables(self):
        tree = views()
        family = tree["families"]["stages"]
        family["state"] |= {"eggs": {"start": 1}, "larvae": {"start": 1}}
        family["step"] |= {"eggs": "eggs", "larvae": "larvae"}
        assert "families.stages.state: 4 entries stand here; 1 to 3 are allowed" in refusal_of(tree)

    def test_patterns_that_repeat_too_late_together(self):
        tree = changed("fates", set={"settlement": {"pattern": ["good"] * 63}})
        parameters = tree["families"]["stages"]["parameters"]
        parameters |= {"first": {"pattern": [1] * 64}, "second": {"pattern": [1] * 61}}
        assert "at most 4096 are allowed" in refusal_of(tree)

    def test_a_key_of_another_kind_may_say_its_default(self):
        keys = {"samples": "auto", "by_attractor": "false", "values_per_column": 32, "shading": "equalised"}
        assert parse_config(changed("fates", **keys)).plates["fates"] == PLATES["fates"]
        keys = {"steps": 2000, "supersampling": 1, "extinct": {}}
        assert parse_config(changed("yearly", **keys)).plates["yearly"] == PLATES["yearly"]


class TestProperties:
    @settings(deadline=None, max_examples=150)
    @given(st.lists(st.tuples(st.sampled_from(PATHS), HOSTILE), min_size=1, max_size=2))
    def test_a_spoilt_config_is_read_or_refused_in_one_sentence(self, spoils: list[Any]):
        tree = views()
        for path, value in spoils:
            put(tree, path, lambda _, value=value: value)
        outcome = answer(tree)
        if isinstance(outcome, str):
            assert "\n" not in outcome
            assert outcome.startswith("sound.yaml: ")
            assert len(outcome) < 1000

    @settings(deadline=None, max_examples=100)
    @given(
        st.sampled_from([path for path in PATHS if path[0] == "plates" and len(path) == 3]),
        st.sampled_from([path for path in PATHS if path[0] == "plates" and len(path) == 3]),
    )
    def test_whatever_is_read_with_a_key_of_another_plate_is_made_again(self, path: Any, other: Any):
        tree = views()
        put(tree, (*path[:2], other[2]), lambda _: copy.deepcopy(TREE["plates"][other[1]][other[2]]))
        outcome = answer(tree)
        if not isinstance(outcome, str):
            plate = outcome.plates[path[1]]
            form = normalised(plate)
            assert from_normalised(json.loads(json.dumps(form))) == plate
            assert plate.kind in KINDS
            assert PALETTES[plate.palette].kind == DRAWS[plate.draw].palette_kind


def put(tree: Any, path: tuple[Any, ...], make: Callable[[Any], Any]) -> None:
    """Put a value at the end of a way, where the way is still there."""
    for key in path[:-1]:
        if not (isinstance(tree, dict) and key in tree) and not (isinstance(tree, list) and key < len(tree)):
            return
        tree = tree[key]
    if isinstance(tree, dict) or (isinstance(tree, list) and path[-1] < len(tree)):
        tree[path[-1]] = make(tree)
