"""The schema that editors read: it accepts what the reader accepts and knows the same keys."""

from __future__ import annotations

import copy
import json
from pathlib import Path
from typing import Any

import jsonschema
import pytest
import yaml
from hypothesis import given, settings
from hypothesis import strategies as st

from atlas.config.keys import CONFIG_KEYS, SECTIONS
from atlas.config.load import load, normalised, parse_config
from atlas.config.remake import from_normalised
from atlas.config.schema import key_rows, schema
from atlas.families.keys import FAMILY_KEYS
from atlas.reading.yaml_text import read_yaml
from tiles.errors import Refusal

HERE = Path(__file__).parent
EXAMPLES = [HERE / "sound.yaml", HERE / "views.yaml", *sorted((HERE.parents[1] / "configs").glob("*.yaml"))]
TREE: Any = read_yaml((HERE / "sound.yaml").read_text(encoding="utf-8"), "sound.yaml")
VIEWS: Any = read_yaml((HERE / "views.yaml").read_text(encoding="utf-8"), "views.yaml")
SCHEMA = schema()
VALIDATOR = jsonschema.Draft202012Validator(SCHEMA)


def sound() -> dict[str, Any]:
    return copy.deepcopy(TREE)


def accepted_by_reader(tree: Any) -> bool:
    try:
        parse_config(tree)
    except Refusal:
        return False
    return True


def test_it_is_a_schema_of_the_draft_that_it_names():
    assert SCHEMA["$schema"] == "https://json-schema.org/draft/2020-12/schema"
    jsonschema.Draft202012Validator.check_schema(SCHEMA)
    assert json.loads(json.dumps(SCHEMA)) == SCHEMA


@pytest.mark.parametrize("path", EXAMPLES, ids=lambda path: path.name)
def test_examples_are_accepted_as_texts_and_as_an_editor_types_them(path: Path):
    load(path)
    text = path.read_text(encoding="utf-8")
    VALIDATOR.validate(read_yaml(text, path.name))
    VALIDATOR.validate(yaml.safe_load(text))


@pytest.mark.parametrize(
    "way",
    [
        (),
        ("defaults",),
        ("families", "sound"),
        ("families", "sound", "state", "n"),
        ("families", "sound", "parameters", "r"),
        ("plates", "growth"),
        ("plates", "growth", "inset"),
        ("plates", "harvest", "across"),
        ("tile_sets", "tiles"),
        ("tile_sets", "tiles", "levels"),
        ("figures", "both"),
    ],
    ids=".".join,
)
def test_unknown_keys_are_refused_by_both(way: tuple[str, ...]):
    tree = sound()
    section = tree
    for key in way:
        section = section[key]
    section["unheard_of"] = "1"
    assert not VALIDATOR.is_valid(tree)
    assert not accepted_by_reader(tree)


@pytest.mark.parametrize("section", list(SECTIONS))
def test_missing_keys_are_refused_by_both(section: str):
    for key in (key for key in SECTIONS[section] if key.required):
        tree = sound()
        del next(iter(tree[section].values()))[key.name]
        assert not VALIDATOR.is_valid(tree)
        assert not accepted_by_reader(tree)


@pytest.mark.parametrize(
    ("key", "value"),
    [
        ("transient", "soon"),
        ("transient", -1),
        ("palette", "gray"),
        ("size", "180"),
        ("across", ["r", 1]),
        ("across", ["r", "1", "x"]),
        ("key", "yes"),
        ("formats", ["jpeg"]),
        ("formats", []),
        ("starts", {"n": 1}),
        ("samples", "some"),
        ("background", "grey"),
    ],
)
def test_wrong_values_are_refused_by_both(key: str, value: Any):
    tree = sound()
    tree["plates"]["growth"][key] = value
    assert not VALIDATOR.is_valid(tree)
    assert not accepted_by_reader(tree)


@pytest.mark.parametrize(
    ("plate", "key", "value"),
    [
        ("fates", "draw", "fates"),
        ("fates", "supersampling", 8),
        ("fates", "steps", 63),
        ("fates", "extinct", ["adults"]),
        ("fates", "set", {"settlement": ["good"]}),
        ("fates", "set", {"settlement": {"pattern": []}}),
        ("both_ways", "follow", "left"),
        ("yearly", "record", 12),
        ("yearly", "record", {"phase": 1}),
        ("yearly", "record", {"every": 2, "phases": 1}),
        ("split", "by_attractor", "yes"),
        ("split", "starts", {"grid": [2, 2]}),
        ("split", "starts", {"grid": [2, 2], "box": {}}),
        ("split", "starts", {"grid": [], "box": {"adults": [0, 1]}}),
        ("split", "starts", {"grid": [2], "box": {"adults": [0]}}),
    ],
)
def test_wrong_values_of_views_are_refused_by_both(plate: str, key: str, value: Any):
    tree = copy.deepcopy(VIEWS)
    tree["plates"][plate][key] = value
    assert not VALIDATOR.is_valid(tree)
    assert not accepted_by_reader(tree)


@pytest.mark.parametrize("given", ["tif", ["tif", "png"], "tiff", ["tiff"]])
def test_tif_is_accepted_by_both(given: Any):
    tree = sound()
    tree["defaults"]["formats"] = given
    assert VALIDATOR.is_valid(tree)
    assert accepted_by_reader(tree)


@pytest.mark.parametrize("example", [TREE, VIEWS], ids=["sound", "views"])
def test_normalised_settings_are_a_config_for_the_schema_too(example: Any):
    for record in parse_config(example).outputs().values():
        form = normalised(record)
        assert from_normalised(form) == record
        section = {"plate": "plates", "tile set": "tile_sets", "figure": "figures"}[form["kind"]]
        settings_given = {key: value for key, value in form["settings"].items() if value is not None}
        VALIDATOR.validate({section: {form["name"]: settings_given}})


VALUES = st.one_of(
    st.sampled_from(
        [
            "",
            "auto",
            "pi",
            "density",
            "fate",
            "up",
            "kinds",
            "-2*pi/3",
            "1/3",
            ".5",
            "1e-3",
            "010",
            "4/2",
            "true",
            "#fff",
            "90x60",
            "x",
        ]
    ),
    st.sampled_from(
        [True, 0, 1, 2.0, 0.5, -1, [], {}, ["r", 0, 1], [{"n": "1"}], {"across": 1, "up": 2}, ["png"]]
    ),
    st.text(max_size=5),
)


def paths(tree: Any, before: tuple[Any, ...] = ()) -> list[tuple[Any, ...]]:
    """Return the way to every value below the top of a tree."""
    entries = tree.items() if isinstance(tree, dict) else enumerate(tree) if isinstance(tree, list) else ()
    found = []
    for key, value in entries:
        found += [(*before, key), *paths(value, (*before, key))]
    return found


@settings(deadline=None, max_examples=300)
@given(
    st.sampled_from([(example, path) for example in (TREE, VIEWS) for path in paths(example)]),
    VALUES,
)
def test_whatever_the_reader_accepts_the_schema_accepts(found: tuple[Any, tuple[Any, ...]], value: Any):
    example, path = found
    tree = copy.deepcopy(example)
    parent: Any = tree
    for key in path[:-1]:
        parent = parent[key]
    parent[path[-1]] = value
    assert VALIDATOR.is_valid(tree) or not accepted_by_reader(tree)


def test_every_key_is_documented_once_a_section():
    rows = key_rows()
    assert {row.section for row in rows} <= set(CONFIG_KEYS)
    assert len({(row.section, row.name) for row in rows}) == len(rows)
    assert len(rows) == sum(map(len, SECTIONS.values())) + len(FAMILY_KEYS)
    assert all(row.meaning.endswith(".") and row.allowed for row in rows)
    by_name = {(row.section, row.name): row.default for row in rows}
    assert by_name["plates", "size"] == "180x110"
    assert by_name["plates", "formats"] == "png"
    assert by_name["plates", "key"] == "false"
    assert by_name["tile_sets", "levels"] == "across 4, up 4"
    assert by_name["plates", "set"] == by_name["plates", "inset"] == "none"
    assert by_name["figures", "panels"] == "required"
