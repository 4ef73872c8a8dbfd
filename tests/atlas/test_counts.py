"""Orbit histograms for notebooks: observables, records, patterns, several variables, sweeps."""

from __future__ import annotations

import json
from typing import Any

import numpy as np
import pytest
import xarray

import atlas
from atlas.families.reader import family_from_config
from tiles.errors import Refusal, TooLarge
from tiles.strip import PER_COLUMN

MAPS = family_from_config(
    "maps",
    {
        "state": {"x": {"start": "0.3"}, "y": {"start": "0.4"}},
        "parameters": {"r": {"default": "3.8"}},
        "step": {"x": "r * x * (1 - x)", "y": "0.5 * y + 0.5 * x"},
        "observables": {"gap": {"formula": "x - y", "label": "difference", "unit": "kt"}},
        "escape": "1000",
    },
)
QUICK: dict[str, Any] = {"size": (24, 30), "samples": 200, "transient": 100, "transient_limit": 2000}


NOT_EXTENDED = {**QUICK, "transient_limit": 100}
"""Extensions depend on all variables of an orbit, and are whole patterns."""


def counted(up: Any, across: Any = ("r", "2.9", "3.9"), **more: Any) -> xarray.Dataset:
    """Return counts of the family above."""
    found: xarray.Dataset = atlas.orbit_counts(MAPS, atlas.View(across=across, up=up), **{**QUICK, **more})
    return found


def test_a_variable_that_drives_others_is_counted_as_if_alone() -> None:
    across, up = ("r", "3.57", "3.9"), ("x", 0, 1)
    alone = family_from_config(
        "alone",
        {
            "state": {"x": {"start": "0.3"}},
            "parameters": {"r": {"default": "3.8"}},
            "step": {"x": "r * x * (1 - x)"},
            "escape": "1000",
        },
    )
    one = atlas.orbit_counts(alone, atlas.View(across=across, up=up), **NOT_EXTENDED)
    two = counted(up, across, transient_limit=100)
    settled = ((one.unsettled == 0) & (two.unsettled == 0)).to_numpy()
    assert settled.sum() > 10
    np.testing.assert_array_equal(two.counts.to_numpy()[:, settled], one.counts.to_numpy()[:, settled])


def test_an_observable_has_its_own_axis() -> None:
    ds = counted(("gap", -1, 1))
    assert ds.counts.dims == ("gap", "r")
    assert (ds.gap.attrs["long_name"], ds.gap.attrs["units"]) == ("difference", "kt")
    assert (ds.counts.sum("gap") + ds.unsettled == ds.exposure).all()
    fixed = ds.sel(r=slice(None, 2.99))
    occupied = fixed.gap[fixed.counts.sum("r").to_numpy() > 0]
    assert (abs(occupied) < 0.04).all()


def test_records_show_one_point_of_a_cycle() -> None:
    every = counted(("x", 0, 1), ("r", "3.1", "3.4"))
    second = counted(("x", 0, 1), ("r", "3.1", "3.4"), record={"every": 2, "phase": 1})
    third = counted(("x", 0, 1), ("r", "3.1", "3.4"), record={"every": 2})
    for ds, points in ((every, 2), (second, 1), (third, 1)):
        near = (ds.counts.sel(r=3.2, method="nearest") > 0).to_numpy()
        assert np.count_nonzero(np.diff(near.astype(int)) == 1) == points
    assert json.loads(second.attrs["atlas-certificate"])["config"]["settings"]["record"] == {
        "every": 2,
        "phase": 1,
    }
    both = (second.counts > 0).to_numpy() | (third.counts > 0).to_numpy()
    np.testing.assert_array_equal(both, (every.counts > 0).to_numpy())


def test_a_pattern_of_equal_letters_changes_nothing() -> None:
    view = atlas.View(across=("a", "3.6", "3.9"), up=("x", 0, 1))
    forced = atlas.family("forced_logistic")
    equal = atlas.orbit_counts(forced, view, set={"r": {"pattern": ["a", "a", "a"]}}, **NOT_EXTENDED)
    plain = atlas.orbit_counts(
        atlas.family("logistic"), atlas.View(across=("r", "3.6", "3.9"), up=("x", 0, 1)), **NOT_EXTENDED
    )
    settled = ((plain.unsettled == 0) & (equal.unsettled.to_numpy() == 0)).to_numpy()
    starts = [float(family.states[0].start) for family in (forced, atlas.family("logistic"))]
    assert starts[0] == starts[1]
    assert settled.sum() > 10
    np.testing.assert_array_equal(equal.counts.to_numpy()[:, settled], plain.counts.to_numpy()[:, settled])


def test_a_grid_of_starts_multiplies_the_exposure() -> None:
    starts = {"grid": [3, 2], "box": {"x": [0, 1], "y": [0, 1]}}
    ds = counted(("y", 0, 1), starts=starts)
    assert (ds.exposure == 6 * counted(("y", 0, 1)).exposure).all()


def test_sweeps_stand_side_by_side() -> None:
    both = counted(("x", 0, 1), follow="both", workers=2)
    assert both.counts.dims == ("sweep", "x", "r")
    assert both.sweep.values.tolist() == ["up", "down"]
    assert all(both[name].dims == ("sweep", "r") for name in PER_COLUMN)
    for direction in ("up", "down"):
        alone = counted(("x", 0, 1), follow=direction)
        assert alone.counts.dims == ("x", "r")
        part = both.sel(sweep=direction)
        for name in ("counts", "density", *PER_COLUMN):
            xarray.testing.assert_equal(part[name].drop_vars("sweep"), alone[name])
        assert part.samples_filled_by_repeats == alone.attrs["samples_filled_by_repeats"]
    record = json.loads(both.attrs["atlas-certificate"])
    assert record["counts_digest"] == both.attrs["counts_digest"]
    assert record["config"]["settings"]["follow"] == "both"
    assert set(record["shares"]) == set(record["samples"]) == {"up", "down"}


def test_a_sweep_is_another_picture_where_attractors_coexist() -> None:
    cusp = family_from_config(
        "cusp",
        {
            "state": {"x": {"start": "0.1"}},
            "parameters": {"a": {"default": "0"}},
            "step": {"x": "a + 1.3 * x - x * x * x"},
            "escape": "100",
        },
    )
    view = atlas.View(across=("a", "-0.1", "0.1"), up=("x", "-1", "1"))
    both = atlas.orbit_counts(cusp, view, follow="both", **{**QUICK, "transient": 1000})
    mean = (both.counts * both.x).sum("x") / both.exposure
    middle = mean.sel(a=0, method="nearest").to_numpy()
    assert middle[0] < -0.4
    assert middle[1] > 0.4


@pytest.mark.parametrize(
    ("more", "sentence"),
    [
        ({"follow": "sideways"}, "follow: 'sideways'"),
        ({"record": {"every": 2, "phase": 2}}, "record.phase: the phase 2 is not below the stride 2"),
        ({"follow": "up", "record": {"every": 2}}, "record"),
        ({"starts": {"grid": [3], "box": {"z": [0, 1]}}}, "the family 'maps' has no state variable 'z'"),
    ],
)
def test_a_wrong_request_gets_one_sentence(more: dict[str, Any], sentence: str) -> None:
    with pytest.raises(Refusal) as caught:
        counted(("x", 0, 1), **more)
    assert sentence in str(caught.value)


def test_two_sweeps_need_more_memory_than_one() -> None:
    with pytest.raises(TooLarge, match="a Dataset of 9000 x 18000 cells would need"):
        counted(("x", 0, 1), size=(9000, 9000), follow="both")


def test_an_observable_of_a_map_with_a_pattern_is_counted_as_its_state_is() -> None:
    """Twice the state falls into the cells twice as high; 2 x is exact."""
    made = family_from_config(
        "forced",
        {
            "state": {"x": {"start": "0.3"}},
            "parameters": {"a": {"default": 3}, "b": {"default": 3}, "r": {"pattern": ["a", "b"]}},
            "step": {"x": "r * x * (1 - x)"},
            "observables": {"double": "2 * x"},
        },
    )
    across = ("a", "2.9", "3.9")
    options: dict[str, Any] = {"size": (9, 16), "samples": 300, "transient": 60}
    state = atlas.orbit_counts(made, atlas.View(across, ("x", 0, 1)), **options)
    twice = atlas.orbit_counts(made, atlas.View(across, ("double", 0, 2)), **options)
    assert int(state.counts.sum()) > 0
    np.testing.assert_array_equal(state.counts.values, twice.counts.values)
