"""Configs: what they come to, read from files, mappings and parts; and what no input may do."""

from __future__ import annotations

import copy
from fractions import Fraction
from pathlib import Path
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from atlas.config.load import Config, load, normalised, parse_config, plate_from_parts
from atlas.errors import ConfigRefused
from atlas.figure.layout import layout
from atlas.figure.panels import request_of
from atlas.reading.place import COMMAND_LINE
from atlas.reading.sheet import Size
from atlas.reading.view_kinds import Levels
from atlas.reading.yaml_text import LARGEST_FILE, read_yaml
from tiles.errors import Refusal
from tiles.number import exact
from tiles.window import View

SOUND = Path(__file__).with_name("sound.yaml").read_text(encoding="utf-8")
TREE: Any = read_yaml(SOUND, "sound.yaml")


def sound() -> dict[str, Any]:
    return copy.deepcopy(TREE)


class TestRecords:
    def test_a_plate_holds_what_the_file_says(self):
        plate = parse_config(SOUND).plates["growth"]
        assert plate.name == "growth"
        assert plate.family.name == "sound"
        assert plate.view == View(("r", "1.6", "4.2"), ("n", 0, "3.5"))
        assert plate.set == {"h": exact("0.1")}
        assert plate.size == Size(Fraction(180), Fraction(110))
        assert plate.pixels == (4252, 2598)
        assert plate.palette == "grey"
        assert plate.inset is not None
        assert plate.inset.view == View(("r", "2.6", 3), ("n", 1, 2))
        assert (plate.inset.corner, plate.inset.width) == ("lower left", 0.4)

    def test_defaults_of_the_file_go_before_those_of_the_program(self):
        config = parse_config(SOUND)
        growth, harvest = config.plates["growth"], config.plates["harvest"]
        assert (growth.transient, growth.dpi, growth.formats) == (2000, 600, ("png", "pdf"))
        assert harvest.dpi == 300
        assert config.figures["both"].dpi == 600
        assert config.tile_sets["tiles"].transient == 2000

    def test_defaults_of_the_program(self):
        plate = plate_from_parts("logistic", ("r", "2.8", 4), ("x", 0, 1))
        assert (plate.transient, plate.transient_limit, plate.samples) == (1000, 1_000_000, "auto")
        assert (plate.values_per_column, plate.longest_period) == (32, 64)
        assert (plate.shading, plate.dpi, plate.formats) == ("equalised", 300, ("png",))
        assert plate.size == Size.parse("180x110")
        assert (plate.background, plate.missing, plate.title, plate.letter, plate.inset) == (None,) * 5
        assert plate.key is False
        assert plate.font_size == 8.0

    def test_numbers_stay_exact(self):
        plate = parse_config(SOUND).plates["harvest"]
        assert plate.across.low.value == Fraction(1, 100)
        assert plate.starts[1]["n"].value == Fraction(1, 3)
        assert plate.across.scale == "log"
        assert plate.across.label == "share taken"

    def test_starts_are_completed_by_the_family(self):
        assert parse_config(SOUND).plates["growth"].starts == ({"n": exact("0.3")},)

    def test_a_catalogue_family_needs_no_entry_and_an_own_family_goes_first(self):
        config = parse_config(SOUND)
        assert config.plates["rise"].family.name == "logistic"
        assert list(config.families) == ["sound"]
        tree = sound()
        tree["families"]["logistic"] = tree["families"]["sound"]
        tree["plates"] = {"own": {"family": "logistic", "across": ["r", 1, 2], "up": ["n", 0, 1]}}
        del tree["figures"]
        assert parse_config(tree).plates["own"].family.states[0].name == "n"

    def test_parameters_off_the_axes_have_values(self):
        config = parse_config(SOUND)
        assert config.plates["growth"].parameters() == {"h": exact("0.1")}
        assert config.plates["harvest"].parameters() == {"r": exact("2.6")}

    def test_a_tile_set_has_levels_an_axis_and_carries_the_title_of_the_file(self):
        tiles = parse_config(SOUND).tile_sets["tiles"]
        assert tiles.levels == Levels(6, 3)
        assert tiles.cells == (256 * 64, 256 * 8)
        assert tiles.pairs == "all"
        assert tiles.title == "Harrow Sound scallops, an invented stock"

    def test_level_pairs_can_be_listed(self):
        tree = sound()
        tree["tile_sets"]["tiles"]["pairs"] = [["6", "3"], [0, 0]]
        assert parse_config(tree).tile_sets["tiles"].pairs == ((0, 0), (6, 3))

    def test_a_figure_holds_its_plates(self):
        figure = parse_config(SOUND).figures["both"]
        assert figure.panels == (("growth",), ("harvest",))
        assert list(figure.plates) == ["growth", "harvest"]
        assert figure.letters is True
        tree = sound()
        tree["figures"]["both"]["panels"] = ["growth", "harvest"]
        assert parse_config(tree).figures["both"].panels == (("growth", "harvest"),)

    @pytest.mark.parametrize(
        ("keys", "defaults", "letters"),
        [
            ({"panels": ["growth"]}, {}, False),
            ({"panels": [["growth"]]}, {}, False),
            ({"panels": [["growth"]], "letters": True}, {}, True),
            ({"panels": [["growth"]]}, {"letters": True}, True),
            ({"panels": [["growth"], ["harvest"]]}, {}, True),
            ({"panels": ["growth", "harvest"]}, {"letters": False}, False),
        ],
    )
    def test_one_panel_carries_a_letter_only_when_asked(
        self, keys: dict[str, Any], defaults: dict[str, Any], letters: bool
    ):
        tree = sound()
        tree["figures"]["both"] = keys
        tree["defaults"] |= defaults
        figure = parse_config(tree).figures["both"]
        assert figure.letters is letters
        assert layout(request_of(figure)).panels[0].letter == ("a" if letters else "")

    @pytest.mark.parametrize("given", ["tif", ["tif"], ["png", "tif"], ["png", "tiff"]])
    def test_tif_is_another_word_for_tiff(self, given: Any):
        tree = sound()
        tree["plates"]["growth"]["formats"] = given
        plate = parse_config(tree).plates["growth"]
        assert plate.formats == (("png", "tiff") if len(given) == 2 else ("tiff",))
        assert normalised(plate)["settings"]["formats"] == list(plate.formats)
        tree["plates"]["growth"]["formats"] = ["tif", "tiff"]
        with pytest.raises(ConfigRefused, match="a word is listed twice"):
            parse_config(tree)

    def test_panels_with_equal_intervals_may_share_an_axis(self):
        tree = sound()
        tree["figures"]["both"] = {"panels": ["growth", "harvest"], "share": "up"}
        assert parse_config(tree).figures["both"].share == ("up",)

    def test_a_long_transient_raises_a_limit_that_was_not_given(self):
        plate = plate_from_parts("logistic", ("r", "2.8", 4), ("x", 0, 1), transient="2e6")
        assert plate.transient_limit == 2_000_000

    def test_an_inset_takes_the_scale_of_its_plate(self):
        tree = sound()
        tree["plates"]["harvest"]["inset"] = {"across": ["h", "0.1", "0.2"], "up": ["n", 1, 2]}
        plate = parse_config(tree).plates["harvest"]
        inset = plate.inset_plate()
        assert inset is not None
        assert inset.view.across.scale == "log"
        assert inset.inset is None

    def test_colours_are_kept_in_one_form(self):
        plate = plate_from_parts("logistic", ("r", "2.8", 4), ("x", 0, 1), background="#FFF", missing="black")
        assert (plate.background, plate.missing) == ("#ffffff", "#000000")

    def test_python_values_mean_what_their_texts_mean(self):
        tree = {
            "plates": {
                "rise": {
                    "family": "logistic",
                    "across": ("r", 2.8, exact(4)),
                    "up": ["x", 0, Fraction(1)],
                    "samples": 5000,
                    "key": True,
                    "letter": "a",
                    "transient": 2000.0,
                    "dpi": 600,
                    "formats": ("png", "pdf"),
                }
            }
        }
        assert parse_config(tree).plates["rise"] == parse_config(SOUND).plates["rise"]

    def test_empty_sections_are_absent_sections(self):
        config = parse_config("plates: {p: {family: tent, across: [mu, 1, 2], up: [x, 0, 1]}}\ntile_sets:\n")
        assert config.tile_sets == {}
        assert config.title == ""
        assert list(config.outputs()) == ["p"]


class TestFiles:
    def test_a_file_is_read_and_remembered(self, tmp_path: Path):
        path = tmp_path / "sound.yaml"
        path.write_text(SOUND, encoding="utf-8")
        config = load(path)
        assert config.path == path
        assert list(config.plates) == ["growth", "harvest", "rise"]
        assert load(str(path)) == config

    def test_the_sentence_names_the_file_as_the_user_did(
        self, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
    ):
        (tmp_path / "sound.yaml").write_text("plates: {a: {}}", encoding="utf-8")
        monkeypatch.chdir(tmp_path)
        with pytest.raises(ConfigRefused, match=r"^sound\.yaml: plates\.a: the key 'family' is missing"):
            load("sound.yaml")

    @pytest.mark.parametrize(
        ("name", "words"),
        [
            ("missing.yaml", "there is no such file"),
            (".", "this is a folder"),
            ("nul\0.yaml", ""),
            ("x" * 5000, "cannot be read"),
            ("picture.png", "not UTF-8"),
            ("large.yaml", "larger than 1 MiB"),
            ("empty.yaml", "the file is empty"),
        ],
    )
    def test_what_is_no_config_file(self, tmp_path: Path, name: str, words: str):
        (tmp_path / "picture.png").write_bytes(b"\x89PNG\r\n\x1a\n\0\0")
        (tmp_path / "large.yaml").write_bytes(b"#" * (LARGEST_FILE + 1))
        (tmp_path / "empty.yaml").touch()
        with pytest.raises(ConfigRefused) as caught:
            load(f"{tmp_path}/{name}")
        assert words in str(caught.value)
        assert "\n" not in str(caught.value)


class TestParts:
    def test_texts_of_a_command_line_are_enough(self):
        plate = plate_from_parts(
            "ricker",
            ("r", "1.6", "4.2"),
            {"name": "x", "low": "0.01", "high": "4", "scale": "log"},
            starts=[{"x": "0.3"}],
            size="1200x800px",
            samples="400",
            title=None,
        )
        assert plate.pixels == (1200, 800)
        assert plate.samples == 400
        assert plate.up.scale == "log"

    def test_it_is_the_plate_that_a_file_would_give(self):
        config = parse_config(SOUND)
        given = config.plates["growth"]
        plate = plate_from_parts(
            given.family,
            given.across,
            given.up,
            set={"h": 0.1},
            name="growth",
            size="180x110",
            palette="grey",
            inset={"across": ["r", 2.6, 3], "up": ["n", 1, 2], "corner": "lower left"},
            transient=2000,
            dpi=600,
            formats=["png", "pdf"],
        )
        assert plate == given

    @pytest.mark.parametrize(
        ("change", "words"),
        [
            ({"across": ("r", 4, 1)}, "--across: axis 'r': the interval from 4 to 1"),
            (
                {"across": ("R", 1, 4)},
                "--across: the family 'logistic' has no parameter or state variable 'R'",
            ),
            ({"up": ("y", 0, 1)}, "--up: the family 'logistic' has no parameter or state variable 'y'"),
            ({"set": {"r": 1}}, "--set.r: 'r' already runs along an axis"),
            ({"starts": [{"x": "a"}]}, "--start[1].x: 'a' is not a number"),
            ({"values_per_column": 0}, "--values-per-column: '0' is out of range"),
            ({"family": "logistik"}, "--family: there is no family 'logistik'; did you mean 'logistic'?"),
            ({"dpy": 3}, "command line: the key 'dpy' is unknown; did you mean 'dpi'?"),
        ],
    )
    def test_refusals_name_the_option(self, change: dict[str, Any], words: str):
        parts: dict[str, Any] = {"family": "logistic", "across": ("r", "2.8", 4), "up": ("x", 0, 1)}
        with pytest.raises(ConfigRefused) as caught:
            plate_from_parts(**(parts | change), place=COMMAND_LINE)
        assert str(caught.value).startswith(words)

    def test_from_python_the_key_is_named(self):
        with pytest.raises(ConfigRefused, match=r"^across: axis 'r'"):
            plate_from_parts("logistic", ("r", 4, 1), ("x", 0, 1))


HOSTILE = st.one_of(
    st.sampled_from(
        [None, "", " ", [], {}, [[]], [{}], {"": ""}, True, -1, 0, 10**5000, float("nan"), float("-inf")]
    ),
    st.sampled_from(
        ["auto", "1/0", "pi", "-pi/2", "1e9999", "1e-9999", "x" * 1000, "\ud800", "a\nb", "#", "1x1"]
    ),
    st.sampled_from(
        [b"bytes", object(), 1j, {1: 2}, {None: 1}, ("r", 1, 2), {"name": "r", "low": 1, "high": 2}]
    ),
    st.text(max_size=8),
    st.integers(),
    st.floats(),
)


def paths(tree: Any, before: tuple[Any, ...] = ()) -> list[tuple[Any, ...]]:
    """Return the way to every value below the top of a tree."""
    entries = tree.items() if isinstance(tree, dict) else enumerate(tree) if isinstance(tree, list) else ()
    found = []
    for key, value in entries:
        found += [(*before, key), *paths(value, (*before, key))]
    return found


PATHS = paths(sound())


def answer(given: Any) -> Config | str:
    """Return the config or the sentence of the refusal; any other exception fails the test."""
    try:
        return parse_config(given, "sound.yaml")
    except Refusal as refusal:
        return str(refusal)


class TestProperties:
    @settings(deadline=None, max_examples=200)
    @given(
        st.lists(
            st.tuples(st.sampled_from(PATHS), st.sampled_from(["delete", "rename", "replace"]), HOSTILE),
            min_size=1,
            max_size=3,
        )
    )
    def test_a_spoilt_config_is_read_or_refused_in_one_sentence(self, spoils: list[Any]):
        tree = sound()
        for path, how, value in spoils:
            parent: Any = tree
            for key in path[:-1]:
                parent = parent[key] if isinstance(parent, dict | list) and _has(parent, key) else None
            if not isinstance(parent, dict | list) or not _has(parent, path[-1]):
                continue
            old = parent[path[-1]]
            if how == "replace":
                parent[path[-1]] = value
            else:
                del parent[path[-1]]
            if how == "rename" and isinstance(parent, dict):
                parent[f"{path[-1]}{value if isinstance(value, str) else 's'}"] = old
        outcome = answer(tree)
        if isinstance(outcome, str):
            assert "\n" not in outcome
            assert outcome.startswith("sound.yaml: ")
            assert len(outcome) < 1000

    @settings(deadline=None)
    @given(st.text() | st.binary())
    def test_no_text_yields_a_traceback(self, document: str | bytes):
        outcome = answer(document)
        assert isinstance(outcome, Config) or "\n" not in outcome

    @settings(deadline=None)
    @given(st.integers(0, len(SOUND)), st.integers(0, 40), st.text(max_size=3))
    def test_no_damage_to_the_text_yields_a_traceback(self, first: int, length: int, filling: str):
        outcome = answer(SOUND[:first] + filling + SOUND[first + length :])
        assert isinstance(outcome, Config) or "\n" not in outcome


def _has(parent: Any, key: Any) -> bool:
    return key in parent if isinstance(parent, dict) else isinstance(key, int) and key < len(parent)
