"""The page gets every key that it reads."""

import itertools
import json

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as some

from tiles.meta import meta, runs_text, runs_where, script
from tiles.shading import LEVELS, colour_table, fit
from tiles.window import View

VIEW = View(
    across=("r", "14/5", "4"),
    up={"name": "n", "low": "0.5", "high": "20", "scale": "log", "label": "stock"},
)
HEADER = {
    "title": "Sound “A”",
    "family": "ricker",
    "formula": ["n → n exp(r (1 − n))"],
    "note": "invented",
    "units": {"n": "kt"},
    "plate": {"family": "ricker", "set": {"h": "0.1"}},
    "families": {"ricker": {"step": {"n": "n"}}},
}
PRESENT = {(0, 0): {0: [(0, 0)]}, (1, 2): {0: [(0, 1), (3, 3)], 1: [(2, 2)]}}


def made(header=HEADER, view=VIEW, **more):
    curve = fit(np.array([0.5, 1.0, 2.0, 8.0]))
    return meta(header, view, PRESENT, curve, colour_table("blue", background="#fafafa"), **more)


def test_every_key():
    found = made(marks=(1, [(3, 5), (9, 9)]), certificate={"record": 1})
    key = found.pop("key")
    assert found == {
        "version": 1,
        "tile": 256,
        "title": "Sound “A”",
        "family": "ricker",
        "formula": ["n → n exp(r (1 − n))"],
        "note": "invented",
        "axes": {
            "across": {
                "name": "r",
                "label": "r",
                "unit": "",
                "low": {"num": "14", "den": "5"},
                "high": {"num": "4", "den": "1"},
                "of_pi": False,
                "scale": "linear",
            },
            "up": {
                "name": "n",
                "label": "stock",
                "unit": "kt",
                "low": {"num": "1", "den": "2"},
                "high": {"num": "20", "den": "1"},
                "of_pi": False,
                "scale": "log",
            },
        },
        "layers": [{"name": "density", "label": "density", "kind": "density"}],
        "pairs": [[0, 0], [1, 2]],
        "present": {"0/0": {"0": "0"}, "1/2": {"0": "0-1,3", "1": "2"}},
        "background": "#fafafa",
        "missing": "#f0f0f0",
        "marks": {"1": "3-5,9"},
        "plate": {"family": "ricker", "set": {"h": "0.1"}, "up": {"label": "stock"}},
        "families": {"ricker": {"step": {"n": "n"}}},
        "certificate": {"record": 1},
    }
    table = colour_table("blue")
    assert len(key["colours"]) == LEVELS
    assert key["colours"][0] == "#{:02x}{:02x}{:02x}".format(*table[1])
    assert key["colours"][-1] == "#{:02x}{:02x}{:02x}".format(*table[LEVELS])
    assert key["shading"] == "equalised"
    assert key["caption"] == "density (share of samples per unit of ln n)"
    assert key["labels"]
    assert all(0 <= place <= 1 and isinstance(text, str) for place, text in key["labels"])


def test_an_index_that_says_nothing_of_itself_still_gets_every_key():
    found = made({}, View(across=("a", 0, "2*pi"), up=("b", -1, 1)))
    assert set(found) == set(made())
    assert "marks" not in found
    assert found["axes"]["across"]["of_pi"] is True
    assert found["axes"]["across"]["high"] == {"num": "2", "den": "1"}
    assert found["key"]["caption"] == "density (share of samples per unit of b)"
    assert (found["title"], found["formula"]) == ("", [])
    assert [found[key] for key in ("plate", "families", "certificate")] == [{}, {}, {}]


def test_the_caption_names_the_unit_or_what_the_header_says():
    view = View(across=("r", 1, 2), up=("n", 0, 1))
    assert made(HEADER, view)["key"]["caption"] == "density (share of samples per kt)"
    assert made({"caption": "points per bin"}, view)["key"]["caption"] == "points per bin"


def test_no_marks_where_everything_settled():
    assert "marks" not in made(marks=(1, []))


def test_the_script_is_ascii_and_reads_back():
    text = script(made())
    assert text.isascii()
    assert text.startswith("window.ATLAS_META = {")
    assert text.endswith("};\n")
    body = text.removeprefix("window.ATLAS_META = ").removesuffix(";\n")
    assert json.loads(body) == made()
    assert script(made()) == text


def test_the_script_cannot_be_closed_from_inside():
    assert "</script" not in script(made({"note": "</script><b>"})).lower()


@given(some.lists(some.booleans(), max_size=40), some.integers(1, 7))
def test_runs_of_flags_in_pieces(flags, size):
    pieces = [(at, np.array(flags[at : at + size], bool)) for at in range(0, len(flags), size)]
    covered = [at for first, last in runs_where(pieces) for at in range(first, last + 1)]
    assert covered == [at for at, flag in enumerate(flags) if flag]
    runs = list(runs_where(pieces))
    assert all(left[1] + 1 < right[0] for left, right in itertools.pairwise(runs))


def test_runs_break_at_missing_pieces():
    ones = np.ones(4, bool)
    assert list(runs_where([(0, ones), (4, ones), (12, ones)])) == [(0, 7), (12, 15)]


@pytest.mark.parametrize(
    ("runs", "text"), [([], ""), ([(3, 3)], "3"), ([(0, 2), (2**70, 2**70)], f"0-2,{2**70}")]
)
def test_runs_as_text(runs, text):
    assert runs_text(runs) == text
