"""Strips account for every sample and join without gaps."""

import dataclasses

import numpy as np
import pytest

from tiles.strip import PER_COLUMN, Strip, join


def a_strip(first=0, columns=3, rows=8, seed=1):
    """A consistent strip of random counts."""
    rng = np.random.default_rng(seed)
    counts = rng.integers(0, 9, (columns, rows)).astype(np.uint32)
    lost = {name: rng.integers(0, 5, columns).astype(np.uint64) for name in PER_COLUMN[1:]}
    exposure = counts.sum(axis=1, dtype=np.uint64)
    for name in ("below", "above", "escaped", "unsettled"):
        exposure = exposure + lost[name]
    return Strip(first, counts, exposure, **lost)


def test_a_consistent_strip_passes():
    a_strip().check()


@pytest.mark.parametrize("name", ["exposure", "below", "above", "escaped", "unsettled"])
def test_one_sample_too_many_is_found_in_its_column(name):
    strip = a_strip(first=10)
    array = getattr(strip, name).copy()
    array[1] += 1
    with pytest.raises(AssertionError, match="column 11 accounts"):
        dataclasses.replace(strip, **{name: array}).check()


def test_collapsed_orbits_stand_outside_the_sum():
    strip = a_strip()
    dataclasses.replace(strip, collapsed=strip.collapsed + np.uint64(7)).check()


def test_wrong_types_and_shapes_are_found():
    strip = a_strip()
    with pytest.raises(AssertionError, match="uint32"):
        dataclasses.replace(strip, counts=strip.counts.astype(np.int64)).check()
    with pytest.raises(AssertionError, match="below"):
        dataclasses.replace(strip, below=strip.below[:2]).check()


def test_join_puts_neighbours_together():
    parts = [a_strip(4, 3, seed=1), a_strip(7, 1, seed=2), a_strip(8, 2, seed=3)]
    whole = join(parts)
    whole.check()
    assert (whole.first, whole.last) == (4, 10)
    assert np.array_equal(whole.counts[3], parts[1].counts[0])
    assert np.array_equal(whole.escaped[4:], parts[2].escaped)


def test_join_refuses_a_gap():
    with pytest.raises(ValueError, match="ends at 3"):
        join([a_strip(0, 3), a_strip(4, 1)])
