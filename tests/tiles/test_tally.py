"""Tallies of densities: every occupied cell once, whatever the order and the cutting."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

import tiles.tally
from tiles.tally import Tally, density


def slow_tally(counts, exposure, height):
    """Return how often each density occurs, cell by cell."""
    seen = {}
    for column, samples in zip(counts.tolist(), exposure, strict=True):
        for count in column:
            if count and samples:
                value = count / (float(samples) * height)
                seen[value] = seen.get(value, 0) + 1
    return sorted(seen.items())


def items(tally):
    values, often = tally.distinct()
    return list(zip(values.tolist(), often.tolist(), strict=True))


@given(
    arrays(np.uint32, (6, 5), elements=st.one_of(st.integers(0, 5), st.integers(0, 2**32 - 1))),
    st.lists(st.integers(0, 4), min_size=6, max_size=6),
    st.sampled_from([1.0, 0.1, 1 / 3]),
    st.integers(0, 6),
)
def test_a_tally_counts_every_occupied_cell_once(counts, exposure, height, cut):
    counts[np.array(exposure) == 0] = 0
    expected = slow_tally(counts, exposure, height)
    whole, first, second = Tally(), Tally(), Tally()
    whole.add(counts, exposure, height)
    first.add(counts[cut:], exposure[cut:], height)
    second.add(counts[:cut], exposure[:cut], height)
    first.merge(second)
    assert items(whole) == expected
    assert items(first) == expected


@pytest.mark.parametrize(("block", "large"), [(1, 1), (7, 3), (13, 1 << 16)])
def test_blocks_change_nothing(monkeypatch, block, large):
    counts = np.random.default_rng(1).integers(0, 9, (11, 6)).astype(np.uint32)
    exposure = np.arange(11) % 3
    monkeypatch.setattr(tiles.tally, "_BLOCK", block)
    monkeypatch.setattr(tiles.tally, "_LARGE", large)
    tally = Tally()
    tally._limit = 3
    for column in range(11):
        tally.add(counts[column : column + 1], exposure[column : column + 1], 0.25)
    counts[exposure == 0] = 0
    assert items(tally) == slow_tally(counts, exposure, 0.25)


def test_an_empty_tally_is_empty():
    assert items(Tally()) == []
    tally = Tally()
    tally.add(np.zeros((0, 4), np.uint32), np.zeros(0), 1.0)
    tally.add(np.zeros((4, 0), np.uint32), 3, 1.0)
    assert items(tally) == []


def test_density_is_the_share_of_samples_per_unit():
    found = density(np.array([[0, 3], [5, 5], [0, 0]], np.uint32), np.array([3, 10, 0]), 0.5)
    assert found.tolist() == [[0, 2], [1, 1], [0, 0]]
    assert found.dtype == np.float64
