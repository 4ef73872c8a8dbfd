"""Reading YAML: texts stay texts, and every hostile document ends in one sentence."""

from __future__ import annotations

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from atlas.errors import ConfigRefused
from atlas.reading.yaml_text import DEEPEST, LARGEST_FILE, read_yaml

LAUGHS = "a0: &a0 [x, x, x, x, x, x, x, x, x, x]\n" + "".join(
    f"a{n}: &a{n} [{', '.join([f'*a{n - 1}'] * 10)}]\n" for n in range(1, 12)
)


def refused(document: str | bytes) -> str:
    with pytest.raises(ConfigRefused) as caught:
        read_yaml(document, "file.yaml")
    sentence = str(caught.value)
    assert sentence.startswith("file.yaml: ")
    assert "\n" not in sentence
    assert len(sentence) < 300
    return sentence


def test_scalars_stay_as_they_were_written():
    document = "{a: no, b: 1:30, c: 010, d: 1e-3, e: ~, f: 'true', g: 0x1F, h: 2024-01-01, i: .5, j: 1/3}"
    assert read_yaml(document, "file.yaml") == {
        "a": "no",
        "b": "1:30",
        "c": "010",
        "d": "1e-3",
        "e": "~",
        "f": "true",
        "g": "0x1F",
        "h": "2024-01-01",
        "i": ".5",
        "j": "1/3",
    }


def test_order_lists_and_empty_values_are_kept():
    tree = read_yaml("z: [1, [2, 3]]\na:\nm: {k: ''}\n", "file.yaml")
    assert tree == {"z": ["1", ["2", "3"]], "a": "", "m": {"k": ""}}
    assert list(tree) == ["z", "a", "m"]


def test_a_byte_order_mark_and_windows_line_ends_are_no_obstacle():
    assert read_yaml(b"\xef\xbb\xbfa: 1\r\nb: 2\r\n", "file.yaml") == {"a": "1", "b": "2"}


def test_aliases_repeat_a_value():
    tree = read_yaml("a: &one {p: 1}\nb: *one\nc: [*one, *one]\n", "file.yaml")
    assert tree == {"a": {"p": "1"}, "b": {"p": "1"}, "c": [{"p": "1"}, {"p": "1"}]}


@pytest.mark.parametrize(
    ("document", "words"),
    [
        ("a: 1\nb: 2\na: 3\n", "line 3: the key 'a' is given twice, first in line 1"),
        ("p:\n  x: 1\n  y: 2\n  x: 3\n", "line 4: the key 'x' is given twice, first in line 2"),
        (LAUGHS, "with aliases expanded"),
        ("a: &a [*a]", "'a' refers to the value that holds it"),
        ("a: *b", "'b' refers to nothing above it"),
        ("<<: {a: 1}", "merge keys"),
        ("b: &b {x: 1}\na:\n  <<: *b\n", "merge keys"),
        ("!!python/object/apply:os.system [ls]", "tag"),
        ("a: !!int 3", "line 1: the tag"),
        ("a: !own 3", "tag"),
        ("a: 1\n---\nb: 2\n", "line 2: a second document"),
        ("? [a, b]\n: 1\n", "a key must be plain text"),
        ("{a: 1}: 2", "a key must be plain text"),
        ("", "empty"),
        ("# only a comment\n", "empty"),
        ("a: [1, 2", "this is not YAML"),
        ("a: 'never closed", "this is not YAML"),
        ("a\t: 1", "line 1, column 2: this is not YAML"),
        ("a: \x00", "control characters"),
        ('a: "\\ud800"', "half of a character pair"),
        ('a: "\\UFFFFFFFF"', "out of range"),
        ("%YAML " + "9" * 5000 + ".1\n---\na: 1", "out of range"),
        ("%YAML 3.0\n---\na: 1", "this is not YAML"),
        ("[" * 5000, f"deeper than {DEEPEST}"),
        ("- " * 5000, f"deeper than {DEEPEST}"),
        ("{a: " * 5000, f"deeper than {DEEPEST}"),
        (b"a: \xff\xfe", "byte 4 is not UTF-8"),
        ("a: 1".encode("utf-16"), "not UTF-8"),
        ("\x89PNG\r\n\x1a\n".encode("latin-1"), "not UTF-8"),
        ("a: " + "y" * LARGEST_FILE, "larger than 1 MiB"),
    ],
)
def test_hostile_documents_are_refused_in_one_sentence(document: str | bytes, words: str):
    assert words in refused(document)


def test_the_bound_on_expanded_values_is_exact(monkeypatch: pytest.MonkeyPatch):
    monkeypatch.setattr("atlas.reading.yaml_text.MOST_NODES", 30)
    # The mapping and its 3 keys are 4 values, the anchored list is 6, its two aliases 1 + 12, the filling 7.
    head = "a: &a [1, 2, 3, 4, 5]\nb: [*a, *a]\n"
    assert len(read_yaml(f"{head}c: [1, 2, 3, 4, 5, 6]\n", "file.yaml")) == 3
    assert "more than 30 values" in refused(f"{head}c: [1, 2, 3, 4, 5, 6, 7]\n")


def answer(document: str | bytes) -> str:
    """Return the sentence of the refusal, or nothing; any other exception fails the test."""
    try:
        read_yaml(document, "file.yaml")
    except ConfigRefused as refusal:
        return str(refusal)
    return ""


@settings(deadline=None)
@given(st.text())
def test_no_text_yields_a_traceback(document: str):
    assert "\n" not in answer(document)


@settings(deadline=None)
@given(st.binary())
def test_no_bytes_yield_a_traceback(document: bytes):
    assert "\n" not in answer(document)


SIGNS = [*"ab:-[]{}&*!|>'\"%@`#,? \n\t\\", "---", "<<", "&a ", "*a", ": ", "- "]


@settings(deadline=None)
@given(st.lists(st.sampled_from(SIGNS)))
def test_no_soup_of_yaml_signs_yields_a_traceback(signs: list[str]):
    assert "\n" not in answer("".join(signs))
