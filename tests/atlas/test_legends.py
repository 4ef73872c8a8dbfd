"""Legends: which entries stand where there is not room for all, and the widths of their labels."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from atlas.figure.boxes import Box, Spacing
from atlas.figure.legends import class_legend, fitted, legend_pieces
from atlas.figure.lettering import text_width
from atlas.figure.panels import legend_width
from atlas.figure.pieces import Block, LegendEntry, Words
from atlas.figure.typeset import Typesetter, settings
from tiles.classes import class_colours

ENTRIES = st.lists(st.booleans(), max_size=30).map(
    lambda kept: [LegendEntry(str(number), (number, 0, 0), each) for number, each in enumerate(kept)]
)


@given(ENTRIES, st.integers(1, 40))
def test_what_is_left_out_is_counted_where_it_would_stand(entries: list[LegendEntry], lines: int) -> None:
    found = fitted(entries, lines)
    shown = [line for line in found if not isinstance(line, int)]
    numbers = [line for line in found if isinstance(line, int)]
    assert len(found) == min(lines, len(entries))
    assert [entry for entry in entries if entry in shown] == shown
    if len(entries) <= lines:
        assert shown == entries
        return
    assert numbers == [len(entries) - len(shown)]
    gone = [entry for entry in entries if entry not in shown]
    before = found[: found.index(numbers[0])]
    assert all(
        entries.index(entry) < entries.index(gone[0]) for entry in before if not isinstance(entry, int)
    )
    if any(entry.kept for entry in gone):
        assert all(entry.kept for entry in shown)
    else:
        free = [entry for entry in entries if not entry.kept]
        assert gone == free[len(free) - len(gone) :]


def test_classes_stand_in_order_and_those_with_a_name_are_kept() -> None:
    found = class_legend([60002, 8, 1, 8, 60003, 2], lambda code: f"class {code}")
    assert [entry.label for entry in found] == [f"class {code}" for code in (1, 2, 8, 60002, 60003)]
    assert [entry.colour for entry in found] == class_colours([1, 2, 8, 60002, 60003])
    assert [entry.kept for entry in found] == [False, False, False, True, True]
    assert class_legend([], str) == ()


@given(ENTRIES, st.integers(30, 900), st.floats(5, 12))
def test_a_legend_stays_in_its_box(entries: list[LegendEntry], height: int, font: float) -> None:
    box, spacing = Box(400, 20, 90, height), Spacing(font, 120)
    for piece in legend_pieces(box, entries, spacing):
        if isinstance(piece, Block):
            assert box.left <= piece.box.left
            assert piece.box.right <= box.right
            assert box.top <= piece.box.top
            assert piece.box.bottom <= max(box.bottom, box.top + round(spacing.em))
        elif isinstance(piece, Words):
            assert piece.x + piece.room <= box.right + 1e-6


@pytest.mark.parametrize("dpi", [72, 96, 150, 300, 600])
def test_labels_fit_the_width_that_is_reserved_for_them(dpi: float) -> None:
    labels = (
        "quasi-periodic",
        "period 4096",
        "fixed point",
        "downward",
        "10 attractors",
        "no attractor found",
        "10: quasi-periodic",
    )
    with settings():
        setter = Typesetter(dpi)
        for font in (6.0, 7.0, 8.0, 11.5):
            spacing = Spacing(font, dpi)
            for label in labels:
                words = Words(label, 0, 0, spacing.tick_font, spacing.ems(legend_width([label])), "left")
                assert setter.points(words) == words.points, label


def test_widths_of_small_letters_are_those_of_the_font() -> None:
    with settings():
        setter = Typesetter(7200)  # so fine that fitting type to pixels does not matter
        for letter in "abcdefghijklmnopqrstuvwxyz-:±%0":
            many = setter.stamp(Words(letter * 21, 0, 0, 8.0, 1e9))[2].shape[1]
            one = setter.stamp(Words(letter, 0, 0, 8.0, 1e9))[2].shape[1]
            assert (many - one) / 7200 * 25.4 == pytest.approx(text_width(letter * 20, 8.0), rel=0.05), letter
