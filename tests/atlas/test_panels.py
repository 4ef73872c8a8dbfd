"""Panels of plates: what is done with numbers before they are coloured, and the room that it takes."""

from __future__ import annotations

import tracemalloc

import numpy as np
import pytest
from numpy.typing import NDArray

from atlas.config.load import plate_from_parts
from atlas.families.reader import family_from_config
from atlas.orbits.schedule import schedule
from atlas.output.panel import View
from atlas.output.panels.plane import PlaneMaker
from atlas.output.panels.split import MOST, SplitMaker, told_apart
from atlas.output.reporter import Silence

FLAT_TOPPED = family_from_config(
    "flat_topped",
    {
        "state": {"x": {"start": "0.3"}},
        "parameters": {"r": {"default": "3"}, "c": {"default": "0.7"}},
        "step": {"x": "min(r * x * (1 - x), c)"},
    },
)


def test_superstable_cycles_have_the_lowest_shade_and_do_not_stretch_the_ramp() -> None:
    plate = plate_from_parts(
        FLAT_TOPPED,
        ("r", 2, 4),
        ("c", "0.4", "1.1"),
        draw="lyapunov",
        key=True,
        transient=100,
        steps=64,
        transient_limit=300,
    )
    with schedule(1) as opened:
        panel = PlaneMaker().make(View("flat", plate, 24, 24), "flat", opened, Silence())
    assert panel.fit is not None
    assert -10 < panel.fit.low < 0 < panel.fit.high < 1
    assert panel.raster.indices is not None
    lowest, elsewhere = panel.raster.indices == 1, panel.raster.indices > 1
    assert lowest.mean() > 0.05
    assert len(np.unique(panel.raster.indices[elsewhere])) > 12


def _layers(*counts: int) -> NDArray[np.uint32]:
    """Return layers of three cells, of which the first holds the counts."""
    layers = np.zeros((len(counts), 3, 1), np.uint32)
    layers[:, 0, 0] = counts
    return layers


@pytest.mark.parametrize(
    ("counts", "kept", "names"),
    [
        ((0, 9000, 5000), [9000, 5000], ["attractor 1", "attractor 2"]),
        ((70, 9000, 5000), [9000, 5000, 70], ["attractor 1", "attractor 2", "others"]),
        ((70, 3, 9000, 2, 5000, 0), [9000, 5000, 75], ["attractor 1", "attractor 2", "others"]),
        ((0, 3, 9000), [9000, 3], ["attractor 1", "others"]),
        ((7, 0, 0), [7], ["others"]),
        ((0, 0, 0), [0], ["others"]),
    ],
)
def test_attractors_that_are_hardly_seen_are_joined(
    counts: tuple[int, ...], kept: list[int], names: list[str]
) -> None:
    found, called = told_apart(_layers(*counts))
    assert found[:, 0, 0].tolist() == kept
    assert called == names


def test_telling_apart_takes_no_room_for_a_second_copy() -> None:
    layers = np.ones((MOST + 1, 200, 300), np.uint32)
    tracemalloc.start()
    found, _ = told_apart(layers)
    _, peak = tracemalloc.get_traced_memory()
    tracemalloc.stop()
    assert len(found) == MOST + 1
    assert peak < 1.5 * layers[0].nbytes


def test_the_room_of_a_split_density_grows_with_its_starts() -> None:
    def each_worker(side: int) -> int:
        grid = {"grid": [side, side], "box": {"x": [-1, 1], "y": [-1, 1]}}
        plate = plate_from_parts(
            "henon", ("a", "0.9", "1.3"), ("x", -2, 2), starts=grid, by_attractor=True, samples=100
        )
        return SplitMaker().room(View("split", plate, 100, 100)).each_worker

    assert 1 << 16 < each_worker(1) < 2 << 20
    assert 47 << 20 < each_worker(16) < 200 << 20  # measured: 47 MiB a thread with 256 starts
    portrait = plate_from_parts("henon", ("x", -2, 2), ("y", -2, 2), by_attractor=True)
    assert SplitMaker().room(View("split", portrait, 300, 200)).each_worker == 8 * 302 * 202
