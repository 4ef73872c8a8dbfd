"""Addresses of any depth, their order and the level pairs of a set."""

import pytest
from hypothesis import given
from hypothesis import strategies as some

from tiles.errors import TooLarge, WindowRefused
from tiles.grid import Address, key_of, level_pairs, middle_pair, number_of


@some.composite
def addresses(draw, deepest=130):
    a, u = draw(some.integers(0, deepest)), draw(some.integers(0, deepest))
    return Address(a, u, draw(some.integers(0, 2**a - 1)), draw(some.integers(0, 2**u - 1)))


@given(addresses(), addresses())
def test_keys_sort_as_addresses_do(one, other):
    assert (one < other) == (one.as_key() < other.as_key())
    assert Address.from_key(one.as_key()) == one


@given(some.integers(0, 2**2000 - 1), some.integers(0, 2**2000 - 1))
def test_blobs_of_any_size_keep_the_order(one, other):
    assert (one < other) == (key_of(one) < key_of(other))
    assert number_of(key_of(one)) == one


@given(addresses())
def test_children_come_back_to_their_parent(address):
    left, right = address.children_across()
    assert left.parent_across() == right.parent_across() == address
    assert right.column == left.column + 1
    lower, upper = address.children_up()
    assert lower.parent_up() == upper.parent_up() == address
    assert upper.row == lower.row + 1


@pytest.mark.parametrize("numbers", [(2, 1, 4, 0), (2, 1, 0, 2), (2, 1, -1, 0), (0, 0, 0, -1), (-1, 0, 0, 0)])
def test_addresses_outside_the_view_are_refused(numbers):
    with pytest.raises(WindowRefused, match="does not exist"):
        Address(*numbers)


def test_an_absurd_level_is_refused():
    with pytest.raises(TooLarge, match="2001"):
        Address(2001, 0, 0, 0)


def test_the_coarsest_tile_has_no_parent():
    with pytest.raises(WindowRefused):
        Address(0, 3, 0, 1).parent_across()


def test_pairs_on_the_diagonal_stop_at_zero():
    assert level_pairs(2, 2) == ((0, 0), (1, 1), (2, 2))
    assert level_pairs(1, 3, "diagonal") == ((0, 0), (0, 1), (0, 2), (1, 3))
    assert level_pairs(2, 0) == ((0, 0), (1, 0), (2, 0))


def test_all_pairs():
    pairs = level_pairs(2, 3, "all")
    assert len(pairs) == len(set(pairs)) == 12
    assert pairs[-1] == (2, 3)
    assert list(pairs) == sorted(pairs)


def test_listed_pairs_keep_the_deepest():
    assert level_pairs(3, 2, [(1, 2), (0, 0), (1, 2)]) == ((0, 0), (1, 2), (3, 2))


def test_wrong_pairs_are_refused():
    with pytest.raises(WindowRefused, match="did you mean 'diagonal'"):
        level_pairs(1, 1, "diagonals")
    with pytest.raises(WindowRefused, match="outside the tile set"):
        level_pairs(1, 1, [(2, 0)])


@pytest.mark.parametrize("pairs", ["all", "diagonal"])
@pytest.mark.parametrize("level", range(1, 7))
def test_the_middle_pair_is_half_as_deep(level, pairs):
    assert middle_pair(level_pairs(level, level, pairs)) == (level // 2, level // 2)


@pytest.mark.parametrize(
    ("levels", "pairs", "middle"),
    [
        ((4, 2), "all", (2, 1)),
        ((5, 2), "all", (2, 1)),
        ((0, 3), "all", (0, 1)),
        ((4, 2), "diagonal", (2, 0)),
        ((1, 5), "diagonal", (0, 2)),
        ((0, 0), "diagonal", (0, 0)),
        ((4, 4), [(0, 0), (3, 3), (1, 1)], (1, 1)),
    ],
)
def test_the_middle_pair_of_unequal_levels(levels, pairs, middle):
    assert middle_pair(level_pairs(*levels, pairs)) == middle
