"""Bad requests for planes, portraits, basins and followed attractors: one sentence each, nothing made."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest

import atlas
from tests.atlas.test_cli import done, refused
from tiles.errors import Refusal

PLANE = ("forced_logistic", "--across", "a=2:4", "--up", "b=2:4")
STATES = ("henon", "--across", "x=-1:1", "--up", "y=-1:1")
MIXED = ("henon", "--across", "a=0:1", "--up", "x=-1:1")
DRAWN: dict[str, tuple[tuple[str, ...], str]] = {
    "fate of states": (
        (*STATES, "--draw", "fate"),
        "--draw: 'fate' cannot be drawn of a state variable (x) across",
    ),
    "density of parameters": (
        (*PLANE, "--draw", "density"),
        "allowed: fate, period, lyapunov, escape, attractors",
    ),
    "basin of a parameter": ((*MIXED, "--draw", "basin"), "allowed: density"),
    "rotation of one variable": (
        (*PLANE, "--draw", "rotation"),
        "needs a state variable with wrap, or two state",
    ),
    "second exponent of one": ((*PLANE, "--draw", "lyapunov_2"), "needs two state variables"),
    "unknown draw": ((*PLANE, "--draw", "fates"), "did you mean 'fate'?"),
    "pattern": (("forced_logistic", "--across", "r=2:4", "--up", "x=0:1"), "name one of its letters: a, b"),
    "unknown observable": (
        ("henon", "--across", "a=0:1", "--up", "total=0:1"),
        "--up: the family 'henon' has no parameter or state variable 'total'",
    ),
    "swapped": (("henon", "--across", "x=0:1", "--up", "a=0:1"), "cannot be drawn; swap the axes"),
    "wrapped beyond": (("circle", "--across", "Omega=0:1", "--up", "theta=0:2"), "reaches beyond 0 to 1"),
    "memory": (
        (*PLANE, "--memory", "512MiB"),
        "--memory: 512MiB is too little; this program needs 1GiB at least",
    ),
    "supersampling 3": ((*PLANE, "--supersampling", "3"), "--supersampling: "),
    "supersampling of a density": (
        (*MIXED, "--supersampling", "2"),
        "belongs to a parameter plane or a basin chart",
    ),
    "vast": (
        (*PLANE, "--supersampling", "4", "--size", "15000x15000px"),
        "GiB of memory and the budget is 2.0 GiB",
    ),
    "vast values": (
        (*PLANE, "--draw", "lyapunov", "--size", "20000x20000px"),
        "2.1 GiB of memory and the budget",
    ),
    "steps": ((*PLANE, "--steps", "10"), "--steps: "),
    "steps of a density": ((*MIXED, "--steps", "100"), "belongs to a parameter plane or a basin chart"),
    "no transient": ((*PLANE, "--transient", "-1"), "--transient: "),
    "follow what": ((*MIXED, "--follow", "sideways"), "--follow: "),
    "follow a plane": ((*PLANE, "--follow", "up"), "--follow: 'up' belongs to "),
    "record of a plane": ((*PLANE, "--record", "every=2"), "--record: "),
    "extinct of a density": (
        (*MIXED, "--extinct", "x=1e-6"),
        "belongs to a parameter plane or a basin chart",
    ),
    "extinct of nothing": ((*PLANE, "--extinct", "n=1e-6"), "has no state variable 'n'"),
    "extinct below nothing": ((*PLANE, "--extinct", "x=-1"), "--extinct"),
    "palette": ((*PLANE, "--palette", "blue"), "is a sequential palette and fate needs a categorical one"),
    "palette of exponents": ((*PLANE, "--draw", "lyapunov", "--palette", "wheel"), "needs a diverging"),
    "start": ((*PLANE, "--start", "y=1"), "has no state variable 'y'"),
    "deep": (
        ("forced_logistic", "--across", "a=3.5:3.50000000000000001", "--up", "b=2:4"),
        "finer than float64 can resolve",
    ),
    "deep basin": (
        ("henon", "--across", "x=1:1.00000000000001", "--up", "y=-1:1", "--draw", "basin"),
        "finer than",
    ),
    "pattern as a number": ((*PLANE, "--set", "r=3"), "is the pattern [a, b]"),
    "letter of no pattern": ((*PLANE, "--set", "r=a,q"), "'q'"),
    "axis set": ((*PLANE, "--set", "a=3"), "already runs along an axis"),
}


@pytest.mark.parametrize("name", DRAWN)
def test_a_wrong_drawing_is_refused_in_one_sentence(tmp_path: Path, name: str) -> None:
    words, sentence = DRAWN[name]
    given = (*words, "--dpi", "72") if "--size" in words else (*words, "--size", "300x200px", "--dpi", "72")
    assert sentence in refused("draw", *given, "--out", tmp_path / "out" / "a.png")
    assert not (tmp_path / "out").exists()


FOUR = {
    "state": {name: {"start": 0.1} for name in "wxyz"},
    "parameters": {"r": {"default": 1}, "s": {"default": 1}},
    "step": {name: f"r * {name}" for name in "wxyz"},
}
ROUGH = {
    "state": {"x": {"start": 0.3}},
    "parameters": {"r": {"default": 1}, "s": {"default": 1}},
    "step": {"x": "s * r / (x - x)"},
}
PLATE: dict[str, Any] = {
    "family": "forced_logistic",
    "across": ["a", 2, 4],
    "up": ["b", 2, 4],
    "size": "300x200px",
}
CHART: dict[str, Any] = {"family": "henon", "across": ["x", -1, 1], "up": ["y", -1, 1], "size": "300x200px"}
TILES = {key: value for key, value in PLATE.items() if key != "size"}
OWN = {"across": ["r", 0, 1], "up": ["s", 0, 1], "size": "300x200px"}
CONFIGS: dict[str, tuple[dict[str, Any], str]] = {
    "four states": (
        {"families": {"four": FOUR}, "plates": {"view": {"family": "four", **OWN}}},
        "families.four.state: ",
    ),
    "no derivative": (
        {"families": {"rough": ROUGH}, "plates": {"view": {"family": "rough", **OWN}}},
        "families.rough.step: the formula divides by",
    ),
    "no derivative in tiles": (
        {
            "families": {"rough": ROUGH},
            "tile_sets": {"view": {"family": "rough", "across": ["r", 0, 1], "up": ["s", 0, 1]}},
        },
        "families.rough.step: the formula divides by",
    ),
    "starts": (
        {
            "plates": {
                "view": {
                    **CHART,
                    "draw": "density",
                    "starts": {"grid": [100, 100], "box": {"x": [0, 1], "y": [0, 1]}},
                }
            }
        },
        "a grid of 100 x 100 has 10000 starts; at most 4096 are allowed",
    ),
    "log of a wrapped variable": (
        {
            "plates": {
                "view": {
                    "family": "circle",
                    "across": ["Omega", 0, 1],
                    "up": {"name": "theta", "low": "0.1", "high": 1, "scale": "log"},
                }
            }
        },
        "is wrapped to 0 to 1 and cannot have a log axis; write linear",
    ),
    "basin of an observable": (
        {
            "plates": {
                "view": {
                    "family": "insect_stages",
                    "across": ["larvae", 0, 1],
                    "up": ["b", 0, 1],
                    "draw": "basin",
                }
            }
        },
        "plates.view.across: ",
    ),
    "both sweeps tiled": (
        {
            "tile_sets": {
                "view": {"family": "henon", "across": ["a", 0, 1], "up": ["x", 0, 1], "follow": "both"}
            }
        },
        "a tile set follows one sweep; make one set with follow: up and another with down",
    ),
    "deep plane": ({"tile_sets": {"view": {**TILES, "levels": 50}}}, "finer than float64 can resolve"),
    "supersampled tiles": ({"tile_sets": {"view": {**TILES, "supersampling": 2}}}, "supersampling"),
    "deep portrait": (
        {"tile_sets": {"view": {"family": "henon", "across": ["x", -1, 1], "up": ["y", -1, 1], "levels": 8}}},
        "view: 65536 x 65536 cells are too many for a phase portrait; take fewer",
    ),
    "large portrait": (
        {"tile_sets": {"view": {"family": "henon", "across": ["x", -1, 1], "up": ["y", -1, 1], "levels": 6}}},
        "view: 16384 x 16384 pixels would need 5.2 GiB",
    ),
    "deep basin": (
        {
            "tile_sets": {
                "view": {
                    "family": "henon",
                    "across": ["x", -1, 1],
                    "up": ["y", -1, 1],
                    "draw": "basin",
                    "levels": 8,
                }
            }
        },
        "view: 65536 x 65536 pixels would need",
    ),
    "inset of a chart": (
        {"plates": {"view": {**CHART, "draw": "basin", "inset": {"across": ["x", 0, 1], "up": ["y", 0, 1]}}}},
        "view/inset: attractors are numbered anew in every window",
    ),
}


@pytest.mark.parametrize("name", CONFIGS)
def test_a_wrong_config_is_refused_with_its_place_before_anything_is_made(tmp_path: Path, name: str) -> None:
    tree, sentence = CONFIGS[name]
    path = tmp_path / "wrong.yaml"
    path.write_text(json.dumps({"defaults": {"dpi": 72}, **tree}), "utf-8")
    for words in (("check", path), ("render", path, "--out", tmp_path / "out")):
        said = refused(*words)
        assert said.startswith(f"{path}: ")
        assert sentence in said
    assert list(tmp_path.iterdir()) == [path]


def test_no_transient_and_few_steps_are_allowed(tmp_path: Path) -> None:
    words = (*PLANE, "--transient", "0", "--steps", "64", "--size", "300x200px", "--dpi", "72")
    done("draw", *words, "--out", tmp_path / "a.png")
    assert (tmp_path / "a.png").is_file()


@pytest.mark.parametrize(
    "layers",
    [(), "fate", 5, None, ["fat"], [["fate"]], [0], np.array(["period", "fat"])],
    ids=repr,
)
def test_layers_that_are_none_are_refused_in_one_sentence(layers: Any) -> None:
    view = atlas.View(across=("a", 0, 1), up=("b", 0, 1))
    with pytest.raises(Refusal, match=r"^layers: .*lay"):
        atlas.parameter_plane(atlas.family("henon"), view, size=(2, 2), layers=layers)
