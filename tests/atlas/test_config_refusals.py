"""What a config gets wrong is answered by one sentence with place, value and remedy."""

from __future__ import annotations

import copy
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from atlas.config.load import parse_config, plate_from_parts
from atlas.reading.yaml_text import read_yaml
from tiles.errors import Refusal

SOUND = Path(__file__).with_name("sound.yaml").read_text(encoding="utf-8")
TREE: Any = read_yaml(SOUND, "sound.yaml")


def sound() -> dict[str, Any]:
    return copy.deepcopy(TREE)


def refusal_of(given: Any) -> str:
    with pytest.raises(Refusal) as caught:
        parse_config(given, "sound.yaml")
    sentence = str(caught.value)
    assert caught.value.exit_code == 2
    assert "\n" not in sentence
    return sentence


def at(*keys: str) -> Callable[[dict[str, Any]], dict[str, Any]]:
    def find(tree: dict[str, Any]) -> dict[str, Any]:
        for key in keys:
            tree = tree[key]
        return tree

    return find


GROWTH, TILES, BOTH = at("plates", "growth"), at("tile_sets", "tiles"), at("figures", "both")
TOP = at()

# Where, what is written there, and what the sentence says.
WRONG: list[tuple[Callable[[dict[str, Any]], dict[str, Any]], str, Any, str]] = [
    (TOP, "plate", {}, "sound.yaml: the section 'plate' is unknown; did you mean 'plates'?"),
    (TOP, "plates", "growth", "sound.yaml: plates: 'growth' stands where a mapping"),
    (TOP, "plates", ["growth"], "sound.yaml: plates: a list stands where a mapping"),
    (TOP, "title", ["a"], "sound.yaml: title: a list is not a line of text"),
    (TOP, "title", "a\nb", "title: 'a\\nb' is not a line of text"),
    (at("defaults"), "dpy", "300", "sound.yaml: defaults: the key 'dpy' is unknown; did you mean 'dpi'?"),
    (at("defaults"), "across", ["r", 1, 2], "defaults: the key 'across' has no common default"),
    (at("defaults"), "dpi", "high", "sound.yaml: defaults.dpi: 'high' is not a whole number"),
    (at("plates"), "growth", "sound", "sound.yaml: plates.growth: 'sound' stands where a mapping"),
    (GROWTH, "pallete", "grey", "plates.growth: the key 'pallete' is unknown; did you mean 'palette'?"),
    (GROWTH, "levels", "3", "plates.growth: the key 'levels' is unknown"),
    (GROWTH, "family", "sond", "plates.growth.family: there is no family 'sond'; did you mean 'sound'?"),
    (GROWTH, "family", "logistics", "there is no family 'logistics'; did you mean 'logistic'?"),
    (GROWTH, "family", "", "plates.growth.family: the key has no value"),
    (GROWTH, "across", "r", "plates.growth.across: 'r' is not an axis; write [name, low, high]"),
    (GROWTH, "across", ["r", 1], "plates.growth.across: a list is not an axis"),
    (GROWTH, "across", ["r", 4, 1], "plates.growth.across: axis 'r': the interval from 4 to 1 is empty"),
    (GROWTH, "across", ["r", 1, 1], "the interval from 1 to 1 is empty"),
    (GROWTH, "across", ["r", "1", "x"], "plates.growth.across.high: 'x' is not a number"),
    (GROWTH, "across", ["r", "nan", "4"], "plates.growth.across.low: 'nan' is not a number"),
    (GROWTH, "across", ["r", 1, float("inf")], "plates.growth.across.high: 'inf' is not a number"),
    (
        GROWTH,
        "across",
        ["r", 1, "1e400"],
        "plates.growth.across.high: a number of more than 390 digits is too large",
    ),
    (
        GROWTH,
        "across",
        ["r", 1, "1e9999"],
        "plates.growth.across.high: a number of more than 390 digits is too large",
    ),
    (GROWTH, "across", ["r", 1, "1e309"], "plates.growth.across.high: '1e309' is out of range"),
    (GROWTH, "across", ["r", "1e-330", "1"], "plates.growth.across.low: '1e-330' is out of range"),
    (
        GROWTH,
        "across",
        ["r", "1e-9999", "1"],
        "plates.growth.across.low: a number of more than 390 digits is too large or too fine",
    ),
    (GROWTH, "across", ["r", "1/0", "1"], "plates.growth.across.low: '1/0' divides by zero"),
    (GROWTH, "across", ["r", True, "1"], "plates.growth.across.low: 'True' is not a number"),
    (GROWTH, "across", ["q", 1, 2], "across: the family 'sound' has no parameter or state variable 'q'"),
    (GROWTH, "across", ["n", 1, 2], "'n' stands on both axes"),
    (GROWTH, "up", ["r", 1, 2], "'r' stands on both axes"),
    (GROWTH, "up", ["h", 0, 1], "plates.growth.set.h: 'h' already runs along an axis"),
    (GROWTH, "across", {"name": "r", "low": 1, "hihg": 2}, "the key 'hihg' is unknown; did you mean 'high'?"),
    (GROWTH, "across", {"name": "r", "low": 1}, "plates.growth.across: the key 'high' is missing"),
    (GROWTH, "across", {"name": "r", "low": 0, "high": 2, "scale": "log"}, "a log axis cannot start at 0"),
    (GROWTH, "across", {"name": "r", "low": 1, "high": 2, "scale": "lin"}, "across.scale: 'lin' is unknown"),
    (GROWTH, "set", {"k": 1}, "plates.growth.set: the family 'sound' has no parameter 'k'"),
    (GROWTH, "set", {"r": 1}, "plates.growth.set.r: 'r' already runs along an axis"),
    (GROWTH, "set", {"h": "much"}, "plates.growth.set.h: 'much' is not a number"),
    (GROWTH, "set", ["h", 1], "plates.growth.set: a list stands where a mapping"),
    (GROWTH, "starts", {"n": 1}, "plates.growth.starts: a mapping is not a list of states"),
    (GROWTH, "starts", [], "plates.growth.starts: an empty list is not a list of states"),
    (GROWTH, "starts", [{"n": 1}, {"m": 1}], "starts[2]: the family 'sound' has no state variable 'm'"),
    (GROWTH, "starts", [{"n": "low"}], "plates.growth.starts[1].n: 'low' is not a number"),
    (GROWTH, "starts", [{"n": "2e6"}], "plates.growth.starts[1].n: the start 2000000 lies beyond the escape"),
    (GROWTH, "starts", [{"n": 1}] * 5000, "plates.growth.starts: 5000 starts are too many"),
    (GROWTH, "transient", "-1", "plates.growth.transient: '-1' is out of range; write a whole number from 0"),
    (GROWTH, "transient", "1.5", "plates.growth.transient: '1.5' is not a whole number"),
    (GROWTH, "transient", "pi", "plates.growth.transient: 'pi' is not a whole number"),
    (GROWTH, "transient", True, "plates.growth.transient: 'True' is not a whole number"),
    (
        GROWTH,
        "transient",
        10**5000,
        "plates.growth.transient: a whole number of 16610 bits is not a whole number",
    ),
    (GROWTH, "transient_limit", "500", "transient_limit: the limit 500 is below the transient 2000"),
    (GROWTH, "samples", "many", "plates.growth.samples: 'many' is not auto, or a whole number"),
    (GROWTH, "samples", "0", "plates.growth.samples: '0' is out of range"),
    (GROWTH, "values_per_column", "0", "plates.growth.values_per_column: '0' is out of range"),
    (GROWTH, "shading", "equalized", "shading: 'equalized' is unknown; did you mean 'equalised'?"),
    (GROWTH, "palette", "gray", "palette: 'gray' is unknown; did you mean 'grey'?"),
    (GROWTH, "background", "", "background: the key has no value; write white, black or a colour"),
    (GROWTH, "background", "#12345", "background: '#12345' is not white, black or a colour"),
    (GROWTH, "size", "180", "plates.growth.size: '180' cannot be used: a size is written 180x110"),
    (GROWTH, "size", "0x110", "plates.growth.size: '0x110' cannot be used: both sides"),
    (GROWTH, "size", [180, 110], "plates.growth.size: a list is not a size"),
    (GROWTH, "dpi", "5", "plates.growth.dpi: '5' is out of range"),
    (
        GROWTH,
        "formats",
        ["jpeg"],
        "plates.growth.formats[1]: 'jpeg' is unknown; allowed: pdf, png, svg, tiff",
    ),
    (GROWTH, "formats", ["png", "png"], "plates.growth.formats: a word is listed twice"),
    (GROWTH, "formats", [], "plates.growth.formats: an empty list is not a list of png"),
    (GROWTH, "key", "yes", "plates.growth.key: 'yes' is not true or false"),
    (GROWTH, "key", "no", "plates.growth.key: 'no' is not true or false"),
    (GROWTH, "letter", "abcd", "plates.growth.letter: 'abcd' is not a line of text of at most 3"),
    (
        GROWTH,
        "font_size",
        "100",
        "plates.growth.font_size: '100' is out of range; write a number from 3 to 72",
    ),
    (GROWTH, "inset", {"across": ["r", 1, 2]}, "plates.growth.inset: the key 'up' is missing"),
    (at("plates", "growth", "inset"), "across", ["r", 1, 2], "inset.across: 1 to 2 does not lie inside"),
    (at("plates", "growth", "inset"), "across", ["h", 1, 2], "inset.across: 'h' is not the axis"),
    (at("plates", "growth", "inset"), "corner", "upper", "inset.corner: 'upper' is unknown"),
    (at("plates", "growth", "inset"), "width", "2", "inset.width: '2' is out of range"),
    (TILES, "levels", "-1", "tile_sets.tiles.levels: '-1' is out of range"),
    (TILES, "levels", {"across": 1}, "tile_sets.tiles.levels: the key 'up' is missing"),
    (TILES, "pairs", "every", "tile_sets.tiles.pairs: 'every' is unknown; allowed: all, diagonal"),
    (TILES, "pairs", [[0, 4]], "tile_sets.tiles.pairs: the level pair [0, 4] is deeper than the levels"),
    (TILES, "pairs", [[1, 1], [1, 1]], "tile_sets.tiles.pairs: a level pair is listed twice"),
    (TILES, "pairs", [[1]], "tile_sets.tiles.pairs[1]: a list is not a level pair"),
    (TILES, "size", "180x110", "tile_sets.tiles: the key 'size' is unknown"),
    (BOTH, "panels", ["grwth"], "figures.both.panels: there is no plate 'grwth'; did you mean 'growth'?"),
    (BOTH, "panels", ["tiles"], "figures.both.panels: there is no plate 'tiles'"),
    (BOTH, "panels", ["growth", "growth"], "figures.both.panels: the plate 'growth' stands in two panels"),
    (BOTH, "panels", [["growth"], []], "figures.both.panels: a row is not a list of plates"),
    (BOTH, "panels", [["growth"], "harvest"], "figures.both.panels: a row is not a list of plates"),
    (BOTH, "panels", "growth", "figures.both.panels: 'growth' is not a list of plates"),
    (
        BOTH,
        "share",
        ["across"],
        "figures.both.share: the panels growth (r from 1.6 to 4.2, linear) and harvest",
    ),
    (BOTH, "share", ["down"], "figures.both.share[1]: 'down' is unknown"),
]


class TestRefusals:
    @pytest.mark.parametrize(("where", "key", "value", "words"), WRONG, ids=[row[3][:60] for row in WRONG])
    def test_what_is_wrong_is_named_with_its_place(self, where, key: str, value: Any, words: str):
        tree = sound()
        where(tree)[key] = value
        sentence = refusal_of(tree)
        assert words in sentence
        assert sentence.startswith("sound.yaml: ")

    @pytest.mark.parametrize("key", ["family", "across", "up"])
    def test_a_missing_key_is_named(self, key: str):
        tree = sound()
        del tree["plates"]["growth"][key]
        assert f"sound.yaml: plates.growth: the key '{key}' is missing" in refusal_of(tree)

    def test_a_formula_is_refused_with_the_place_of_the_family(self):
        tree = sound()
        tree["families"]["sound"]["step"] = {"n": "__import__('os').system('true')"}
        assert refusal_of(tree).startswith("sound.yaml: families.sound")

    def test_a_ragged_figure_cannot_share_columns(self):
        tree = sound()
        tree["figures"]["both"] = {"panels": [["growth", "rise"], ["harvest"]], "share": ["across"]}
        assert "figures.both.share: the rows of panels differ in length" in refusal_of(tree)

    def test_duplicate_plates_are_named_with_their_lines(self):
        document = "plates:\n  a: {family: tent}\n  a: {family: tent}\n"
        assert refusal_of(document) == "sound.yaml: line 3: the key 'a' is given twice, first in line 2"

    @pytest.mark.parametrize("document", ["title: only words\n", "plates:\n", "defaults: {dpi: 300}\n"])
    def test_a_file_without_anything_to_make(self, document: str):
        assert "there is nothing to make" in refusal_of(document)

    @pytest.mark.parametrize("document", ["just words", "- a\n- b\n"])
    def test_a_file_that_is_no_mapping(self, document: str):
        assert "stands where a mapping of keys belongs" in refusal_of(document)

    @pytest.mark.parametrize(
        "given", [None, 3, [], {1: 2}, {"plates": {1: {}}}, {"plates": {"a": {None: 1}}}]
    )
    def test_python_values_that_are_no_config(self, given: Any):
        refusal_of(given)


class TestNames:
    @pytest.mark.parametrize("name", ["a", "Fig_1", "3", "a-b.c", "_x", "x" * 100])
    def test_names_that_every_file_system_takes(self, name: str):
        assert plate_from_parts("logistic", ("r", "2.8", 4), ("x", 0, 1), name=name).name == name

    @pytest.mark.parametrize(
        "name",
        [
            "../up",
            "a/b",
            "a\\b",
            "/etc",
            ".parts",
            ".",
            "..",
            "",
            " ",
            "a b",
            "-a",
            "ä",
            "a\n",
            "a\0",
            "x" * 101,
            "con",
            "NUL",
            "aux.x",
            "com1",
            "a.",
            "a.png",
            "b.PDF",
            "c.tif",
            "d.svg",
        ],
    )
    @pytest.mark.parametrize("section", ["plates", "tile_sets", "figures"])
    def test_names_that_could_leave_or_clobber_are_refused(self, name: str, section: str):
        tree = sound()
        tree[section][name] = next(iter(tree[section].values()))
        sentence = refusal_of(tree)
        assert sentence.startswith(f"sound.yaml: {section}.")

    @pytest.mark.parametrize(
        ("section", "name"), [("tile_sets", "growth"), ("figures", "Rise"), ("plates", "BOTH")]
    )
    def test_outputs_that_would_share_a_file_are_refused(self, section: str, name: str):
        tree = sound()
        tree[section][name] = next(iter(tree[section].values()))
        assert "has this name already" in refusal_of(tree)
